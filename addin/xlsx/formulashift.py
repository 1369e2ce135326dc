"""A shared formula as it reads in another cell of its group."""

from __future__ import annotations

import re

from .a1 import MAX_COLUMN, MAX_ROW, column_letters, column_number

# Order matters: what must not be taken for a reference comes before the references.
_TOKEN = re.compile(
    r"""
      (?P<text>"(?:[^"]|"")*")                                      # a string
    | (?P<quoted>'(?:[^']|'')*')                                    # a quoted sheet name
    | (?P<bracket>\[(?:[^\[\]']|'.|\[(?:[^\[\]']|'.)*\])*\])        # a table part, or a workbook's number
    | (?P<error>\#(?:REF!|DIV/0!|VALUE!|NAME\?|NUM!|N/A|NULL!|[A-Z_]+[!?]))
    | (?P<sheet>[^\W\d][\w.\\?]*(?::[\w.\\?]+)?!)                   # Sheet1! or Jan:Mar!
    | (?P<rows>(?P<r1>\$?[0-9]{1,7}):(?P<r2>\$?[0-9]{1,7})(?![\w.]))
    | (?P<cols>(?P<c1>\$?[A-Za-z]{1,3}):(?P<c2>\$?[A-Za-z]{1,3})(?![\w.(!\[\\?]))
    | (?P<cell>(?P<col>\$?[A-Za-z]{1,3})(?P<row>\$?[1-9][0-9]{0,6})(?![\w.(!\[\\?]))
    | (?P<number>[0-9]+\.?[0-9]*(?:[eE][+-]?[0-9]+)?|\.[0-9]+(?:[eE][+-]?[0-9]+)?)
    | (?P<word>[^\W\d][\w.\\?]*|\\[\w.\\?]*)                        # a function or a name
    | (?P<other>.)
    """,
    re.VERBOSE | re.DOTALL,
)


_Axis = tuple[bool, int]  # held by a $, number
_Reference = tuple[str, _Axis, _Axis]  # cell: row, column; rows and cols: first, last


def _axis(text: str, is_column: bool) -> _Axis:
    plain = text.lstrip("$")
    return plain != text, column_number(plain) if is_column else int(plain)


def _reference(match: re.Match[str]) -> _Reference | None:
    """A word of the right shape beyond the last column or row is a name, not a cell."""
    try:
        if match["cell"]:
            row, col = _axis(match["row"], False), _axis(match["col"], True)
            return ("cell", row, col) if row[1] <= MAX_ROW else None
        if match["cols"]:
            return "cols", _axis(match["c1"], True), _axis(match["c2"], True)
        if match["rows"]:
            first, last = _axis(match["r1"], False), _axis(match["r2"], False)
            return ("rows", first, last) if 1 <= first[1] <= MAX_ROW and 1 <= last[1] <= MAX_ROW else None
    except ValueError:
        pass
    return None


def _moved(axis: _Axis, by: int, last: int, around: bool) -> int:
    """The number moved, 0 where it leaves the sheet."""
    held, number = axis
    number += 0 if held else by
    if around:
        return (number - 1) % last + 1
    return number if 1 <= number <= last else 0


def _row(axis: _Axis, by: int, around: bool) -> str:
    number = _moved(axis, by, MAX_ROW, around)
    return f"{'$' if axis[0] else ''}{number}" if number else ""


def _col(axis: _Axis, by: int, around: bool) -> str:
    number = _moved(axis, by, MAX_COLUMN, around)
    return ("$" if axis[0] else "") + column_letters(number) if number else ""


class MovableFormula:
    """A formula taken apart once, to be read in many cells.

    ``text`` has no leading equals sign; (row, col) is the cell it was written for.
    """

    def __init__(self, text: str, row: int, col: int) -> None:
        self._text, self._row, self._col = text, row, col
        self._pieces: list[str | _Reference] = []
        start = 0
        for match in _TOKEN.finditer(text):
            reference = _reference(match)
            if reference is not None:
                self._pieces += [text[start : match.start()], reference]
                start = match.end()
        self._pieces.append(text[start:])

    def at(self, row: int, col: int, around: bool = False) -> str:
        """The formula in another cell; ``$`` parts, strings, names and table parts stay.

        A reference that leaves the sheet becomes ``#REF!``, as a spreadsheet writes it; in a
        defined name it goes ``around`` and comes in at the other edge.
        """
        rows, cols = row - self._row, col - self._col
        if rows == 0 and cols == 0:
            return self._text
        out = []
        for piece in self._pieces:
            if isinstance(piece, str):
                out.append(piece)
                continue
            kind, one, two = piece
            if kind == "cell":
                number, letters = _row(one, rows, around), _col(two, cols, around)
                out.append(letters + number if letters and number else "#REF!")
            else:
                shift, by = (_col, cols) if kind == "cols" else (_row, rows)
                first, last = shift(one, by, around), shift(two, by, around)
                out.append(f"{first}:{last}" if first and last else "#REF!")
        return "".join(out)
