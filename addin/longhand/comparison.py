"""The cells that show results: each beside the long-hand value of its whole formula."""

from __future__ import annotations

from collections.abc import Callable
from functools import partial

import numpy as np

from ..cells import Scalar
from ..hosts.headless.formulas import Part
from ..tables import is_blank
from ..xlsx.a1 import to_a1
from .arguments import surveyed
from .block import Block, Check
from .calls import Call, NotWorked, Outcome, Shape, render
from .convert import Conversion
from .expressions import SINGLE, Survey, element, within
from .given import Reader
from .grid import quoted_sheet
from .outcomes import BlockOutcome, RowsOutcome, WordsOutcome, named, written
from .schedule import ScheduleOutcome
from .source import Source, TbCell, plain
from .staged import Staged
from .summary import Entry
from .tableplan import TableOutcome


class Comparison:
    """Puts every cell of the workbook beside its working."""

    def __init__(self, source: Source, staged: Staged, reader: Reader) -> None:
        self._source, self._staged, self._reader = source, staged, reader
        self.loose = Block(None, [], lambda role: Conversion("", 1.0))
        """Formulas that compute with results of more than one working."""

    def add(self, cell: TbCell, entry: Entry) -> None:
        """Plan the comparison of a cell, or of all cells that its formula fills. Raises NotWorked."""
        only = cell.items[0] if len(cell.items) == 1 else None
        if not isinstance(only, Call):
            self._formula(cell, entry)
            return
        outcome = only.outcome
        assert outcome is not None
        entry.formula_of = partial(_repeated, outcome)
        entry.words = _gives_words(outcome)
        for i, j in np.ndindex(cell.shape):
            self._result(outcome, cell, entry, i, j)

    def _result(self, outcome: Outcome, cell: TbCell, entry: Entry, i: int, j: int) -> None:
        """One cell of a formula that is one call: beside its working, or with the loose formulas."""
        assert entry.formula_of is not None
        value = partial(_or_not_available, entry.formula_of, i, j)
        block = outcome.block if isinstance(outcome, BlockOutcome) else self.loose
        result = ""
        twin: Callable[[], tuple[str, str] | None] | None = None
        if _shows(outcome.shape, i, j):
            row, col = within(outcome.shape, i, j)
            if isinstance(outcome, BlockOutcome):
                result = outcome.results[col]
            elif isinstance(outcome, RowsOutcome):
                if self._own_line(outcome, cell, entry, row, col, _ref(cell, i, j)):
                    return
                twin = partial(outcome.beside, row, col)
            elif isinstance(outcome, TableOutcome | ScheduleOutcome):
                if outcome.own(row, col, _ref(cell, i, j)):
                    entry.table = outcome
                    entry.shown.add(outcome.results[col])
                    return
                twin = partial(outcome.beside, row, col)
            if isinstance(outcome, WordsOutcome | TableOutcome | ScheduleOutcome):
                stored = self._stored(cell, i, j)
                shown = "" if is_blank(stored) else stored
                if outcome.text(row, col, shown) == shown:
                    return
        check = self._check(block, cell, entry, i, j, value, result)
        if twin is not None:
            check.twin = twin

    def _stored(self, cell: TbCell, i: int, j: int) -> Scalar:
        return self._source.values(cell.sheet).get((cell.cell.row + i, cell.cell.col + j))

    def _formula(self, cell: TbCell, entry: Entry) -> None:
        """A formula around one call or several."""
        plain(cell.items, self._source, cell.sheet, named)  # whatever cannot be written is found here
        found = surveyed(cell.items, cell.sheet, self._source)
        one = cell.shape == SINGLE
        last = [item for item in cell.items if isinstance(item, Call)][-1].outcome
        block = last.block if isinstance(last, BlockOutcome) and one else self.loose
        array = found.computes and (found.takes_results or cell.cell.kind != "plain")
        if found.elementwise and not array:
            entry.formula_of = self._elements(cell, found)
        elif one and not array and not found.loose and self._gives_one(cell, found):
            entry.formula_of = lambda i, j: render(cell.items, self._operand(cell), written)
        else:
            entry.formula_of = self._staged_formula(cell)
        for i, j in np.ndindex(cell.shape):
            value = partial(_or_not_available, entry.formula_of, i, j)
            self._check(block, cell, entry, i, j, value, "").scale = partial(_largest, cell)

    def _gives_one(self, cell: TbCell, found: Survey) -> bool:
        return not found.takes_results or self._reader.shape(cell) == SINGLE

    def _operand(self, cell: TbCell) -> Callable[[str], str]:
        return lambda text: self._source.operand(text, cell.sheet)

    def _elements(self, cell: TbCell, found: Survey) -> Callable[[int, int], str]:
        """The formula of each cell: every range in it gives the one element that belongs there."""
        shape = found.shape
        own = cell.cell

        def of_range(operand: Part, i: int, j: int) -> str:
            area = self._source.area(operand.text, cell.sheet)
            assert area is not None
            return area.ref(i, j) if own.kind != "plain" else area.meeting(own.row, own.col)

        def formula(i: int, j: int) -> str:
            i, j = _beyond(shape, i, j)
            items = element(found, cell.items, i, j, of_range)
            return render(items, self._operand(cell), written)

        return formula

    def _staged_formula(self, cell: TbCell) -> Callable[[int, int], str]:
        """The formula as an array over as many cells as it gives values."""
        shape = self._reader.shape(cell)
        if shape is None:
            raise NotWorked("how many values the formula gives cannot be evaluated here")
        text = partial(plain, cell.items, self._source, cell.sheet, written)
        area = self._staged.array(cell, f"={cell.cell.text}", shape, text)
        return lambda i, j: area.ref(*_beyond(shape, i, j))

    def _check(
        self, block: Block, cell: TbCell, entry: Entry, i: int, j: int, value: Callable[[], str], result: str
    ) -> Check:
        a1 = to_a1(cell.cell.row + i, cell.cell.col + j)
        check = Check(cell, _ref(cell, i, j), f"{cell.sheet}!{a1}", value)
        stored = self._stored(cell, i, j)
        check.figures = isinstance(stored, str) and any(map(str.isdigit, stored))
        if result:
            check.scale = lambda: block.scale_ref(result)
        block.checks.append(check)
        entry.checks.append((block, check))
        return check

    def _own_line(self, outcome: RowsOutcome, cell: TbCell, entry: Entry, i: int, j: int, ref: str) -> bool:
        """Set a cell beside its line; False where another cell stands there."""
        line, result = outcome.place(i, j)
        chosen = outcome.group.lines[line]
        chosen.target = chosen.target or ref
        if chosen.own.setdefault(result, ref) != ref:
            return False
        entry.rows = outcome
        entry.shown.add(result)
        return True


