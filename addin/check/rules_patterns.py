"""Patterns: formulas that were filled down or across, and the cell among them that is not like the others."""

from __future__ import annotations

import re
from collections import Counter
from collections.abc import Iterator

from ..figures import figure
from ..hosts.headless.dependency import Reference
from ..hosts.headless.model import Node
from .book import Book, Place
from .gather import Remark, figures, joined
from .types import Finding, Rule, Severity

_LONG = 3
"""Formulas in line, all alike, that the next cell is expected to continue."""
_FEW = 3
"""Cells of numbers at an end of a run that are still taken for typed over."""
_GAP = 50
"""Cells of numbers inside a run of formulas that are still taken for typed over."""
_BESIDE = 30
"""Cells before a formula in which a text that tells its kind is looked for."""
_NUMBER = re.compile(r"\s*[-+]?\d+(?:[.,]\d+)?\s*")
"""A number that was typed, or pasted, as text."""
_CONSTANT = re.compile(r"(?<![\w.$:])\d+(?:\.\d+)?(?:e[-+]?\d+)?(?![\w:(])")
_CELL = re.compile(r"(?:'[^']*'!|[\w.]+!)?\$?[a-z]{1,3}\$?\d+(?![\w(])")
_DOWN, _ACROSS = (1, 0), (0, 1)


def overtyped(book: Book) -> Iterator[Finding]:
    """P01: a number stands where the formulas around it say that a formula belongs."""
    found: dict[Place, Node] = {}
    for step in (_DOWN, _ACROSS):
        runs = list(_runs(book, step))
        in_line: Counter[tuple[int, int, str]] = Counter()
        for run in runs:
            if len(run) > 1:
                in_line[_line(book, run[0], step)] += len(run)
        for run in runs:
            if run[0].index in book.affected and not (run[0].area and run[0].cell.kind == "plain"):
                long = in_line[_line(book, run[0], step)] >= _LONG
                for place in _numbers_after(book, run, step, long):
                    found.setdefault(place, run[-1])
    for place, like in _subtotals(book):
        found.setdefault(place, like)
    remarks = []
    for (sheet, row, col), like in found.items():
        value = book.value((sheet, row, col))
        read = [book.value(moved) for _, moved in _inputs(book, like, (sheet, row, col))]
        remarks.append(
            Remark(
                book.sheet(sheet),
                row,
                col,
                book.signatures[like.index],
                f"the number {figure(value, 9)} stands in place of the formula",
                f"{like.a1} and the cells in line with it hold a formula, ={like.cell.text}.",
                figures([value, book.signatures[like.index], *read]),
            )
        )
    yield from joined("P01", Severity.ERROR, remarks)


def _runs(book: Book, step: tuple[int, int]) -> Iterator[list[Node]]:
    """Neighbouring formulas of one relative form, down or across; single ones too."""
    down, across = step
    order = (
        (lambda n: (n.sheet, n.cell.col, n.cell.row))
        if down
        else (lambda n: (n.sheet, n.cell.row, n.cell.col))
    )
    run: list[Node] = []
    for node in sorted((n for n in book.model.nodes if _in_line(n, step)), key=order):
        if run:
            last = run[-1]
            next_to = (node.sheet, node.cell.row, node.cell.col) == (
                last.sheet,
                last.cell.row + down,
                last.cell.col + across,
            )
            if next_to and book.signatures[node.index] == book.signatures[last.index]:
                run.append(node)
                continue
            yield run
        run = [node]
    if run:
        yield run


def _in_line(node: Node, step: tuple[int, int]) -> bool:
    """Whether a formula fills one cell, or one line across the way that formulas are filled."""
    r1, c1, r2, c2 = node.extent()
    thin = r1 == r2 if step[0] else c1 == c2
    return node.cell.kind == "plain" or (node.cell.kind in ("array", "dynamic") and thin)


def _line(book: Book, node: Node, step: tuple[int, int]) -> tuple[int, int, str]:
    """The column (or row) of a formula and its form: what a long run has in common."""
    return node.sheet, node.cell.col if step == _DOWN else node.cell.row, book.signatures[node.index]


