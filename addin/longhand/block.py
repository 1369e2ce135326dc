"""The working of one call from top to bottom: arguments, units, steps, results, the cells that show them."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field
from typing import Final

from ..catalogue.registry import wording
from ..catalogue.types import Longhand, Row
from .arguments import Argument, Written, linked, taken
from .convert import ANGLE_SCALE, P_ATM, Conversion, agreement, from_si, in_use, not_given, to_si
from .grid import Formula, Link, Sheet, local
from .source import TbCell
from .symbols import fill, shown, si_unit

TITLE_ROW: Final = 2
FIRST: Final = 4
_HEAD: Final = (
    "symbol",
    "meaning",
    "where from, or formula",
    "value",
    "unit",
    "factor to SI",
    "datum",
    "SI value",
    "SI unit",
    "allowed",
)
_CELL_HEAD: Final = ("cell", "", "formula in it", "long-hand", "", "its own value", "difference", "", "", "")
_WIDTHS: Final = (10.0, 36.0, 44.0, 13.0, 8.0, 13.0, 10.0, 14.0, 8.0, 16.0)


@dataclass(slots=True, eq=False)
class Check:
    """One cell beside its long-hand value."""

    cell: TbCell
    ref: str
    """The cell, as a formula refers to it."""
    place: str
    """The cell, for reading."""
    value: Callable[[], str]
    """The long-hand value as a formula, once everything has its place."""
    scale: Callable[[], str] = lambda: ""
    figures: bool = False
    """Whether the cell holds a text with figures in it."""
    twin: Callable[[], tuple[str, str] | None] = lambda: None
    """A cell that shows the same beside its working, and the verdict on it."""
    at: int = 0
    """The row of its line."""


@dataclass(slots=True, eq=False)
class Block:
    """The plan of one working: laid out when all plans are known."""

    row: Row | None
    arguments: list[Argument]
    conversion: Callable[[str], Conversion]
    """The unit of a role in the call's unit set."""
    results: list[str] = field(default_factory=list)
    checks: list[Check] = field(default_factory=list)
    sheet: Sheet | None = None
    top: int = 0

    @property
    def height(self) -> int:
        """Rows that the block takes, with one left empty."""
        body = 0
        if self.row is not None:
            assert isinstance(self.row.longhand, Longhand)
            body = len(self.row.args) + len(self.row.longhand.steps) + len(self.results)
        return 1 + body + (1 + len(self.checks) if self.checks else 0) + 1

    def want(self, result: str) -> None:
        if result not in self.results:
            self.results.append(result)

    def _steps_at(self) -> int:
        assert self.row is not None
        return self.top + 1 + len(self.row.args)

    def _results_at(self) -> int:
        assert self.row is not None
        assert isinstance(self.row.longhand, Longhand)
        return self._steps_at() + len(self.row.longhand.steps)

    def result_ref(self, result: str) -> str:
        """The cell that holds a result in the unit of the call."""
        assert self.sheet is not None
        return self.sheet.ref(self._results_at() + self.results.index(result), 4)

    def scale_ref(self, result: str) -> str:
        """The largest quantity of the kind of a result, in the unit of the call; "" where there is none."""
        row = self.row
        assert row is not None
        assert isinstance(row.longhand, Longhand)
        role = next(r.role for r in row.results if r.name == result)
        step = row.longhand.results.get(result, result)
        same = [
            f"ABS({local(self._steps_at() + i, 8)})"
            for i, s in enumerate(row.longhand.steps)
            if s.role == role and s.symbol != step
        ]
        factor = local(self._results_at() + self.results.index(result), 6)
        if role == "angle":
            return f"{ANGLE_SCALE}/{factor}"
        return f"MAX({','.join(same)})/{factor}" if same else ""

    def place(self, sheet: Sheet, top: int) -> int:
        """Give the block its place; the next free row comes back."""
        self.sheet, self.top = sheet, top
        at = top + self.height - 1 - len(self.checks)
        for i, check in enumerate(self.checks):
            check.at = at + i
        return top + self.height

    def write(self, written: Written, tolerance: str) -> None:
        """Put the block on its sheet."""
        sheet, top = self.sheet, self.top
        assert sheet is not None
        if self.row is not None:
            self._write_working(sheet, self.row, written)
        else:
            sheet.line(top, ["formulas", "that compute with results", *[""] * 8], "block")
        if not self.checks:
            return
        sheet.line(self.checks[0].at - 1, list(_CELL_HEAD), "headnote")
        for check in self.checks:
            self._write_check(sheet, check, tolerance)
        first, last = self.checks[0].at, self.checks[-1].at
        sheet.verdicts.append(f"J{first}:J{last}")

    def _write_working(self, sheet: Sheet, row: Row, written: Written) -> None:
        working = row.longhand
        assert isinstance(working, Longhand)
        places = ", ".join(dict.fromkeys(check.place for check in self.checks[:4]))
        more = f" and {len(self.checks) - 4} more" if len(self.checks) > 4 else ""
        caption = [row.name, row.summary.rstrip(".").split(",")[0], places + more]
        sheet.fill(self.top, 1, 10, "block")
        sheet.line(self.top, list(caption), "block")
        cells: dict[str, str] = {}
        ambient = P_ATM
        names = [arg.name for arg in row.args]
        if "pamb" in names:
            ambient = local(self.top + 1 + names.index("pamb"), 8)
        for i, arg in enumerate(row.args):
            at = self.top + 1 + i
            self._write_argument(sheet, row, i, at, P_ATM if arg.name == "pamb" else ambient, written)
            cells[arg.name] = local(at, 8)
        for i, step in enumerate(working.steps):
            at = self._steps_at() + i
            sheet.line(at, [step.symbol, step.text], "wrapped")
            sheet.put(at, 3, shown(step.formula), "mono")
            sheet.put(at, 8, Formula(fill(step.formula, cells.__getitem__)), "number")
            sheet.put(at, 9, si_unit(step.role), "text")
            sheet.fit_height(at)
            cells[step.symbol] = local(at, 8)
        for i, name in enumerate(self.results):
            at = self._results_at() + i
            result = next(r for r in row.results if r.name == name)
            step_name = working.results.get(name, name)
            unit = self.conversion(result.role)
            sheet.line(at, [name, result.text], "resulttext")
            sheet.put(at, 3, f"result: {step_name}", "resulttext")
            datum = unit.datum(ambient, -1).removeprefix("+")
            value = from_si(local(at, 8), local(at, 6), unit, ambient)
            sheet.put(at, 4, Formula(value), "result")
            sheet.put(at, 5, unit.unit, "resulttext")
            sheet.put(at, 6, unit.factor, "result")
            sheet.put(at, 7, Formula(datum) if datum else "", "result")
            sheet.put(at, 8, Formula(cells[step_name]), "result")
            sheet.put(at, 9, si_unit(result.role), "resulttext")
            sheet.put(at, 10, "", "resulttext")
            sheet.fit_height(at)

    def _write_argument(
        self, sheet: Sheet, row: Row, i: int, at: int, ambient: str, written: Written
    ) -> None:
        arg, argument = row.args[i], self.arguments[i]
        content, own = taken(argument, arg, written)
        sheet.line(at, [arg.name, wording(arg)], "wrapped")
        if content is None:
            sheet.put(at, 3, f"not given: {arg.empty}" if arg.empty else "not given", "note")
            missing = not_given(row, arg)
            if missing is not None:
                sheet.put(at, 8, missing, "number")
                sheet.put(at, 9, si_unit(arg.role), "text")
            sheet.fit_height(at)
            return
        sheet.put(at, 3, argument.shown() if argument.form != "literal" else "constant", "mono")
        sheet.put(at, 4, content, "linked" if isinstance(content, Formula) else "number")
        raw = local(at, 4)
        if arg.role == "choice":
            si = raw
            sheet.put(at, 10, ", ".join(arg.choices), "wrapped")
        else:
            unit = own or self.conversion(arg.role)
            sheet.put(at, 5, unit.unit, "text")
            sheet.put(at, 6, unit.factor, "factor")
            datum = unit.datum(ambient).removeprefix("+")
            if datum:
                sheet.put(at, 7, Formula(datum), "factor")
            si = to_si(raw, local(at, 6), unit, ambient)
            bound = row.bound(arg)
            text = "" if bound is None else str(bound)
            sheet.put(at, 10, "" if text == "any number" else text, "wrapped")
            sheet.put(at, 9, si_unit(arg.role), "text")
        sheet.put(at, 8, Formula(in_use(row, arg, raw, si)), "number")
        sheet.fit_height(at)

    def _write_check(self, sheet: Sheet, check: Check, tolerance: str) -> None:
        at = check.at
        sheet.put(at, 1, check.place.rpartition("!")[2], "link")
        sheet.links.append(Link(at, 1, check.ref))
        sheet.put(at, 2, check.place.rpartition("!")[0], "text")
        sheet.put(at, 3, "=" + check.cell.cell.text, "mono")
        sheet.put(at, 4, Formula(check.value()), "number")
        sheet.put(at, 6, linked(check.ref), "linked")
        sheet.put(at, 7, Formula(f"{local(at, 4)}-{local(at, 6)}"), "difference")
        apart, twin = '"differs"', check.twin()
        if twin is not None:  # its verdict knows how large the terms of a small sum are
            apart = f"IF({local(at, 6)}={twin[0]},{twin[1]},{apart})"
        verdict = agreement(local(at, 4), local(at, 6), tolerance, check.scale(), check.figures, apart)
        sheet.put(at, 10, Formula(verdict), "verdict")
        sheet.fit_height(at)


def new_block_sheet(name: str) -> Sheet:
    """An empty sheet for blocks, its headings repeated on every page."""
    sheet = Sheet(name)
    sheet.put(1, 1, "Long-hand working of every cell", "title")
    sheet.line(TITLE_ROW, list(_HEAD), "head")
    sheet.widths = {i: width for i, width in enumerate(_WIDTHS, 1)}
    sheet.title_rows = (TITLE_ROW, TITLE_ROW)
    sheet.freeze = (TITLE_ROW, 1)
    return sheet
