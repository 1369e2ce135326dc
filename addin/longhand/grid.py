"""A checking sheet while it is being laid out: cells, widths, breaks, links."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import NamedTuple, TypeAlias

from ..xlsx.a1 import column_letters


class Formula(NamedTuple):
    """The text of a formula, without its equals sign; with ``ref`` it is an array formula for those cells."""

    text: str
    ref: str = ""


def as_written(formula: Formula) -> str:
    """The text of a formula as it stands."""
    return formula.text


FILLED = Formula("")
"""A cell that the array formula in another one fills."""


Content: TypeAlias = float | str | Formula


class Link(NamedTuple):
    """A hyperlink inside the workbook."""

    row: int
    col: int
    target: str


WRAPPED = frozenset(("wrapped", "mono", "resulttext"))
"""Styles whose text runs over several lines."""


@dataclass(slots=True)
class Sheet:
    """Cells by row and column, both counted from 1; a style is a name of ``styles.py``."""

    name: str
    cells: dict[int, dict[int, tuple[Content, str]]] = field(default_factory=dict)
    widths: dict[int, float] = field(default_factory=dict)
    heights: dict[int, float] = field(default_factory=dict)
    links: list[Link] = field(default_factory=list)
    row_breaks: list[int] = field(default_factory=list)
    column_breaks: list[int] = field(default_factory=list)
    title_rows: tuple[int, int] | None = None
    title_columns: tuple[int, int] | None = None
    print_areas: list[tuple[int, int, int, int]] = field(default_factory=list)
    """Parts printed on pages of their own: first row and column, last row and column; none: all."""
    fit_width: bool = True
    merges: list[tuple[int, int, int]] = field(default_factory=list)
    """Cells of a row that are one: row, first and last column."""
    verdicts: list[str] = field(default_factory=list)
    """Areas whose words "agrees" and "differs" are coloured."""
    footer: str = "Long-hand working"
    freeze: tuple[int, int] | None = None
    """Rows and columns that stay when the sheet is scrolled."""

    def put(self, row: int, col: int, content: Content, style: str = "text") -> None:
        self.cells.setdefault(row, {})[col] = (content, style)

    def line(self, row: int, contents: list[Content], style: str = "text", col: int = 1) -> None:
        """Put several contents side by side."""
        cells = self.cells.setdefault(row, {})
        for i, content in enumerate(contents):
            cells[col + i] = (content, style)

    def fill(self, row: int, first: int, last: int, style: str) -> None:
        """Give empty cells a style."""
        cells = self.cells.setdefault(row, {})
        empty: tuple[Content, str] = ("", style)
        for col in range(first, last + 1):
            cells[col] = empty

    def spread(self, row: int, first: int, last: int, content: str, style: str) -> None:
        """Put a text over several columns."""
        self.put(row, first, content, style)
        for col in range(first + 1, last + 1):
            self.put(row, col, "", style)
        self.merges.append((row, first, last))
        width = sum(self.widths.get(col, 13.0) for col in range(first, last + 1))
        lines = -(-len(content) // int(width * (1.0 if style == "mono" else 1.1)))
        if lines > 1:
            self.heights[row] = max(self.heights.get(row, 0.0), 13.0 * lines + 2)

    def fit_height(self, row: int) -> None:
        """Make a row as tall as its wrapped texts need; not every spreadsheet does so by itself."""
        lines = max(
            (
                _lines(content, self.widths.get(col, 9.0) * (1.0 if style == "mono" else 1.1))
                for col, (content, style) in self.cells[row].items()
                if isinstance(content, str) and style in WRAPPED
            ),
            default=1,
        )
        if lines > 1:
            self.heights[row] = 13.0 * lines + 2

    def ref(self, row: int, col: int) -> str:
        """The absolute reference to a cell from another sheet."""
        return f"{quoted_sheet(self.name)}!{fixed(row, col)}"

    @property
    def last_row(self) -> int:
        return max(self.cells, default=0)

    @property
    def last_col(self) -> int:
        return max((max(cells, default=0) for cells in self.cells.values()), default=0)


def _lines(text: str, width: float) -> int:
    """Lines that a text takes in a cell of so many characters: words go to a new line whole, then are cut."""
    most = max(1, int(width))
    if len(text) <= most:
        return 1
    lines, used = 1, 0
    for word in text.split(" "):
        if used and used + 1 + len(word) <= most:
            used += 1 + len(word)
            continue
        lines += (used > 0) + max(0, len(word) - 1) // most
        used = max(0, len(word) - 1) % most + 1
    return lines


def quoted_sheet(name: str) -> str:
    """The name of a sheet as a formula writes it in front of a reference."""
    return "'" + name.replace("'", "''") + "'"


def fixed(row: int, col: int) -> str:
    """``$B$3``."""
    return f"${column_letters(col)}${row}"


def local(row: int, col: int) -> str:
    """``B3``."""
    return f"{column_letters(col)}{row}"
