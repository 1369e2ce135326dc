"""Whether two typed inputs with one label are meant to be one and the same quantity."""

from __future__ import annotations

import re
from collections import defaultdict
from collections.abc import Iterator
from dataclasses import dataclass
from typing import TYPE_CHECKING

from ..cells import Scalar
from ..units import ROLES

if TYPE_CHECKING:
    from .book import Book, Place

_WORD = re.compile(r"[^\W\d_]+")
_OF_THE_MAIN = frozenset(("flow", "massflow", "flowrate", "temperature", "viscosity", "kinematic", "density"))
"""What is the same all along a main; everything else may differ from fitting to fitting."""
_SAYS_NOTHING = frozenset(
    (
        "angle",
        "bore",
        "deflection",
        "diameter",
        "inlet",
        "inner",
        "inside",
        "internal",
        "nominal",
        "of",
        "outlet",
        "pipe",
        "pressure",
        "section",
        "the",
        "θ",
        "ø",
        "⌀",
        "δ",
        "α",
        "dn",
        "id",
    )
)
_STATE = re.compile(
    r"\b(?:alternative|case|day|duty|emergency|empty|existing|future|max(?:imum)?|min(?:imum)?|night|normal|"
    r"operating|operation|option|peak|scenario|shut(?:off)?|stage|start|summer|surge|test|variant|winter)\b"
)
"""Words of a sheet's name or a heading that tell one state of the works from another."""
_ABOVE = 60
"""Rows above a cell in which the heading of its block is looked for."""

LabelKey = tuple[str, str]
"""Role and label."""


@dataclass(frozen=True, slots=True)
class Input:
    """A number that was typed, and the call that reads it."""

    name: str
    role: str
    label: str
    value: float
    """SI."""
    shown: Scalar
    unit: str
    place: Place
    literal: bool
    call: int
    of_fitting: bool
    """Whether the call is one of a single fitting."""


class Sameness:
    """Tells which labelled inputs stand for one quantity.

    Two inputs are one quantity when nothing but this quantity sets the calculations
    apart that read them, when no heading names two states of the works, and when the
    label says more than which argument of a fitting it is: each fitting has its own
    diameter, angle and pressure.
    """

    def __init__(self, book: Book, labelled: dict[LabelKey, list[Input]]) -> None:
        self._book = book
        of_call: dict[int, dict[LabelKey, set[Place]]] = defaultdict(lambda: defaultdict(set))
        for key, group in labelled.items():
            for item in group:
                of_call[item.call][key].add(item.place)
        self._beside: dict[Place, dict[LabelKey, set[Place]]] = {}
        for group in labelled.values():
            for item in group:
                own = self._beside.setdefault(item.place, {})
                for key, places in of_call[item.call].items():
                    own.setdefault(key, set()).update(places)
        self._states: dict[Place, frozenset[str]] = {}

    def same(self, one: Input, other: Input) -> bool:
        """Whether two inputs of one label are meant to be one quantity."""
        if one.place == other.place or self._separate(one.place, other.place):
            return False
        of_the_main = one.role in _OF_THE_MAIN
        if one.of_fitting and other.of_fitting and not of_the_main and _says_nothing(one):
            return False
        return self._state(one.place) == self._state(other.place)

    def _separate(self, one: Place, other: Place) -> bool:
        """Whether the calls that read the two differ in another labelled input as well."""
        mine, others = self._beside[one], self._beside[other]
        apart = sum(mine[key].isdisjoint(others[key]) for key in mine.keys() & others.keys())
        return apart > 1

    def _state(self, place: Place) -> frozenset[str]:
        """The texts around a cell that name a state of the works, such as a load case."""
        if place not in self._states:
            texts = [self._book.sheet(place[0]), *self._headings(place)]
            named = (text for text in texts if _STATE.search(text.casefold()))
            self._states[place] = frozenset(" ".join(text.casefold().split()) for text in named)
        return self._states[place]

    def _headings(self, place: Place) -> Iterator[str]:
        """The title of the sheet, and the nearest line above the cell that holds nothing but text."""
        sheet, row, col = place
        for line in (1, *range(row - 1, max(row - _ABOVE, 1), -1)):
            cells = [self._book.value((sheet, line, c)) for c in range(1, col + 3)]
            texts = [cell for cell in cells if isinstance(cell, str) and cell.strip()]
            if texts and not any(isinstance(cell, float) for cell in cells):
                yield " ".join(texts)
                if line > 1:
                    return


def _says_nothing(item: Input) -> bool:
    """Whether a label is no more than the name of the argument, or of its kind of quantity."""
    own = {*_WORD.findall(item.name.casefold()), *_WORD.findall(ROLES[item.role].text), item.role}
    return set(_WORD.findall(item.label)) <= own | _SAYS_NOTHING
