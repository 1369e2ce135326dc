"""The sheet of arrays: what must stand in cells before a working can read it."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field
from typing import Final

from .calls import NotWorked, Outcome, Shape
from .grid import FILLED, Content, Formula, Link, Sheet, local
from .source import Area, TbCell

_FIRST: Final = 4
MOST_CELLS: Final = 10_000
"""Cells of one array: the embedded evaluator fills no more."""


@dataclass(slots=True)
class Staged:
    """Ranges filled with expressions and with results, one below the other.

    Each has its place at once; its formulas are written when everything else has its place.
    """

    sheet: Sheet
    _at: int = _FIRST
    _waiting: list[Callable[[], None]] = field(default_factory=list)

    def __post_init__(self) -> None:
        sheet = self.sheet
        sheet.put(1, 1, "Arrays of the long-hand working", "title")
        sheet.put(
            2,
            1,
            "Arguments that are computed in the formula itself, formulas around several results, and "
            "results that another formula takes as one range. Each stands here as ordinary formulas.",
            "note",
        )
        sheet.widths |= {1: 16.0, **{col: 13.0 for col in range(2, 12)}}

    @property
    def used(self) -> bool:
        """Whether anything stands here."""
        return bool(self._waiting)

    def array(self, cell: TbCell, shown: str, shape: Shape, text: Callable[[], str]) -> Area:
        """Cells that one formula fills; ``shown`` is what the formula of the workbook says there."""
        area = self._place(cell, shown, shape)

        def write() -> None:
            for row in range(area.r1, area.r2 + 1):
                for col in range(area.c1, area.c2 + 1):
                    self.sheet.put(row, col, FILLED, "linked")
            ref = f"{local(area.r1, area.c1)}:{local(area.r2, area.c2)}"
            self.sheet.put(area.r1, area.c1, Formula(text(), ref), "linked")

        self._waiting.append(write)
        return area

    def results(self, cell: TbCell, shown: str, outcome: Outcome) -> Area:
        """The results of a call side by side."""
        area = self._place(cell, shown, outcome.shape)

        def write() -> None:
            for i in range(outcome.shape[0]):
                for j in range(outcome.shape[1]):
                    content: Content = Formula(outcome.at(i, j))
                    self.sheet.put(area.r1 + i, area.c1 + j, content, "linked")

        self._waiting.append(write)
        return area

    def _place(self, cell: TbCell, shown: str, shape: Shape) -> Area:
        if shape[0] * shape[1] > MOST_CELLS:
            raise NotWorked(f"{shown} has more than {MOST_CELLS} cells")
        sheet, top = self.sheet, self._at
        last = 1 + shape[1]
        sheet.line(top, [f"{cell.where}   {shown}", *[""] * (max(last, 8) - 1)], "block")
        sheet.links.append(Link(top, 1, cell.target))
        self._at = top + shape[0] + 2
        return Area(sheet.name, top + 1, 2, top + shape[0], last)

    def write(self) -> None:
        """Put the formulas on the sheet."""
        for write in self._waiting:
            write()
