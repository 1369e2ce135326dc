"""A pipe run under several load cases, and the case that governs at each node."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import Final

import numpy as np
import numpy.typing as npt

from .constants import G
from .errors import EngineError, OutOfRange, Problem
from .guard import ANY, NON_NEGATIVE, POSITIVE, Bound
from .numeric import NOT_GIVEN
from .run import Run, assemble, run_geometry
from .runflow import ENDS, Flow, RunStart, check_start, flow_at_end, solve_flow
from .runshape import Array, Geometry, RunTable, build

KINDS: Final = ("operating", "peak", "shut", "test", "surge", "empty")
"""Kinds of load case; see :class:`LoadCase`."""

STILL: Final = ("shut", "test", "empty")
"""Kinds in which nothing flows."""

EQUAL: Final = 1e-9
"""Relative difference below which two cases count as equal."""

CASE_BOUNDS: Final[dict[str, Bound]] = {
    "Q": ANY,
    "p": ANY,
    "H": ANY,
    "zp": ANY,
    "pump": NON_NEGATIVE,
    "offtakes": NON_NEGATIVE,
    "dp": ANY,
    "dp2": ANY,
    "rho": POSITIVE,
    "H2": ANY,
}
"""Range of each number of a load case, SI units."""

COMPONENTS: Final = ("F", "Fh", "Fx", "Fy", "Fz")
"""The quantities for which a governing case is sought."""


@dataclass(frozen=True)
class LoadCase:
    """One load case. SI units; NaN or "" means not given: as in the start block.

    Attributes
    ----------
    name : the case's name.
    kind : one of

        - "operating", "peak": steady flow;
        - "surge": steady flow with ``dp`` on top of its pressures;
        - "shut": no flow at the head ``H`` (or pressure ``p``) given; an end that is
          a jet is shut and becomes a closed end. With ``valve`` it is a valve at that
          node which is shut: the head stands on the side of the end ``at``, and ``H2``
          on the other;
        - "test": hydrostatic test, no flow, pressure ``p`` at the level ``zp`` (at
          the lowest node if no level is given); a jet is closed; pumps do nothing;
        - "empty": no fluid, no force. The grade lines lie on the pipe.
    Q, p, H, at : flow, gauge pressure or total head, and the end where they hold. A
        case that gives p or H replaces both. With a jet, a case that gives a flow
        takes no pressure from the start block, nor the reverse.
    zp : level of the test gauge [m].
    pump : factor on the pump heads. Not given: 1; 0 in a test.
    offtakes : factor on the offtake flows. Not given: 1; where nothing flows it is 0.
    dp, dp2 : surge pressure at the start and at the end of the run, linear along the
        chainage between [Pa]; ``dp2`` not given: ``dp`` all along. It does not act
        on a jet, which stands in the open.
    rho : density [kg/m3].
    valve : index of the node, from 0, whose valve is shut; -1: none.
    H2 : head on the far side of that valve [m], pumps there standing still; not given:
        the pipe beyond is drained, without pressure or weight, which loads the valve most.
    """

    name: str
    kind: str
    Q: float = NOT_GIVEN
    p: float = NOT_GIVEN
    H: float = NOT_GIVEN
    at: str = ""
    zp: float = NOT_GIVEN
    pump: float = NOT_GIVEN
    offtakes: float = NOT_GIVEN
    dp: float = NOT_GIVEN
    dp2: float = NOT_GIVEN
    rho: float = NOT_GIVEN
    valve: int = -1
    H2: float = NOT_GIVEN


@dataclass(frozen=True)
class Governing:
    """The largest value of one quantity at each node, shape (N,).

    ``value`` keeps the sign it has in the governing case; ``case`` is the index of
    that case, counted from 0, the first of equals. Where a node has no thrust
    ``value`` is NaN and ``case`` -1.
    """

    value: Array
    case: npt.NDArray[np.int64]


@dataclass(frozen=True)
class RunCases:
    """Results of :func:`run_cases`.

    ``runs`` holds a :class:`~thrustbook.engine.run.Run` for each case. The others
    tell, node by node, the case with the largest magnitude of the thrust ``F``, of
    its horizontal part ``Fh``, of each component, and with the highest pressure
    ``p`` [Pa] on either side.
    """

    names: tuple[str, ...]
    runs: tuple[Run, ...]
    F: Governing
    Fh: Governing
    Fx: Governing
    Fy: Governing
    Fz: Governing
    p: Governing


def run_cases(table: RunTable, start: RunStart, cases: Sequence[LoadCase]) -> RunCases:
    """One run under every load case, and the governing case at each node.

    Assumptions, control volumes and signs are those of
    :func:`~thrustbook.engine.run.run`; the geometry is worked once. A surge is an
    envelope pressure laid on steady flow, not a transient solution. "Governs"
    means largest in magnitude; a component keeps its sign.

    Parameters
    ----------
    table : RunTable
        The nodes, columns of shape (N,).
    start : RunStart
        What a case does not say itself.
    cases : sequence of LoadCase
        At least one.

    Returns
    -------
    RunCases
        One Run a case and the governing values, arrays of shape (N,).

    Raises
    ------
    OutOfRange
        With every bad entry of table, start block and cases; an entry of a case is
        named by column and the index of the case from 0 (``dp[4]``). No case may be
        left out of an envelope, so one bad case fails the whole.
    NotClosed, NoSolution
        Of the first case that has none, named.

    Notes
    -----
    Source: derived from the momentum balance; the kinds of case are common practice.

    Examples
    --------
    >>> table = RunTable(x=[0, 50, 50], y=[0, 0, 50], z=0.0, D=0.3, e=1e-4)
    >>> start = RunStart(rho=1000.0, mu=1e-3, Q=0.1, p=4e5)
    >>> cases = [LoadCase("run", "operating"), LoadCase("test", "test", p=9e5)]
    >>> result = run_cases(table, start, cases)
    >>> result.names[result.F.case[1]], round(float(result.F.value[1]), 1)
    ('test', 89968.4)
    """
    geometry, problems = build(table, start.start, start.end)
    problems += check_start(start)
    if not cases:
        problems.append(Problem("cases", 0, "at least one load case"))
    plans = []
    for i, case in enumerate(cases):
        problems += check_case(case, i)
        if geometry is not None and not -1 <= case.valve < geometry.size:
            problems.append(Problem(f"valve[{i}]", case.valve, f"a node, 0 to {geometry.size - 1}"))
        plans.append(_case_start(start, case))
    if geometry is None or problems:
        raise OutOfRange(problems, "run_cases")
    runs = []
    late: list[Problem] = []
    for i, (case, plan) in enumerate(zip(cases, plans, strict=True)):
        try:
            runs.append(_run_case(geometry, plan, case))
        except OutOfRange as error:
            late += [Problem(f"{p.argument}[{i}]", p.value, p.allowed) for p in error.problems]
        except EngineError as error:
            raise type(error)(f"case {case.name!r}: {error.reason}", "run_cases") from error
    if late:
        raise OutOfRange(late, "run_cases")
    highest = [np.maximum(r.p1, r.p2) for r in runs]
    return RunCases(
        names=tuple(case.name for case in cases),
        runs=tuple(runs),
        p=governing(np.stack(highest), signed=True),
        **{name: governing(np.stack([getattr(r, name) for r in runs])) for name in COMPONENTS},
    )


def governing(values: Array, signed: bool = False) -> Governing:
    """Pick at each node the case of the largest magnitude, or of the largest value if ``signed``.

    ``values`` has shape (cases, N). A node that lacks a value in any case has none.
    Cases closer than ``EQUAL`` differ by rounding, and the first of them governs.
    """
    lacking = np.isnan(values).any(axis=0)
    size = np.where(np.isnan(values), -np.inf, values if signed else np.abs(values))
    largest = size.max(axis=0)
    case = np.argmax(size >= largest - EQUAL * np.abs(largest), axis=0)
    value = np.where(lacking, np.nan, np.take_along_axis(values, case[None, :], axis=0)[0])
    return Governing(value, np.where(lacking, -1, case))


def check_case(case: LoadCase, i: int) -> list[Problem]:
    """Collect every entry of a load case that is not allowed, or that its kind has no use for."""
    problems = []

    def refuse(name: str, allowed: str) -> None:
        problems.append(Problem(f"{name}[{i}]", getattr(case, name), allowed))

    given = {name: not math.isnan(float(getattr(case, name))) for name in CASE_BOUNDS}
    for name, bound in CASE_BOUNDS.items():
        if given[name] and not bound.allows(float(getattr(case, name))):
            refuse(name, str(bound))
    if case.kind not in KINDS:
        refuse("kind", ", ".join(KINDS))
        return problems
    if case.at not in ("", *ENDS):
        refuse("at", " or ".join(ENDS))
    elif case.at and not (given["Q"] or given["p"] or given["H"]):
        refuse("at", "only with Q, p or H")
    if given["p"] and given["H"]:
        refuse("H", "only one of p and H")
    if case.kind in STILL:
        for name in ("Q", "offtakes"):
            if given[name] and getattr(case, name) != 0:
                refuse(name, f"0 or not given: nothing flows in kind {case.kind}")
    if case.kind == "surge" and not given["dp"]:
        refuse("dp", "the surge pressure")
    if case.kind == "test" and not given["p"]:
        refuse("p", "the test pressure")
    if case.valve != -1 and case.kind != "shut":
        refuse("valve", "only in kind shut")
    if given["H2"] and case.valve == -1:
        refuse("H2", "only with a valve")
    for name, kinds in _ONLY.items():
        if given[name] and case.kind not in kinds:
            refuse(name, f"only in kind {' or '.join(kinds)}")
    return problems


_ONLY: Final[dict[str, tuple[str, ...]]] = {
    "dp": ("surge",),
    "dp2": ("surge",),
    "zp": ("test",),
    "p": ("operating", "peak", "shut", "surge", "test"),
    "H": ("operating", "peak", "shut", "surge"),
    "pump": ("operating", "peak", "shut", "surge"),
    "H2": ("shut",),
}


def _case_start(start: RunStart, case: LoadCase) -> RunStart:
    """The start block of one case: what the case gives stands in front of what the block gives."""
    rho = start.rho if math.isnan(case.rho) else case.rho
    headed = not (math.isnan(case.p) and math.isnan(case.H))
    flowing = not math.isnan(case.Q)
    p, H, at = (case.p, case.H, case.at or start.at) if headed else (start.p, start.H, start.at)
    flow_at = start.flow_at or start.at
    Q = start.Q
    if flowing:
        Q, flow_at = case.Q, case.at or flow_at
    if start.end == "jet" and case.kind not in STILL and headed != flowing:
        # Flow and pressure of a jet follow from each other.
        Q, p, H = (case.Q, NOT_GIVEN, NOT_GIVEN) if flowing else (NOT_GIVEN, p, H)
    if case.kind in STILL:
        Q = 0.0
    return replace(start, rho=rho, Q=Q, p=p, H=H, at=at, flow_at=flow_at)


def _run_case(geometry: Geometry, start: RunStart, case: LoadCase) -> Run:
    pump = case.pump
    offtakes = case.offtakes
    if case.kind in STILL:
        offtakes = 0.0
        geometry, start = _shut_jet(geometry, start)
    if case.kind == "test":
        pump = 0.0
        level = float(geometry.z.min()) if math.isnan(case.zp) else case.zp
        start = replace(start, p=NOT_GIVEN, H=level + case.p / (start.rho * G))
    if case.kind == "empty":
        return assemble(geometry, start, _no_fluid(geometry))
    Hp = geometry.Hp * (1.0 if math.isnan(pump) else pump)
    Qo = geometry.Qo * (1.0 if math.isnan(offtakes) else offtakes)
    if case.valve >= 0:
        at_end, problems = flow_at_end(geometry, start, Qo)
        if problems:
            raise OutOfRange(problems)
        flow = solve_flow(geometry, start, at_end, Qo, Hp)
        return assemble(geometry, start, _behind_valve(geometry, flow, case, start.at == "start"))
    rise: Array | float = 0.0
    if case.kind == "surge":
        last = case.dp if math.isnan(case.dp2) else case.dp2
        rise = case.dp + (last - case.dp) * geometry.s / geometry.s[-1]
    return run_geometry(geometry, start, Qo, Hp, rise)


def _shut_jet(geometry: Geometry, start: RunStart) -> tuple[Geometry, RunStart]:
    """With nothing flowing an end that is a jet is shut: a cap on the last leg."""
    if geometry.end != "jet":
        return geometry, start
    area2, joint2 = geometry.area2.copy(), geometry.joint2.copy()
    area2[-1] = joint2[-1] = 0.0
    return replace(geometry, end="closed", area2=area2, joint2=joint2), replace(start, end="closed")


def _behind_valve(geometry: Geometry, flow: Flow, case: LoadCase, onwards: bool) -> Flow:
    """Put the far side of a shut valve under its own head, or drain it."""
    nodes, legs = np.arange(geometry.size), np.arange(geometry.size - 1)
    v = case.valve
    far1, far2 = (nodes > v, nodes >= v) if onwards else (nodes <= v, nodes < v)
    far_legs = legs >= v if onwards else legs < v
    drained = math.isnan(case.H2)
    head = geometry.z if drained else np.full(geometry.size, case.H2)
    pressure = flow.rho * G * (head - geometry.z)
    beyond = far1 & far2 & geometry.offtake  # an offtake at the valve stands on its near side
    return replace(
        flow,
        EGL1=np.where(far1, head, flow.EGL1),
        EGL2=np.where(far2, head, flow.EGL2),
        p1=np.where(far1, pressure, flow.p1),
        p2=np.where(far2, pressure, flow.p2),
        po=np.where(beyond, pressure, flow.po),
        full=np.where(far_legs & drained, 0.0, 1.0),
    )


def _no_fluid(geometry: Geometry) -> Flow:
    node, leg = np.zeros(geometry.size), np.zeros(geometry.size - 1)
    return Flow(
        rho=0.0,
        Q1=node,
        Q2=node,
        V1=node,
        V2=node,
        EGL1=geometry.z,
        EGL2=geometry.z,
        p1=node,
        p2=node,
        Qo=node,
        Vo=node,
        po=node,
        Re=leg,
        f=leg,
        hf=leg,
        hK=node,
    )
