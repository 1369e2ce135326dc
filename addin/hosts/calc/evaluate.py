"""Evaluate a workbook with LibreOffice Calc and work out what is to be stored in it.

The outcome has the shape of the embedded evaluator's, and the values are stored by
the same code, so the two can be compared cell by cell.
"""

from __future__ import annotations

import tempfile
from collections.abc import Callable, Mapping
from pathlib import Path
from typing import Any

import numpy as np

from ...cells import Cell, CellError, ErrorKind, Grid, Scalar
from ...dispatch import headings
from ...progress import Progress
from ...xlsx.a1 import to_a1
from ...xlsx.package import Package
from ...xlsx.sheetxml import set_formulas, store, stored_values
from ..headless.dependency import Reference
from ..headless.elsewhere import elsewhere
from ..headless.evaluate import Computed, Elsewhere, Evaluation, Failed, Kept, Table
from ..headless.formulas import CLOSES, OPENS, Kind, Part, call_name, join, take_apart
from ..headless.host import Functions
from ..headless.model import Model, Node
from . import soffice
from .office import wire

TIMEOUT = 600.0
_KINDS: dict[int, ErrorKind] = {code: kind for kind, code in wire.ERROR_CODES.items()}  # type: ignore[misc]
_NATIVE = "a cell that it depends on is an error, or its own formula fails"
_MOST_ERRORS = 1000
Batch = Callable[[Mapping[str, Any], float], dict[str, Any]]


def evaluate_workbook(
    package: Package,
    *,
    progress: Progress | None = None,
    fill_native: bool = False,
    functions: Functions | None = None,
    timeout: float = TIMEOUT,
    batch: Batch = soffice.batch,
) -> Evaluation:
    """Have Calc compute the TB_ formulas of a workbook and everything that depends on them.

    Nothing is written: the caller saves ``replaced``. An office with a profile of its own
    is started for it, on a copy of the file, and ends within ``timeout`` seconds.

    Raises
    ------
    Refusal
        There is no office, it does not answer in time, or it cannot load the workbook.
    """
    model = Model(package, functions or Functions.of_catalogue(), progress)
    evaluation = Evaluation()
    for sheet in package.sheets:
        for where, formula in elsewhere(package.part(sheet.part), model.names, sheet.name):
            evaluation.not_evaluated.append(Elsewhere(sheet.name, where, formula))
    seeds = [node.index for node in model.nodes if node.calls]
    affected = set()
    if seeds:
        affected = model.graph().dependents(seeds + [node.index for node in model.nodes if node.anywhere])
    else:
        evaluation.warnings.append("no cell of this workbook holds a TB_ formula")
    wanted = [
        node
        for node in model.nodes
        if node.cell.kind != "table" and (node.index in affected or (fill_native and node.cell.value is None))
    ]
    if not wanted:
        return evaluation
    if progress is not None:
        progress("evaluate", 0, len(wanted))
    answers = _ask(model, wanted, timeout, batch)
    _Outcome(model, evaluation, affected).take(wanted, answers)
    if package.signed and evaluation.replaced:
        evaluation.warnings.append("the digital signature of the file becomes invalid when values are stored")
    if progress is not None:
        progress("evaluate", len(wanted), len(wanted))
    return evaluation


def _ask(model: Model, wanted: list[Node], timeout: float, batch: Batch) -> list[Any]:
    package = model.package
    with tempfile.TemporaryDirectory(prefix="thrustbook-", ignore_cleanup_errors=True) as folder:
        copy = Path(folder) / f"book{package.path.suffix.lower() or '.xlsx'}"
        copy.write_bytes(package.to_bytes(_without_empty_arguments(model)))
        formulas = [
            {
                "sheet": model.sheet_names[node.sheet],
                "area": node.cell.ref if _fills_area(node) else (node.cell.row, node.cell.col) * 2,
                "spills": node.cell.kind == "dynamic",
                "call": _whole_call(node),
            }
            for node in wanted
        ]
        answer = batch({"book": str(copy), "formulas": formulas}, timeout)
    return list(answer["formulas"])


def _fills_area(node: Node) -> bool:
    return node.cell.kind in ("array", "dynamic") and node.cell.ref is not None


def _whole_call(node: Node) -> str:
    """The function of a formula that is one TB_ call and nothing else, else ""."""
    whole = node.rewritten.whole if node.rewritten is not None else None
    return whole[0] if whole is not None else ""


