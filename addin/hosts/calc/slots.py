"""What 0 can mean in each place of a call from Calc, which passes an empty cell as 0."""

from __future__ import annotations

import enum

from ...catalogue.types import Arg, Row

_NEVER_NUMBERS = ("choice", "text", "table", "headings")


class Slot(enum.Enum):
    """How a 0 in one place of a call is read."""

    NUMBER = enum.auto()
    """As 0: it may be meant, or the argument is required and its range says what is allowed."""
    ZERO_IS_EMPTY = enum.auto()
    """As empty: 0 cannot be meant."""


def slots(row: Row) -> tuple[Slot, ...]:
    """Tell for every place of a call of this function how a 0 is read."""
    return (Slot.ZERO_IS_EMPTY,) * row.leading + tuple(_slot(row, arg) for arg in row.args)


def _slot(row: Row, arg: Arg) -> Slot:
    if arg.role in _NEVER_NUMBERS:
        return Slot.ZERO_IS_EMPTY
    if row.required(arg):
        return Slot.NUMBER
    if arg.name == "pamb":  # nobody converts to gauge pressure in a vacuum
        return Slot.ZERO_IS_EMPTY
    bound = row.bound(arg)
    return Slot.ZERO_IS_EMPTY if bound is not None and not bound.allows(0.0) else Slot.NUMBER


def zero_for_empty(row: Row) -> tuple[str, ...]:
    """Name the optional arguments whose empty cell Calc passes as a 0 that may be meant.

    Left out altogether they have their default; a reference to an empty cell gives 0.
    """
    return tuple(
        arg.name
        for arg, slot in zip(row.args, slots(row)[row.leading :], strict=True)
        if slot is Slot.NUMBER and not row.required(arg) and not _zero_is_default(row, arg)
    )


def _zero_is_default(row: Row, arg: Arg) -> bool:
    for parameter in getattr(row.routine, "parameters", ()):
        if parameter.name == arg.name:
            return bool(parameter.default == 0.0)
    return False
