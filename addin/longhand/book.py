"""The checking sheets of a workbook: every TB_ call planned, placed, written."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field
from functools import partial
from typing import Any, Final

import numpy as np

from ..blocks.schedule import Schedule
from ..catalogue.registry import CATALOGUE
from ..catalogue.types import Longhand, NoLonghand, Row
from ..cells import Refused
from ..leading import heading_row, wanted
from ..progress import Progress
from ..units import UnitError
from ..xlsx.a1 import to_a1
from ..xlsx.refusals import Refusal
from .arguments import Argument, Shape, in_group, resolve, same_datum, taken
from .block import FIRST as FIRST_BLOCK
from .block import Block, Check, new_block_sheet
from .calls import Call, NotWorked, Outcome, render
from .convert import Conversion
from .detachtext import constant
from .grid import Sheet, quoted_sheet
from .outcomes import BlockOutcome, Guard, RowsOutcome, WordsOutcome, named, written
from .rows import Group, Line, RowSheet
from .schedule import ScheduleOutcome, plan_schedule, schedule_outcome
from .source import Source, TbCell, plain
from .summary import Entry, Summary
from .tablecalls import TableCalls
from .tableplan import TableOutcome
from .tableread import OfRole
from .tools import convert_formula
from .unitsheet import UnitSheet

SUMMARY, UNITS, CELLS = "Long-hand", "LH units", "LH cells"
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
        taken_names = {sheet.name.casefold() for sheet in self.source.package.sheets}
        if SUMMARY.casefold() in taken_names or UNITS.casefold() in taken_names:
            raise Refusal(
                f"{self.source.package.path.name} has checking sheets already ({SUMMARY}, {UNITS}). "
                "Take the workbook without them."
            )
        self.summary = Summary(Sheet(SUMMARY))
        self.units = UnitSheet(Sheet(UNITS))
        self.tables = TableCalls(self.source)
        self._loose = Block(None, [], lambda role: Conversion("", 1.0))
        self._known: dict[Any, Any] = {}
        self._rows: dict[str, list[RowsOutcome]] = {}
        count = len(self.source.cells)
        for i, cell in enumerate(self.source.cells):
            if self.progress is not None and i & 255 == 0:
                self.progress("plan", i, count)
            self.entries.append(self._cell(cell))
        self._lay_out()

    # Planning

    def _cell(self, cell: TbCell) -> Entry:
        entry = Entry(cell)
        try:
            if cell.trouble:
                raise NotWorked(cell.trouble)
            for call in cell.calls:
                call.outcome = self._call(call, cell)
            self._check(cell, entry)
        except NotWorked as reason:
            entry.trouble = str(reason)
        except (Refused, UnitError) as refusal:
            entry.trouble = str(refusal)
        return entry

    def _call(self, call: Call, cell: TbCell) -> Outcome:
        row = CATALOGUE.get(call.name)
        if row is None:
            raise NotWorked(f"there is no function {call.name}")
        given = [resolve(items, cell.sheet, self.source) for items in call.args]
        if row.kind == "tool":
            return self._tool(row, given, cell)
        empty = resolve([], cell.sheet, self.source)
        if row.max_args is not None and len(given) > row.max_args:
            raise NotWorked(f"{row.name} takes at most {row.max_args} arguments")
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
            if isinstance(row.routine, Schedule):
                return self._schedule(row, key, arguments, of_role, results, guard, cell)
            return self.tables.outcome(row, key, arguments, of_role, results, guard, cell)
        shapes = [a.shape for a in arguments]
        if all(shape == (1, 1) for shape in shapes):
            return self._block(row, units, arguments, results, guard)
        return self._elements(row, units, arguments, results, single, guard, cell)

    def _tool(self, row: Row, given: list[Argument], cell: TbCell) -> Outcome:
        if row.name == "TB_CONVERT":
            return WordsOutcome([[None]], convert_formula(given))
        value = cell.cell.value
        if len(cell.items) != 1:
            raise NotWorked(f"{row.name} gives a text inside another formula")
        return WordsOutcome([[value]])

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
        elements = _broadcast([a.shape for a in arguments])
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
            for arg, argument, conversion in zip(row.args, arguments, conversions, strict=True):
                if conversion is not None:
                    same_datum(argument, arg, conversion)
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

    # The cells that show the results

    def _check(self, cell: TbCell, entry: Entry) -> None:
        only = cell.items[0] if len(cell.items) == 1 else None
        if not isinstance(only, Call):
            if cell.cell.ref is not None and cell.cell.ref[:2] != cell.cell.ref[2:]:
                raise NotWorked("the formula fills several cells and is not one call alone")
            plain(cell.items, self.source, cell.sheet, named)  # whatever cannot be written is found here
            last = [item for item in cell.items if isinstance(item, Call)][-1].outcome
            block = last.block if isinstance(last, BlockOutcome) else self._loose
            entry.formula = lambda: plain(cell.items, self.source, cell.sheet, written)
            entry.formula_of = lambda i, j: render(cell.items, str, written)
            self._add_check(block, cell, entry, 0, 0, entry.formula, "")
            return
        outcome = only.outcome
        assert outcome is not None
        entry.formula_of = partial(_repeated, outcome)
        if isinstance(outcome, WordsOutcome):
            if outcome.formula is None:
                entry.words = True
            else:
                self._add_check(self._loose, cell, entry, 0, 0, outcome.formula, "")
            return
        for i, j in _filled(cell, outcome.shape):
            if isinstance(outcome, BlockOutcome):
                value = _bound(outcome.at, i, j)
                self._add_check(outcome.block, cell, entry, i, j, value, outcome.results[j])
            elif isinstance(outcome, RowsOutcome):
                self._own_line(outcome, cell, entry, i, j)
            elif isinstance(outcome, TableOutcome | ScheduleOutcome):
                outcome.own(i, j, f"{quoted_sheet(cell.sheet)}!{to_a1(cell.cell.row + i, cell.cell.col + j)}")
                entry.table = outcome

    def _add_check(
        self, block: Block, cell: TbCell, entry: Entry, i: int, j: int, value: Callable[[], str], result: str
    ) -> None:
        a1 = to_a1(cell.cell.row + i, cell.cell.col + j)
        check = Check(cell, f"{quoted_sheet(cell.sheet)}!{a1}", f"{cell.sheet}!{a1}", value)
        if result:
            check.scale = lambda: block.scale_ref(result)
        block.checks.append(check)
        entry.checks.append((block, check))

    def _own_line(self, outcome: RowsOutcome, cell: TbCell, entry: Entry, i: int, j: int) -> None:
        line, result = outcome.place(i, j)
        ref = f"{quoted_sheet(cell.sheet)}!{to_a1(cell.cell.row + i, cell.cell.col + j)}"
        chosen = outcome.group.lines[line]
        chosen.own.setdefault(result, ref)
        if not chosen.target:
            chosen.target = ref
        entry.rows = outcome

    # Placing and writing

    def _lay_out(self) -> None:
        tolerance = self.summary.tolerance
        if self._loose.checks:
            self.blocks.append(self._loose)
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
        self.summary.write(self.entries, self.source.package.path.name)
        self.sheets = [self.summary.sheet, *block_sheets, *(rows.sheet for rows in row_sheets), *table_sheets]
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


def _bound(at: Callable[[int, int], str], i: int, j: int) -> Callable[[], str]:
    return lambda: at(i, j)


def _repeated(outcome: Outcome, i: int, j: int) -> str:
    """A cell of an array formula: one row or column fills all; beyond the result there is nothing."""
    rows, cols = outcome.shape
    if (rows > 1 and i >= rows) or (cols > 1 and j >= cols):
        raise NotWorked("the array formula covers more cells than its result has")
    return outcome.at(i if rows > 1 else 0, j if cols > 1 else 0)


def _broadcast(shapes: list[Shape]) -> Shape:
    try:
        rows, cols = np.broadcast_shapes(*shapes)
    except ValueError:
        raise NotWorked("the ranges do not fit together") from None
    return rows, cols


def _filled(cell: TbCell, shape: Shape) -> list[Shape]:
    """The elements of the answer that the formula's cells show."""
    if cell.cell.kind == "plain" or cell.cell.ref is None:
        return [(0, 0)]
    r1, c1, r2, c2 = cell.cell.ref
    rows, cols = min(r2 - r1 + 1, shape[0]), min(c2 - c1 + 1, shape[1])
    return [(i, j) for i in range(rows) for j in range(cols)]
