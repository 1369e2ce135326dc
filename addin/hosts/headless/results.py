"""What is stored in the sheets of the user's file, and nothing else."""

from __future__ import annotations

from collections.abc import Iterable

import numpy as np

from ...cells import Grid, Scalar
from ...xlsx.sheetxml import store
from .areas import Extent
from .host import error_word
from .model import Node
from .settle import Settlement, value_of


class _Sheet:
    def __init__(self) -> None:
        self.values: dict[tuple[int, int], Scalar] = {}
        self.blocks: list[tuple[int, int, Grid]] = []
        self.array_refs: dict[tuple[int, int], Extent] = {}
        self.cells = 0


class Results:
    """The values of the wanted formulas. ``grids`` holds those that fill an area, by formula."""

    def __init__(self, settlement: Settlement, wanted: Iterable[int]) -> None:
        self._settlement = settlement
        self._sheets: dict[int, _Sheet] = {}
        self.values: dict[int, Scalar] = {}
        self.grids: dict[int, Grid] = {}
        for index in sorted(wanted):
            self._take(settlement.model.nodes[index])

    def stored(self) -> tuple[dict[str, bytes], int]:
        """New bytes of the sheets that change, by part, and the number of cells that get a value."""
        package = self._settlement.model.package
        replaced: dict[str, bytes] = {}
        count = 0
        for number, sheet in sorted(self._sheets.items()):
            part = package.sheets[number].part
            old = package.part(part)
            new = store(old, sheet.values, sheet.blocks, sheet.array_refs)
            count += sheet.cells
            if new != old:
                replaced[part] = new
        return replaced, count

    def _take(self, node: Node) -> None:
        settlement = self._settlement
        sheet = self._sheets.setdefault(node.sheet, _Sheet())
        cell, area = node.cell, node.area
        failed = settlement.failed.get(node.index)
        # An error of the evaluator itself stands for the whole formula, whatever was computed for it.
        lost = failed is not None or (area is not None and area.grid is None)
        if cell.kind not in ("array", "dynamic") or cell.ref is None:
            plain = area is None or lost or area.grid is None
            value = value_of(settlement, node) if plain or area is None else area.result()[0, 0]
            self.values[node.index] = sheet.values[cell.row, cell.col] = value
            sheet.cells += 1
            return
        r1, c1, r2, c2 = cell.ref
        if lost or area is None or error_word(settlement.run.raw(node)) in ("Circ", "Spill"):
            value = value_of(settlement, node)
            shape = (r2 - r1 + 1, c2 - c1 + 1) if cell.kind == "array" else (1, 1)
            grid = np.full(shape, value, dtype=object)
        else:
            grid = area.result()
        self.values[node.index] = grid[0, 0]
        self.grids[node.index] = grid
        sheet.blocks.append((r1, c1, grid))
        sheet.cells += grid.size
        if cell.kind == "dynamic":
            bottom, right = r1 + grid.shape[0] - 1, c1 + grid.shape[1] - 1
            if (bottom, right) != (r2, c2):
                sheet.array_refs[r1, c1] = (r1, c1, bottom, right)
            # What spilled further before is no longer part of the result.
            for row in range(r1, r2 + 1):
                for col in range(c1 if row > bottom else right + 1, c2 + 1):
                    sheet.values[row, col] = None
