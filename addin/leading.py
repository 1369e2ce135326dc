"""The leading arguments of a call: the wanted result and the unit set."""

from __future__ import annotations

import numpy as np

from .catalogue.types import Row
from .cells import Cell, CellError, Grid, Refused
from .tables import is_blank
from .units import UnitSet, unit_set


def result_name(row: Row, cell: Cell) -> str:
    """Read the wanted result; an exact name, or a unique one without regard to case."""
    if isinstance(cell, list) and len(cell) == 1 and len(cell[0]) == 1:
        cell = cell[0][0]
    if isinstance(cell, CellError):
        raise Refused(cell.kind, cell.message or f"result is the error {cell}")
    names = [r.name for r in row.results]
    special = ["all", "labels", "units"]
    if isinstance(cell, str):
        text = cell.strip()
        if text in names:
            return text
        loose = [n for n in special + names if n.lower() == text.lower()]
        if len(loose) == 1 or (loose and loose[0] in special):
            return loose[0]
    shown = "empty" if is_blank(cell) else f'"{cell}"' if isinstance(cell, str) else "not a word"
    raise Refused("VALUE", f"result is {shown} (allowed: {', '.join(special + names)})")


def read_units(cell: Cell) -> UnitSet:
    if isinstance(cell, CellError):
        raise Refused(cell.kind, cell.message or f"units is the error {cell}")
    if isinstance(cell, list):
        for line in cell:
            for entry in line:
                if isinstance(entry, CellError):
                    raise Refused(entry.kind, f"units: a cell is the error {entry}")
    return unit_set(cell)


def heading_row(row: Row, result: str, units: UnitSet) -> Grid:
    columns = [r for r in row.results if not r.alone]
    out = np.empty((1, len(columns)), dtype=object)
    for j, r in enumerate(columns):
        text = "" if r.role == "text" else units.symbol(r.role)
        out[0, j] = r.name if result == "labels" else text
    return out
