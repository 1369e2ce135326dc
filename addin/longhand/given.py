"""What the calls of a workbook are given: told by the text, or where it must be by an evaluation."""

from __future__ import annotations

from functools import cached_property
from typing import Any

from ..catalogue.types import Longhand, Row
from ..cells import CellError, Scalar
from ..hosts.headless.formulas import Kind, Part
from ..hosts.headless.model import Node
from ..hosts.headless.probe import Probe
from ..progress import Progress
from ..tables import is_blank
from ..xlsx.refusals import Refusal
from .arguments import WORDS, Argument, linked, number_of, resolve
from .calls import Call, Items, NotWorked
from .expressions import SINGLE, hands_on_cells, spans
from .outcomes import named, written
from .source import Area, Source, TbCell, plain
from .staged import Staged

_READ_BEFOREHAND = ("table", "headings")


class Reader:
    """Finds the arguments of calls.

    The embedded evaluator is asked only where the text of a formula cannot tell how many
    values an expression has, or what stands in a range that a working must read.
    """

    def __init__(self, source: Source, staged: Staged, progress: Progress | None = None) -> None:
        self._source, self._staged, self._progress = source, staged, progress
        self._known: dict[Any, Argument] = {}

    @cached_property
    def _probe(self) -> Probe | None:
        try:
            return Probe.of(self._source.package, self._progress)
        except Refusal:
            return None

    def shape(self, cell: TbCell) -> tuple[int, int] | None:
        """Rows and columns of all that a formula gives; None where that cannot be told."""
        node = self._node(cell)
        return None if self._probe is None or node is None else self._probe.shape(node)

    def _node(self, cell: TbCell) -> Node | None:
        """The formula of a cell in the evaluated workbook; None where it cannot be asked."""
        return None if self._probe is None else self._probe.node(cell.sheet, cell.cell.row, cell.cell.col)

    def arguments(self, call: Call, number: int, cell: TbCell, row: Row) -> list[Argument]:
        """The arguments of one call, the calls of a cell counted from 0. Raises NotWorked."""
        out = []
        for k, items in enumerate(call.args):
            argument = resolve(items, cell.sheet, self._source)
            beforehand = _beforehand(row, k)
            if argument.form == "expression" or (argument.form == "call" and beforehand):
                text = plain(items, self._source, cell.sheet, named)
                key = cell.sheet, row.name, k, text, cell.shape == SINGLE
                found = self._known.get(key)
                if found is None:
                    found = self._known[key] = self._settled(argument, cell, number, k, row, beforehand)
                argument = found
            out.append(argument)
        return out

    def _settled(
        self, argument: Argument, cell: TbCell, number: int, k: int, row: Row, beforehand: bool
    ) -> Argument:
        """An expression as a working can take it: by its text, or staged with its values."""
        found = argument.survey
        role = row.args[k - row.leading].role if row.leading <= k < row.leading + len(row.args) else "any"
        plain_text = found is not None and not beforehand and found.elementwise and not found.computes
        if found is not None and plain_text and (found.number or role in WORDS):
            return argument
        grid = self._values(cell, number, k)
        if grid is not None and isinstance(grid[0][0], CellError) and grid[0][0].kind == "NAME":
            grid = None  # a function that the evaluator does not know
        failed = grid is None or (len(grid) == 1 and isinstance(grid[0][0], CellError))
        one = found is not None and (found.elementwise or (grid is not None and cell.shape == SINGLE))
        if failed and one and not beforehand:
            return argument
        if grid is None or (failed and not isinstance(cell.cell.value, CellError)):
            raise NotWorked(f"{argument.shown()} must be known beforehand and cannot be evaluated here")
        if found is not None and not beforehand and not found.computes and not spans(argument.items):
            numbers = role in WORDS or all(isinstance(v, float | CellError) for line in grid for v in line)
            shape = len(grid), len(grid[0])
            if numbers and shape == (found.shape if found.elementwise else SINGLE):
                argument.extent = shape
                return argument
        return self._stage(argument, cell, grid, role not in (*WORDS, *_READ_BEFOREHAND))

    def _values(self, cell: TbCell, number: int, k: int) -> list[list[Scalar]] | None:
        """What the evaluator hands to a call; None where it cannot tell."""
        node = self._node(cell)
        values = None if self._probe is None or node is None else self._probe.arguments(node, number)
        if values is None or k >= len(values):
            return None
        value = values[k]
        return value if isinstance(value, list) else [[value]]

    def _stage(self, argument: Argument, cell: TbCell, grid: list[list[Scalar]], numeric: bool) -> Argument:
        """An argument that stands in cells of its own."""
        items, shown = argument.items, argument.shown()
        if argument.form == "call":
            call = items[0]
            assert isinstance(call, Call)
            assert call.outcome is not None
            area = self._staged.results(cell, shown, call.outcome)
        else:
            flat = [value for line in grid for value in line]
            handed = hands_on_cells(items) or any(map(is_blank, flat))
            number = numeric and len(flat) == 1 and isinstance(flat[0], float)

            def text() -> str:
                inside = plain(items, self._source, cell.sheet, written)
                if spans(items):  # not every evaluator gives the cells between two others as an array
                    inside = f"INDEX({inside},0,0)"
                taken = number_of(inside) if number else linked(inside)
                return taken.text if handed else inside

            area = self._staged.array(cell, shown, (len(grid), len(grid[0])), text)
        return staged_argument(area, argument, [[None if is_blank(v) else v for v in line] for line in grid])


def staged_argument(area: Area, argument: Argument, values: list[list[Any]]) -> Argument:
    """An argument that is a range of the checking sheets."""
    items: Items = [Part(area.text(), Kind.REFERENCE)]
    return Argument("area", argument.sheet, items, argument.source, area, values)


def _beforehand(row: Row, k: int) -> bool:
    """Whether a working is planned by the values of an argument."""
    if row.kind == "tool":
        return row.name == "TB_CONVERT" and k in (1, 2)
    if k < row.leading:
        return True
    if isinstance(row.longhand, Longhand) or k - row.leading >= len(row.args):
        return False
    return row.args[k - row.leading].role in _READ_BEFOREHAND
