"""Failures and warnings: the error value of a failed element, and the cautions that apply."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np
import numpy.typing as npt

from thrustbook.engine.errors import EngineError, Status
from thrustbook.engine.guard import Routine

from .catalogue.types import Row
from .cells import CellError, ErrorKind

MOST_EXPLAINED = 1000
"""Failed elements of one array call that get a message of their own."""


def kind_of(error: EngineError) -> ErrorKind:
    """Choose the error value: a missing argument is #VALUE!, a number out of range #NUM!."""
    missing = any(isinstance(p.value, float) and math.isnan(p.value) for p in error.problems)
    return "VALUE" if missing else "NUM"


def failures(
    routine: Routine[Any, Any],
    values: Sequence[Any],
    status: npt.NDArray[np.uint8],
    errors: Mapping[int, CellError],
) -> dict[int, CellError]:
    """Give each failed element its error; the reason comes from asking again for that element alone."""
    out = dict(errors)
    for n, i in enumerate(np.flatnonzero(status)):
        if int(i) not in out:
            out[int(i)] = explain(routine, values, int(i)) if n < MOST_EXPLAINED else UNEXPLAINED[status[i]]
    return out


UNEXPLAINED = {
    int(Status.OUT_OF_RANGE): CellError("NUM", "an argument is out of range"),
    int(Status.NO_SOLUTION): CellError("NUM", "no finite result for these arguments"),
}


def explain(routine: Routine[Any, Any], values: Sequence[Any], i: int) -> CellError:
    """Say why element ``i`` of an array call failed."""
    alone = [float(v.reshape(-1)[i if v.size > 1 else 0]) if isinstance(v, np.ndarray) else v for v in values]
    try:
        routine.scalar(alone)
    except EngineError as error:
        return CellError(kind_of(error), error.reason)
    return UNEXPLAINED[int(Status.NO_SOLUTION)]


def warnings(row: Row, values: Sequence[Any], results: Sequence[Any]) -> list[str]:
    """List the cautions of a row that apply anywhere to these arguments (SI) and results (SI)."""
    known = dict(zip((a.name for a in row.args), values, strict=True))
    # A name that is both, such as p2, is the result: the same where it was given, found where it was not.
    known |= {r.name: x for r, x in zip(row.results, results, strict=True)}
    with np.errstate(invalid="ignore"):
        return [c.text for c in row.cautions if bool(np.any(c.test(known)))]
