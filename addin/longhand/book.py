"""The checking sheets of a workbook: every TB_ call planned, placed, written."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field
from functools import partial
from typing import Any, Final

from ..blocks.schedule import Schedule
from ..catalogue.registry import CATALOGUE
from ..catalogue.types import Longhand, NoLonghand, Row
from ..cells import Refused
from ..leading import heading_row, wanted
from ..progress import Progress
from ..units import UnitError
from ..xlsx.refusals import Refusal
from .arguments import Argument, in_group, resolve, taken
from .block import FIRST as FIRST_BLOCK
from .block import Block, new_block_sheet
from .calls import Call, NotWorked, Outcome, Refuses
from .comparison import Comparison
from .convert import Conversion
from .detachtext import constant
from .expressions import SINGLE, broadcast
from .given import Reader
from .grid import Sheet
from .outcomes import BlockOutcome, Guard, RowsOutcome, WordsOutcome, named, written
from .rows import Group, Line, RowSheet
from .schedule import ScheduleOutcome, plan_schedule, schedule_outcome
from .source import Source, TbCell, plain
from .staged import Staged
from .summary import Entry, Summary
from .tablecalls import NOTED, TableCalls
from .tableread import OfRole
from .tools import convert_outcome
from .unitsheet import UnitSheet

SUMMARY, UNITS, CELLS, STAGED = "Long-hand", "LH units", "LH cells", "LH arrays"
MOST_LINES: Final = 20_000
"""Rows of one call that get a working."""
_ROWS_A_SHEET: Final = 60_000


@dataclass
class Book:
    """The plan of all checking sheets of a workbook."""

    source: Source
    progress: Progress | None = None
    entries: list[Entry] = field(default_factory=list)
    blocks: list[Block] = field(default_factory=list)
    sheets: list[Sheet] = field(default_factory=list)

    def __post_init__(self) -> None:
        self.summary = Summary(Sheet(SUMMARY))
        self.units = UnitSheet(Sheet(UNITS))
        self.tables = TableCalls(self.source)
        self.staged = Staged(Sheet(STAGED))
        self.reader = Reader(self.source, self.staged, self.progress)
        self.comparison = Comparison(self.source, self.staged, self.reader)
        self._known: dict[Any, Any] = {}
        self._rows: dict[str, list[RowsOutcome]] = {}
        count = len(self.source.cells)
        for i, cell in enumerate(self.source.cells):
            if self.progress is not None and i & 255 == 0:
                self.progress("plan", i, count)
            self.entries.append(self._cell(cell))
        self._lay_out()
        there = {sheet.name.casefold() for sheet in self.source.package.sheets}
        twice = [sheet.name for sheet in self.sheets if sheet.name.casefold() in there]
        if twice:
            raise Refusal(
                f"{self.source.package.path.name} has checking sheets already ({', '.join(twice)}). "
                "Take the workbook without them."
            )

    # Planning

    def _cell(self, cell: TbCell) -> Entry:
        entry = Entry(cell)
        try:
            if cell.trouble:
                raise NotWorked(cell.trouble)
            calls = cell.calls
            taken_whole = {
                id(items[0]) for call in calls for items in (*call.args, cell.items) if len(items) == 1
            }
            for number, call in enumerate(calls):
                call.outcome = outcome = self._call(call, number, cell)
                if outcome.shape != SINGLE and not outcome.one_range and id(call) not in taken_whole:
                    call.range = self.staged.results(cell, f"{call.name}(...)", outcome).text()
            self.comparison.add(cell, entry)
        except (NotWorked, Refused, UnitError) as reason:
            entry.trouble = str(reason)
            entry.refused = not isinstance(reason, NotWorked) or isinstance(reason, Refuses)
        return entry

    def _call(self, call: Call, number: int, cell: TbCell) -> Outcome:
        row = CATALOGUE.get(call.name)
        if row is None:
            raise NotWorked(f"there is no function {call.name}")
        if row.max_args is not None and len(call.args) > row.max_args:
            raise NotWorked(f"{row.name} takes at most {row.max_args} arguments")
        if row.name == "TB_CONVERT":
            return convert_outcome(self.reader.arguments(call, number, cell, row))
        if row.kind == "tool":
            if len(cell.items) != 1:
                raise NotWorked(f"{row.name} gives a text inside another formula")
            return WordsOutcome([[cell.cell.value]])
        given = self.reader.arguments(call, number, cell, row)
        empty = resolve([], cell.sheet, self.source)
        given += [empty] * (row.leading + len(row.args) - len(given))
        units = given[row.leading - 1]
        results, single, guard = tuple(r.name for r in row.results), True, None
        if row.has_result:
            asked = wanted(row, given[0].value())
            results, single = tuple(r.name for r in asked.results), asked.single
            if asked.form != "values":
                return WordsOutcome(heading_row(asked, self.units.read(units)[1]).tolist())
            if given[0].area is not None:
                guard = Guard(given[0].text(written), str(given[0].value()))
        arguments = given[row.leading :]
        if isinstance(row.longhand, NoLonghand) or row.longhand is None:
            reason = row.longhand.reason if row.longhand is not None else "it has no long-hand working"
            raise NotWorked(f"{row.name}: {reason}")
        self.units.read(units)
        if not isinstance(row.longhand, Longhand):
            key = self._key(row, units, arguments)
            of_role = partial(self.units.conversion, units)
            if "note" in results and row.name in NOTED and cell.items != [call]:
                raise NotWorked(f"{row.name} gives notes inside another formula")
            if isinstance(row.routine, Schedule):
                return self._schedule(row, key, arguments, of_role, results, guard, cell)
            return self.tables.outcome(row, key, arguments, of_role, results, guard, cell)
        shapes = [a.shape for a in arguments]
        if all(shape == (1, 1) for shape in shapes):
            return self._block(row, units, arguments, results, guard)
        return self._elements(row, units, arguments, results, single, guard, cell)

    def _key(self, row: Row, units: Argument, arguments: list[Argument]) -> Any:
        return row.name, units.text(named), *(self._text(a, named) for a in arguments)

    def _text(self, argument: Argument, name: Callable[[Call], str]) -> str:
        if argument.area is not None:
            return argument.area.text()
        if argument.form == "call":
            return f"#{id(argument.items[0].outcome)}"  # type: ignore[union-attr]
        return plain(argument.items, self.source, argument.sheet, name)

    def _block(
        self,
        row: Row,
        units: Argument,
        arguments: list[Argument],
        results: tuple[str, ...],
        guard: Guard | None,
    ) -> BlockOutcome:
        key = self._key(row, units, arguments)
        block = self._known.get(key)
        if block is None:
            block = Block(row, arguments, partial(self.units.conversion, units))
            self._known[key] = block
            self.blocks.append(block)
        for result in results:
            block.want(result)
        return BlockOutcome(block, results, guard)

    def _elements(
        self,
        row: Row,
        units: Argument,
        arguments: list[Argument],
        results: tuple[str, ...],
        single: bool,
        guard: Guard | None,
        cell: TbCell,
    ) -> RowsOutcome:
        try:
            elements = broadcast([a.shape for a in arguments])
        except NotWorked as reason:
            raise Refuses(str(reason)) from None
        if not single and min(elements) > 1:
            raise NotWorked("several results take ranges of one row or one column")
        count = elements[0] * elements[1]
        if count > MOST_LINES:
            raise NotWorked(f"it has more than {MOST_LINES} rows")
        key = self._key(row, units, arguments)
        group = self._known.get(key)
        roles = {r.name: r.role for r in row.results}
        if group is None:
            conversions = [
                None if a.role == "choice" else self.units.conversion(units, a.role) for a in row.args
            ]
            lines = [
                Line(str(n + 1), "", _given(row, arguments, conversions, n // elements[1], n % elements[1]))
                for n in range(count)
            ]
            group = Group(f"{cell.where}   ={cell.cell.text}", cell.target, conversions, {}, lines)
            self._known[key] = group
        for result in results:
            group.results.setdefault(result, self.units.conversion(units, roles[result]))
        shape = elements if single else (count, len(results)) if elements[1] == 1 else (len(results), count)
        outcome = RowsOutcome(shape, results, single, elements, group, guard)
        self._rows.setdefault(row.name, []).append(outcome)
        return outcome

    def _schedule(
        self,
        row: Row,
        key: Any,
        arguments: list[Argument],
        of_role: OfRole,
        results: tuple[str, ...],
        guard: Guard | None,
        cell: TbCell,
    ) -> ScheduleOutcome:
        plan = self._known.get(key)
        if plan is None:
            plan = self._known[key] = plan_schedule(row, arguments, of_role, cell)
            for kind, carrier in plan.carriers.items():
                self._rows.setdefault(row.routine.kinds[kind].name, []).append(carrier)
        notes = {}
        if "note" in results:
            values, col = self.source.values(cell.sheet), cell.cell.col + results.index("note")
            notes = {i: constant(values.get((cell.cell.row + i, col))) for i in range(plan.table.size)}
        return schedule_outcome(row, plan, of_role, results, guard, notes)

    # Placing and writing

    def _lay_out(self) -> None:
        tolerance = self.summary.tolerance
        if self.comparison.loose.checks:
            self.blocks.append(self.comparison.loose)
        block_sheets: list[Sheet] = []
        at = _ROWS_A_SHEET + 1
        for block in self.blocks:
            if at > _ROWS_A_SHEET:
                number = len(block_sheets) + 1
                block_sheets.append(new_block_sheet(CELLS if number == 1 else f"{CELLS} {number}"))
                at = FIRST_BLOCK
            at = block.place(block_sheets[-1], at)
        row_sheets = []
        for name, outcomes in self._rows.items():
            row = CATALOGUE[name]
            needed = [r.name for r in row.results if any(r.name in o.group.results for o in outcomes)]
            rows = RowSheet(row, Sheet(f"LH {name}"), needed, tolerance)
            row_sheets.append(rows)
            numbers: dict[int, int] = {}
            for outcome in outcomes:
                if id(outcome.group) not in numbers:
                    numbers[id(outcome.group)] = rows.place(outcome.group)
                outcome.rows, outcome.number = rows, numbers[id(outcome.group)]
        table_sheets = self.tables.place()
        for i, block in enumerate(self.blocks):
            if self.progress is not None and i & 255 == 0:
                self.progress("write", i, len(self.blocks))
            block.write(written, tolerance)
        for rows in row_sheets:
            rows.write()
        self.tables.write(tolerance)
        self.staged.write()
        self.summary.write(self.entries, self.source.package.path.name)
        self.sheets = [self.summary.sheet, *block_sheets, *(rows.sheet for rows in row_sheets), *table_sheets]
        if self.staged.used:
            self.sheets.append(self.staged.sheet)
        if self.units.used:
            self.sheets.append(self.units.sheet)


def _given(
    row: Row, arguments: list[Argument], conversions: list[Conversion | None], i: int, j: int
) -> Callable[[], list[Any]]:
    """The contents of one line, once everything has its place."""

    def contents() -> list[Any]:
        out = []
        for arg, argument, conversion in zip(row.args, arguments, conversions, strict=True):
            content, own = taken(argument, arg, written, i, j)
            out.append(content if conversion is None else in_group(content, own, conversion))
        return out

    return contents
