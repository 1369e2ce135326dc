"""Formulas seen as arrays: what their text alone tells of the values that they give."""

from __future__ import annotations

from collections.abc import Callable, Iterable
from dataclasses import dataclass
from typing import Final

import numpy as np

from ..hosts.headless.formulas import CLOSES, OPENS, Kind, Part, function_name
from ..hosts.headless.singlevalues import ALL_SINGLE, BY_ITSELF, REDUCES, REDUCES_ARRAYS, words
from .calls import Call, Items, NotWorked, Shape

SINGLE: Final = (1, 1)

# Functions of single values: given a range they work element by element.
_ELEMENTWISE: Final = ALL_SINGLE | BY_ITSELF | {"PI"}
# Functions that make one value of whatever they are given.
_REDUCING: Final = REDUCES | REDUCES_ARRAYS
# Of both, those that surely give numbers; of the others the evaluator tells.
_NUMERIC: Final = words(
    """
    ABS ACOS ASIN ATAN ATAN2 AVERAGE CEILING COLUMNS COS COSH COUNT COUNTA COUNTBLANK DEGREES EVEN EXP
    FACT FLOOR INT LN LOG LOG10 MAX MEDIAN MIN MOD ODD PI POWER PRODUCT RADIANS ROUND ROUNDDOWN ROUNDUP
    ROWS SIGN SIN SINH SQRT STDEV STDEV.P STDEV.S SUM SUMPRODUCT SUMSQ TAN TANH TRUNC VAR VAR.P VAR.S
    """
)
_OF_NUMBERS: Final = frozenset("+-*/^%")
_OF_CELLS: Final = frozenset((":", " ", ","))
"""From one cell to another, what two ranges share, both of them."""
_GIVES_CELLS: Final = frozenset(("CHOOSE", "IF", "IFERROR", "IFNA", "INDEX", "INDIRECT", "OFFSET"))
"""Functions that may hand on a cell as it is, an empty one included."""


@dataclass(slots=True, frozen=True)
class Survey:
    """What the text of an expression tells of its result.

    ``loose`` are the items with several values that stand outside every function that
    takes ranges whole: number of the item -> rows and columns. ``elementwise`` says that
    each element of the result comes from the same element of those. ``number`` says that
    the result can be nothing but numbers. ``takes_results`` says that a function that takes
    ranges whole is given several results of ours, ``computes`` that it is given an array
    that is computed first: not every spreadsheet does so outside an array formula.
    """

    loose: dict[int, Shape]
    elementwise: bool
    number: bool
    takes_results: bool
    computes: bool

    @property
    def shape(self) -> Shape:
        """Rows and columns of the result of an elementwise expression. Raises NotWorked."""
        return broadcast(self.loose.values())


def broadcast(shapes: Iterable[Shape]) -> Shape:
    """The rows and columns of ranges that are computed element by element. Raises NotWorked."""
    try:
        rows, cols = np.broadcast_shapes(SINGLE, *shapes)
    except ValueError:
        raise NotWorked("the ranges do not fit together") from None
    return rows, cols


def survey(items: Items, shape_of: Callable[[Part], Shape | None]) -> Survey:
    """Look through an expression.

    ``shape_of`` gives rows and columns of an operand, None for one that is no plain reference.
    """
    loose: dict[int, Shape] = {}
    elementwise = number = True
    takes_results = several = computes = False
    whole = 0  # open brackets inside the outermost function that takes ranges whole
    for i, item in enumerate(items):
        if isinstance(item, Call):
            shape = outcome_shape(item)
            if shape != SINGLE and whole:
                takes_results = several = True
            elif shape != SINGLE:
                loose[i] = shape
            continue
        if whole:
            whole += (item.kind in OPENS) - (item.kind in CLOSES)
            computes = computes or item.kind is Kind.OPERATOR
            if item.kind is Kind.OPEN and function_name(item.text) in _ELEMENTWISE:
                computes = True
            several = several or item.kind is Kind.ARRAY_OPEN
            if item.kind is Kind.REFERENCE and not several:
                several = shape_of(item) not in (None, SINGLE)
            continue
        if item.kind is Kind.OPEN:
            name = function_name(item.text)
            number = number and name in _NUMERIC
            if name not in _ELEMENTWISE:
                whole = 1
                elementwise = elementwise and name in _REDUCING
        elif item.kind is Kind.ARRAY_OPEN:
            whole, elementwise = 1, False
        elif item.kind is Kind.REFERENCE:
            of = shape_of(item)
            if of is None:
                elementwise = number = False
            elif of != SINGLE:
                loose[i] = of
        elif item.kind is Kind.OPERATOR:
            number = number and item.text in _OF_NUMBERS
            elementwise = elementwise and item.text not in _OF_CELLS
        elif item.kind is Kind.LITERAL:
            number = number and item.text[:1] in "0123456789."
    return Survey(loose, elementwise, number, takes_results, computes and several)


def element(survey_: Survey, items: Items, i: int, j: int, cell: Callable[[Part, int, int], str]) -> Items:
    """The items for one element; ``cell(range, row, column)`` writes that element of a range."""

    def written(item: Part | Call, i: int, j: int) -> str:
        if not isinstance(item, Call):
            return cell(item, i, j)
        assert item.outcome is not None
        return item.outcome.at(i, j)

    return [
        Part(written(item, *within(survey_.loose[n], i, j)), Kind.LITERAL) if n in survey_.loose else item
        for n, item in enumerate(items)
    ]


def within(shape: Shape, i: int, j: int) -> Shape:
    """The place that serves (i, j) in something of which a single row or column stands for all."""
    return (i if shape[0] > 1 else 0), (j if shape[1] > 1 else 0)


def hands_on_cells(items: Items) -> bool:
    """Whether an expression may give a cell as it is."""
    first = items[0]
    if spans(items) or not isinstance(first, Part):
        return spans(items)
    return first.kind is Kind.OPEN and function_name(first.text) in _GIVES_CELLS


def spans(items: Items) -> bool:
    """Whether an expression refers to cells by an operator, as from one cell to another."""
    return any(isinstance(i, Part) and i.kind is Kind.OPERATOR and i.text in _OF_CELLS for i in items)


def outcome_shape(item: Call) -> Shape:
    """Rows and columns of what a call gives."""
    return SINGLE if item.outcome is None else item.outcome.shape
