"""TB_SCHEDULE: a table of unrelated fittings, one a row.

The rows are sorted by kind of fitting, each kind goes through its own engine
routine as arrays, and the results return to their rows. The functions of the
single fittings and the schedule therefore cannot disagree.
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from typing import Any, Final

import numpy as np
import numpy.typing as npt

from thrustbook.engine.guard import Routine

from ..catalogue.glossary import GLOSSARY
from ..catalogue.types import Column, Result, Row
from ..cells import CellError
from ..failures import cautions, failures
from ..tables import Table, read_table
from ..units import UnitSet
from .types import TableAnswer, TableCall

COLUMN_OF: Final[Mapping[str, str]] = {"D": "D1", "p": "p1", "Q1": "Q", "V": "V1"}
"""A single fitting's symbol -> the schedule's, where they differ: the schedule numbers every section."""

_SYMMETRIC: Final = ("Fy", "Ry", "dir")
"""Results that a fitting along one axis does not list because they follow from symmetry."""


class Schedule:
    """The reader of TB_SCHEDULE, made from the rows of the single fittings."""

    def __init__(self, kinds: Mapping[str, Row], results: Sequence[Result]) -> None:
        self.kinds = dict(kinds)
        self.results = [r.name for r in results if r.role != "text"]
        self.columns = self._columns()

    def _columns(self) -> tuple[Column, ...]:
        """The columns of all kinds together; one that means something else by kind says so."""
        roles: dict[str, str] = {}
        meanings: dict[str, dict[str, list[str]]] = {}
        needs: dict[str, dict[str, list[str]]] = {}
        for kind, row in self.kinds.items():
            for arg in row.args:
                name = COLUMN_OF.get(arg.name, arg.name)
                if roles.setdefault(name, arg.role) != arg.role:
                    raise TypeError(f"{row.name}: {arg.name} is a {arg.role}, elsewhere a {roles[name]}")
                text = arg.text or GLOSSARY[arg.name]
                meanings.setdefault(name, {}).setdefault(text, []).append(kind)
                need = "needed" if row.required(arg) else arg.empty
                needs.setdefault(name, {}).setdefault(need, []).append(kind)
        return (
            Column(name="name", role="text", text="name of the fitting", empty="no name"),
            Column(name="fitting", role="text", text=f"kind: {', '.join(self.kinds)}", required=True),
            *(
                Column(name=name, role=role, text=_by_kind(meanings[name], True), empty=_by_kind(needs[name]))
                for name, role in roles.items()
            ),
        )

    def __call__(self, call: TableCall) -> TableAnswer:
        """Read the table, evaluate every row, and give the results row by row."""
        headings, cells = call.cells
        table = read_table(self.columns, headings, cells, call.units, what="schedule")
        errors: dict[int, CellError] = dict(table.errors)
        notes: dict[int, str] = {}
        columns: dict[str, Any] = {name: np.full(table.size, np.nan) for name in self.results}
        groups = _groups(table, errors)
        for kind, places in groups.items():
            row = self.kinds.get(kind)
            if row is None:
                allowed = ", ".join(self.kinds)
                shown = f'"{kind}"' if kind else "empty"
                for i in places.tolist():
                    errors.setdefault(i, CellError("VALUE", f"fitting is {shown} (allowed: {allowed})"))
                continue
            self._evaluate(row, call.units, table, places, columns, errors, notes)
        columns["name"] = table.text("name")
        columns["fitting"] = table.text("fitting")
        return TableAnswer(columns=columns, errors=errors, notes=notes, blank=table.blank)

    def _evaluate(
        self,
        row: Row,
        units: UnitSet,
        table: Table,
        places: npt.NDArray[np.intp],
        columns: dict[str, Any],
        errors: dict[int, CellError],
        notes: dict[int, str],
    ) -> None:
        routine: Routine[Any, Any] = row.routine
        whole = len(places) == table.size
        values: list[Any] = []
        for parameter in routine.parameters:
            source = table.numbers.get(COLUMN_OF.get(parameter.name, parameter.name))
            initial = math.nan if parameter.required else float(parameter.default)
            if source is None:
                values.append(initial)
                continue
            chosen = source if whole else source[places]
            if initial == initial:
                chosen = np.where(np.isnan(chosen), initial, chosen)
            values.append(chosen)
        if not any(isinstance(v, np.ndarray) for v in values):
            values[0] = np.full(len(places), values[0])
        results, status = routine.evaluate(values)
        given = {COLUMN_OF.get(r.name, r.name): x for r, x in zip(row.results, results, strict=True)}
        given |= _along_axis(given, len(places))
        for name, target in columns.items():
            if name in given:
                target[places] = given[name]
        for i, error in failures(row, units, values, status, {}, COLUMN_OF).items():
            errors.setdefault(int(places[i]), error)
        for text, applies in cautions(row, values, results):
            for i in places[np.broadcast_to(applies, places.shape)].tolist():
                notes[i] = f"{notes[i]}; {text}" if i in notes else text


def _by_kind(texts: Mapping[str, Sequence[str]], alone: bool = False) -> str:
    """Say what holds for which kinds; ``alone``: without the kinds where it is the same for all."""
    if alone and len(texts) == 1:
        return next(iter(texts))
    return "; ".join(f"{', '.join(kinds)}: {text}" for text, kinds in texts.items())


def _groups(table: Table, errors: Mapping[int, CellError]) -> dict[str, npt.NDArray[np.intp]]:
    """Sort the rows by kind; blank rows and rows that could not be read are left out."""
    texts = table.text("fitting")
    kind_of = {text: text.strip().lower() for text in dict.fromkeys(texts)}
    kinds = list(dict.fromkeys(kind_of.values()))
    code_of = {text: kinds.index(kind) for text, kind in kind_of.items()}
    codes = np.fromiter(map(code_of.__getitem__, texts), np.intp, table.size)
    usable = ~table.blank
    usable[list(errors)] = False
    groups = {kind: np.flatnonzero((codes == i) & usable) for i, kind in enumerate(kinds)}
    return {kind: places for kind, places in groups.items() if places.size}


def _along_axis(given: Mapping[str, Any], size: int) -> dict[str, Any]:
    """Fill in what symmetry gives: no force across the axis of a nozzle, reducer or cap."""
    if "Fx" not in given or "Fy" in given:
        return {}
    zero = np.zeros(size)
    return dict(zip(_SYMMETRIC, (zero, zero, np.where(given["Fx"] < 0, np.pi, 0.0)), strict=True))
