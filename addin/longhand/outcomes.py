"""What a TB_ call becomes on the checking sheets, and how a formula refers to it."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field

from ..hosts.headless.formulas import literal
from .block import Block
from .calls import Call, NotWorked, Outcome, Shape
from .rows import Group, RowSheet
from .symbols import quoted


def written(call: Call) -> str:
    """How a formula writes what a call gives."""
    outcome = call.outcome
    if outcome is None:
        raise NotWorked(f"{call.name} has no long-hand result")
    if outcome.shape == (1, 1):
        return outcome.at(0, 0)
    return call.range or outcome.range_text()


def named(call: Call) -> str:
    """A name for what a call gives, while nothing has its place."""
    outcome: Outcome | None = call.outcome
    if outcome is None:
        raise NotWorked(f"{call.name} has no long-hand result")
    return f"#{id(outcome)}"


@dataclass(slots=True, eq=False)
class Guard:
    """The cell that names the wanted result: the working stands only while it says the same."""

    ref: str
    word: str

    def around(self, text: str) -> str:
        return f"IF(LOWER(TRIM({self.ref}))={quoted(self.word.strip().lower())},{text},NA())"


@dataclass(slots=True, eq=False)
class BlockOutcome:
    """Results of a call with single values."""

    block: Block
    results: tuple[str, ...]
    guard: Guard | None = None

    @property
    def shape(self) -> Shape:
        return 1, len(self.results)

    def at(self, i: int, j: int) -> str:
        text = self.block.result_ref(self.results[j])
        return text if self.guard is None else self.guard.around(text)

    @property
    def one_range(self) -> bool:
        return False

    def range_text(self) -> str:
        raise NotWorked("the formula computes with a whole row of results")


@dataclass(slots=True, eq=False)
class RowsOutcome:
    """Results of a call with ranges: one element a line of a group."""

    shape: Shape
    results: tuple[str, ...]
    single: bool
    elements: Shape
    group: Group
    guard: Guard | None = None
    rows: RowSheet | None = None
    number: int = 0
    """Of the group on its sheet."""

    def place(self, i: int, j: int) -> tuple[int, str]:
        """Line and result of an element of the answer."""
        if self.single:
            return i * self.elements[1] + j, self.results[0]
        return (i, self.results[j]) if self.elements[1] == 1 else (j, self.results[i])

    def at(self, i: int, j: int) -> str:
        line, result = self.place(i, j)
        assert self.rows is not None
        text = self.rows.sheet.ref(*self.rows.places[self.number][line][result])
        return text if self.guard is None else self.guard.around(text)

    def beside(self, i: int, j: int) -> tuple[str, str]:
        """The cell that stands beside the working of an element, and the verdict on it."""
        line, result = self.place(i, j)
        return self.at_line(line, result)

    def at_line(self, line: int, result: str) -> tuple[str, str]:
        """The same for a line of the group."""
        assert self.rows is not None
        row, col = self.rows.places[self.number][line][result]
        return self.group.lines[line].own[result], self.rows.sheet.ref(row, col + 3)

    @property
    def one_range(self) -> bool:
        return self.single and self.elements[1] == 1 and self.guard is None

    def range_text(self) -> str:
        first = self.at(0, 0)
        return f"{first}:{self.at(self.elements[0] - 1, 0).rpartition('!')[2]}"


@dataclass(slots=True, eq=False)
class WordsOutcome:
    """Headings and other answers that are not computed: they stand as constants."""

    grid: list[list[object]]
    formula: Callable[[int, int], str] | None = None
    """For values that can be worked after all."""
    shape: Shape = field(init=False)

    def __post_init__(self) -> None:
        self.shape = len(self.grid), len(self.grid[0])

    def at(self, i: int, j: int) -> str:
        if self.formula is not None:
            return self.formula(i, j)
        return literal(self.grid[i][j])  # type: ignore[arg-type]

    def text(self, i: int, j: int, stored: object) -> object:
        """The text that the cell of an element shows; None where it is worked."""
        return self.grid[i][j] if self.formula is None else None

    @property
    def one_range(self) -> bool:
        return False

    def range_text(self) -> str:
        raise NotWorked("the formula computes with a row of headings")
