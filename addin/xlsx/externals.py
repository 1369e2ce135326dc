"""Cells of other workbooks: the values that a file itself keeps of them. No other file is ever opened."""

from __future__ import annotations

import re
from collections.abc import Sequence

from lxml import etree

from ..cells import ERROR_KIND, CellError, Scalar
from .a1 import range_from_a1
from .opc import MAIN
from .xmltext import unescape_xstring

_OPERAND = re.compile(
    r"(?:'\[(?P<quoted_book>\d+)\](?P<quoted>(?:[^']|'')+)'|\[(?P<book>\d+)\](?P<sheet>[^'!\[\]]+))!"
    r"(?P<range>\$?[A-Za-z]{1,3}\$?[0-9]{1,7}(?::\$?[A-Za-z]{1,3}\$?[0-9]{1,7})?)"
)
_Cells = dict[tuple[int, int], Scalar]


class Externals:
    """What is kept of the linked workbooks, in the order in which formulas number them."""

    def __init__(self, roots: Sequence[etree._Element]) -> None:
        self._books = [_sheets(root) for root in roots]

    def grid(self, operand: str) -> list[list[Scalar]] | None:
        """The kept values of ``[1]Data!A1:B3``; None where the operand is no such range, or nothing is kept.

        A cell that is not kept is empty in a range; alone, nothing is known of it.
        """
        match = _OPERAND.fullmatch(operand)
        if match is None:
            return None
        number = int(match["book"] or match["quoted_book"])
        name = match["sheet"] or match["quoted"].replace("''", "'")
        if not 1 <= number <= len(self._books):
            return None
        cells = self._books[number - 1].get(name.casefold())
        try:
            r1, c1, r2, c2 = range_from_a1(match["range"])
        except ValueError:
            return None
        grid = [[(cells or {}).get((r, c)) for c in range(c1, c2 + 1)] for r in range(r1, r2 + 1)]
        return None if all(value is None for line in grid for value in line) else grid


def _sheets(root: etree._Element) -> dict[str, _Cells]:
    names = [node.get("val", "") for node in root.iter(f"{{{MAIN}}}sheetName")]
    out: dict[str, _Cells] = {}
    for data in root.iter(f"{{{MAIN}}}sheetData"):
        number = int(data.get("sheetId", "0"))
        if number < len(names):
            out[names[number].casefold()] = _cells(data)
    return out


def _cells(data: etree._Element) -> _Cells:
    cells: _Cells = {}
    for cell in data.iter(f"{{{MAIN}}}cell"):
        text = cell.findtext(f"{{{MAIN}}}v")
        if text is None:
            continue
        r1, c1, _, _ = range_from_a1(cell.get("r", "A1"))
        value = _value(cell.get("t", "n"), text)
        if value is not None:
            cells[r1, c1] = value
    return cells


def _value(kind: str, text: str) -> Scalar:
    if kind == "n":
        try:
            return float(text)
        except ValueError:
            return None
    if kind == "b":
        return text.strip() in ("1", "true")
    if kind == "e":
        return CellError(ERROR_KIND.get(text.strip(), "VALUE"))
    return unescape_xstring(text)
