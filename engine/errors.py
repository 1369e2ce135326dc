"""Typed errors of the engine.

Every error says which function refused, and for each bad argument its name, the
value received and what is allowed. All bad arguments of a call are reported
together. Array calls do not raise for a bad row: they return a status array.
"""

from __future__ import annotations

from collections.abc import Sequence
from enum import IntEnum
from typing import NamedTuple


class Status(IntEnum):
    """Outcome of one element of an array call."""

    OK = 0
    OUT_OF_RANGE = 1
    NO_SOLUTION = 2


class Problem(NamedTuple):
    """One bad argument."""

    argument: str
    value: object
    allowed: str

    def __str__(self) -> str:
        return f"{self.argument} = {format_value(self.value)} (allowed: {self.allowed})"


def format_value(value: object) -> str:
    """Write a value as a reader of an error message wants it: short and exact enough."""
    if isinstance(value, float):
        return "not given" if value != value else f"{value:.6g}"
    return repr(value)


class EngineError(ValueError):
    """Base of every refusal of the engine.

    Attributes
    ----------
    function : str
        Name of the routine that refused ("" until the routine's guard fills it in).
    problems : tuple of Problem
        The bad arguments, all of them; empty where no single argument is to blame.
    reason : str
        The sentence for the reader.
    """

    def __init__(self, reason: str, function: str = "", problems: Sequence[Problem] = ()) -> None:
        self.reason = reason
        self.function = function
        self.problems = tuple(problems)
        super().__init__(reason)

    def __str__(self) -> str:
        return f"{self.function}: {self.reason}" if self.function else self.reason


class OutOfRange(EngineError):
    """One or more arguments lie outside what the routine allows."""

    def __init__(self, problems: Sequence[Problem], function: str = "") -> None:
        super().__init__("; ".join(map(str, problems)), function, problems)


class NoSolution(EngineError):
    """Each argument is allowed, but together they have no physical solution."""


class NotClosed(NoSolution):
    """The flows of a control volume do not add up to zero."""
