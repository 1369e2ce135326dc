"""Reading worksheet ranges: columns of cells to arrays in SI units.

The only place where a cell becomes a number of the engine. A cell that cannot
be read gives an error for its own row and leaves the others alone.
"""

from __future__ import annotations

import difflib
import re
from collections.abc import Sequence
from dataclasses import dataclass, field
from operator import itemgetter
from typing import Any, NamedTuple

import numpy as np
import numpy.typing as npt

from thrustbook.engine.constants import P_ATM

from .catalogue.types import Column
from .cells import Cell, CellError, Refused, Scalar
from .units import Unit, UnitError, UnitSet, quantity, unit

_PLAIN = {float, int, type(None)}


def is_blank(cell: object) -> bool:
    """Tell an empty cell; empty text is what a spreadsheet's own formula leaves behind."""
    return cell is None or (isinstance(cell, str) and not cell.strip())


def number(cell: Scalar, name: str, role: str, given: Unit, ambient: float = P_ATM) -> float:
    """Read one cell as an SI number; NaN where it is empty.

    Raises
    ------
    Refused
        #VALUE! for text or a logical value; the cell's own error for an error.
    """
    if type(cell) is float or type(cell) is int:
        if cell != cell:
            raise Refused("NUM", f"{name} is not a number")
        si = cell * given.factor + given.offset
        return si + given.shift * ambient if given.shift else si
    if is_blank(cell):
        return np.nan
    if isinstance(cell, CellError):
        raise Refused(cell.kind, cell.message or f"{name} is the error {cell}")
    if isinstance(cell, bool):
        raise Refused("VALUE", f"{name} = {str(cell).upper()} (allowed: a number)")
    if isinstance(cell, str):
        try:
            value, shift = quantity(cell, role)
        except UnitError as error:
            raise Refused("VALUE", f"{name}: {error}") from None
        return value + shift * ambient
    return float(cell or 0.0) * given.factor + given.offset + given.shift * ambient  # numpy scalars


class LongTable(list[list[Scalar]]):
    """The rows of a long range whose host had its columns, so that they need not be made again.

    A column is a float array where all its cells are numbers.
    """

    columns: Sequence[Any]


def numbers(
    cells: Sequence[Scalar] | npt.NDArray[np.float64],
    name: str,
    role: str,
    given: Unit,
    ambient: float = P_ATM,
) -> tuple[npt.NDArray[np.float64], dict[int, CellError]]:
    """Read many cells as SI numbers; NaN where empty or unreadable, with the errors by position."""
    errors: dict[int, CellError] = {}
    if isinstance(cells, np.ndarray) or set(map(type, cells)) <= _PLAIN:
        values = np.array(cells, dtype=float)
        values *= given.factor
        if given.shift or given.offset:
            values += given.shift * ambient + given.offset
        return values, errors
    values = np.empty(len(cells))
    for i, cell in enumerate(cells):
        try:
            values[i] = number(cell, name, role, given, ambient)
        except Refused as refusal:
            errors[i] = refusal.error
            values[i] = np.nan
    return values, errors


def as_range(cell: Cell, name: str) -> list[list[Scalar]]:
    """Take an argument that must be a range; a single cell counts as a range of one."""
    if isinstance(cell, CellError):
        raise Refused(cell.kind, cell.message or f"{name} is the error {cell}")
    if cell is None:
        raise Refused("VALUE", f"{name} is empty (allowed: a range)")
    return cell if isinstance(cell, list) else [[cell]]


_HEADING = re.compile(r"^\s*(.*?)\s*(?:\[([^\]]*)\])?\s*$", re.S)


class Heading(NamedTuple):
    """A heading cell, taken apart."""

    name: str
    unit: str | None


