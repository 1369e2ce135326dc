"""Checking sheets of a small workbook: what they link to, what they leave alone, what they find."""

from __future__ import annotations

import re
import zipfile
from pathlib import Path

import openpyxl
import pytest
from openpyxl.formatting.rule import FormulaRule

from thrustbook.addin.cli import main
from thrustbook.addin.hosts.headless.evaluate import evaluate_workbook
from thrustbook.addin.longhand.detach import Detached
from thrustbook.addin.longhand.make import Made
from thrustbook.addin.xlsx.package import Package
from thrustbook.addin.xlsx.refusals import Refusal

from .office import recalculated
from .smallbook import SHEET, UNITS, make
from .test_detach import changed, evaluated, same

ALLOWED = {
    "xl/workbook.xml",
    "xl/_rels/workbook.xml.rels",
    "[Content_Types].xml",
    "xl/styles.xml",
    "docProps/app.xml",
}


@pytest.fixture(scope="module")
def book(tmp_path_factory: pytest.TempPathFactory) -> Path:
    return make(tmp_path_factory.mktemp("small") / "small.xlsx")


@pytest.fixture(scope="module")
def copy(book: Path) -> Path:
    target = book.with_name("copy.xlsx")
    assert main(["longhand", str(book), "-o", str(target)]) == 0
    return target


def test_every_cell_agrees(book: Path) -> None:
    found = Made(Package.read(book)).verdicts()
    assert {word: len(entries) for word, entries in found.items()} == {
        "agrees": 32,
        "differs": 0,
        "error": 0,
        "text": 2,
        "not worked": 0,
    }


def test_all_other_parts_stay_byte_for_byte(book: Path, copy: Path) -> None:
    before, after = zipfile.ZipFile(book), zipfile.ZipFile(copy)
    added = set(after.namelist()) - set(before.namelist())
    assert added
    assert all(name.startswith("xl/worksheets/longhand") for name in added)
    for name in set(before.namelist()) - ALLOWED:
        assert after.read(name) == before.read(name), name
    assert before.read("xl/worksheets/sheet1.xml") == after.read("xl/worksheets/sheet1.xml")


def test_other_libraries_read_the_copy_with_its_values(copy: Path) -> None:
    book = openpyxl.load_workbook(copy)
    values = openpyxl.load_workbook(copy, data_only=True)
    assert book.sheetnames[2:] == ["Long-hand", "LH cells", "LH TB_AREA", "LH TB_REDUCER", "LH units"]
    formulas = {c.coordinate for row in book["LH cells"].iter_rows() for c in row if c.data_type == "f"}
    assert len(formulas) > 500
    empty = [at for at in formulas if values["LH cells"][at].value is None]
    # An argument that is not given stays empty; nothing else does.
    assert all(book["LH cells"][at].value.startswith("=IF(") for at in empty)


def test_inputs_are_linked_and_not_copied(copy: Path) -> None:
    cells = openpyxl.load_workbook(copy)["LH cells"]
    formulas = [c.value for row in cells.iter_rows() for c in row if isinstance(c.value, str)]
    for ref in ("'Calc''s sheet'!C4", "rho"):
        number = f'IF(ISNUMBER({ref}),{ref},IF({ref}="","",#VALUE!))'
        assert f"=IF(ISLOGICAL({ref}),#VALUE!,{number})" in formulas
    assert any("'LH units'!" in f for f in formulas)
    # The flow inside TB_VELOCITY is the long-hand result of the inner call.
    assert any(f.startswith("='LH cells'!$D$") and f.endswith("*3600") for f in formulas)


def test_a_stale_value_is_found(book: Path, tmp_path: Path) -> None:
    stale = changed(book, {SHEET: {"C7": 999.0}}, tmp_path / "stale.xlsx")
    found = Made(Package.read(stale)).verdicts()
    assert {e.cell.a1 for e in found["differs"]} == {"G7", "H7", "I7", "M4"}


def test_a_workbook_without_values_is_refused(book: Path, tmp_path: Path) -> None:
    path = tmp_path / "empty.xlsx"
    openpyxl.load_workbook(book).save(path)
    with pytest.raises(Refusal, match="holds no value"):
        Made(Package.read(path))
    assert main(["longhand", str(path)]) == 2


