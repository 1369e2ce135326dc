"""Store values in the cells of a sheet part."""

from __future__ import annotations

import math
import re
from collections.abc import Callable, Mapping, Sequence

from ..cells import Grid, Scalar
from .a1 import column_number
from .cellvalues import encode, value_element
from .sheetedit import Editor, Extent, Place, bounds, range_text, with_ref, with_type
from .sheetscan import CellMark, Frame, attributes

# Smaller blocks are handled as single cells, so that many of them cost no search by row.
_SMALL_BLOCK = 2_000


class _Keep:
    """Stands for the value that is already there."""


_KEEP = _Keep()
_New = Scalar | _Keep


def store(
    xml: bytes,
    values: Mapping[Place, Scalar],
    blocks: Sequence[tuple[int, int, Grid]] = (),
    array_refs: Mapping[Place, Extent] = {},
) -> bytes:
    """The sheet with other values in some cells; every other byte stays.

    ``values`` are single cells by (row, column). ``blocks`` are (row, column, two-dimensional
    array) put down and to the right from there; they must not overlap. A single cell counts
    before a block. None clears a value. ``array_refs`` gives array formulas a new extent; what
    lies in the old extent alone must be cleared by the caller through ``values``.

    A cell keeps its style and its formula, and all its bytes when the value is already there.
    Raises ValueError when ``array_refs`` names a cell without an array formula or a block is
    not two-dimensional, TypeError for a value that no cell can hold, :class:`Refusal` when the
    sheet is not written as a sheet has to be.
    """
    frame = Frame.locate(xml)
    cells = _NewValues(values, blocks, array_refs)
    done: set[Place] = set()
    editor: Editor[_New] = Editor(
        frame, _rewriter(frame, array_refs, done), _writer(frame), _overwriter(frame.prefix.decode())
    )
    result = editor.edited(cells.numbers(), cells.of_row, cells.extent)
    missed = sorted(set(array_refs) - done)
    if missed:
        raise ValueError(f"row {missed[0][0]}, column {missed[0][1]} holds no array formula")
    return result


class _NewValues:
    """New values by row, from single cells and from blocks."""

    def __init__(
        self,
        values: Mapping[Place, Scalar],
        blocks: Sequence[tuple[int, int, Grid]],
        array_refs: Mapping[Place, Extent],
    ) -> None:
        self._rows: dict[int, dict[int, _New]] = {}
        self._large: list[tuple[int, int, Grid]] = []
        corners = [place for place, value in values.items() if value is not None]
        for row, col, grid in blocks:
            if grid.ndim != 2:
                raise ValueError(f"a block must have two dimensions, not {grid.ndim}")
            if grid.size == 0:
                continue
            corners += [(row, col), (row + grid.shape[0] - 1, col + grid.shape[1] - 1)]
            if grid.size > _SMALL_BLOCK:
                self._large.append((row, col, grid))
                continue
            for down, line in enumerate(grid.tolist()):
                self._rows.setdefault(row + down, {}).update(enumerate(line, col))
        for (row, col), value in values.items():
            self._rows.setdefault(row, {})[col] = value
        for row, col in array_refs:
            if col not in self.of_row(row):
                self._rows.setdefault(row, {})[col] = _KEEP
        self.extent = bounds(corners)

    def numbers(self) -> list[int]:
        """Numbers of the rows that change, ascending."""
        numbers = set(self._rows)
        for row, _, grid in self._large:
            numbers.update(range(row, row + grid.shape[0]))
        return sorted(numbers)

    def of_row(self, number: int) -> dict[int, _New]:
        """New values of one row by column, ascending."""
        singles = self._rows.get(number)
        lines = [
            (col, grid[number - row].tolist())
            for row, col, grid in self._large
            if row <= number < row + grid.shape[0]
        ]
        if singles is None and len(lines) == 1:
            return dict(enumerate(lines[0][1], lines[0][0]))
        found: dict[int, _New] = {}
        for col, line in lines:
            found.update(enumerate(line, col))
        found.update(singles or {})
        return dict(sorted(found.items()))


def _writer(frame: Frame) -> Callable[[_New, str, str], str]:
    prefix = frame.prefix.decode()
    start, open_value, end = f'<{prefix}c r="', f"><{prefix}v>", f"</{prefix}v></{prefix}c>"

    def fresh(value: _New, place: str, style: str) -> str:
        if type(value) is float:  # by far the most frequent
            kind, text = encode(value)
            if not kind:
                return f'{start}{place}"{style}{open_value}{text}{end}'
        if value is None or isinstance(value, _Keep):
            return ""
        kind, text = encode(value)
        typed = f' t="{kind}"' if kind else ""
        return f'<{prefix}c r="{place}"{style}{typed}>{value_element(prefix, kind, text)}</{prefix}c>'

    return fresh


