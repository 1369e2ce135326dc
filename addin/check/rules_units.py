"""Units: one set on a sheet, and headings that say what the functions read and give."""

from __future__ import annotations

import math
from collections import Counter
from collections.abc import Iterator
from typing import TypeAlias

from ..catalogue.types import Column
from ..cells import Cell, Refused, Scalar
from ..tables import find_column, heading, is_blank
from ..units import ROLES, Unit, UnitError, unit
from ..xlsx.a1 import to_a1
from .book import Book, Place
from .calls import Call, Given
from .gather import Remark, joined
from .labels import Written
from .types import Finding, Rule, Severity

_PLAIN = ("ratio", "text", "choice", "table", "headings", "any")
_Key: TypeAlias = tuple[str, float, int, float]
"""A unit: its symbol, and what makes it that unit."""


def _roles(call: Call) -> set[str]:
    """The kinds of quantity that a call reads or gives."""
    roles = {arg.role for arg, _, value in call.arguments if not is_blank(value)}
    if call.wanted is not None and call.wanted.form != "labels":
        roles |= {r.role for r in call.wanted.results}
    for arg in call.row.args:
        roles |= {column.role for column in arg.columns if column.required}
    return {role for role in roles if role in ROLES and role != "ratio"}


def mixed(book: Book) -> Iterator[Finding]:
    """U01: calls on one sheet count the same kind of quantity in different units."""
    used: dict[tuple[int, str], Counter[_Key]] = {}
    sets: list[tuple[Call, dict[str, _Key]]] = []
    for call in book.calls:
        units = call.units
        if units is None:
            continue
        own = {}
        for role in _roles(call):
            own[role] = _key(units.unit(role))
            used.setdefault((call.node.sheet, role), Counter())[own[role]] += 1
        sets.append((call, own))
    usual = {key: counter.most_common(1)[0][0] for key, counter in used.items()}
    remarks = []
    for call, own in sets:
        sheet = call.node.sheet
        odd = sorted(role for role, key in own.items() if key[1:] != usual[sheet, role][1:])
        if not odd:
            continue
        unusual = ", ".join(f"{role} in {own[role][0]}" for role in odd)
        others = ", ".join(f"{role} in {usual[sheet, role][0]}" for role in odd)
        remarks.append(
            Remark(
                book.sheet(sheet),
                call.node.cell.row,
                call.node.cell.col,
                unusual,
                f"{call.row.name} counts {unusual}",
                f"The other functions of this sheet count {others}; one set of units on a sheet is safer.",
                f"{unusual} / {others}",
            )
        )
    yield from joined("U01", Severity.WARNING, remarks)


def _key(given: Unit) -> _Key:
    return given.symbol, given.factor, given.shift, given.offset


def headings(book: Book) -> Iterator[Finding]:
    """U02: the unit written at a cell is not the one in which a function reads or gives it."""
    seen: set[Place] = set()
    for call in book.calls:
        for place, role, own in _quantities(book, call):
            written = _unlike(book, place, role, own)
            if written is None:
                place = book.source(place) or place
                written = _unlike(book, place, role, own)
            if written is None or written.place in seen:
                continue
            seen.add(written.place)
            reads = book.name((call.node.sheet, call.node.cell.row, call.node.cell.col))
            direction = "gives" if place[:1] == (call.node.sheet,) and _is_result(call, place) else "reads"
            yield Finding(
                "U02",
                Severity.ERROR,
                book.sheet(written.place[0]),
                to_a1(*written.place[1:]),
                f'the unit written here is "{written.text}", but {call.row.name} {direction} '
                f"{to_a1(*place[1:])} in {own.symbol}",
                f"{reads} takes its units from its unit set, not from this text"
                + ("." if written.unit else f'; "{written.text}" is no unit of {ROLES[role].text} at all.'),
                f"{written.text} {own.symbol}",
            )


def _unlike(book: Book, place: Place, role: str, own: Unit) -> Written | None:
    """The unit written at a cell, where it is another than its own."""
    written = book.around.written_unit(place, role)
    same = written is None or (written.unit is not None and _equal(written.unit, own))
    return None if same else written


def _equal(one: Unit, other: Unit) -> bool:
    same_zero = one.shift == other.shift and one.offset == other.offset
    return same_zero and math.isclose(one.factor, other.factor, rel_tol=1e-9)


def _is_result(call: Call, place: Place) -> bool:
    r1, c1, r2, c2 = call.node.extent()
    return r1 <= place[1] <= r2 and c1 <= place[2] <= c2


def _quantities(book: Book, call: Call) -> Iterator[tuple[Place, str, Unit]]:
    """Cells that a call reads or fills as plain numbers: place, role, and the unit it counts them in."""
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


RULES = (
    Rule("U01", "unit sets mixed on a sheet", mixed),
    Rule("U02", "unit in a heading differs from the unit set", headings),
)
