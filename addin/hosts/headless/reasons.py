"""Why a cell holds an error: which call failed, and what it said."""

from __future__ import annotations

from collections.abc import Mapping

from ...cells import CellError, Scalar
from .host import error_word
from .model import Node
from .settle import Settlement


def reason(settlement: Settlement, node: Node, values: Mapping[int, Scalar]) -> str:
    """The reason of an error in one cell, as a sentence part.

    ``values`` are the new values of the formulas by index.
    """
    model, run = settlement.model, settlement.run
    if error_word(run.raw(node)) == "Circ":
        return "it refers to itself (circular reference)"
    unknown = [name for name in node.calls if name not in model.functions.block]
    if unknown:
        return f"there is no function {unknown[0]}"
    if node.rewritten is not None:
        spans = node.rewritten.spans
        for name, first, last in spans:
            value, failed = run.try_formula(node, "".join(node.rewritten.pieces[first : last + 1]))
            if failed is None or (error_word(value) is None and len(spans) > 1 and type(value) is not list):
                continue
            message = failed[1].message
            if not message:  # an error that was passed on: its source says more
                break
            return message if len(spans) == 1 else f"{name}: {message}"
    source = _first_error(settlement, node, values)
    if source:
        return f"it follows from {source}"
    if node.calls:
        return "the TB_ functions gave values, but the formula around them fails"
    return "the formula fails"


def _first_error(settlement: Settlement, node: Node, values: Mapping[int, Scalar]) -> str:
    model = settlement.model
    for ref in node.references:
        if ref.r1 == ref.r2 and ref.c1 == ref.c2:
            single = model.at.get((ref.sheet, ref.r1, ref.c1))
            near: list[Node] = [] if single is None else [single]
        else:
            near = [
                other
                for other in model.nodes
                if other.sheet == ref.sheet
                and ref.r1 <= other.cell.row <= ref.r2
                and ref.c1 <= other.cell.col <= ref.c2
            ]
        for other in near:
            if other.index in settlement.kept and other.cell.value is None:
                return f"{model.where(other)}, which could not be computed"
            if isinstance(values.get(other.index), CellError):
                return model.where(other)
    return ""
