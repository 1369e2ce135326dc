"""Stored values that are wrong, in every cell that a formula fills: each is found, and nothing else."""

from __future__ import annotations

from pathlib import Path
from typing import NamedTuple

import openpyxl
import pytest
from openpyxl.worksheet.formula import ArrayFormula

from thrustbook.addin.cells import CellError, Scalar
from thrustbook.addin.longhand.detach import Detached
from thrustbook.addin.longhand.make import Made
from thrustbook.addin.xlsx.a1 import to_a1
from thrustbook.addin.xlsx.package import Package
from thrustbook.addin.xlsx.sheetxml import stored_values

from .test_detach import TEMPLATES, changed, evaluated

SHEET = "S"
BEND = "1000,0.3,200000,0.2,90"
SCHEDULE = '"SI",A10:G10,A11:G14'


class Case(NamedTuple):
    """A formula, the cells that it fills, and those among them whose text nothing tells beforehand."""

    text: str
    size: tuple[int, int] = (1, 1)
    untold: tuple[int, ...] = ()


CASES = (
    Case('TB_AREA("SI",A1:A3)', (3, 1)),
    Case('TB_AREA("SI",A1:A3)', (3, 1)),  # the same call in other cells
    Case('TB_AREA("SI",$A$1:$A$3)'),
    Case('TB_AREA("SI",A1:A3)', (3, 3)),  # one column of results in three
    Case('TB_AREA("SI",A1:A3)', (5, 1)),  # nothing beyond the result
    Case('TB_BEND("Fx,Fx,Fy","SI",1000,A1:A3,200000,0.2,90)', (3, 3)),
    Case(f'TB_BEND("Fx,Fy","SI",{BEND})', (3, 2)),
    Case(f'TB_BEND("Fx,Fy","SI",{BEND})', (1, 4)),
    Case(f'TB_BEND("all","SI",{BEND})/2', (1, 6)),
    Case('TB_BEND("labels","SI")', (1, 3)),
    Case('TB_BEND("units","SI")', (1, 3)),
    Case('TB_BRANCHFLOW("SI",C1:D2)', (2, 1)),
    Case('TB_BRANCHFLOW("SI",C1:D2)', (3, 2)),
    Case(f'TB_SCHEDULE("name,Fx,Fy,note",{SCHEDULE})', (4, 4), (3, 7, 11, 15)),
    Case(f'TB_SCHEDULE("name,Fx,Fy",{SCHEDULE})', (4, 3)),
    Case('TB_AREA("SI",A1)'),
    Case(f'TB_SCHEDULE("fitting,Fx,dir",{SCHEDULE})', (5, 3)),
    Case(f'TB_SCHEDULE("Fx",{SCHEDULE})', (4, 2)),
    Case(f'TB_SCHEDULE("name",{SCHEDULE})'),
    Case('IF(TB_AREA("SI",A1)>0.001,"wide","narrow")'),
    Case('TEXT(TB_AREA("SI",A1:A3),"0.000")&" m2"', (3, 1)),
    Case('"DN300: "&IF(TB_AREA("SI",A1)>0.001,"wide","narrow")'),
    Case('TB_AREA("SI",A1)>0.001'),
)


def _place(number: int) -> tuple[int, int]:
    return 20 + 7 * number, 8


def _cells(case: Case, number: int) -> list[tuple[int, int]]:
    row, col = _place(number)
    return [(row + i, col + j) for i in range(case.size[0]) for j in range(case.size[1])]


@pytest.fixture(scope="module")
def book(tmp_path_factory: pytest.TempPathFactory) -> Path:
    path = tmp_path_factory.mktemp("stored") / "book.xlsx"
    book = openpyxl.Workbook()
    sheet = book.worksheets[0]
    sheet.title = SHEET
    for at, value in (
        ("A1", 0.1),
        ("A2", 0.2),
        ("A3", 0.3),
        ("C1", -0.5),
        ("C2", 0.7),
        ("D1", 0.25),
        ("D2", -0.6),
    ):
        sheet[at] = value
    table = (
        ("name", "fitting", "rho", "D1", "p1 [bar]", "Q", "theta"),
        ("B1", "bend", 1000.0, 0.3, 2.0, 0.2, 90.0),
        (None,) * 7,
        ("B2", "bend", 1000.0, 0.2, 3.0, 0.05, 30.0),
        ("E1", "closed", None, 0.2, 3.0, None, None),
    )
    for i, line in enumerate(table):
        for j, value in enumerate(line):
            sheet.cell(10 + i, 1 + j, value)
    for number, case in enumerate(CASES):
        row, col = _place(number)
        last = to_a1(row + case.size[0] - 1, col + case.size[1] - 1)
        text = f"={case.text}"
        sheet.cell(row, col, text if case.size == (1, 1) else ArrayFormula(f"{to_a1(row, col)}:{last}", text))
    book.save(path)
    return evaluated(path)


