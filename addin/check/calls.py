"""The TB_ calls of a workbook: their arguments as texts, as cells and as values."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from functools import cached_property
from itertools import pairwise
from typing import TYPE_CHECKING

from ..catalogue.registry import CATALOGUE
from ..catalogue.types import Arg, Row
from ..cells import Cell, Refused
from ..hosts.headless.dependency import Reference
from ..hosts.headless.formulas import Kind, Part, Unreadable, function_name, take_apart
from ..hosts.headless.model import Node
from ..leading import Wanted, read_units, wanted
from ..longhand.calls import Call as Written
from ..longhand.calls import Items, NotWorked, all_calls, tree
from ..units import UnitError, UnitSet
from ..xlsx.a1 import MAX_COLUMN, MAX_ROW

if TYPE_CHECKING:
    from .book import Book


_PASSING = frozenset(
    (
        "ABS",
        "AVERAGE",
        "CEILING",
        "FLOOR",
        "IFERROR",
        "IFNA",
        "INT",
        "MAX",
        "MIN",
        "MROUND",
        "ROUND",
        "ROUNDDOWN",
        "ROUNDUP",
        "SUM",
        "TRUNC",
    )
)
"""Functions whose result has the unit of what they are given."""
_BEHIND = (Kind.COMMA, Kind.CLOSE, Kind.PAREN_CLOSE, Kind.LITERAL)


@dataclass(slots=True, eq=False)
class Given:
    """One argument as it stands in a formula. ``area`` is set where it is one cell or range."""

    text: str
    area: Reference | None
    constant: bool


@dataclass(eq=False)
class Call:
    """One call. ``values`` are its arguments as the dispatcher gets them.

    ``shown`` tells that the cell shows what the call gives: the formula is this call
    and nothing else, but for rounding, a sign, a sum or extreme, or a guard against errors.
    """

    node: Node
    row: Row
    given: list[Given]
    values: Sequence[Cell]
    shown: bool

    @property
    def arguments(self) -> Iterator[tuple[Arg, Given, Cell]]:
        """The arguments after result and units that were given, with what they are."""
        lead = self.row.leading
        return zip(self.row.args, self.given[lead:], self.values[lead:], strict=False)

    @cached_property
    def units(self) -> UnitSet | None:
        """The unit set of the call, None where it has none or it cannot be read."""
        if not self.row.has_units:
            return None
        position = self.row.leading - 1
        try:
            return read_units(self.values[position] if len(self.values) > position else None)
        except (Refused, UnitError):
            return None

    @cached_property
    def wanted(self) -> Wanted | None:
        """What the call asks for, None where that cannot be read."""
        if not self.row.has_result:
            return Wanted("values", self.row.results[:1], True)
        try:
            return wanted(self.row, self.values[0] if self.values else None)
        except Refused:
            return None

    @property
    def inputs(self) -> Sequence[Cell]:
        """All arguments but the wanted result."""
        return self.values[int(self.row.has_result) :]


def read_calls(book: Book) -> Iterator[Call]:
    """Every call of a function of the catalogue, formula by formula."""
    calling = [n for n in book.model.nodes if n.calls and n.index not in book.settlement.kept]
    for done, node in enumerate(calling):
        if done & 255 == 0:
            book.tell("read calls", done, len(calling))
        yield from _calls_of(book, node)


def _calls_of(book: Book, node: Node) -> Iterator[Call]:
    model, cell = book.model, node.cell
    sheet = model.sheet_names[node.sheet]
    try:
        parts = take_apart(model.tables.written_out(cell.text, sheet, cell.row, cell.col))
        items = tree(model.names.written_out(parts, sheet, cell.row, cell.col))
    except (Unreadable, NotWorked):
        return
    for n, written in enumerate(all_calls(items)):
        row = CATALOGUE.get(written.name)
        if row is None:
            continue
        given = [_given(book, node, argument) for argument in written.args]
        values = _values(book, node, given, n)
        if values is not None:
            yield Call(node, row, given, values, _shows(items, written))


def _shows(items: Items, call: Written) -> bool:
    """Whether a formula passes on what a call gives, in the same unit."""
    at = 0
    for item in items:
        if isinstance(item, Written) or not _passes(item):
            break
        at += 1
    if at == len(items) or items[at] is not call:
        return False
    rest = [item for item in items[at + 1 :] if isinstance(item, Written) or item.kind is not Kind.SPACE]
    return all(_follows(item, last) for last, item in pairwise([call, *rest]))


def _follows(item: Part | Written, last: Part | Written) -> bool:
    if isinstance(item, Written):
        return False
    sign = item.text == "-" and not isinstance(last, Written) and last.kind is Kind.COMMA
    return sign or item.kind in _BEHIND


def _passes(part: Part) -> bool:
    if part.kind is Kind.OPEN:
        return function_name(part.text) in _PASSING
    return part.kind in (Kind.PAREN_OPEN, Kind.SPACE) or part.text in ("@", "+", "-")


def _given(book: Book, node: Node, items: Items) -> Given:
    if len(items) != 1:
        text = "".join(item.text if isinstance(item, Part) else f"{item.name}()" for item in items)
        signed = len(items) == 2 and isinstance(items[0], Part) and items[0].text in ("-", "+")
        return Given(text, None, signed and _is_number(items[1]))
    only = items[0]
    if isinstance(only, Written):
        return Given(f"{only.name}()", None, False)
    if only.kind is Kind.REFERENCE:
        found = book.model.references([only], node)
        return Given(only.text, found[0] if len(found) == 1 else None, False)
    return Given(only.text, None, only.kind is Kind.LITERAL)


def _is_number(item: Part | Written) -> bool:
    return isinstance(item, Part) and item.kind is Kind.LITERAL and item.text[:1] in "0123456789."


def _values(book: Book, node: Node, given: Sequence[Given], number: int) -> list[Cell] | None:
    """The values of a call's arguments; what is not a constant or a cell is left to the evaluator."""
    out: list[Cell] = []
    for argument in given:
        known, value = _known(book, argument)
        if not known:
            return book.probe.arguments(node, number)
        out.append(value)
    return out


def _known(book: Book, given: Given) -> tuple[bool, Cell]:
    text, area = given.text, given.area
    if not text:
        return True, None
    if area is not None:
        if area.r2 == MAX_ROW or area.c2 == MAX_COLUMN:
            return False, None
        cells = book.values[area.sheet]
        if area.r1 == area.r2 and area.c1 == area.c2:
            return True, cells.get((area.r1, area.c1))
        columns = range(area.c1, area.c2 + 1)
        return True, [[cells.get((r, c)) for c in columns] for r in range(area.r1, area.r2 + 1)]
    if not given.constant:
        return False, None
    if text[0] == '"':
        return True, text[1:-1].replace('""', '"')
    try:
        return True, float(text)
    except ValueError:
        return False, None
