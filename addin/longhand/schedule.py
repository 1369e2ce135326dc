"""The schedule of fittings: its rows go to the sheets of the single functions, and come back."""

from __future__ import annotations

from collections.abc import Callable, Collection
from dataclasses import dataclass, field
from typing import Final

from ..blocks.schedule import COLUMN_OF, Schedule
from ..catalogue.types import Longhand, Row
from ..cells import Scalar
from ..tables import is_blank
from .arguments import Argument
from .calls import NotWorked, Shape
from .convert import Conversion
from .grid import Content
from .outcomes import Guard, RowsOutcome
from .rows import Group, Line
from .source import TbCell
from .symbols import quoted
from .tableread import OfRole, ReadTable, read_headed

MOST_ROWS: Final = 20_000
_ZERO: Final = ("Fy", "Ry")
"""Results that a fitting along one axis does not list: they are 0 by symmetry."""


@dataclass(slots=True, eq=False)
class ScheduleOutcome:
    """Results of a schedule: a row for each row of the range."""

    table: ReadTable
    results: tuple[str, ...]
    kinds: dict[int, str]
    """Kind of fitting by row of the range."""
    carriers: dict[str, RowsOutcome]
    lines: dict[int, int]
    """Line of each row on the sheet of its kind."""
    rows_of: dict[str, Row]
    angle: Conversion
    notes: dict[int, str]
    guard: Guard | None = None

    @property
    def shape(self) -> Shape:
        return self.table.size, len(self.results)

    @property
    def one_range(self) -> bool:
        return False

    def range_text(self) -> str:
        raise NotWorked("the formula computes with a column of a schedule")

    def result_of(self, i: int, result: str) -> str:
        """The name that a result has in the function of the row's fitting; "" where it has none."""
        return next(iter(self.results_of(self.kinds[i], (result,))), "")

    def results_of(self, kind: str, results: Collection[str]) -> list[str]:
        """The names that results have in the function of a fitting, of those that it has."""
        return [r.name for r in self.rows_of[kind].results if COLUMN_OF.get(r.name, r.name) in results]

    def at(self, i: int, j: int) -> str:
        text = self._element(i, self.results[j])
        return text if self.guard is None else self.guard.around(text)

    def _element(self, i: int, result: str) -> str:
        if i not in self.table.rows:
            area = self.table.whole_row(i)
            return f'IF(COUNTA({area})=0,"",NA())' if area else '""'
        if result in ("name", "fitting"):
            return self._text(i, result)
        if result == "note":
            return self.notes.get(i, '""')
        if i not in self.kinds:
            return "NA()"
        own = self.result_of(i, result)
        if own:
            text = self._ref(i, own)
        elif result in _ZERO and self.result_of(i, "Fx"):
            text = f"0*{self._ref(i, 'Fx')}"
        elif result == "dir" and self.result_of(i, "Fx"):
            factor = getattr(self.angle.factor, "text", None) or repr(self.angle.factor)
            text = f"IF({self._ref(i, 'Fx')}<0,PI()/{factor},0)"
        else:
            text = '""'
        kind = self.table.ref(i, "fitting")
        return f"IF(LOWER(TRIM({kind}))={quoted(self.kinds[i])},{text},NA())" if kind else text

    def _ref(self, i: int, result: str) -> str:
        carrier = self.carriers[self.kinds[i]]
        assert carrier.rows is not None
        return carrier.rows.sheet.ref(*carrier.rows.places[carrier.number][self.lines[i]][result])

    def _text(self, i: int, column: str) -> str:
        ref = self.table.ref(i, column)
        if ref:
            return f'{ref}&""'
        value = self.table.value(i, column)
        return quoted("" if value is None else str(value))

    def own(self, i: int, j: int, ref: str) -> bool:
        """Set the cell that shows an element beside its working; False where it has none or it is taken."""
        result = self.result_of(i, self.results[j]) if i in self.kinds else ""
        if not result:
            return False
        line = self.carriers[self.kinds[i]].group.lines[self.lines[i]]
        line.target = line.target or ref
        return line.own.setdefault(result, ref) == ref

    def beside(self, i: int, j: int) -> tuple[str, str] | None:
        """The cell that stands beside the working of an element, and the verdict on it."""
        result = self.result_of(i, self.results[j]) if i in self.kinds else ""
        return self.carriers[self.kinds[i]].at_line(self.lines[i], result) if result else None

    def text(self, i: int, j: int, stored: Scalar) -> Scalar:
        """The text that the cell of an element shows; None where it is no text known beforehand."""
        result = self.results[j]
        if i not in self.table.rows:
            return ""
        if result in ("name", "fitting"):
            return str(self.table.value(i, result) or "")
        return stored if result == "note" else None


@dataclass(slots=True, eq=False)
class SchedulePlan:
    """What the calls with one table share."""

    table: ReadTable
    kinds: dict[int, str] = field(default_factory=dict)
    carriers: dict[str, RowsOutcome] = field(default_factory=dict)
    lines: dict[int, int] = field(default_factory=dict)


def plan_schedule(row: Row, arguments: list[Argument], of_role: OfRole, cell: TbCell) -> SchedulePlan:
    """Sort the rows by kind, a group of lines for each. Raises NotWorked."""
    reader: Schedule = row.routine
    heads, cells = arguments
    table = read_headed(reader.columns, heads, cells, of_role, "schedule")
    if len(table.rows) > MOST_ROWS:
        raise NotWorked(f"it has more than {MOST_ROWS} rows")
    plan = SchedulePlan(table)
    conversions = {column.name: conversion for column, conversion in table.columns}
    for i in table.rows:
        kind = str(table.value(i, "fitting") or "").strip().lower()
        function = reader.kinds.get(kind)
        if function is None or not isinstance(function.longhand, Longhand):
            continue
        carrier = plan.carriers.get(kind)
        if carrier is None:
            caption = f"{cell.where}   rows with {kind}   ={cell.cell.text}"
            units = [conversions.get(COLUMN_OF.get(a.name, a.name)) for a in function.args]
            group = Group(caption, cell.target, units, {}, [])
            carrier = plan.carriers[kind] = RowsOutcome((1, 1), (), True, (1, 1), group)
        plan.kinds[i] = kind
        plan.lines[i] = len(carrier.group.lines)
        name = table.value(i, "name")
        label = str(i + 1) if is_blank(name) else str(name)
        carrier.group.lines.append(Line(label, "", _given(table, function, i)))
    return plan


def _given(table: ReadTable, function: Row, i: int) -> Callable[[], list[Content | None]]:
    names = [COLUMN_OF.get(a.name, a.name) for a in function.args]
    present = {column.name for column, _ in table.columns}
    return lambda: [table.content(i, n) if n in present else None for n in names]


def schedule_outcome(
    row: Row,
    plan: SchedulePlan,
    of_role: OfRole,
    results: tuple[str, ...],
    guard: Guard | None,
    notes: dict[int, str],
) -> ScheduleOutcome:
    """What one call with that table becomes."""
    reader: Schedule = row.routine
    outcome = ScheduleOutcome(
        plan.table,
        results,
        plan.kinds,
        plan.carriers,
        plan.lines,
        reader.kinds,
        of_role("angle"),
        notes,
        guard,
    )
    for kind, carrier in plan.carriers.items():
        function = reader.kinds[kind]
        wanted = [r for r in function.results if COLUMN_OF.get(r.name, r.name) in (*results, "Fx")]
        for result in wanted:
            carrier.group.results.setdefault(result.name, of_role(result.role))
    return outcome
