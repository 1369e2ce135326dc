"""Inputs: one quantity that has two values in the same workbook."""

from __future__ import annotations

import math
from collections import Counter
from collections.abc import Callable, Iterator

from ..cells import Cell, Refused, Scalar
from ..figures import figure
from ..tables import find_column, heading, number
from ..units import UnitError, UnitSet, unit
from ..xlsx.a1 import to_a1
from .book import Book, Place
from .calls import Call, Given
from .gather import figures
from .relative import moving, of_own_row
from .sameinput import Input, LabelKey, Sameness
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
_MANY = 200
"""Cells of one label beyond which they are a table, however it is laid out."""


def two_values(book: Book) -> Iterator[Finding]:
    """D01: the same input is typed twice, with different values.

    Density, viscosity, ambient and vapour pressure count as the same input in the whole
    workbook unless labels tell several fluids apart. Any other two inputs of one label and
    kind of quantity are the same as :class:`Sameness` says. What a formula that was
    filled down or across reads from its own row or column is a table, not one input.
    """
    inputs = list(_inputs(book))
    groups: dict[str, list[Input]] = {}
    labelled: dict[LabelKey, list[Input]] = {}
    for item in inputs:
        if item.name in PROJECT_WIDE:
            generic = not item.label or item.label in PROJECT_WIDE[item.name]
            groups.setdefault(item.name if generic else f"{item.name} {item.label}", []).append(item)
        elif item.label:
            labelled.setdefault((item.role, item.label), []).append(item)
    sameness = Sameness(book, labelled)
    reported: set[Place] = set()
    for group in groups.values():
        yield from _contradictions(book, group, reported, lambda one, other: one.place != other.place)
    for group in labelled.values():
        if len({item.place for item in group}) <= _MANY:
            yield from _contradictions(book, group, reported, sameness.same)


def _contradictions(
    book: Book, group: list[Input], reported: set[Place], same: Callable[[Input, Input], bool]
) -> Iterator[Finding]:
    """The inputs that others of the group contradict: of two values the rarer is told, or the later."""
    counts: Counter[float] = Counter()
    of_place: dict[Place, tuple[Input, float]] = {}
    for item in group:
        near = next((v for v in counts if math.isclose(v, item.value, rel_tol=_CLOSE)), item.value)
        counts[near] += 1
        before = of_place.get(item.place)
        if before is None or (item.of_fitting and not before[0].of_fitting):
            of_place[item.place] = item, near
    ranked = [[item for item, v in of_place.values() if v == value] for value, _ in counts.most_common()]
    for item, rank in ((item, rank) for rank, items in enumerate(ranked) for item in items):
        other = next((o for items in ranked[:rank] for o in items if same(item, o)), None)
        if other is None or item.place in reported:
            continue
        reported.add(item.place)
        called = f'"{item.label}"' if item.label else item.name
        sheet, row, col = item.place
        yield Finding(
            "D01",
            Severity.WARNING,
            book.sheet(sheet),
            to_a1(row, col),
            f"{called} is {_shown(item)} here and {_shown(other)} in {book.name(other.place)}",
            f"Both are read as {item.name} by TB_ functions; one project has one value of it"
            + (", typed into the formula here." if item.literal else "."),
            f"{figures(item.value)} {figures(other.value)}",
        )


def _shown(item: Input) -> str:
    unit = f" {item.unit}" if isinstance(item.shown, float) and item.unit != "-" else ""
    return f"{figure(item.shown)}{unit}"


def _inputs(book: Book) -> Iterator[Input]:
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
) -> Iterator[Input]:
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
        of_fitting = call.row.family == "Fittings"
        symbol = units.unit(role).symbol
        yield Input(name, role, label, si, value, symbol, place, literal, n, of_fitting)


def _si(value: Scalar, name: str, role: str, units: UnitSet) -> float | None:
    try:
        si = number(value, name, role, units.unit(role))
    except (Refused, UnitError):
        return None
    return si if si == si else None


def _of_a_table(book: Book, call: Call, given: Given) -> bool:
    """Whether the reference moves along a formula that was filled down or across."""
    node = call.node
    moves = (True, False) if given.area and of_own_row(node, given.area) else moving(given.text)
    if moves is None:
        return False
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


def _start_block(call: Call, given: Given, value: Cell, units: UnitSet, n: int) -> Iterator[Input]:
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
            given_in = unit(own, column.role) if own else units.unit(column.role)
            si = number(line[1], name, column.role, given_in)
        except (Refused, UnitError, IndexError):
            continue
        place = (given.area.sheet, given.area.r1 + i, given.area.c1 + 1)
        yield Input(column.name, column.role, "", si, line[1], given_in.symbol, place, False, n, False)


RULES = (Rule("D01", "one input with two values", two_values),)
