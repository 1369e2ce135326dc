"""What the dispatcher hands to a table reader, and what it gets back."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field

import numpy as np
import numpy.typing as npt

from thrustbook.engine.constants import P_ATM

from ..cells import Cell, CellError
from ..units import UnitSet


@dataclass(frozen=True, slots=True)
class TableCall:
    """A call of a table function, its leading arguments already read."""

    result: str
    """Wanted result: a name of the row, or "all"."""
    units: UnitSet
    cells: Sequence[Cell]
    """The remaining arguments in the row's order; one that was left out is None."""


@dataclass(frozen=True, slots=True)
class TableAnswer:
    """Results in SI units, by name, one element a row of the answer.

    A number column is a float array (NaN: not applicable, shown as empty text);
    a text column is a list of strings. ``errors`` holds the rows that failed,
    ``notes`` the warnings of the rows that did not, ``blank`` the rows whose input was empty.
    """

    columns: Mapping[str, npt.NDArray[np.float64] | Sequence[str]]
    errors: Mapping[int, CellError] = field(default_factory=dict)
    notes: Mapping[int, str] = field(default_factory=dict)
    blank: npt.NDArray[np.bool_] | None = None
    single: bool = False
    """True where the answer is one row by nature: a single result is then a plain value."""
    ambient: float = P_ATM
    """Ambient pressure of the call [Pa], between gauge results and a unit that is absolute."""
    general: Sequence[str] = ()
    """Remarks on the whole answer, for TB_WHY."""
