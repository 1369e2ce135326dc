"""Workbook files through a real Calc: loaded, changed, saved, loaded again, exported, evaluated."""

from __future__ import annotations

import html
import math
import re
import shutil
import subprocess
import zipfile
from collections.abc import Mapping
from pathlib import Path
from typing import Any

import openpyxl
import pytest
from openpyxl.workbook.defined_name import DefinedName
from openpyxl.worksheet.datavalidation import DataValidation
from openpyxl.worksheet.formula import ArrayFormula

from thrustbook.addin import cli
from thrustbook.addin.cells import CellError, Scalar
from thrustbook.addin.hosts.calc.evaluate import evaluate_workbook as evaluate_in_calc
from thrustbook.addin.hosts.calc.office import wire
from thrustbook.addin.hosts.headless.evaluate import evaluate_workbook
from thrustbook.addin.xlsx.a1 import to_a1
from thrustbook.addin.xlsx.package import Package
from thrustbook.addin.xlsx.sheetxml import stored_values
from thrustbook.workbooks.templates import shipped

from .excelfile import as_saved_by_excel, as_spilling
from .office import Office, memory

TOLERANCE = 1e-12
AREA_300 = math.pi * 0.09 / 4


def stored(package: Package, replaced: Mapping[str, bytes] | None = None) -> dict[str, dict[Any, Scalar]]:
    """Values that a workbook holds, by sheet and place."""
    given = replaced or {}
    return {
        sheet.name: dict(
            stored_values(given.get(sheet.part, package.part(sheet.part)), package.shared_strings)
        )
        for sheet in package.sheets
    }


def differences(office: Office, book: int, wanted: dict[str, dict[Any, Scalar]]) -> list[Any]:
    """Cells in which a workbook open in Calc differs from stored values."""
    found = []
    for name, cells in wanted.items():
        if not cells:
            continue
        last = to_a1(max(r for r, _ in cells), max(c for _, c in cells))
        grid = office.values(book, name, f"A1:{last}")
        for (row, col), value in cells.items():
            here = grid[row - 1][col - 1]
            if isinstance(value, bool):
                value = float(value)
            if isinstance(value, CellError):
                value = {"error": wire.ERROR_CODES[value.kind]}
            if isinstance(value, float) and isinstance(here, float):
                same = math.isclose(value, here, rel_tol=TOLERANCE, abs_tol=1e-300)
            else:
                same = value == here
            if not same:
                found.append((name, to_a1(row, col), here, value))
    return found


def formulas_of(path: Path) -> list[str]:
    """Every formula text of a saved .xlsx."""
    with zipfile.ZipFile(path) as archive:
        sheets = [n for n in archive.namelist() if re.fullmatch(r"xl/worksheets/[^/]+\.xml", n)]
        return [
            html.unescape(match)
            for name in sheets
            for match in re.findall(r"<f[^>]*>([^<]*)</f>", archive.read(name).decode())
        ]


@pytest.fixture
def pipe_run(tmp_path: Path) -> Path:
    path = tmp_path / "pipe-run.xlsx"
    shutil.copyfile(str(shipped("pipe-run")), path)
    return path


def _input_of_flow(path: Path) -> tuple[str, str]:
    """Sheet and cell of the flow among the inputs of the template."""
    for sheet in openpyxl.load_workbook(path).worksheets:
        for line in sheet.iter_rows(max_col=2, max_row=30):
            if line[0].value == "Q" and isinstance(line[1].value, int | float):
                return sheet.title, str(line[1].coordinate)
    raise AssertionError("the template has no input for the flow")


def test_template_loaded_changed_saved_and_loaded_again(
    office: Office, pipe_run: Path, tmp_path: Path
) -> None:
    original = stored(Package.read(pipe_run))
    book = office.load(str(pipe_run))
    office.recalculate(book)
    assert differences(office, book, original) == []

    sheet, place = _input_of_flow(pipe_run)
    changed = tmp_path / "changed.xlsx"
    workbook = openpyxl.load_workbook(pipe_run)
    flow = workbook[sheet][place].value * 0.9
    workbook[sheet][place] = flow
    workbook.save(changed)
    package = Package.read(changed)
    expected = stored(package, evaluate_workbook(package).replaced)

    office.put(book, sheet, place, flow)
    assert differences(office, book, expected) == []
    assert differences(office, book, original) != []

    for name in ("saved.xlsx", "saved.ods"):
        office.save(book, str(tmp_path / name))
    office.close(book)
    for name in ("saved.xlsx", "saved.ods"):
        again = office.load(str(tmp_path / name))
        assert differences(office, again, expected) == []
        office.recalculate(again)
        assert differences(office, again, expected) == []
        office.close(again)

    calls = [text for text in formulas_of(tmp_path / "saved.xlsx") if "TB_" in text]
    assert calls
    assert not any("THRUSTBOOK" in text.upper() for text in calls)
    saved = Package.read(tmp_path / "saved.xlsx")
    evaluation = evaluate_workbook(saved)
    assert evaluation.ok
    assert differences_between(stored(saved), stored(saved, evaluation.replaced)) == []


