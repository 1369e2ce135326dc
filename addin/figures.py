"""Numbers and tables as a reader wants them on the terminal."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from .cells import CellError


def counted(number: int, noun: str) -> str:
    """``1 cell``, ``2 cells``."""
    return f"{number} {noun}{'s' * (number != 1)}"


def figure(value: object, digits: int = 6) -> str:
    """Write a cell value with a sensible number of significant figures, plainly where that reads well."""
    if value is None:
        return ""
    if isinstance(value, bool):
        return "TRUE" if value else "FALSE"
    if isinstance(value, CellError | str):
        return str(value)
    if isinstance(value, int | float | np.floating):
        number = float(value)
        if number == 0 or 1e-4 <= abs(number) < 1e9:
            decimals = max(0, digits - 1 - int(np.floor(np.log10(abs(number) or 1.0))))
            text = f"{number:.{decimals}f}"
            return (text.rstrip("0").rstrip(".") if "." in text else text) or "0"
        return f"{number:.{digits - 1}e}"
    return str(value)


def table(
    rows: Sequence[Sequence[object]], *, headings: int = 1, digits: int = 5, indent: str = "  "
) -> list[str]:
    """Align a table: texts left, numbers right with one count of decimals for a column."""
    if not rows:
        return []
    columns = [_column([row[j] for row in rows], headings, digits) for j in range(len(rows[0]))]
    lines = [indent + "  ".join(cells).rstrip() for cells in zip(*columns, strict=True)]
    if headings:
        lines.insert(headings, indent + "  ".join("-" * len(c[0]) for c in columns))
    return lines


def _column(cells: Sequence[object], headings: int, digits: int) -> list[str]:
    body = cells[headings:]
    values = [float(c) for c in body if isinstance(c, int | float | np.floating) and not isinstance(c, bool)]
    if values and all(type(c) is int for c in body):
        texts = [str(c) for c in body]
    elif values:
        largest = max(map(abs, values))
        decimals = min(6, max(0, digits - 1 - int(np.floor(np.log10(largest)))) if largest else 0)
        texts = [
            f"{float(c):z.{decimals}f}" if isinstance(c, int | float | np.floating) else figure(c)
            for c in body
        ]
    else:
        texts = [figure(c) for c in body]
    shown = [figure(c) for c in cells[:headings]] + texts
    width = max(map(len, shown))
    return [t.rjust(width) if values else t.ljust(width) for t in shown]
