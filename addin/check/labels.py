"""What stands around a cell: its label, its heading, the unit written beside it."""

from __future__ import annotations

import re
from bisect import bisect_left
from functools import lru_cache
from typing import TYPE_CHECKING, NamedTuple

from ..units import Unit, UnitError, unit

if TYPE_CHECKING:
    from .book import Book, Place

_BRACKETS = re.compile(r"\[([^\[\]]*)\]\s*$")
_ROUND = re.compile(r"\(([^()]*(?:\([^()]*\))?[^()]*)\)\s*$")
_COMMA = re.compile(r",\s*([^,]+)$|\bin\s+(\S+)$")
_SYMBOL = 3
"""Letters of a text that may be a symbol, such as Q or D2."""
_REACH = 3
"""Columns to the left in which a label is looked for."""


class Written(NamedTuple):
    """A unit written beside or above a cell, where it stands, and what it is for the role."""

    place: Place
    text: str
    unit: Unit | None
    """None where the unit does not measure the role at all."""


class Surroundings:
    """Texts around cells, looked up quickly."""

    def __init__(self, book: Book) -> None:
        self._book = book
        self._texts: dict[tuple[int, int], list[int]] = {}
        for sheet, cells in enumerate(book.values):
            for (row, col), value in cells.items():
                if isinstance(value, str) and value.strip():
                    self._texts.setdefault((sheet, col), []).append(row)
        for rows in self._texts.values():
            rows.sort()
        self._used = [
            sorted({r for (r, _), v in cells.items() if v not in (None, "")}) for cells in book.values
        ]

    def above(self, place: Place) -> Place | None:
        """The nearest text above a cell, where no empty row of the sheet lies between."""
        sheet, row, col = place
        rows, used = self._texts.get((sheet, col), []), self._used[sheet]
        at = bisect_left(rows, row)
        if not at:
            return None
        found = rows[at - 1]
        together = bisect_left(used, row) - bisect_left(used, found) == row - found
        return (sheet, found, col) if together else None

    def left(self, place: Place) -> Place | None:
        """The text to the left of a cell, where nothing but empty cells lies between."""
        sheet, row, col = place
        for step in range(1, min(_REACH, col - 1) + 1):
            value = self._book.value((sheet, row, col - step))
            if isinstance(value, str) and value.strip():
                return sheet, row, col - step
            if value not in (None, ""):
                return None
        return None

    def text(self, place: Place | None) -> str:
        """The text of a cell, "" where there is none."""
        value = self._book.value(place) if place is not None else None
        return value.strip() if isinstance(value, str) else ""

    def label(self, place: Place) -> str:
        """The label to the left of a cell, without its unit, in small letters.

        Of several texts side by side it is the nearest that is neither a unit nor a mere symbol.
        """
        texts: list[str] = []
        at = self.left(place)
        while at is not None and len(texts) < _REACH and self.text(at):
            texts.append(_without_unit(self.text(at)))
            at = (at[0], at[1], at[2] - 1)
        named = [text for text in texts if not _known(text)] or texts
        text = next((text for text in named if len(text) > _SYMBOL), next(iter(named), ""))
        return re.sub(r"\s+", " ", text).strip(" :=").casefold()

    def written_unit(self, place: Place, role: str) -> Written | None:
        """The unit written for a cell: to its right, in the label to its left, or in the heading above."""
        sheet, row, col = place
        right = (sheet, row, col + 1)
        bare = _bare(self.text(right), role)
        if bare is not None:
            return Written(right, self.text(right), bare)
        for near in (self.left(place), self.above(place)):
            found = unit_in(self.text(near), role)
            if near is not None and found is not None:
                return Written(near, *found)
        return None


def _without_unit(text: str) -> str:
    text = _BRACKETS.sub("", text).strip()
    inside = _ROUND.search(text)
    return text[: inside.start()].strip() if inside and _known(inside[1]) else text


@lru_cache(maxsize=4096)
def _bare(text: str, role: str) -> Unit | None:
    """A text that is nothing but a unit of the role."""
    if not text or text[0].isdigit() or text == "-":
        return None
    inside = text[1:-1] if text[0] + text[-1] in ("[]", "()") else text
    try:
        return unit(inside, role)
    except UnitError:
        return None


@lru_cache(maxsize=4096)
def _known(text: str) -> bool:
    """Whether a text is a unit of any kind."""
    from ..units import convert

    try:
        convert(1.0, text, text)
    except UnitError:
        return False
    return True


def unit_in(text: str, role: str) -> tuple[str, Unit | None] | None:
    """The unit that a heading names, None without one.

    In square brackets any unit counts, one that does not measure the role too; elsewhere
    only a unit of the role, since "Q (max)" or a bare "L" need not be a unit.
    """
    bracket = _BRACKETS.search(text)
    if bracket:
        inside = bracket[1].strip()
        if not inside or inside[0].isdigit() or inside == "-":
            return None
        found = _bare(inside, role)
        return (inside, found) if found is not None or _known(inside) else None
    for pattern in (_ROUND, _COMMA):
        match = pattern.search(text)
        inside = next((g for g in match.groups() if g), "").strip() if match else ""
        found = _bare(inside, role)
        if found is not None:
            return inside, found
    found = _bare(text, role)
    return (text, found) if found is not None else None