def _rewriter(
    frame: Frame, array_refs: Mapping[Place, Extent], done: set[Place]
) -> Callable[[CellMark, _New], bytes]:
    prefix = frame.prefix.decode()
    start, end = f"<{prefix}c".encode(), f"</{prefix}c>".encode()

    def rewrite(cell: CellMark, value: _New) -> bytes:
        parts = frame.content(cell)
        formula: bytes = parts["f"] or b""
        place = (cell.row, cell.col)
        if place in array_refs and _is_array(parts):
            done.add(place)
            formula = _resized(formula, parts["fattrs"], array_refs[place])
        kind, text = ("", None) if isinstance(value, _Keep) else encode(value)
        if isinstance(value, _Keep) or _same(cell, parts, kind, text):
            raw = frame.xml[cell.start : cell.stop]
            return raw.replace(parts["f"], formula, 1) if formula else raw
        attrs = with_type(cell.attrs, kind)
        inner = formula + value_element(prefix, kind, text).encode() + parts["rest"]
        return start + attrs + (b">" + inner + end if inner else b"/>")

    return rewrite


def _overwriter(prefix: str) -> Callable[[bytes, int, Mapping[int, _New]], bytes | None]:
    """Rows of plain values, one after the other and without formulas, written in one go."""
    c, v = f"{prefix}c", f"{prefix}v"
    plain = re.compile(
        rf'(<{c} r="([A-Z]{{1,3}})([0-9]+)"((?: s="[0-9]+")?)(?: t="(?:n|([a-zA-Z]+))")?'
        rf'(?:/>|><{v}(?: xml:space="preserve")?>([^<]*)</{v}></{c}>))'
    )

    def overwrite(body: bytes, number: int, changes: Mapping[int, _New]) -> bytes | None:
        try:
            old_body = body.decode()
            cells = [(column_number(found[1]), *found) for found in plain.findall(old_body)]
        except ValueError:
            return None
        out: list[str] = []
        digits = str(number)
        met = length = before = 0
        for col, whole, letters, row, style, kind, text in cells:
            if row != digits or col <= before:
                return None
            before = col
            length += len(whole)
            if col not in changes:
                out.append(whole)
                continue
            met += 1
            value = changes[col]
            if isinstance(value, _Keep):
                return None
            new_kind, new = encode(value)
            if new_kind == kind and new == text:
                out.append(whole)
            elif new is None:
                out.append(f'<{c} r="{letters}{row}"{style}/>')
            elif not kind and not new_kind and text and _equal(text, new):
                out.append(whole)
            else:
                typed = f' t="{new_kind}"' if new_kind else ""
                out.append(
                    f'<{c} r="{letters}{row}"{style}{typed}>{value_element(prefix, new_kind, new)}</{c}>'
                )
        return "".join(out).encode() if met == len(changes) and length == len(old_body) else None

    return overwrite


def _is_array(parts: re.Match[bytes]) -> bool:
    return attributes(parts["fattrs"] or b"").get("t") == "array"


def _resized(formula: bytes, attrs: bytes, extent: Extent) -> bytes:
    old = attributes(attrs).get("ref")
    if old is None:
        new = attrs + f' ref="{range_text(extent)}"'.encode()
    elif old == range_text(extent):
        return formula
    else:
        new = with_ref(attrs, extent)
    return formula.replace(attrs, new, 1)


def _same(cell: CellMark, parts: re.Match[bytes], kind: str, text: str | None) -> bool:
    """Whether a cell already holds a value, so that its bytes can stay."""
    old: bytes | None = parts["vtext"]
    if text is None:
        return not old and parts["is"] is None and cell.type != "str"  # an empty text is a value
    if not old or cell.type != (kind or "n") or b" vm" in cell.attrs:
        return False
    if old == text.encode():
        return True
    return not kind and _equal(old, text)


def _equal(old: bytes | str, new: str) -> bool:
    """Whether two texts are the same number, a negative zero being another than zero."""
    try:
        was, now = float(old), float(new)
    except ValueError:
        return False
    return was == now and math.copysign(1, was) == math.copysign(1, now)
