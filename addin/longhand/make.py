"""Making the copy with checking sheets: planned, evaluated, put into the package."""

from __future__ import annotations

import contextlib
import gc
from collections.abc import Callable, Iterator
from pathlib import Path

from ..cells import Scalar
from ..hosts.headless.contexts import Operand, in_context
from ..hosts.headless.formulas import Unreadable, join, take_apart
from ..hosts.headless.names import Names
from ..hosts.headless.plainvalues import evaluate_sheets, without_formulas
from ..progress import Progress
from ..xlsx.package import Package
from ..xlsx.refusals import Refusal
from .book import Book
from .grid import Formula
from .parts import Addition, Parts
from .source import Source
from .summary import Entry

_SEVERAL = ":{["
"""Signs without which a formula has neither ranges nor arrays, and nothing of other workbooks."""


@contextlib.contextmanager
def collection_paused() -> Iterator[None]:
    """Millions of cells come into being and all stay: looking for garbage among them takes half the time."""
    was = gc.isenabled()
    gc.disable()
    try:
        yield
    finally:
        if was:
            gc.enable()


def for_the_evaluator(package: Package) -> Callable[[Formula], str]:
    """Formulas as the embedded evaluator gets them right; for evaluation only.

    They are given the values that the file keeps of other workbooks, and a range or an array
    where a single value is meant as a spreadsheet takes it.
    """
    names = Names((), package.externals)

    def text_of(formula: Formula) -> str:
        text = formula.text
        if not any(sign in text for sign in _SEVERAL):
            return text
        parts = names.written_out(take_apart(text), "", 1, 1)
        with contextlib.suppress(Unreadable):
            parts = in_context(parts, bool(formula.ref), lambda name: Operand.UNKNOWN)
        return join(parts)

    return text_of


def evaluated(
    package: Package, addition: Addition, text_of: Callable[[Formula], str]
) -> dict[str, dict[int, list[Scalar]]]:
    """The values of new sheets, by sheet and row, over the stored values of the workbook."""
    still = {sheet.part: without_formulas(package.part(sheet.part)) for sheet in package.sheets}
    parts = addition.parts(None, text_of)
    extents = {sheet.name: (sheet.last_row, sheet.last_col) for sheet in addition.sheets}
    return evaluate_sheets(package.to_bytes({**parts.replaced, **still}, parts.added), extents)


class Made:
    """Checking sheets for a workbook, with their values."""

    def __init__(self, package: Package, progress: Progress | None = None) -> None:
        self.package = package
        source = Source(package, progress)
        missing = source.without_value()
        if missing is not None:
            raise Refusal(
                f"{missing} is a TB_ formula, or is read by one, and holds no value. Run thrustbook evaluate "
                "--fill first, or save the workbook in the spreadsheet program."
            )
        with collection_paused():
            self.book = Book(source, progress)
        self.addition = Addition(package, self.book.sheets)
        if progress is not None:
            progress("evaluate", 0, 1)
        self.text_of = for_the_evaluator(package)
        """Formulas as the embedded evaluator gets them right."""
        with collection_paused():
            self.values = evaluated(package, self.addition, self.text_of)
        if progress is not None:
            progress("evaluate", 1, 1)

    def parts(self) -> Parts:
        """The parts of the copy."""
        return self.addition.parts(self.values)

    def verdicts(self) -> dict[str, list[Entry]]:
        """The TB_ cells by verdict."""
        front = self.book.summary.sheet.name
        return self.book.summary.verdicts(self.book.entries, self.values[front])

    def save(self, target: Path) -> None:
        """Write the copy."""
        parts = self.parts()
        self.package.save(target, parts.replaced, parts.added)