def test_values_that_no_call_reads_may_be_missing(book: Path, tmp_path: Path) -> None:
    path, unread = tmp_path / "one.xlsx", openpyxl.load_workbook(book)
    unread["Units"]["F1"] = "=F2"
    unread["Units"]["F2"] = "=F1"
    unread.save(path)
    package = Package.read(path)
    package.save(path, evaluate_workbook(package, fill_native=True).replaced)
    assert len(Made(Package.read(path)).verdicts()["agrees"]) == 32
    unread[SHEET]["C7"] = "=400+70"
    unread.save(path)
    package = Package.read(path)
    package.save(path, evaluate_workbook(package).replaced)
    with pytest.raises(Refusal, match=r"Calc's sheet!C7 .* holds no value"):
        Made(Package.read(path))


def test_a_workbook_with_checking_sheets_is_refused(copy: Path) -> None:
    assert main(["longhand", str(copy)]) == 2
    assert main(["longhand", str(copy), "-o", str(copy)]) == 2


@pytest.mark.parametrize(
    "changes",
    [
        {SHEET: {"A4": 350.0, "C5": 300.0, "D6": 30.0, "E7": 200.0, "A5": "280 mm", "G3": "R"}},
        {
            SHEET: {"B6": "3.9 bar(g)", "E4": None},
            "Units": {"B2": "psi", "B3": "L/s", "B4": "lbf", "B5": "in"},
        },
    ],
)
def test_detached_copy_follows_the_inputs(
    book: Path, changes: dict[str, dict[str, float | str | None]], tmp_path: Path
) -> None:
    plain = tmp_path / "plain.xlsx"
    assert main(["detach", str(book), "-o", str(plain)]) == 0
    engine = evaluated(changed(book, changes, tmp_path / "engine.xlsx"))
    without = recalculated(changed(plain, changes, tmp_path / "changed.xlsx"), tmp_path)
    sheets = [openpyxl.load_workbook(path, data_only=True)[SHEET] for path in (engine, without)]
    tables = [[[cell.value for cell in row] for row in sheet["G4:AE9"]] for sheet in sheets]
    if changes[SHEET].get("G3"):  # the working was made for Fx, and says so
        assert {row[0] for row in tables[1]} == {"#N/A"}
        tables = [[row[1:] for row in table] for table in tables]
    for table in tables:
        table[0][11] = ""  # TB_WHY stands as a constant
    assert same(*tables) > 50


def test_detached_copy_calls_nothing_of_ours(book: Path, tmp_path: Path) -> None:
    target = tmp_path / "plain.xlsx"
    detached = Detached(Package.read(book))
    detached.save(target)
    for row in openpyxl.load_workbook(target)[SHEET].iter_rows():
        for cell in row:
            assert not re.search(r"TB_\w+\(", str(cell.value)), cell.coordinate
    assert {frozen.reason for frozen in detached.frozen} == {"it is a text"}


def test_detached_copy_tells_what_calls_still(
    book: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    path, copy = tmp_path / "format.xlsx", tmp_path / "copy.xlsx"
    with_format = openpyxl.load_workbook(book)
    rule = FormulaRule(formula=["TB_AREA(Units,A4)>1"], stopIfTrue=True)
    with_format[SHEET].conditional_formatting.add("A4:A9", rule)
    with_format.save(path)
    package = Package.read(path)
    package.save(path, evaluate_workbook(package, fill_native=True).replaced)
    assert main(["detach", str(path), "-o", str(copy)]) == 1
    assert "Calc's sheet!A4:A9  TB_AREA(Units,A4)>1" in capsys.readouterr().out


def test_the_units_of_the_book_are_those_of_the_test() -> None:
    assert dict(UNITS)["force"] == "kN"


def test_a_text_with_a_number_in_it_is_no_error(tmp_path: Path) -> None:
    path = tmp_path / "text.xlsx"
    book = openpyxl.Workbook()
    sheet = book.active
    assert sheet is not None
    sheet["A1"] = 300
    sheet["B1"] = '=TB_AREA("metric",A1)&" m2"'
    sheet["B2"] = '=TB_AREA("metric",A1)'
    book.save(path)
    package = Package.read(path)
    package.save(path, evaluate_workbook(package).replaced)
    found = Made(Package.read(path)).verdicts()
    assert not found["error"]
    assert not found["differs"]
    assert [e.cell.where for e in found["agrees"]] in (["Sheet!B1", "Sheet!B2"], ["Sheet!B2"])
