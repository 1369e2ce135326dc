"""TB_WORKING: the long-hand working of one call as a table of cells."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np

from thrustbook.engine.constants import P_ATM

from ..catalogue.registry import CATALOGUE, wording
from ..catalogue.types import Longhand, NoLonghand, Row
from ..cells import Cell, CellError, Grid, Refused, Scalar
from ..leading import read_units, wanted
from ..tables import column_from_si, is_blank, number
from .symbols import default_of, fill, shown, si_unit

HEADINGS = ("symbol", "meaning", "unit", "equation", "value")


def working(args: Sequence[Cell]) -> Cell | Grid:
    """Give the working of a call: its arguments in SI, the steps, the results in the call's units.

    ``args`` are the name of the function and then the arguments of the call. The steps are
    evaluated as worksheet formulas, not by the engine.

    Raises
    ------
    Refused
        Unknown function, no working, ranges; or whatever the call itself is refused for.
    """
    # Imported late: the dispatcher is assembled from the catalogue, which holds this function.
    from .. import dispatch

    row = _row(args[0] if args else None)
    cells = [_single(cell, row) for cell in args[1:]]
    outcome = dispatch.call(row.name, cells)
    if isinstance(outcome, CellError):
        return outcome
    cells += [None] * (row.leading + len(row.args) - len(cells))
    units = read_units(cells[row.leading - 1])
    results = row.results
    if row.has_result:
        asked = wanted(row, cells[0])
        if asked.form != "values":
            raise Refused("VALUE", f"result asks for {asked.form}, which have no working")
        results = asked.results
    values, table = _arguments(row, cells[row.leading :], units)
    longhand = row.longhand
    assert isinstance(longhand, Longhand)
    places = {arg.name: f"$A${i}" for i, arg in enumerate(row.args, 1)}
    formulas = []
    for i, step in enumerate(longhand.steps, 1):
        formulas.append(fill(step.formula, places.__getitem__))
        places[step.symbol] = f"$B${i}"
    from ..hosts.headless.plainvalues import evaluate_formulas

    steps = dict(zip((s.symbol for s in longhand.steps), evaluate_formulas(formulas, values), strict=True))
    for step in longhand.steps:
        table.append([step.symbol, step.text, si_unit(step.role), shown(step.formula), steps[step.symbol]])
    names = [arg.name for arg in row.args]
    ambient = values[names.index("pamb")] if "pamb" in names else P_ATM
    for result in results:
        symbol = longhand.results.get(result.name, result.name)
        value = steps[symbol]
        if isinstance(value, float):
            value = float(column_from_si(value, result.role, units, ambient))
        table.append([result.name, result.text, units.symbol(result.role), f"result: {symbol}", value])
    out = np.empty((len(table) + 1, len(HEADINGS)), dtype=object)
    out[0] = HEADINGS
    out[1:] = table
    return out


def _row(name: Cell) -> Row:
    if isinstance(name, list) and len(name) == 1 and len(name[0]) == 1:
        name = name[0][0]
    if isinstance(name, CellError):
        raise Refused(name.kind, name.message or f"name is the error {name}")
    if not isinstance(name, str) or is_blank(name):
        raise Refused("VALUE", 'name is not a word (allowed: a function, such as "TB_BEND")')
    row = CATALOGUE.get(name.strip().upper())
    if row is None:
        raise Refused("NAME", f"there is no function {name}")
    if isinstance(row.longhand, NoLonghand):
        raise Refused("NA", f"{row.name} has no long-hand working: {row.longhand.reason}")
    if not isinstance(row.longhand, Longhand):
        raise Refused("NA", f"{row.name} works tables: thrustbook longhand shows the working on sheets")
    return row


def _single(cell: Cell, row: Row) -> Cell:
    if isinstance(cell, list) and len(cell) == 1 and len(cell[0]) == 1:
        return cell[0][0]
    if isinstance(cell, list) and len(cell[0]) != 2 and len(cell[0]) != 3:
        raise Refused("VALUE", f"an argument of {row.name} is a range (allowed: single cells)")
    return cell


def _arguments(row: Row, cells: Sequence[Cell], units: Any) -> tuple[list[Scalar], list[list[Any]]]:
    """The arguments in SI, and their lines of the table."""
    values: list[Scalar] = []
    lines: list[list[Any]] = []
    names = [arg.name for arg in row.args]
    ambient = P_ATM
    if "pamb" in names:
        found = number(cells[names.index("pamb")], "pamb", "absolute", units.unit("absolute"))  # type: ignore[arg-type]
        ambient = P_ATM if found != found else found
    for arg, cell in zip(row.args, cells, strict=True):
        value: Scalar
        if isinstance(cell, list):
            raise Refused("VALUE", f"{arg.name} is a range (allowed: a single cell)")
        if is_blank(cell):
            value = default_of(row, arg)
            origin = f"not given: {arg.empty}" if arg.empty else "not given"
        elif arg.role == "choice":
            value, origin = str(cell).strip().lower(), "given"
        else:
            own = P_ATM if arg.name == "pamb" else ambient
            value, origin = number(cell, arg.name, arg.role, units.unit(arg.role), own), "given"
        values.append(value)
        lines.append([arg.name, wording(arg), si_unit(arg.role), origin, "" if value is None else value])
    return values, lines
