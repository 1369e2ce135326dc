"""Formula texts: taken apart, and put together again for the embedded evaluator.

The evaluator does not know the spellings that spreadsheets save for the calls of an
add-in, passes 0 for an argument omitted between two commas, and lets a plain formula
spill. So it is given a rewritten text; the user's own text is never changed.
"""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass
from enum import IntEnum
from typing import NamedTuple

from formualizer import TokenizerError, TokenSubType, TokenType, tokenize

from ...cells import CellError, Scalar

# Stands for an omitted argument in the rewritten text: two characters of private use,
# which no keyboard makes.
OMITTED = "\ue0f0\ue0f1"


class Kind(IntEnum):
    """What a part of a formula is."""

    OPEN = 1  # a function name with its bracket
    CLOSE = 2
    PAREN_OPEN = 3
    PAREN_CLOSE = 4
    ARRAY_OPEN = 5
    ARRAY_CLOSE = 6
    COMMA = 7
    REFERENCE = 8  # cell, range, name
    LITERAL = 9
    OPERATOR = 10
    SPACE = 11


class Part(NamedTuple):
    """One token of a formula."""

    text: str
    kind: Kind


_KINDS = {
    (TokenType.Func, TokenSubType.Open): Kind.OPEN,
    (TokenType.Func, TokenSubType.Close): Kind.CLOSE,
    (TokenType.Paren, TokenSubType.Open): Kind.PAREN_OPEN,
    (TokenType.Paren, TokenSubType.Close): Kind.PAREN_CLOSE,
    (TokenType.Array, TokenSubType.Open): Kind.ARRAY_OPEN,
    (TokenType.Array, TokenSubType.Close): Kind.ARRAY_CLOSE,
    (TokenType.Sep, TokenSubType.Arg): Kind.COMMA,
    (TokenType.Operand, TokenSubType.Range): Kind.REFERENCE,
    (TokenType.Whitespace, TokenSubType.None_): Kind.SPACE,
}
_LITERALS = (TokenType.Operand, TokenType.Literal)
OPENS = frozenset((Kind.OPEN, Kind.PAREN_OPEN, Kind.ARRAY_OPEN))
CLOSES = frozenset((Kind.CLOSE, Kind.PAREN_CLOSE, Kind.ARRAY_CLOSE))

# [1]!TB_X(   'C:\dir\thrustbook.xlam'!TB_X(   book.xlam!TB_X(   _xll.TB_X(   org.thrustbook.TB_X(
_CALL = re.compile(r"(?:.*!)?(?:[A-Z_]\w*\.)*(TB_[A-Z0-9_]+)", re.IGNORECASE | re.DOTALL)
_FUTURE = re.compile(r"(?:_xlfn\.|_xlws\.|_xludf\.|_xll\.)+", re.IGNORECASE)
_CELL_OR_RANGE = re.compile(
    r"(?:.*!)?(?:\$?[A-Za-z]{1,3}\$?[0-9]+(?::\$?[A-Za-z]{1,3}\$?[0-9]+)?"
    r"|\$?[A-Za-z]{1,3}:\$?[A-Za-z]{1,3}|\$?[0-9]+:\$?[0-9]+)",
    re.DOTALL,
)
_SINGLE_CELL = re.compile(r"(?:.*!)?\$?[A-Za-z]{1,3}\$?[0-9]+", re.DOTALL)

# Functions whose result may be a range or an array although every argument is a single cell.
_GIVES_ARRAY = frozenset(
    {"ANCHORARRAY", "INDEX", "INDIRECT", "MUNIT", "OFFSET", "RANDARRAY", "SEQUENCE", "TEXTSPLIT", "XLOOKUP"}
)
# Functions that make one value of a range.
_REDUCES = frozenset(
    {"AND", "AVERAGE", "AVERAGEIF", "AVERAGEIFS", "COLUMNS", "COUNT", "COUNTA", "COUNTBLANK", "COUNTIF"}
    | {"COUNTIFS", "LARGE", "MAX", "MAXIFS", "MEDIAN", "MIN", "MINIFS", "OR", "PRODUCT", "ROWS", "SMALL"}
    | {"STDEV", "STDEV.P", "STDEV.S", "SUBTOTAL", "SUM", "SUMIF", "SUMIFS", "SUMPRODUCT", "SUMSQ", "VAR"}
)


class Unreadable(ValueError):
    """A formula that cannot be taken apart; the text says why."""


def take_apart(text: str) -> list[Part]:
    """The parts of a formula (given without its equals sign), in order.

    Raises :class:`Unreadable`.
    """
    try:
        tokens = tokenize("=" + text).tokens()
    except TokenizerError as error:
        raise Unreadable(f"the formula cannot be read ({error})") from None
    parts = []
    for token in tokens:
        kind = _KINDS.get((token.token_type, token.subtype))
        if kind is None:
            kind = Kind.LITERAL if token.token_type in _LITERALS else Kind.OPERATOR
        parts.append(Part(token.value, kind))
    return parts


def join(parts: Sequence[Part]) -> str:
    """The text of the parts."""
    return "".join(part.text for part in parts)


