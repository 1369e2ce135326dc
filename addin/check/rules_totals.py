"""Totals: a sum, or the like, that stops short of the results it belongs to."""

from __future__ import annotations

from collections.abc import Iterator

from ..hosts.headless.dependency import Reference
from ..hosts.headless.model import Node
from ..xlsx.a1 import to_a1
from .book import Book, Place
from .gather import Remark, joined
from .types import Finding, Rule, Severity


def short_total(book: Book) -> Iterator[Finding]:
    """P03: a range ends beside a result that was filled from the same formula, above or below a total.

    Where another formula reads a range that begins with the cell left out, the results are
    summed in groups, and nothing is missing.
    """
    totals = [n for n in book.model.nodes if not n.calls and n.index in book.affected]
    ranges = {ref for n in totals for ref in n.references if (ref.r1, ref.c1) != (ref.r2, ref.c2)}
    remarks = []
    for node in totals:
        for ref in _lines(node) if node.cell.kind == "plain" else ():
            left_out = _left_out(book, ref, book.signatures[node.index])
            if left_out is None or any(_covers(other, ref, left_out) for other in ranges):
                continue
            cell, shown = to_a1(*left_out[1:]), f"{to_a1(ref.r1, ref.c1)}:{to_a1(ref.r2, ref.c2)}"
            form = book.signatures[node.index]
            remarks.append(
                Remark(
                    sheet=book.sheet(node.sheet),
                    row=node.cell.row,
                    col=node.cell.col,
                    kind=form,
                    what=f"={node.cell.text} leaves out {cell}",
                    why=f"{cell} holds the formula of {shown}, stands next to it, and is in no other total.",
                    basis=f"{form} {cell}",
                )
            )
    yield from joined("P03", Severity.WARNING, remarks)


def _lines(node: Node) -> Iterator[Reference]:
    """The ranges of several cells in one column above or below a formula, or in one row beside it."""
    row, col = node.cell.row, node.cell.col
    for ref in node.references:
        upright = ref.c1 == ref.c2 == col and ref.r1 < ref.r2 and not ref.r1 <= row <= ref.r2
        level = ref.r1 == ref.r2 == row and ref.c1 < ref.c2 and not ref.c1 <= col <= ref.c2
        if ref.sheet == node.sheet and (upright or level):
            yield ref


def _left_out(book: Book, ref: Reference, own: str) -> Place | None:
    """A cell at either end of a range that holds the same formula as the range, but not that of the total."""
    down, across = (1, 0) if ref.c1 == ref.c2 else (0, 1)
    for row, col, way in ((ref.r1, ref.c1, -1), (ref.r2, ref.c2, 1)):
        inside = book.model.at.get((ref.sheet, row, col))
        second = book.model.at.get((ref.sheet, row - way * down, col - way * across))
        outside = book.model.at.get((ref.sheet, row + way * down, col + way * across))
        forms = {book.signatures.get(n.index) if n is not None else None for n in (inside, second, outside)}
        if outside is not None and len(forms) == 1 and own not in forms and outside.index in book.affected:
            return ref.sheet, outside.cell.row, outside.cell.col
    return None


def _covers(other: Reference, ref: Reference, place: Place) -> bool:
    """Whether another range takes up a cell that this one leaves out, and nothing of what this one has."""
    apart = other.r1 > ref.r2 or other.r2 < ref.r1 or other.c1 > ref.c2 or other.c2 < ref.c1
    holds = other.r1 <= place[1] <= other.r2 and other.c1 <= place[2] <= other.c2
    return apart and holds and other.sheet == ref.sheet


RULES = (Rule("P03", "total that stops short", short_total),)
