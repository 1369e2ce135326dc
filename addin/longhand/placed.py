"""The plan of one table's working: what belongs to it, and the place of each part on its sheet."""

from __future__ import annotations

import re
from collections.abc import Callable, Iterable, Mapping, Sequence
from dataclasses import dataclass, field
from typing import Final

from ..catalogue.types import Column, Result, TableLonghand
from .convert import P_ATM, Conversion
from .grid import Content, Sheet, fixed, local
from .rows import LABELS

SUFFIX: Final = re.compile(r"(.+)\.(prev|next|first|last|column)")
TEXT_FROM, TEXT_TO, FORMULA_TO = 4, 8, 14
"""Columns over which meanings and formulas of the upper part run."""


@dataclass(slots=True, eq=False)
class Entry:
    """A value that the whole table shares: of a start block, or a single argument."""

    name: str
    text: str
    role: str
    content: Callable[[], Content | None]
    conversion: Conversion
    stored: str = ""
    """A word as it is stored now."""


@dataclass(slots=True, eq=False)
class TableLine:
    """One row of the table: its cells as given, the cells whose value it must match."""

    label: str
    target: str
    given: Callable[[], Mapping[str, Content | None]]
    own: dict[str, str] = field(default_factory=dict)


@dataclass(slots=True, eq=False)
class Placed:
    """The plan of one table's working, and where everything of it stands."""

    title: str
    caption: str
    target: str
    working: TableLonghand
    columns: Sequence[tuple[Column, Conversion]]
    entries: list[Entry]
    lines: list[TableLine]
    results: dict[str, tuple[Result, Conversion]] = field(default_factory=dict)
    own: dict[str, str] = field(default_factory=dict)
    """Result that is one value -> the cell that shows it."""
    sheet: Sheet = field(default_factory=lambda: Sheet(""))
    top: int = 1
    _entry_at: dict[str, int] = field(default_factory=dict)
    _single_at: dict[str, int] = field(default_factory=dict)
    _column: dict[str, int] = field(default_factory=dict)
    _raw: dict[str, int] = field(default_factory=dict)
    _result: dict[str, int] = field(default_factory=dict)
    _result_at: dict[str, int] = field(default_factory=dict)
    _head: int = 0
    _first: int = 0
    _verdict: int = 0

    def is_single(self, result: str) -> bool:
        """Whether a result is one value for the whole table."""
        symbol = self.working.results.get(result, result)
        return any(step.symbol == symbol for step in self.working.single)

    def place(self, sheet: Sheet, top: int) -> int:
        """Give everything its place; the next free row comes back."""
        self.sheet, self.top = sheet, top
        at = top + 1
        if self.entries:
            at += 1
            for entry in self.entries:
                self._entry_at[entry.name] = at
                at += 1
        at += 1
        for step in self.working.single:
            self._single_at[step.symbol] = at
            at += 1
        singles = [name for name in self.results if self.is_single(name)]
        at += 1 if singles else 0
        for name in singles:
            self._result_at[name] = at
            at += 1
        self._head = at + 1
        self._first = self._head + 6
        col = LABELS + 1
        for column, _ in self.columns:
            self._raw[column.name] = col
            self._column[column.name] = col + len(self.columns)
            col += 1
        col += len(self.columns)
        for row_step in self.working.rows:
            self._column[row_step.symbol] = col
            col += 1
        for name, (result, _) in self.results.items():
            if not self.is_single(name):
                self._result[name] = col
                col += 3 if result.role == "text" else 4
        self._verdict = col
        return self._first + len(self.lines) + 2

    @property
    def print_areas(self) -> list[tuple[int, int, int, int]]:
        """The upper part, and the table: each on pages of its own."""
        return [(1, 1, self._head - 1, FORMULA_TO), (self._head, 1, self._last, self._verdict)]

    @property
    def heading_rows(self) -> tuple[int, int]:
        """The rows of the heading of the table."""
        return self._head, self._head + 5

    # Where things stand

    def result_ref(self, result: str, line: int) -> str:
        """The cell of a result, in the unit of the call."""
        if result in self._result_at:
            return self.sheet.ref(self._result_at[result], 2)
        return self.sheet.ref(self._first + line, self._result[result])

    def result_range(self, result: str) -> str:
        col = self._result[result]
        return f"{self.sheet.ref(self._first, col)}:{fixed(self._last, col)}"

    def si_ref(self, symbol: str, line: int) -> str:
        """The cell of a row step, in SI."""
        return self.sheet.ref(self._first + line, self._column[symbol])

    def single_ref(self, symbol: str) -> str:
        return self.sheet.ref(self._single_at[symbol], 2)

    def verdict_areas(self, results: Iterable[str]) -> list[str]:
        """The verdicts on some results, as a formula refers to them."""
        areas = []
        for name in sorted(results):
            first, last = self.verdict_ref(name, 0), self.verdict_ref(name, len(self.lines) - 1)
            areas.append(first if first == last else f"{first}:{last.rpartition('!')[2]}")
        return areas

    def verdict_ref(self, result: str, line: int) -> str:
        """The verdict on a result."""
        if result in self._result_at:
            return self.sheet.ref(self._result_at[result], 7)
        col = self._result[result] + (2 if self.results[result][0].role == "text" else 3)
        return self.sheet.ref(self._first + line, col)

    @property
    def _last(self) -> int:
        return self._first + len(self.lines) - 1

    @property
    def _ambient(self) -> str:
        at = self._entry_at.get("pamb")
        return fixed(at, 2) if at is not None else P_ATM

    def _cell(self, name: str, row: int | None) -> str:
        """What {name} stands for, in a formula on a row of the table, or (None) in a single one."""
        match = SUFFIX.fullmatch(name)
        plain, suffix = (match[1], match[2]) if match else (name, "")
        col = self._column.get(plain)
        if col is not None and (suffix or row is not None):
            if suffix == "column":
                return f"{fixed(self._first, col)}:{fixed(self._last, col)}"
            if suffix in ("first", "last"):
                return fixed(self._first if suffix == "first" else self._last, col)
            assert row is not None
            return local(row + {"prev": -1, "next": 1}.get(suffix, 0), col)
        if plain in self._single_at:
            return fixed(self._single_at[plain], 2)
        if plain in self._entry_at:
            return fixed(self._entry_at[plain], 2)
        return self.working.defaults.get(plain, '""')
