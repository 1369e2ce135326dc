"""Where the rows and cells of a sheet part lie in its bytes.

A sheet can hold a million cells, so no tree of it is built. The scanner steps from
row to row and from cell to cell and accepts exactly what a sheet may hold there;
anything else is refused, since guessing could damage the file.
"""

from __future__ import annotations

import re
from collections.abc import Iterator
from dataclasses import dataclass
from functools import lru_cache
from typing import NamedTuple

from .a1 import MAX_COLUMN, MAX_ROW, column_number
from .opc import MAIN, STRICT
from .refusals import Refusal

_ATTRIBUTES = rb"""((?:[^"'<>/]++|"[^"<]*+"|'[^'<]*+')*+)"""
_NODE = re.compile(
    rb"""<!--.*?-->|<\?.*?\?>|<!\[CDATA\[.*?\]\]>|<!|<(/?)((?:[^\s<>/:="']+:)?)([^\s<>/:="']+)"""
    + _ATTRIBUTES
    + rb"(/?)>",
    re.DOTALL,
)
_ATTRIBUTE = re.compile(rb"""([^\s="']+)\s*=\s*(?:"([^"]*)"|'([^']*)')""")
_ROW_NUMBER = re.compile(rb"""\sr\s*=\s*["']\s*([0-9]+)\s*["']""")
_PLACE = re.compile(rb"\sr\s*=")
_PLAIN_CELL = re.compile(rb"""\s+r="([A-Z]{1,3})([0-9]{1,7})"(?: s="[0-9]+")?(?: t="([a-zA-Z]+)")?""")
_CLOSING = re.compile(rb"\s*>")
_SPACE = re.compile(rb"\s*")


def refused(what: str) -> Refusal:
    """A sheet that is not written as a sheet has to be."""
    return Refusal(
        f"A sheet of this workbook {what}. Nothing was changed. "
        "Open it in the spreadsheet program, save it and use that file."
    )


def attributes(raw: bytes) -> dict[str, str]:
    """Attributes of a tag by name, as they stand (no entity occurs in those that are used)."""
    try:
        return {
            m[1].decode(): (m[2] if m[2] is not None else m[3]).decode() for m in _ATTRIBUTE.finditer(raw)
        }
    except UnicodeDecodeError as error:
        raise refused("holds text that is not UTF-8") from error


class Grammar(NamedTuple):
    """Patterns of the elements of a sheet under one namespace prefix."""

    row: re.Pattern[bytes]
    row_end: bytes
    cell: re.Pattern[bytes]
    content: re.Pattern[bytes]
    formula: re.Pattern[bytes]
    cell_start: re.Pattern[bytes]
    stray: re.Pattern[bytes]
    text: re.Pattern[bytes]
    phonetic: re.Pattern[bytes]


@lru_cache(maxsize=8)
def grammar(prefix: bytes) -> Grammar:
    """The patterns for ``prefix``, which is empty or ends in a colon."""
    p = re.escape(prefix)
    a = _ATTRIBUTES

    def compiled(pattern: bytes) -> re.Pattern[bytes]:
        return re.compile(pattern.replace(b"@", b"<" + p).replace(b"~", b"</" + p), re.DOTALL)

    def element(name: bytes, inside: bytes) -> bytes:
        return rb"@" + name + rb"(?=[\s/>])" + a + rb"(?:/>|>" + inside + rb"~" + name + rb"\s*+>)"

    return Grammar(
        row=compiled(rb"\s*+(@row(?=[\s/>])" + a + rb"(/?)>)"),
        row_end=b"</" + prefix + b"row",
        cell=compiled(rb"\s*+" + element(b"c", rb"([^<]*+(?:<(?!/" + p + rb"c[\s>])[^<]*+)*+)")),
        content=compiled(
            rb"\s*+(?P<f>"
            + element(b"f", rb"(?P<ftext>[^<]*+)").replace(a, b"(?P<fattrs>" + a[1:], 1)
            + rb")?+\s*+(?P<v>"
            + element(b"v", rb"(?P<vtext>[^<]*+)")
            + rb")?+\s*+(?P<is>"
            + element(b"is", rb"(?P<istext>.*?)")
            + rb")?+\s*+(?P<rest>.*)"
        ),
        formula=compiled(rb"@f(?=[\s/>])"),
        cell_start=compiled(rb"@c(?=[\s/>])"),
        stray=compiled(rb"@(?:f|v|is)[\s/>]"),
        text=compiled(element(b"t", rb"([^<]*+)")),
        phonetic=compiled(element(b"rPh", rb".*?")),
    )


