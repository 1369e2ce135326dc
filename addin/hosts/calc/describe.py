"""The catalogue as the office's function wizard needs it."""

from __future__ import annotations

from typing import NamedTuple

from ...catalogue.registry import CATALOGUE, wording
from ...catalogue.types import Arg, Row
from .slots import zero_for_empty
from .typelib import Method

CATEGORY = "Add-In"
SINGLE = ("TB_WHY", "TB_VERSION")
"""Functions whose answer is one text. Given as a value and not as an array of one, the office
takes it into its pool of texts, so that comparisons and look-ups find it."""
INTERFACE = "org.thrustbook.calc.XFunctions"


class Place(NamedTuple):
    """One argument in the wizard."""

    name: str
    text: str


class Described(NamedTuple):
    """One function in the wizard."""

    name: str
    text: str
    places: tuple[Place, ...]
    repeats: bool

    @property
    def single(self) -> bool:
        """Whether the answer is one value, never an array."""
        return self.name in SINGLE

    @property
    def method(self) -> Method:
        """The method of the add-in's interface; its parameters sort in their order."""
        names = tuple(f"a{i:02d}" for i in range(len(self.places)))
        return Method(self.name, names, self.repeats, self.single)


def _places(row: Row) -> list[Place]:
    places = []
    if row.has_result:
        names = ", ".join(r.name for r in row.results)
        places.append(Place("result", f'Wanted result: {names}; "all", "labels" or "units": a row of them'))
    if row.has_units:
        text = 'Unit set: "SI" (also when empty), "metric", "US", or a range of two columns, role and unit'
        places.append(Place("units", text))
    empty_is_zero = zero_for_empty(row)
    return places + [_place(row, arg, arg.name in empty_is_zero) for arg in row.args]


def _place(row: Row, arg: Arg, empty_is_zero: bool) -> Place:
    text = wording(arg)
    text = text[:1].upper() + text[1:]
    if arg.choices:
        text += f" ({', '.join(arg.choices)})"
    if row.required(arg):
        return Place(arg.name, text)
    text += f"; may be left out: {arg.empty}" if arg.empty else "; may be left out"
    if empty_is_zero:
        text += ". An empty cell counts as 0 here: leave the argument out instead"
    return Place(arg.name, text)


def described(row: Row) -> Described:
    """Describe one function."""
    repeats = bool(row.args) and row.args[-1].repeats
    return Described(row.name, row.summary, tuple(_places(row)), repeats)


def functions() -> list[Described]:
    """Describe every function of the catalogue, in its order."""
    return [described(row) for row in CATALOGUE.values()]
