"""Long-hand of table functions: their checking sheets are made in memory, evaluated, and thrown away."""

from __future__ import annotations

from collections.abc import Iterator
from typing import TYPE_CHECKING

from ..catalogue.registry import CATALOGUE
from ..catalogue.types import Row, TableLonghand
from ..cells import CellError
from ..longhand.book import Book as Workings
from ..longhand.make import evaluated, for_the_evaluator
from ..longhand.parts import Addition
from ..longhand.source import Source, TbCell
from ..xlsx.package import Package
from ..xlsx.refusals import Refusal
from .gather import Remark

if TYPE_CHECKING:
    from .book import Book

MOST_ROWS = 5_000
"""Rows of a table beyond which its working is left to ``thrustbook longhand``."""


def table_remarks(book: Book) -> Iterator[Remark]:
    """The cells of table functions that their working does not bear out."""
    wanted = _wanted(book)
    if not wanted:
        return
    package = _recomputed(book)
    source = Source(package)
    source.cells = [cell for cell in source.cells if (cell.sheet, cell.cell.row, cell.cell.col) in wanted]
    try:
        workings = Workings(source)
    except Refusal as refusal:
        book.remarks.append(f"table functions were not worked long-hand: {refusal}")
        return
    for cell, row in _differing(package, workings):
        yield Remark(
            sheet=cell.sheet,
            row=cell.cell.row,
            col=cell.cell.col,
            kind=cell.cell.text,
            what=f"{row}: the long-hand working gives another value than the function",
            why="Two independent ways must agree; thrustbook longhand shows the working row by row.",
            basis=cell.cell.text,
        )


def _wanted(book: Book) -> set[tuple[str, int, int]]:
    """The cells with a call that has a table working and is of a size to be worked here."""
    out = set()
    for call in book.calls:
        if not isinstance(call.row.longhand, TableLonghand):
            continue
        cell = call.node.cell
        largest = max((len(v) for v in call.values if isinstance(v, list)), default=0)
        if largest > MOST_ROWS:
            where = book.model.where(call.node)
            book.remarks.append(
                f"{where}: a table of {largest} rows was not worked long-hand here (at most {MOST_ROWS}); "
                "thrustbook longhand works it"
            )
        elif not _failed(book, call.node.index):
            out.add((book.sheet(call.node.sheet), cell.row, cell.col))
    return out


def _failed(book: Book, index: int) -> bool:
    """Whether a formula gives an error, which is another finding's business."""
    grid = book.results.grids.get(index)
    cells = [book.results.values.get(index)] if grid is None else grid.ravel().tolist()
    return any(isinstance(cell, CellError) for cell in cells)


def _recomputed(book: Book) -> Package:
    """The workbook with recomputed values, so that a stale value is not told twice. Never saved."""
    replaced, _ = book.results.stored()
    return Package(book.package.path, book.package.to_bytes(replaced)) if replaced else book.package


def _differing(package: Package, workings: Workings) -> Iterator[tuple[TbCell, str]]:
    values = evaluated(package, Addition(package, workings.sheets), for_the_evaluator(package))
    front = workings.summary.sheet.name
    for entry in workings.summary.verdicts(workings.entries, values[front]).get("differs", []):
        names = [call.name for call in entry.cell.calls if _row(call.name) is not None]
        yield entry.cell, ", ".join(dict.fromkeys(names))


def _row(name: str) -> Row | None:
    return CATALOGUE.get(name)
