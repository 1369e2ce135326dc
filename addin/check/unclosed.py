"""TB_ calls that fail because the flows of a control volume do not close."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

from thrustbook.engine.errors import NotClosed

from .. import tabular
from ..catalogue.types import Row
from ..cells import Cell, CellError
from .calls import Call

if TYPE_CHECKING:
    from .book import Book


def unclosed(book: Book) -> dict[int, tuple[Call, str]]:
    """Formula -> its call whose flows do not close, and what the engine says of it."""
    out: dict[int, tuple[Call, str]] = {}
    for call in book.calls:
        if call.row.kind == "table" and call.node.index not in out and _failed(book, call):
            said = _closing_fault(call.row, call.values)
            if said:
                out[call.node.index] = call, said
    return out


def _failed(book: Book, call: Call) -> bool:
    index = call.node.index
    grid = book.results.grids.get(index)
    first = book.results.values.get(index)
    if grid is not None:
        return any(isinstance(item, CellError) for item in grid.flat)
    return isinstance(first, CellError)


def _closing_fault(row: Row, values: Sequence[Cell]) -> str:
    try:
        tabular.evaluate(row, values)
    except Exception as error:
        link: BaseException | None = error
        while link is not None:
            if isinstance(link, NotClosed):
                return link.reason
            link = link.__cause__
    return ""
