"""TB_BRANCHFLOW: the flow that closes a junction, from a range of any shape."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from thrustbook.engine import sections

from ..cells import CellError, Refused
from ..tables import as_range, is_blank, numbers
from .types import TableAnswer, TableCall


def branchflow(call: TableCall) -> TableAnswer:
    """Close one junction (a single row or column of flows), or one for every row of the range.

    Empty cells are no flows. A row with no flow at all stays empty, so that a
    range may be taken longer than its contents.
    """
    cells = as_range(call.cells[0], "Q")
    single = len(cells) == 1 or len(cells[0]) == 1
    if single:
        cells = [[cell for row in cells for cell in row]]
    width = len(cells[0])
    values, found = numbers([c for row in cells for c in row], "Q", "flow", call.units.unit("flow"))
    empty = np.array([[is_blank(c) for c in row] for row in cells])
    no_flow: npt.NDArray[np.bool_] = np.asarray(empty.all(axis=1))
    if no_flow.all():
        raise Refused("VALUE", "Q is empty (allowed: at least one known flow)")
    flows = np.where(empty, 0.0, values.reshape(len(cells), width))
    errors: dict[int, CellError] = {}
    for i, error in found.items():
        errors.setdefault(i // width, error)
    closing = np.asarray(sections.branchflow(flows).Q)
    for bad in np.flatnonzero(np.isnan(closing)).tolist():
        errors.setdefault(bad, CellError("NUM", "Q holds a flow that is not a finite number"))
    return TableAnswer(columns={"Q": closing}, errors=errors, blank=no_flow, single=single)
