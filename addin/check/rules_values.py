"""Values: what the file holds against what the formulas give."""

from __future__ import annotations

import math
from collections.abc import Iterator

from .. import dispatch
from ..cells import CellError, Scalar
from ..figures import figure
from ..hosts.headless.elsewhere import elsewhere
from ..hosts.headless.model import Node
from ..hosts.headless.reasons import reason
from ..units import ROLES
from .book import Book
from .calls import Call
from .gather import Remark, figures, joined
from .types import Finding, Rule, Severity

RELATIVE = 1e-9
"""Difference between stored and recomputed value that is accepted, as a fraction of the value."""
OF_LARGEST = 1e-12
"""The same as a fraction of the largest number in the same result: rounding of what should be zero."""
_FOLLOWS = "no result: "
"""How the message of a row begins that has no result because of another row."""
_COVERS = ("IFERROR(", "IFNA(", "ISERR", "ISNUMBER(", "ISNA(", "AGGREGATE(", "COUNT(")
"""Functions by which a formula can go on after an error."""
_VOLATILE = frozenset(("NOW", "TODAY", "RAND", "RANDBETWEEN", "RANDARRAY"))


def _cells(book: Book) -> Iterator[tuple[Node, int, int, Scalar, Scalar, float]]:
    """Each cell of each computed formula: stored value, new value, largest number of its result."""
    for index, new in book.results.values.items():
        node = book.model.nodes[index]
        cell, grid = node.cell, book.results.grids.get(index)
        if grid is None:
            yield node, cell.row, cell.col, cell.value, new, abs(new) if isinstance(new, float) else 0.0
            continue
        columns = [[v for v in column if isinstance(v, float)] for column in grid.T.tolist()]
        largest = [max(map(abs, column), default=0.0) for column in columns]
        stored = book.stored[node.sheet]
        for row, line in enumerate(grid.tolist(), cell.row):
            for j, item in enumerate(line):
                col = cell.col + j
                yield node, row, col, stored.get((row, col)), item, largest[j]


def agree(old: Scalar, new: Scalar, largest: float) -> bool:
    """Whether a stored value is the recomputed one, within the tolerance."""
    if isinstance(old, CellError) and isinstance(new, CellError):
        return old.kind == new.kind
    if isinstance(old, bool) or isinstance(new, bool):
        return old is new
    if isinstance(old, float) and isinstance(new, float):
        size = max(abs(old), abs(new))
        return abs(old - new) <= RELATIVE * size + OF_LARGEST * max(largest, 1e-3)
    return old == new


def _volatile(book: Book) -> set[int]:
    """Formulas that change by themselves, and all that depend on them."""
    seeds = [n.index for n in book.model.nodes if any(f"{w}(" in n.cell.text.upper() for w in _VOLATILE)]
    return book.model.graph().dependents(seeds) if seeds else set()


def stale(book: Book) -> Iterator[Finding]:
    """V01: the value in the file is not what the formula gives."""
    skip = _volatile(book) | book.circular[1]
    remarks: dict[Severity, list[Remark]] = {Severity.ERROR: [], Severity.WARNING: []}
    for node, row, col, old, new, largest in _cells(book):
        if node.index in skip or old is None or agree(old, new, largest):
            continue
        severity = Severity.ERROR if node.index in book.related else Severity.WARNING
        apart = _apart(old, new)
        remarks[severity].append(
            Remark(
                sheet=book.sheet(node.sheet),
                row=row,
                col=col,
                kind=book.signatures[node.index],
                what=f"the file holds {figure(old, 9)}, the formula gives {figure(new, 9)}{apart}",
                why="The value was not recalculated after a change, or was edited in the file "
                f"(accepted: {RELATIVE:g} of the value).",
                basis=f"{figures(old)} {figures(new)}",
            )
        )
    for severity, found in remarks.items():
        yield from joined("V01", severity, found)


def _apart(old: Scalar, new: Scalar) -> str:
    if isinstance(old, float) and isinstance(new, float) and new:
        share = abs(old - new) / abs(new)
        return f" (a difference of {share:.2g} of it)" if math.isfinite(share) else ""
    return ""


def missing(book: Book) -> Iterator[Finding]:
    """V02: a TB_ cell, or one that depends on one, holds no value in the file."""
    remarks = []
    for node, row, col, old, new, _ in _cells(book):
        if old is None and new != "" and node.index in book.affected and node.index not in book.circular[1]:
            remarks.append(
                Remark(
                    book.sheet(node.sheet),
                    row,
                    col,
                    "",
                    f"the file holds no value, the formula gives {figure(new, 9)}",
                    "Whoever opens the file without the add-in sees nothing here; "
                    "thrustbook evaluate stores the values.",
                    figures(new),
                )
            )
    yield from joined("V02", Severity.WARNING, remarks)


