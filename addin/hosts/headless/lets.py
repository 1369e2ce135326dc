"""LET, and LAMBDA called with its arguments, written out: every variable replaced by its text.

For programs and people that do not have them.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Final

from .formulas import CLOSES, OPENS, Kind, Part, Unreadable, calls, function_name

MOST_PARTS: Final = 5_000
"""Of one formula: variables of variables can grow without end."""


def without_lets(parts: list[Part]) -> list[Part]:
    """A formula that calls a TB_ function, without its LETs and calls of LAMBDA; any other as it is.

    Raises :class:`Unreadable` for one that is not whole, or too long when written out.
    """
    if not any(_opens(part, "LET") or opens_lambda(part) for part in parts) or not calls(parts):
        return parts
    return _written_out(parts, {})


def opens_lambda(part: Part) -> bool:
    """Whether a function without a name begins here."""
    return _opens(part, "LAMBDA")


def called(function: Sequence[Part], arguments: Sequence[Sequence[Part]]) -> list[Part]:
    """A function without a name, called with arguments."""
    out = [*function, Part("(", Kind.PAREN_OPEN)]
    for number, argument in enumerate(arguments):
        if number:
            out.append(Part(",", Kind.OPERATOR))  # as the evaluator reads it behind a bracket
        out += argument
    return [*out, Part(")", Kind.PAREN_CLOSE)]


def _opens(part: Part, name: str) -> bool:
    return part.kind is Kind.OPEN and function_name(part.text) == name


def _variable(part: Part) -> str:
    """The name of a variable, however it is saved."""
    return part.text.casefold().removeprefix("_xlpm.")


def _written_out(parts: Sequence[Part], known: Mapping[str, list[Part]]) -> list[Part]:
    out: list[Part] = []
    at = 0
    while at < len(parts):
        part = parts[at]
        if _opens(part, "LET"):
            arguments, at = arguments_from(parts, at + 1)
            out += _body(arguments, known)
        elif opens_lambda(part):
            first = at
            arguments, at = arguments_from(parts, at + 1)
            if at < len(parts) and parts[at].kind is Kind.PAREN_OPEN:
                given, at = arguments_from(parts, at + 1)
                out += _of_lambda(arguments, given, known)
            else:
                out += parts[first:at]
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
        variables[_name(name)] = _bracketed(_written_out(value, variables))
    return _bracketed(_written_out(arguments[-1], variables))


def _of_lambda(
    arguments: Sequence[Sequence[Part]], given: Sequence[Sequence[Part]], known: Mapping[str, list[Part]]
) -> list[Part]:
    """The last argument of a LAMBDA with what it was given put in."""
    if len(given) != len(arguments) - 1 or any(not argument for argument in given):
        raise Unreadable("LAMBDA is not given as many arguments as it has")
    variables = dict(known)
    for name, value in zip(arguments[:-1], given, strict=True):
        variables[_name(name)] = _bracketed(_written_out(value, known))
    return _bracketed(_written_out(arguments[-1], variables))


def _name(parts: Sequence[Part]) -> str:
    word = [part for part in parts if part.kind is not Kind.SPACE]
    if len(word) != 1 or word[0].kind is not Kind.REFERENCE:
        raise Unreadable("LET or LAMBDA has a name that is none")
    return _variable(word[0])


def _bracketed(parts: list[Part]) -> list[Part]:
    inside = [part for part in parts if part.kind is not Kind.SPACE]
    if len(inside) == 1:
        return inside
    return [Part("(", Kind.PAREN_OPEN), *parts, Part(")", Kind.PAREN_CLOSE)]


def arguments_from(parts: Sequence[Part], at: int) -> tuple[list[list[Part]], int]:
    """What stands between the commas of a call, and the place behind its closing bracket."""
    out: list[list[Part]] = [[]]
    depth = 0
    while at < len(parts):
        part = parts[at]
        at += 1
        if depth == 0 and part.text == "," and part.kind in (Kind.COMMA, Kind.OPERATOR):
            out.append([])
            continue
        if depth == 0 and part.kind in CLOSES:
            return out, at
        depth += (part.kind in OPENS) - (part.kind in CLOSES)
        out[-1].append(part)
    raise Unreadable("the brackets of the formula do not close")
