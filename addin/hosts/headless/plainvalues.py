"""Values of ordinary formulas, worked by the embedded evaluator; no TB_ function takes part."""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence
from functools import lru_cache
from typing import Any

from formualizer import ExcelEvaluationError, RangeAddress, Workbook

from ...cells import Scalar
from ...xlsx.refusals import Refusal
from .each import register_each
from .host import engine_value, scalar

_FORMULA = re.compile(
    rb"<(?P<p>(?:[\w.-]+:)?)f(?=[\s/>])(?:[^>\"']|\"[^\"]*\"|'[^']*')*?(?:/>|>.*?</(?P=p)f\s*>)", re.DOTALL
)


def without_formulas(xml: bytes) -> bytes:
    """A sheet part in which every formula has become its stored value; for evaluation only."""
    return _FORMULA.sub(b"", xml)


def evaluate_sheets(
    book: bytes, extents: Mapping[str, tuple[int, int]]
) -> dict[str, dict[int, list[Scalar]]]:
    """Evaluate a workbook and give the values of some sheets, from A1 to (rows, columns).

    The answer is, for each sheet, row -> values from column 1 on. Raises :class:`Refusal` when
    the evaluator gives up on the workbook.
    """
    workbook = Workbook.from_bytes(book)
    register_each(workbook)
    try:
        workbook.evaluate_all()
    except ExcelEvaluationError as error:
        raise Refusal(f"the workbook cannot be evaluated ({error})") from None
    found = {}
    for name, (rows, cols) in extents.items():
        grid = workbook[name].get_values(RangeAddress(name, 1, 1, rows, cols))
        found[name] = {i: [scalar(value) for value in line] for i, line in enumerate(grid, 1)}
    return found


@lru_cache(maxsize=64)
def _prepared(formulas: tuple[str, ...]) -> Workbook:
    workbook = Workbook()
    workbook.add_sheet("S")
    for row, text in enumerate(formulas, 1):
        workbook.set_formula("S", row, 2, f"={text}")
    return workbook


def evaluate_formulas(formulas: Sequence[str], values: Sequence[Scalar]) -> list[Scalar]:
    """Evaluate formulas that stand in B1, B2, ... over given values in A1, A2, ...

    A formula may refer to any of the values and to any other of the formulas.
    """
    workbook = _prepared(tuple(formulas))
    for row, value in enumerate(values, 1):
        shown: Any = None if value is None else engine_value(value)
        workbook.set_value("S", row, 1, shown)
    workbook.evaluate_all()
    return [scalar(workbook.evaluate_cell("S", row, 2)) for row in range(1, len(formulas) + 1)]


ROW = "\x00"
"""Stands for the number of the row in a formula of :func:`evaluate_rows`."""


def evaluate_rows(given: Sequence[Sequence[Scalar]], formulas: Sequence[str]) -> list[list[Scalar]]:
    """Evaluate the same formulas over many rows of values.

    The values of a row stand in its columns from A on, the formulas in the columns behind
    them; each may refer to the columns before its own, as ``A`` + ``ROW``. The answer is the
    values of the formulas, row by row.
    """
    workbook = Workbook()
    workbook.add_sheet("S")
    sheet = workbook.sheet("S")
    count, width = len(given), len(given[0])
    sheet.set_values_batch(1, 1, count, width, [[engine_value(v) for v in line] for line in given])
    rows = [[f"={text.replace(ROW, str(r))}" for text in formulas] for r in range(1, count + 1)]
    sheet.set_formulas_batch(1, width + 1, count, len(formulas), rows)
    workbook.evaluate_all()
    columns = range(width + 1, width + len(formulas) + 1)
    return [[scalar(workbook.get_value("S", r, c)) for c in columns] for r in range(1, count + 1)]
