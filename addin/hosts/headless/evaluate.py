"""Evaluate every formula of a workbook and work out what is to be stored in it."""

from __future__ import annotations

import gc
from collections import Counter
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass, field
from typing import NamedTuple

from ...cells import CellError, Grid, Scalar
from ...dispatch import headings
from ...progress import Progress, ticker
from ...xlsx.a1 import to_a1
from ...xlsx.package import Package
from .areas import OUTSIDE, Area
from .elsewhere import elsewhere
from .host import Functions, Host
from .model import Model, Node
from .reasons import reason
from .results import Results
from .settle import Settlement

_MOST_ERRORS = 1000  # listed of one area


class Computed(NamedTuple):
    """One cell with a TB_ formula. For a formula that fills an area the value is its upper left one."""

    sheet: str
    row: int
    col: int
    functions: tuple[str, ...]
    value: Scalar
    kind: str

    @property
    def a1(self) -> str:
        return to_a1(self.row, self.col)


class Failed(NamedTuple):
    """An error in a TB_ cell, or in a cell that depends on one."""

    sheet: str
    a1: str
    error: str
    reason: str
    formula: str


class Kept(NamedTuple):
    """A formula that the evaluator cannot compute; what the file holds stays."""

    sheet: str
    a1: str
    formula: str
    reason: str
    depends_on_tb: bool


class Elsewhere(NamedTuple):
    """A TB_ formula of a conditional format or a validation."""

    sheet: str
    where: str
    formula: str


class Table(NamedTuple):
    """The result of a block function."""

    sheet: str
    a1: str
    function: str
    grid: Grid
    labels: tuple[str, ...] = ()
    units: tuple[str, ...] = ()


@dataclass
class Evaluation:
    """What came of it. ``replaced`` are the new bytes of the sheets that change, by part."""

    replaced: dict[str, bytes] = field(default_factory=dict)
    cells: list[Computed] = field(default_factory=list)
    errors: list[Failed] = field(default_factory=list)
    native_kept: list[Kept] = field(default_factory=list)
    not_evaluated: list[Elsewhere] = field(default_factory=list)
    counts: Counter[str] = field(default_factory=Counter)
    tables: list[Table] = field(default_factory=list)
    stored: int = 0
    warnings: list[str] = field(default_factory=list)

    @property
    def stale(self) -> list[Kept]:
        """What could not be computed although it depends on a TB_ cell."""
        return [kept for kept in self.native_kept if kept.depends_on_tb]

    @property
    def ok(self) -> bool:
        """Whether no TB_ cell, and nothing that depends on one, failed or is stale."""
        return not self.errors and not self.stale


def evaluate_workbook(
    package: Package,
    *,
    progress: Progress | None = None,
    fill_native: bool = False,
    functions: Functions | None = None,
) -> Evaluation:
    """Compute the TB_ formulas of a workbook and everything that depends on them.

    Nothing is written: the caller saves ``replaced``. Only values of TB_ cells and of their
    dependents are in it; with ``fill_native`` also those of the spreadsheet's own formulas
    that have no value in the file. ``progress(stage, done, total)`` is called now and then.
    Raises :class:`Refusal` when the embedded evaluator gives up on the workbook.
    """
    with _no_collector():
        return _evaluated(package, functions or Functions.of_catalogue(), progress, fill_native)


@contextmanager
def _no_collector() -> Iterator[None]:
    """Keep the garbage collector from walking millions of live cells over and over; they form no circles."""
    was_on = gc.isenabled()
    gc.disable()
    try:
        yield
    finally:
        if was_on:
            gc.enable()


def _evaluated(
    package: Package, functions: Functions, progress: Progress | None, fill_native: bool
) -> Evaluation:
    model = Model(package, functions, progress)
    evaluation = Evaluation()
    for sheet in package.sheets:
        for where, formula in elsewhere(package.part(sheet.part), model.names, sheet.name):
            evaluation.not_evaluated.append(Elsewhere(sheet.name, where, formula))
    calling = [node for node in model.nodes if node.calls]
    if not calling:
        evaluation.warnings.append("no cell of this workbook holds a TB_ formula")
        if not fill_native:
            return evaluation
    host = Host(functions, ticker(progress, "evaluate", sum(len(node.calls) for node in calling)))
    settlement = Settlement(model, host)
    settlement.settle()
    affected = settlement.affected()
    wanted = affected - settlement.kept.keys()
    if fill_native:
        wanted |= {
            node.index
            for node in model.nodes
            if node.cell.value is None and node.index not in settlement.kept
        }
    results = Results(settlement, wanted)
    evaluation.warnings += settlement.warnings + _built_on_stale(settlement, affected)
    if model.names.outside:
        evaluation.warnings.append(
            "cells of other workbooks have the values that this file keeps of them; no other file was opened"
        )
    _Report(evaluation, settlement, results, affected).write()
    settlement.release()  # the evaluated copy and the new sheets together would be the peak of memory
    if progress is not None:
        progress("store", 0, len(package.sheets))
    evaluation.replaced, evaluation.stored = results.stored()
    if package.signed and evaluation.replaced:
        evaluation.warnings.append("the digital signature of the file becomes invalid when values are stored")
    if progress is not None:
        progress("store", len(package.sheets), len(package.sheets))
    return evaluation


