"""The front sheet: every TB_ cell with its verdict, and a link to its working."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field
from typing import Any, Final

from ..cells import CellError
from .block import Block, Check
from .calls import Call
from .grid import Formula, Link, Sheet, fixed, local, quoted_sheet
from .outcomes import RowsOutcome
from .schedule import ScheduleOutcome
from .source import TbCell
from .tableplan import TableOutcome

TOLERANCE: Final = 1e-9
HEAD_ROW: Final = 12
_HEAD: Final = ("cell", "function", "formula", "long-hand", "own value", "difference", "verdict", "working")
_COUNTS: Final = (
    ("agrees", "within the tolerance of its long-hand working"),
    ("differs", "outside the tolerance"),
    ("error", "an error in the cell and in the working alike"),
    ("text", "not a number: nothing to work"),
    ("not worked", "no long-hand working; the reason stands beside the cell"),
)


@dataclass(slots=True, eq=False)
class Entry:
    """One TB_ cell of the workbook and what became of it."""

    cell: TbCell
    trouble: str = ""
    """Why it has no working."""
    refused: bool = False
    """Whether that is what the function itself has against its arguments."""
    words: bool = False
    """Whether it is one call that gives texts which stand as constants: headings, notes."""
    checks: list[tuple[Block, Check]] = field(default_factory=list)
    rows: RowsOutcome | None = None
    table: TableOutcome | ScheduleOutcome | None = None
    shown: set[str] = field(default_factory=set)
    """Results whose cells stand beside their rows or their table."""
    formula_of: Callable[[int, int], str] | None = None
    """The long-hand formula of each cell that the formula fills, counted from its first."""
    row: int = 0
    """Its row on the summary."""

    @property
    def word(self) -> str:
        """Its verdict where no formula gives one."""
        if self.trouble:
            failed = self.refused and isinstance(self.cell.cell.value, CellError)
            return "error" if failed else "not worked"
        return "" if self.checks or self.rows is not None or self.table is not None else "text"


class Summary:
    """The front sheet."""

    def __init__(self, sheet: Sheet) -> None:
        self.sheet = sheet
        self.tolerance = sheet.ref(4, 2)

    def write(self, entries: list[Entry], book: str) -> None:
        sheet = self.sheet
        sheet.widths = {1: 20.0, 2: 16.0, 3: 56.0, 4: 13.0, 5: 13.0, 6: 10.0, 7: 10.0, 8: 26.0}
        sheet.put(1, 1, "Long-hand working and check", "title")
        sheet.line(3, ["workbook", book])
        sheet.line(4, ["tolerance", TOLERANCE])
        sheet.put(4, 3, "relative difference that is accepted", "note")
        first, last = HEAD_ROW + 1, HEAD_ROW + max(1, len(entries))
        area = f"{fixed(first, 7)}:{fixed(last, 7)}"
        for i, (word, meaning) in enumerate(_COUNTS):
            sheet.put(5 + i, 1, word)
            sheet.put(5 + i, 2, Formula(f'COUNTIF({area},"{word}")'), "number")
            sheet.put(5 + i, 3, meaning, "note")
        sheet.put(
            10,
            1,
            "Every number on the sheets behind is an ordinary formula. The results are hydraulic forces from "
            "a stated idealisation; local codes and licensed practice govern.",
            "note",
        )
        sheet.line(HEAD_ROW, list(_HEAD), "head")
        for i, entry in enumerate(entries):
            entry.row = first + i
            self._entry(entry)
        sheet.verdicts.append(f"G{first}:G{last}")
        sheet.title_rows = (HEAD_ROW, HEAD_ROW)
        sheet.freeze = (HEAD_ROW, 1)

    def _entry(self, entry: Entry) -> None:
        sheet, at, cell = self.sheet, entry.row, entry.cell
        sheet.put(at, 1, cell.where, "link")
        sheet.links.append(Link(at, 1, cell.target))
        names = dict.fromkeys(i.name for i in cell.items if isinstance(i, Call))
        sheet.put(at, 2, ", ".join(names))
        sheet.put(at, 3, f"={cell.cell.text}", "mono")
        sheet.fit_height(at)
        if entry.trouble:
            sheet.put(at, 7, entry.word, "verdict")
            sheet.put(at, 8, entry.trouble, "wrapped")
            sheet.fit_height(at)
        elif entry.word:
            sheet.put(at, 7, entry.word, "verdict")
        elif entry.rows is not None:
            self._rows(entry, entry.rows)
        elif isinstance(entry.table, ScheduleOutcome):
            self._schedule(entry, entry.table)
        elif entry.table is not None:
            section = entry.table.section
            sheet.put(at, 4, f"{len(section.lines)} rows", "note")
            self._verdict(entry, *section.verdict_areas(entry.shown))
            self._link(at, section.sheet, local(section.top, 1))
        elif entry.checks:
            self._checks(entry)

    def _checks(self, entry: Entry) -> None:
        sheet, at = self.sheet, entry.row
        block, check = entry.checks[0]
        assert block.sheet is not None
        if len(entry.checks) == 1:
            for col, source, style in ((4, 4, "number"), (5, 6, "linked"), (6, 7, "difference")):
                sheet.put(at, col, Formula(block.sheet.ref(check.at, source)), style)
            sheet.put(at, 7, Formula(block.sheet.ref(check.at, 10)), "verdict")
        else:
            sheet.put(at, 4, f"{len(entry.checks)} cells", "note")
            self._verdict(entry)
        self._link(at, block.sheet, local(block.top, 1))

    def _rows(self, entry: Entry, outcome: RowsOutcome) -> None:
        sheet, at = self.sheet, entry.row
        assert outcome.rows is not None
        sheet.put(at, 4, f"{len(outcome.group.lines)} rows", "note")
        self._verdict(entry, *outcome.rows.verdict_areas(outcome.number, entry.shown))
        self._link(at, outcome.rows.sheet, local(outcome.rows.verdicts[outcome.number][0] - 3, 1))

    def _schedule(self, entry: Entry, outcome: ScheduleOutcome) -> None:
        sheet, at = self.sheet, entry.row
        sheet.put(at, 4, f"{len(outcome.table.rows)} rows", "note")
        areas: list[str] = []
        for kind, carrier in outcome.carriers.items():
            assert carrier.rows is not None
            areas += carrier.rows.verdict_areas(carrier.number, outcome.results_of(kind, entry.shown))
            self._link(at, carrier.rows.sheet, local(carrier.rows.verdicts[carrier.number][0] - 3, 1))
        self._verdict(entry, *areas)

    def _verdict(self, entry: Entry, *areas: str) -> None:
        """The verdict on a formula from those in some areas and those of its own checks."""
        if entry.checks:
            (block, first), (_, last) = entry.checks[0], entry.checks[-1]
            assert block.sheet is not None
            areas = *areas, f"{block.sheet.ref(first.at, 10)}:{fixed(last.at, 10)}"
        self.sheet.put(entry.row, 7, Formula(joint(*areas)), "verdict")

    def _link(self, at: int, sheet: Sheet, a1: str) -> None:
        self.sheet.put(at, 8, f"{sheet.name}!{a1}", "link")
        self.sheet.links.append(Link(at, 8, f"{quoted_sheet(sheet.name)}!{a1}"))

    def verdicts(self, entries: list[Entry], values: dict[int, list[Any]]) -> dict[str, list[Entry]]:
        """The entries by verdict, from the values of the front sheet."""
        found: dict[str, list[Entry]] = {word: [] for word, _ in _COUNTS}
        for entry in entries:
            word = entry.word
            if not word:
                shown = values[entry.row][6]
                word = shown if isinstance(shown, str) and shown in found else "error"
            found[word].append(entry)
        return found


def joint(*areas: str) -> str:
    """One verdict for areas of them."""

    def count(word: str) -> str:
        return "+".join(f'COUNTIF({area},"{word}")' for area in areas)

    text = f'IF({count("text")}>0,"text","error")'
    return f'IF({count("differs")}>0,"differs",IF({count("agrees")}>0,"agrees",{text}))'
