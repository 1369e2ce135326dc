"""A workbook as the rules see it: formulas, recomputed values, calls, and who reads whom."""

from __future__ import annotations

from bisect import bisect_left, bisect_right
from collections.abc import Iterable, Iterator
from functools import cached_property

from ..cells import Scalar
from ..hosts.headless.dependency import Reference
from ..hosts.headless.formulas import Kind, Unreadable, take_apart
from ..hosts.headless.host import Functions, Host
from ..hosts.headless.model import Model, Node
from ..hosts.headless.probe import Probe, Recorder
from ..hosts.headless.results import Results
from ..hosts.headless.settle import Settlement
from ..progress import Progress, ticker
from ..xlsx.a1 import to_a1
from ..xlsx.package import Package
from ..xlsx.refusals import Refusal
from ..xlsx.sheetxml import stored_values
from .calls import Call, read_calls
from .circles import WORDS, circles, in_circles
from .labels import Surroundings
from .relative import moving, of_own_row, relative_form
from .writtenunits import Met, met

Place = tuple[int, int, int]
"""Sheet (from 0), row and column (from 1)."""


class Book:
    """One evaluated workbook. Nothing in it is ever written.

    Raises :class:`~thrustbook.addin.xlsx.refusals.Refusal` when the embedded
    evaluator gives up on the workbook.
    """

    def __init__(self, package: Package, progress: Progress | None = None) -> None:
        self.package = package
        self.progress = progress
        self.remarks: list[str] = []
        """What a reader of the report should know of the check itself."""
        recorder = Recorder(Functions.of_catalogue())
        self.model = Model(package, recorder.functions, progress)
        self.settlement = self._settled(recorder)
        self.probe = Probe(self.settlement, recorder)
        self.affected = self.settlement.affected()
        computed = [n.index for n in self.model.nodes if n.index not in self.settlement.kept]
        self.results = Results(self.settlement, computed)

    def _settled(self, recorder: Recorder) -> Settlement:
        """The workbook evaluated; without its circles, where they make the evaluator give up on it all."""
        tick = ticker(self.progress, "evaluate", sum(len(node.calls) for node in self.model.nodes))
        settlement = Settlement(self.model, Host(recorder.functions, tick))
        try:
            settlement.settle()
        except Refusal:
            spoilt = in_circles(self)
            if not spoilt:
                raise
            for node in spoilt:
                node.reason = WORDS
            settlement = Settlement(self.model, Host(recorder.functions, tick))
            settlement.settle()
        return settlement

    def tell(self, stage: str, done: int, total: int) -> None:
        """Show how far the work is."""
        if self.progress is not None:
            self.progress(stage, done, total)

    def sheet(self, number: int) -> str:
        """The name of a sheet."""
        return self.model.sheet_names[number]

    def name(self, place: Place) -> str:
        """``Sheet!B3``."""
        return f"{self.sheet(place[0])}!{to_a1(*place[1:])}"

    @cached_property
    def stored(self) -> list[dict[tuple[int, int], Scalar]]:
        """For each sheet what the file holds in its cells, formulas or not."""
        package = self.package
        return [stored_values(package.part(s.part), package.shared_strings) for s in package.sheets]

    @cached_property
    def values(self) -> list[dict[tuple[int, int], Scalar]]:
        """For each sheet the values of its cells, recomputed where they can be."""
        out = [dict(cells) for cells in self.stored]
        for index, value in self.results.values.items():
            node = self.model.nodes[index]
            grid = self.results.grids.get(index)
            sheet = out[node.sheet]
            if grid is None:
                sheet[node.cell.row, node.cell.col] = value
                continue
            for row, line in enumerate(grid.tolist(), node.cell.row):
                for col, item in enumerate(line, node.cell.col):
                    sheet[row, col] = item
        return out

    def value(self, place: Place) -> Scalar:
        """The value of one cell, None where it is empty."""
        return self.values[place[0]].get(place[1:])

    def source(self, place: Place) -> Place | None:
        """The typed cell that a cell takes its value from by plain references; None where it is computed."""
        for _ in range(8):
            node = self.model.at.get(place)
            if node is None:
                return None if self.in_area(place) else place
            refs = node.references
            if len(refs) != 1 or moving(node.cell.text.strip()) is None:
                return None
            place = (refs[0].sheet, refs[0].r1, refs[0].c1)
        return None

    @cached_property
    def calls(self) -> list[Call]:
        """Every TB_ call of every formula that can be computed, with its arguments."""
        return list(read_calls(self))

    @cached_property
    def signatures(self) -> dict[int, str]:
        """Formula -> its relative form: the same for formulas that were filled down or across."""
        return {node.index: relative_form(node) for node in self.model.nodes if node.cell.kind != "table"}

    @cached_property
    def _by_column(self) -> dict[tuple[int, int], tuple[list[int], list[Node]]]:
        """(sheet, column) -> rows of its formulas, and the formulas."""
        sorted_nodes = sorted(self.model.nodes, key=lambda n: (n.sheet, n.cell.col, n.cell.row))
        out: dict[tuple[int, int], tuple[list[int], list[Node]]] = {}
        for node in sorted_nodes:
            rows, nodes = out.setdefault((node.sheet, node.cell.col), ([], []))
            rows.append(node.cell.row)
            nodes.append(node)
        return out

    def formulas_in(self, area: Reference) -> Iterator[Node]:
        """The formulas that stand in an area."""
        if area.r1 == area.r2 and area.c1 == area.c2:
            node = self.model.at.get((area.sheet, area.r1, area.c1))
            if node is not None:
                yield node
                return
        elif area.c2 - area.c1 > 200:
            for (sheet, col), column in self._by_column.items():
                if sheet == area.sheet and area.c1 <= col <= area.c2:
                    yield from _between(column, area)
        else:
            for col in range(area.c1, area.c2 + 1):
                yield from _between(self._by_column.get((area.sheet, col), ([], [])), area)
        yield from self._filling(area)

    def _filling(self, area: Reference) -> list[Node]:
        """The formulas of several cells that reach into an area."""
        by_row = self._wide_by_row
        if area.r2 - area.r1 < len(by_row):
            rows: Iterable[int] = range(area.r1, area.r2 + 1)
        else:
            rows = (row for sheet, row in by_row if sheet == area.sheet and area.r1 <= row <= area.r2)
        found = {node.index: node for row in rows for node in by_row.get((area.sheet, row), ())}
        return [n for n in found.values() if n.extent()[1] <= area.c2 and area.c1 <= n.extent()[3]]

    def in_area(self, place: Place) -> bool:
        """Whether a cell is filled by an array formula."""
        sheet, row, col = place
        return bool(self._filling(Reference(sheet, row, col, row, col)))

    def relative_references(self, node: Node) -> Iterator[tuple[Reference, bool, bool]]:
        """The single cells that a formula refers to; whether each moves when filled down, or across."""
        try:
            text = self.model.tables.written_out(
                node.cell.text, self.sheet(node.sheet), node.cell.row, node.cell.col
            )
            parts = take_apart(text)
        except Unreadable:
            return
        for part in parts:
            moves = moving(part.text) if part.kind is Kind.REFERENCE else None
            if moves is not None:
                for ref in self.model.references([part], node):
                    yield ref, *((True, False) if of_own_row(node, ref) else moves)

    @cached_property
    def _wide_by_row(self) -> dict[tuple[int, int], list[Node]]:
        """(sheet, row) -> the formulas of several cells that fill a part of it."""
        out: dict[tuple[int, int], list[Node]] = {}
        for node in self.model.nodes:
            r1, c1, r2, c2 = node.extent()
            if node.cell.kind in ("array", "dynamic") and (r1, c1) != (r2, c2):
                for row in range(r1, r2 + 1):
                    out.setdefault((node.sheet, row), []).append(node)
        return out

    @cached_property
    def around(self) -> Surroundings:
        """Labels, headings and units written around cells."""
        return Surroundings(self)

    @cached_property
    def feeding(self) -> tuple[set[int], set[Reference]]:
        """What TB_ cells read, however far up: formulas and areas."""
        formulas: set[int] = set()
        areas: set[Reference] = set()
        waiting = [node for node in self.model.nodes if node.calls]
        while waiting:
            for ref in waiting.pop().references:
                if ref in areas:
                    continue
                areas.add(ref)
                for node in self.formulas_in(ref):
                    if node.index not in formulas:
                        formulas.add(node.index)
                        waiting.append(node)
        return formulas, areas

    @cached_property
    def related(self) -> set[int]:
        """Formulas that call a TB_ function, depend on one that does, or feed one."""
        return self.affected | self.feeding[0]

    @cached_property
    def circular(self) -> tuple[list[list[Node]], set[int]]:
        """The circles of formulas that refer to themselves, and all formulas spoilt by them."""
        return circles(self)

    @cached_property
    def written_units(self) -> list[Met]:
        """The units written at the cells that calls read and fill."""
        return list(met(self))

    @cached_property
    def unclosed(self) -> dict[int, tuple[Call, str]]:
        """Formula -> its call whose flows do not close, and what the engine says of it."""
        from .unclosed import unclosed

        return unclosed(self)


def _between(column: tuple[list[int], list[Node]], area: Reference) -> list[Node]:
    rows, nodes = column
    return nodes[bisect_left(rows, area.r1) : bisect_right(rows, area.r2)]
