"""Evaluate again and again until every formula either has a result or is set aside."""

from __future__ import annotations

from ...cells import CellError, Scalar
from ...xlsx.a1 import MAX_COLUMN, MAX_ROW, to_a1
from ...xlsx.refusals import Refusal
from ...xlsx.sheetxml import stored_values
from .areas import Area
from .dependency import Graph, Reference
from .host import Host, error_word, scalar
from .model import Model, Node
from .run import Run, Stopped
from .shadow import evaluation_copy
from .tablerefs import sheet_range
from .uncomputable import Judge

_PATIENCE = 20  # evaluations beyond one for each area


class Settlement:
    """The last evaluation of a workbook, and what had to be set aside for it.

    ``kept`` gives, by formula, why its stored value stands in for it. ``failed`` gives the
    error of a formula that cannot stand where it is.
    """

    run: Run

    def __init__(self, model: Model, host: Host) -> None:
        self.model, self.host = model, host
        self.kept: dict[int, str] = {}
        self.failed: dict[int, CellError] = {}
        self.warnings: list[str] = []
        self._of_area = {node.area.number: node for node in model.nodes if node.area is not None}

    def settle(self) -> None:
        """Evaluate until nothing more has to be replaced by a plain value.

        Raises :class:`Refusal` when the evaluator gives up on the workbook.
        """
        for node in self.model.nodes:
            if node.reason:
                self._set_aside(node, node.reason)
        graph = self.model.graph()
        for area, node in self._live_areas():
            if _is_read(graph, node):
                area.expect()
        left = _PATIENCE + len(self.model.areas)
        while True:
            self.run = self._evaluate()
            left -= 1
            if not (self._find_blocked() or self._lay_tiles() or self._find_uncomputable()):
                return
            if left <= 0:
                self.warnings.append(
                    "results that depend on each other did not settle; look for a circular reference"
                )
                return
            self.release()  # two evaluated copies at a time would take twice the memory

    def release(self) -> None:
        """Let go of the evaluated copy; nothing can be asked of it any more."""
        del self.run

    def affected(self) -> set[int]:
        """The formulas that call a TB_ function or depend on one that does."""
        seeds = [node.index for node in self.model.nodes if node.calls]
        if not seeds:
            return set()
        seeds += [node.index for node in self.model.nodes if node.anywhere]
        return self.model.graph().dependents(seeds)

    def gave_several(self, node: Node) -> bool:
        """Whether a plain formula that is one TB_ call gives more than one cell."""
        whole = node.rewritten.whole if node.rewritten is not None else None
        if node.cell.kind != "plain" or whole is None or whole[0] not in self.host.gave_grid:
            return False
        call = f"{whole[0]}({whole[1]})"
        value, _ = self.run.try_formula(node, f"ROWS({call})*COLUMNS({call})")
        return isinstance(value, float) and value > 1

    def _set_aside(self, node: Node, reason: str) -> None:
        """Let the stored value stand; a TB_ formula without one becomes an error with its reason."""
        if node.calls and (node.cell.value is None or isinstance(node.cell.value, CellError)):
            self.failed[node.index] = CellError("NAME", reason)
        else:
            self.kept[node.index] = reason

    def _evaluate(self) -> Run:
        while True:
            instead: dict[int, Scalar] = {i: self.model.nodes[i].cell.value for i in self.kept}
            instead |= self.failed
            try:
                return Run(self.model, self.host, evaluation_copy(self.model, instead))
            except Stopped as stopped:
                self._find_named(str(stopped))

    def _find_named(self, message: str) -> None:
        """Set aside the formulas that the evaluator named when it gave up on the whole workbook."""
        word = message.rsplit(": ", 1)[-1].strip().casefold()
        found = False
        for node in self.model.nodes:
            if node.index in self.kept or node.index in self.failed or not word:
                continue
            if word in node.copy.casefold():
                self._set_aside(node, f"the evaluator cannot read it ({message})")
                found = True
        if not found:
            raise Refusal(
                f"The embedded evaluator cannot evaluate this workbook ({message}). Nothing was changed. "
                "Let the spreadsheet program compute it."
            )

    def _live_areas(self) -> list[tuple[Area, Node]]:
        found = []
        for area in self.model.areas:
            node = self._of_area.get(area.number)
            if node is not None and node.index not in self.kept and node.index not in self.failed:
                found.append((area, node))
        return found

    def _find_blocked(self) -> bool:
        """Set aside the formulas whose result meets another cell, or its own inputs."""
        found = False
        for area, node in self._live_areas():
            error = self._obstacle(area, node) if area.kind != "plain" else None
            if error is not None:
                self.failed[node.index] = error
                area.tiled = None
                found = True
        return found

    def _obstacle(self, area: Area, node: Node) -> CellError | None:
        if area.grid is None:
            return None
        own = Reference(node.sheet, *area.extent())
        if area.grid.size > 1 and any(_overlap(ref, own) for ref in node.references):
            return CellError("VALUE", "its result lies on cells that it refers to (circular reference)")
        if area.kind != "dynamic":
            return None
        if error_word(self.run.raw(node)) != "Spill" and not self._meets_others(area, node):
            return None
        rows, cols = area.grid.shape
        place = self._obstacle_at(node, own) + " is not free"
        return CellError("VALUE", f"#SPILL!: the result needs {rows} rows by {cols} columns; {place}")

    def _meets_others(self, area: Area, node: Node) -> bool:
        """Whether anything but its own upper left cell lies under a large result without tiles."""
        assert area.grid is not None
        if not area.large or area.tiled == area.grid.shape:
            return False
        _, _, r2, c2 = area.extent()
        if r2 > MAX_ROW or c2 > MAX_COLUMN:
            return True
        under = self._under(area)
        counts = [
            self.run.try_formula(node, f"COUNTA({sheet_range(self.model.sheet_names[node.sheet], part)})")[0]
            for part in under
        ]
        return any(count != 0.0 for count in counts)

    @staticmethod
    def _under(area: Area) -> list[tuple[int, int, int, int]]:
        """The extent of a result without the cells that were its own in the evaluated copy."""
        r1, c1, r2, c2 = area.extent()
        rows, cols = area.tiled or (1, 1)
        parts = [(r1 + rows, c1, r2, min(c2, c1 + cols - 1)), (r1, c1 + cols, r2, c2)]
        return [part for part in parts if part[0] <= part[2] and part[1] <= part[3]]

    def _obstacle_at(self, node: Node, own: Reference) -> str:
        """The first cell under a result, beyond its extent in the file, that belongs to somebody else."""
        if own.r2 > MAX_ROW or own.c2 > MAX_COLUMN:
            return "a cell beyond the edge of the sheet"
        cell = node.cell
        old = cell.ref or (cell.row, cell.col, cell.row, cell.col)
        package = self.model.package
        taken = set(stored_values(package.part(package.sheets[node.sheet].part), package.shared_strings))
        taken |= {(other.cell.row, other.cell.col) for other in self.model.nodes if other.sheet == node.sheet}
        taken = {
            (row, col)
            for row, col in taken
            if own.r1 <= row <= own.r2
            and own.c1 <= col <= own.c2
            and not (old[0] <= row <= old[2] and old[1] <= col <= old[3])
        }
        return to_a1(*min(taken)) if taken else "a cell under it (another result)"

    def _lay_tiles(self) -> bool:
        """Have tiles in the next copy for the large results that other formulas read."""
        again = False
        graph = self.model.graph()
        for area, node in self._live_areas():
            shape = area.grid.shape if area.grid is not None else (1, 1)
            if not area.large:
                again = again or area.tiled is not None
                area.tiled = None
            elif area.tiled != shape and (area.tiled is not None or _is_read(graph, node)):
                area.tiled = (shape[0], shape[1])
                again = True
        return again

    def _find_uncomputable(self) -> bool:
        found = False
        judge: Judge | None = None
        for node in self.model.nodes:
            if node.calls or node.index in self.kept or node.index in self.failed:
                continue
            if error_word(self.run.raw(node)) is None:
                continue
            judge = judge or Judge(self.model, self.run, self.kept, self.affected())
            reason = judge.not_computed(node)
            if reason:
                self.kept[node.index] = reason
                found = True
        return found


def _is_read(graph: Graph, node: Node) -> bool:
    """Whether another formula refers to the cells that this one fills."""
    return bool(graph.readers(Reference(node.sheet, *node.extent())) - {node.index})


def _overlap(one: Reference, other: Reference) -> bool:
    return (
        one.sheet == other.sheet
        and one.r1 <= other.r2
        and other.r1 <= one.r2
        and one.c1 <= other.c2
        and other.c1 <= one.c2
    )


def value_of(settlement: Settlement, node: Node) -> Scalar:
    """The new value of a formula cell, or of the upper left cell of an area."""
    failed = settlement.failed.get(node.index)
    if failed is not None:
        return failed
    raw = settlement.run.raw(node)
    value = scalar(raw)
    if error_word(raw) == "Circ":
        return CellError("VALUE", "it refers to itself (circular reference)")
    return 0.0 if value is None else value
