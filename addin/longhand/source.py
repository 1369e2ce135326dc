"""The workbook that is worked: its TB_ cells, its stored values, what its operands mean."""

from __future__ import annotations

import re
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from functools import cached_property
from typing import Any, NamedTuple

from ..cells import CellError, Scalar
from ..hosts.headless.contexts import Operand, meant_as_one_cell
from ..hosts.headless.formulas import (
    Kind,
    Part,
    Unreadable,
    call_name,
    function_name,
    functions,
    take_apart,
)
from ..hosts.headless.lets import arguments_from
from ..hosts.headless.names import Names, split_sheet
from ..hosts.headless.tablerefs import Tables
from ..progress import Progress
from ..xlsx.a1 import MAX_COLUMN, MAX_ROW, range_from_a1, to_a1
from ..xlsx.package import Package
from ..xlsx.sheetxml import FormulaCell, formula_cells, stored_values
from .calls import Call, Items, NotWorked, Shape, all_calls, everything, render, tree
from .grid import quoted_sheet
from .symbols import quoted

_RANGE = re.compile(
    r"\$?[A-Za-z]{1,3}\$?[0-9]{1,7}(?::\$?[A-Za-z]{1,3}\$?[0-9]{1,7})?"
    r"|\$?[A-Za-z]{1,3}:\$?[A-Za-z]{1,3}|\$?[0-9]{1,7}:\$?[0-9]{1,7}"
)
_OF_THE_PLACE = frozenset(("ROW", "COLUMN", "CELL", "INDIRECT", "SHEET"))
"""Functions whose result depends on where the formula stands."""


class Area(NamedTuple):
    """A rectangle of cells."""

    sheet: str
    r1: int
    c1: int
    r2: int
    c2: int

    @property
    def shape(self) -> tuple[int, int]:
        return self.r2 - self.r1 + 1, self.c2 - self.c1 + 1

    def ref(self, i: int, j: int) -> str:
        """The reference to the cell in row i and column j of the area, from 0."""
        return f"{quoted_sheet(self.sheet)}!{to_a1(self.r1 + i, self.c1 + j, absolute=True)}"

    def meeting(self, row: int, col: int) -> str:
        """The cell that a formula takes which wants one only: that in its own row or column."""
        rows, cols = self.shape
        i = 0 if rows == 1 else row - self.r1
        j = 0 if cols == 1 else col - self.c1
        return self.ref(i, j) if 0 <= i < rows and 0 <= j < cols else "#VALUE!"

    def text(self) -> str:
        first = self.ref(0, 0)
        if self.shape == (1, 1):
            return first
        return f"{first}:{to_a1(self.r2, self.c2, absolute=True)}"


@dataclass(slots=True, eq=False)
class TbCell:
    """One formula cell with TB_ calls; ``trouble`` says why its formula cannot be read."""

    sheet: str
    cell: FormulaCell
    items: Items
    trouble: str = ""

    @property
    def a1(self) -> str:
        return to_a1(self.cell.row, self.cell.col)

    @property
    def shape(self) -> Shape:
        """Rows and columns that the formula fills."""
        if self.cell.kind == "plain" or self.cell.ref is None:
            return 1, 1
        r1, c1, r2, c2 = self.cell.ref
        return r2 - r1 + 1, c2 - c1 + 1

    @property
    def where(self) -> str:
        """``Calc!G12``, for reading."""
        return f"{self.sheet}!{self.a1}"

    @property
    def target(self) -> str:
        """``'Calc'!G12``, for a hyperlink."""
        return f"{quoted_sheet(self.sheet)}!{self.a1}"

    @property
    def calls(self) -> list[Call]:
        return all_calls(self.items)