def differences_between(one: dict[str, dict[Any, Scalar]], other: dict[str, dict[Any, Scalar]]) -> list[Any]:
    found: list[Any] = []
    assert one.keys() == other.keys()
    for name in one:
        for place in sorted({*one[name], *other[name]}):
            a, b = one[name].get(place), other[name].get(place)
            if isinstance(a, float) and isinstance(b, float):
                if not math.isclose(a, b, rel_tol=TOLERANCE, abs_tol=1e-300):
                    found.append((name, place, a, b))
            elif str(a or "") != str(b or ""):
                found.append((name, place, a, b))
    return found


def plain_book(path: Path, protected: bool = False) -> Path:
    """A workbook as openpyxl or the headless host leave it: plain names, arrays, a name with a call."""
    workbook = openpyxl.Workbook()
    sheet = workbook.worksheets[0]
    sheet.title = "Data"
    sheet["A1"] = '=TB_AREA("metric",300)'
    sheet["A2"] = "=A1*2"
    sheet["A3"] = '=IFERROR(TB_AREA("metric",-1),"bad")'
    sheet["A4"] = '=IF(A1>0,"TB_AREA(","x")'
    for row in (1, 2, 3):
        sheet[f"C{row}"] = row / 10
    sheet["D1"] = ArrayFormula("D1:D3", '=TB_AREA("SI",C1:C3)')
    workbook.defined_names["Area"] = DefinedName("Area", attr_text='TB_AREA("metric",300)')
    sheet["E1"] = "=Area*1"
    if protected:
        sheet.protection.sheet = True
        sheet.protection.password = "word"
    workbook.save(path)
    return path


def check_plain_book(office: Office, book: int) -> None:
    values = office.values(book, "Data", "A1:E4")
    assert math.isclose(values[0][0], AREA_300, rel_tol=TOLERANCE)
    assert math.isclose(values[1][0], 2 * AREA_300, rel_tol=TOLERANCE)
    assert [values[2][0], values[3][0]] == ["bad", "TB_AREA("]
    for row, d in enumerate((0.1, 0.2, 0.3)):
        assert math.isclose(values[row][3], math.pi * d * d / 4, rel_tol=TOLERANCE)
    assert math.isclose(values[0][4], AREA_300, rel_tol=TOLERANCE)


@pytest.mark.parametrize("kind", ["plain", "protected", "excel"])
def test_names_are_bound_on_loading_and_plain_after_saving(office: Office, tmp_path: Path, kind: str) -> None:
    path = plain_book(tmp_path / "book.xlsx", protected=kind == "protected")
    if kind == "excel":
        as_saved_by_excel(path)
        assert any("[1]!TB_AREA" in text for text in formulas_of(path))
    book = office.load(str(path))
    assert not office.modified(book)
    check_plain_book(office, book)
    saved = tmp_path / "saved.xlsx"
    office.save(book, str(saved))
    time_of_saving = saved.stat().st_mtime_ns
    office.put(book, "Data", "F1", 1.0)
    office.save_again(book)
    assert saved.stat().st_mtime_ns >= time_of_saving
    office.close(book)
    texts = formulas_of(saved)
    assert 'TB_AREA("metric",300)' in texts
    assert not any("THRUSTBOOK" in text.upper() or "]" in text for text in texts)
    with zipfile.ZipFile(saved) as archive:
        assert archive.testzip() is None
        assert b"org.thrustbook" not in archive.read("xl/workbook.xml").lower()
    again = office.load(str(saved))
    check_plain_book(office, again)
    office.close(again)


def test_native_file_keeps_the_functions(office: Office, tmp_path: Path) -> None:
    book = office.load(str(plain_book(tmp_path / "book.xlsx")))
    office.save(book, str(tmp_path / "book.ods"))
    office.close(book)
    again = office.load(str(tmp_path / "book.ods"))
    check_plain_book(office, again)
    office.recalculate(again)
    check_plain_book(office, again)
    office.close(again)


