"""Cell values as a sheet part writes them."""

from __future__ import annotations

import datetime
import math
from collections.abc import Sequence

import numpy as np

from ..cells import ERROR_KIND, CellError, Scalar
from .sheetscan import CellMark, Frame, refused
from .xmltext import escape, unescape

# The longest text that a cell can hold.
MAX_TEXT = 32_767


def encode(value: Scalar) -> tuple[str, str | None]:
    """The cell type (empty for a number) and the escaped text, None for an empty cell.

    A number that is not finite becomes #NUM!, a text too long for a cell #VALUE!,
    as in a spreadsheet. Raises TypeError for what no cell can hold.
    """
    if type(value) is float:
        if not math.isfinite(value):
            return "e", "#NUM!"
        text = repr(value)
        return "", text[:-2] if text.endswith(".0") else text
    if value is None:
        return "", None
    if isinstance(value, str):
        return ("str", escape(str(value))) if len(value) <= MAX_TEXT else ("e", "#VALUE!")
    if isinstance(value, bool):
        return "b", "1" if value else "0"
    if isinstance(value, CellError):
        return "e", str(value)
    if isinstance(value, np.generic):
        return encode(value.item())
    if isinstance(value, int):
        return encode(float(value))
    raise TypeError(f"a cell cannot hold a {type(value).__name__}")


def value_element(prefix: str, kind: str, text: str | None) -> str:
    """The ``<v>`` of a value; nothing for an empty cell."""
    if text is None:
        return ""
    keep = ' xml:space="preserve"' if kind == "str" and text != text.strip() else ""
    return f"<{prefix}v{keep}>{text}</{prefix}v>"


def decode(frame: Frame, cell: CellMark, shared_strings: Sequence[str]) -> Scalar:
    """The stored value of a cell, None when none is stored.

    An error of a newer kind, such as #SPILL!, comes as #VALUE! with its name as message.
    A date in ISO form comes as its serial number of the 1900 date system.
    """
    if not cell.content:
        return None
    parts = frame.content(cell)
    kind = cell.type
    if kind == "inlineStr":
        inside = frame.grammar.phonetic.sub(b"", parts["istext"] or b"")
        return "".join(unescape(match[2] or b"") for match in frame.grammar.text.finditer(inside))
    raw = parts["vtext"]
    if raw is None:
        return None
    try:
        if kind == "str":
            return unescape(raw)
        if not raw.strip():
            return None
        if kind == "n":
            return float(raw)
        if kind == "s":
            index = int(raw)
            if index < 0:
                raise ValueError("a negative index")
            return shared_strings[index]
        if kind == "b":
            return raw.strip() in (b"1", b"true")
        if kind == "e":
            text = unescape(raw)
            return CellError(ERROR_KIND[text]) if text in ERROR_KIND else CellError("VALUE", text)
        if kind == "d":
            return _serial(raw.decode())
    except (ValueError, IndexError) as error:
        raise refused(f"has an unreadable value {raw[:40]!r} in row {cell.row}") from error
    raise refused(f"has a cell of an unknown type {kind!r} in row {cell.row}")


def _serial(text: str) -> float:
    moment = datetime.datetime.fromisoformat(text.strip().removesuffix("Z")).replace(tzinfo=None)
    days = (moment - datetime.datetime(1899, 12, 30)) / datetime.timedelta(days=1)
    # The 1900 system counts a 29 February 1900 that never was.
    return days if days >= 61 else days - 1
