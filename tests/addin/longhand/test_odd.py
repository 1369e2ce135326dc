"""Formulas around calls, and arguments that are computed in the formula: worked, detached, recalculated."""

from __future__ import annotations

from pathlib import Path

import openpyxl
import pytest

from thrustbook.addin.cells import Scalar
from thrustbook.addin.hosts.headless.evaluate import evaluate_workbook
from thrustbook.addin.longhand.detach import Detached
from thrustbook.addin.xlsx.package import Package

from .oddbook import FORMULAS, SHEET, area, make, place
from .office import recalculated
from .test_detach import changed, evaluated, same


@pytest.fixture(scope="module")
def book(tmp_path_factory: pytest.TempPathFactory) -> Path:
    return make(tmp_path_factory.mktemp("odd") / "odd.xlsx")


@pytest.fixture(scope="module")
def detached(book: Path) -> Detached:
    return Detached(Package.read(book))


def tables(book: Path) -> list[list[list[object]]]:
    """The values of every formula."""
    sheet = openpyxl.load_workbook(book, data_only=True)[SHEET]
    found = []
    for number in range(len(FORMULAS)):
        cells = sheet[area(number)]
        found.append([[c.value for c in line] for line in cells])
    return found


def test_every_formula_has_values(book: Path) -> None:
    for odd, table in zip(FORMULAS, tables(book), strict=True):
        rows, cols = odd.size or (1, 1)
        shown = [value for line in table for value in line]
        assert len(shown) == rows * cols
        assert all(isinstance(v, float | int) or not str(v).startswith("#") for v in shown), (odd, shown)


def test_the_evaluation_says_that_it_used_kept_values(book: Path) -> None:
    warnings = evaluate_workbook(Package.read(book)).warnings
    assert [warning for warning in warnings if "other workbooks" in warning]


def test_every_cell_is_worked_and_agrees(detached: Detached) -> None:
    found = detached.made.verdicts()
    other = {e.cell.a1: (word, e.trouble) for word, es in found.items() for e in es if word != "agrees"}
    assert other == {}
    assert len(found["agrees"]) == len(FORMULAS)
    assert not detached.frozen


def test_every_cell_of_an_array_is_compared(detached: Detached) -> None:
    by_place = {entry.cell.a1: entry for entry in detached.made.book.entries}
    for number, odd in enumerate(FORMULAS):
        entry = by_place[place(number)]
        rows, cols = odd.size or (1, 1)
        if entry.checks:
            assert len(entry.checks) == rows * cols, odd
        elif entry.rows is not None:
            shown = [ref for line in entry.rows.group.lines for ref in line.own.values()]
            assert len(shown) == rows * cols, odd
        else:
            assert entry.table is not None, odd


@pytest.mark.parametrize(
    "changes",
    [{}, {"A1": 0.15, "A3": 0.22, "B1": 4.0, "C1": 0.3, "L3": "350 kPa(a)", "E7": "175 mm"}],
)
def test_libreoffice_recalculates_the_detached_copy(
    book: Path, detached: Detached, changes: dict[str, Scalar], tmp_path: Path
) -> None:
    copy = tmp_path / "copy.xlsx"
    detached.save(copy)
    by_sheet = {SHEET: changes}
    with_engine = evaluated(changed(book, by_sheet, tmp_path / "engine.xlsx"))
    without = recalculated(changed(copy, by_sheet, tmp_path / "plain.xlsx"), tmp_path)
    for odd, one, other in zip(FORMULAS, tables(with_engine), tables(without), strict=True):
        assert same(one, other) + ("d=" in odd.text) > 0, odd
