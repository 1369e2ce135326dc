"""Table functions: ranges read as tables, answered by columns."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from .blocks.types import TableAnswer, TableCall
from .catalogue.types import Result, Row
from .cells import Cell, Grid, Refused
from .leading import Wanted, heading_row, read_units, wanted
from .tables import column_from_si, is_blank
from .units import UnitSet


def _table_call(row: Row, args: Sequence[Cell]) -> tuple[Wanted, TableCall]:
    if row.max_args is not None and len(args) > row.max_args:
        raise Refused("VALUE", f"{row.name} takes at most {row.max_args} arguments, {len(args)} given")
    padded = [*args, *[None] * (row.leading + len(row.args) - len(args))]
    asked = wanted(row, padded[0]) if row.has_result else Wanted("values", row.results[:1], True)
    units = read_units(padded[row.leading - 1])
    result = asked.results[0].name if asked.single else "all"
    return asked, TableCall(result=result, units=units, cells=padded[row.leading :])


def solved(row: Row, args: Sequence[Cell]) -> TableAnswer:
    """Give the answer of a table function before it becomes cells, in SI units.

    Raises
    ------
    Refused, EngineError
        A call that has no answer at all.
    """
    found: TableAnswer = row.routine(_table_call(row, args)[1])
    return found


def evaluate(row: Row, args: Sequence[Cell]) -> Cell | Grid:
    """Answer one call of a table function."""
    asked, request = _table_call(row, args)
    if asked.form != "values":
        return heading_row(asked, request.units)
    for arg, cell in zip(row.args, request.cells, strict=True):
        if row.required(arg) and is_blank(cell):
            raise Refused("VALUE", f"{arg.name} is empty (it is required)")
    answer: TableAnswer = row.routine(request)
    columns = [_column(answer, r, request.units) for r in asked.results]
    if answer.single and asked.single:
        return columns[0].reshape(-1)[0]  # type: ignore[no-any-return]
    if columns[0].ndim == 2:
        return columns[0]
    return np.stack(columns, axis=1)


def _column(answer: TableAnswer, result: Result, units: UnitSet) -> Grid:
    """Give one result as cells: values, the errors of the rows that failed, remarks in the note."""
    column = _cells(answer, result.name, result.role, units)
    if result.name == "note":
        for i, note in answer.notes.items():
            column[i] = note
        for i, error in answer.errors.items():
            column[i] = error.message
    elif result.role != "text":
        for i, error in answer.errors.items():
            column[i] = error
    if answer.blank is not None and answer.blank.any():
        column[answer.blank] = ""
    return column


def _cells(answer: TableAnswer, name: str, role: str, units: UnitSet) -> Grid:
    source = answer.columns.get(name)
    if source is None:  # the note column is filled from errors and notes
        return np.full(len(next(iter(answer.columns.values()))), "", dtype=object)
    if role == "text":
        texts = np.empty(len(source), dtype=object)
        texts[:] = list(source)
        return texts
    values = column_from_si(np.asarray(source, dtype=float), role, units, answer.ambient)
    out: Grid = values.astype(object)
    hidden = np.isnan(values)
    if hidden.any():
        out[hidden] = ""
    return out


def remarks(row: Row, args: Sequence[Cell]) -> list[str]:
    """List what TB_WHY tells of a call that was answered."""
    asked, request = _table_call(row, args)
    if asked.form != "values":
        return []
    answer: TableAnswer = row.routine(request)
    remarks = [f"row {i + 1}: {e.message or e}" for i, e in sorted(answer.errors.items())]
    remarks += [f"row {i + 1}: {note}" for i, note in sorted(answer.notes.items()) if i not in answer.errors]
    more = [f"{len(remarks) - 8} more"] if len(remarks) > 8 else []
    return [*answer.general, *remarks[:8], *more]
