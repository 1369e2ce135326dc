"""The relative form of a formula: equal for two cells when one was filled from the other."""

from __future__ import annotations

import re

from ..hosts.headless.dependency import Reference
from ..hosts.headless.formulas import Kind, Unreadable, call_name, take_apart
from ..hosts.headless.model import Node
from ..xlsx.formulashift import MovableFormula

# Any one cell far from every edge serves: formulas are compared after they are moved there.
_ROW, _COL = 524_288, 8_192
_ONE_CELL = re.compile(r"(?:.*!)?(\$?)[A-Za-z]{1,3}(\$?)[0-9]{1,7}", re.DOTALL)


def relative_form(node: Node) -> str:
    """The formula as it would read in one fixed cell, without what does not change its meaning."""
    cell = node.cell
    moved = MovableFormula(cell.text, cell.row, cell.col).at(_ROW, _COL)
    try:
        parts = take_apart(moved)
    except Unreadable:
        return moved.casefold()
    texts = []
    for part in parts:
        name = call_name(part.text) if part.kind is Kind.OPEN else None
        if part.kind is not Kind.SPACE:
            texts.append(f"{name}(" if name else part.text.casefold())
    return "".join(texts)


def moving(text: str) -> tuple[bool, bool] | None:
    """Whether a reference to one cell moves when filled down, and across; None for another text."""
    match = _ONE_CELL.fullmatch(text)
    return (not match[2], not match[1]) if match else None


def of_own_row(node: Node, area: Reference) -> bool:
    """Whether an area is of the formula's own row, and read by a table reference such as ``Pipes[@Flow]``."""
    text = node.cell.text.casefold()
    own = (area.sheet, area.r1, area.r2) == (node.sheet, node.cell.row, node.cell.row)
    return own and ("[@" in text or "#this row" in text)
