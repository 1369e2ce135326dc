"""Structure: circular references, and inputs that a reader of the sheets does not see."""

from __future__ import annotations

import re
from collections.abc import Iterator, Sequence, Set
from itertools import pairwise
from typing import NamedTuple

from ..hosts.headless.dependency import Reference
from ..xlsx.a1 import MAX_COLUMN, column_letters
from ..xlsx.sheetscan import attributes
from .book import Book, Place
from .gather import figures
from .types import Finding, Rule, Severity

_ROW = re.compile(rb"<(?:[\w.-]+:)?row\b([^>]*\bhidden\s*=\s*[\"'](?:1|true)[\"'][^>]*)>")
_COLUMNS = re.compile(rb"<(?:[\w.-]+:)?cols\b.*?</(?:[\w.-]+:)?cols>", re.DOTALL)
_COLUMN = re.compile(rb"<(?:[\w.-]+:)?col\b([^>]*)>")
_ITERATE = re.compile(rb"<(?:[\w.-]+:)?calcPr\b[^>]*\biterate\s*=\s*[\"'](?:1|true)[\"']")


def circular(book: Book) -> Iterator[Finding]:
    """S01: a formula that depends on its own result."""
    found, _ = book.circular
    iterating = _ITERATE.search(book.package.part(book.package.workbook_part)) is not None
    for circle in found:
        first = circle[0]
        way = [book.model.where(n) for n in [*circle, first]]
        shown = " -> ".join(way if len(way) <= 8 else [*way[:6], "...", way[-1]])
        yield Finding(
            "S01",
            Severity.WARNING if iterating else Severity.ERROR,
            book.sheet(first.sheet),
            first.a1,
            f"circular reference: {shown}",
            "The workbook allows iteration, so the result depends on where it stopped."
            if iterating
            else "No program can compute such a formula; what the cells show is left over or zero.",
            "\n".join(sorted(n.cell.text for n in circle)),
        )


def _unused_headings(book: Book) -> Iterator[Place]:
    """Headings of tables over columns without a value: to read them changes nothing."""
    for call in book.calls:
        pairs = pairwise(call.arguments)
        for (arg, given, _), (_, table, value) in pairs:
            if arg.role != "headings" or given.area is None or table.area is None:
                continue
            for j, column in enumerate(zip(*value, strict=True) if isinstance(value, list) else ()):
                if all(cell in (None, "") for cell in column):
                    for row in range(given.area.r1, given.area.r2 + 1):
                        yield given.area.sheet, row, given.area.c1 + j


class _Hidden(NamedTuple):
    area: Reference
    cell: str
    words: str


def hidden(book: Book) -> Iterator[Finding]:
    """S02: a hidden sheet, row or column holds something that a TB_ cell reads, directly or not."""
    _, areas = book.feeding
    unused = set(_unused_headings(book))
    by_sheet: dict[int, list[Reference]] = {}
    for area in areas:
        by_sheet.setdefault(area.sheet, []).append(area)
    for number, sheet in enumerate(book.package.sheets):
        read = by_sheet.get(number)
        if not read:
            continue
        idle = {(row, col) for of, row, col in unused if of == number}
        for place in _hidden_places(book, number, sheet.state):
            held = _held(book, place.area, read, idle)
            if held:
                what = ", ".join(name for name, _ in held[:3]) + (", ..." if len(held) > 3 else "")
                yield Finding(
                    "S02",
                    Severity.WARNING,
                    sheet.name,
                    place.cell,
                    f"{place.words} and feeds TB_ cells ({what})",
                    "A reader of the sheets, or of a print, does not see this input.",
                    "\n".join(f"{name} {figures(value)}" for name, value in held),
                )


def _hidden_places(book: Book, number: int, state: str) -> list[_Hidden]:
    if state != "visible":
        words = "the sheet is hidden" if state == "hidden" else "the sheet is hidden (veryHidden)"
        return [_Hidden(Reference(number, 1, 1, 1 << 30, MAX_COLUMN), "", words)]
    xml = book.package.part(book.package.sheets[number].part)
    rows = [int(a["r"]) for m in _ROW.finditer(xml) if "r" in (a := attributes(m[1]))]
    out = [
        _Hidden(
            Reference(number, first, 1, last, MAX_COLUMN),
            f"{first}:{last}",
            f"row {first} is hidden" if first == last else f"rows {first} to {last} are hidden",
        )
        for first, last in _ranges(rows)
    ]
    columns: list[int] = []
    block = _COLUMNS.search(xml)
    for match in _COLUMN.finditer(block[0]) if block else ():
        given = attributes(match[1])
        if given.get("hidden") in ("1", "true"):
            columns += range(int(given["min"]), int(given["max"]) + 1)
    for first, last in _ranges(columns):
        one, two = column_letters(first), column_letters(last)
        words = f"column {one} is hidden" if one == two else f"columns {one} to {two} are hidden"
        out.append(_Hidden(Reference(number, 1, first, 1 << 30, last), f"{one}:{two}", words))
    return out


def _ranges(numbers: Sequence[int]) -> list[tuple[int, int]]:
    out: list[tuple[int, int]] = []
    for n in sorted(set(numbers)):
        if out and n == out[-1][1] + 1:
            out[-1] = out[-1][0], n
        else:
            out.append((n, n))
    return out


def _held(
    book: Book, place: Reference, read: Sequence[Reference], idle: Set[tuple[int, int]]
) -> list[tuple[str, object]]:
    """The cells in a hidden place that hold something and are read."""
    cells = book.values[place.sheet]
    boxes = [
        (max(a.r1, place.r1), max(a.c1, place.c1), min(a.r2, place.r2), min(a.c2, place.c2)) for a in read
    ]
    found: set[tuple[int, int]] = set()
    for r1, c1, r2, c2 in boxes:
        if r1 > r2 or c1 > c2:
            continue
        if (r2 - r1 + 1) * (c2 - c1 + 1) <= len(cells):
            found.update((r, c) for r in range(r1, r2 + 1) for c in range(c1, c2 + 1) if (r, c) in cells)
        else:
            found.update(p for p in cells if r1 <= p[0] <= r2 and c1 <= p[1] <= c2)
    return [
        (f"{column_letters(c)}{r}", cells[r, c])
        for r, c in sorted(found - idle)
        if cells[r, c] not in (None, "")
    ]


RULES = (
    Rule("S01", "circular reference", circular),
    Rule("S02", "hidden input", hidden),
)
