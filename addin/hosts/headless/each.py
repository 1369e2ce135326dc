"""Functions of single values, worked value by value over ranges and arrays.

Every value is computed by the evaluator's own function, in a sheet beside: one row for each.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any, Final

from formualizer import LiteralValue, Workbook

from ...xlsx.a1 import column_letters, to_a1
from .formulas import OMITTED
from .host import engine_value, scalar
from .singlevalues import HANDS_ON, one_by_one

EACH: Final = "THRUSTBOOK.EACH"  # EACH(name of the function, its arguments...)

_AT_A_TIME: Final = 10_000  # rows; more would take more memory and no less time
_NA: Final = {"type": "Error", "kind": "Na"}

Rows = list[list[Any]]


def register_each(workbook: Workbook) -> None:
    """Register the private function."""
    workbook.register_function(EACH, each, min_args=2, max_args=None)


def each(name: str, *values: Any) -> Any:
    """What a function gives for each of the values that stand at places of single ones.

    A single row or column is repeated along the others; where an argument has no value at
    all the result is #N/A, as in a spreadsheet. Arguments that are ranges are handed on whole.
    """
    along = sorted(position for position in one_by_one(name, len(values)) if type(values[position]) is list)
    grids = [_rows(values[position]) for position in along]
    height = max((len(grid) for grid in grids), default=1)
    width = max((len(grid[0]) for grid in grids), default=1)
    calls = [tuple(_at(grid, row, col) for grid in grids) for row in range(height) for col in range(width)]
    known: dict[Any, Any] = {}
    for call in calls:
        known.setdefault(_key(call), call)
    results = dict(zip(known, _worked(name, values, along, list(known.values())), strict=True))
    flat = [results[_key(call)] for call in calls]
    rows = [flat[start : start + width] for start in range(0, len(flat), width)]
    return rows if height * width > 1 else rows[0][0]


def _rows(value: Any) -> Rows:
    rows: Rows = value if value and type(value[0]) is list else [value]
    return rows


def _at(grid: Rows, row: int, col: int) -> Any:
    row, col = (0 if len(grid) == 1 else row), (0 if len(grid[0]) == 1 else col)
    return grid[row][col] if row < len(grid) and col < len(grid[0]) else _NA


def _key(call: tuple[Any, ...]) -> tuple[Any, ...]:
    return tuple((type(item), item["kind"] if type(item) is dict else item) for item in call)


def _worked(name: str, values: Sequence[Any], along: list[int], calls: list[tuple[Any, ...]]) -> list[Any]:
    out: list[Any] = []
    for start in range(0, len(calls), _AT_A_TIME):
        out += _Beside(name, values, along).work(calls[start : start + _AT_A_TIME])
    return out


class _Beside:
    """A workbook with the arguments that stay, and a row for each call."""

    def __init__(self, name: str, values: Sequence[Any], along: list[int]) -> None:
        self._workbook = Workbook()
        self._workbook.set_temporal_egress("serial")
        self._workbook.add_sheet("Each")
        self._name, self._width = name, len(along)
        self._arguments: list[str] = []
        for position, value in enumerate(values):
            if position in along:
                self._arguments.append("$" + column_letters(along.index(position) + 1) + "{row}")
            elif type(value) is str and value == OMITTED:
                self._arguments.append("")
            else:
                self._arguments.append(
                    self._stays(f"Arg{position}", _rows(value) if type(value) is list else [[value]])
                )

    def _stays(self, sheet: str, rows: Rows) -> str:
        self._workbook.add_sheet(sheet)
        self._workbook.set_values_batch(sheet, 1, 1, rows)
        last = to_a1(len(rows), len(rows[0]), absolute=True)
        return f"{sheet}!$A$1" + ("" if last == "$A$1" else f":{last}")

    def work(self, calls: Sequence[tuple[Any, ...]]) -> list[Any]:
        """The results, ready for the evaluator."""
        book, col, count = self._workbook, self._width + 1, len(calls)
        if self._width:
            book.set_values_batch("Each", 1, 1, [list(call) for call in calls])
        call = f"{self._name}({','.join(self._arguments)})"
        found = self._column(col, "=" + call, count)
        # A formula shows an empty cell as 0; only here it can be told from one.
        blank = self._column(col + 2, f"=ISBLANK({call})", count) if self._name in HANDS_ON else []
        for number, value in enumerate(blank):
            if value is True:
                found[number] = None
        return [None if value is None else self._ready(value) for value in found]

    def _column(self, col: int, text: str, count: int) -> list[Any]:
        """Evaluate a formula in every row."""
        book = self._workbook
        formulas = [[text.replace("{row}", str(row))] for row in range(1, count + 1)]
        book.set_formulas_batch("Each", 1, col, formulas)
        # A call that gives several values must not pass for its first one: there is no room for more.
        book.set_values_batch("Each", 1, col + 1, [[0.0]] * (count + 1))
        book.set_value("Each", count + 1, col, 0.0)
        return list(book.evaluate_cells([("Each", row, col) for row in range(1, count + 1)]))

    @staticmethod
    def _ready(value: Any) -> Any:
        if type(value) is list:
            return LiteralValue.error("Value", None)
        return engine_value(scalar(value))
