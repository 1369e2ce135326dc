"""The TB_ functions registered with the embedded evaluator, and the values in between."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from itertools import chain
from math import isfinite
from typing import Any

import numpy as np
from formualizer import LiteralValue, Workbook

from ...cells import Cell, CellError, ErrorKind, Grid, Scalar
from .formulas import OMITTED

# The evaluator's own words for errors.
_FROM_ENGINE: dict[str, ErrorKind] = {
    "Value": "VALUE",
    "Num": "NUM",
    "Na": "NA",
    "Div": "DIV0",
    "Ref": "REF",
    "Name": "NAME",
    "Null": "NULL",
    # A workbook file has no value of its own for these.
    "Spill": "VALUE",
    "Calc": "VALUE",
    "Circ": "VALUE",
    "NImpl": "NAME",
    "Error": "VALUE",
    "Cancelled": "VALUE",
}
_TO_ENGINE: dict[str, str] = {
    "VALUE": "Value",
    "NUM": "Num",
    "NA": "Na",
    "DIV0": "Div",
    "REF": "Ref",
    "NAME": "Name",
    "NULL": "Null",
}
_NOTHING = type(None)
_CLEAN_INSIDE = frozenset((float, bool, _NOTHING, str))
_CLEAN_OR_RANGE = _CLEAN_INSIDE | {list}
_ANSWERS = frozenset((float, bool, str))
_NO_VALUE = CellError("NA", "the function gave no value")
_NOT_FINITE = CellError("NUM", "the result is not a finite number")
_ERRORS = {word: CellError(kind) for word, kind in _FROM_ENGINE.items()}


@dataclass(frozen=True)
class Functions:
    """What may be called: ``call(name, arguments)``, and for each name whether it is a block function."""

    call: Callable[[str, Sequence[Cell]], Any]
    block: Mapping[str, bool]

    @classmethod
    def of_catalogue(cls) -> Functions:
        """Every function of the catalogue, through the one dispatcher."""
        from ... import dispatch
        from ...catalogue.registry import CATALOGUE

        return cls(dispatch.call, {name: row.block for name, row in CATALOGUE.items()})


def error_word(value: object) -> str | None:
    """The evaluator's word for an error value, None for any other value."""
    return str(value.get("kind")) if type(value) is dict else None


def scalar(value: Any) -> Scalar:
    """A single value of the evaluator as a cell value."""
    kind = type(value)
    if kind is float:
        return value if isfinite(value) else _NOT_FINITE
    if kind is str or kind is bool or value is None:
        return value  # type: ignore[no-any-return]
    if kind is int:
        return float(value)
    if kind is dict:
        return _ERRORS.get(value.get("kind", ""), _ERRORS["Value"])
    if kind is list:  # an array where a single value is meant: its top left corner
        return scalar(value[0][0] if type(value[0]) is list else value[0])
    return CellError("VALUE", f"the evaluator gave a value of an unknown kind ({kind.__name__})")


def _argument(value: Any) -> Cell:
    if type(value) is list:
        rows = value if value and type(value[0]) is list else [value]
        if set(map(type, chain.from_iterable(rows))) <= _CLEAN_INSIDE:
            return rows
        return [[scalar(item) for item in row] for row in rows]
    return None if value == OMITTED else scalar(value)


def arguments(values: Sequence[Any]) -> Sequence[Cell]:
    """The arguments of a call as cell values; the common case is handed on as it is."""
    kinds = set(map(type, values))
    if kinds <= _CLEAN_INSIDE:
        return values if OMITTED not in values else [_argument(item) for item in values]
    if kinds <= _CLEAN_OR_RANGE and OMITTED not in values:
        for value in values:
            if type(value) is list and not (
                value
                and type(value[0]) is list
                and set(map(type, chain.from_iterable(value))) <= _CLEAN_INSIDE
            ):
                break
        else:
            return values
    return [_argument(item) for item in values]


def engine_value(value: Any) -> Any:
    """A single cell value as the evaluator takes it."""
    kind = type(value)
    if kind is float:
        return value if isfinite(value) else _engine_error(_NOT_FINITE)
    if kind is str or kind is bool:
        return value
    if kind is CellError:
        return _engine_error(value)
    if value is None:
        return _engine_error(_NO_VALUE)
    if isinstance(value, np.generic):
        return engine_value(value.item())
    return float(value)


