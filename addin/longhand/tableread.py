"""Ranges of a table call read into what the checking sheets link to."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Any

from ..catalogue.types import Column
from ..cells import Refused
from ..tables import find_column, heading, is_blank, match_headings
from ..units import Unit, UnitError, unit
from .arguments import Argument, in_group, linked, own_unit, taken
from .calls import NotWorked, Refuses, Shape
from .convert import Conversion
from .grid import Content, Formula
from .outcomes import written
from .section import Entry
from .symbols import number, quoted

OfRole = Callable[[str], Conversion]


@dataclass(slots=True, eq=False)
class ReadTable:
    """A headed table: its columns in use, its rows that are not empty."""

    argument: Argument
    columns: list[tuple[Column, Conversion]]
    _at: dict[str, int]
    rows: list[int]
    """Rows of the range with anything in them, from 0."""
    size: int
    top: int = 0
    """Rows of the range in front of the first."""

    def content(self, row: int, name: str) -> Content | None:
        """What the sheet puts for a cell of the table."""
        column, conversion = next(c for c in self.columns if c[0].name == name)
        content, own = cell_content(self.argument, column, row + self.top, self._at[name])
        return in_group(content, own, conversion) if column.role != "text" else content

    def value(self, row: int, name: str) -> Any:
        """The stored value of a cell; None where the table has no such column."""
        at = self._at.get(name)
        return None if at is None else self.argument.value(row + self.top, at)

    def ref(self, row: int, name: str) -> str:
        """A reference to a cell of the table; "" for a constant or a column that it has not."""
        at, area = self._at.get(name), self.argument.area
        return "" if at is None or area is None else area.ref(row + self.top, at)

    def given(self, row: int) -> dict[str, Content | None]:
        return {column.name: self.content(row, column.name) for column, _ in self.columns}

    def whole_row(self, row: int) -> str:
        """A reference to one row of the range; "" for a constant."""
        area = self.argument.area
        if area is None:
            return ""
        last = area.ref(row + self.top, area.shape[1] - 1).rpartition("!")[2]
        return f"{area.ref(row + self.top, 0)}:{last}"


def cell_content(
    argument: Argument, column: Column, i: int, j: int
) -> tuple[Content | None, Conversion | None]:
    """The content for one cell of a table, and the unit that it brings."""
    if argument.area is None:
        value = argument.value(i, j)
        if is_blank(value):
            return None, None
        if isinstance(value, float):
            return value, None
        own = own_unit(str(value), column.role) if column.role != "text" else None
        if own is not None:
            return float(str(value).strip()[: -len(str(own.unit))].strip()), own
        return str(value), None
    if column.role == "text":
        return linked(argument.area.ref(i, j)), None
    return taken(argument, column, written, i, j)


def whole_table(table: Argument, columns: list[tuple[Column, Conversion]]) -> ReadTable:
    """A table without headings whose columns are all of it."""
    rows = _grid(table, "the range")
    used = [i for i, line in enumerate(rows) if not all(map(is_blank, line))]
    at = {column.name: j for j, (column, _) in enumerate(columns)}
    return ReadTable(table, columns, at, used, len(rows))


def read_headed(
    columns: Sequence[Column], heads: Argument, table: Argument, of_role: OfRole, what: str, top: int = 0
) -> ReadTable:
    """Read the headings of a table and find its rows in use."""
    rows = _grid(table, what)[top:]
    if not rows:
        raise NotWorked(f"{what} has no rows")
    found: list[tuple[Column, str | None] | None]
    downwards = False
    if heads.form == "empty":
        found = [(column, None) for column in columns[: len(rows[0])]]
        head_rows: list[list[Any]] = []
    else:
        head_rows = _grid(heads, "headings")[: 1 if top else None]
        if len(head_rows) > 2 and len(head_rows[0]) == 1:
            downwards, head_rows = True, [[line[0] for line in head_rows]]
        try:
            found = match_headings(columns, head_rows, len(rows[0]), what)
        except (Refused, UnitError) as error:
            raise Refuses(str(error)) from None
    chosen: list[tuple[Column, Conversion]] = []
    at: dict[str, int] = {}
    for j, entry in enumerate(found):
        if entry is None:
            continue
        column, own = entry
        conversion = Conversion("", 1.0)
        if column.role != "text":
            below = len(head_rows) == 2 and not is_blank(head_rows[1][j])
            place = (j, 0) if downwards else (int(below), j)
            conversion = _own_conversion(heads, place, own, column) if own else of_role(column.role)
        chosen.append((column, conversion))
        at[column.name] = j
    used = [i for i, line in enumerate(rows) if not all(is_blank(line[j]) for j in at.values())]
    return ReadTable(table, chosen, at, used, len(rows), top)


def _grid(argument: Argument, what: str) -> list[list[Any]]:
    if argument.values is None:
        raise NotWorked(f"{what} is an expression")
    return argument.values


def _own_conversion(heads: Argument, place: Shape, own: str, column: Column) -> Conversion:
    """The unit that a heading gives, kept only while the heading says so."""
    try:
        given = unit(own, column.role)
    except UnitError as error:
        raise Refuses(str(error)) from None
    if heads.area is None:
        return Conversion.of(given)
    return guarded(given, heads.area.ref(*place), str(heads.value(*place)))


def guarded(given: Unit, ref: str, text: str) -> Conversion:
    """A unit that a cell names: its factor holds while the cell says the same."""
    factor = f"IF(EXACT({ref},{quoted(text)}),{number(given.factor)},NA())"
    return Conversion(given.symbol, Formula(factor), given.shift, given.offset)


def read_block(columns: Sequence[Column], pairs: Argument, of_role: OfRole, what: str) -> list[Entry]:
    """Read a block name | value [| unit]."""
    entries = []
    for i, line in enumerate(_grid(pairs, what)):
        try:
            name, own = heading(line[0])
            if not name or len(line) < 2 or is_blank(line[1]):
                continue
            column = find_column(name, columns, what)
        except Refused as refusal:
            raise Refuses(str(refusal)) from None
        conversion = Conversion("", 1.0)
        if column.role != "text":
            conversion = _pair_conversion(pairs, line, i, own, column, of_role)
        entries.append(_pair_entry(pairs, column, i, conversion))
    return entries


def _pair_entry(pairs: Argument, column: Column, i: int, conversion: Conversion) -> Entry:

    def content() -> Content | None:
        found, own = cell_content(pairs, column, i, 1)
        return in_group(found, own, conversion) if column.role != "text" else found

    return Entry(column.name, column.text, column.role, content, conversion, str(pairs.value(i, 1)))


def _pair_conversion(
    pairs: Argument, line: list[Any], i: int, own: str | None, column: Column, of_role: OfRole
) -> Conversion:
    j = 0
    if len(line) > 2 and not is_blank(line[2]):
        own, j = str(line[2]).strip().strip("[]"), 2
    if own is None:
        return of_role(column.role)
    try:
        given = unit(own, column.role)
    except UnitError as error:
        raise Refuses(str(error)) from None
    return guarded(given, pairs.area.ref(i, j), str(line[j])) if pairs.area else Conversion.of(given)