def _built_on_stale(settlement: Settlement, affected: set[int]) -> list[str]:
    """Results that rest on a stored value which should have changed."""
    stale = affected & settlement.kept.keys()
    model = settlement.model
    below = sorted(model.graph().dependents(stale) - settlement.kept.keys()) if stale else []
    if not below:
        return []
    places = ", ".join(model.where(model.nodes[index]) for index in below[:5])
    return [
        f"{len(below)} cells were computed from values that could not be renewed: {places}"
        + (", ..." if len(below) > 5 else "")
    ]


class _Report:
    """Fills in what a reader wants to know."""

    def __init__(
        self, evaluation: Evaluation, settlement: Settlement, results: Results, affected: set[int]
    ) -> None:
        self._to, self._settlement, self._results, self._affected = evaluation, settlement, results, affected
        self._model: Model = settlement.model

    def write(self) -> None:
        for node in self._model.nodes:
            kept = self._settlement.kept.get(node.index)
            affected = node.index in self._affected
            if kept is not None:
                if affected or node.cell.kind != "table":
                    self._to.native_kept.append(
                        Kept(self._sheet(node), node.a1, "=" + node.cell.text, kept, affected)
                    )
                continue
            if node.calls:
                self._computed(node)
            if affected:
                self._errors(node)

    def _sheet(self, node: Node) -> str:
        return self._model.sheet_names[node.sheet]

    def _computed(self, node: Node) -> None:
        value = self._results.values.get(node.index)
        cell = node.cell
        self._to.counts.update(node.calls)
        names = tuple(dict.fromkeys(node.calls))
        self._to.cells.append(Computed(self._sheet(node), cell.row, cell.col, names, value, cell.kind))
        area = node.area
        if area is not None and area.grid is not None and node.index not in self._settlement.failed:
            if area.function is not None and self._model.functions.block.get(area.function):
                self._table(node, area)
            several = area.kind == "plain" and area.grid.size > 1
        else:
            several = area is None and self._settlement.gave_several(node)
        if several:
            self._to.warnings.append(
                f"{self._model.where(node)}: the formula gives several cells but stands in one; "
                "it shows the first. Enter it as an array formula to see all of them."
            )

    def _table(self, node: Node, area: Area) -> None:
        """List the result of a block; headings and single values are no tables."""
        result = area.leading[0] if area.leading else None
        head = isinstance(result, str) and result.strip().lower().startswith(("labels", "units"))
        grid = area.result()
        if head or grid.size == 1 or area.function is None:
            return
        labels, units = headings(area.function, area.leading, grid.shape[1])
        self._to.tables.append(Table(self._sheet(node), node.a1, area.function, grid, labels, units))

    def _errors(self, node: Node) -> None:
        failed = self._settlement.failed.get(node.index)
        formula = "=" + node.cell.text
        if failed is not None:
            self._to.errors.append(Failed(self._sheet(node), node.a1, str(failed), failed.message, formula))
            return
        grid = self._results.grids.get(node.index)
        if grid is None:
            value = self._results.values.get(node.index)
            if isinstance(value, CellError):
                self._fail(node, node.a1, value, formula)
            return
        if any(value is OUTSIDE for value in grid[-1]) or any(value is OUTSIDE for value in grid[:, -1]):
            self._to.warnings.append(
                f"{self._model.where(node)}: the array formula covers more cells than its result has; "
                "the others hold #N/A"
            )
        bad = 0
        for row, line in enumerate(grid.tolist(), node.cell.row):
            if CellError not in set(map(type, line)):
                continue
            for col, value in enumerate(line, node.cell.col):
                if type(value) is CellError and value is not OUTSIDE:
                    bad += 1
                    if bad <= _MOST_ERRORS:
                        self._fail(node, to_a1(row, col), value, formula)
        if bad > _MOST_ERRORS:
            self._to.warnings.append(
                f"{self._model.where(node)}: {bad} cells of the result are errors; "
                f"the first {_MOST_ERRORS} are listed"
            )

    def _fail(self, node: Node, a1: str, error: CellError, formula: str) -> None:
        text = error.message or reason(self._settlement, node, self._results.values)
        self._to.errors.append(Failed(self._sheet(node), a1, str(error), text, formula))
