"""What a worksheet cell can hold, the same in every host.

A host translates its own values into these before it calls the dispatcher and
translates the answer back afterwards:

- in: ``float``, ``str``, ``bool``, ``None`` (an empty cell, or an argument
  omitted between two commas), :class:`CellError`, and for a range a list of
  equal rows of those;
- out: a single value of those kinds, or a two-dimensional object array of them.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any, Literal, TypeAlias

import numpy.typing as npt

ErrorKind = Literal["VALUE", "NUM", "NA", "DIV0", "REF", "NAME", "NULL"]

ERROR_TEXT: dict[ErrorKind, str] = {
    "VALUE": "#VALUE!",
    "NUM": "#NUM!",
    "NA": "#N/A",
    "DIV0": "#DIV/0!",
    "REF": "#REF!",
    "NAME": "#NAME?",
    "NULL": "#NULL!",
}
ERROR_KIND: dict[str, ErrorKind] = {text: kind for kind, text in ERROR_TEXT.items()}


@dataclass(frozen=True, slots=True)
class CellError:
    """A true error value of a worksheet, with the reason that TB_WHY tells."""

    kind: ErrorKind
    message: str = ""

    def __str__(self) -> str:
        return ERROR_TEXT[self.kind]


Scalar: TypeAlias = float | str | bool | CellError | None
Range: TypeAlias = list[list[Scalar]]
Cell: TypeAlias = Scalar | Range
Grid: TypeAlias = npt.NDArray[Any]


class Refused(Exception):
    """A call that cannot be answered; becomes the cell's error value."""

    def __init__(self, kind: ErrorKind, message: str) -> None:
        super().__init__(message)
        self.error = CellError(kind, message)
