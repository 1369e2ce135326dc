"""The formulas of a workbook as the evaluator needs them: read once, before any evaluation."""

from __future__ import annotations

import re
from collections.abc import Iterable
from dataclasses import dataclass, field

from formualizer import Workbook

from ...progress import Progress
from ...xlsx.a1 import MAX_COLUMN, MAX_ROW, column_number, to_a1
from ...xlsx.package import NameRef, Package
from ...xlsx.sheetxml import FormulaCell, formula_cells
from .areas import AREA, CALL, Area, Extent
from .contexts import Operand, in_context, operand
from .dependency import Graph, Reference
from .formulas import (
    Kind,
    Part,
    Rewritten,
    Unreadable,
    calls,
    functions,
    join,
    one_cell,
    rewrite,
    take_apart,
)
from .host import Functions
from .names import Names, split_sheet
from .tablerefs import Tables, sheet_range

_A1 = re.compile(
    r"\$?([A-Za-z]{1,3})\$?([0-9]{1,7})(?::\$?([A-Za-z]{1,3})\$?([0-9]{1,7}))?"
    r"|\$?([A-Za-z]{1,3}):\$?([A-Za-z]{1,3})|\$?([0-9]{1,7}):\$?([0-9]{1,7})"
)
_DIGITS = re.compile(r"[0-9]+")
_ANYWHERE = frozenset(("INDIRECT", "OFFSET"))  # may read any cell


@dataclass(slots=True, eq=False)
class Node:
    """One formula cell.

    ``calls`` are the TB_ functions in it, also through names. ``copy`` is its text in the
    evaluation copy. ``reason`` says why the evaluator cannot compute it, "" when it can.
    """

    index: int
    sheet: int
    cell: FormulaCell
    calls: tuple[str, ...] = ()
    copy: str = ""
    reason: str = ""
    anywhere: bool = False
    references: list[Reference] = field(default_factory=list)
    rewritten: Rewritten | None = None
    area: Area | None = None

    @property
    def a1(self) -> str:
        return to_a1(self.cell.row, self.cell.col)

    def extent(self) -> Extent:
        """The cells that the formula fills, in the file or by its latest result, whichever is more."""
        cell = self.cell
        old = cell.ref or (cell.row, cell.col, cell.row, cell.col)
        if self.area is None or self.area.kind != "dynamic":
            return old
        new = self.area.extent()
        return old[0], old[1], max(old[2], new[2]), max(old[3], new[3])


@dataclass(slots=True)
class _Seen:
    """What the operands of one formula, or of one name, refer to."""

    references: list[Reference]
    anywhere: bool = False
    outside: bool = False
    functions: set[str] = field(default_factory=set)


class Known:
    """Which functions the evaluator knows, found out by trying each name once."""

    def __init__(self) -> None:
        self._workbook = Workbook()
        self._workbook.add_sheet("Try")
        self._known: dict[str, bool] = {}

    def missing(self, names: Iterable[str]) -> str:
        """Why a formula with these functions cannot be computed, or ""."""
        for name in sorted(names):
            if name == "LAMBDA":
                return "the evaluator does not compute LAMBDA"
            if "!" in name:
                return f"{name} is a function of another file"
            if name != "SINGLE" and not self._knows(name):
                return f"the evaluator does not know the function {name}"
        return ""

    def _knows(self, name: str) -> bool:
        known = self._known.get(name)
        if known is None:
            self._workbook.set_formula("Try", 1, 1, f"={name}()")
            answer = self._workbook.evaluate_cell("Try", 1, 1)
            known = not (type(answer) is dict and answer.get("kind") in ("Name", "Error"))
            self._known[name] = known
        return known


