"""Workings in rows: one row a fitting, steps in columns, for tables and ranges."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass, field
from typing import Final

from ..catalogue.registry import wording
from ..catalogue.types import Arg, Longhand, Row, Step
from ..xlsx.a1 import column_letters
from .arguments import linked
from .convert import (
    ANGLE_SCALE,
    P_ATM,
    PLAIN,
    Conversion,
    agreement,
    from_si,
    in_use,
    not_given,
    to_si,
    with_ambient,
)
from .grid import Content, Formula, Link, Sheet, fixed, local
from .sheetpart import SCALE
from .symbols import fill, shown, si_unit

SYMBOL, MEANING, UNIT, FORMULA = 2, 3, 4, 5
"""Rows of the heading, repeated on every page."""
FIRST: Final = 7
LABELS: Final = 2
"""Columns in front: what the row is, and where its result stands."""
NARROW: Final = 13.0
_WIDE: Final = 30.0
_PAPER: Final = 255.0
"""Width in mm that both A4 and Letter have between the margins, lying down."""


@dataclass(slots=True)
class Line:
    """One row: its label, its arguments as given, the cells whose value it must match."""

    label: Content
    target: str
    given: Callable[[], Sequence[Content | None]]
    """The arguments, once everything has its place."""
    own: dict[str, str] = field(default_factory=dict)
    """Result -> reference to the cell that shows it."""


@dataclass(slots=True)
class Group:
    """Lines of one call that share their units."""

    caption: str
    target: str
    arguments: Sequence[Conversion | None]
    results: dict[str, Conversion]
    lines: list[Line]


@dataclass(slots=True)
class RowSheet:
    """A sheet of rows for one function. Where a result of a line stands is kept in ``places``."""

    row: Row
    sheet: Sheet
    results: Sequence[str]
    tolerance: str
    at: int = FIRST
    places: list[list[dict[str, tuple[int, int]]]] = field(default_factory=list)
    verdicts: list[tuple[int, int]] = field(default_factory=list)
    """First and last row of each group."""
    _groups: list[tuple[int, Group]] = field(default_factory=list)
    _raw: dict[str, int] = field(default_factory=dict)
    _column: dict[str, int] = field(default_factory=dict)
    _result: dict[str, int] = field(default_factory=dict)
    _verdict: int = 0
    _steps: Sequence[Step] = ()
    _step_of: dict[str, str] = field(default_factory=dict)
    _roles: dict[str, str] = field(default_factory=dict)

    def __post_init__(self) -> None:
        working = self.row.longhand
        assert isinstance(working, Longhand)
        self._steps = working.steps
        self._step_of = {r.name: working.results.get(r.name, r.name) for r in self.row.results}
        self._roles = {r.name: r.role for r in self.row.results}
        self._allot()
        self._head()

    def _allot(self) -> None:
        col = LABELS + 1
        for arg in self.row.args:
            self._raw[arg.name] = col
            col += 1
        for arg in self.row.args:
            self._column[arg.name] = col
            col += 1
        for step in self._steps:
            self._column[step.symbol] = col
            col += 1
        for name in self.results:
            self._result[name] = col
            col += 4
        self._verdict = col

    def _head(self) -> None:
        sheet, row = self.sheet, self.row
        sheet.put(1, 1, f"{row.name}: {row.summary}", "title")
        for at, text in ((SYMBOL, "symbol"), (MEANING, "meaning"), (UNIT, "unit"), (FORMULA, "formula")):
            sheet.put(at, 1, text, "headnote")
            sheet.put(at, 2, "cell" if at == SYMBOL else "", "head")
        for arg in row.args:
            self._head_column(self._raw[arg.name], arg.name, wording(arg), "as given", "input")
            self._head_column(self._column[arg.name], arg.name, "in SI units", _unit(arg), _range(row, arg))
        for step in self._steps:
            col = self._column[step.symbol]
            self._head_column(col, step.symbol, step.text, si_unit(step.role), shown(step.formula))
            sheet.widths[col] = max(NARROW, min(_WIDE, len(step.formula) / 4))
        for name in self.results:
            col = self._result[name]
            meaning = next(r.text for r in row.results if r.name == name)
            self._head_column(col, name, meaning, "of the cell", self._step_of[name])
            self._head_column(col + 1, name, "value in the cell", "", "")
            self._head_column(col + 2, name, "difference", "", "")
            self._head_column(col + 3, name, "verdict", "", "")
            sheet.widths |= {col + 2: 10.0, col + 3: 9.0}
        self._head_column(self._verdict, "", "the whole row", "", "")
        sheet.widths[self._verdict] = 9.0
        sheet.widths |= {1: 16.0, 2: 14.0}
        sheet.heights |= {MEANING: 66.0, FORMULA: 78.0}
        sheet.title_rows, sheet.title_columns, sheet.fit_width = (SYMBOL, FORMULA), (1, LABELS), False
        sheet.freeze = (FORMULA, LABELS)
        sheet.column_breaks = column_breaks(sheet.widths, self._verdict)

    def _head_column(self, col: int, symbol: str, meaning: str, unit: str, formula: str) -> None:
        sheet = self.sheet
        for at, text in ((SYMBOL, symbol), (MEANING, meaning), (UNIT, unit)):
            sheet.put(at, col, text, "head")
        sheet.put(FORMULA, col, formula, "headmono")
        sheet.widths.setdefault(col, NARROW)

    def place(self, group: Group) -> int:
        """Give a group its place under what is there; the number of the group comes back."""
        first, last = self.at + 3, self.at + 2 + len(group.lines)
        self._groups.append((self.at, group))
        self.places.append([{n: (r, self._result[n]) for n in group.results} for r in range(first, last + 1)])
        self.verdicts.append((first, last))
        self.at = last + 2
        return len(self.places) - 1

    def verdict_areas(self, number: int, results: Iterable[str]) -> list[str]:
        """The verdicts on some results of a group, as a formula refers to them."""
        first, last = self.verdicts[number]
        columns = sorted(self._result[name] + 3 for name in results)
        return [f"{self.sheet.ref(first, col)}:{fixed(last, col)}" for col in columns]

    def write(self) -> None:
        """Put all groups on the sheet."""
        for top, group in self._groups:
            self._write(top, group)

    def _write(self, top: int, group: Group) -> None:
        sheet = self.sheet
        sheet.line(top, [group.caption, *[""] * (self._verdict - 1)], "block")
        if group.target:
            sheet.links.append(Link(top, 1, group.target))
        for at, text in ((top + 1, "unit"), (top + 2, "factor to SI")):
            sheet.put(at, 1, text, "note")
        units, factors = top + 1, top + 2
        units_of: dict[str, Conversion] = {}
        for arg, conversion in zip(self.row.args, group.arguments, strict=True):
            if conversion is not None and arg.role != "choice":
                sheet.put(units, self._raw[arg.name], conversion.unit, "note")
                sheet.put(factors, self._raw[arg.name], conversion.factor, "factor")
                units_of[arg.name] = conversion
        for name, conversion in group.results.items():
            sheet.put(units, self._result[name], conversion.unit, "note")
            sheet.put(factors, self._result[name], conversion.factor, "factor")
        for i, line in enumerate(group.lines):
            self._line(top + 3 + i, factors, group, line, units_of)
        first, last = top + 3, top + 2 + len(group.lines)
        mark = column_letters(self._verdict)
        sheet.verdicts.append(f"{mark}{first}:{mark}{last}")
        for name in group.results:
            mark = column_letters(self._result[name] + 3)
            sheet.verdicts.append(f"{mark}{first}:{mark}{last}")

    def _line(self, at: int, factors: int, group: Group, line: Line, units_of: dict[str, Conversion]) -> None:
        sheet, row = self.sheet, self.row
        sheet.put(at, 1, line.label, "text")
        if line.target:
            sheet.put(at, 2, line.target.rpartition("!")[2], "link")
            sheet.links.append(Link(at, 2, line.target))
        ambient = self._ambient(at)
        cells: dict[str, str] = {}
        for arg, given in zip(row.args, line.given(), strict=True):
            raw, col = self._raw[arg.name], self._column[arg.name]
            cells[arg.name] = local(at, col)
            if given is None:
                missing = not_given(row, arg)
                if missing is not None:
                    sheet.put(at, col, missing, "number")
                continue
            own_ambient = P_ATM if arg.name == "pamb" else ambient
            sheet.put(at, raw, with_ambient(given, own_ambient), "linked")
            factor = fixed(factors, raw)
            si = to_si(local(at, raw), factor, units_of.get(arg.name, PLAIN), own_ambient)
            sheet.put(at, col, Formula(in_use(row, arg, local(at, raw), si)), "number")
        for step in self._steps:
            col = self._column[step.symbol]
            sheet.put(at, col, Formula(fill(step.formula, cells.__getitem__)), "number")
            cells[step.symbol] = local(at, col)
        verdicts = []
        for name, conversion in group.results.items():
            col = self._result[name]
            value = from_si(cells[self._step_of[name]], fixed(factors, col), conversion, ambient)
            sheet.put(at, col, Formula(value), "result")
            own = line.own.get(name)
            if own is not None:
                sheet.put(at, col + 1, linked(own), "linked")
                sheet.put(at, col + 2, Formula(f"{local(at, col)}-{local(at, col + 1)}"), "difference")
                scale = self._scale(name, cells)
                if scale:
                    scale = f"{scale}/{fixed(factors, col)}"
                verdict = agreement(local(at, col), local(at, col + 1), self.tolerance, scale)
                sheet.put(at, col + 3, Formula(verdict), "verdict")
                verdicts.append(local(at, col + 3))
        if verdicts:
            sheet.put(at, self._verdict, Formula(worst(verdicts)), "verdict")

    def _ambient(self, at: int) -> str:
        col = self._column.get("pamb")
        return local(at, col) if col is not None else P_ATM

    def _scale(self, name: str, cells: dict[str, str]) -> str:
        """The largest of the quantities of the same kind: a difference of them keeps their rounding."""
        role = self._roles[name]
        if role == "angle":
            return ANGLE_SCALE
        same = [cells[s.symbol] for s in self._steps if s.role == role and s.symbol != self._step_of[name]]
        return f"MAX({','.join(f'ABS({cell})' for cell in same)})" if same else ""


def worst(verdicts: Sequence[str]) -> str:
    """One verdict out of several cells of verdicts."""
    if len(verdicts) == 1:
        return verdicts[0]
    agree = ",".join(f'{cell}="agrees"' for cell in verdicts)
    differ = ",".join(f'{cell}="differs"' for cell in verdicts)
    return f'IF(AND({agree}),"agrees",IF(OR({differ}),"differs","error"))'


def _unit(arg: Arg) -> str:
    return si_unit(arg.role)


def _range(row: Row, arg: Arg) -> str:
    if arg.choices:
        return ", ".join(arg.choices)
    bound = row.bound(arg)
    text = "" if bound is None else str(bound)
    return "" if text == "any number" else text


def column_breaks(widths: dict[int, float], last: int) -> list[int]:
    """Columns behind which a page ends, so that no column is cut."""
    front = sum(_mm(widths[c]) for c in range(1, LABELS + 1))
    breaks: list[int] = []
    used = front
    for col in range(LABELS + 1, last + 1):
        width = _mm(widths[col])
        if used + width > _PAPER:
            breaks.append(col - 1)
            used = front
        used += width
    return breaks


def _mm(width: float) -> float:
    """A column's width on paper: about seven pixels a character and five more, 96 to the inch."""
    return (7 * width + 5) / 96 * 25.4 * SCALE / 100
