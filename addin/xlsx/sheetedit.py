"""Put changed cells into the bytes of a sheet; all other bytes stay."""

from __future__ import annotations

import re
from collections.abc import Callable, Collection, Iterable, Mapping
from typing import Generic, TypeVar

from .a1 import column_letters, range_from_a1, to_a1
from .sheetscan import CellMark, Frame, Row, attributes, refused

Place = tuple[int, int]
Extent = tuple[int, int, int, int]
Change = TypeVar("Change")

_TYPE = re.compile(rb"""\st\s*=\s*(?:"[^"]*"|'[^']*')""")
_VALUE_METADATA = re.compile(rb"""\svm\s*=\s*(?:"[^"]*"|'[^']*')""")
_SPANS = re.compile(rb"""(\sspans\s*=\s*["'])([0-9]+):([0-9]+)(["'])""")
_REF = re.compile(rb"""(\sref\s*=\s*)(?:"([^"]*)"|'([^']*)')""")


def with_type(attrs: bytes, kind: str) -> bytes:
    """Attributes of a cell with another value type (empty for a number).

    The value metadata index goes: it describes the value that was there, such as the
    detail behind an error, and a spreadsheet would show that instead of the new one.
    """
    attrs = _VALUE_METADATA.sub(b"", attrs)
    new = f' t="{kind}"'.encode() if kind else b""
    match = _TYPE.search(attrs)
    if match is None:
        return attrs + new
    return attrs[: match.start()] + new + attrs[match.end() :]


def with_ref(attrs: bytes, extent: Extent) -> bytes:
    """Attributes with another ``ref``."""
    text = range_text(extent).encode()
    return _REF.sub(lambda match: match[1] + b'"' + text + b'"', attrs, count=1)


def range_text(extent: Extent) -> str:
    """``A1:C3``, or ``A1`` for a single cell."""
    r1, c1, r2, c2 = extent
    first, last = to_a1(r1, c1), to_a1(r2, c2)
    return first if first == last else f"{first}:{last}"


def bounds(places: Collection[Place]) -> Extent | None:
    """The smallest extent that holds all places, None when there are none."""
    rows, cols = zip(*places, strict=True) if places else ((), ())
    return (min(rows), min(cols), max(rows), max(cols)) if rows else None


