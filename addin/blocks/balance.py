"""TB_BALANCE: the general momentum balance, its ports read from a table."""

from __future__ import annotations

import math
import re
from typing import Final

import numpy as np

from thrustbook.engine.balance import CLOSURE_TOLERANCE, Array
from thrustbook.engine.balance import balance as momentum_balance
from thrustbook.engine.errors import OutOfRange, Problem

from ..catalogue.types import Column
from ..cells import Cell, CellError, Refused
from ..failures import in_units, kind_of
from ..tables import Table, number, read_table
from .types import TableAnswer, TableCall

PORT_COLUMNS: Final = (
    Column(name="nx", role="ratio", text="outward normal along x", required=True),
    Column(name="ny", role="ratio", text="outward normal along y", required=True),
    Column(name="nz", role="ratio", text="outward normal along z", required=True),
    Column(name="D", role="diameter", text="diameter of the port", empty="A is given"),
    Column(name="p", role="pressure", text="gauge pressure at the port", required=True),
    Column(name="Q", role="flow", text="flow out through the port, negative into the fitting", required=True),
    Column(name="beta", role="ratio", text="momentum correction at the port", empty="1"),
    Column(name="A", role="area", text="area of a port that is not circular", empty="D is given"),
)


def balance(call: TableCall) -> TableAnswer:
    """Balance one fitting; every row of the table that is not empty is a port."""
    rho_, headings, ports, *rest = call.cells
    rho = _scalar(call, rho_, "rho", "density", math.nan)
    W, *rate = (
        _scalar(call, cell, name, "force", 0.0)
        for cell, name in zip(rest[:4], ("W", "dMx", "dMy", "dMz"), strict=True)
    )
    tol = _scalar(call, rest[4], "tol", "ratio", CLOSURE_TOLERANCE)
    table = read_table(PORT_COLUMNS, headings, ports, call.units, what="ports")
    for i, error in sorted(table.errors.items()):
        raise Refused(error.kind, f"row {i + 1} of the ports: {error.message or error}")
    area = _areas(table)
    used = ~table.blank
    for column in PORT_COLUMNS:
        if column.required and np.isnan(table.number(column.name)[used]).any():
            row = int(np.flatnonzero(used & np.isnan(table.number(column.name)))[0])
            raise Refused("VALUE", f"row {row + 1} of the ports: {column.name} is empty (it is required)")
    n = np.stack([table.number(f"n{axis}") for axis in "xyz"], axis=1)
    try:
        result = momentum_balance(
            n[used],
            area[used],
            table.number("p")[used],
            table.number("Q")[used],
            rho,
            table.number("beta", 1.0)[used],
            W,
            rate,
            tol,
        )
    except OutOfRange as error:
        D = table.number("D")[used]
        raise Refused(kind_of(error), "; ".join(_worded(p, D, call) for p in error.problems)) from error
    return TableAnswer(
        columns={name: np.array([x]) for name, x in result._asdict().items()},
        single=True,
    )


def _areas(table: Table) -> Array:
    """Give the area of each port from its diameter or its area; exactly one of the two is given."""
    D, A = table.number("D"), table.number("A")
    both = np.isnan(D) == np.isnan(A)
    for row in np.flatnonzero(both & ~table.blank).tolist():
        raise Refused("VALUE", f"row {row + 1} of the ports: give exactly one of D and A")
    # A negative diameter must not turn into an area that looks right.
    return np.where(np.isnan(D), A, math.pi / 4 * D * np.abs(D))


_PORT: Final = re.compile(r"(\w+) of port (\d+)$")
_ROLES: Final = {c.name: c.role for c in PORT_COLUMNS} | {"rho": "density", "W": "force"}


def _worded(problem: Problem, D: Array, call: TableCall) -> str:
    """Word a bad argument as the sheet has it: in its unit, and a diameter for the area it gave."""
    match = _PORT.match(problem.argument)
    name = match[1] if match else problem.argument
    if match and name == "A" and not math.isnan(D[int(match[2]) - 1]):
        name = "D"
        problem = problem._replace(argument=f"D of port {match[2]}", value=float(D[int(match[2]) - 1]))
    return in_units(problem, _ROLES.get(name, ""), call.units)


def _scalar(call: TableCall, cell: Cell, name: str, role: str, empty: float) -> float:
    if isinstance(cell, list):
        if len(cell) != 1 or len(cell[0]) != 1:
            raise Refused("VALUE", f"{name} is a range (allowed: one cell)")
        cell = cell[0][0]
    if isinstance(cell, CellError):
        raise Refused(cell.kind, cell.message or f"{name} is the error {cell}")
    value = number(cell, name, role, call.units.unit(role))
    return empty if math.isnan(value) else value
