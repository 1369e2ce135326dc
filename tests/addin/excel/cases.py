"""Calls for the contract with xlwings: every function of the catalogue, with every kind of cell."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any, NamedTuple

from thrustbook.addin.catalogue.registry import CATALOGUE
from thrustbook.addin.catalogue.types import Row
from thrustbook.addin.cells import ERROR_TEXT, Cell, CellError
from thrustbook.addin.formula_text import read_call
from thrustbook.addin.units import ROLES

from .standins import ERRORS, MISSING, ExcelRange


class Omitted:
    """An argument left out, as against an empty cell."""


class RowConstant(list[Any]):
    """A row typed into the formula, {1,2,3}: Excel hands it over with one dimension only."""


class Case(NamedTuple):
    """One call: the cells of the formula, and whether Excel hands ranges over as references."""

    name: str
    label: str
    cells: tuple[Any, ...]
    by_reference: bool = False

    def expected_arguments(self) -> list[Cell]:
        """Give the arguments as the dispatcher is to see them."""
        return [
            None if isinstance(c, Omitted) else [list(c)] if isinstance(c, RowConstant) else c
            for c in self.cells
        ]

    def com_arguments(self) -> tuple[Any, ...]:
        """Give the arguments as COM hands them to xlwings."""
        return tuple(self._com(c) for c in self.cells)

    def _com(self, cell: Any) -> Any:
        if isinstance(cell, Omitted):
            return MISSING
        if isinstance(cell, RowConstant):
            return tuple(self._plain(c) for c in cell)
        if isinstance(cell, list):
            rows = tuple(tuple(self._plain(c) for c in line) for line in cell)
            return ExcelRange(rows) if self.by_reference else rows
        if self.by_reference and not isinstance(cell, str):
            return ExcelRange(self._plain(cell))
        return self._plain(cell)

    @staticmethod
    def _plain(cell: Any) -> Any:
        return ERRORS[ERROR_TEXT[cell.kind]] if isinstance(cell, CellError) else cell


def cases(row: Row) -> Iterator[Case]:
    """Give the calls of one function, all variations of the example in its row."""
    name, given = read_call(row.example)
    start = tuple(given)
    yield Case(name, "as in the example", start)
    yield Case(name, "by reference", start, by_reference=True)
    if row.max_args is not None:
        rest = row.max_args - len(start)
        yield Case(name, "the rest omitted", start + (Omitted(),) * rest)
        yield Case(name, "the rest empty cells", start + (None,) * rest)
        yield Case(name, "all omitted", (Omitted(),) * row.max_args)
    if row.has_result:
        for word in ("all", "labels", "units", "ALL", "no such result"):
            yield Case(name, f"result {word}", (word, *start[1:]))
    for i, cell in enumerate(start):
        for label, value in _values(row, i, cell):
            yield Case(name, f"argument {i + 1} {label}", (*start[:i], value, *start[i + 1 :]))
            if type(value) is list or value is None:
                changed = (*start[:i], value, *start[i + 1 :])
                yield Case(name, f"argument {i + 1} {label} by reference", changed, by_reference=True)


def _values(row: Row, i: int, cell: Any) -> Iterator[tuple[str, Any]]:
    yield "omitted", Omitted()
    yield "empty", None
    yield "empty text", ""
    yield "TRUE", True
    yield "text", "abc"
    yield "zero", 0.0
    yield "negative", -1.0e9
    yield "a cell", [[cell]] if not isinstance(cell, list) else cell[0][0]
    for kind in ERROR_TEXT:
        yield f"error {kind}", CellError(kind)
    if isinstance(cell, list):
        yield "with an error", [[*line[:-1], CellError("REF")] for line in cell]
        yield "with empty cells", [[*line[:-1], None] for line in cell]
        yield "first row only", cell[:1]
        yield "first column only", [line[:1] for line in cell]
        return
    yield "column", [[cell], [cell], [cell]]
    yield "row", [[cell, cell, cell]]
    yield "row constant", RowConstant([cell, CellError("NA"), cell])
    yield "table", [[cell, cell], [cell, cell]]
    yield "mixed column", [[cell], [None], [""], [True], ["abc"], [CellError("DIV0")], [cell]]
    yield "mixed row", [[cell, None, "", False, "abc", CellError("NA"), cell]]
    role = row.args[i - row.leading].role if i >= row.leading and i - row.leading < len(row.args) else ""
    if role in ROLES and isinstance(cell, float):
        yield "quantity as text", f"{cell} {ROLES[role].metric}"
        yield "quantities as text", [[f"{cell} {ROLES[role].us}"], [cell], ["5 lightyears"]]


def all_cases() -> list[Case]:
    """Give the calls of every function."""
    return [case for row in CATALOGUE.values() for case in cases(row)]
