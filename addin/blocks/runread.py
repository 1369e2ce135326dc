"""Reading the ranges of a pipe run: its start block, its table of nodes, its load cases."""

from __future__ import annotations

import re
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Any, Final

import numpy as np
import numpy.typing as npt

from thrustbook.engine.constants import P_ATM
from thrustbook.engine.errors import EngineError, Problem
from thrustbook.engine.guard import Routine
from thrustbook.engine.properties import Water, water
from thrustbook.engine.runcases import LoadCase
from thrustbook.engine.runflow import RunStart
from thrustbook.engine.runnotes import FAULTS, note_text
from thrustbook.engine.runshape import RunTable

from ..catalogue.types import Column
from ..cells import Cell, CellError, Refused
from ..failures import in_units, kind_of
from ..tables import Table, as_range, read_pairs, read_table
from ..units import UnitSet

NODE_COLUMNS: Final = (
    Column(name="name", role="text", text="name of the node", empty="no name"),
    Column(name="x", role="level", text="coordinate east", required=True),
    Column(name="y", role="level", text="coordinate north", required=True),
    Column(name="z", role="level", text="level, up", required=True),
    Column(
        name="D",
        role="diameter",
        text="inside diameter of the leg that leaves the node; on the last row of the jet or the pipe beyond",
        required=True,
    ),
    Column(name="e", role="roughness", text="roughness of that leg", empty="f must be given"),
    Column(
        name="K", role="ratio", text="loss coefficient of the node, on the velocity leaving it", empty="0"
    ),
    Column(name="Hp", role="head", text="pump head added at the node", empty="0"),
    Column(name="Qo", role="flow", text="flow out through an offtake at the node", empty="0"),
    Column(name="ox", role="ratio", text="direction of the offtake, east part", empty="0"),
    Column(name="oy", role="ratio", text="direction of the offtake, north part", empty="0"),
    Column(name="oz", role="ratio", text="direction of the offtake, part upwards", empty="0"),
    Column(name="Do", role="diameter", text="inside diameter of the offtake", empty="no offtake"),
    Column(name="Ko", role="ratio", text="loss coefficient of the offtake, on its own velocity", empty="0"),
    Column(
        name="Dj",
        role="diameter",
        text="diameter on which pressure acts at the joints of the leg (unrestrained: outside diameter)",
        empty="D",
    ),
    Column(name="f", role="ratio", text="Darcy friction factor of the leg", empty="from e and mu"),
    Column(name="alpha", role="ratio", text="kinetic energy correction of the leg", empty="1"),
    Column(name="beta", role="ratio", text="momentum correction of the leg", empty="1"),
)

START_COLUMNS: Final = (
    Column(
        name="fluid",
        role="text",
        text="fluid whose properties are known: water; needs T",
        empty="rho must be given",
    ),
    Column(name="T", role="temperature", text="temperature of that fluid", empty="there is no fluid"),
    Column(
        name="rho", role="density", text="density; goes before that of the fluid", empty="that of the fluid"
    ),
    Column(
        name="mu",
        role="viscosity",
        text="dynamic viscosity; goes before that of the fluid",
        empty="from nu, or that of the fluid; without either every leg needs f",
    ),
    Column(name="nu", role="kinematic", text="kinematic viscosity, in place of mu", empty="mu is used"),
    Column(name="Q", role="flow", text="flow along the run", empty="from a closed end, or solved for a jet"),
    Column(name="p", role="pressure", text="gauge pressure at one end", empty="from H, or from the jet"),
    Column(name="H", role="level", text="total head above the datum of z at one end", empty="from p"),
    Column(name="at", role="text", text="where p or H holds: start or end", empty="start"),
    Column(name="flow_at", role="text", text="where Q holds: start or end", empty="as at"),
    Column(name="start", role="text", text="first node: continues or closed", empty="continues"),
    Column(name="end", role="text", text="last node: continues, jet or closed", empty="continues"),
    Column(name="pamb", role="absolute", text="ambient pressure", empty="standard atmosphere"),
    Column(name="pv", role="absolute", text="vapour pressure", empty="that of the fluid, or 0"),
    Column(name="Vmax", role="velocity", text="velocity above which a leg is remarked on", empty="3 m/s"),
    Column(name="method", role="text", text="friction: colebrook, swamee-jain, haaland", empty="colebrook"),
)