def _leading(node: Node) -> list[list[Part]]:
    """The first two arguments of a formula that is one TB_ call, taken apart."""
    whole = node.rewritten.whole if node.rewritten is not None else None
    found: list[list[Part]] = [[]]
    depth = 0
    inside = take_apart(f"{whole[0]}({whole[1]})")[1:-1] if whole is not None else []
    for part in inside:
        depth += (part.kind in OPENS) - (part.kind in CLOSES)
        if part.kind is Kind.COMMA and depth == 0:
            found.append([])
        elif part.kind is not Kind.SPACE:
            found[-1].append(part)
    return found[:2]


def _without_empty_arguments(model: Model) -> dict[str, bytes]:
    """Sheets for the copy in which a TB_ argument that is one empty cell is left out.

    Calc passes an empty cell to an add-in as 0; left out, it has its default.
    """
    filled: dict[int, set[tuple[int, int]]] = {}
    package = model.package

    def empty(reference: Reference) -> bool:
        sheet = reference.sheet
        if sheet not in filled:
            xml = package.part(package.sheets[sheet].part)
            filled[sheet] = set(stored_values(xml, package.shared_strings))
            for node in model.nodes:
                if node.sheet == sheet:
                    r1, c1, r2, c2 = node.extent()
                    filled[sheet].update((r, c) for r in range(r1, r2 + 1) for c in range(c1, c2 + 1))
        return (reference.r1, reference.c1) not in filled[sheet]

    changed: dict[int, dict[tuple[int, int], str]] = {}
    for node in model.nodes:
        if node.calls and not node.reason:
            text = _left_out(model, node, empty)
            if text != node.cell.text:
                changed.setdefault(node.sheet, {})[node.cell.row, node.cell.col] = text
    return {
        package.sheets[sheet].part: set_formulas(package.part(package.sheets[sheet].part), texts)
        for sheet, texts in changed.items()
    }


def _left_out(model: Model, node: Node, empty: Callable[[Reference], bool]) -> str:
    parts = take_apart(node.cell.text)
    stack: list[bool] = []
    out: list[Part] = []
    for i, part in enumerate(parts):
        if part.kind in OPENS:
            stack.append(part.kind is Kind.OPEN and call_name(part.text) is not None)
        elif part.kind in CLOSES and stack:
            stack.pop()
        if part.kind is Kind.REFERENCE and stack and stack[-1] and _alone(parts, i):
            found = model.references([part], node)
            if len(found) == 1 and found[0][1:3] == found[0][3:5] and empty(found[0]):
                continue
        out.append(part)
    return join(out)


def _alone(parts: list[Part], i: int) -> bool:
    """Whether a part is the whole of an argument."""
    ends = (Kind.OPEN, Kind.COMMA, Kind.CLOSE)
    before = next((p for p in reversed(parts[:i]) if p.kind is not Kind.SPACE), None)
    after = next((p for p in parts[i + 1 :] if p.kind is not Kind.SPACE), None)
    return before is not None and after is not None and before.kind in ends and after.kind in ends


