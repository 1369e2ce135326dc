"""Long-hand workings of tables against the engine, in the embedded evaluator and in LibreOffice."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import pytest

from thrustbook.addin.blocks.balance import PORT_COLUMNS
from thrustbook.addin.blocks.runread import CASE_COLUMNS, NODE_COLUMNS, START_COLUMNS
from thrustbook.addin.catalogue.types import Column, TableLonghand
from thrustbook.addin.catalogue.workings.balance import TB_BALANCE
from thrustbook.addin.catalogue.workings.runs import run_working
from thrustbook.addin.hosts.headless.evaluate import evaluate_workbook
from thrustbook.addin.longhand.detach import Detached
from thrustbook.addin.longhand.make import Made
from thrustbook.addin.longhand.section import unknown_names
from thrustbook.addin.xlsx.a1 import range_from_a1
from thrustbook.addin.xlsx.package import Package
from thrustbook.addin.xlsx.sheetxml import stored_values

from .office import recalculated
from .tablebook import make
from .test_detach import TEMPLATES, changed, evaluated, same

# The entries of a load case begin with c in the working.
CASES = tuple(Column(name=f"c{column.name}", role=column.role) for column in CASE_COLUMNS)
# Random calls of each table function.
COUNTS = {"runs": 200, "cases": 200, "schedules": 200, "balances": 200, "junctions": 200}


@pytest.fixture(scope="module")
def book(tmp_path_factory: pytest.TempPathFactory) -> tuple[Path, list[tuple[str, str]]]:
    """A workbook of random table calls with the engine's values."""
    path = tmp_path_factory.mktemp("tables") / "tables.xlsx"
    areas = make(path, COUNTS)
    package = Package.read(path)
    package.save(path, evaluate_workbook(package).replaced)
    return path, areas


@pytest.fixture(scope="module")
def made(book: tuple[Path, list[tuple[str, str]]]) -> Detached:
    return Detached(Package.read(book[0]))


def test_embedded_evaluator_agrees_with_the_engine(made: Detached) -> None:
    found = {word: [e.cell.where for e in entries] for word, entries in made.made.verdicts().items()}
    assert {word: places for word, places in found.items() if places and word != "agrees"} == {}
    assert len(found["agrees"]) >= sum(COUNTS.values())


def test_libreoffice_agrees_with_the_engine(
    book: tuple[Path, list[tuple[str, str]]], made: Detached, tmp_path: Path
) -> None:
    path, areas = book
    copy = tmp_path / "copy.xlsx"
    made.save(copy)
    engine, office = stored(path), stored(recalculated(copy, tmp_path))
    for sheet, area in areas:
        r1, c1, r2, c2 = range_from_a1(area)
        tables = [
            [[cells[sheet].get((r, c)) for c in range(c1, c2 + 1)] for r in range(r1, r2 + 1)]
            for cells in (engine, office)
        ]
        assert same(*tables) > 0, (sheet, area)


def stored(path: Path) -> dict[str, dict[tuple[int, int], Any]]:
    """The values of the sheets with the calls; the checking sheets would take long to read."""
    package = Package.read(path)
    calling = [sheet for sheet in package.sheets if sheet.name in COUNTS]
    return {s.name: stored_values(package.part(s.part), package.shared_strings) for s in calling}


def test_a_pressure_that_is_left_of_two_equal_levels_agrees(tmp_path: Path) -> None:
    """In pipes ten metres wide a few millipascals stand before the free end: rounding of the levels."""
    book = evaluated(changed(TEMPLATES / "pipe-run.xlsx", {"Inputs": {"E25": "in"}}, tmp_path / "wide.xlsx"))
    found = Made(Package.read(book)).verdicts()
    assert not found["differs"]
    assert len(found["agrees"]) == 18


@pytest.mark.parametrize(
    ("working", "columns"),
    [
        (run_working(solve, fluid), (*NODE_COLUMNS, *START_COLUMNS, *CASES))
        for solve in (True, False)
        for fluid in (True, False)
    ]
    + [(TB_BALANCE, (*PORT_COLUMNS, Column(name="rho", role="density")))],
)
def test_every_name_in_a_working_is_given(working: TableLonghand, columns: tuple[Column, ...]) -> None:
    assert unknown_names(working, {column.name for column in columns}) == set()
