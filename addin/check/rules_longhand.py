"""Long-hand: every call worked by the plain formulas of its working, beside what the function gives."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, field

import numpy as np

from thrustbook.engine.constants import P_ATM

from .. import dispatch
from ..catalogue.types import Longhand, Row
from ..cells import Cell, CellError, Grid, Refused, Scalar
from ..figures import figure
from ..hosts.headless.plainvalues import ROW, evaluate_rows
from ..longhand.symbols import default_of, fill
from ..tables import is_blank, number
from ..units import UnitError, UnitSet
from ..xlsx.a1 import column_letters
from .book import Book
from .calls import Call
from .gather import Remark, figures, joined
from .tableworkings import table_remarks
from .types import Finding, Rule, Severity

TOLERANCE = 1e-9
"""Difference between function and working that is accepted, as a fraction of the value."""
OF_LARGEST = 1e-13
"""The same as a fraction of the largest quantity of the same kind in the working: its rounding."""
_BATCH = 4_000
"""Workings evaluated in one go, to bound the memory."""

Given = tuple[Scalar, ...]
"""The arguments of one working: SI numbers, words, "" where nothing is given."""


@dataclass(slots=True)
class _Sheet:
    """The distinct workings of one function, and their values once they are evaluated."""

    row: Row
    working: Longhand
    lines: dict[Given, int] = field(default_factory=dict)
    values: list[list[Scalar]] = field(default_factory=list)
    """For each line the values of the steps."""

    def evaluate(self, book: Book) -> None:
        """Let the spreadsheet's own functions work every line."""
        names = [arg.name for arg in self.row.args]
        columns = {name: column_letters(i) for i, name in enumerate(names, 1)}
        templates = []
        for i, step in enumerate(self.working.steps, len(names) + 1):
            templates.append(fill(step.formula, lambda name: columns[name] + ROW))
            columns[step.symbol] = column_letters(i)
        given = list(self.lines)
        for start in range(0, len(given), _BATCH):
            book.tell(f"long-hand of {self.row.name}", start, len(given))
            batch = given[start : start + _BATCH]
            self.values += evaluate_rows(batch, templates)

    def step(self, line: int, result: str) -> Scalar:
        """The value of the step that is a result, SI."""
        symbol = self.working.results.get(result, result)
        at = next(i for i, s in enumerate(self.working.steps) if s.symbol == symbol)
        return self.values[line][at]

    def ambient(self, line: int) -> float:
        """The ambient pressure of a line: its own where the function has one, else standard."""
        at = next((i for i, arg in enumerate(self.row.args) if arg.name == "pamb"), -1)
        given = list(self.lines)[line][at] if at >= 0 else None
        return given if isinstance(given, float) else P_ATM

    def largest(self, line: int, role: str) -> float:
        """The largest of the steps of one kind of quantity, SI."""
        found = zip(self.working.steps, self.values[line], strict=True)
        return max((abs(v) for s, v in found if s.role == role and isinstance(v, float)), default=0.0)


@dataclass(slots=True)
class _Use:
    """One element of one call: its line among the workings."""

    call: Call
    element: tuple[int, int]
    line: int


def difference(book: Book) -> Iterator[Finding]:
    """L01: the long-hand working of a call gives another value than the function."""
    sheets: dict[str, _Sheet] = {}
    uses: list[_Use] = []
    for call in book.calls:
        working = call.row.longhand
        if not isinstance(working, Longhand) or working.method == "residual":
            continue
        if call.units is None or call.wanted is None or call.wanted.form != "values":
            continue
        sheet = sheets.setdefault(call.row.name, _Sheet(call.row, working))
        for element, given in _elements(call, call.units):
            uses.append(_Use(call, element, sheet.lines.setdefault(given, len(sheet.lines))))
    for sheet in sheets.values():
        sheet.evaluate(book)
    yield from joined("L01", Severity.ERROR, [*_remarks(book, sheets, uses), *table_remarks(book)])