def heading(cell: Scalar) -> Heading:
    """Split a heading such as "D1 [mm]" into its name and unit."""
    if isinstance(cell, CellError):
        raise Refused(cell.kind, cell.message or f"a heading is the error {cell}")
    match = _HEADING.match("" if cell is None else str(cell))
    assert match
    return Heading(match[1], match[2])


def find_column(name: str, columns: Sequence[Column], what: str) -> Column:
    """Find a column by heading: exact symbol first, then without regard to case where that is unique."""
    for column in columns:
        if column.name == name:
            return column
    loose = [c for c in columns if c.name.lower() == name.lower()]
    if len(loose) == 1:
        return loose[0]
    near = difflib.get_close_matches(name, [c.name for c in columns], n=3, cutoff=0.5)
    hint = f"; did you mean {', '.join(near)}?" if near else ""
    raise Refused(
        "VALUE",
        f'{what}: heading "{name}" is not known (allowed: {", ".join(c.name for c in columns)}){hint}',
    )


@dataclass(slots=True)
class Table:
    """A table read from cells."""

    size: int
    numbers: dict[str, npt.NDArray[np.float64]] = field(default_factory=dict)
    texts: dict[str, list[str]] = field(default_factory=dict)
    errors: dict[int, CellError] = field(default_factory=dict)
    blank: npt.NDArray[np.bool_] = field(default_factory=lambda: np.zeros(0, bool))

    def number(self, name: str, fallback: float = np.nan) -> npt.NDArray[np.float64]:
        """Give a number column, NaN filled with the fallback; a column not in the table is all fallback."""
        found = self.numbers.get(name)
        if found is None:
            return np.full(self.size, fallback)
        return found if fallback != fallback else np.where(np.isnan(found), fallback, found)

    def text(self, name: str) -> list[str]:
        """Give a text column; a column not in the table is all empty."""
        return self.texts.get(name) or [""] * self.size


def _column_unit(column: Column, own: str | None, units: UnitSet, what: str) -> Unit:
    try:
        return unit(own, column.role) if own else units.unit(column.role)
    except UnitError as error:
        raise Refused("VALUE", f"{what}: column {column.name}: {error}") from None


def read_table(
    columns: Sequence[Column],
    headings: Cell,
    table: Cell,
    units: UnitSet,
    *,
    what: str = "table",
    ambient: float = P_ATM,
) -> Table:
    """Read a headed table.

    ``headings`` is one row of names (with a unit in brackets, "D1 [mm]", where it
    differs from the unit set), or two rows of which the second holds units. A
    column whose heading is empty is ignored.

    Raises
    ------
    Refused
        Unknown, doubled or missing headings, unit of the wrong dimension, empty table.
    """
    rows = as_range(table, what)
    found = match_headings(columns, as_range(headings, "headings"), len(rows[0]), what)
    present = {entry[0].name for entry in found if entry}
    missing = [c.name for c in columns if c.required and c.name not in present]
    if missing:
        raise Refused("VALUE", f"{what}: column {', '.join(missing)} is missing")
    out = Table(size=len(rows))
    for j, entry in enumerate(found):
        if entry is None:
            continue
        column, own = entry
        values = rows.columns[j] if isinstance(rows, LongTable) else list(map(itemgetter(j), rows))
        if column.role == "text":
            out.texts[column.name] = _texts(values, out.errors)
            continue
        given = _column_unit(column, own, units, what)
        out.numbers[column.name], errors = numbers(values, column.name, column.role, given, ambient)
        for i, error in errors.items():
            out.errors.setdefault(i, error)
    out.blank = _blank_rows(out)
    if out.blank.all():
        raise Refused("VALUE", f"{what} is empty")
    return out


def _blank_rows(table: Table) -> npt.NDArray[np.bool_]:
    blank = np.ones(table.size, bool)
    for values in table.numbers.values():
        blank &= np.isnan(values)
    blank[list(table.errors)] = False
    for i in np.flatnonzero(blank).tolist():  # few: most rows have a number
        blank[i] = all(not texts[i].strip() for texts in table.texts.values())
    return blank


