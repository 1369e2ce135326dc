"""Table functions: ranges read as tables, answered by columns."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from .blocks.types import TableAnswer, TableCall
from .catalogue.types import Row
from .cells import Cell, Grid, Refused
from .leading import heading_row, read_units, result_name
from .tables import column_from_si, is_blank
from .units import UnitSet


def _table_call(row: Row, args: Sequence[Cell]) -> tuple[str, TableCall]:
    if row.max_args is not None and len(args) > row.max_args:
        raise Refused("VALUE", f"{row.name} takes at most {row.max_args} arguments, {len(args)} given")
    padded = [*args, *[None] * (row.leading + len(row.args) - len(args))]
    name = result_name(row, padded[0]) if row.has_result else row.results[0].name
    units = read_units(padded[row.leading - 1])
    cells = padded[row.leading :]
    return name, TableCall(result=name, units=units, cells=cells)


def evaluate(row: Row, args: Sequence[Cell]) -> Cell | Grid:
    name, request = _table_call(row, args)
    if name in ("labels", "units"):
        return heading_row(row, name, request.units)
    for arg, cell in zip(row.args, request.cells, strict=True):
        if row.required(arg) and is_blank(cell):
            raise Refused("VALUE", f"{arg.name} is empty (it is required)")
    answer: TableAnswer = row.routine(request)
    roles = {r.name: r.role for r in row.results}
    names = [r.name for r in row.results if not r.alone] if name == "all" else [name]
    columns = [_cells(answer, n, roles[n], request.units) for n in names]
    for error_row, error in answer.errors.items():
        for n, column in zip(names, columns, strict=True):
            if n == "note":
                column[error_row] = error.message
            elif roles[n] != "text":
                column[error_row] = error
    for i, note in answer.notes.items():
        if "note" in names and i not in answer.errors:
            columns[names.index("note")][i] = note
    if answer.blank is not None and answer.blank.any():
        for column in columns:
            column[answer.blank] = ""
    if answer.single and name != "all":
        return columns[0].reshape(-1)[0]  # type: ignore[no-any-return]
    if columns[0].ndim == 2:
        return columns[0]
    return np.stack(columns, axis=1)


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
    name, request = _table_call(row, args)
    if name in ("labels", "units"):
        return []
    answer: TableAnswer = row.routine(request)
    remarks = [f"row {i + 1}: {e.message or e}" for i, e in sorted(answer.errors.items())]
    remarks += [f"row {i + 1}: {note}" for i, note in sorted(answer.notes.items()) if i not in answer.errors]
    more = [f"{len(remarks) - 8} more"] if len(remarks) > 8 else []
    return [*answer.general, *remarks[:8], *more]
