"""Table calls of a book: planned once for each set of arguments, placed on sheets of their own."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field
from typing import Any

from ..catalogue.types import Row
from .arguments import Argument
from .calls import NotWorked
from .convert import Conversion
from .detachtext import constant
from .grid import Sheet
from .outcomes import Guard
from .section import Section
from .source import Source, TbCell
from .tableplan import TableOutcome, envelope, plan_balance, plan_branchflow, plan_cases, plan_run
from .tableread import OfRole, ReadTable

_STACKED = ("TB_BALANCE", "TB_BRANCHFLOW")
"""Functions whose tables are short: all on one sheet."""

NOTED = ("TB_RUNCASES", "TB_SCHEDULE")
"""Functions whose notes are not worked: they stand as the cells of the call hold them."""

MOST_SHEETS = 16
"""Tables that get sheets of their own, with headings on every page; beyond, they are stacked."""


@dataclass(slots=True, eq=False)
class _Plan:
    """One set of arguments: the section with the results, and those behind it."""

    name: str
    section: Section
    table: ReadTable | None
    cases: list[tuple[str, Section]] = field(default_factory=list)


class TableCalls:
    """The table calls of one workbook."""

    def __init__(self, source: Source) -> None:
        self._source = source
        self._plans: dict[Any, _Plan] = {}

    def outcome(
        self,
        row: Row,
        key: Any,
        arguments: list[Argument],
        of_role: OfRole,
        results: tuple[str, ...],
        guard: Guard | None,
        cell: TbCell,
    ) -> TableOutcome:
        """What a call becomes. Raises NotWorked."""
        plan = self._plans.get(key)
        if plan is None:
            title = f"{cell.where}   ={cell.cell.text}"
            plan = self._plans[key] = self._plan(row, arguments, of_role, title, cell.target)
        section = plan.section
        by_name = {r.name: r for r in row.results}
        wide = results[0].endswith("_by_case")
        names = tuple(f"{results[0]}_{n}" for n in range(1, len(plan.cases) + 1)) if wide else results
        constants = {}
        for j, name in enumerate(names):
            result = by_name[results[0]] if wide else by_name[name]
            if name == "note" and plan.cases:
                constants[name] = self._stored(cell, j, plan)
                continue
            conversion = Conversion("", 1.0) if result.role == "text" else of_role(result.role)
            section.results.setdefault(name, (result, conversion))
        table = plan.table
        return TableOutcome(
            section,
            names,
            1 if table is None else table.size,
            [] if table is None else table.rows,
            (lambda i: "") if table is None else table.whole_row,
            guard,
            constants,
        )

    def _stored(self, cell: TbCell, j: int, plan: _Plan) -> list[str]:
        """A column of texts as the cells of the call hold it."""
        values = self._source.values(cell.sheet)
        size = 1 if plan.table is None else plan.table.size
        return [constant(values.get((cell.cell.row + i, cell.cell.col + j))) for i in range(size)]

    def _plan(self, row: Row, arguments: list[Argument], of_role: OfRole, title: str, target: str) -> _Plan:
        if row.name == "TB_RUNCASES":
            cases, table = plan_cases(row, arguments, of_role, title, target)
            return _Plan(row.name, envelope(row, cases, table, title, target), table, cases)
        planner = _PLANNERS.get(row.name)
        if planner is None:
            raise NotWorked(f"{row.name} has no long-hand for tables")
        section, found = planner(row, arguments, of_role, title, target)
        return _Plan(row.name, section, found)

    def place(self) -> list[Sheet]:
        """Give every section its sheet and its place there."""
        many = sum(1 + len(p.cases) for p in self._plans.values() if p.name not in _STACKED) > MOST_SHEETS
        stacks: dict[str, tuple[Sheet, int]] = {}
        sheets: list[Sheet] = []
        counts: dict[str, int] = {}
        for plan in self._plans.values():
            number = counts[plan.name] = counts.get(plan.name, 0) + 1
            name = f"LH {plan.name}"
            if many or plan.name in _STACKED:
                self._stack(name, [plan.section], stacks, sheets)
                self._stack(f"{name} cases", [section for _, section in plan.cases], stacks, sheets)
                continue
            name += f" {number}" if number > 1 else ""
            self._alone(plan.section, self._new(name, plan.section, sheets))
            for i, (_, section) in enumerate(plan.cases, 1):
                self._alone(section, self._new(f"{name} case {i}", section, sheets))
        return sheets

    def _stack(
        self,
        name: str,
        sections: list[Section],
        stacks: dict[str, tuple[Sheet, int]],
        sheets: list[Sheet],
    ) -> None:
        """Put sections one below the other on a sheet of their own."""
        for section in sections:
            if name not in stacks:
                stacks[name] = self._new(name, section, sheets), 3
            sheet, at = stacks[name]
            stacks[name] = sheet, section.place(sheet, at)

    def _new(self, name: str, section: Section, sheets: list[Sheet]) -> Sheet:
        sheet = Sheet(name, fit_width=False)
        sheet.put(1, 1, f"{section.title}: long-hand working", "title")
        sheets.append(sheet)
        return sheet

    def _alone(self, section: Section, sheet: Sheet) -> None:
        section.place(sheet, 3)
        sheet.title_rows = section.heading_rows
        sheet.print_areas = section.print_areas
        sheet.title_columns = (1, 2)

    def write(self, tolerance: str) -> None:
        for plan in self._plans.values():
            for _, section in plan.cases:
                section.write(tolerance)
            plan.section.write(tolerance)


_PLANNERS: dict[str, Callable[..., tuple[Section, ReadTable | None]]] = {
    "TB_RUN": plan_run,
    "TB_BALANCE": plan_balance,
    "TB_BRANCHFLOW": plan_branchflow,
}
