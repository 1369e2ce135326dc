"""Element functions: one set of numbers, or ranges worked element by element."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from thrustbook.engine.constants import P_ATM
from thrustbook.engine.errors import EngineError
from thrustbook.engine.guard import Routine

from .catalogue.types import Row
from .cells import Cell, CellError, Grid, Refused
from .failures import cautions, failures, refused
from .leading import Wanted, heading_row, read_units, wanted
from .tables import column_from_si, is_blank, number, numbers
from .units import Unit, UnitSet


@dataclass(slots=True)
class _Input:
    name: str
    role: str
    unit: Unit
    default: Any
    choices: tuple[str, ...]


@dataclass(slots=True)
class _Plan:
    """All that a call needs and that does not depend on its numbers."""

    row: Row
    routine: Routine[Any, Any]
    asked: Wanted
    units: UnitSet
    inputs: list[_Input]
    factors: list[float]
    defaults: list[Any]
    ambient: int
    """Position of the ambient pressure among the arguments, -1 where there is none."""
    shifted: bool
    """Whether a number of some argument takes more than a multiplication."""
    columns: list[int]
    """Positions of the wanted results among the routine's."""
    first: int
    divisor: float
    """Of a single wanted result; 0 where it needs more than a division, or there are several."""


_plans: dict[Any, _Plan] = {}


def _plan(row: Row, args: Sequence[Cell]) -> _Plan:
    leading = row.leading
    result: Cell = args[0] if row.has_result and args else None
    units: Cell = args[leading - 1] if len(args) >= leading else None
    if type(units) is list:
        key: Any = (row.name, _hashable(result), tuple(map(tuple, units)))
    else:
        key = (row.name, _hashable(result), units)
    plan = _plans.get(key)
    if plan is None:
        if len(_plans) > 4096:  # a workbook has a few; a runaway caller must not fill the memory
            _plans.clear()
        plan = _plans[key] = _make_plan(row, result, read_units(units))
    return plan


def _hashable(cell: Cell) -> Any:
    return str(cell) if type(cell) is list else cell


def _make_plan(row: Row, result: Cell, units: UnitSet) -> _Plan:
    asked = wanted(row, result) if row.has_result else Wanted("values", row.results[:1], True)
    routine: Routine[Any, Any] = row.routine
    inputs, factors = [], []
    for arg, parameter in zip(row.args, routine.parameters, strict=True):
        given = Unit("", 1.0, 0) if arg.role == "choice" else units.unit(arg.role)
        initial = math.nan if parameter.required else parameter.default
        inputs.append(_Input(arg.name, arg.role, given, initial, arg.choices))
        factors.append(given.factor)
    names = [i.name for i in inputs]
    columns = [row.results.index(r) for r in asked.results]
    divisor = 0.0
    if asked.single:
        answer = units.unit(asked.results[0].role)
        divisor = 0.0 if answer.shift or answer.offset else answer.factor
    return _Plan(
        row=row,
        routine=routine,
        asked=asked,
        units=units,
        inputs=inputs,
        factors=factors,
        defaults=[i.default for i in inputs],
        ambient=names.index("pamb") if "pamb" in names else -1,
        shifted=any(i.unit.shift or i.unit.offset for i in inputs),
        columns=columns,
        first=columns[0],
        divisor=divisor,
    )


