"""Cell references: ``B3`` to and from (row, column), both counted from 1."""

from __future__ import annotations

import re
from functools import lru_cache

MAX_ROW = 1_048_576
MAX_COLUMN = 16_384

_CELL = re.compile(r"\$?([A-Za-z]{1,3})\$?([0-9]{1,7})")


@lru_cache(maxsize=MAX_COLUMN)
def column_letters(col: int) -> str:
    """Letters of a column: 1 is A, 16384 is XFD. Raises ValueError outside the sheet."""
    if not 1 <= col <= MAX_COLUMN:
        raise ValueError(f"column {col} is outside the sheet (1 to {MAX_COLUMN})")
    letters = ""
    while col:
        col, rest = divmod(col - 1, 26)
        letters = chr(65 + rest) + letters
    return letters


@lru_cache(maxsize=MAX_COLUMN)
def column_number(letters: str) -> int:
    """Number of a column: A is 1, XFD is 16384. Raises ValueError for anything else."""
    number = 0
    for letter in letters.upper():
        if not "A" <= letter <= "Z":
            raise ValueError(f"{letters!r} is not a column")
        number = number * 26 + ord(letter) - 64
    if not 1 <= number <= MAX_COLUMN:
        raise ValueError(f"{letters!r} is not a column (A to XFD)")
    return number


def to_a1(row: int, col: int, absolute: bool = False) -> str:
    """``B3`` for (3, 2), or ``$B$3``. Raises ValueError outside the sheet."""
    if not 1 <= row <= MAX_ROW:
        raise ValueError(f"row {row} is outside the sheet (1 to {MAX_ROW})")
    mark = "$" if absolute else ""
    return f"{mark}{column_letters(col)}{mark}{row}"


def from_a1(text: str) -> tuple[int, int]:
    """(3, 2) for ``B3``, ``$B$3`` or ``b3``. Raises ValueError for anything else."""
    match = _CELL.fullmatch(text)
    if match is None or not 1 <= int(match[2]) <= MAX_ROW:
        raise ValueError(f"{text!r} is not a cell reference")
    return int(match[2]), column_number(match[1])


def range_from_a1(text: str) -> tuple[int, int, int, int]:
    """(r1, c1, r2, c2) of ``A1:B3``, ``A1``, ``A:C`` or ``1:3``, upper left corner first."""
    first, colon, last = text.replace("$", "").partition(":")
    last = last if colon else first
    if colon and first.isdigit() and last.isdigit():
        r1, c1, r2, c2 = int(first), 1, int(last), MAX_COLUMN
        if not (1 <= r1 <= MAX_ROW and 1 <= r2 <= MAX_ROW):
            raise ValueError(f"{text!r} is not a range")
    elif colon and first.isalpha() and last.isalpha():
        r1, c1, r2, c2 = 1, column_number(first), MAX_ROW, column_number(last)
    else:
        (r1, c1), (r2, c2) = from_a1(first), from_a1(last)
    return min(r1, r2), min(c1, c2), max(r1, r2), max(c1, c2)
