"""Arithmetic that serves one number and a whole array with the same line of code.

A worksheet calls a routine either for one cell (plain floats, where numpy's
overhead would dominate) or for a table (arrays). These helpers pick the cheap
way by type, so that a routine's body is written once. A quantity that was not
given is NaN, in scalars and in arrays alike.
"""

from __future__ import annotations

import math
from typing import Any, Final, TypeAlias

import numpy as np

from .errors import NoSolution

Num: TypeAlias = Any
"""A float or a float array; both obey the same arithmetic."""

NOT_GIVEN: Final = math.nan


def is_given(x: Num) -> Num:
    """Tell where a quantity was given."""
    return x == x


def choose(condition: Num, yes: Num, no: Num) -> Num:
    """Pick ``yes`` where the condition holds, else ``no``; both are evaluated."""
    if isinstance(condition, bool):
        return yes if condition else no
    return np.where(condition, yes, no)


def default(x: Num, fallback: Num) -> Num:
    """Fill in a quantity that was not given."""
    if isinstance(x, float):
        return fallback if x != x else x
    return np.where(np.isnan(x), fallback, x)


def refuse(bad: Num, value: Num, reason: str) -> Num:
    """Pass ``value`` through except where ``bad``: a scalar raises, an array gets NaN."""
    if isinstance(bad, bool | np.bool_):
        if bad:
            raise NoSolution(reason)
        return value
    return np.where(bad, np.nan, value)


def sqrt(x: Num) -> Num:
    """Square root; NaN for a negative number, never an exception."""
    if isinstance(x, float):
        return math.sqrt(x) if x >= 0 else math.nan
    return np.sqrt(x)


def sin(x: Num) -> Num:
    """Sine."""
    return math.sin(x) if isinstance(x, float) else np.sin(x)


def cos(x: Num) -> Num:
    """Cosine."""
    return math.cos(x) if isinstance(x, float) else np.cos(x)


def atan2(y: Num, x: Num) -> Num:
    """Angle of the point (x, y) [rad], -pi to pi."""
    if isinstance(x, float) and isinstance(y, float):
        return math.atan2(y, x)
    return np.arctan2(y, x)


def exp(x: Num) -> Num:
    """Exponential."""
    return math.exp(x) if isinstance(x, float) else np.exp(x)


def log(x: Num) -> Num:
    """Natural logarithm; NaN where it is not defined, never an exception."""
    if isinstance(x, float):
        return math.log(x) if x > 0 else math.nan
    return np.log(x)


def log10(x: Num) -> Num:
    """Common logarithm; NaN where it is not defined, never an exception."""
    if isinstance(x, float):
        return math.log10(x) if x > 0 else math.nan
    return np.log10(x)


def maximum(x: Num, y: Num) -> Num:
    """The larger of two, element by element."""
    if isinstance(x, float) and isinstance(y, float):
        return max(x, y)
    return np.maximum(x, y)


def minimum(x: Num, y: Num) -> Num:
    """The smaller of two, element by element."""
    if isinstance(x, float) and isinstance(y, float):
        return min(x, y)
    return np.minimum(x, y)
