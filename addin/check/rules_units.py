"""Units: one set on a sheet, and headings that say what the functions read and give."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterator
from typing import TypeAlias

from ..tables import is_blank
from ..units import ROLES, Unit
from ..xlsx.a1 import to_a1
from .book import Book, Place
from .calls import Call
from .gather import Remark, joined
from .types import Finding, Rule, Severity
from .writtenunits import Met

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
    """U01: calls on one sheet count the same kind of quantity in different units.

    A call that the units written at its cells contradict as well is told there, as U02.
    """
    told = {id(found[0].call) for found in _unlike(book)[1]}
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
        if not odd or id(call) in told:
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
    """U02: the unit written at a cell is not the one in which a function reads or gives it.

    The text is at fault, or the unit set of the call, where most that is written at its
    cells is of another set, or the text serves other calls well.
    """
    told: set[Place] = set()
    texts, sets = _unlike(book)
    for one in texts:
        if one.written.place in told:
            continue
        told.add(one.written.place)
        row, node = one.call.row.name, one.call.node
        text = one.written.text
        yield Finding(
            "U02",
            Severity.ERROR,
            book.sheet(one.written.place[0]),
            to_a1(*one.written.place[1:]),
            f'the unit written here is "{text}", but {row} {"gives" if one.gives else "reads"} '
            f"{to_a1(*one.place[1:])} in {one.own.symbol}",
            f"{book.name((node.sheet, node.cell.row, node.cell.col))} takes its units from its unit set, "
            "not from this text"
            + ("." if one.written.unit else f'; "{text}" is no unit of {ROLES[one.role].text} at all.'),
            f"{text} {one.own.symbol}",
        )
    yield from joined("U02", Severity.ERROR, (_of_call(book, found) for found in sets))


def _unlike(book: Book) -> tuple[list[Met], list[list[Met]]]:
    """What disagrees: texts, each with a call; and calls whose unit set is at fault, each with its cells."""
    of_call: dict[int, list[Met]] = {}
    votes: Counter[Place] = Counter()
    for one in book.written_units:
        of_call.setdefault(id(one.call), []).append(one)
        votes[one.written.place] += 1 if one.agrees else -1
    agreed = {one.written.place for found in of_call.values() for one in found if one.agrees}
    texts, sets = [], []
    for found in of_call.values():
        wrong = [one for one in found if not one.agrees]
        good = [one for one in wrong if one.written.place in agreed and votes[one.written.place] >= 0]
        if good or (len(wrong) > 1 and 2 * len(wrong) > len(found)):
            sets.append(wrong)
        else:
            texts += wrong
    return texts, sets


def _of_call(book: Book, found: list[Met]) -> Remark:
    call = found[0].call
    own = ", ".join(dict.fromkeys(f"{one.role} in {one.own.symbol}" for one in found))
    written = ", ".join(dict.fromkeys(f'"{one.written.text}"' for one in found))
    return Remark(
        sheet=book.sheet(call.node.sheet),
        row=call.node.cell.row,
        col=call.node.cell.col,
        kind=f"{own} {written}",
        what=f"{call.row.name} counts {own}, but at its cells is written {written}",
        why=f"The unit set of this call is not that of its cells ({book.name(found[0].written.place)}).",
        basis=f"{own} {written}",
    )


RULES = (
    Rule("U01", "unit sets mixed on a sheet", mixed),
    Rule("U02", "unit in a heading differs from the unit set", headings),
)
