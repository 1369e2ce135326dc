"""TB_ calls inside formulas, taken apart so that each can be replaced by its long-hand result."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass, field
from typing import Protocol, TypeAlias

from ..hosts.headless.formulas import CLOSES, OPENS, Kind, Part, call_name

Items: TypeAlias = "list[Part | Call]"
Shape: TypeAlias = tuple[int, int]
"""Rows and columns."""


class NotWorked(Exception):
    """A call that gets no long-hand working; the text says why."""


class Refuses(NotWorked):
    """A call that the function itself refuses; the text is its reason."""


class Outcome(Protocol):
    """Results of one call on the checking sheets, as a grid of the shape that the call itself gives."""

    @property
    def shape(self) -> Shape: ...

    @property
    def one_range(self) -> bool:
        """Whether one reference covers all elements."""

    def at(self, i: int, j: int) -> str:
        """A formula for one element."""

    def range_text(self) -> str:
        """One reference to all elements."""


@dataclass(slots=True, eq=False)
class Call:
    """One TB_ call: its name and what stands between its commas, calls inside it included."""

    name: str
    args: list[Items] = field(default_factory=list)
    outcome: Outcome | None = None
    """What the plan of the book makes of it."""
    range: str = ""
    """Where all that it gives stands in one range, if its outcome has none."""


def tree(parts: Sequence[Part]) -> Items:
    """The parts of a formula with every TB_ call as one item."""
    items, at = _items(parts, 0, inside=False)
    if at != len(parts):
        raise NotWorked("the brackets of the formula do not close")
    return items


def _items(parts: Sequence[Part], at: int, inside: bool) -> tuple[Items, int]:
    """Items up to the end, or (inside a call) up to its next comma or closing bracket."""
    out: Items = []
    depth = 0
    while at < len(parts):
        part = parts[at]
        if part.kind is Kind.OPEN and (name := call_name(part.text)):
            call, at = _call(parts, at + 1, name)
            out.append(call)
            continue
        if inside and depth == 0 and (part.kind is Kind.COMMA or part.kind in CLOSES):
            return out, at
        depth += (part.kind in OPENS) - (part.kind in CLOSES)
        out.append(part)
        at += 1
    if inside:
        raise NotWorked("the brackets of the formula do not close")
    return out, at


def _call(parts: Sequence[Part], at: int, name: str) -> tuple[Call, int]:
    call = Call(name)
    while True:
        items, at = _items(parts, at, inside=True)
        call.args.append(stripped(items))
        closing = parts[at].kind is not Kind.COMMA
        at += 1
        if closing:
            if call.args == [[]]:
                call.args = []
            return call, at


def stripped(items: Items) -> Items:
    """Items without blanks at either end, and without brackets round the whole."""
    out = [item for item in items if isinstance(item, Call) or item.kind is not Kind.SPACE]
    while len(out) > 2 and _is(out[0], Kind.PAREN_OPEN) and _closing(out) == len(out) - 1:
        out = out[1:-1]
    return out


def _is(item: Part | Call, kind: Kind) -> bool:
    return isinstance(item, Part) and item.kind is kind


def _closing(items: Items) -> int:
    """The place of the bracket that closes the first one."""
    depth = 0
    for i, item in enumerate(items):
        if isinstance(item, Part):
            depth += (item.kind in OPENS) - (item.kind in CLOSES)
            if depth == 0:
                return i
    return -1


def all_calls(items: Items) -> list[Call]:
    """Every call in the items, inner ones before the call that holds them."""
    found: list[Call] = []
    for item in items:
        if isinstance(item, Call):
            for arg in item.args:
                found += all_calls(arg)
            found.append(item)
    return found


def everything(items: Items) -> Iterator[Part]:
    """Every part in the items, and in the arguments of the calls among them."""
    for item in items:
        if isinstance(item, Call):
            for arg in item.args:
                yield from everything(arg)
        else:
            yield item


def render(items: Items, operand: Callable[[str], str], call: Callable[[Call], str]) -> str:
    """The text of items, with operands and calls as the two functions write them.

    Raises :class:`NotWorked` for operators that mean the place of the formula itself.
    """
    out = []
    for item in items:
        if isinstance(item, Call):
            out.append(call(item))
        elif item.kind is Kind.REFERENCE:
            out.append(operand(item.text))
        elif item.kind is Kind.OPERATOR and item.text in ("#", "@"):
            raise NotWorked(f'the formula uses the operator "{item.text}"')
        else:
            out.append(item.text)
    return "".join(out)
