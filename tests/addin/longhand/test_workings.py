"""Every long-hand working against the engine: by the embedded evaluator and by LibreOffice."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import openpyxl
import pytest

from thrustbook.addin.catalogue.registry import CATALOGUE
from thrustbook.addin.catalogue.types import Longhand, Row
from thrustbook.addin.cells import Cell, CellError
from thrustbook.addin.dispatch import call
from thrustbook.addin.hosts.headless.plainvalues import evaluate_sheets
from thrustbook.addin.longhand.convert import Conversion
from thrustbook.addin.longhand.grid import Sheet
from thrustbook.addin.longhand.parts import Addition
from thrustbook.addin.longhand.rows import Group, Line, RowSheet
from thrustbook.addin.units import named_set
from thrustbook.addin.xlsx.package import Package

from .office import recalculated
from .samples import samples

COUNT = 210
TOLERANCE = 1e-9
ROWS = [row for row in CATALOGUE.values() if isinstance(row.longhand, Longhand)]


class Laid:
    """The calls of one function, laid out as a sheet of rows, and what the engine says."""

    def __init__(self, row: Row) -> None:
        self.row = row
        self.names = [r.name for r in row.results]
        sheet = Sheet(f"LH {row.name}")
        self.rows = RowSheet(row, sheet, self.names, "1E-9")
        self.engine: list[list[Any]] = []
        self.calls: list[tuple[str, list[Cell]]] = []
        for units, cells in samples(row, COUNT):
            unit_set = named_set(units)
            conversions = [
                None if arg.role == "choice" else Conversion.of(unit_set.unit(arg.role)) for arg in row.args
            ]
            results = {r.name: Conversion.of(unit_set.unit(r.role)) for r in row.results}
            line = Line("", "", lambda cells=cells: cells)
            self.rows.place(Group("", "", conversions, results, [line]))
            leading: list[Cell] = ["all", units] if row.has_result else [units]
            answer = call(row.name, [*leading, *cells])
            self.engine.append(list(answer[0]) if isinstance(answer, np.ndarray) else [answer])
            self.calls.append((units, cells))
        self.rows.write()

    def compare(self, value_at: Any) -> None:
        """Compare every result with the engine's."""
        compared = 0
        for i, (expected, (units, cells)) in enumerate(zip(self.engine, self.calls, strict=True)):
            for name, engine in zip(self.names, expected, strict=True):
                value = value_at(*self.rows.places[i][0][name])
                where = f"{self.row.name} {name} {units} {cells}: {value!r} against {engine!r}"
                if isinstance(engine, CellError):
                    assert not isinstance(value, float), where
                    continue
                assert isinstance(value, float | int), where
                # A result that is a difference of larger ones keeps their rounding, no more.
                others = [abs(x) for x in expected if isinstance(x, float)]
                assert abs(value - engine) <= TOLERANCE * abs(engine) + 1e-14 * max(others), where
                compared += 1
        assert compared >= 200 * max(1, len(self.names) - 2)


@pytest.fixture(scope="module")
def laid() -> dict[str, Laid]:
    return {row.name: Laid(row) for row in ROWS}


@pytest.fixture(scope="module")
def book(laid: dict[str, Laid], tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("workings")
    base = folder / "base.xlsx"
    openpyxl.Workbook().save(base)
    package = Package.read(base)
    parts = Addition(package, [one.rows.sheet for one in laid.values()]).parts(None)
    path = folder / "workings.xlsx"
    path.write_bytes(package.to_bytes(parts.replaced, parts.added))
    return path


@pytest.fixture(scope="module")
def embedded(laid: dict[str, Laid], book: Path) -> dict[str, Any]:
    extents = {
        one.rows.sheet.name: (one.rows.sheet.last_row, one.rows.sheet.last_col) for one in laid.values()
    }
    return evaluate_sheets(book.read_bytes(), extents)


@pytest.fixture(scope="module")
def office(book: Path) -> Any:
    return openpyxl.load_workbook(recalculated(book, book.parent), data_only=True)


@pytest.mark.parametrize("name", [row.name for row in ROWS])
def test_embedded_evaluator_agrees_with_the_engine(
    name: str, laid: dict[str, Laid], embedded: dict[str, Any]
) -> None:
    values = embedded[f"LH {name}"]
    laid[name].compare(lambda row, col: values[row][col - 1])


@pytest.mark.parametrize("name", [row.name for row in ROWS])
def test_libreoffice_agrees_with_the_engine(name: str, laid: dict[str, Laid], office: Any) -> None:
    sheet = office[f"LH {name}"]
    laid[name].compare(lambda row, col: sheet.cell(row, col).value)