def _engine_error(error: CellError) -> Any:
    return LiteralValue.error(_TO_ENGINE[error.kind], error.message or None)


def engine_rows(grid: Grid) -> list[list[Any]]:
    """A grid as the evaluator takes it."""
    rows: list[list[Any]] = grid.tolist()
    kinds = set(map(type, chain.from_iterable(rows)))
    if kinds <= _ANSWERS and (float not in kinds or _finite(rows, kinds)):
        return rows
    return [[engine_value(item) for item in row] for row in rows]


def _finite(rows: list[list[Any]], kinds: set[type]) -> bool:
    if kinds == {float}:
        return bool(np.isfinite(np.array(rows, dtype=float)).all())
    return all(isfinite(item) for item in chain.from_iterable(rows) if type(item) is float)


def as_grid(value: Any) -> Grid:
    """Any answer of a function, or value of the evaluator, as a two-dimensional object array."""
    if isinstance(value, np.ndarray):
        grid = value if value.dtype == object else value.astype(object)
        return grid if grid.ndim == 2 else np.atleast_2d(grid)
    if type(value) is list:
        rows = value if value and type(value[0]) is list else [value]
        if not set(map(type, chain.from_iterable(rows))) <= _CLEAN_INSIDE:
            rows = [[scalar(item) for item in row] for row in rows]
        grid = np.empty((len(rows), len(rows[0])), dtype=object)
        grid[:] = rows
        return grid
    grid = np.empty((1, 1), dtype=object)
    grid[0, 0] = value
    return grid


def storable(grid: Grid) -> Grid:
    """A grid with nothing in it that a workbook cannot hold as a result."""
    flat = grid.ravel()
    kinds = set(map(type, flat))
    if kinds == {float}:
        if np.isfinite(flat.astype(float)).all():
            return grid
    elif kinds <= {float, str, bool, CellError} and all(
        isfinite(x) for x in flat.tolist() if type(x) is float
    ):
        return grid
    out = np.empty(grid.shape, dtype=object)
    out[:] = [[_storable(item) for item in row] for row in grid.tolist()]
    return out


def _storable(value: Any) -> Scalar:
    if value is None:
        return _NO_VALUE
    if isinstance(value, np.generic):
        value = value.item()
    return value if type(value) is CellError else scalar(value)


class Host:
    """Registers the functions with workbooks and remembers the last call that failed."""

    def __init__(self, functions: Functions, tick: Callable[[], None] | None = None) -> None:
        self.functions = functions
        self.last_error: tuple[str, CellError] | None = None
        self.gave_grid: set[str] = set()
        self.looking = False  # for the first error inside an array as well
        self._tick = tick

    def register(self, workbook: Workbook) -> None:
        """Register every function; the dispatcher itself judges the number of arguments."""
        for name in self.functions.block:
            workbook.register_function(name, self._callback(name), min_args=0, max_args=None)

    def call(self, name: str, values: Sequence[Any]) -> Any:
        """Call a function with values of the evaluator; the answer is the function's own."""
        if self._tick is not None:
            self._tick()
        if name not in self.functions.block:
            answer: Any = CellError("NAME", f"there is no function {name}")
        else:
            answer = self.functions.call(name, arguments(values))
        if type(answer) is CellError:
            self.last_error = (name, answer)
        return answer

    def _note(self, name: str, grid: Grid) -> None:
        self.gave_grid.add(name)
        if self.looking:
            error = next((item for item in grid.flat if type(item) is CellError), None)
            if error is not None:
                self.last_error = (name, error)

    def _callback(self, name: str) -> Callable[..., Any]:
        call, tick = self.functions.call, self._tick

        # Written for the single cell with plain arguments: some ten thousand of them are usual.
        def callback(*values: Any) -> Any:
            if tick is not None:
                tick()
            answer = call(name, arguments(values))
            kind = type(answer)
            if kind is float and isfinite(answer):
                return answer
            if kind is CellError:
                self.last_error = (name, answer)
                return _engine_error(answer)
            if isinstance(answer, (np.ndarray, list)):
                grid = as_grid(answer)
                self._note(name, grid)
                return engine_rows(grid) if grid.size > 1 else engine_value(grid[0, 0])
            return engine_value(answer)

        return callback