class Source:
    """A workbook's formulas and stored values."""

    def __init__(self, package: Package, progress: Progress | None = None) -> None:
        self.package = package
        self.names = Names(package.defined_names)
        self.tables = Tables(package.tables)
        self._parts = {sheet.name.casefold(): sheet for sheet in package.sheets}
        self._values: dict[str, dict[tuple[int, int], Scalar]] = {}
        self.cells: list[TbCell] = []
        self._valueless: dict[str, set[tuple[int, int]]] = {}
        """By sheet the formula cells that hold no stored value."""
        self._spills: dict[tuple[str, int, int], tuple[int, int, int, int]] = {}
        """What the formulas fill that fill more than their own cell."""
        calling: list[tuple[str, FormulaCell]] = []
        for number, sheet in enumerate(package.sheets):
            if progress is not None:
                progress("read", number, len(package.sheets))
            for cell in formula_cells(package.part(sheet.part), package.shared_strings):
                if cell.value is None and cell.kind != "table":
                    self._valueless.setdefault(sheet.name, set()).add((cell.row, cell.col))
                if cell.kind in ("array", "dynamic") and cell.ref is not None:
                    self._spills[sheet.name.casefold(), cell.row, cell.col] = cell.ref
                if "TB_" in cell.text.upper() or self._calling_names:
                    calling.append((sheet.name, cell))
        for name, cell in calling:
            self._take(name, cell)

    def without_value(self) -> str | None:
        """The first formula cell that holds no value although a TB_ call stands in it or reads it."""
        if not self._valueless:
            return None
        for cell in self.cells:
            own = Area(cell.sheet, cell.cell.row, cell.cell.col, cell.cell.row, cell.cell.col)
            for area in (own, *self._read(cell)):
                found = self._empty_in(area)
                if found is not None:
                    return f"{area.sheet}!{to_a1(*found)}"
        return None

    def _read(self, cell: TbCell) -> Iterator[Area]:
        for item in everything(cell.items):
            if item.kind is Kind.REFERENCE:
                try:
                    area = self.area(item.text, cell.sheet)
                except NotWorked:
                    continue
                if area is not None:
                    yield area

    def _empty_in(self, area: Area) -> tuple[int, int] | None:
        places = self._valueless.get(area.sheet, set())
        if area.shape == (1, 1):
            return (area.r1, area.c1) if (area.r1, area.c1) in places else None
        return min(
            (p for p in places if area.r1 <= p[0] <= area.r2 and area.c1 <= p[1] <= area.c2), default=None
        )

    @cached_property
    def _calling_names(self) -> bool:
        return any(self.names.calling(name) for name in self.package.defined_names)

    def _take(self, sheet: str, cell: FormulaCell) -> None:
        try:
            text = self.tables.written_out(cell.text, sheet, cell.row, cell.col)
            parts = self.names.written_out(take_apart(text), sheet, cell.row, cell.col)
            if not any(p.kind is Kind.OPEN and call_name(p.text) for p in parts):
                return
            parts = self._older(self._met(parts, sheet, cell), sheet, cell)
            if "LAMBDA" in functions(parts):
                raise NotWorked("the formula declares a function of its own (LAMBDA)")
            self.cells.append(TbCell(sheet, cell, tree(self._fixed(parts, sheet, cell))))
        except (Unreadable, NotWorked) as error:
            self.cells.append(TbCell(sheet, cell, [], str(error)))

    def _met(self, parts: list[Part], sheet: str, cell: FormulaCell) -> list[Part]:
        """The parts of a plain formula with the one cell that is meant in place of a range."""
        if cell.kind != "plain":
            return parts

        def named(text: str) -> Operand:
            area = self.area(text, sheet)
            return (
                Operand.UNKNOWN if area is None else Operand.CELL if area.shape == (1, 1) else Operand.RANGE
            )

        out = list(parts)
        places = {id(part): at for at, part in enumerate(parts)}
        for part in meant_as_one_cell(parts, named):
            area = self.area(part.text, sheet)
            if area is not None:
                text = area.meeting(cell.row, cell.col)
                kind = Kind.LITERAL if text.startswith("#") else Kind.REFERENCE
                out[places[id(part)]] = Part(text, kind)
        return out

    def _older(self, parts: list[Part], sheet: str, cell: FormulaCell) -> list[Part]:
        """The parts of a formula as every spreadsheet knows them: C4# and @A1:A9 as the cells they mean.

        Raises :class:`NotWorked` where that cannot be had.
        """
        out: list[Part] = []
        at = 0
        while at < len(parts):
            part, at = parts[at], at + 1
            name = function_name(part.text) if part.kind is Kind.OPEN else ""
            if name not in ("ANCHORARRAY", "SINGLE"):
                out.append(part)
                continue
            area = self.area(parts[at].text, sheet) if parts[at].kind is Kind.REFERENCE else None
            if area is None or parts[at + 1].kind is not Kind.CLOSE:
                raise NotWorked(f"the formula uses {name}, which not every spreadsheet knows")
            text = area.meeting(cell.row, cell.col)
            if name == "ANCHORARRAY":
                filled = self._spills.get((area.sheet.casefold(), area.r1, area.c1))
                text = "#REF!" if filled is None else Area(area.sheet, *filled).text()
            out.append(Part(text, Kind.LITERAL if text.startswith("#") else Kind.REFERENCE))
            at += 2
        return out

    def _fixed(self, parts: list[Part], sheet: str, cell: FormulaCell) -> list[Part]:
        """The parts of a formula such that they mean the same on another sheet.

        Raises :class:`NotWorked` where that cannot be had.
        """
        own = Area(sheet, cell.row, cell.col, cell.row, cell.col)
        if cell.kind == "array" and cell.ref is not None:
            own = Area(sheet, *cell.ref)
        out: list[Part] = []
        at = 0
        while at < len(parts):
            part, at = parts[at], at + 1
            out.append(part)
            name = function_name(part.text) if part.kind is Kind.OPEN else ""
            if name not in _OF_THE_PLACE:
                continue
            arguments, behind = arguments_from(parts, at)
            given = [part for part in arguments[0] if part.kind is not Kind.SPACE]
            first = given[0].text if given else ""
            if name == "INDIRECT" and first.startswith('"'):
                word = str(literal(given[0]))
                if "!" in word:
                    continue
                if len(given) > 1 or len(arguments) > 1:
                    raise NotWorked("the formula uses INDIRECT, which depends on where it stands")
                out.append(Part(quoted(f"{quoted_sheet(sheet)}!{word}"), Kind.LITERAL))
                at = behind - 1
            elif name not in ("ROW", "COLUMN"):
                raise NotWorked(f"the formula uses {name}, which depends on where it stands")
            elif not given:
                out.append(Part(own.text(), Kind.REFERENCE))
        return out

    def values(self, sheet: str) -> dict[tuple[int, int], Scalar]:
        """Stored values of a sheet by (row, column)."""
        key = sheet.casefold()
        found = self._values.get(key)
        if found is None:
            part = self._parts[key].part
            found = stored_values(self.package.part(part), self.package.shared_strings)
            self._values[key] = found
        return found

    def value(self, area: Area, i: int = 0, j: int = 0) -> Scalar:
        """The stored value of one cell of an area; an error of a newer kind is #VALUE!."""
        return self.values(area.sheet).get((area.r1 + i, area.c1 + j))

    def grid(self, area: Area) -> list[list[Any]]:
        """The stored values of an area."""
        rows, cols = area.shape
        values = self.values(area.sheet)
        return [[values.get((area.r1 + i, area.c1 + j)) for j in range(cols)] for i in range(rows)]

    def area(self, operand: str, sheet: str, depth: int = 0) -> Area | None:
        """The cells that an operand means in a formula on a sheet; None when it is no plain reference."""
        place, rest = split_sheet(operand) if "!" in operand else (None, operand)
        if operand.startswith("[") or (place is not None and "[" in place):
            return None  # of another workbook
        if _RANGE.fullmatch(rest):
            home = sheet if place is None else place
            if home.casefold() not in self._parts:
                raise NotWorked(f"there is no sheet {home}")
            try:
                r1, c1, r2, c2 = range_from_a1(rest)
            except ValueError:
                pass
            else:
                if r2 == MAX_ROW or c2 == MAX_COLUMN:
                    r2, c2 = self._used(home, r2, c2)
                return Area(self._parts[home.casefold()].name, r1, c1, max(r1, r2), max(c1, c2))
        name = self.names.find(operand, sheet)
        if name is None or depth > 8:
            return None
        text = self.tables.written_out(name.text.removeprefix("="), name.sheet or sheet, 1, 1)
        parts = [p for p in take_apart(text) if p.kind is not Kind.SPACE]
        if len(parts) != 1 or parts[0].kind is not Kind.REFERENCE:
            return None
        return self.area(parts[0].text, name.sheet or sheet, depth + 1)

    def _used(self, sheet: str, row: int, col: int) -> tuple[int, int]:
        """Whole columns and rows as far as they are used."""
        values = self.values(sheet)
        rows = max((r for r, _ in values), default=1)
        cols = max((c for _, c in values), default=1)
        return (rows if row == MAX_ROW else row), (cols if col == MAX_COLUMN else col)

    def operand(self, text: str, sheet: str) -> str:
        """An operand of a formula on a sheet, as a formula on any other sheet writes it."""
        if text.startswith("[") or "[" in text.partition("!")[0]:
            return text
        if "!" in text and _RANGE.fullmatch(split_sheet(text)[1]):
            return text
        if _RANGE.fullmatch(text):
            try:
                range_from_a1(text)
            except ValueError:
                return text
            return f"{quoted_sheet(sheet)}!{text}"
        name = self.names.find(text, sheet)
        if name is None or not (name.sheet or "!" in text):
            return text
        # A sheet's own name is written out: not every spreadsheet knows it on another sheet.
        area = self.area(text, sheet)
        if area is not None:
            return area.text()
        return text if "!" in text else f"{quoted_sheet(sheet)}!{text}"


def literal(part: Part) -> Scalar:
    """The value of a literal in a formula."""
    text = part.text.strip()
    if text.startswith('"') and text.endswith('"') and len(text) > 1:
        return text[1:-1].replace('""', '"')
    if text.upper() in ("TRUE", "FALSE"):
        return text.upper() == "TRUE"
    if text.startswith("#"):
        return CellError("NA") if text.upper() == "#N/A" else CellError("VALUE", text)
    try:
        return float(text)
    except ValueError:
        raise NotWorked(f"{text} cannot be read as a number") from None


def plain(items: Items, source: Source, sheet: str, call: Callable[[Call], str]) -> str:
    """The text of items as a formula on any sheet writes it."""
    return render(items, lambda text: source.operand(text, sheet), call)
