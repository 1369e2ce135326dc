"""Which of the spreadsheet's own formulas the embedded evaluator cannot compute.

Such a formula keeps the value that is stored in the file. The evaluator does not say
which these are, so its errors are judged: an error that follows from another error, or
from changed inputs, is a result; an error out of sound inputs where the file holds a
value is not.
"""

from __future__ import annotations

from collections.abc import Collection, Mapping

from ...cells import CellError, Scalar
from .dependency import Reference
from .host import error_word
from .model import Model, Node
from .run import Run
from .tablerefs import sheet_range

_NEVER_A_RESULT = frozenset(("NImpl", "Error", "Cancelled"))
# Errors that sums and look-ups give by themselves when their inputs change.
_ORDINARY = frozenset(("Div", "Num", "Na", "Null"))


class Judge:
    """Judges the errors of one evaluation.

    ``kept`` are the formulas already known not to be computable, ``affected`` those that
    depend on a TB_ cell.
    """

    def __init__(self, model: Model, run: Run, kept: Mapping[int, str], affected: Collection[int]) -> None:
        self._model, self._run, self._affected = model, run, affected
        self._counted: dict[Reference, int] = {}
        self._valueless = [i for i in kept if model.nodes[i].cell.value is None]

    def not_computed(self, node: Node) -> str:
        """Why a formula counts as not computable, or "" when its value is a result."""
        word = error_word(self._run.raw(node))
        stored = node.cell.value
        if word is None or isinstance(stored, CellError):
            return ""
        if word in _NEVER_A_RESULT:
            return "the evaluator cannot compute this formula"
        if word == "Circ":
            return "" if node.index in self._affected else "it refers to itself (circular reference)"
        wrong = self._wrong_precedents(node)
        if wrong is None:
            return ""
        if wrong:
            return f"it depends on {wrong}, which could not be computed"
        if stored is None:
            return ""
        if node.index in self._affected and word in _ORDINARY and self._inputs_changed(node):
            return ""
        return f"the evaluator gives {self._run.value(node)} where the file holds {stored!s}"

    def _wrong_precedents(self, node: Node) -> str | None:
        """ "" for sound inputs, a cell when nothing but uncomputed cells is wrong, None for other errors."""
        first = ""
        for ref in node.references:
            errors = self._errors_in(node, ref)
            if not errors:
                continue
            uncomputed = [i for i in self._valueless if self._inside(self._model.nodes[i], ref)]
            if errors > len(uncomputed):
                return None
            first = first or self._model.where(self._model.nodes[uncomputed[0]])
        return first

    def _errors_in(self, node: Node, ref: Reference) -> int:
        count = self._counted.get(ref)
        if count is None:
            text = sheet_range(self._model.sheet_names[ref.sheet], ref[1:])
            value, _ = self._run.try_formula(node, f"SUMPRODUCT(--ISERROR({text}))")
            count = self._counted[ref] = int(value) if isinstance(value, float) else 0
        return count

    @staticmethod
    def _inside(node: Node, ref: Reference) -> bool:
        row, col = node.cell.row, node.cell.col
        return node.sheet == ref.sheet and ref.r1 <= row <= ref.r2 and ref.c1 <= col <= ref.c2

    def _inputs_changed(self, node: Node) -> bool:
        for ref in node.references:
            if (ref.r2 - ref.r1) * (ref.c2 - ref.c1) == 0 and ref.r2 - ref.r1 + ref.c2 - ref.c1 < 1000:
                places = [
                    (ref.sheet, row, col)
                    for row in range(ref.r1, ref.r2 + 1)
                    for col in range(ref.c1, ref.c2 + 1)
                ]
                sources = [self._model.at[place] for place in places if place in self._model.at]
            else:
                sources = [other for other in self._model.nodes if self._inside(other, ref)]
            if any(not same(self._run.value(other), other.cell.value) for other in sources):
                return True
        return False


def same(one: Scalar, other: Scalar) -> bool:
    """Whether two cell values are one and the same."""
    if isinstance(one, CellError) and isinstance(other, CellError):
        return one.kind == other.kind
    return type(one) is type(other) and one == other