class Row(NamedTuple):
    """One row: its number, its tag and its body as places in the sheet's bytes."""

    number: int
    start: int
    body: int
    body_end: int
    stop: int
    attrs: bytes
    closed: bool


class CellMark(NamedTuple):
    """One cell: its place, its attributes, its type and its content."""

    row: int
    col: int
    start: int
    stop: int
    attrs: bytes
    type: str
    content: bytes


@dataclass(frozen=True, slots=True)
class Frame:
    """What stands around the cells of a sheet. ``data`` to ``data_end`` are the rows."""

    xml: bytes
    prefix: bytes
    grammar: Grammar
    tag: int
    data: int
    data_end: int
    closed: bool
    dimension: tuple[int, int] | None
    columns: tuple[tuple[int, int, str], ...]

    @classmethod
    def locate(cls, xml: bytes) -> Frame:
        """Find the rows of a sheet part. Raises :class:`Refusal` for what is no ordinary sheet."""
        _check_encoding(xml)
        depth = 0
        prefix = b""
        dimension = None
        columns: list[tuple[int, int, str]] = []
        for node in _NODE.finditer(xml):
            if node[3] is None:
                if node[0] == b"<!":
                    raise refused("declares a document type, which a workbook may not do")
                continue
            if depth == 0:
                prefix = node[2]
                _check_root(node)
            own = node[2] == prefix
            if own and depth == 1 and node[3] == b"sheetData" and not node[1]:
                data_end = node.end()
                if not node[5]:
                    data_end = xml.find(b"</" + prefix + b"sheetData", node.end())
                    if data_end < 0:
                        raise refused("breaks off before its end")
                    for mark in (b"<!", b"<?"):
                        if xml.find(mark, node.end(), data_end) >= 0:
                            raise refused("holds comments, CDATA or processing instructions among its cells")
                return cls(
                    xml,
                    prefix,
                    grammar(prefix),
                    node.start(),
                    node.end(),
                    data_end,
                    bool(node[5]),
                    dimension,
                    tuple(columns),
                )
            if own and depth == 1 and node[3] == b"dimension" and not node[1]:
                dimension = node.span()
            if own and depth == 2 and node[3] == b"col" and not node[1]:
                found = attributes(node[4])
                if all(found.get(name, "").isdecimal() for name in ("min", "max", "style")):
                    columns.append((int(found["min"]), int(found["max"]), found["style"]))
            if node[1]:
                depth -= 1
            elif not node[5]:
                depth += 1
        raise refused("has no cell data")

    def rows(self) -> Iterator[Row]:
        """All rows in the order of the file."""
        if self.closed:
            return
        xml, end = self.xml, self.data_end
        start_tag, row_end = self.grammar.row, self.grammar.row_end
        at = self.data
        number = 0
        while (match := start_tag.match(xml, at, end)) is not None:
            given = _ROW_NUMBER.search(match[2])
            number = int(given[1]) if given else number + 1
            if not 1 <= number <= MAX_ROW:
                raise refused(f"has a row number {number}")
            body = body_end = at = match.end()
            if not match[3]:
                body_end = xml.find(row_end, body, end)
                if body_end < 0:
                    raise refused(f"breaks off in row {number}")
                closing = _CLOSING.match(xml, body_end + len(row_end), end)
                if closing is None:
                    raise refused(f"has a broken tag at the end of row {number}")
                at = closing.end()
            yield Row(number, match.start(1), body, body_end, at, match[2], bool(match[3]))
        if at != end and _SPACE.fullmatch(xml, at, end) is None:
            raise refused(f"holds something other than a row after row {number}")

    def cells(self, row: Row) -> Iterator[CellMark]:
        """All cells of a row in the order of the file."""
        at, col = row.body, 0
        while (match := self.grammar.cell.match(self.xml, at, row.body_end)) is not None:
            cell = self._mark(match, row.number, col)
            yield cell
            at, col = cell.stop, cell.col
        if at != row.body_end and _SPACE.fullmatch(self.xml, at, row.body_end) is None:
            raise refused(f"holds something other than a cell in row {row.number}")

    def last_column(self, row: Row) -> int:
        """The column of the last cell of a row, 0 where it has none; the other cells are not looked at."""
        start = self.xml.rfind(b"<" + self.prefix + b"c ", row.body, row.body_end)
        match = self.grammar.cell.match(self.xml, start, row.body_end) if start >= 0 else None
        if match is None or _PLACE.search(match[1]) is None or match.end() != row.body_end:
            # Something unusual: the careful way finds out, or refuses.
            return max((cell.col for cell in self.cells(row)), default=0)
        return self._mark(match, row.number, 0).col

    def _mark(self, match: re.Match[bytes], row: int, before: int) -> CellMark:
        attrs, content = match[1], match[2] or b""
        start = self.xml.index(b"<", match.start())
        plain = _PLAIN_CELL.fullmatch(attrs)
        if plain is not None:
            kind = plain[3].decode() if plain[3] else "n"
            place = _column(plain[1])
            if row and int(plain[2]) != row:
                raise refused(f"has cell {(plain[1] + plain[2]).decode()} in row {row}")
            return CellMark(int(plain[2]), place, start, match.end(), attrs, kind, content)
        found = attributes(attrs)
        at_row, at_col = row, before + 1
        if "r" in found:
            letters = found["r"].rstrip("0123456789")
            digits = found["r"][len(letters) :]
            at_row, at_col = int(digits) if len(digits) < 8 and digits else 0, _column(letters.encode())
        if at_row < 1 or (row and at_row != row) or at_col > MAX_COLUMN:
            raise refused(f"has a cell {found.get('r', '')!r} in row {row}")
        return CellMark(at_row, at_col, start, match.end(), attrs, found.get("t", "n"), content)

    def formula_marks(self) -> Iterator[CellMark]:
        """The cells that hold a formula element, found without looking at the others."""
        at = self.data
        while (hit := self.grammar.formula.search(self.xml, at, self.data_end)) is not None:
            start = self.xml.rfind(b"<" + self.prefix + b"c", self.data, hit.start())
            while start >= 0 and self.grammar.cell_start.match(self.xml, start) is None:
                start = self.xml.rfind(b"<" + self.prefix + b"c", self.data, start)
            match = self.grammar.cell.match(self.xml, start) if start >= 0 else None
            if match is None or match.end() <= hit.start():
                raise refused("holds a formula outside a cell")
            if _PLACE.search(match[1]) is None:
                raise LookupError("a cell without a reference")
            cell = self._mark(match, 0, 0)
            yield cell
            at = cell.stop

    def content(self, cell: CellMark) -> re.Match[bytes]:
        """The parts of a cell: f, fattrs, ftext, v, vtext, is, istext and rest."""
        match = self.grammar.content.fullmatch(cell.content)
        if match is None or self.grammar.stray.match(match["rest"]) is not None:
            raise refused(f"has the parts of a cell of row {cell.row} in an order that is not allowed")
        return match


@lru_cache(maxsize=MAX_COLUMN)
def _column(letters: bytes) -> int:
    try:
        return column_number(letters.decode())
    except ValueError as error:
        raise refused(f"has a cell in a column {letters!r}") from error


def _check_encoding(xml: bytes) -> None:
    head = xml[:200]
    declared = re.match(rb"""(?:\xef\xbb\xbf)?\s*<\?xml[^>]*?encoding\s*=\s*["']([^"']+)["']""", head)
    name = declared[1].decode().lower() if declared else "utf-8"
    if head[:2] in (b"\xff\xfe", b"\xfe\xff") or b"\0" in head or name not in ("utf-8", "utf8", "us-ascii"):
        raise refused("is not written in UTF-8")


def _check_root(node: re.Match[bytes]) -> None:
    prefix, root = (text.decode("utf-8", "replace") for text in (node[2], node[3]))
    space = attributes(node[4]).get(f"xmlns:{prefix}".rstrip(":"), "")
    if space.startswith(STRICT):
        raise refused("is saved as Strict Open XML")
    if space != MAIN or root != "worksheet":
        raise refused(f"is not a worksheet but {root!r} of {space!r}")
