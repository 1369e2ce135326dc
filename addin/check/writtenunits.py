"""Cells that functions read or fill as plain numbers, and the units written at them."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass
from typing import TYPE_CHECKING

from ..catalogue.types import Column
from ..cells import Cell, Refused, Scalar
from ..hosts.headless.dependency import Reference
from ..tables import find_column, heading, is_blank
from ..units import ROLES, Unit, UnitError, unit
from .calls import Call, Given
from .labels import Written

if TYPE_CHECKING:
    from .book import Book, Place

_PLAIN = ("ratio", "text", "choice", "table", "headings", "any")


@dataclass(frozen=True, slots=True)
class Met:
    """A call that reads or gives a cell in one unit, and what is written there."""

    call: Call
    place: Place
    role: str
    own: Unit
    written: Written
    agrees: bool

    @property
    def gives(self) -> bool:
        """Whether the cell is one that the call fills."""
        r1, c1, r2, c2 = self.call.node.extent()
        sheet, row, col = self.place
        return sheet == self.call.node.sheet and r1 <= row <= r2 and c1 <= col <= c2


def met(book: Book) -> Iterator[Met]:
    """Every cell of every call at which a unit is written; at its source where the cell is but a link."""
    for call in book.calls:
        for place, role, own in _quantities(book, call):
            near = _written(book, call, place, role, own)
            source = book.source(place) if near is None or near.agrees else None
            far = _written(book, call, source, role, own) if source not in (None, place) else None
            if near is not None and (far is None or far.agrees):
                yield near
            elif far is not None:
                yield far


def _written(book: Book, call: Call, place: Place | None, role: str, own: Unit) -> Met | None:
    written = book.around.written_unit(place, role) if place is not None else None
    if place is None or written is None:
        return None
    agrees = written.unit is not None and _equal(written.unit, own)
    return Met(call, place, role, own, written, agrees)


def _equal(one: Unit, other: Unit) -> bool:
    same_zero = one.shift == other.shift and one.offset == other.offset
    return same_zero and math.isclose(one.factor, other.factor, rel_tol=1e-9)


def _quantities(book: Book, call: Call) -> Iterator[tuple[Place, str, Unit]]:
    """Cells that a call reads or fills as plain numbers: place, role, and the unit it counts them in."""
    if call.row.name == "TB_CONVERT":
        yield from _converted(book, call)
    units = call.units
    if units is None:
        return
    heads: Cell = None
    before = ""
    for arg, given, value in call.arguments:
        if arg.role == "headings":
            heads = value
        if given.area is not None and arg.role == "table" and before == "headings":
            yield from _table(call, arg.columns, given, value, heads)
        elif given.area is not None and arg.name == "start":
            yield from _pairs(call, arg.columns, given, value)
        before = arg.role
        if given.area is not None and arg.role not in _PLAIN:
            for place in _tops(given):
                if isinstance(book.value(place), float):
                    yield place, arg.role, units.unit(arg.role)
    if call.shown:
        yield from _given_back(call)


def _converted(book: Book, call: Call) -> Iterator[tuple[Place, str, Unit]]:
    """What a conversion reads and gives; the first kind of quantity that both its units measure."""
    texts = [text for text in call.values[1:3] if isinstance(text, str)]
    for role in ROLES:
        try:
            units = [unit(text, role) for text in texts]
        except UnitError:
            continue
        area = call.given[0].area
        if len(units) == 2 and area is not None and isinstance(book.value(_first(area)), float):
            yield _first(area), role, units[0]
        node = call.node
        if len(units) == 2 and call.shown:
            yield (node.sheet, node.cell.row, node.cell.col), role, units[1]
        return


def _first(area: Reference) -> Place:
    return area.sheet, area.r1, area.c1


def _tops(given: Given) -> list[Place]:
    area = given.area
    assert area is not None
    return [(area.sheet, area.r1, col) for col in range(area.c1, area.c2 + 1)][:100]


def _given_back(call: Call) -> Iterator[tuple[Place, str, Unit]]:
    """The cells at the head of what a call gives."""
    node, units, asked = call.node, call.units, call.wanted
    if units is None or asked is None or asked.form != "values":
        return
    r1, c1, r2, c2 = node.extent()
    # Results stand side by side, but below each other where the inputs were one row.
    upright = call.row.kind == "table" or r2 == r1 or c2 - c1 + 1 == len(asked.results)
    for j, result in enumerate(asked.results):
        row, col = (r1, c1 + j) if upright else (r1 + j, c1)
        if result.role not in _PLAIN and row <= r2 and col <= c2:
            yield (node.sheet, row, col), result.role, units.unit(result.role)


def _table(
    call: Call, columns: tuple[Column, ...], given: Given, value: Cell, heads: Cell
) -> Iterator[tuple[Place, str, Unit]]:
    """The columns of a table; a unit in its headings goes before the unit set."""
    units, area = call.units, given.area
    assert units is not None
    assert area is not None
    if not isinstance(value, list):
        return
    if is_blank(heads):
        plan: list[tuple[Column, str | None] | None] = [(c, None) for c in columns[: len(value[0])]]
    elif isinstance(heads, list) and len(heads[0]) == len(value[0]):
        plan = [_column(heads, j, columns) for j in range(len(heads[0]))]
    else:
        return
    for j, entry in enumerate(plan):
        if entry is None or entry[0].role in _PLAIN or not any(isinstance(line[j], float) for line in value):
            continue
        column, own = entry
        try:
            expected = unit(own, column.role) if own else units.unit(column.role)
        except UnitError:
            continue
        yield (area.sheet, area.r1, area.c1 + j), column.role, expected


def _pairs(
    call: Call, columns: tuple[Column, ...], given: Given, value: Cell
) -> Iterator[tuple[Place, str, Unit]]:
    """The values of a block name | value | unit; a unit that the block itself holds goes first."""
    units, area = call.units, given.area
    assert units is not None
    assert area is not None
    for i, line in enumerate(value if isinstance(value, list) else []):
        if len(line) < 2 or not isinstance(line[1], float):
            continue
        found = _column([[line[0]]], 0, columns)
        if found is None or found[0].role in _PLAIN:
            continue
        column, own = found
        if len(line) > 2 and not is_blank(line[2]):
            own = str(line[2]).strip().strip("[]")
        try:
            expected = unit(own, column.role) if own else units.unit(column.role)
        except UnitError:
            continue
        yield (area.sheet, area.r1 + i, area.c1 + 1), column.role, expected


def _column(
    heads: list[list[Scalar]], j: int, columns: tuple[Column, ...]
) -> tuple[Column, str | None] | None:
    try:
        name, own = heading(heads[0][j])
        if not name:
            return None
        if len(heads) == 2 and not is_blank(heads[1][j]):
            own = str(heads[1][j]).strip().strip("[]")
        return find_column(name, columns, ""), own
    except Refused:
        return None