class _Outcome:
    """Turns the office's answers into what is stored and what is reported."""

    def __init__(self, model: Model, evaluation: Evaluation, affected: set[int]) -> None:
        self._model, self._to, self._affected = model, evaluation, affected
        self._values: dict[int, dict[tuple[int, int], Scalar]] = {}
        self._blocks: dict[int, list[tuple[int, int, Grid]]] = {}
        self._refs: dict[int, dict[tuple[int, int], tuple[int, int, int, int]]] = {}

    def take(self, wanted: list[Node], answers: list[Any]) -> None:
        for node, answer in zip(wanted, answers, strict=True):
            self._take(node, answer)
        for sheet in sorted({*self._values, *self._blocks}):
            part = self._model.package.sheets[sheet].part
            old = self._model.package.part(part)
            new = store(
                old, self._values.get(sheet, {}), self._blocks.get(sheet, ()), self._refs.get(sheet, {})
            )
            if new != old:
                self._to.replaced[part] = new

    def _take(self, node: Node, answer: Any) -> None:
        cell = node.cell
        sheet = self._model.sheet_names[node.sheet]
        grid = _grid(answer)
        reason = _not_computed(node, grid)
        if reason:
            kept = Kept(sheet, node.a1, "=" + cell.text, reason, node.index in self._affected)
            self._to.native_kept.append(kept)
            return
        value = grid[0, 0]
        if _fills_area(node):
            self._put_area(node, grid)
        else:
            self._values.setdefault(node.sheet, {})[cell.row, cell.col] = value
        self._to.stored += grid.size
        if node.calls:
            self._to.counts.update(node.calls)
            names = tuple(dict.fromkeys(node.calls))
            self._to.cells.append(Computed(sheet, cell.row, cell.col, names, value, cell.kind))
            name = _whole_call(node)
            if name and _fills_area(node) and self._model.functions.block.get(name):
                self._table(node, name, grid)
        if node.index in self._affected:
            self._errors(node, grid)

    def _table(self, node: Node, name: str, grid: Grid) -> None:
        """List the result of a block; headings and single values are no tables."""
        leading = [self._constant(node, parts) for parts in _leading(node)]
        result = leading[0] if leading and isinstance(leading[0], str) else ""
        if result.strip().lower().startswith(("labels", "units")) or grid.size == 1:
            return
        labels, units = headings(name, leading, grid.shape[1])
        sheet = self._model.sheet_names[node.sheet]
        self._to.tables.append(Table(sheet, node.a1, name, grid, labels, units))

    def _constant(self, node: Node, parts: list[Part]) -> Cell:
        """What an argument is, if it is a text or a reference to cells without formulas."""
        (part,) = parts if len(parts) == 1 else (Part("", Kind.SPACE),)
        if part.kind is Kind.LITERAL and part.text.startswith('"'):
            return part.text[1:-1].replace('""', '"')
        if part.kind is not Kind.REFERENCE:
            return None
        found = self._model.references([part], node)
        if len(found) != 1 or (found[0].r2 - found[0].r1) * (found[0].c2 - found[0].c1) > 1000:
            return None
        sheet, r1, c1, r2, c2 = found[0]
        package = self._model.package
        values = stored_values(package.part(package.sheets[sheet].part), package.shared_strings)
        return [[values.get((r, c)) for c in range(c1, c2 + 1)] for r in range(r1, r2 + 1)]

    def _put_area(self, node: Node, grid: Grid) -> None:
        assert node.cell.ref is not None
        r1, c1, r2, c2 = node.cell.ref
        self._blocks.setdefault(node.sheet, []).append((r1, c1, grid))
        bottom, right = r1 + grid.shape[0] - 1, c1 + grid.shape[1] - 1
        if (bottom, right) == (r2, c2):
            return
        self._refs.setdefault(node.sheet, {})[r1, c1] = (r1, c1, bottom, right)
        values = self._values.setdefault(node.sheet, {})
        for row in range(r1, r2 + 1):  # what spilled further before is no longer part of the result
            for col in range(c1 if row > bottom else right + 1, c2 + 1):
                values[row, col] = None

    def _errors(self, node: Node, grid: Grid) -> None:
        bad = 0
        sheet, formula = self._model.sheet_names[node.sheet], "=" + node.cell.text
        if node.cell.kind == "array":
            inside = _without_outside(grid)
            if inside.size < grid.size:
                self._to.warnings.append(
                    f"{self._model.where(node)}: the array formula covers more cells than its result has; "
                    "the others hold #N/A"
                )
            grid = inside
        for row, line in enumerate(grid.tolist(), node.cell.row):
            for col, value in enumerate(line, node.cell.col):
                if isinstance(value, CellError):
                    bad += 1
                    if bad <= _MOST_ERRORS:
                        why = value.message or ("" if node.calls else _NATIVE)
                        self._to.errors.append(Failed(sheet, to_a1(row, col), str(value), why, formula))
        if bad > _MOST_ERRORS:
            self._to.warnings.append(
                f"{self._model.where(node)}: {bad} cells of the result are errors; "
                f"the first {_MOST_ERRORS} are listed"
            )


def _without_outside(grid: Grid) -> Grid:
    """The part of an array without the rows and columns at its end that are all #N/A."""
    na = np.array([[type(v) is CellError and v.kind == "NA" for v in line] for line in grid.tolist()])
    rows, columns = np.flatnonzero(~na.all(axis=1)), np.flatnonzero(~na.all(axis=0))
    if not rows.size or not columns.size:
        return grid
    return grid[: rows[-1] + 1, : columns[-1] + 1]


def _grid(answer: Any) -> Grid:
    if isinstance(answer, dict):
        message = f"#SPILL!: the result needs more cells, and {answer['blocked']} is not free"
        answer = [[CellError("VALUE", message)]]
    grid = np.empty((len(answer), len(answer[0])), dtype=object)
    grid[:] = [[_value(item) for item in line] for line in answer]
    return grid


def _value(item: Any) -> Scalar:
    if isinstance(item, dict):
        code = int(item["error"])
        kind = _KINDS.get(code)
        return CellError(kind or "VALUE", item.get("why", "" if kind else f"Err:{code} in Calc"))
    return item  # type: ignore[no-any-return]


def _not_computed(node: Node, grid: Grid) -> str:
    """Why a formula of the spreadsheet itself keeps its stored value, "" when it does not."""
    value = grid[0, 0]
    if node.calls or not isinstance(value, CellError) or isinstance(node.cell.value, CellError):
        return ""
    if value.message or value.kind == "NAME":
        return f"Calc does not compute it ({value.message or value})"
    return ""