def _texts(values: Sequence[Scalar], errors: dict[int, CellError]) -> list[str]:
    if isinstance(values, np.ndarray):
        values = values.tolist()
    kinds = set(map(type, values))
    if kinds == {str}:
        return list(values)  # type: ignore[arg-type]
    if CellError in kinds:
        for i, value in enumerate(values):
            if isinstance(value, CellError):
                errors.setdefault(i, value)
    return ["" if v is None else v if isinstance(v, str) else _plain_text(v) for v in values]


def _plain_text(value: Scalar) -> str:
    if isinstance(value, float) and value.is_integer() and abs(value) < 1e15:
        return str(int(value))
    return str(value)


def match_headings(
    columns: Sequence[Column], rows: list[list[Scalar]], width: int, what: str
) -> list[tuple[Column, str | None] | None]:
    """Find the column, and its unit, that each heading of a range names; None for an empty heading.

    ``rows`` are one row of names, or names and units. Raises Refused.
    """
    if len(rows) > 2:
        if len(rows[0]) == 1 and len(rows) == width:  # headings written downwards
            rows = [[row[0] for row in rows]]
        else:
            raise Refused("VALUE", f"headings have {len(rows)} rows (allowed: names, or names and units)")
    if len(rows[0]) != width:
        raise Refused("VALUE", f"headings have {len(rows[0])} columns but the {what} has {width}")
    found: list[tuple[Column, str | None] | None] = []
    seen: set[str] = set()
    for j, cell in enumerate(rows[0]):
        name, own = heading(cell)
        if not name:
            found.append(None)
            continue
        column = find_column(name, columns, what)
        if column.name in seen:
            raise Refused("VALUE", f"{what}: column {column.name} is given twice")
        seen.add(column.name)
        if len(rows) == 2 and not is_blank(rows[1][j]):
            below = str(rows[1][j]).strip().strip("[]")
            if own and own != below:
                raise Refused("VALUE", f"{what}: column {column.name} has two units, {own} and {below}")
            own = below
        found.append((column, None if column.role == "text" else own))
    return found


def read_pairs(
    columns: Sequence[Column], cell: Cell, units: UnitSet, *, what: str, ambient: float = P_ATM
) -> dict[str, float | str]:
    """Read a two- or three-column range name | value [| unit]; what is empty is left out.

    Raises
    ------
    Refused
        Unknown or doubled names, unreadable values, required names missing.
    """
    out: dict[str, float | str] = {}
    for row in as_range(cell, what):
        name, own = heading(row[0])
        if not name:
            continue
        if len(row) < 2:
            raise Refused("VALUE", f"{what} has one column (allowed: name | value, or name | value | unit)")
        column = find_column(name, columns, what)
        if column.name in out:
            raise Refused("VALUE", f"{what}: {column.name} is given twice")
        value = row[1]
        if is_blank(value):
            continue
        if isinstance(value, CellError):
            raise Refused(value.kind, value.message or f"{what}: {column.name} is the error {value}")
        if column.role == "text":
            out[column.name] = _plain_text(value).strip()
            continue
        if len(row) > 2 and not is_blank(row[2]):
            own = str(row[2]).strip().strip("[]")
        given = _column_unit(column, own, units, what)
        out[column.name] = number(value, column.name, column.role, given, ambient)
    missing = [c.name for c in columns if c.required and c.name not in out]
    if missing:
        raise Refused("VALUE", f"{what}: {', '.join(missing)} is missing")
    return out


def column_from_si(values: Any, role: str, units: UnitSet, ambient: Any = P_ATM) -> Any:
    """Turn SI results, a float or an array, into the unit set's unit."""
    given = units.unit(role)
    if given.shift or given.offset:
        values = values - (given.shift * ambient + given.offset)
    out = values / given.factor
    return out + 0.0  # no negative zero reaches a cell
