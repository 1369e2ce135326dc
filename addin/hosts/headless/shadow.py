"""The evaluation copy of a workbook: the same cells with formulas as the evaluator reads them.

It lives in memory only. The user's own formulas are never rewritten in the file.
"""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from ...cells import Grid, Scalar
from ...xlsx.sheetxml import set_formulas, store
from .formulas import literal
from .model import Model, Node


def evaluation_copy(model: Model, instead: Mapping[int, Scalar]) -> bytes:
    """The package for the evaluator.

    ``instead`` gives formulas, by index, for which a plain value stands.
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
        if node.area is not None and node.area.tiled is not None:
            formulas.setdefault(node.sheet, {}).update(node.area.tiles())
        cleared = _cleared(node)
        if cleared is not None:
            blocks.setdefault(node.sheet, []).append((*place, cleared))
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


def _cleared(node: Node) -> Grid | None:
    """Empty cells for the extent of an area, so that its result can spill there."""
    if node.area is None or node.cell.ref is None:
        return None
    r1, c1, r2, c2 = node.cell.ref
    shape = r2 - r1 + 1, c2 - c1 + 1
    return np.full(shape, None, dtype=object) if shape != (1, 1) else None