def _largest(cell: TbCell) -> str:
    """The largest of the results in a formula: a difference of them keeps their rounding."""
    results = [written(item) for item in cell.items if isinstance(item, Call)]
    sizes = ",".join(f"{text},0-MIN({text})" for text in results)
    return f"IFERROR(MAX({sizes}),0)"


def _gives_words(outcome: Outcome) -> bool:
    """Whether a call gives texts that are not worked."""
    if isinstance(outcome, WordsOutcome):
        return outcome.formula is None
    if isinstance(outcome, ScheduleOutcome):
        return "note" in outcome.results
    return isinstance(outcome, TableOutcome) and bool(outcome.constants)


def _ref(cell: TbCell, i: int, j: int) -> str:
    """A cell that a formula fills, as other sheets refer to it."""
    return f"{quoted_sheet(cell.sheet)}!{to_a1(cell.cell.row + i, cell.cell.col + j)}"


def _shows(shape: Shape, i: int, j: int) -> bool:
    """Whether a cell of an array formula shows an element of its result."""
    return (shape[0] == 1 or i < shape[0]) and (shape[1] == 1 or j < shape[1])


def _beyond(shape: Shape, i: int, j: int) -> Shape:
    """The element that a cell of an array formula shows. Raises NotWorked where it shows none.

    One row or column of values fills all cells; beyond the result there is nothing.
    """
    if not _shows(shape, i, j):
        raise NotWorked("the array formula covers more cells than its result has")
    return within(shape, i, j)


def _repeated(outcome: Outcome, i: int, j: int) -> str:
    return outcome.at(*_beyond(outcome.shape, i, j))


def _or_not_available(formula_of: Callable[[int, int], str], i: int, j: int) -> str:
    try:
        return formula_of(i, j)
    except NotWorked:
        return "NA()"
