"""A copy of a workbook in which every TB_ cell refers to its long-hand result."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path
from typing import NamedTuple

from lxml import etree

from ..cells import CellError, Scalar
from ..hosts.headless.elsewhere import elsewhere
from ..hosts.headless.plainvalues import evaluate_sheets, without_formulas
from ..progress import Progress
from ..xlsx.opc import MAIN, parse
from ..xlsx.package import Package
from ..xlsx.sheetxml import set_formulas, store
from .calls import NotWorked
from .detachtext import constant
from .grid import Formula
from .make import Made
from .summary import Entry

Place = tuple[int, int]
_BEHIND_CALCULATION = (
    "oleSize",
    "customWorkbookViews",
    "pivotCaches",
    "smartTagPr",
    "smartTagTypes",
    "webPublishing",
    "fileRecoveryPr",
    "webPublishObjects",
    "extLst",
)


class Frozen(NamedTuple):
    """A cell whose value stands as a constant, and why."""

    where: str
    reason: str


class Detached:
    """The detached copy of a workbook."""

    def __init__(self, package: Package, progress: Progress | None = None) -> None:
        self.package = package
        self.made = Made(package, progress)
        self.frozen: list[Frozen] = []
        self.cells = 0
        self._formulas: dict[str, dict[Place, str]] = {}
        names = self.made.book.source.names
        self.outside = [
            f"{sheet.name}!{where.split()[0]}  {formula}"
            for sheet in package.sheets
            for where, formula in elsewhere(package.part(sheet.part), names, sheet.name)
        ]
        """Conditional formats and validations that call the functions still."""
        for entry in self.made.book.entries:
            for place, formula in self._of_entry(entry):
                self._formulas.setdefault(entry.cell.sheet, {})[place] = formula
                self.cells += 1

    def _of_entry(self, entry: Entry) -> Iterator[tuple[Place, str]]:
        cell = entry.cell.cell
        r1, c1, r2, c2 = cell.ref if cell.ref is not None else (cell.row, cell.col) * 2
        if entry.trouble or entry.formula_of is None:
            self.frozen.append(Frozen(entry.cell.where, entry.trouble))
        elif entry.words:
            self.frozen.append(Frozen(entry.cell.where, "it is a text"))
        for row in range(r1, r2 + 1):
            for col in range(c1, c2 + 1):
                yield (row, col), self._formula(entry, row - cell.row, col - cell.col)

    def _formula(self, entry: Entry, i: int, j: int) -> str:
        if entry.formula_of is not None and not entry.trouble:
            try:
                return entry.formula_of(i, j)
            except (IndexError, NotWorked):
                return "NA()"  # an array formula larger than its result
        place = entry.cell.cell.row + i, entry.cell.cell.col + j
        return constant(self.made.book.source.values(entry.cell.sheet).get(place))

    def save(self, target: Path) -> None:
        """Write the copy."""
        parts = self.made.parts()
        replaced = dict(parts.replaced)
        sheets = {sheet.name: sheet.part for sheet in self.package.sheets}
        for name, formulas in self._formulas.items():
            xml = self.package.part(sheets[name])
            replaced[sheets[name]] = set_formulas(xml, formulas, formulas.keys())
        workbook = self.package.workbook_part
        replaced[workbook] = _recalculating(replaced[workbook], workbook, self.package.path.name)
        self._store_values(replaced, parts.added, sheets)
        self.package.save(target, replaced, parts.added)

    def _store_values(
        self, replaced: dict[str, bytes], added: dict[str, bytes], sheets: dict[str, str]
    ) -> None:
        """Give the changed cells the values of their new formulas; those of the checking sheets are known."""
        extents = {
            name: (max(r for r, _ in places), max(c for _, c in places))
            for name, places in self._formulas.items()
        }
        if not extents:
            return
        text_of = self.made.text_of
        evaluated = dict(replaced)
        for name, formulas in self._formulas.items():
            texts = {place: text_of(Formula(text)) for place, text in formulas.items()}
            evaluated[sheets[name]] = set_formulas(self.package.part(sheets[name]), texts, texts.keys())
        known = {part: without_formulas(xml) for part, xml in added.items()}
        values = evaluate_sheets(self.package.to_bytes(evaluated, known), extents)
        for name, places in self._formulas.items():
            before = self.made.book.source.values(name)
            new: dict[Place, Scalar] = {}
            for row, col in places:
                value = values[name][row][col - 1]
                old = before.get((row, col))
                # The evaluator does not know every function of a spreadsheet.
                unknown = isinstance(value, CellError) and not isinstance(old, CellError)
                new[row, col] = old if unknown or value is None else value
            replaced[sheets[name]] = store(replaced[sheets[name]], new)


def _recalculating(content: bytes, part: str, label: str) -> bytes:
    """The workbook part with the mark that everything is to be computed when it is opened."""
    root = parse(content, part, label)
    node = root.find(f"{{{MAIN}}}calcPr")
    if node is None:
        node = etree.Element(f"{{{MAIN}}}calcPr")
        behind = {f"{{{MAIN}}}{name}" for name in _BEHIND_CALCULATION}
        at = next((i for i, child in enumerate(root) if child.tag in behind), len(root))
        root.insert(at, node)
    node.set("fullCalcOnLoad", "1")
    return etree.tostring(root, xml_declaration=True, encoding="UTF-8", standalone=True)
