"""Formulas that refer to themselves."""

from __future__ import annotations

from typing import TYPE_CHECKING

from ..hosts.headless.host import error_word
from ..hosts.headless.model import Node

if TYPE_CHECKING:
    from .book import Book

WORDS = "circular reference"


def circles(book: Book) -> tuple[list[list[Node]], set[int]]:
    """Each circle in the order in which it is walked, and the formulas that it spoils."""
    suspects = {node.index for node in book.model.nodes if _suspect(book, node)}
    if not suspects:
        return [], set()
    # Not every formula of a circle need be an error: some stop at a value that they had.
    reads = _reads(book)
    closed = [component for component in _closed(reads) if not suspects.isdisjoint(component)]
    found = [[book.model.nodes[i] for i in _walk(component, reads)] for component in closed]
    own = {node.index for circle in found for node in circle}
    return found, book.model.graph().dependents(own) if own else set()


def in_circles(book: Book) -> list[Node]:
    """The formulas that refer to themselves, by their references alone: no result is needed."""
    closed = _closed(_reads(book))
    return [book.model.nodes[i] for component in closed for i in component]


def _reads(book: Book) -> dict[int, list[int]]:
    """Formula -> the formulas that it reads."""
    return {
        node.index: sorted({other.index for ref in node.references for other in book.formulas_in(ref)})
        for node in book.model.nodes
    }


def _closed(reads: dict[int, list[int]]) -> list[list[int]]:
    """The components that are circles."""
    return [part for part in _components(reads) if len(part) > 1 or part[0] in reads[part[0]]]


def _suspect(book: Book, node: Node) -> bool:
    settlement = book.settlement
    if WORDS in settlement.kept.get(node.index, ""):
        return True
    failed = settlement.failed.get(node.index)
    if failed is not None:
        return WORDS in failed.message
    return error_word(settlement.run.raw(node)) == "Circ"


def _components(reads: dict[int, list[int]]) -> list[list[int]]:
    """Strongly connected components (Tarjan's algorithm, without recursion)."""
    order: dict[int, int] = {}
    low: dict[int, int] = {}
    stack: list[int] = []
    on_stack: set[int] = set()
    out: list[list[int]] = []
    for root in reads:
        if root in order:
            continue
        work = [(root, iter(reads[root]))]
        order[root] = low[root] = len(order)
        stack.append(root)
        on_stack.add(root)
        while work:
            at, following = work[-1]
            for other in following:
                if other not in order:
                    order[other] = low[other] = len(order)
                    stack.append(other)
                    on_stack.add(other)
                    work.append((other, iter(reads[other])))
                    break
                if other in on_stack:
                    low[at] = min(low[at], order[other])
            else:
                work.pop()
                if work:
                    low[work[-1][0]] = min(low[work[-1][0]], low[at])
                if low[at] == order[at]:
                    cut = stack.index(at)
                    out.append(stack[cut:])
                    on_stack.difference_update(stack[cut:])
                    del stack[cut:]
    return out


def _walk(component: list[int], reads: dict[int, list[int]]) -> list[int]:
    """The shortest way from the first formula of a component back to itself."""
    start, inside = min(component), set(component)
    came_from: dict[int, int] = {}
    layer = [start]
    while layer:
        following = []
        for at in layer:
            for other in reads[at]:
                if other == start:
                    way = [at]
                    while way[-1] != start:
                        way.append(came_from[way[-1]])
                    return way[::-1]
                if other in inside and other not in came_from:
                    came_from[other] = at
                    following.append(other)
        layer = following
    return [start]
