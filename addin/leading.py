"""The leading arguments of a call: the wanted result and the unit set."""

from __future__ import annotations

from typing import Literal, NamedTuple

import numpy as np

from .catalogue.types import Result, Row
from .cells import Cell, CellError, Grid, Refused
from .tables import is_blank
from .units import UnitSet, unit_set


class Wanted(NamedTuple):
    """What a call asks for."""

    form: Literal["values", "labels", "units"]
    results: tuple[Result, ...]
    single: bool
    """True where one result is asked for by its name."""


def wanted(row: Row, cell: Cell) -> Wanted:
    """Read the first argument of a row with several results.

    It is the name of a result, several names separated by commas, or "all". Behind
    "labels" or "units", and a colon where only some are wanted, it asks for the
    headings of those columns: ``"labels"``, ``"units: name, F"``. Case does not matter
    where it makes no difference.

    Raises
    ------
    Refused
        With the names there are.
    """
    if isinstance(cell, list) and len(cell) == 1 and len(cell[0]) == 1:
        cell = cell[0][0]
    if isinstance(cell, CellError):
        raise Refused(cell.kind, cell.message or f"result is the error {cell}")
    columns = tuple(r for r in row.results if not r.alone)
    if not isinstance(cell, str) or is_blank(cell):
        shown = "empty" if is_blank(cell) else "not a word"
        raise Refused("VALUE", f"result is {shown} (allowed: {_names(row)})")
    text = cell.strip()
    form, colon, rest = text.partition(":")
    heads: Literal["labels", "units"] | None = None
    if form.strip().lower() == "labels":
        heads = "labels"
    elif form.strip().lower() == "units":
        heads = "units"
    if heads and not colon:
        return Wanted(heads, columns, False)
    names = (rest if heads else text).split(",")
    if len(names) == 1 and names[0].strip().lower() == "all":
        return Wanted(heads or "values", columns, False)
    found = tuple(_result(row, name.strip()) for name in names)
    if len(found) > 1 and any(r.alone for r in found):
        lonely = next(r.name for r in found if r.alone)
        raise Refused("VALUE", f'result "{lonely}" stands alone, not in a list')
    return Wanted(heads or "values", found, heads is None and len(found) == 1)


def _names(row: Row) -> str:
    return ", ".join(["all", "labels", "units", *(r.name for r in row.results)])


def _result(row: Row, name: str) -> Result:
    for result in row.results:
        if result.name == name:
            return result
    loose = [r for r in row.results if r.name.lower() == name.lower()]
    if len(loose) == 1:
        return loose[0]
    raise Refused("VALUE", f'result is "{name}" (allowed: {_names(row)})')


def read_units(cell: Cell) -> UnitSet:
    """Read the unit set; an error in it is passed on."""
    if isinstance(cell, CellError):
        raise Refused(cell.kind, cell.message or f"units is the error {cell}")
    if isinstance(cell, list):
        for line in cell:
            for entry in line:
                if isinstance(entry, CellError):
                    raise Refused(entry.kind, f"units: a cell is the error {entry}")
    return unit_set(cell)


def heading_row(asked: Wanted, units: UnitSet) -> Grid:
    """Give the headings asked for, as one row of texts."""
    out = np.empty((1, len(asked.results)), dtype=object)
    for j, r in enumerate(asked.results):
        text = "" if r.role == "text" else units.symbol(r.role)
        out[0, j] = r.name if asked.form == "labels" else text
    return out