CASE_COLUMNS: Final = (
    Column(name="case", role="text", text="name of the load case", required=True),
    Column(name="kind", role="text", text="operating, peak, shut, test, surge or empty", required=True),
    Column(name="Q", role="flow", text="flow along the run", empty="as in the start block"),
    Column(
        name="p", role="pressure", text="gauge pressure; in a test the test pressure", empty="as start block"
    ),
    Column(name="H", role="level", text="total head; for shut the shut-off head", empty="as start block"),
    Column(name="at", role="text", text="where Q, p or H holds: start or end", empty="as start block"),
    Column(name="zp", role="level", text="level of the test gauge", empty="lowest node"),
    Column(name="pump", role="ratio", text="factor on the pump heads", empty="1, in a test 0"),
    Column(name="offtakes", role="ratio", text="factor on the offtakes", empty="1, with no flow 0"),
    Column(name="dp", role="loss", text="surge pressure at the start of the run", empty="none"),
    Column(name="dp2", role="loss", text="surge pressure at the end, linear between", empty="as dp"),
    Column(name="rho", role="density", text="density", empty="as start block"),
    Column(
        name="valve", role="text", text="in kind shut, name of the node whose valve is shut", empty="none"
    ),
    Column(name="H2", role="level", text="head beyond that valve", empty="pipe beyond is drained"),
)

FLUIDS: Final[Mapping[str, Routine[Any, Water]]] = {"water": water}
"""What the entry fluid may name: density, viscosity and vapour pressure from the temperature."""

_WORDS: Final = ("fluid", "at", "flow_at", "start", "end", "method", "kind")
_INDEX: Final = re.compile(r"(\w+)\[(\d+)\]")
MOST_NAMED: Final = 3
"""Bad rows that a message names one by one."""


@dataclass(frozen=True)
class Nodes:
    """The nodes read from cells. ``rows`` gives the row of the range for each node: empty rows are none."""

    table: Table
    rows: npt.NDArray[np.intp]
    run_table: RunTable

    def label(self, row: int) -> str:
        """Name a row for a message."""
        name = self.table.text("name")[row]
        return f'node "{name}" (row {row + 1})' if name else f"row {row + 1}"

    def spread(self, values: Any, last: bool = True) -> npt.NDArray[np.float64]:
        """Put node values on the rows of the range; ``last`` False: the last node has none."""
        values = np.asarray(values, dtype=float)
        out = np.full((self.table.size, *values.shape[1:]), np.nan)
        out[self.rows] = values
        if not last:
            out[self.rows[-1]] = np.nan
        return out

    def words(self, texts: Sequence[str]) -> list[str]:
        """Put node texts on the rows of the range."""
        out = [""] * self.table.size
        for row, text in zip(self.rows.tolist(), texts, strict=True):
            out[row] = text
        return out


class RunFault(Exception):
    """A run that has no result because of some of its rows."""

    def __init__(self, nodes: Nodes, errors: dict[int, CellError]) -> None:
        self.nodes = nodes
        self.errors = errors
        super().__init__(next(iter(errors.values())).message)


def read_start(cell: Cell, units: UnitSet) -> tuple[RunStart, float]:
    """Read the start block; give it with the ambient pressure."""
    found = read_pairs(START_COLUMNS, cell, units, what="start")
    ambient = float(found.get("pamb", P_ATM))
    if ambient != P_ATM:  # pressures written as absolute take this ambient pressure off
        found = read_pairs(START_COLUMNS, cell, units, what="start", ambient=ambient)
    return RunStart(**_with_fluid(_lowered(found), units)), ambient


def _with_fluid(found: dict[str, Any], units: UnitSet) -> dict[str, Any]:
    """Fill in the properties of the fluid. One that has an entry of its own keeps it."""
    fluid, T = found.pop("fluid", None), found.pop("T", None)
    if fluid is None:
        if T is not None:
            raise Refused("VALUE", "start: T is given, but no fluid (allowed: T with fluid)")
        if "rho" not in found:
            raise Refused("VALUE", "start: rho is missing (allowed: rho, or fluid and T)")
        return found
    if fluid not in FLUIDS:
        raise Refused("VALUE", f'start: fluid = "{fluid}" (allowed: {", ".join(FLUIDS)})')
    if T is None:
        raise Refused("VALUE", f"start: T is missing (the temperature of the {fluid})")
    try:
        known = FLUIDS[fluid](T)
    except EngineError as error:
        bound = FLUIDS[fluid].parameters[0].bound
        texts = [in_units(problem, "temperature", units, bound) for problem in error.problems]
        raise Refused(kind_of(error), f"start: {'; '.join(texts)}") from error
    filled = {"rho": known.rho, "pv": known.pv}
    if "nu" not in found:
        filled["mu"] = known.mu
    return filled | found


def _lowered(found: dict[str, Any]) -> dict[str, Any]:
    return {k: v.lower() if k in _WORDS else v for k, v in found.items()}


