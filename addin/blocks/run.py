"""TB_RUN: a pipe run, node by node."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any, Final

import numpy as np

from thrustbook.engine.errors import EngineError
from thrustbook.engine.run import Run
from thrustbook.engine.run import run as engine_run
from thrustbook.engine.runnotes import Fitting, fitting_text, note_text

from ..catalogue.types import Result
from ..cells import Refused
from .runread import Nodes, RunFault, from_engine, read_nodes, read_start, thrust_faults
from .types import TableAnswer, TableCall

RESULTS: Final = (
    Result(name="name", role="text", text="name of the node"),
    Result(name="fitting", role="text", text="what the node is: bend, reducer, tee, pump, cap, jet"),
    Result(name="s", role="length", text="chainage along the run"),
    Result(name="Q1", role="flow", text="flow arriving at the node"),
    Result(name="Q2", role="flow", text="flow leaving along the run"),
    Result(name="V1", role="velocity", text="velocity arriving"),
    Result(name="V2", role="velocity", text="velocity leaving"),
    Result(name="p1", role="pressure", text="gauge pressure on the arriving side"),
    Result(name="p2", role="pressure", text="gauge pressure on the leaving side"),
    Result(name="HGL1", role="level", text="hydraulic grade line on the arriving side"),
    Result(name="HGL2", role="level", text="hydraulic grade line on the leaving side"),
    Result(name="EGL1", role="level", text="energy grade line on the arriving side"),
    Result(name="EGL2", role="level", text="energy grade line on the leaving side"),
    Result(name="theta", role="angle", text="deflection"),
    Result(name="Fx", role="force", text="thrust of the fluid on the node, east"),
    Result(name="Fy", role="force", text="thrust, north"),
    Result(name="Fz", role="force", text="thrust, up"),
    Result(name="F", role="force", text="thrust, magnitude"),
    Result(name="Fh", role="force", text="thrust, horizontal part"),
    Result(name="bearing", role="angle", text="bearing of the horizontal part, clockwise from north"),
    Result(name="Fv", role="force", text="thrust, vertical part, up positive"),
    Result(name="drag", role="force", text="wall drag on the leg that leaves, along it"),
    Result(name="W", role="force", text="weight of the water in that leg"),
    Result(name="L", role="length", text="length of that leg"),
    Result(name="Re", role="ratio", text="Reynolds number of that leg"),
    Result(name="fD", role="ratio", text="Darcy friction factor of that leg"),
    Result(name="hf", role="head", text="friction loss of that leg"),
    Result(name="hK", role="head", text="local loss of the node"),
    Result(name="po", role="pressure", text="gauge pressure in the offtake"),
    Result(name="Vo", role="velocity", text="velocity in the offtake"),
    Result(name="note", role="text", text="remarks, or why there is no result"),
    Result(
        name="closure",
        role="ratio",
        text="closure of the whole run: residual over the largest single force",
        alone=True,
    ),
)

_LEG: Final = ("drag", "W", "L", "Re", "fD", "hf")
_FIELD: Final = {"fD": "f"}  # results are found without regard to case, and F is the thrust
_OFFTAKE: Final = ("po", "Vo")
_NUMBERS: Final = tuple(r.name for r in RESULTS if r.role != "text" and not r.alone)


def run(call: TableCall) -> TableAnswer:
    """Read start block and nodes, work the run, and give it back row by row."""
    start_cell, headings, table_cell = call.cells
    start, ambient = read_start(start_cell, call.units)
    try:
        nodes = read_nodes(headings, table_cell, call.units, ambient)
        try:
            result = engine_run(nodes.run_table, start)
        except EngineError as refusal:
            raise from_engine(nodes, refusal, call.units) from refusal
    except RunFault as fault:
        return spoilt_answer(call, fault, _NUMBERS)
    faults = thrust_faults(nodes, result.note)
    if call.result == "closure":
        if faults:
            row, error = min(faults.items())
            raise Refused(error.kind, f"{nodes.label(row)}: {error.message}")
        return TableAnswer(columns={"closure": np.array([result.closure.relative])}, single=True)
    return TableAnswer(
        columns=_columns(nodes, result),
        errors=faults,
        notes={int(nodes.rows[j]): note_text(result.note[j]) for j in np.flatnonzero(result.note).tolist()},
        blank=nodes.table.blank,
        ambient=ambient,
    )


def _columns(nodes: Nodes, result: Run) -> dict[str, Any]:
    columns: dict[str, Any] = {
        name: nodes.spread(getattr(result, _FIELD.get(name, name)), last=name not in _LEG)
        for name in _NUMBERS
    }
    for name in _OFFTAKE:
        columns[name][nodes.rows[(result.fitting & Fitting.TEE) == 0]] = np.nan
    columns["name"] = nodes.table.text("name")
    columns["fitting"] = nodes.words(_fittings(result))
    columns["note"] = nodes.words(["ok"] * len(nodes.rows))
    return columns


def _fittings(result: Run) -> list[str]:
    known = {code: fitting_text(code) for code in set(result.fitting.tolist())}
    return [known[code] for code in result.fitting.tolist()]


def spoilt_answer(call: TableCall, fault: RunFault, numbers: Sequence[str], width: int = 0) -> TableAnswer:
    """Answer with an error on every row; a result of one cell is refused.

    ``width`` is the number of columns of a result that is wider than one.
    """
    if call.result == "closure":
        error = next(iter(fault.errors.values()))
        raise Refused(error.kind, error.message)
    table = fault.nodes.table
    names = table.text("name")
    columns: dict[str, Any] = {name: np.full(table.size, np.nan) for name in numbers}
    if width:
        columns[call.result] = np.full((table.size, width), np.nan)
    return TableAnswer(columns={"name": names} | columns, errors=fault.errors, blank=table.blank)
