"""Cells of Excel, as xlwings hands them over, to cells of the dispatcher and back.

In, with ``ndim=2, err_to_str=True`` on every argument:

============================  =====================================================
Excel                         dispatcher
============================  =====================================================
empty cell, empty text        None
argument omitted              None
number, date, currency        float; a date is its serial number, as in a cell
TRUE, FALSE                   bool
text                          str
error cell                    CellError of its kind; kinds newer than #N/A are #VALUE!
one cell                      that cell alone
row, column, table            list of rows
============================  =====================================================

A cell that holds the *text* "#N/A" cannot be told from an error cell, because
xlwings gives the error as that text. It is taken for the error: it can never
become a number.

Out: xlwings cannot return a true error value, so an error becomes a marker, a
text that says which error it is. The generated VBA turns markers into errors.
Where the functions are imported with xlwings' own "Import Functions", the
marker itself stands in the cell; passed on to another of our functions it
counts as the error that it names.
"""

from __future__ import annotations

import datetime
import decimal
import math
from typing import Any, Final

import numpy as np

from ...cells import ERROR_KIND, ERROR_TEXT, Cell, CellError, ErrorKind, Grid, Scalar

MARKER_TAIL: Final = " (see TB_WHY)"
MARKER: Final[dict[ErrorKind, str]] = {kind: text + MARKER_TAIL for kind, text in ERROR_TEXT.items()}
_ERROR_OF_TEXT: Final[dict[str, ErrorKind]] = ERROR_KIND | {text: kind for kind, text in MARKER.items()}

LONGEST_TEXT: Final = 32767
"""Characters that an Excel cell holds."""

# COM gives an error cell as 0x800A0000 + its number (2000 #NULL! to 2051); numbers never come as integers
# from a cell, so that an integer in this span is an error even where xlwings does not know its name.
_FIRST_ERROR, _LAST_ERROR = -2146826288, -2146826188
_NEWER_ERRORS: Final[dict[int, str]] = {
    2043: "#GETTING_DATA",
    2045: "#SPILL!",
    2046: "#CONNECT!",
    2047: "#BLOCKED!",
    2048: "#UNKNOWN!",
    2049: "#FIELD!",
    2050: "#CALC!",
    2051: "#BUSY!",
}
_EPOCH: Final = datetime.datetime(1899, 12, 30)
_PLAIN: Final = frozenset({float, type(None)})


def read_argument(value: Any) -> Cell:
    """Read one argument as xlwings' conversion gives it (two-dimensional, or None where omitted)."""
    if not isinstance(value, list):
        return _read(value)
    if len(value) == 1 and len(value[0]) == 1:
        return _read(value[0][0])
    return [row if _PLAIN.issuperset(map(type, row)) else [_read(c) for c in row] for row in value]


def _read(value: Any) -> Scalar:
    kind = type(value)
    if kind is float or value is None or kind is bool:
        return value  # type: ignore[no-any-return]
    if kind is str:
        if not value:
            return None
        error = _ERROR_OF_TEXT.get(value)
        return CellError(error) if error else value
    if isinstance(value, int):
        if _FIRST_ERROR <= value <= _LAST_ERROR:
            number = value - _FIRST_ERROR + 2000
            return CellError("VALUE", f"a cell holds the error {_NEWER_ERRORS.get(number, number)}")
        return float(value)
    if isinstance(value, decimal.Decimal):  # a cell in a currency format
        return float(value)
    if isinstance(value, datetime.datetime):
        return (value.replace(tzinfo=None) - _EPOCH) / datetime.timedelta(days=1)
    return CellError("VALUE", f"a cell holds a {kind.__name__}, which is not a cell value")


def write_answer(outcome: Cell | Grid) -> Any:
    """Turn an answer of the dispatcher into what xlwings may return: a value, or a list of rows."""
    if isinstance(outcome, np.ndarray):
        outcome = outcome.tolist()
    if not isinstance(outcome, list):
        return _write(outcome)
    return [[_write(cell) for cell in row] for row in outcome]


def _write(cell: Any) -> float | str | bool:
    kind = type(cell)
    if kind is float:
        return cell if math.isfinite(cell) else MARKER["NUM"]
    if kind is str:
        return cell[:LONGEST_TEXT]  # type: ignore[no-any-return]
    if kind is CellError:
        return MARKER[cell.kind]
    if isinstance(cell, bool | np.bool_):
        return bool(cell)
    if isinstance(cell, int | float | np.number):
        return _write(float(cell))
    return MARKER["VALUE"]  # None would show as a blank
