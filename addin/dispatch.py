"""The dispatcher: from the cells of one call to the engine and back to cells.

Every host calls :func:`call` with the name of a worksheet function and its
arguments as plain cell values (see ``cells.py``), and gets a cell value or a
grid of them. It never raises: a failed result is a :class:`CellError`, whose
message is what TB_WHY tells.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from thrustbook.engine.errors import EngineError

from . import elements, tabular
from .catalogue.registry import CATALOGUE
from .catalogue.types import Row
from .cells import Cell, CellError, Grid, Refused
from .failures import kind_of
from .units import UnitError


def call(name: str, args: Sequence[Cell]) -> Cell | Grid:
    """Evaluate one worksheet call.

    Parameters
    ----------
    name : str
        Name of the worksheet function, such as "TB_BEND".
    args : sequence of cells
        The arguments in the order of the formula; one that is empty or omitted is None.

    Returns
    -------
    cell or two-dimensional object array
        Numbers, texts and error values; never None.
    """
    try:
        row = CATALOGUE.get(name) or _row(name)
        if row.kind == "element":
            return elements.evaluate(row, args)
        if row.kind == "tool":
            return row.routine(args)  # type: ignore[no-any-return]
        return tabular.evaluate(row, args)
    except Refused as refusal:
        return refusal.error
    except UnitError as error:
        return CellError("VALUE", str(error))
    except EngineError as error:
        return CellError(kind_of(error), error.reason)
    except MemoryError:
        return CellError("VALUE", "the call needs more memory than there is")
    except Exception as error:  # a fault of ours must not take the host down
        return CellError("VALUE", f"internal fault in {name}: {type(error).__name__}: {error}")


def headings(name: str, leading: Sequence[Cell], width: int) -> tuple[tuple[str, ...], tuple[str, ...]]:
    """Give the labels and units over the columns of a block call's answer in cells ``width`` wide.

    ``leading`` are the call's first two arguments, wanted result and units.
    """
    result = leading[0] if leading and isinstance(leading[0], str) else ""
    units = leading[1] if len(leading) > 1 else None
    found = []
    for form in ("labels", "units"):
        row = call(name, [f"{form}: {result}", units])
        texts = [str(text) for text in row[0]] if isinstance(row, np.ndarray) else []
        found.append(tuple((texts + [""] * width)[:width]))
    return found[0], found[1]


def why(name: str, args: Sequence[Cell]) -> str:
    """Tell why a call fails, or what to be careful of; "ok" where there is nothing to say."""
    outcome = call(name, args)
    if isinstance(outcome, CellError):
        return outcome.message or str(outcome)
    row = _row(name)
    if row.kind == "tool":
        remarks = elements.failed_elements(outcome)
    elif row.kind == "table":
        remarks = tabular.remarks(row, args)
    else:
        remarks = elements.remarks(row, args, outcome)
    return "; ".join(remarks) or "ok"


def _row(name: str) -> Row:
    found = CATALOGUE.get(name.upper())
    if found is None:
        raise Refused("NAME", f"there is no function {name}")
    return found