class Editor(Generic[Change]):
    """Edits of a sheet: how a cell that is there changes, and how a new one is written.

    ``rewrite`` returns the bytes of the whole cell; ``fresh`` returns the text of a new
    cell from its change, its reference and its style attribute, or an empty text.
    ``whole_row`` may take a row's body, its number and its changes and return the new body,
    when every change meets a cell that is there; it saves time in large blocks.
    """

    def __init__(
        self,
        frame: Frame,
        rewrite: Callable[[CellMark, Change], bytes],
        fresh: Callable[[Change, str, str], str],
        whole_row: Callable[[bytes, int, Mapping[int, Change]], bytes | None] | None = None,
    ) -> None:
        self._frame = frame
        self._prefix = frame.prefix.decode()
        self._rewrite = rewrite
        self._fresh = fresh
        self._whole_row = whole_row
        self._styles: dict[int, str] = {}

    def edited(
        self,
        numbers: Iterable[int],
        changes_of: Callable[[int], Mapping[int, Change]],
        extent: Extent | None,
    ) -> bytes:
        """The sheet with the changes of the rows ``numbers`` (ascending), each by column (ascending).

        ``extent`` is what the dimension of the sheet has to cover afterwards.
        """
        frame = self._frame
        xml = frame.xml
        out = [self._head(extent)]
        wanted = iter(numbers)
        number = next(wanted, None)
        at = last = frame.data
        before = 0
        for row in frame.rows():
            if number is None:
                break
            if row.number <= before:
                raise refused(f"has row {row.number} after row {before}")
            before = row.number
            if number <= row.number:
                out.append(xml[at : row.start])
                at = row.start
                while number is not None and number < row.number:
                    out.append(self._new_row(number, changes_of(number)))
                    number = next(wanted, None)
                if number == row.number:
                    out.append(self._row(row, changes_of(number)))
                    at = row.stop
                    number = next(wanted, None)
            last = row.stop
        out.append(xml[at:last])
        while number is not None:
            out.append(self._new_row(number, changes_of(number)))
            number = next(wanted, None)
        if frame.closed:
            out.append(f"</{self._prefix}sheetData>".encode())
        out.append(xml[last:])
        return b"".join(out)

    def _head(self, extent: Extent | None) -> bytes:
        frame = self._frame
        xml = frame.xml
        tag = xml[frame.tag : frame.data]
        if frame.closed:
            tag = tag[:-2].rstrip() + b">"
        if extent is None or frame.dimension is None:
            return xml[: frame.tag] + tag
        start, stop = frame.dimension
        old = xml[start:stop]
        match = _REF.search(old)
        if match is None:
            return xml[: frame.tag] + tag
        try:
            r1, c1, r2, c2 = range_from_a1((match[2] or match[3] or b"").decode())
        except ValueError:
            return xml[: frame.tag] + tag
        grown = (min(r1, extent[0]), min(c1, extent[1]), max(r2, extent[2]), max(c2, extent[3]))
        if grown != (r1, c1, r2, c2):
            old = with_ref(old, grown)
        return xml[:start] + old + xml[stop : frame.tag] + tag

    def _new_cell(self, number: int, col: int, change: Change, row_style: str | None) -> str:
        style = row_style if row_style is not None else self._column_style(col)
        return self._fresh(change, f"{column_letters(col)}{number}", style)

    def _column_style(self, col: int) -> str:
        style = self._styles.get(col)
        if style is None:
            given = (text for first, last, text in self._frame.columns if first <= col <= last)
            text = next(given, "0")
            style = self._styles[col] = "" if text == "0" else f' s="{text}"'
        return style

    def _new_row(self, number: int, changes: Mapping[int, Change]) -> bytes:
        cells = "".join([self._new_cell(number, col, change, None) for col, change in changes.items()])
        return f'<{self._prefix}row r="{number}">{cells}</{self._prefix}row>'.encode() if cells else b""

    def _row(self, row: Row, changes: Mapping[int, Change]) -> bytes:
        xml = self._frame.xml
        if self._whole_row is not None:
            whole = self._whole_row(xml[row.body : row.body_end], row.number, changes)
            if whole is not None:
                return xml[row.start : row.body] + whole + xml[row.body_end : row.stop]
        style = None
        if b"customFormat" in row.attrs:
            found = attributes(row.attrs)
            if found.get("customFormat") in ("1", "true"):
                style = f' s="{found["s"]}"' if found.get("s", "0") != "0" else ""
        wanted = list(changes.items())
        if wanted[0][0] > self._frame.last_column(row):  # behind all cells: no need to look at them
            if all(change is None for _, change in wanted):
                return xml[row.start : row.stop]
            texts = [(col, self._new_cell(row.number, col, change, style)) for col, change in wanted]
            new = "".join([text for _, text in texts])
            if not new:
                return xml[row.start : row.stop]
            return self._with(
                row, xml[row.body : row.body_end] + new.encode(), [col for col, text in texts if text]
            )
        out: list[bytes] = []
        added: list[int] = []
        index, count = 0, len(wanted)

        def insert(below: int | None) -> None:
            nonlocal index
            while index < count and (below is None or wanted[index][0] < below):
                col, change = wanted[index]
                text = self._new_cell(row.number, col, change, style)
                if text:
                    out.append(text.encode())
                    added.append(col)
                index += 1

        at, before = row.body, 0
        for cell in self._frame.cells(row):
            if cell.col <= before:
                raise refused(f"has its cells of row {row.number} out of order")
            before = cell.col
            if index >= count:
                break
            out.append(xml[at : cell.start])
            insert(cell.col)
            if index < count and wanted[index][0] == cell.col:
                out.append(self._rewrite(cell, wanted[index][1]))
                index += 1
            else:
                out.append(xml[cell.start : cell.stop])
            at = cell.stop
        insert(None)
        out.append(xml[at : row.body_end])
        return self._with(row, b"".join(out), added)

    def _with(self, row: Row, body: bytes, added: list[int]) -> bytes:
        """The row with another body, in which the columns ``added`` are new."""
        xml = self._frame.xml
        if not added:
            return xml[row.start : row.body] + body + xml[row.body_end : row.stop]
        tag = _SPANS.sub(
            lambda m: m[1] + b"%d:%d" % (min(int(m[2]), *added), max(int(m[3]), *added)) + m[4],
            xml[row.start : row.body],
            count=1,
        )
        if row.closed:
            return tag[:-2].rstrip() + b">" + body + f"</{self._prefix}row>".encode()
        return tag + body + xml[row.body_end : row.stop]
