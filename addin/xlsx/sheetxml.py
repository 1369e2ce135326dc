"""Formulas and values of one worksheet part, read and changed byte by byte."""

from __future__ import annotations

from collections.abc import Collection, Iterator, Mapping, Sequence
from typing import NamedTuple

from ..cells import Scalar
from .a1 import range_from_a1
from .cellvalues import decode
from .formulashift import MovableFormula
from .sheetedit import Editor, Extent, Place, bounds, with_type
from .sheetscan import CellMark, Frame, attributes, refused
from .sheetstore import store
from .xmltext import escape, unescape

__all__ = ["FormulaCell", "formula_cells", "set_formulas", "store", "stored_values"]


class FormulaCell(NamedTuple):
    """One cell that holds a formula.

    ``row`` and ``col`` count from 1. ``text`` has no equals sign and is that of this
    cell also when the file holds it once for a group of cells. ``kind`` is plain, array,
    dynamic (an array that spills by itself) or table (a what-if data table, whose text is
    empty). ``ref`` is the extent of an array or of a data table. ``value`` is the stored value, or None.
    """

    row: int
    col: int
    text: str
    kind: str
    ref: Extent | None
    value: Scalar


class _RawFormula(NamedTuple):
    cell: CellMark
    text: str
    kind: str
    ref: Extent | None
    group: str | None


def formula_cells(xml: bytes, shared_strings: Sequence[str]) -> list[FormulaCell]:
    """All formulas of a sheet in the order of the file.

    Raises :class:`Refusal` when the sheet is not written as a sheet has to be.
    """
    frame = Frame.locate(xml)
    return [
        FormulaCell(
            raw.cell.row, raw.cell.col, raw.text, raw.kind, raw.ref, decode(frame, raw.cell, shared_strings)
        )
        for raw in _raw_formulas(frame)
    ]


def stored_values(xml: bytes, shared_strings: Sequence[str]) -> dict[Place, Scalar]:
    """All stored values of a sheet by (row, column); empty cells are left out.

    Raises :class:`Refusal` when the sheet is not written as a sheet has to be.
    """
    frame = Frame.locate(xml)
    values: dict[Place, Scalar] = {}
    for cell in _all_cells(frame):
        value = decode(frame, cell, shared_strings)
        if value is not None:
            values[cell.row, cell.col] = value
    return values


def set_formulas(xml: bytes, formulas: Mapping[Place, str], single: Collection[Place] = frozenset()) -> bytes:
    """The sheet with other formulas, given without equals sign, in some cells.

    The stored values of those cells go. An array formula stays one, with its extent, unless
    its cell is in ``single``: it becomes an ordinary formula of that one cell. When a
    cell belongs to a group that shares one formula, every other cell of the group gets that
    formula written out and keeps its value. Raises ValueError for an empty formula or one
    that begins with an equals sign, :class:`Refusal` as :func:`store`.
    """
    for (row, col), text in formulas.items():
        if not text or text.startswith("="):
            raise ValueError(f"row {row}, column {col}: {text!r} is not a formula without its equals sign")
    frame = Frame.locate(xml)
    shared = [raw for raw in _raw_formulas(frame) if raw.group is not None]
    touched = {raw.group for raw in shared if (raw.cell.row, raw.cell.col) in formulas}
    changes: dict[int, dict[int, tuple[str, bool]]] = {}
    for raw in shared:
        if raw.group in touched:
            changes.setdefault(raw.cell.row, {})[raw.cell.col] = (raw.text, True)
    for (row, col), text in formulas.items():
        changes.setdefault(row, {})[col] = (text, False)
    prefix = frame.prefix.decode()

    def rewrite(cell: CellMark, change: tuple[str, bool]) -> bytes:
        text, keep_value = change
        parts = frame.content(cell)
        kept = parts["fattrs"] or b""
        alone = (cell.row, cell.col) in single
        if alone or attributes(kept).get("t") != "array":
            kept = _without(kept, ("t", "ref", "aca", "si", "dt2D", "dtr", "r1", "r2", "del1", "del2"))
        formula = f"<{prefix}f".encode() + kept + f">{escape(text)}</{prefix}f>".encode()
        if keep_value:
            attrs, value = cell.attrs, (parts["v"] or b"") + (parts["is"] or b"")
        else:
            attrs, value = with_type(cell.attrs, ""), b""
            if alone:
                attrs = _without(attrs, ("cm",))
        return f"<{prefix}c".encode() + attrs + b">" + formula + value + parts["rest"] + _end(prefix)

    def fresh(change: tuple[str, bool], place: str, style: str) -> str:
        return f'<{prefix}c r="{place}"{style}><{prefix}f>{escape(change[0])}</{prefix}f></{prefix}c>'

    ordered = {row: dict(sorted(changes[row].items())) for row in sorted(changes)}
    editor = Editor(frame, rewrite, fresh)
    return editor.edited(ordered, ordered.__getitem__, bounds(formulas))


def _end(prefix: str) -> bytes:
    return f"</{prefix}c>".encode()


def _without(attrs: bytes, names: Sequence[str]) -> bytes:
    """Attributes of a formula without some of them."""
    return b"".join(
        f' {name}="{value}"'.encode() for name, value in attributes(attrs).items() if name not in names
    )


def _all_cells(frame: Frame) -> Iterator[CellMark]:
    for row in frame.rows():
        yield from frame.cells(row)


def _raw_formulas(frame: Frame) -> list[_RawFormula]:
    try:
        cells = list(frame.formula_marks())
    except LookupError:
        # Some cell does not name its place, so the places have to be counted.
        cells = [cell for cell in _all_cells(frame) if frame.grammar.formula.search(cell.content)]
    found: list[_RawFormula] = []
    masters: dict[str, MovableFormula] = {}
    # Members that stand before the one that holds the text, by group.
    waiting: dict[str, list[int]] = {}
    for cell in cells:
        parts = frame.content(cell)
        given = attributes(parts["fattrs"] or b"")
        text = unescape(parts["ftext"] or b"")
        kind, group = given.get("t", "normal"), None
        ref = None
        if kind == "array":
            ref = _extent(given["ref"]) if "ref" in given else (cell.row, cell.col, cell.row, cell.col)
            name = "dynamic" if attributes(cell.attrs).get("cm", "0") != "0" else "array"
        elif kind == "dataTable":
            name = "table"
            ref = _extent(given["ref"]) if "ref" in given else None
        elif kind == "shared" and "si" in given:
            name, group = "plain", given["si"]
            if text and ("ref" in given or group not in masters):
                masters[group] = MovableFormula(text, cell.row, cell.col)
                for index in waiting.pop(group, []):
                    early = found[index]
                    found[index] = early._replace(text=masters[group].at(early.cell.row, early.cell.col))
            elif not text and group in masters:
                text = masters[group].at(cell.row, cell.col)
            elif not text:
                waiting.setdefault(group, []).append(len(found))
        elif text:
            name = "plain"
        else:
            continue
        found.append(_RawFormula(cell, text, name, ref, group))
    for indices in waiting.values():
        raise refused(f"has a formula in row {found[indices[0]].cell.row} whose shared text is missing")
    return found


def _extent(text: str) -> Extent:
    try:
        return range_from_a1(text)
    except ValueError as error:
        raise refused(f"has an array formula with the extent {text!r}") from error
