"""LET written out: every variable replaced by its text, for programs and people that have no LET."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Final

from .formulas import CLOSES, OPENS, Kind, Part, Unreadable, calls, function_name

MOST_PARTS: Final = 5_000
"""Of one formula: variables of variables can grow without end."""


def without_lets(parts: list[Part]) -> list[Part]:
    """A formula that calls a TB_ function, without its LETs; any other formula as it is.

    Raises :class:`Unreadable` for a LET that is not whole, or too long when written out.
    """
    if not any(_is_let(part) for part in parts) or not calls(parts):
        return parts
    return _written_out(parts, {})


def _is_let(part: Part) -> bool:
    return part.kind is Kind.OPEN and function_name(part.text) == "LET"


def _variable(part: Part) -> str:
    """The name of a variable, however it is saved."""
    return part.text.casefold().removeprefix("_xlpm.")


def _written_out(parts: Sequence[Part], known: Mapping[str, list[Part]]) -> list[Part]:
    out: list[Part] = []
    at = 0
    while at < len(parts):
        part = parts[at]
        if _is_let(part):
            arguments, at = _arguments(parts, at + 1)
            out += _body(arguments, known)
        else:
            own = known.get(_variable(part)) if part.kind is Kind.REFERENCE else None
            out += [part] if own is None else own
            at += 1
        if len(out) > MOST_PARTS:
            raise Unreadable("LET written out is too long")
    return out


def _body(arguments: Sequence[Sequence[Part]], known: Mapping[str, list[Part]]) -> list[Part]:
    """The last argument of a LET with the variables of the others put in."""
    if len(arguments) < 3 or len(arguments) % 2 == 0:
        raise Unreadable("LET has an incomplete pair of name and value")
    variables = dict(known)
    for name, value in zip(arguments[0:-1:2], arguments[1::2], strict=True):
        word = [part for part in name if part.kind is not Kind.SPACE]
        if len(word) != 1 or word[0].kind is not Kind.REFERENCE:
            raise Unreadable("LET has a name that is none")
        variables[_variable(word[0])] = _bracketed(_written_out(value, variables))
    return _bracketed(_written_out(arguments[-1], variables))


def _bracketed(parts: list[Part]) -> list[Part]:
    inside = [part for part in parts if part.kind is not Kind.SPACE]
    if len(inside) == 1:
        return inside
    return [Part("(", Kind.PAREN_OPEN), *parts, Part(")", Kind.PAREN_CLOSE)]


def _arguments(parts: Sequence[Part], at: int) -> tuple[list[list[Part]], int]:
    """What stands between the commas of a call, and where its closing bracket was left behind."""
    out: list[list[Part]] = [[]]
    depth = 0
    while at < len(parts):
        part = parts[at]
        at += 1
        if depth == 0 and part.kind is Kind.COMMA:
            out.append([])
            continue
        if depth == 0 and part.kind in CLOSES:
            return out, at
        depth += (part.kind in OPENS) - (part.kind in CLOSES)
        out[-1].append(part)
    raise Unreadable("the brackets of LET do not close")