def _elements(call: Call, units: UnitSet) -> Iterator[tuple[tuple[int, int], Given]]:
    """The arguments of each element of a call, as its working takes them; those that fail are left out."""
    lead = call.row.leading
    cells = [*call.values[lead:], *[None] * (lead + len(call.row.args) - len(call.values))]
    grids = [cell for cell in cells if isinstance(cell, list)]
    try:
        rows, cols = np.broadcast_shapes(*((len(g), len(g[0])) for g in grids)) if grids else (1, 1)
    except ValueError:
        return
    for i in range(rows):
        for j in range(cols):
            try:
                yield (i, j), _given(call.row, [_one(cell, i, j) for cell in cells], units)
            except (Refused, UnitError):
                continue


def _one(cell: Cell, i: int, j: int) -> Scalar:
    if not isinstance(cell, list):
        return cell
    return cell[i if len(cell) > 1 else 0][j if len(cell[0]) > 1 else 0]


def _given(row: Row, cells: Sequence[Scalar], units: UnitSet) -> Given:
    ambient = P_ATM
    for arg, cell in zip(row.args, cells, strict=False):
        if arg.name == "pamb" and not is_blank(cell):
            ambient = number(cell, arg.name, arg.role, units.unit(arg.role))
    out: list[Scalar] = []
    for arg, cell in zip(row.args, cells, strict=False):
        if is_blank(cell):
            default = default_of(row, arg)
            out.append("" if default is None else default)
        elif arg.role == "choice":
            out.append(str(cell).strip().lower())
        else:
            out.append(number(cell, arg.name, arg.role, units.unit(arg.role), ambient))
    return tuple(out)


def _remarks(book: Book, sheets: dict[str, _Sheet], uses: Sequence[_Use]) -> Iterator[Remark]:
    of_call: dict[int, list[_Use]] = {}
    for use in uses:
        of_call.setdefault(id(use.call), []).append(use)
    seen: set[tuple[str, int, str]] = set()
    for found in of_call.values():
        call = found[0].call
        sheet, units = sheets[call.row.name], call.units
        assert units is not None
        assert call.wanted is not None
        for result in call.wanted.results:
            own = _own(call, result.name)
            given_in = units.unit(result.role)
            for use in found:
                key = call.row.name, use.line, result.name
                value = own[use.element] if own.shape != (1, 1) else own[0, 0]
                if key in seen or not isinstance(value, float):
                    continue
                ambient = sheet.ambient(use.line) if given_in.shift else 0.0
                si = value * given_in.factor + given_in.offset + given_in.shift * ambient
                worked = sheet.step(use.line, result.name)
                if _agree(si, worked, sheet.largest(use.line, result.role)):
                    continue
                seen.add(key)
                shown = worked
                if isinstance(worked, float):
                    shown = (worked - given_in.offset - given_in.shift * ambient) / given_in.factor
                yield _remark(book, use, result.name, value, shown)


def _own(call: Call, result: str) -> Grid:
    """What the function gives for one result, element by element."""
    values = [result, *call.inputs] if call.row.has_result else call.values
    outcome = dispatch.call(call.row.name, values)
    if isinstance(outcome, np.ndarray):
        return outcome
    out = np.empty((1, 1), dtype=object)
    out[0, 0] = outcome
    return out


def _agree(value: float, worked: Scalar, largest: float) -> bool:
    if not isinstance(worked, float):
        return False
    return abs(value - worked) <= TOLERANCE * max(abs(value), abs(worked)) + OF_LARGEST * largest


def _remark(book: Book, use: _Use, result: str, value: float, worked: Scalar) -> Remark:
    call = use.call
    cell, i = call.node.cell, use.element[0]
    r1, _, r2, _ = call.node.extent()
    about = f"{call.row.name} {result}" if call.row.has_result else call.row.name
    where = f" (element {i + 1}, {use.element[1] + 1})" if use.element != (0, 0) else ""
    gives = str(worked) if isinstance(worked, CellError) else figure(worked, 9)
    return Remark(
        sheet=book.sheet(call.node.sheet),
        row=cell.row + i if r1 + i <= r2 else cell.row,
        col=cell.col,
        kind=f"{about} {book.signatures[call.node.index]}",
        what=f"{about}{where} is {figure(value, 9)}, its long-hand working gives {gives}",
        why=f"Two independent ways must agree to {TOLERANCE:g}; thrustbook longhand shows the working.",
        basis=f"{figures(value)} {figures(worked)}",
    )


RULES = (Rule("L01", "long-hand difference", difference),)
