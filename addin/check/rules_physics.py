"""Physics: cautions that apply, balances that do not close, load cases that nobody looked at."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

import numpy as np

from thrustbook.engine.runcases import KINDS

from .. import dispatch, elements, tabular
from ..catalogue.types import Row
from ..cells import Cell, CellError, Refused
from ..figures import figure
from ..units import UnitError
from .book import Book
from .calls import Call
from .gather import Remark, digest, joined
from .types import Finding, Rule, Severity

BALANCE_TOLERANCE = 1e-6
"""Net outflow of a balance, as a fraction of its largest flow, that needs no remark."""
RUN_TOLERANCE = 1e-8
"""Closure of a run, residual over largest single force, that needs no remark."""
WANTED_CASES = ("test", "surge")
_CASE_WORDS = {"test": "pressure test", "surge": "surge"}


def cautions(book: Book) -> Iterator[Finding]:
    """H01: a warning of the catalogue or a note of a block applies."""
    seen: set[tuple[str, str]] = set()
    remarks = []
    for done, call in enumerate(book.calls):
        if done & 1023 == 0:
            book.tell("cautions", done, len(book.calls))
        if call.row.kind == "tool" or _only_headings(call):
            continue
        basis = digest(list(call.inputs))
        for row, text in _remarks(call):
            key = f"{call.row.name} {basis} {row}", text
            if key in seen:
                continue  # another result of the same call: the physics is the same
            seen.add(key)
            cell = call.node.cell
            at = cell.row + row if row and call.node.extent()[2] > cell.row else cell.row
            about = f"{call.row.name}, row {row + 1}" if call.row.kind == "table" else call.row.name
            remarks.append(
                Remark(
                    sheet=book.sheet(call.node.sheet),
                    row=at,
                    col=cell.col,
                    kind=f"{call.row.name} {text}",
                    what=f"{about}: {text}",
                    why=f"A caution of {call.row.name}: the result holds only where this is meant.",
                    basis=f"{basis} {row} {text}",
                )
            )
    yield from joined("H01", Severity.WARNING, remarks)


def _remarks(call: Call) -> list[tuple[int, str]]:
    """(row of the answer, text) of each caution; row 0 for an element function."""
    try:
        if call.row.kind == "table":
            answer = tabular.solved(call.row, call.values)
            return [(row, text) for row, text in sorted(answer.notes.items()) if row not in answer.errors] + [
                (0, text) for text in answer.general
            ]
        if not call.row.cautions:
            return []
        outcome = dispatch.call(call.row.name, call.values)
        if isinstance(outcome, CellError):
            return []
        return [(0, text) for text in elements.remarks(call.row, call.values, _sound(outcome))]
    except (Refused, UnitError, ValueError):
        return []


def _sound(outcome: object) -> Cell:
    """The outcome without its failed elements, which are another finding's business."""
    return None if isinstance(outcome, np.ndarray) else outcome  # type: ignore[return-value]


def junctions(book: Book) -> Iterator[Finding]:
    """M01: the flows of a balance, or of a run, do not add up to zero.

    Either the engine refused the call, or the call's own tolerance was set so wide that
    it did not.
    """
    refused: dict[tuple[str, str], list[tuple[Call, str]]] = {}
    for call, said in book.unclosed.values():
        refused.setdefault((call.row.name, digest(list(call.inputs))), []).append((call, said))
    for (name, basis), calls in refused.items():
        call, said = calls[0]
        others = f" (and {len(calls) - 1} more cells with the same flows)" if len(calls) > 1 else ""
        yield Finding(
            "M01",
            Severity.ERROR,
            book.sheet(call.node.sheet),
            call.node.a1,
            f"{name}: {said}{others}",
            "What flows into a control volume must flow out of it; without that there is no thrust.",
            basis,
        )
    seen = set()
    for call in book.calls:
        if call.row.name != "TB_BALANCE" or call.node.index in book.unclosed:
            continue
        share = _residual(call)
        basis = digest(list(call.inputs))
        if share > BALANCE_TOLERANCE and basis not in seen:
            seen.add(basis)
            yield Finding(
                "M01",
                Severity.WARNING,
                book.sheet(call.node.sheet),
                call.node.a1,
                f"TB_BALANCE: the flows add up to {share:.3g} of the largest flow, not to zero",
                f"The call accepts this by its own tolerance; {BALANCE_TOLERANCE:g} is usual.",
                basis,
            )


