"""Formulas that fill more than one cell.

The embedded evaluator spills at most ten thousand cells and takes no notice of the
extent that the file gives an array formula. So each such formula is wrapped in a
private function that carries the number of its :class:`Area`: the whole result is kept
here, and the evaluator gets what its cells are to hold. A result too large to spill is
laid out in tiles, each with a formula of its own in the evaluation copy, wherever
other formulas read it.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from formualizer import Workbook

from ...cells import CellError, Grid
from ...xlsx.a1 import to_a1
from .host import Host, arguments, as_grid, engine_rows, engine_value, storable

SPILL_LIMIT = 10_000  # cells that the evaluator is willing to spill
AREA = "THRUSTBOOK.AREA"  # AREA(number, value)
CALL = "THRUSTBOOK.CALL"  # CALL(number, arguments of the one TB_ call...)
TILE = "THRUSTBOOK.TILE"  # TILE(number, first row, first column, upper left cell of the area)

Extent = tuple[int, int, int, int]
OUTSIDE = CellError("NA", "the array formula covers more cells than its result has")


@dataclass(slots=True, eq=False)
class Area:
    """One formula that may give several cells.

    ``function`` is set when the formula is one TB_ call and nothing else; ``leading``
    are then its first two arguments, wanted result and units. ``grid`` is
    the latest result, whole. ``tiled`` is the shape that the evaluation copy has tiles for.
    """

    number: int
    kind: str  # plain, array, dynamic
    row: int
    col: int
    ref: Extent | None
    function: str | None
    grid: Grid | None = None
    leading: tuple[Any, ...] = ()
    tiled: tuple[int, int] | None = None

    def expect(self) -> None:
        """Provide for a large result of the extent that the file gives: very likely it has that again."""
        if self.ref is not None:
            rows, cols = self.ref[2] - self.ref[0] + 1, self.ref[3] - self.ref[1] + 1
            if rows * cols > SPILL_LIMIT:
                self.tiled = rows, cols

    def settle(self, value: Any) -> Any:
        """Keep a result; return what the evaluator is to put in the cells."""
        grid = as_grid(value)
        if self.kind == "array" and self.ref is not None:
            r1, c1, r2, c2 = self.ref
            grid = fitted(grid, r2 - r1 + 1, c2 - c1 + 1)
        self.grid = grid
        if self.kind == "plain" or grid.size == 1:
            return engine_value(grid[0, 0])
        if self.tiled is not None:
            return self.tile(0, 0)
        return engine_value(grid[0, 0]) if self.large else engine_rows(grid)

    @property
    def large(self) -> bool:
        """Whether the result is too large for the evaluator to spill."""
        return self.kind != "plain" and self.grid is not None and self.grid.size > SPILL_LIMIT

    def _tile_shape(self) -> tuple[int, int]:
        assert self.tiled is not None
        cols = min(self.tiled[1], SPILL_LIMIT)
        return SPILL_LIMIT // cols, cols

    def tiles(self) -> dict[tuple[int, int], str]:
        """The formulas of all tiles but the first, by cell."""
        if self.tiled is None:
            return {}
        high, wide = self._tile_shape()
        anchor = to_a1(self.row, self.col, absolute=True)
        return {
            (self.row + row, self.col + col): f"{TILE}({self.number},{row},{col},{anchor})"
            for row in range(0, self.tiled[0], high)
            for col in range(0, self.tiled[1], wide)
            if row or col
        }

    def tile(self, row: int, col: int) -> Any:
        """What one tile is to hold."""
        if self.grid is None:
            return _engine_nothing()
        high, wide = self._tile_shape()
        part = self.grid[row : row + high, col : col + wide]
        return engine_rows(part) if part.size else _engine_nothing()

    def result(self) -> Grid:
        """What the cells of the formula are to hold."""
        if self.grid is None:
            return as_grid(CellError("VALUE", "the formula was not evaluated"))
        return storable(self.grid[:1, :1] if self.kind == "plain" else self.grid)

    def extent(self) -> Extent:
        """The cells that the latest result fills."""
        if self.kind == "array" and self.ref is not None:
            return self.ref
        if self.kind == "plain" or self.grid is None:
            return self.row, self.col, self.row, self.col
        rows, cols = self.grid.shape
        return self.row, self.col, self.row + rows - 1, self.col + cols - 1


def fitted(grid: Grid, rows: int, cols: int) -> Grid:
    """A result in an array formula of a given extent, as spreadsheets fit it.

    A single value, row or column is repeated; what is missing is #N/A; the rest is cut off.
    """
    if grid.shape == (rows, cols):
        return grid
    if grid.shape[0] == 1:
        grid = np.repeat(grid, rows, axis=0)
    if grid.shape[1] == 1:
        grid = np.repeat(grid, cols, axis=1)
    out = np.full((rows, cols), OUTSIDE, dtype=object)
    part = grid[:rows, :cols]
    out[: part.shape[0], : part.shape[1]] = part
    return out


def _engine_nothing() -> Any:
    return engine_value(CellError("NA", "there is no such part of the result"))


def register_areas(workbook: Workbook, host: Host, areas: list[Area]) -> None:
    """Register the two private functions."""

    def call(number: float, *values: Any) -> Any:
        area = areas[int(number)]
        area.leading = tuple(arguments(values[:2]))
        return area.settle(host.call(area.function or "", values))

    def keep(number: float, value: Any) -> Any:
        # A formula of the spreadsheet's own shows an empty cell as 0.
        return areas[int(number)].settle(0.0 if value is None else _without_blanks(value))

    def tile(number: float, row: float, col: float, _anchor: Any) -> Any:
        return areas[int(number)].tile(int(row), int(col))

    workbook.register_function(TILE, tile, min_args=4, max_args=4)
    workbook.register_function(CALL, call, min_args=1, max_args=None)
    workbook.register_function(AREA, keep, min_args=2, max_args=2)


def _without_blanks(value: Any) -> Any:
    if type(value) is not list:
        return value
    rows = value if value and type(value[0]) is list else [value]
    if all(None not in row for row in rows):
        return rows
    return [[0.0 if item is None else item for item in row] for row in rows]
