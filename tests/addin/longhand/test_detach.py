"""Detached copies recalculated by LibreOffice, which has no extension here."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path
from typing import Any

import openpyxl
import pytest

from thrustbook.addin.cells import Scalar
from thrustbook.addin.hosts.headless.evaluate import evaluate_workbook
from thrustbook.addin.longhand.detach import Detached
from thrustbook.addin.xlsx.a1 import from_a1
from thrustbook.addin.xlsx.package import Package
from thrustbook.addin.xlsx.sheetxml import store

from .office import recalculated

TEMPLATES = Path(__file__).parents[3] / "workbooks"


def changed(book: Path, changes: Mapping[str, Mapping[str, Scalar]], target: Path) -> Path:
    """A copy of a workbook with other inputs; nothing is recalculated."""
    package = Package.read(book)
    parts = {sheet.name: sheet.part for sheet in package.sheets}
    replaced = {
        parts[name]: store(package.part(parts[name]), {from_a1(a1): value for a1, value in cells.items()})
        for name, cells in changes.items()
    }
    package.save(target, replaced)
    return target


def evaluated(book: Path) -> Path:
    package = Package.read(book)
    package.save(book, evaluate_workbook(package, fill_native=True).replaced)
    return book


def detached(book: Path, target: Path) -> Detached:
    made = Detached(Package.read(book))
    made.save(target)
    return made


def values(book: Path, sheet: str, area: str) -> list[list[Any]]:
    cells = openpyxl.load_workbook(book, data_only=True)[sheet][area]
    return [[cell.value for cell in line] for line in cells]


def same(one: list[list[Any]], other: list[list[Any]]) -> int:
    """Compare two tables; the number of numbers compared comes back."""
    count = 0
    # A number that is a difference of the larger ones keeps their rounding, no more.
    largest = max([1.0, *(abs(x) for line in one for x in line if isinstance(x, float))])
    for line, second in zip(one, other, strict=True):
        for a, b in zip(line, second, strict=True):
            if isinstance(a, float | int) and not isinstance(a, bool):
                assert isinstance(b, float | int), (a, b)
                assert abs(a - b) <= 1e-9 * abs(a) + 1e-13 * largest, (a, b)
                count += 1
            else:
                assert (a or "") == (b or ""), (a, b)
    return count


RUN, CASES = ("Run data", "A7:X30"), ("Cases data", "A7:R30")


@pytest.mark.parametrize(
    "changes",
    [
        {"Inputs": {"B8": 180.0}},
        {"Inputs": {"B8": 310.0, "D40": 77.5, "E30": 450.0, "D19": 105.0, "E21": 180.0}},
        {"Units": {"B6": "bar", "B8": "lbf", "B10": "rad"}, "Inputs": {"B8": 240.0, "J39": 20.0}},
    ],
)
def test_pipe_run_after_a_change(changes: dict[str, dict[str, Scalar]], tmp_path: Path) -> None:
    original = TEMPLATES / "pipe-run.xlsx"
    copy = tmp_path / "copy.xlsx"
    assert not [c for c in detached(original, copy).frozen if c.reason != "it is a text"]
    with_engine = evaluated(changed(original, changes, tmp_path / "engine.xlsx"))
    without = recalculated(changed(copy, changes, tmp_path / "plain.xlsx"), tmp_path)
    before = values(original, *RUN)
    for sheet, area in (RUN, CASES):
        assert same(values(with_engine, sheet, area), values(without, sheet, area)) > 100
    assert values(with_engine, *RUN) != before