def evaluate(row: Row, args: Sequence[Cell]) -> Cell | Grid:
    """Answer one call of an element function: a cell, or a grid. Raises Refused."""
    plan = _plan(row, args)
    if plan.asked.form != "values":
        return heading_row(plan.asked, plan.units)
    leading = row.leading
    if len(args) - leading > len(plan.inputs):
        raise Refused("VALUE", f"{row.name} takes at most {row.max_args} arguments, {len(args)} given")
    values = plan.defaults.copy()
    plain = not plan.shifted
    if plain:
        factors = plan.factors
        for i in range(leading, len(args)):
            cell = args[i]
            if type(cell) is float and cell == cell:
                values[i - leading] = cell * factors[i - leading]
            elif cell is not None:
                plain = False
                break
    if not plain:
        cells = [_single(cell) for cell in args[leading:]]
        if any(type(cell) is list for cell in cells):
            return _grid(plan, cells)
        _read_scalars(plan, cells, values)
    try:
        result = plan.routine.scalar(values)
    except EngineError as error:
        return refused(row, plan.units, error)
    if plan.divisor:
        value = result[plan.first]
        if value != value:
            raise Refused("NUM", _undefined(plan.asked.results[0].name))
        return value / plan.divisor + 0.0  # type: ignore[no-any-return]
    out = np.empty((1, len(plan.columns)), dtype=object)
    ambient = _ambient(plan, values)
    for j, (i, r) in enumerate(zip(plan.columns, plan.asked.results, strict=True)):
        value = float(column_from_si(result[i], r.role, plan.units, ambient))
        out[0, j] = CellError("NUM", _undefined(r.name)) if value != value else value
    return out[0, 0] if plan.asked.single else out


def _undefined(result: str) -> str:
    return f"{result} is not defined without an optional argument that it needs"


def _single(cell: Cell) -> Cell:
    """Take a range of one cell for the cell itself."""
    return cell[0][0] if type(cell) is list and len(cell) == 1 and len(cell[0]) == 1 else cell


def _ambient(plan: _Plan, values: Sequence[Any]) -> Any:
    """Give the ambient pressure of a call: its own where the function has one, else standard."""
    if plan.ambient < 0:
        return P_ATM
    given = values[plan.ambient]
    if isinstance(given, float):
        return P_ATM if given != given else given
    return np.where(np.isnan(given), P_ATM, given)


def _read_scalars(plan: _Plan, cells: Sequence[Cell], values: list[Any]) -> None:
    """Fill ``values`` from the cells of one call, all bad ones reported together."""
    problems: list[CellError] = []
    order = [plan.ambient] if 0 <= plan.ambient < len(cells) else []
    for i in order + [i for i in range(len(cells)) if i != plan.ambient]:
        cell, given = cells[i], plan.inputs[i]
        if is_blank(cell):
            continue
        try:
            if given.role == "choice":
                values[i] = _choice(given, cell)
            else:
                ambient = P_ATM if i == plan.ambient else _ambient(plan, values)
                values[i] = number(cell, given.name, given.role, given.unit, ambient)  # type: ignore[arg-type]
        except Refused as refusal:
            problems.append(refusal.error)
    if problems:
        passed_on = next(
            (p for p, c in _with_cells(problems, cells) if isinstance(c, CellError)), problems[0]
        )
        raise Refused(passed_on.kind, "; ".join(p.message for p in problems))


def _with_cells(problems: Sequence[CellError], cells: Sequence[Cell]) -> list[tuple[CellError, Cell]]:
    errors = [c for c in cells if isinstance(c, CellError)]
    return [(p, next((c for c in errors if c.kind == p.kind), None)) for p in problems]


def _choice(given: _Input, cell: Cell) -> str:
    if isinstance(cell, CellError):
        raise Refused(cell.kind, cell.message or f"{given.name} is the error {cell}")
    if isinstance(cell, str) and cell.strip().lower() in given.choices:
        return cell.strip().lower()
    shown = f'"{cell}"' if isinstance(cell, str) else "not a word"
    raise Refused("VALUE", f"{given.name} = {shown} (allowed: {', '.join(given.choices)})")


def _grid(plan: _Plan, cells: Sequence[Cell]) -> Grid:
    """Evaluate a call with ranges, element by element; one bad element spoils only itself."""
    shape, flat = _broadcast(plan, cells)
    values, errors = _read_arrays(plan, flat, math.prod(shape))
    results, status = plan.routine.evaluate(values)
    ambient = _ambient(plan, values)
    columns: list[Grid] = []
    for j in plan.columns:
        si = np.broadcast_to(results[j], status.shape)
        column = column_from_si(si, plan.row.results[j].role, plan.units, ambient)
        columns.append(column.astype(object))
        undefined = np.isnan(column)
        if undefined.any():
            columns[-1][undefined] = CellError("NUM", _undefined(plan.row.results[j].name))
    failed = failures(plan.row, plan.units, values, status, errors)
    for column in columns:
        for i, error in failed.items():
            column[i] = error
    if plan.asked.single:
        return columns[0].reshape(shape)
    grid = np.stack(columns, axis=1)
    return grid if shape[1] == 1 else grid.T