def _residual(call: Call) -> float:
    """Net outflow of a balance over its largest flow; 0 where the call has no answer."""
    from ..blocks.balance import PORT_COLUMNS
    from ..tables import read_table

    units = call.units
    residual = dispatch.call("TB_BALANCE", ["residual", *call.values[1:]])
    if units is None or not isinstance(residual, float):
        return 0.0
    table = read_table(PORT_COLUMNS, call.values[3], call.values[4], units, what="ports")
    flow = np.abs(table.number("Q"))
    largest = float(np.nanmax(flow)) / units.unit("flow").factor
    return abs(residual) / largest if largest else 0.0


def run_closure(book: Book) -> Iterator[Finding]:
    """M02: the thrusts of a run do not add up to the balance of the run as one control volume."""
    for call in _distinct(book, ("TB_RUN", "TB_RUNCASES")):
        closure = dispatch.call(call.row.name, ["closure", *call.values[1:]])
        if isinstance(closure, float) and closure > RUN_TOLERANCE:
            yield Finding(
                "M02",
                Severity.ERROR,
                book.sheet(call.node.sheet),
                call.node.a1,
                f"{call.row.name}: node thrusts, wall drag and weight miss the balance of the whole run "
                f"by {figure(closure, 3)} of its largest force",
                f"The two must agree to {RUN_TOLERANCE:g}; do not use these thrusts.",
                digest(list(call.inputs)),
            )


def _distinct(book: Book, names: Sequence[str]) -> Iterator[Call]:
    """Calls of some functions, one for each set of arguments."""
    seen = set()
    for call in book.calls:
        if call.row.name in names and not _only_headings(call):
            key = call.row.name, digest(list(call.inputs))
            if key not in seen:
                seen.add(key)
                yield call


def load_cases(book: Book) -> Iterator[Finding]:
    """C01: a run without load cases, or without a test or a surge among them.

    A run is known by its table of nodes: TB_RUN has its load cases where some
    TB_RUNCASES reads the same table.
    """
    kinds: dict[str, set[str]] = {}
    first: dict[str, Call] = {}
    for call in book.calls:
        if call.row.name in ("TB_RUN", "TB_RUNCASES") and not _only_headings(call):
            key = _table_key(call)
            first.setdefault(key, call)
            kinds.setdefault(key, set()).update(_kinds(call.row, call.values))
            if call.row.name == "TB_RUNCASES" and first[key].row.name == "TB_RUN":
                first[key] = call  # the cases stand here, so here they are missing
    for key, found in kinds.items():
        call = first[key]
        lacking = [kind for kind in WANTED_CASES if kind not in found]
        if not lacking or not found <= set(KINDS):
            continue  # a kind that is none is an error of the call
        words = " and no ".join(_CASE_WORDS[kind] for kind in lacking)
        yield Finding(
            "C01",
            Severity.WARNING,
            book.sheet(call.node.sheet),
            call.node.a1,
            f"{call.row.name}: there is no {words} among the load cases of this run"
            if found
            else f"{call.row.name}: this run has no load cases, so no {words}",
            "Test and surge pressures often govern the restraint; give them as cases of TB_RUNCASES, "
            "or accept this finding with the reason.",
            f"{key} {sorted(found)}",
        )


def _only_headings(call: Call) -> bool:
    return call.wanted is not None and call.wanted.form != "values"


def _table_key(call: Call) -> str:
    given = call.given[call.row.leading + 2 : call.row.leading + 3]
    if given and given[0].area is not None:
        return " ".join(map(str, given[0].area))
    return digest(list(call.values[call.row.leading + 2 : call.row.leading + 3]))


def _kinds(row: Row, values: Sequence[Cell]) -> set[str]:
    cases = values[row.leading + 3] if len(values) > row.leading + 3 else None
    if row.name != "TB_RUNCASES" or not isinstance(cases, list):
        return set()
    headings = [str(cell).strip().casefold() for cell in cases[0]]
    if "kind" not in headings:
        return set()
    at = headings.index("kind")
    return {str(line[at]).strip().casefold() for line in cases[1:] if line[at] not in (None, "")}


RULES = (
    Rule("M01", "flows of a junction do not close", junctions),
    Rule("M02", "balance of a run does not close", run_closure),
    Rule("C01", "load cases missing", load_cases),
    Rule("H01", "physical caution", cautions),
)