def test_menu_command_links_a_formula_that_the_office_did_not_know(office: Office, book: int) -> None:
    office.put(book, 0, "A1", '=[1]!TB_AREA("metric";300)')
    assert "error" in office.values(book, 0, "A1")[0][0]
    office.dispatch(book, "service:org.thrustbook.calc.Relink?")
    assert math.isclose(office.values(book, 0, "A1")[0][0], AREA_300, rel_tol=TOLERANCE)


def test_pages_of_the_template(office: Office, pipe_run: Path, tmp_path: Path) -> None:
    """Printed by Calc, the workbook reads as a calculation: headings, values, charts, no error."""
    book = office.load(str(pipe_run))
    office.recalculate(book)
    pdf = tmp_path / "pipe-run.pdf"
    office.copy(book, str(pdf))
    office.close(book)
    text = subprocess.run(
        ["pdftotext", "-layout", str(pdf), "-"], capture_output=True, text=True, check=True, timeout=60
    ).stdout
    assert "invented" in text
    assert not re.search(r"#(NAME\?|VALUE!|NUM!|REF!|N/A|DIV/0!)|Err:\d", text)
    assert len(text.split("\f")) > 3


def test_opening_and_closing_again_and_again_keeps_little(office: Office, pipe_run: Path) -> None:
    """A short form of the soak in tests/benchmarks/bench_calc.py; a document kept would be megabytes."""

    def once() -> None:
        book = office.load(str(pipe_run))
        office.recalculate(book)
        office.close(book)

    for _ in range(15):  # caches fill up first
        once()
    (office_pid,) = office.processes("soffice.bin")
    (worker_pid,) = office.processes("hosts.calc.worker")
    before = memory(office_pid), memory(worker_pid)
    cycles = 20
    for _ in range(cycles):
        once()
    assert memory(office_pid) - before[0] < cycles * 1_000_000
    assert memory(worker_pid) - before[1] < cycles * 100_000
    assert office.processes("hosts.calc.worker") == [worker_pid]