def errors(book: Book) -> Iterator[Finding]:
    """V03: a TB_ cell, or one that depends on one, is an error; only where the error begins."""
    wrong = {
        index
        for index in book.affected - book.settlement.kept.keys() - book.circular[1] - book.unclosed.keys()
        if isinstance(book.results.values.get(index), CellError) or _error_rows(book, index)
    }
    remarks = []
    elsewhere_wrong = wrong | book.unclosed.keys()
    for index in sorted(wrong):
        node = book.model.nodes[index]
        sources = {n.index for ref in node.references for n in book.formulas_in(ref)} - {index}
        if sources & elsewhere_wrong:
            continue
        rows = _error_rows(book, index)
        if rows:
            own = [r for r in rows if not r[2].message.startswith(_FOLLOWS)]
            for row, col, error in own or rows:
                text = error.message or reason(book.settlement, node, book.results.values)
                remarks.append(_error(book, node, row, col, error, text))
            continue
        value = book.results.values[index]
        assert isinstance(value, CellError)
        text = value.message or reason(book.settlement, node, book.results.values)
        remarks.append(_error(book, node, node.cell.row, node.cell.col, value, text))
    yield from joined("V03", Severity.ERROR, _one_a_row(remarks))


def _one_a_row(remarks: list[Remark]) -> list[Remark]:
    """The first cell of each row for each reason: one bad input often spoils several results of its row."""
    rows: dict[tuple[str, int, str], list[Remark]] = {}
    for remark in remarks:
        rows.setdefault((remark.sheet, remark.row, remark.kind), []).append(remark)
    out = []
    for found in rows.values():
        first = min(found, key=lambda r: r.col)
        others = len(found) - 1
        more = f", and so do {others} others of this row" if others > 1 else ""
        more = ", and so does another of this row" if others == 1 else more
        out.append(first._replace(what=first.what + more))
    return out


def _error(book: Book, node: Node, row: int, col: int, error: CellError, text: str) -> Remark:
    why = f"The reason: {text}."
    return Remark(
        book.sheet(node.sheet), row, col, text, f"the formula gives {error}", why, f"{error} {text}"
    )


def _error_rows(book: Book, index: int) -> list[tuple[int, int, CellError]]:
    """The first error of each row of a formula that fills an area."""
    grid = book.results.grids.get(index)
    if grid is None:
        return []
    cell = book.model.nodes[index].cell
    out = []
    for row, line in enumerate(grid.tolist(), cell.row):
        for col, item in enumerate(line, cell.col):
            if isinstance(item, CellError):
                out.append((row, col, item))
                break
    return out


def not_recomputed(book: Book) -> Iterator[Finding]:
    """V04: a formula in the chain of a TB_ cell could not be recomputed here."""
    remarks: dict[Severity, list[Remark]] = {Severity.WARNING: [], Severity.NOTE: []}
    for index, why in book.settlement.kept.items():
        node = book.model.nodes[index]
        if index in book.circular[1] or (node.cell.kind == "table" and index not in book.related):
            continue
        severity = Severity.WARNING if index in book.related else Severity.NOTE
        remarks[severity].append(
            Remark(
                book.sheet(node.sheet),
                node.cell.row,
                node.cell.col,
                why,
                f"not recomputed: {why}",
                "The value in the file was taken as it stands and must be checked by other means.",
                f"{why} {node.cell.text}",
            )
        )
    for severity, found in remarks.items():
        yield from joined("V04", severity, found)


def not_checked(book: Book) -> Iterator[Finding]:
    """V05: a TB_ formula outside the cells, in a conditional format or a validation."""
    for sheet in book.package.sheets:
        for where, formula in elsewhere(book.package.part(sheet.part), book.model.names, sheet.name):
            yield Finding(
                "V05",
                Severity.NOTE,
                sheet.name,
                where.split(" ")[0],
                f"not checked: {formula}",
                "The formula stands in a conditional format or a validation, which is not evaluated.",
                f"{where} {formula}",
            )


def covered(book: Book) -> Iterator[Finding]:
    """V06: a call fails, and the formula around it shows a number, or nothing though the inputs are there."""
    remarks = []
    for call in book.calls:
        node = call.node
        shown = book.results.values.get(node.index)
        hides = isinstance(shown, float) or (shown == "" and _all_there(call))
        if not hides or not any(word in node.cell.text.upper() for word in _COVERS):
            continue
        answer = dispatch.call(call.row.name, call.values)
        if isinstance(answer, CellError):
            instead = "nothing" if shown == "" else figure(shown)
            remarks.append(
                Remark(
                    book.sheet(node.sheet),
                    node.cell.row,
                    node.cell.col,
                    f"{call.row.name} {book.signatures[node.index]}",
                    f"{call.row.name} fails ({answer}), and the formula shows {instead} instead",
                    f"The reason: {answer.message or answer}. A sum over such cells does not tell it.",
                    f"{answer} {figures(shown)}",
                )
            )
    yield from joined("V06", Severity.WARNING, remarks)


def _all_there(call: Call) -> bool:
    """Whether every cell that a call reads as one number holds a number: its row is in use."""
    cells = [
        value
        for arg, given, value in call.arguments
        if given.area is not None and arg.role in ROLES and not isinstance(value, list)
    ]
    return bool(cells) and all(isinstance(value, float) for value in cells)


RULES = (
    Rule("V01", "stored value differs from recomputation", stale),
    Rule("V02", "no value stored", missing),
    Rule("V03", "error value", errors),
    Rule("V04", "formula not recomputed", not_recomputed),
    Rule("V05", "formula outside the cells", not_checked),
    Rule("V06", "failed call covered up", covered),
)
