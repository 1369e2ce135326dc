"""Failures and warnings: the error value of a failed element, and the cautions that apply."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np
import numpy.typing as npt

from thrustbook.engine.errors import EngineError, Problem, Status
from thrustbook.engine.guard import Bound

from .catalogue.types import Row
from .cells import CellError, ErrorKind
from .units import ROLES, UnitSet, unit

MOST_EXPLAINED = 1000
"""Failed elements of one array call that get a message of their own."""


def kind_of(error: EngineError) -> ErrorKind:
    """Choose the error value: a missing argument is #VALUE!, a number out of range #NUM!."""
    missing = any(isinstance(p.value, float) and math.isnan(p.value) for p in error.problems)
    return "VALUE" if missing else "NUM"


def in_units(problem: Problem, role: str, units: UnitSet, bound: Bound | None = None) -> str:
    """Word a bad argument with its value, and the range allowed, in the unit of the call.

    A pressure that the set measures from the other datum stays in pascals: the message
    shows the engine's own number then.
    """
    x = problem.value
    own = bound is not None and problem.allowed == str(bound)
    if own and isinstance(x, float) and x != x:
        return f"{problem.argument} is not given (it is required)"
    if role not in ROLES or not isinstance(x, float) or x != x:
        return str(problem)
    given = units.unit(role)
    if given.shift:
        given = unit(ROLES[role].si, role)

    def own_number(si: float) -> float:
        return (si - given.offset) / given.factor

    symbol = "" if given.symbol == "-" else f" {given.symbol}"
    allowed = problem.allowed
    if bound is not None and own:
        allowed = str(bound._replace(low=own_number(bound.low), high=own_number(bound.high)))
    return f"{problem.argument} = {own_number(x):.6g}{symbol} (allowed: {allowed})"


def refused(row: Row, units: UnitSet, error: EngineError, names: Mapping[str, str] = {}) -> CellError:
    """Turn a refusal of a row's routine into its error value, worded in the units of the call.

    ``names`` gives the arguments that the sheet calls otherwise.
    """
    args = {a.name: a for a in row.args}
    texts = [
        in_units(
            p._replace(argument=names.get(p.argument, p.argument)),
            args[p.argument].role,
            units,
            row.bound(args[p.argument]),
        )
        for p in error.problems
    ]
    return CellError(kind_of(error), "; ".join(texts) or error.reason)


def failures(
    row: Row,
    units: UnitSet,
    values: Sequence[Any],
    status: npt.NDArray[np.uint8],
    errors: Mapping[int, CellError],
    names: Mapping[str, str] = {},
) -> dict[int, CellError]:
    """Give each failed element its error; the reason comes from asking again for that element alone."""
    out = dict(errors)
    for n, i in enumerate(np.flatnonzero(status).tolist()):
        if i not in out:
            asked = n < MOST_EXPLAINED
            out[i] = _explain(row, units, values, i, names) if asked else UNEXPLAINED[int(status[i])]
    return out


UNEXPLAINED = {
    int(Status.OUT_OF_RANGE): CellError("NUM", "an argument is out of range"),
    int(Status.NO_SOLUTION): CellError("NUM", "no finite result for these arguments"),
}


def _explain(row: Row, units: UnitSet, values: Sequence[Any], i: int, names: Mapping[str, str]) -> CellError:
    """Say why element ``i`` of an array call failed."""
    alone = [float(v.reshape(-1)[i if v.size > 1 else 0]) if isinstance(v, np.ndarray) else v for v in values]
    try:
        row.routine.scalar(alone)
    except EngineError as error:
        return refused(row, units, error, names)
    return UNEXPLAINED[int(Status.NO_SOLUTION)]


def cautions(row: Row, values: Sequence[Any], results: Sequence[Any]) -> list[tuple[str, Any]]:
    """Give the cautions of a row, each with where it applies to these arguments and results (SI)."""
    known = dict(zip((a.name for a in row.args), values, strict=True))
    # A name that is both, such as p2, is the result: the same where it was given, found where it was not.
    known |= {r.name: x for r, x in zip(row.results, results, strict=True)}
    with np.errstate(invalid="ignore"):
        return [(c.text, np.asarray(c.test(known), dtype=bool)) for c in row.cautions]