def _broadcast(plan: _Plan, cells: Sequence[Cell]) -> tuple[tuple[int, int], list[Any]]:
    shapes = [(len(c), len(c[0])) for c in cells if isinstance(c, list)]
    try:
        rows, columns = np.broadcast_shapes(*shapes)
    except ValueError:
        sizes = ", ".join(f"{r} x {c}" for r, c in dict.fromkeys(shapes))
        raise Refused("VALUE", f"the ranges do not fit together: {sizes}") from None
    if not plan.asked.single and min(rows, columns) > 1:
        raise Refused("VALUE", "more than one result takes ranges of one row or one column")
    flat: list[Any] = []
    for cell, given in zip(cells, plan.inputs, strict=False):
        if not isinstance(cell, list):
            flat.append(cell)
            continue
        if given.role == "choice":
            raise Refused("VALUE", f"{given.name} is a range (allowed: one of {', '.join(given.choices)})")
        source = np.empty((len(cell), len(cell[0])), dtype=object)
        source[:] = cell
        flat.append(np.broadcast_to(source, (rows, columns)).reshape(-1).tolist())
    return (rows, columns), flat


def _read_arrays(plan: _Plan, flat: Sequence[Any], size: int) -> tuple[list[Any], dict[int, CellError]]:
    values: list[Any] = plan.defaults.copy()
    scalars = [None if type(c) is list else c for c in flat]
    _read_scalars(plan, scalars, values)
    errors: dict[int, CellError] = {}
    order = [plan.ambient] if 0 <= plan.ambient < len(flat) else []
    for i in order + [i for i in range(len(flat)) if i != plan.ambient]:
        if type(flat[i]) is not list:
            continue
        given = plan.inputs[i]
        no_shift = given.unit._replace(shift=0)
        array, bad = numbers(flat[i], given.name, given.role, no_shift)
        if given.unit.shift:
            array = array + given.unit.shift * _ambient(plan, values)
        if given.default == given.default:
            array = np.where(np.isnan(array), given.default, array)
        values[i] = array
        for k, error in bad.items():
            errors.setdefault(k, error)
    if not any(isinstance(v, np.ndarray) for v in values):
        values = [np.full(size, v) if isinstance(v, float) else v for v in values]
    return values, errors


def failed_elements(outcome: Cell | Grid) -> list[str]:
    """Say of a grid which elements failed and why; the first few."""
    if not isinstance(outcome, np.ndarray):
        return []
    failed = [(i, c) for i, c in enumerate(outcome.reshape(-1), 1) if isinstance(c, CellError)]
    more = [f"{len(failed) - 5} more"] if len(failed) > 5 else []
    return [f"element {i}: {c.message or c}" for i, c in failed[:5]] + more


def remarks(row: Row, args: Sequence[Cell], outcome: Cell | Grid) -> list[str]:
    """List what TB_WHY tells of a call that was answered."""
    failed = failed_elements(outcome)
    if failed or not row.cautions:
        return failed
    plan = _plan(row, args)
    if plan.asked.form != "values":
        return []
    cells = [_single(cell) for cell in args[row.leading :]]
    if any(type(cell) is list for cell in cells):
        shape, flat = _broadcast(plan, cells)
        values, _ = _read_arrays(plan, flat, math.prod(shape))
        results = plan.routine.evaluate(values)[0]
    else:
        values = plan.defaults.copy()
        _read_scalars(plan, cells, values)
        results = plan.routine.scalar(values)
    return [text for text, applies in cautions(row, values, results) if applies.any()]
