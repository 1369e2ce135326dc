"""Which formulas depend on which cells.

One formula a node; single cells are found through a dictionary, ranges through a
tree over the rows of each column, so that a hundred thousand formulas with long
overlapping ranges stay cheap: each range is visited once and then taken out.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from typing import NamedTuple

import numpy as np
import numpy.typing as npt

from ...xlsx.a1 import MAX_ROW

_LEAVES = 1 << MAX_ROW.bit_length()  # leaves of the tree over rows; row r is leaf _LEAVES + r


class Reference(NamedTuple):
    """A rectangle of cells on one sheet (sheets counted from 0, rows and columns from 1)."""

    sheet: int
    r1: int
    c1: int
    r2: int
    c2: int


class Graph:
    """Formulas, the cells that each fills and the cells that each refers to.

    ``places[i]`` is where formula i stands: its own cell, or the whole area that it
    fills. ``references[i]`` are the cells that it reads.
    """

    def __init__(self, places: Sequence[Reference], references: Sequence[Iterable[Reference]]) -> None:
        self.places = places
        self._single: dict[tuple[int, int, int], list[int]] = {}
        self._readers: dict[Reference, list[int]] = {}
        for index, refs in enumerate(references):
            for ref in refs:
                if ref[1] == ref[3] and ref[2] == ref[4]:
                    self._single.setdefault((ref[0], ref[1], ref[2]), []).append(index)
                else:
                    self._readers.setdefault(ref, []).append(index)
        self._ranges = list(self._readers)
        self._bounds: npt.NDArray[np.int64] = np.array(self._ranges, dtype=np.int64).reshape(-1, 5)
        self._cells: npt.NDArray[np.int64] | None = None
        self._columns = {(place.sheet, c) for place in places for c in range(place.c1, place.c2 + 1)}

    def readers(self, area: Reference) -> set[int]:
        """The formulas that refer to any cell of an area."""
        found: set[int] = set()
        sheet, r1, c1, r2, c2 = area
        b = self._bounds
        hit = (b[:, 0] == sheet) & (b[:, 1] <= r2) & (b[:, 3] >= r1) & (b[:, 2] <= c2) & (b[:, 4] >= c1)
        for index in np.flatnonzero(hit):
            found.update(self._readers[self._ranges[index]])
        if (r2 - r1 + 1) * (c2 - c1 + 1) <= 64:
            for row in range(r1, r2 + 1):
                for col in range(c1, c2 + 1):
                    found.update(self._single.get((sheet, row, col), ()))
        else:
            if self._cells is None:
                self._cells = np.array(list(self._single), dtype=np.int64).reshape(-1, 3)
            s = self._cells
            hit = (s[:, 0] == sheet) & (s[:, 1] >= r1) & (s[:, 1] <= r2) & (s[:, 2] >= c1) & (s[:, 2] <= c2)
            for cell in s[hit].tolist():
                found.update(self._single[cell[0], cell[1], cell[2]])
        return found

    def dependents(self, seeds: Iterable[int]) -> set[int]:
        """The seeds and every formula that depends on one of them, however far down."""
        tree = self._row_trees()
        reached = set(seeds)
        waiting = list(reached)
        while waiting:
            place = self.places[waiting.pop()]
            if place.r1 == place.r2 and place.c1 == place.c2:
                new = set(self._single.get((place.sheet, place.r1, place.c1), ()))
                node = _LEAVES + place.r1
                while node:
                    # A range that was reached once has told all its readers: out with it.
                    for ref in tree.pop((place.sheet, place.c1, node), ()):
                        new.update(self._readers[ref])
                    node >>= 1
            else:
                new = self.readers(place)
            new -= reached
            reached |= new
            waiting += new
        return reached

    def _row_trees(self) -> dict[tuple[int, int, int], list[Reference]]:
        """(sheet, column, node) -> the ranges that cover all rows below that node of the tree."""
        tree: dict[tuple[int, int, int], list[Reference]] = {}
        used: dict[int, list[int]] = {}
        for sheet, col in self._columns:
            used.setdefault(sheet, []).append(col)
        for ref in self._ranges:
            columns = [col for col in used.get(ref.sheet, ()) if ref.c1 <= col <= ref.c2]
            if not columns:
                continue
            low, high = _LEAVES + ref.r1, _LEAVES + ref.r2 + 1
            nodes = []
            while low < high:
                if low & 1:
                    nodes.append(low)
                    low += 1
                if high & 1:
                    high -= 1
                    nodes.append(high)
                low >>= 1
                high >>= 1
            for col in columns:
                for node in nodes:
                    tree.setdefault((ref.sheet, col, node), []).append(ref)
        return tree
