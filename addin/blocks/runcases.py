"""TB_RUNCASES: a pipe run under load cases, with the governing case at each node."""

from __future__ import annotations

from typing import Any, Final

import numpy as np

from thrustbook.engine.errors import EngineError
from thrustbook.engine.runcases import COMPONENTS, Governing, RunCases, run_cases
from thrustbook.engine.runnotes import note_text

from ..catalogue.types import Result
from ..cells import Refused
from .run import spoilt_answer
from .runread import (
    Nodes,
    RunFault,
    from_engine,
    place_valves,
    read_cases,
    read_nodes,
    read_start,
    thrust_faults,
)
from .types import TableAnswer, TableCall

_QUANTITIES: Final = {
    "F": ("force", "thrust, magnitude"),
    "Fh": ("force", "thrust, horizontal part"),
    "Fx": ("force", "thrust of the fluid, east"),
    "Fy": ("force", "thrust of the fluid, north"),
    "Fz": ("force", "thrust of the fluid, up"),
    "p": ("pressure", "gauge pressure, the higher of the two sides"),
}


def _results() -> tuple[Result, ...]:
    out = [Result(name="name", role="text", text="name of the node")]
    for name, (role, text) in _QUANTITIES.items():
        size = "highest" if name == "p" else "largest, with its sign"
        out.append(Result(name=name, role=role, text=f"{text}: {size} of all cases"))
        out.append(Result(name=f"case_{name}", role="text", text=f"the case that governs {name}"))
        if name == "Fh":
            out.append(
                Result(name="bearing", role="angle", text="bearing of Fh in that case, clockwise from north")
            )
    out.append(Result(name="note", role="text", text="remarks by case, or why there is no result"))
    for name, (role, text) in _QUANTITIES.items():
        out.append(
            Result(name=f"{name}_by_case", role=role, text=f"{text}: a column for each case", alone=True)
        )
    out.append(
        Result(name="closure", role="ratio", text="closure of the run, the worst of all cases", alone=True)
    )
    return tuple(out)


RESULTS: Final = _results()
_NUMBERS: Final = tuple(r.name for r in RESULTS if r.role != "text" and not r.alone)


def runcases(call: TableCall) -> TableAnswer:
    """Read start block, nodes and cases, work every case, and give the envelope row by row."""
    start_cell, headings, table_cell, cases_cell = call.cells
    start, ambient = read_start(start_cell, call.units)
    cases, valves = read_cases(cases_cell, call.units, ambient)
    wide = call.result.endswith("_by_case")
    try:
        nodes = read_nodes(headings, table_cell, call.units, ambient)
        cases = place_valves(nodes, cases, valves)
        try:
            result = run_cases(nodes.run_table, start, cases)
        except EngineError as refusal:
            raise from_engine(nodes, refusal, call.units, cases) from refusal
    except RunFault as fault:
        return spoilt_answer(call, fault, _NUMBERS, len(cases) if wide else 0)
    faults = thrust_faults(nodes, result.runs[0].note)
    if call.result == "closure":
        if faults:
            row, error = min(faults.items())
            raise Refused(error.kind, f"{nodes.label(row)}: {error.message}")
        worst = max(r.closure.relative for r in result.runs)
        return TableAnswer(columns={"closure": np.array([worst])}, single=True)
    columns: dict[str, Any] = {}
    if wide:
        columns[call.result] = _by_case(nodes, result, call.result.removesuffix("_by_case"))
    else:
        columns = _envelope(nodes, result)
    return TableAnswer(
        columns=columns,
        errors=faults,
        notes=_notes(nodes, result),
        blank=nodes.table.blank,
        ambient=ambient,
    )


def _by_case(nodes: Nodes, result: RunCases, name: str) -> Any:
    if name == "p":
        return nodes.spread(np.stack([np.maximum(r.p1, r.p2) for r in result.runs], axis=1))
    return nodes.spread(np.stack([getattr(r, name) for r in result.runs], axis=1))


def _envelope(nodes: Nodes, result: RunCases) -> dict[str, Any]:
    columns: dict[str, Any] = {"name": nodes.table.text("name")}
    for name in (*COMPONENTS, "p"):
        found: Governing = getattr(result, name)
        columns[name] = nodes.spread(found.value)
        columns[f"case_{name}"] = nodes.words(
            [result.names[i] if i >= 0 else "" for i in found.case.tolist()]
        )
    bearings = np.stack([r.bearing for r in result.runs])
    columns["bearing"] = nodes.spread(np.take_along_axis(bearings, result.Fh.case[None, :], axis=0)[0])
    columns["note"] = nodes.words(["ok"] * len(nodes.rows))
    return columns


def _notes(nodes: Nodes, result: RunCases) -> dict[int, str]:
    codes = np.stack([r.note for r in result.runs], axis=1)
    known: dict[tuple[int, ...], str] = {}
    out = {}
    for j in np.flatnonzero(codes.any(axis=1)).tolist():
        row = tuple(codes[j].tolist())
        if row not in known:
            known[row] = _worded(row, result.names)
        out[int(nodes.rows[j])] = known[row]
    return out


def _worded(row: tuple[int, ...], names: tuple[str, ...]) -> str:
    """One remark for the cases that share it."""
    by_text: dict[str, list[str]] = {}
    for code, name in zip(row, names, strict=True):
        if code:
            by_text.setdefault(note_text(code), []).append(name)
    return "; ".join(f"{', '.join(cases)}: {text}" for text, cases in by_text.items())
