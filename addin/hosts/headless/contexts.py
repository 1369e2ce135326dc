"""Ranges and arrays where single values are meant, rewritten so that the evaluator gets them right.

The evaluator's own functions take the first value of a range there, or fail. A spreadsheet
takes the cell in the formula's own row or column in a plain formula, and goes through all
values in an array formula and inside functions such as SUMPRODUCT.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from enum import Enum, auto
from typing import Final

from ...xlsx.a1 import range_from_a1
from .each import EACH
from .formulas import CLOSES, OMITTED, OPENS, Kind, Part, Unreadable, call_name, function_name, join
from .singlevalues import (
    ALL_ALONG,
    BY_ITSELF,
    CHOOSES,
    DISPUTED,
    NEVER_EACH,
    REDUCES,
    REDUCES_ARRAYS,
    REFERS,
    arrays,
    one_by_one,
    single_values,
)

_RANGE = re.compile(
    r"(?:.*!)?(?:\$?[A-Za-z]{1,3}\$?[0-9]+:\$?[A-Za-z]{1,3}\$?[0-9]+|(?P<lines>\$?[A-Za-z]{1,3}:\$?[A-Za-z]{1,3}"
    r"|\$?[0-9]+:\$?[0-9]+))",
    re.DOTALL,
)
_CELL = re.compile(r"(?:.*!)?\$?[A-Za-z]{1,3}\$?[0-9]+", re.DOTALL)
_PLACES: Final = frozenset(("ROW", "COLUMN"))
_MOST_ROWS: Final = 100_000
_JOINS: Final = frozenset((":", "#"))  # operators between references
_AT: Final = Part("@", Kind.OPERATOR)


class Stands(Enum):
    """What a part of a formula may be.

    In an ARRAY every value is worked. Elsewhere ranges are handed over WHOLE, and mean one of
    their cells as an OPERAND of an operator or as a SINGLE argument; the two differ only for
    the functions ROW and COLUMN.
    """

    ARRAY = auto()
    WHOLE = auto()
    OPERAND = auto()
    SINGLE = auto()


class Operand(Enum):
    """What a reference or a name stands for."""

    CELL = auto()
    RANGE = auto()
    LINES = auto()  # whole rows or columns
    UNKNOWN = auto()


@dataclass(slots=True)
class _Bracket:
    opening: Part
    arguments: list[list[_Item]]
    separators: list[Part]
    closing: Part


_Item = Part | _Bracket
_Shown = tuple[list[Part], bool]  # the parts for the evaluator; whether they may give several values


def operand(text: str) -> Operand:
    """What a reference stands for; a name is unknown here."""
    match = _RANGE.fullmatch(text)
    if match is not None:
        return Operand.LINES if match["lines"] else Operand.RANGE
    return Operand.CELL if _CELL.fullmatch(text) else Operand.UNKNOWN


def in_context(
    parts: Sequence[Part], array: bool, named: Callable[[str], Operand], own: str = ""
) -> list[Part]:
    """A formula with every function of single values given what a spreadsheet gives it.

    ``array`` says whether it is an array formula, ``own`` the cells that such a one fills when
    they are several. ``named`` tells what a name stands for. Raises :class:`Unreadable` for what
    the evaluator cannot do.
    """
    if not own and not _worth_a_look(parts):
        return list(parts)
    (arguments, _), end = _read(parts, 0)
    if end < len(parts):
        raise Unreadable("the formula closes a bracket that it does not open")
    if len(arguments) > 1:
        return list(parts)
    return _Formula(named, own).expression(arguments[0], Stands.ARRAY if array else Stands.WHOLE)[0]


def meant_as_one_cell(parts: Sequence[Part], named: Callable[[str], Operand]) -> list[Part]:
    """The ranges of a plain formula that mean the cell in the formula's own row or column.

    The parts themselves come back, to be told by their identity.
    """
    if not _worth_a_look(parts):
        return []
    formula = _Formula(named, "")
    try:
        (arguments, _), end = _read(parts, 0)
        if end == len(parts) and len(arguments) == 1:
            formula.expression(arguments[0], Stands.WHOLE)
    except Unreadable:
        return []
    return formula.met


def _worth_a_look(parts: Sequence[Part]) -> bool:
    """Whether anything in a formula may give several values."""
    for part in parts:
        if part.kind is Kind.REFERENCE:
            if not _CELL.fullmatch(part.text):
                return True
        elif part.kind is Kind.ARRAY_OPEN or (part.kind is Kind.OPEN and function_name(part.text) in REFERS):
            return True
    return False


def _read(parts: Sequence[Part], at: int) -> tuple[tuple[list[list[_Item]], list[Part]], int]:
    """The arguments from a place up to their closing bracket, and where that stands."""
    arguments: list[list[_Item]] = [[]]
    separators: list[Part] = []
    while at < len(parts):
        part = parts[at]
        if part.kind in CLOSES:
            break
        if part.kind in OPENS:
            (inner, between), end = _read(parts, at + 1)
            if end >= len(parts):
                raise Unreadable("the brackets of the formula do not close")
            arguments[-1].append(_Bracket(part, inner, between, parts[end]))
            at = end
        elif part.kind is Kind.COMMA:
            arguments.append([])
            separators.append(part)
        else:
            arguments[-1].append(part)
        at += 1
    return (arguments, separators), at


def _flat(items: Sequence[_Item]) -> list[Part]:
    out: list[Part] = []
    for item in items:
        if isinstance(item, Part):
            out.append(item)
            continue
        out += _joined(item, [_flat(argument) for argument in item.arguments])
    return out


def _joined(bracket: _Bracket, arguments: Sequence[Sequence[Part]]) -> list[Part]:
    """A bracket with other arguments."""
    out = [bracket.opening]
    for number, argument in enumerate(arguments):
        if number:
            out.append(bracket.separators[number - 1])
        out += argument
    return [*out, bracket.closing]


def _solid(items: Sequence[_Item]) -> list[_Item]:
    return [item for item in items if not (isinstance(item, Part) and item.kind is Kind.SPACE)]


def _is_operator(item: _Item) -> bool:
    return isinstance(item, Part) and item.kind is Kind.OPERATOR and item.text not in _JOINS


def _is_reference(items: Sequence[_Item]) -> bool:
    solid = _solid(items)
    return len(solid) == 1 and isinstance(solid[0], Part) and solid[0].kind is Kind.REFERENCE


class _Formula:
    def __init__(self, named: Callable[[str], Operand], own: str) -> None:
        self._named, self._own = named, own
        self.met: list[Part] = []
        """Ranges of which one cell is meant."""

    def expression(self, items: Sequence[_Item], stands: Stands) -> _Shown:
        """Operands with operators between them."""
        if stands is Stands.WHOLE and any(_is_operator(item) for item in items):
            stands = Stands.OPERAND
        out: list[Part] = []
        several = False
        run: list[_Item] = []
        for item in [*items, None]:
            if item is not None and not _is_operator(item):
                run.append(item)
                continue
            if _solid(run) and out and out[-1].text == "@":
                out += _flat(run)  # one cell of it, as the formula says
            else:
                shown, more = self._run(run, stands)
                out += shown
                several = several or more
            run = []
            if isinstance(item, Part):
                out.append(item)
        return out, several

    def _run(self, run: list[_Item], stands: Stands) -> _Shown:
        solid = _solid(run)
        if len(solid) > 1:  # A1:INDEX(...), or where two ranges meet
            return _flat(run), True
        out: list[Part] = []
        several = False
        for item in run:
            if isinstance(item, Part):
                shown, several = self._operand(item, stands) if item in solid else ([item], several)
            elif item.opening.kind is Kind.OPEN:
                shown, several = self._call(item, stands)
            elif item.opening.kind is Kind.PAREN_OPEN and len(item.arguments) == 1:
                inner, several = self.expression(item.arguments[0], stands)
                shown = [item.opening, *inner, item.closing]
            else:
                shown, several = _flat([item]), True
            out += shown
        return out, several

    def _operand(self, part: Part, stands: Stands) -> _Shown:
        if part.kind is not Kind.REFERENCE:
            return [part], False
        kind = self._kind(part.text)
        if kind in (Operand.RANGE, Operand.LINES) and stands in (Stands.OPERAND, Stands.SINGLE):
            self.met.append(part)
            return [_AT, part], False
        return [part], kind is not Operand.CELL

    def _kind(self, text: str) -> Operand:
        kind = operand(text)
        return self._named(text) if kind is Operand.UNKNOWN else kind

    def _call(self, call: _Bracket, stands: Stands) -> _Shown:
        array = stands is Stands.ARRAY
        if call_name(call.opening.text) is not None:
            return self._plain_call(call, Stands.ARRAY), array
        name = function_name(call.opening.text)
        count = len(call.arguments) if _solid(call.arguments[0]) or len(call.arguments) > 1 else 0
        if name == "SINGLE":
            return _flat([call]), False
        if name in _PLACES:
            return self._place(call, name, stands)
        single = single_values(name, count)
        if single:
            return self._with_single_values(call, name, single, stands)
        if name in REDUCES:
            return self._plain_call(call, Stands.ARRAY if array else Stands.WHOLE), False
        return self._plain_call(call, Stands.ARRAY), name not in REDUCES_ARRAYS and count > 0

    def _plain_call(self, call: _Bracket, stands: Stands) -> list[Part]:
        return _joined(call, [self.expression(argument, stands)[0] for argument in call.arguments])

    def _with_single_values(
        self, call: _Bracket, name: str, single: frozenset[int], stands: Stands
    ) -> _Shown:
        shown = [
            self.expression(argument, self._stands(name, position, single, stands))
            for position, argument in enumerate(call.arguments)
        ]
        along = one_by_one(name, len(shown)) if name in ALL_ALONG and stands is Stands.ARRAY else single
        several = [position for position in sorted(along) if shown[position][1]]
        texts = [parts for parts, _ in shown]
        if stands is not Stands.ARRAY and name in DISPUTED and DISPUTED[name] < len(texts):
            self._undisputed(name, call.arguments[DISPUTED[name]])
        if several and name not in BY_ITSELF:
            return self._each(call, name, several, texts), True
        out = _joined(call, texts)
        if name in REFERS and stands in (Stands.OPERAND, Stands.SINGLE):
            return [_AT, *out], False
        if name in CHOOSES or name in BY_ITSELF:
            return out, any(more for _, more in shown)
        return out, name in REFERS

    @staticmethod
    def _stands(name: str, position: int, single: frozenset[int], stands: Stands) -> Stands:
        """Where an argument stands in a call that itself stands somewhere."""
        if stands is Stands.ARRAY:
            return stands
        if name in CHOOSES and position not in single:
            return stands
        if name == "TEXTJOIN":  # several delimiters are used in turn
            return Stands.WHOLE
        if name == "IF" and stands in (Stands.WHOLE, Stands.OPERAND):
            return Stands.OPERAND
        if position in single:
            return Stands.SINGLE
        return Stands.ARRAY if position in arrays(name) else Stands.WHOLE

    def _exposed(self, items: Sequence[_Item], through: frozenset[str]) -> set[Operand]:
        """What references stand in an expression itself, or within certain functions."""
        found: set[Operand] = set()
        for item in items:
            if isinstance(item, Part):
                if item.kind is Kind.REFERENCE:
                    found.add(self._kind(item.text))
                continue
            name = function_name(item.opening.text)
            if name in _PLACES:
                if name in through and self._place(item, name, Stands.WHOLE)[1]:
                    found.add(Operand.RANGE)
            elif item.opening.kind is Kind.PAREN_OPEN or name in through:
                for argument in item.arguments:
                    found |= self._exposed(argument, through)
        return found

    def _undisputed(self, name: str, argument: Sequence[_Item]) -> None:
        if name in BY_ITSELF and not _is_reference(argument):
            return
        if self._exposed(argument, _PLACES) & {Operand.RANGE, Operand.LINES}:
            raise Unreadable(f"spreadsheets disagree about a range in {name} in a plain formula")

    def _each(
        self, call: _Bracket, name: str, several: Sequence[int], texts: Sequence[list[Part]]
    ) -> list[Part]:
        if name in NEVER_EACH:
            raise Unreadable(f"the evaluator does not compute {name} for several values at a time")
        for position in several:
            argument = call.arguments[position]
            if name in ("N", "T") and _is_reference(argument):
                raise Unreadable(f"spreadsheets disagree about {name} of a range")
            if Operand.LINES in self._exposed(argument, CHOOSES | BY_ITSELF):
                raise Unreadable(f"the evaluator does not compute {name} for whole rows or columns")
        # An argument left out would arrive as 0.
        filled = [
            list(text) if join(text).strip() else [Part(f'"{OMITTED}"', Kind.LITERAL)] for text in texts
        ]
        opening = [Part(f"{EACH}(", Kind.OPEN), Part(f'"{name}"', Kind.LITERAL), Part(",", Kind.COMMA)]
        return [*opening, *_joined(call, filled)[1:]]

    def _place(self, call: _Bracket, name: str, stands: Stands) -> _Shown:
        """ROW or COLUMN: the numbers of all rows or columns of a range."""
        argument = _solid(call.arguments[0])
        if stands is Stands.SINGLE or len(call.arguments) != 1 or not (argument or self._own):
            return _flat([call]), False
        text = self._own
        if argument:
            text = argument[0].text if len(argument) == 1 and isinstance(argument[0], Part) else ""
        kind = operand(text)
        if kind is Operand.CELL:
            return _flat([call]), False
        if kind is not Operand.UNKNOWN:
            return self._numbers(name, range_from_a1(text.rpartition("!")[2])), True
        shown, _ = self.expression(call.arguments[0], stands if stands is Stands.ARRAY else Stands.WHOLE)
        size = [Part(f"{name}S(", Kind.OPEN), *shown, call.closing]
        first = [Part(",", Kind.COMMA), call.opening, *shown, call.closing]
        one = Part("1", Kind.LITERAL)
        comma = Part(",", Kind.COMMA)
        numbers = [*size, comma, one, *first] if name == "ROW" else [one, comma, *size, *first]
        return [Part("SEQUENCE(", Kind.OPEN), *numbers, call.closing], True

    @staticmethod
    def _numbers(name: str, bounds: tuple[int, int, int, int]) -> list[Part]:
        r1, c1, r2, c2 = bounds
        first, last = (r1, r2) if name == "ROW" else (c1, c2)
        count = last - first + 1
        if count > _MOST_ROWS:
            raise Unreadable(f"the evaluator does not compute {name} for {count} at a time")
        numbers = f"{count},1,{first}" if name == "ROW" else f"1,{count},{first}"
        opening, closing = Part("SEQUENCE(", Kind.OPEN), Part(")", Kind.CLOSE)
        return [opening, Part(numbers, Kind.LITERAL), closing]