def _numbers_after(book: Book, run: list[Node], step: tuple[int, int], long: bool) -> Iterator[Place]:
    """Numbers that interrupt a run, or that stand at either end of a long one with inputs of their own."""
    last, first = run[-1], run[0]
    gap: list[Place] = []
    place = _moved(_place(last), step)
    while place is not None and len(gap) <= _GAP and _typed_number(book, place):
        gap.append(place)
        place = _moved(place, step)
    if not gap:
        after: list[Place] = []
    else:
        beyond = book.model.at.get(place) if place is not None else None
        if beyond is not None and book.signatures.get(beyond.index) == book.signatures[last.index]:
            # Input and formula in turn, one below the other, are no run with a hole in it.
            if len(run) > 1 or not any(_reads(beyond, p) for p in gap):
                yield from (p for p in gap if not _lacks_inputs(book, last, p))
            return
        after = gap
    before: list[Place] = []
    back = (-step[0], -step[1])
    place = _moved(_place(first), back)
    while place is not None and len(before) <= _GAP and _typed_number(book, place):
        before.append(place)
        place = _moved(place, back)
    # More numbers than that are a list of their own.
    after, before = ([] if len(part) > max(min(len(run) // 2, _FEW), 1) else part for part in (after, before))
    for near, places in ((last, after), (first, before)):
        for place in places:
            # A number that the next formula starts from is the beginning of a chain.
            goes_on = (long or _goes_on_beside(book, near, place, step)) and _has_inputs(book, near, place)
            if (goes_on and not _reads(near, place)) or _sums_beside(book, near, place):
                yield place


def _goes_on_beside(book: Book, near: Node, place: Place, step: tuple[int, int]) -> bool:
    """Whether the line beside this one has a filled formula next to both, the last formula and the place."""
    for side in (-1, 1):
        across = (step[1] * side, step[0] * side)
        one, two = _moved(_place(near), across), _moved(place, across)
        nodes = [book.model.at.get(p) if p is not None else None for p in (one, two)]
        forms = {book.signatures.get(n.index) if n is not None else None for n in nodes}
        if None not in forms and len(forms) == 1 and nodes[0] is not None and nodes[0].index in book.affected:
            return True
    return False


def _subtotals(book: Book) -> Iterator[tuple[Place, Node]]:
    """Numbers below results that a total adds to sums of such results, each with one of those sums."""
    for node in book.model.nodes:
        singles = [ref for ref in node.references if (ref.r1, ref.c1) == (ref.r2, ref.c2)]
        if node.index not in book.affected or node.calls or len(singles) < 3:
            continue
        places = [(ref.sheet, ref.r1, ref.c1) for ref in singles if ref.c1 == node.cell.col]
        sums = [other for p in places if (other := book.model.at.get(p)) and _sums(other, _above(p))]
        for place in places if len(sums) > 1 else ():
            above = book.model.at.get(_above(place))
            if above is not None and above.calls and _typed_number(book, place):
                yield place, sums[0]


def _above(place: Place) -> Place:
    return place[0], place[1] - 1, place[2]


def _reads(node: Node, place: Place) -> bool:
    return any(_holds(ref, place) for ref in node.references)


def _sums(node: Node, place: Place) -> bool:
    """Whether a formula reads a range with a cell in it: a sum, or the like, of the cells in line with it."""
    ranges = [ref for ref in node.references if (ref.r1, ref.c1) != (ref.r2, ref.c2)]
    return any(_holds(ref, place) for ref in ranges)


def _holds(ref: Reference, place: Place) -> bool:
    return ref.sheet == place[0] and ref.r1 <= place[1] <= ref.r2 and ref.c1 <= place[2] <= ref.c2


def _place(node: Node) -> Place:
    return node.sheet, node.cell.row, node.cell.col


def _moved(place: Place, step: tuple[int, int]) -> Place | None:
    row, col = place[1] + step[0], place[2] + step[1]
    return (place[0], row, col) if row >= 1 and col >= 1 else None


def _typed_number(book: Book, place: Place | None) -> bool:
    if place is None or place in book.model.at:
        return False
    value = book.stored[place[0]].get(place[1:])
    number = isinstance(value, float) or (isinstance(value, str) and _NUMBER.fullmatch(value) is not None)
    return number and not book.in_area(place)


def _inputs(book: Book, like: Node, place: Place) -> Iterator[tuple[Place, Place]]:
    """Each cell that a formula reads, and the cell that it would read if it were filled into a place."""
    row, col = place[1] - like.cell.row, place[2] - like.cell.col
    for ref, moves_down, moves_across in book.relative_references(like):
        if (row and moves_down) or (col and moves_across):
            own = ref.sheet, ref.r1, ref.c1
            yield own, (ref.sheet, ref.r1 + row * moves_down, ref.c1 + col * moves_across)


def _has_inputs(book: Book, like: Node, place: Place) -> bool:
    """Whether the formula, filled into a place, would find its inputs there."""
    moved = list(_inputs(book, like, place))
    return bool(moved) and all(p != place and _alike(book, own, p) for own, p in moved)


def _alike(book: Book, own: Place, moved: Place) -> bool:
    value = book.value(moved)
    return value not in (None, "") and (isinstance(value, float) or not isinstance(book.value(own), float))


def _lacks_inputs(book: Book, like: Node, place: Place) -> bool:
    """Whether something that the formula reads is left empty beside a place: a row of another kind."""
    moved = _inputs(book, like, place)
    return any(book.value(p) in (None, "") and book.value(own) not in (None, "") for own, p in moved)


def _sums_beside(book: Book, like: Node, place: Place) -> bool:
    """Whether a formula sums its own line, and beside it the line of a place holds results, too."""
    row, col = place[1] - like.cell.row, place[2] - like.cell.col
    for ref in like.references:
        upright = bool(col) and ref.c1 == ref.c2 == like.cell.col and ref.r1 < ref.r2
        level = bool(row) and ref.r1 == ref.r2 == like.cell.row and ref.c1 < ref.c2
        if ref.sheet == like.sheet and (upright or level):
            moved = Reference(ref.sheet, ref.r1 + row, ref.c1 + col, ref.r2 + row, ref.c2 + col)
            results = [node for node in book.formulas_in(moved) if node.index in book.affected]
            if len(results) > 1 or any(node.area for node in results):
                return True
    return False


def odd_formula(book: Book) -> Iterator[Finding]:
    """P02: a formula, or two filled alike, that differ from neighbours which are all alike."""
    remarks: dict[Severity, list[Remark]] = {Severity.WARNING: [], Severity.NOTE: []}
    for node in book.model.nodes:
        if node.index not in book.related:
            continue
        found = [odd for step in (_DOWN, _ACROSS) if (odd := _neighbours(book, node, step)) is not None]
        if not found or _agrees_with_any(book, node, {twin.index for _, twin in found if twin}):
            continue
        like = found[0][0]
        if not node.calls and _sums(node, _place(like)):
            continue
        other_function = node.calls and sorted(like.calls) != sorted(node.calls)
        if other_function and _another_kind(book, node):
            continue
        remarks[Severity.NOTE if other_function else Severity.WARNING].append(
            Remark(
                sheet=book.sheet(node.sheet),
                row=node.cell.row,
                col=node.cell.col,
                kind=book.signatures[node.index],
                what=f"={node.cell.text} differs from its neighbours",
                why=f"{like.a1} and the cells in line with it hold ={like.cell.text}, which reads other "
                "cells or other constants from there.",
                basis=book.signatures[node.index],
            )
        )
    for severity, some in remarks.items():
        yield from joined("P02", severity, some)


def _neighbours(book: Book, node: Node, step: tuple[int, int]) -> tuple[Node, Node | None] | None:
    """A neighbour that stands for a run which the formula interrupts or ends; None without such a run.

    With it a second formula that was filled from this one, where the two interrupt the run together.
    """
    if not _in_line(node, step):
        return None
    own = book.signatures[node.index]
    back = (-step[0], -step[1])
    for way, other_way in ((back, step), (step, back)):
        near, far = _next(book, node, way), _next(book, node, other_way)
        if near is None or book.signatures[near.index] == own:
            continue
        form = book.signatures[near.index]
        if far is not None and book.signatures[far.index] == form:
            return near, None
        if not _one_kind(book, node, near) or _reads(near, _place(node)):
            continue
        if far is not None and book.signatures[far.index] == own:
            beyond = _next(book, far, other_way)
            if beyond is not None and book.signatures[beyond.index] == form:
                return near, far
        elif (node.calls or not _reads_line(node, step)) and _run_of(book, near, way):
            return near, None
    return None


def _run_of(book: Book, node: Node, way: tuple[int, int]) -> bool:
    """Whether a long run of formulas of one form begins with a formula."""
    at: Node | None = node
    for _ in range(_LONG - 1):
        at = _next(book, at, way) if at is not None else None
        if at is None or book.signatures[at.index] != book.signatures[node.index]:
            return False
    return True


def _reads_line(node: Node, step: tuple[int, int]) -> bool:
    """Whether a formula reads the line it stands in, as totals do."""
    row, col = node.cell.row, node.cell.col
    here = [ref for ref in node.references if ref.sheet == node.sheet]
    if step == _DOWN:
        return any(ref.c1 <= col <= ref.c2 for ref in here)
    return any(ref.r1 <= row <= ref.r2 for ref in here)


def _one_kind(book: Book, node: Node, near: Node) -> bool:
    """Whether two formulas call the same functions, or are the same but for cells and constants."""
    if node.calls or near.calls:
        return sorted(near.calls) == sorted(node.calls)
    one, other = (_CONSTANT.sub("0", _CELL.sub("a", book.signatures[n.index])) for n in (node, near))
    return one == other != "a"  # links from elsewhere are of no kind


def _another_kind(book: Book, node: Node) -> bool:
    """Whether a text of the row (or column) tells that it is of another kind than both its neighbours.

    Such as a column "bend", "closed", "bend" beside the formulas.
    """
    sheet, row, col = _place(node)
    beside = [((row, c), (row - 1, c), (row + 1, c)) for c in range(max(col - _BESIDE, 1), col)]
    beside += [((r, col), (r, col - 1), (r, col + 1)) for r in range(max(row - _BESIDE, 1), row)]
    for places in beside:
        own, one, other = (book.value((sheet, *place)) for place in places)
        if isinstance(own, str) and isinstance(one, str) and own != one == other and one.strip():
            return True
    return False


def _next(book: Book, node: Node, step: tuple[int, int]) -> Node | None:
    place = _moved(_place(node), step)
    found = book.model.at.get(place) if place is not None else None
    return found if found is not None and _in_line(found, step) else None


def _agrees_with_any(book: Book, node: Node, but: set[int]) -> bool:
    own = book.signatures[node.index]
    for step in ((1, 0), (-1, 0), (0, 1), (0, -1)):
        other = _next(book, node, step)
        if other is not None and other.index not in but and book.signatures[other.index] == own:
            return True
    return False


RULES = (
    Rule("P01", "number typed over a formula", overtyped),
    Rule("P02", "formula differs from its neighbours", odd_formula),
)