def literal(value: Scalar) -> str:
    """A value as the text of a formula; what is not stored is #N/A, and never 0."""
    if value is None:
        return "#N/A"
    if value is True or value is False:
        return "TRUE" if value else "FALSE"
    if isinstance(value, CellError):
        return str(value)
    if isinstance(value, str):
        return '"' + value.replace('"', '""') + '"'
    return repr(float(value)).upper()


def call_name(opening: str) -> str | None:
    """``TB_BEND`` for any spelling of that call's opening, None for another function."""
    match = _CALL.fullmatch(opening[:-1])
    return match[1].upper() if match else None


def function_name(opening: str) -> str:
    """The plain upper-case name of a function, without the prefixes of newer functions."""
    return _FUTURE.sub("", opening[:-1]).upper()


def functions(parts: Sequence[Part]) -> set[str]:
    """Names of the functions of the spreadsheet itself that a formula calls."""
    return {
        function_name(part.text)
        for part in parts
        if part.kind is Kind.OPEN and "TB_" not in part.text.upper()
    }


def calls(parts: Sequence[Part]) -> list[str]:
    """Names of the TB_ functions that a formula calls, one for each call."""
    found = []
    for part in parts:
        if part.kind is Kind.OPEN and (name := call_name(part.text)):
            found.append(name)
    return found


@dataclass(slots=True)
class Rewritten:
    """A formula in the spelling for the evaluator.

    ``pieces`` joined are the text. ``spans`` are the TB_ calls as (name, first, last)
    piece, innermost first. ``whole`` is set when the formula is one TB_ call and
    nothing else: its name and the text of its arguments.
    """

    pieces: list[str]
    spans: list[tuple[str, int, int]]
    whole: tuple[str, str] | None
    may_be_array: bool

    @property
    def text(self) -> str:
        return "".join(self.pieces)


def rewrite(parts: Sequence[Part]) -> Rewritten:
    """Prefixes of TB_ calls stripped, omitted arguments marked, ``SINGLE`` as ``@``."""
    pieces: list[str] = []
    spans: list[tuple[str, int, int]] = []
    # One entry an open bracket: [TB name or "", index of its piece, argument so far empty, commas seen]
    stack: list[list[object]] = []
    array_like = False
    reducing = 0  # open brackets inside the outermost function that makes one value of a range
    for part in parts:
        kind, text = part.kind, part.text
        top = stack[-1] if stack else None
        if reducing:
            reducing += (kind in OPENS) - (kind in CLOSES)
        if kind is Kind.OPEN:
            if top:
                top[2] = False
            name = call_name(text)
            if name:
                text = name + "("
                array_like = array_like or not reducing
            else:
                plain = function_name(text)
                array_like = array_like or (not reducing and plain in _GIVES_ARRAY)
                if plain == "SINGLE":
                    text = "@("
                elif plain in _REDUCES and not reducing:
                    reducing = 1
            stack.append([name or "", len(pieces), True, False])
        elif kind in (Kind.PAREN_OPEN, Kind.ARRAY_OPEN):
            if top:
                top[2] = False
            array_like = array_like or (not reducing and kind is Kind.ARRAY_OPEN)
            stack.append(["", len(pieces), True, False])
        elif kind is Kind.COMMA:
            if top and top[0] and top[2]:
                pieces.append(f'"{OMITTED}"')
            if top:
                top[2], top[3] = True, True
        elif kind in (Kind.CLOSE, Kind.PAREN_CLOSE, Kind.ARRAY_CLOSE):
            if top:
                if top[0]:
                    if top[2] and top[3]:
                        pieces.append(f'"{OMITTED}"')
                    spans.append((str(top[0]), int(str(top[1])), len(pieces)))
                stack.pop()
        elif kind is not Kind.SPACE:
            if kind is Kind.REFERENCE and not reducing and not _SINGLE_CELL.fullmatch(text):
                array_like = True
            if top:
                top[2] = False
        pieces.append(text)
    return Rewritten(pieces, spans, _whole(pieces, spans), array_like)


def _whole(pieces: Sequence[str], spans: Sequence[tuple[str, int, int]]) -> tuple[str, str] | None:
    if not spans:
        return None
    name, first, last = spans[-1]
    before = {part for part in pieces[:first] if part.strip()}
    after = {part for part in pieces[last + 1 :] if part.strip()}
    if before <= {"(", "@"} and after <= {")"} and "@" not in before:
        return name, "".join(pieces[first + 1 : last])
    return None


def one_cell(parts: Sequence[Part]) -> list[Part]:
    """A plain formula with the implicit intersection that a spreadsheet applies to it.

    Outside every function a range stands for its cell in the formula's own row or column.
    """
    out: list[Part] = []
    depth = 0
    for index, part in enumerate(parts):
        if part.kind is Kind.OPEN:
            depth += 1
        elif part.kind is Kind.CLOSE:
            depth -= 1
        elif (
            depth == 0
            and part.kind is Kind.REFERENCE
            and _CELL_OR_RANGE.fullmatch(part.text)
            and not _SINGLE_CELL.fullmatch(part.text)
            and not (out and out[-1].text in ("@", ":"))
            and not (index + 1 < len(parts) and parts[index + 1].text in (":", "#"))
        ):
            out.append(Part("@", Kind.OPERATOR))
        out.append(part)
    return out
