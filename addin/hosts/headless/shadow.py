"""The evaluation copy of a workbook: the same cells with formulas as the evaluator reads them.

It lives in memory only. The user's own formulas are never rewritten in the file.
"""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from ...cells import CellError, Grid, Scalar
from .model import Model, Node
from .sheetxml import set_formulas, store


def literal(value: Scalar) -> str:
    """A value as the text of a formula; what is not stored is #N/A, and never 0."""
    if value is None:
        return "#N/A"
    if value is True or value is False:
        return "TRUE" if value else "FALSE"
    if isinstance(value, CellError):
        return str(value)
    if isinstance(value, str):
        return '"' + value.replace('"', '""') + '"'
    return repr(float(value)).upper()


def evaluation_copy(model: Model, instead: Mapping[int, Scalar]) -> bytes:
    """The package for the evaluator.

    ``instead`` gives formulas, by index, for which a plain value stands. An area too
    large to spill holds its latest result (``poured``) as plain values.
    """
    formulas: dict[int, dict[tuple[int, int], str]] = {}
    blocks: dict[int, list[tuple[int, int, Grid]]] = {}
    for node in model.nodes:
        place = node.cell.row, node.cell.col
        if node.index in instead:
            formulas.setdefault(node.sheet, {})[place] = literal(instead[node.index])
            continue
        if node.copy != node.cell.text:
            formulas.setdefault(node.sheet, {})[place] = node.copy
        under = _under(node)
        if under is not None:
            blocks.setdefault(node.sheet, []).append((*place, under))
    replaced: dict[str, bytes] = {}
    for number, sheet in enumerate(model.package.sheets):
        if number not in formulas and number not in blocks:
            continue
        xml = model.package.part(sheet.part)
        if number in blocks:
            xml = store(xml, {}, blocks[number])
        if number in formulas:
            xml = set_formulas(xml, formulas[number])
        replaced[sheet.part] = xml
    return model.package.to_bytes(replaced)


def _under(node: Node) -> Grid | None:
    """What the cells of an area hold in the copy: nothing, so that it can spill, or its last result."""
    area = node.area
    if area is None or area.kind == "plain":
        return None
    rows = cols = 1
    if area.ref is not None:
        r1, c1, r2, c2 = area.ref
        rows, cols = r2 - r1 + 1, c2 - c1 + 1
    poured = area.poured
    if poured is None:
        return np.full((rows, cols), None, dtype=object) if rows * cols > 1 else None
    if poured.shape[0] >= rows and poured.shape[1] >= cols:
        return poured
    under = np.full((max(rows, poured.shape[0]), max(cols, poured.shape[1])), None, dtype=object)
    under[: poured.shape[0], : poured.shape[1]] = poured
    return under