@pytest.mark.usefixtures("real_office")
def test_evaluated_with_calc_as_by_the_embedded_engine(
    pipe_run: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    workbook = openpyxl.load_workbook(pipe_run)
    sheet, place = _input_of_flow(pipe_run)
    workbook[sheet][place] = workbook[sheet][place].value * 0.8
    workbook.save(pipe_run)
    one, other = tmp_path / "one.xlsx", tmp_path / "other.xlsx"
    reports = []
    for target, host in ((one, "calc"), (other, "headless")):
        assert cli.main(["evaluate", str(pipe_run), "-o", str(target), "--with", host]) == 0
        reports.append(capsys.readouterr().out.splitlines()[1:])  # the first line tells the time
    assert reports[0] == reports[1]
    assert differences_between(stored(Package.read(one)), stored(Package.read(other))) == []
    assert stored(Package.read(one)) != stored(Package.read(pipe_run))


def contract_book(path: Path) -> Path:
    """Cells of the contract: empty arguments, failures, spilling arrays, logical values."""
    workbook = openpyxl.Workbook()
    sheet = workbook.worksheets[0]
    sheet.title = "Data"
    formulas = (
        "=TB_AREA(,0.3)",
        "=TB_AREA(Z1,0.3)",
        '=TB_AREA("SI",Z1)',
        '=TB_AREA("metric",-300)',
        '=TB_FRICTION("f","SI",100000,Z1,,0.0001,0.3)',
        '=ISNUMBER(TB_AREA("SI",0.3))',
        '=TB_WHY("TB_AREA","SI",-1)',
        "=SUM(A3:A4)",
        "=1/0",
    )
    for row, formula in enumerate(formulas, 1):
        sheet[f"A{row}"] = formula
    for row in range(1, 6):
        sheet[f"C{row}"] = row / 10 if row != 3 else -1
    sheet["D1"] = ArrayFormula("D1:D5", '=TB_AREA("SI",C1:C5)')
    sheet["F1"] = ArrayFormula("F1:G3", '=TB_AREA("SI",C1:C2)')
    workbook.defined_names["Enough"] = DefinedName("Enough", attr_text='TB_AREA("SI",Data!$C$1)')
    rule = DataValidation(type="custom", formula1="C1<Enough")
    rule.add("C1:C5")
    sheet.add_data_validation(rule)
    workbook.save(path)
    return path


@pytest.mark.usefixtures("real_office")
def test_contract_is_the_same_with_calc_and_with_the_embedded_engine(tmp_path: Path) -> None:
    package = Package.read(contract_book(tmp_path / "book.xlsx"))
    calc, headless = evaluate_in_calc(package), evaluate_workbook(package)
    one, other = stored(package, calc.replaced), stored(package, headless.replaced)
    assert differences_between(one, other) == []
    assert one["Data"][5, 1] == other["Data"][5, 1]
    assert isinstance(one["Data"][5, 1], float)
    assert calc.counts == headless.counts
    assert not calc.ok
    reasons = {error.a1: error.reason for error in calc.errors}
    assert reasons["A4"] == "D = -300 mm (allowed: above 0)"
    assert reasons["A3"] == "D is not given (it is required)"
    assert {e.a1 for e in calc.errors} == {e.a1 for e in headless.errors}
    assert [tuple(e) for e in calc.not_evaluated] == [("Data", "C1:C5", "C1<Enough")]
    assert calc.not_evaluated == headless.not_evaluated


@pytest.mark.usefixtures("real_office")
@pytest.mark.parametrize(("held", "blocked"), [("D1:D2", ""), ("D1:D9", ""), ("D1", "D4")])
def test_spilling_formula_gets_the_extent_of_its_result(tmp_path: Path, held: str, blocked: str) -> None:
    path = tmp_path / "book.xlsx"
    workbook = openpyxl.Workbook()
    sheet = workbook.worksheets[0]
    sheet.title = "Data"
    for row in range(1, 6):
        sheet[f"C{row}"] = row / 10
    sheet["D1"] = ArrayFormula(held, '=TB_AREA("SI",C1:C5)')
    sheet["F1"] = "=SUM(D1:D9)"
    if blocked:
        sheet[blocked] = "in the way"
    workbook.save(path)
    as_spilling(path, "D1")
    package = Package.read(path)
    calc, headless = evaluate_in_calc(package), evaluate_workbook(package)
    one, other = stored(package, calc.replaced), stored(package, headless.replaced)
    assert differences_between(one, other) == []
    assert calc.ok is not bool(blocked)
    if blocked:
        assert any("#SPILL!" in error.reason for error in calc.errors)
    else:
        assert math.isclose(one["Data"][5, 4], math.pi / 16, rel_tol=TOLERANCE)  # type: ignore[arg-type]


def test_no_office_is_said_clearly(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    path = plain_book(tmp_path / "book.xlsx")
    before = path.read_bytes()
    monkeypatch.setenv("THRUSTBOOK_SOFFICE", str(tmp_path / "none"))
    assert cli.main(["evaluate", str(path), "--with", "calc"]) == 2
    assert "LibreOffice was not found" in capsys.readouterr().err
    for command in ("install", "uninstall"):
        assert cli.main([command, "calc"]) == 2
        assert "LibreOffice was not found" in capsys.readouterr().err
    assert path.read_bytes() == before


def test_office_that_does_not_answer_is_stopped(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    from thrustbook.addin.xlsx.refusals import Refusal

    program = tmp_path / "soffice"
    program.write_text("#!/bin/sh\nsleep 600\n")
    program.chmod(0o755)
    monkeypatch.setenv("THRUSTBOOK_SOFFICE", str(program))
    package = Package.read(plain_book(tmp_path / "book.xlsx"))
    with pytest.raises(Refusal, match="did not answer within 1 s"):
        evaluate_in_calc(package, timeout=1.0)


@pytest.mark.usefixtures("real_office")
def test_installed_removed_and_again(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    """Registered by the office's own program, in a profile and a shared store of the test's own."""
    monkeypatch.setenv("UserInstallation", (tmp_path / "profile").as_uri())
    monkeypatch.setenv("UNO_SHARED_PACKAGES_CACHE", (tmp_path / "shared").as_uri())
    monkeypatch.setenv("HOME", str(tmp_path))
    for _ in range(2):
        assert cli.main(["install", "calc"]) == 0
        assert "Installed: thrustbook" in capsys.readouterr().out
    with Office(tmp_path, bundled=False) as installed:
        book = installed.new()
        installed.put(book, 0, "A1", '=TB_AREA("metric";300)')
        assert math.isclose(installed.values(book, 0, "A1")[0][0], AREA_300, rel_tol=TOLERANCE)
    assert cli.main(["uninstall", "calc"]) == 0
    assert "Removed: thrustbook" in capsys.readouterr().out
    assert cli.main(["uninstall", "calc"]) == 0
    assert "not installed" in capsys.readouterr().out
