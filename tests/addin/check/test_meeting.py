"""Runs that meet in a point: what one gives, the other must take. Figures are invented."""

from __future__ import annotations

from pathlib import Path

import pytest
from openpyxl import Workbook
from openpyxl.worksheet.formula import ArrayFormula

from .books import findings, stored

HEADS = ("name", "x", "y", "z", "D", "f", "Qo", "ox", "oy", "oz", "Do")
MAIN = (
    ("A", 0.0, 0.0, 10.0, 0.3, 0.02),
    ("T", 50.0, 0.0, 10.0, 0.3, 0.02, 0.03, 0.0, 1.0, 0.0, 0.15),
    ("E", 90.0, 0.0, 10.0, 0.3, 0.02),
)
BRANCH = (("T", 50.0, 0.0, 10.0, 0.15, 0.02), ("B", 50.0, 30.0, 10.0, 0.15, 0.02))
ONWARD = (("E", 90.0, 0.0, 10.0, 0.3, 0.02), ("F", 90.0, 60.0, 10.0, 0.3, 0.02))


def _add(book: Workbook, title: str, flow: float, nodes: tuple[tuple[object, ...], ...]) -> None:
    ws = book.create_sheet(title)
    for line in (
        ("rho", 998.0),
        ("Q", flow),
        ("p", 5e5),
        ("case", "kind", "p", "dp"),
        ("test", "test", 9e5, None),
        ("trip", "surge", None, 2e5),
        HEADS,
        *nodes,
    ):
        ws.append(line)
    last = 7 + len(nodes)
    arguments = f"A1:B3,A7:K7,A8:K{last}"
    ws["M8"] = ArrayFormula(f"M8:M{last}", f'=TB_RUN("F","SI",{arguments})')
    ws["N8"] = ArrayFormula(f"N8:N{last}", f'=TB_RUNCASES("F","SI",{arguments},A4:D6)')


def _book(main: float, branch: float, onward: float) -> Workbook:
    book = Workbook()
    book.remove(book.worksheets[0])
    _add(book, "Main", main, MAIN)
    _add(book, "Branch", branch, BRANCH)
    _add(book, "Onward", onward, ONWARD)
    return book


def test_runs_that_close_give_no_finding(tmp_path: Path) -> None:
    assert findings(stored(_book(0.1, 0.03, 0.07), tmp_path / "book.xlsx")) == []


@pytest.mark.parametrize(
    ("flows", "sheet", "words"),
    [
        ((0.1, 0.04, 0.07), "Branch", ("lets out 0.03 m3/s", "takes 0.04 m3/s", "0.01 m3/s are left over")),
        ((0.1, 0.03, 0.1), "Onward", ("brings 0.07 m3/s", "takes 0.1 m3/s", "0.03 m3/s are left over")),
    ],
)
def test_runs_that_do_not_close_are_found(
    tmp_path: Path, flows: tuple[float, float, float], sheet: str, words: tuple[str, ...]
) -> None:
    found = findings(stored(_book(*flows), tmp_path / "book.xlsx"))
    assert [(f.code, f.place) for f in found] == [("M03", f"{sheet}!M8")]
    for text in words:
        assert text in f"{found[0].what} {found[0].why}"


def test_a_branch_without_an_offtake_is_found(tmp_path: Path) -> None:
    book = _book(0.1, 0.03, 0.1)
    for col in range(7, 12):
        book["Main"].cell(9, col).value = None
    found = findings(stored(book, tmp_path / "book.xlsx"))
    assert [(f.code, f.place) for f in found] == [("M03", "Branch!M8")]


def test_separate_runs_from_one_origin_are_left_alone(tmp_path: Path) -> None:
    book = Workbook()
    book.remove(book.worksheets[0])
    for title, angle in (("One", 10.0), ("Two", 20.0)):
        _add(book, title, 0.05, (("A", 0.0, 0.0, 10.0, 0.3, 0.02), ("B", 50.0, angle, 10.0, 0.3, 0.02)))
    assert findings(stored(book, tmp_path / "book.xlsx")) == []


def test_one_run_under_several_conditions_is_left_alone(tmp_path: Path) -> None:
    book = _book(0.1, 0.03, 0.07)
    _add(book, "Main at night", 0.05, MAIN)
    assert findings(stored(book, tmp_path / "book.xlsx")) == []
