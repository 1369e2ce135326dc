"""Junctions between runs: what one run gives, the other must take."""

from __future__ import annotations

from collections.abc import Iterator
from typing import NamedTuple

import numpy as np
import numpy.typing as npt

from thrustbook.engine.errors import EngineError
from thrustbook.engine.run import Run
from thrustbook.engine.run import run as engine_run

from ..blocks.runread import Nodes, RunFault, read_nodes, read_start
from ..cells import Refused
from ..figures import figure
from ..units import UnitError
from .book import Book
from .calls import Call
from .gather import digest, figures
from .types import Finding, Rule, Severity

TOLERANCE = 1e-6
"""Net flow at a junction, as a fraction of the largest flow there, that needs no remark."""
SAME_PLACE = 1e-3
"""Distance [m] within which two nodes of one name are the same point."""


class _Solved(NamedTuple):
    """One run, solved again from the arguments of its call; SI units."""

    call: Call
    names: list[str]
    at: npt.NDArray[np.float64]
    result: Run
    offtakes: npt.NDArray[np.float64]
    ends: tuple[str, str]


class _Part(NamedTuple):
    """What one run brings to a junction: its flow into the point, positive, and in what role."""

    run: _Solved
    role: str
    flow: float


def meeting(book: Book) -> Iterator[Finding]:
    """M03: runs that meet in a point, and flows that do not add up to zero there.

    Two runs meet where a node of one and an end of another have the same name and, to a
    millimetre, the same place. The end that continues brings its flow to the point, the
    start takes its flow from it, an offtake brings what it lets out; closed ends and jets
    bring nothing. Runs with the very same nodes are one run under several conditions, and
    are left out. Points where only starts, or only ends, come together are none that this
    rule can judge: separate runs are often counted from an origin of their own.
    """
    runs = _one_of_each([solved for call in _run_calls(book) if (solved := _solve(call)) is not None])
    done: set[tuple[str, int]] = set()
    for run in runs:
        for at in (0, len(run.names) - 1):
            name, place = run.names[at], run.at[at]
            if not name:
                continue
            parts = [part for other in runs for part in _parts(other, name, place)]
            roles = {part.role for part in parts}
            key = name, round(float(np.sum(place)) / SAME_PLACE)
            if len(parts) < 2 or roles <= {"start"} or "start" not in roles or key in done:
                continue
            done.add(key)
            yield from _judge(book, name, parts)


def _judge(book: Book, name: str, parts: list[_Part]) -> Iterator[Finding]:
    largest = max(abs(part.flow) for part in parts)
    net = sum(part.flow for part in parts)
    if abs(net) <= TOLERANCE * largest:
        return
    first = next(part.run.call for part in parts if part.role == "start")
    units = first.units
    assert units is not None
    unit = units.unit("flow")

    def flow(value: float) -> str:
        return f"{figure(abs(value) / unit.factor)} {unit.symbol}"

    told = ", ".join(f"{book.model.where(p.run.call.node)} {_WORDS[p.role]} {flow(p.flow)}" for p in parts)
    yield Finding(
        "M03",
        Severity.WARNING,
        book.sheet(first.node.sheet),
        first.node.a1,
        f'the runs that meet in node "{name}" do not close: {told}',
        f"{flow(net)} are left over; what one run gives, the other takes.",
        f"{name} {[figures(p.flow) for p in parts]}",
    )


_WORDS = {"end": "brings", "start": "takes", "offtake": "lets out", "through": "passes and lets out"}


def _parts(run: _Solved, name: str, place: npt.NDArray[np.float64]) -> Iterator[_Part]:
    last = len(run.names) - 1
    for i, own in enumerate(run.names):
        if own != name or np.abs(run.at[i] - place).max() > SAME_PLACE:
            continue
        if i == 0 and run.ends[0] == "continues":
            yield _Part(run, "start", -float(run.result.Q1[0]))
        elif i == last and run.ends[1] == "continues":
            yield _Part(run, "end", float(run.result.Q2[-1]))
        elif 0 < i < last:
            flow = float(run.offtakes[i])
            yield _Part(run, "offtake" if flow else "through", flow)


def _run_calls(book: Book) -> Iterator[Call]:
    seen = set()
    for call in book.calls:
        if call.row.name == "TB_RUN" and call.wanted is not None and call.wanted.form == "values":
            key = digest(list(call.inputs))
            if key not in seen:
                seen.add(key)
                yield call


def _solve(call: Call) -> _Solved | None:
    if call.units is None or len(call.inputs) < 4:
        return None
    start_cell, headings, table = call.inputs[1:4]
    try:
        start, ambient = read_start(start_cell, call.units)
        nodes: Nodes = read_nodes(headings, table, call.units, ambient)
        result = engine_run(nodes.run_table, start)
    except (EngineError, Refused, RunFault, UnitError):
        return None
    names = [nodes.table.text("name")[i].strip() for i in nodes.rows.tolist()]
    t = nodes.run_table
    at = np.stack([np.broadcast_to(c, len(names)) for c in (t.x, t.y, t.z)], axis=1)
    offtakes = np.nan_to_num(np.broadcast_to(t.Qo, len(names)))
    return _Solved(call, names, at, result, offtakes, (start.start or "continues", start.end or "continues"))


def _one_of_each(runs: list[_Solved]) -> list[_Solved]:
    """The runs whose nodes no other run has."""
    keys = [(tuple(run.names), run.at.round(6).tobytes()) for run in runs]
    return [run for run, key in zip(runs, keys, strict=True) if keys.count(key) == 1]


RULES = (Rule("M03", "flows of runs that meet do not close", meeting),)