class Model:
    """All formulas of a workbook with what they refer to."""

    def __init__(self, package: Package, functions: Functions, progress: Progress | None = None) -> None:
        self.package = package
        self.functions = functions
        self.names = Names(package.defined_names, package.externals)
        self.tables = Tables(package.tables)
        self.sheet_names = [sheet.name for sheet in package.sheets]
        self._sheet_index = {name.casefold(): i for i, name in enumerate(self.sheet_names)}
        self._known = Known()
        self._of_name: dict[NameRef, _Seen] = {}
        # Formulas of the spreadsheet's own that need no rewriting, row numbers apart.
        self._unchanged: set[str] = set()
        # Those in which no range stands for a single value.
        self._in_context: set[str] = set()
        self._missing: dict[frozenset[str], str] = {}
        self.nodes: list[Node] = []
        self.areas: list[Area] = []
        for number, sheet in enumerate(package.sheets):
            if progress is not None:
                progress("read", number, len(package.sheets))
            xml = package.part(sheet.part)
            for cell in formula_cells(xml, package.shared_strings):
                node = Node(len(self.nodes), number, cell)
                self.nodes.append(node)
                self._read(node)
        self.at = {(node.sheet, node.cell.row, node.cell.col): node for node in self.nodes}
        self._graph: tuple[list[Reference], Graph] | None = None

    def graph(self) -> Graph:
        """Who reads whose cells, with every spilling formula at its latest extent."""
        places = [Reference(node.sheet, *node.extent()) for node in self.nodes]
        if self._graph is None or self._graph[0] != places:
            self._graph = places, Graph(places, [node.references for node in self.nodes])
        return self._graph[1]

    def references(self, parts: list[Part], node: Node) -> list[Reference]:
        """The cells that some parts of a formula refer to, names and tables resolved."""
        sheet = self.sheet_names[node.sheet]
        return self._see(self._table_names(parts, sheet), node.sheet, sheet).references

    def where(self, node: Node) -> str:
        """``Sheet!B3``."""
        return f"{self.sheet_names[node.sheet]}!{node.a1}"

    def _read(self, node: Node) -> None:
        cell, sheet = node.cell, self.sheet_names[node.sheet]
        if cell.kind == "table":
            node.reason = "a what-if data table is computed by the spreadsheet alone"
            if cell.ref is not None:  # its formulas stand along the upper and the left edge
                r1, c1, r2, c2 = cell.ref
                top, left = max(1, r1 - 1), max(1, c1 - 1)
                node.references = [
                    Reference(node.sheet, top, left, top, c2),
                    Reference(node.sheet, top, left, r2, left),
                ]
            return
        text = self.tables.written_out(cell.text, sheet, cell.row, cell.col)
        parts: list[Part] = []
        try:
            parts = take_apart(text)
            parts = self.names.written_out(parts, sheet, cell.row, cell.col)
        except Unreadable as error:
            node.reason = str(error)
            node.calls = tuple(self.names.direct_calls(parts, sheet))
            return
        parts = self._table_names(parts, sheet)
        node.calls = tuple(calls(parts))
        seen = self._see(parts, node.sheet, sheet)
        node.references, node.anywhere = seen.references, seen.anywhere
        if seen.functions:
            key = frozenset(seen.functions)
            if key not in self._missing:
                self._missing[key] = self._known.missing(key)
            node.reason = self._missing[key]
        if seen.outside:
            node.reason = "it refers to another workbook, and links are not followed"
        node.copy = self._copy(node, parts)

    def _copy(self, node: Node, parts: list[Part]) -> str:
        """The formula in the evaluation copy."""
        cell = node.cell
        own = cell.kind == "plain" and not node.calls
        shape = _DIGITS.sub("0", cell.text) if own else ""
        if own and shape in self._unchanged:
            return join(parts)
        named = any(part.kind is Kind.REFERENCE and operand(part.text) is Operand.UNKNOWN for part in parts)
        if not own or shape not in self._in_context:
            given = parts
            parts = self._single_values(node, parts)
            if own and not named and not node.reason and parts == given:
                self._in_context.add(shape)
        if cell.kind == "plain":
            parts = one_cell(parts)
        rewritten = rewrite(parts)
        if (
            own
            and not named
            and not node.reason
            and not rewritten.may_be_array
            and rewritten.text == cell.text
        ):
            self._unchanged.add(shape)
        if node.calls:
            node.rewritten = rewritten
        whole = rewritten.whole
        block = whole is not None and self.functions.block.get(whole[0], False)
        if cell.kind == "plain" and not block:
            return f"@({rewritten.text})" if rewritten.may_be_array else rewritten.text
        area = Area(
            len(self.areas), cell.kind, cell.row, cell.col, cell.ref, whole[0] if whole is not None else None
        )
        self.areas.append(area)
        node.area = area
        if whole is None:
            return f"{AREA}({area.number},{rewritten.text})"
        return f"{CALL}({area.number},{whole[1]})" if whole[1].strip() else f"{CALL}({area.number})"

    def _single_values(self, node: Node, parts: list[Part]) -> list[Part]:
        """The formula with a range or an array where a single value is meant as a spreadsheet takes it."""
        cell, sheet = node.cell, self.sheet_names[node.sheet]
        own = ""
        if cell.kind == "array" and cell.ref is not None and cell.ref[:2] != cell.ref[2:]:
            own = f"{to_a1(*cell.ref[:2])}:{to_a1(*cell.ref[2:])}"
        try:
            return in_context(parts, cell.kind != "plain", lambda name: self._named(name, sheet), own)
        except Unreadable as error:
            node.reason = node.reason or str(error)
            return parts

    def _named(self, text: str, sheet: str) -> Operand:
        """What a name stands for, as far as that can be seen at once."""
        name = self.names.find(text, sheet)
        if name is None:
            return Operand.UNKNOWN
        try:
            parts = [part for part in self.names.parts(name) if part.kind is not Kind.SPACE]
        except Unreadable:
            return Operand.UNKNOWN
        if len(parts) == 1 and parts[0].kind is Kind.REFERENCE:
            return operand(parts[0].text)
        simple = (Kind.LITERAL, Kind.OPERATOR, Kind.PAREN_OPEN, Kind.PAREN_CLOSE)
        one = all(part.kind in simple or operand(part.text) is Operand.CELL for part in parts)
        return Operand.CELL if one else Operand.UNKNOWN

    def _table_names(self, parts: list[Part], sheet: str) -> list[Part]:
        """A table's bare name as the range of its data, unless a defined name has that name."""
        if not self.tables:
            return parts
        out = []
        for part in parts:
            found = self.tables.data(part.text) if part.kind is Kind.REFERENCE else None
            if found is not None and self.names.find(part.text, sheet) is None:
                part = Part(sheet_range(*found), Kind.REFERENCE)
            out.append(part)
        return out

    def _see(self, parts: list[Part], number: int, sheet: str, depth: int = 0) -> _Seen:
        seen = _Seen([])
        seen.functions = functions(parts)
        seen.anywhere = not _ANYWHERE.isdisjoint(seen.functions)
        joined = False
        for part in parts:
            if part.kind is Kind.REFERENCE:
                self._operand(part.text, number, sheet, seen, depth)
            elif part.text == ":":
                joined = True
        if joined:  # A1:INDEX(...): anything in between
            for of in {ref.sheet for ref in seen.references}:
                boxes = [ref for ref in seen.references if ref.sheet == of]
                seen.references.append(
                    Reference(
                        of,
                        min(box.r1 for box in boxes),
                        min(box.c1 for box in boxes),
                        max(box.r2 for box in boxes),
                        max(box.c2 for box in boxes),
                    )
                )
        return seen

    def _operand(self, text: str, number: int, sheet: str, seen: _Seen, depth: int) -> None:
        place, rest = split_sheet(text) if "!" in text else (None, text)
        if (place is not None and "[" in place) or text.startswith("["):
            seen.outside = True
            return
        match = _A1.fullmatch(rest)
        if match is not None:
            first = last = number
            if place is not None:
                known = self._sheet_index.get(place.casefold())
                if known is None and ":" in place:  # Jan:Mar!A1
                    ends = [self._sheet_index.get(end.casefold(), 0) for end in place.split(":", 1)]
                    first, last = min(ends), max(ends)
                elif known is None:
                    return
                else:
                    first = last = known
            rect = _rect(match)
            if rect is not None:
                seen.references += [Reference(of, *rect) for of in range(first, last + 1)]
                return
        name = self.names.find(text, sheet)
        if name is None or depth > 16:
            return
        inner = self._of_name.get(name)
        if inner is None:
            self._of_name[name] = inner = _Seen([])  # a name in a circle refers to nothing more
            try:
                home = name.sheet or sheet
                parts = take_apart(self.tables.written_out(name.text.removeprefix("="), home, 1, 1))
                here = self._sheet_index.get(home.casefold(), number)
                inner = self._see(self._table_names(parts, home), here, home, depth + 1)
            except Unreadable:
                pass
            self._of_name[name] = inner
        seen.references += inner.references
        seen.anywhere = seen.anywhere or inner.anywhere
        seen.outside = seen.outside or inner.outside
        seen.functions |= inner.functions


def _rect(match: re.Match[str]) -> tuple[int, int, int, int] | None:
    c1, r1, c2, r2, columns1, columns2, rows1, rows2 = match.groups()
    try:
        if columns1:
            left, right = column_number(columns1), column_number(columns2)
            return 1, min(left, right), MAX_ROW, max(left, right)
        if rows1:
            return min(int(rows1), int(rows2)), 1, max(int(rows1), int(rows2)), MAX_COLUMN
        row, col = int(r1), column_number(c1)
        if not r2:
            return (row, col, row, col) if 1 <= row <= MAX_ROW else None
        bottom, right = int(r2), column_number(c2)
        return min(row, bottom), min(col, right), max(row, bottom), max(col, right)
    except ValueError:
        return None
