"""Inputs: one quantity that has two values in the same workbook."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterator
from dataclasses import dataclass

from ..cells import Cell, Refused, Scalar
from ..figures import figure
from ..tables import find_column, heading, number
from ..units import UnitError, UnitSet, unit
from ..xlsx.a1 import to_a1
from .book import Book, Place
from .calls import Call, Given
from .gather import figures
from .relative import moving
from .types import Finding, Rule, Severity

PROJECT_WIDE = {
    "rho": {
        "rho",
        "ρ",
        "density",
        "density of the fluid",
        "fluid density",
        "density of water",
        "water density",
    },
    "mu": {"mu", "μ", "µ", "viscosity", "dynamic viscosity", "viscosity of water"},
    "pamb": {"pamb", "ambient pressure", "atmospheric pressure"},
    "pv": {"pv", "vapour pressure", "vapor pressure"},
}
"""Arguments that one project has once, with the labels that say no more than the argument's name."""

_CLOSE = 1e-9


@dataclass(frozen=True, slots=True)
class _Input:
    """A number that was typed, and the call that reads it."""

    name: str
    role: str
    label: str
    value: float
    """SI."""
    shown: Scalar
    place: Place
    literal: bool
    call: int


def two_values(book: Book) -> Iterator[Finding]:
    """D01: the same input is typed twice, with different values.

    Density, viscosity, ambient and vapour pressure count as the same input in the whole
    workbook unless labels tell several fluids apart. Any other two inputs are the same
    when label and kind of quantity are, and nothing but this input sets the
    calculations apart that read them: two calculations that each have their own flow and their own
    diameter are two calculations, not one with a contradiction. What a formula that was
    filled down or across reads from its own row or column is a table, not one input.
    """
    inputs = list(_inputs(book))
    reported: set[Place] = set()
    groups: dict[tuple[str, str], list[_Input]] = {}
    for item in inputs:
        if item.name in PROJECT_WIDE:
            generic = not item.label or item.label in PROJECT_WIDE[item.name]
            groups.setdefault(("", item.name if generic else f"{item.name} {item.label}"), []).append(item)
    for group in groups.values():
        yield from _contradictions(book, group, reported)
    labelled: dict[tuple[str, str], list[_Input]] = {}
    for item in inputs:
        if item.label and item.name not in PROJECT_WIDE:
            labelled.setdefault((item.role, item.label), []).append(item)
    reads: dict[int, dict[tuple[str, str], set[Place]]] = {}
    for key, group in labelled.items():
        for item in group:
            reads.setdefault(item.call, {}).setdefault(key, set()).add(item.place)
    for group in labelled.values():
        if len({item.place for item in group}) > 1 and not _separate(group, reads):
            yield from _contradictions(book, group, reported)


def _separate(group: list[_Input], reads: dict[int, dict[tuple[str, str], set[Place]]]) -> bool:
    """Whether the calls that read these inputs differ in another labelled input as well."""
    by_place: dict[Place, dict[tuple[str, str], set[Place]]] = {}
    for item in group:
        own = by_place.setdefault(item.place, {})
        for key, places in reads[item.call].items():
            own.setdefault(key, set()).update(places)
    sides = list(by_place.values())
    shared = set.intersection(*(set(side) for side in sides))
    apart = [key for key in shared if all(sides[0][key].isdisjoint(side[key]) for side in sides[1:])]
    return len(apart) > 1


def _contradictions(book: Book, group: list[_Input], reported: set[Place]) -> Iterator[Finding]:
    values: Counter[float] = Counter()
    first: dict[float, _Input] = {}
    for item in group:
        near = next((v for v in first if abs(v - item.value) <= _CLOSE * max(abs(v), abs(item.value))), None)
        key = item.value if near is None else near
        first.setdefault(key, item)
        values[key] += 1
    if len(first) < 2:
        return
    usual = values.most_common(1)[0][0]
    for item in group:
        if abs(item.value - usual) <= _CLOSE * max(abs(item.value), abs(usual)) or item.place in reported:
            continue
        reported.add(item.place)
        other = first[usual]
        called = f'"{item.label}"' if item.label else item.name
        sheet, row, col = item.place
        yield Finding(
            "D01",
            Severity.WARNING,
            book.sheet(sheet),
            to_a1(row, col),
            f"{called} is {figure(item.shown)} here and {figure(other.shown)} in {book.name(other.place)}",
            f"Both are read as {item.name} by TB_ functions; one project has one value of it"
            + (", typed into the formula here." if item.literal else "."),
            f"{figures(item.value)} {figures(other.value)}",
        )


def _inputs(book: Book) -> Iterator[_Input]:
    for n, call in enumerate(book.calls):
        units = call.units
        if units is None:
            continue
        for arg, given, value in call.arguments:
            if arg.name == "start" and arg.role == "table":
                yield from _start_block(call, given, value, units, n)
            elif arg.role not in ("text", "choice", "table", "headings", "any"):
                yield from _single(book, call, arg.name, arg.role, given, value, units, n)


def _single(
    book: Book, call: Call, name: str, role: str, given: Given, value: Cell, units: UnitSet, n: int
) -> Iterator[_Input]:
    if isinstance(value, list) or value is None or isinstance(value, bool):
        return
    node = call.node
    place, literal = (node.sheet, node.cell.row, node.cell.col), True
    label = ""
    if given.area is not None:
        source = book.source((given.area.sheet, given.area.r1, given.area.c1))
        if source is None or _of_a_table(book, call, given):
            return
        place, literal, label = source, False, book.around.label(source)
    elif not given.constant:
        return
    si = _si(value, name, role, units)
    if si is not None:
        yield _Input(name, role, label, si, value, place, literal, n)


def _si(value: Scalar, name: str, role: str, units: UnitSet) -> float | None:
    try:
        si = number(value, name, role, units.unit(role))
    except (Refused, UnitError):
        return None
    return si if si == si else None


def _of_a_table(book: Book, call: Call, given: Given) -> bool:
    """Whether the reference moves along a formula that was filled down or across."""
    moves = moving(given.text)
    if moves is None:
        return False
    node = call.node
    sheet, row, col = node.sheet, node.cell.row, node.cell.col
    own = book.signatures[node.index]
    for moves_this_way, places in (
        (moves[0], ((sheet, row - 1, col), (sheet, row + 1, col))),
        (moves[1], ((sheet, row, col - 1), (sheet, row, col + 1))),
    ):
        for place in places if moves_this_way else ():
            near = book.model.at.get(place)
            if near is not None and book.signatures.get(near.index) == own:
                return True
    return False


def _start_block(call: Call, given: Given, value: Cell, units: UnitSet, n: int) -> Iterator[_Input]:
    """The project-wide entries of a start block name | value | unit."""
    if given.area is None or not isinstance(value, list):
        return
    columns = next(arg.columns for arg in call.row.args if arg.name == "start")
    for i, line in enumerate(value):
        try:
            name, own = heading(line[0])
            column = find_column(name, columns, "start") if name else None
            if column is None or column.name not in PROJECT_WIDE or not isinstance(line[1], float):
                continue
            if len(line) > 2 and isinstance(line[2], str) and line[2].strip():
                own = line[2].strip().strip("[]")
            si = number(
                line[1], name, column.role, unit(own, column.role) if own else units.unit(column.role)
            )
        except (Refused, UnitError, IndexError):
            continue
        place = (given.area.sheet, given.area.r1 + i, given.area.c1 + 1)
        yield _Input(column.name, column.role, "", si, line[1], place, False, n)


RULES = (Rule("D01", "one input with two values", two_values),)
