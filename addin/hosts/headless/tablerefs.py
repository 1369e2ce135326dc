"""Table references (``Pipes[Flow]``) written out as plain ranges.

The embedded evaluator knows only some of their spellings, and the dependency graph
needs the cells they mean, so both work on the plain range.
"""

from __future__ import annotations

import re
from collections.abc import Iterable

from ...xlsx.a1 import range_from_a1, to_a1
from ...xlsx.package import TableRef

Rect = tuple[int, int, int, int]

# What must not be taken for a table reference comes before it.
_TOKEN = re.compile(
    r"""
      (?P<text>"(?:[^"]|"")*")
    | (?P<quoted>'(?:[^']|'')*'!)
    | (?P<book>\[[^\[\]]*\](?=[\w'!.]))                             # [1]Sheet1!A1, [1]!name
    | (?P<outside>![^\W\d][\w.\\?]*\[)                              # a table of another workbook
    | (?P<name>[^\W\d][\w.\\?]*)?(?P<spec>\[(?:'.|[^\[\]']|\[(?:'.|[^\[\]'])*\])*\])
    """,
    re.VERBOSE | re.DOTALL,
)
_ITEM = re.compile(r"\[((?:'.|[^\[\]'])*)\]")
_ESCAPE = re.compile(r"'(.)")


def sheet_range(sheet: str, rect: Rect) -> str:
    """``'My sheet'!$A$1:$B$2``; a single cell has no colon."""
    r1, c1, r2, c2 = rect
    quoted = sheet.replace("'", "''")
    first = f"'{quoted}'!{to_a1(r1, c1, absolute=True)}"
    return first if (r1, c1) == (r2, c2) else f"{first}:{to_a1(r2, c2, absolute=True)}"


class Tables:
    """The tables of a workbook, by name and by place."""

    def __init__(self, tables: Iterable[TableRef]) -> None:
        self._tables: dict[str, TableRef] = {}
        self._rects: dict[str, Rect] = {}
        for table in tables:
            self._tables[table.name.casefold()] = table
            self._rects[table.name.casefold()] = range_from_a1(table.ref)

    def __bool__(self) -> bool:
        return bool(self._tables)

    def data(self, name: str) -> tuple[str, Rect] | None:
        """Sheet and data rows of a table, or None when there is no such table."""
        table = self._tables.get(name.casefold())
        if table is None:
            return None
        r1, c1, r2, c2 = self._rects[name.casefold()]
        return table.sheet, (r1 + table.header_rows, c1, r2 - table.totals_rows, c2)

    def written_out(self, text: str, sheet: str, row: int, col: int) -> str:
        """A formula of the given cell with every table reference as a plain range.

        An unknown table, column or row becomes ``#REF!`` or ``#VALUE!``, as a spreadsheet shows it.
        """
        if "[" not in text or not self._tables:
            return text

        def replace(match: re.Match[str]) -> str:
            spec = match["spec"]
            if spec is None:
                return match[0]
            name = match["name"]
            key = name.casefold() if name else self._around(sheet, row, col)
            if key not in self._tables:
                return match[0] if name is None else "#REF!"
            return self._resolve(key, spec[1:-1], row)

        return _TOKEN.sub(replace, text)

    def _around(self, sheet: str, row: int, col: int) -> str:
        for key, (r1, c1, r2, c2) in self._rects.items():
            if self._tables[key].sheet == sheet and r1 <= row <= r2 and c1 <= col <= c2:
                return key
        return ""

    def _resolve(self, key: str, spec: str, row: int) -> str:
        table = self._tables[key]
        r1, c1, r2, c2 = self._rects[key]
        items: list[str] = []
        spec = spec.strip()
        this_row = spec.startswith("@")
        if this_row:
            spec = spec[1:].strip()
        if spec.startswith("["):
            items = [item.strip() for item in _ITEM.findall(spec)]
            span = re.search(r"\]\s*:\s*\[", spec) is not None
        else:
            items, span = ([spec] if spec else []), False
        areas = {item.casefold() for item in items if item.startswith("#")}
        columns = [_ESCAPE.sub(r"\1", item).casefold() for item in items if not item.startswith("#")]
        if columns:
            known = [name.casefold() for name in table.columns]
            if len(columns) > 2 or (len(columns) == 2 and not span) or any(c not in known for c in columns):
                return "#REF!"
            places = [c1 + known.index(column) for column in columns]
            c1, c2 = min(places), max(places)
        first, last = r1 + table.header_rows, r2 - table.totals_rows
        if this_row or "#this row" in areas:
            if not first <= row <= last:
                return "#VALUE!"
            return sheet_range(table.sheet, (row, c1, row, c2))
        if "#all" in areas:
            return sheet_range(table.sheet, (r1, c1, r2, c2))
        rows: list[int] = []
        if "#headers" in areas and table.header_rows:
            rows += [r1, first - 1]
        if "#totals" in areas and table.totals_rows:
            rows += [last + 1, r2]
        if "#data" in areas or not areas:
            rows += [first, last]
        if not rows or min(rows) > max(rows):
            return "#REF!"
        return sheet_range(table.sheet, (min(rows), c1, max(rows), c2))