def read_nodes(headings: Cell, table: Cell, units: UnitSet, ambient: float) -> Nodes:
    """Read the table of nodes.

    Raises
    ------
    RunFault
        Where a cell cannot be read: flow and head tie all nodes together.
    """
    read = read_table(NODE_COLUMNS, headings, table, units, what="table", ambient=ambient)
    rows = np.flatnonzero(~read.blank)
    nodes = Nodes(read, rows, RunTable(**{k: v[rows] for k, v in read.numbers.items()}))
    if read.errors:
        raise RunFault(nodes, _spoilt(nodes, read.errors, []))
    return nodes


def read_cases(cell: Cell, units: UnitSet, ambient: float) -> tuple[list[LoadCase], list[str]]:
    """Read the headed table of load cases; empty rows are none. With it the name of each case's valve."""
    rows = as_range(cell, "cases")
    if len(rows) < 2:
        raise Refused("VALUE", "cases has one row (allowed: a row of headings and a row for each case)")
    read = read_table(CASE_COLUMNS, rows[:1], rows[1:], units, what="cases", ambient=ambient)
    for i, error in sorted(read.errors.items()):
        raise Refused(error.kind, f"cases, row {i + 1}: {error.message or error}")
    numbers = {name: values.tolist() for name, values in read.numbers.items()}
    out, valves = [], []
    for i in np.flatnonzero(~read.blank).tolist():
        valves.append(read.text("valve")[i].strip())
        values = {name: column[i] for name, column in numbers.items()}
        out.append(
            LoadCase(
                name=read.text("case")[i].strip() or f"case {i + 1}",
                kind=read.text("kind")[i].strip().lower(),
                at=read.text("at")[i].strip().lower(),
                **values,
            )
        )
    return out, valves


def place_valves(nodes: Nodes, cases: Sequence[LoadCase], valves: Sequence[str]) -> list[LoadCase]:
    """Find the nodes whose valves the cases shut."""
    names = [nodes.table.text("name")[row].strip() for row in nodes.rows.tolist()]
    out = []
    for case, valve in zip(cases, valves, strict=True):
        if valve and names.count(valve) != 1:
            count = "several nodes have" if valve in names else "no node has"
            raise Refused("VALUE", f'case {case.name}: {count} the name of the valve, "{valve}"')
        out.append(replace(case, valve=names.index(valve)) if valve else case)
    return out


def from_engine(
    nodes: Nodes, error: EngineError, units: UnitSet, cases: Sequence[LoadCase] = ()
) -> Exception:
    """Turn a refusal of the engine into errors of rows, or of the call where no row is to blame."""
    at_rows: dict[int, list[Problem]] = {}
    general: list[str] = []
    case_entries = {*(c.name for c in CASE_COLUMNS), "mu"}
    roles = {c.name: c.role for c in (*NODE_COLUMNS, *START_COLUMNS, *CASE_COLUMNS)}

    def worded(problem: Problem) -> str:
        return in_units(problem, roles.get(problem.argument, ""), units)

    for problem in error.problems:
        match = _INDEX.match(problem.argument)
        if not match:
            general.append(worded(problem))
            continue
        name, index = match[1], int(match[2])
        plain = problem._replace(argument=_INDEX.sub(r"\1", problem.argument))
        # Nodes and cases share no column, so the name tells whose index it is.
        if cases and name in case_entries:
            general.append(f"case {cases[index].name}: {worded(plain)}")
        else:
            at_rows.setdefault(int(nodes.rows[index]), []).append(plain)
    if not at_rows:
        return Refused(kind_of(error), "; ".join(general) or error.reason)
    errors = {}
    for row, problems in at_rows.items():
        missing = any(isinstance(p.value, float) and np.isnan(p.value) for p in problems)
        errors[row] = CellError("VALUE" if missing else "NUM", "; ".join(map(worded, problems)))
    return RunFault(nodes, _spoilt(nodes, errors, general))


def _spoilt(nodes: Nodes, errors: dict[int, CellError], general: Iterable[str]) -> dict[int, CellError]:
    """Spread the fault of some rows over all: none has a result, and each says whose fault it is."""
    named = [f"{nodes.label(i)}: {e.message or e}" for i, e in sorted(errors.items())]
    more = [f"{len(named) - MOST_NAMED} more rows"] if len(named) > MOST_NAMED else []
    reason = "; ".join([*general, *named[:MOST_NAMED], *more])
    kind = errors[min(errors)].kind
    return {int(i): errors.get(int(i), CellError(kind, f"no result: {reason}")) for i in nodes.rows}


def thrust_faults(nodes: Nodes, notes: npt.NDArray[np.int64]) -> dict[int, CellError]:
    """The rows whose thrust could not be found."""
    return {
        int(nodes.rows[j]): CellError("VALUE", note_text(int(notes[j]) & FAULTS))
        for j in np.flatnonzero(notes & FAULTS).tolist()
    }