def _verdicts(book: Path) -> dict[str, str]:
    found = Made(Package.read(book)).verdicts()
    return {entry.cell.a1: word for word, entries in found.items() for entry in entries}


def _values(book: Path) -> dict[tuple[int, int], Scalar]:
    package = Package.read(book)
    return stored_values(package.part(package.sheets[0].part), package.shared_strings)


def _wrong(value: Scalar) -> Scalar:
    if isinstance(value, bool):
        return not value
    if isinstance(value, float):
        return value * (1 + 1e-8) or 1e-3
    if isinstance(value, CellError):
        return 7.0
    return f"{value}x" if value else 7.0


def test_nothing_is_found_in_what_is_right(book: Path) -> None:
    words = _verdicts(book)
    assert len(words) == len(CASES)
    for number, case in enumerate(CASES):
        texts = case.text.startswith(('TB_BEND("labels"', 'TB_BEND("units"', 'TB_SCHEDULE("name",'))
        assert words[to_a1(*_place(number))] == ("text" if texts else "agrees"), case


@pytest.mark.parametrize("turn", range(max(case.size[0] * case.size[1] for case in CASES)))
@pytest.mark.parametrize("odd", [0, 1])
def test_every_wrong_value_is_found(book: Path, turn: int, odd: int, tmp_path: Path) -> None:
    """One wrong cell in every other formula, so that those with the same call do not hide each other."""
    values, seeds = _values(book), {}
    seeded = set()
    for number, case in enumerate(CASES):
        cells = _cells(case, number)
        if number % 2 == odd and turn < len(cells) and turn not in case.untold:
            seeds[to_a1(*cells[turn])] = _wrong(values.get(cells[turn]))
            seeded.add(to_a1(*_place(number)))
    words = _verdicts(changed(book, {SHEET: seeds}, tmp_path / "seeded.xlsx"))
    assert {at for at, word in words.items() if word == "differs"} == seeded


@pytest.mark.parametrize("value", ["12.5", "text", ""])
def test_a_text_is_no_number(book: Path, value: str, tmp_path: Path) -> None:
    words = _verdicts(changed(book, {SHEET: {to_a1(*_place(2)): value}}, tmp_path / "seeded.xlsx"))
    assert words[to_a1(*_place(2))] == "differs"


def test_the_same_call_in_two_cells_agrees_in_both(tmp_path: Path) -> None:
    """A sum of forces that is nothing but rounding is no difference in the second cell either."""
    path = tmp_path / "book.xlsx"
    book = openpyxl.load_workbook(TEMPLATES / "pipe-run.xlsx")
    sheet = book["Cover"]
    for row in (40, 41, 42):
        sheet.cell(row, 2, "=" + str(sheet["B16"].value).removeprefix("="))
    book.save(path)
    found = Made(Package.read(evaluated(path))).verdicts()
    assert {entry.cell.where for entry in found["agrees"]} >= {f"Cover!B{row}" for row in (16, 40, 41, 42)}
    assert not found["differs"]
    wrong = changed(path, {"Cover": {"B41": 1e-6}}, tmp_path / "wrong.xlsx")
    assert [e.cell.where for e in Made(Package.read(wrong)).verdicts()["differs"]] == ["Cover!B41"]


@pytest.mark.parametrize(
    "formula",
    [
        f'"Note: "&TB_SCHEDULE("note",{SCHEDULE})',
        f'INDEX(TB_SCHEDULE("name,note",{SCHEDULE}),1,2)',
        f'TB_CONVERT(TB_SCHEDULE("note",{SCHEDULE}),"m","mm")',
    ],
)
def test_notes_inside_a_formula_are_not_taken_from_its_cells(
    book: Path, formula: str, tmp_path: Path
) -> None:
    path = tmp_path / "notes.xlsx"
    other = openpyxl.load_workbook(book)
    other[SHEET]["A9"] = f"={formula}"
    other.save(path)
    made = Detached(Package.read(evaluated(path)))
    found = made.made.verdicts()
    assert [(e.cell.a1, "note" in e.trouble) for e in found["not worked"]] == [("A9", True)]
    first = to_a1(*_place(13))  # the call alone, whose notes stand as constants
    assert [f.reason for f in made.frozen if f.where == f"{SHEET}!{first}"] == ["it is a text"]
