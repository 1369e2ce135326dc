"""A pipe run, node by node: flow, pressure, grade lines and thrust from coordinates.

Fittings need no names. The deflection comes from the coordinates, a change of
diameter makes a reducer, an offtake a tee, the last node a cap or a nozzle.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np
import numpy.typing as npt

from .constants import G
from .errors import EngineError, OutOfRange, Problem
from .runflow import Flow, RunStart, check_start, flow_at_end, solve_flow
from .runnotes import fittings, notes
from .runshape import Array, Geometry, RunTable, build

Codes = npt.NDArray[np.int64]

NOISE: Final = 1e-12
"""A thrust below this fraction of the forces it is the difference of has no direction."""


@dataclass(frozen=True)
class Closure:
    """Balance of the whole run as one control volume against the sum over its parts [N].

    ``parts`` = node thrusts + forces on the legs (wall drag, the weight of water
    across the leg, the pressure difference on the joints' rings). ``whole`` = end
    faces and offtakes + all weight of water - rate of change of momentum. Each has
    shape (3,). ``residual`` is the length of their difference and ``relative`` that
    over the largest single force.
    """

    nodes: Array
    drag: Array
    across: Array
    rings: Array
    parts: Array
    whole: Array
    residual: float
    relative: float


@dataclass(frozen=True)
class Run:
    """Results of :func:`run`: arrays of shape (N,), SI units.

    Suffix 1 is the side of the leg that arrives at the node, 2 of the leg that
    leaves. Results of a leg stand on the node it leaves; the last node has none (0).

    Attributes
    ----------
    s : chainage along the legs [m].
    Q1, Q2 : flow, positive in the order of the nodes [m3/s]; V1, V2 : velocity [m/s].
    p1, p2 : gauge pressure [Pa].
    HGL1, HGL2, EGL1, EGL2 : hydraulic and energy grade line above the datum of z [m].
    theta : deflection [rad].
    Fx, Fy, Fz : thrust of the fluid on the node, east, north and up [N]; ``F`` its
        magnitude, ``Fh`` its horizontal part, ``bearing`` of that part clockwise from
        north [rad, 0 to 2 pi], ``Fv`` its vertical part, up positive (= Fz).
    drag : wall drag on the leg, positive along it [N].
    W : weight of the water in the leg [N].
    L : length of the leg [m]; Re, f : its Reynolds number and Darcy factor;
        hf : friction loss of the leg [m]; hK : local loss of the node [m].
    po, Vo : pressure [Pa] and velocity [m/s] in the offtake.
    note, fitting : bits of :class:`~thrustbook.engine.runnotes.Note` and
        :class:`~thrustbook.engine.runnotes.Fitting`.
    closure : balance of the whole run.
    problems : faults that left a node without its thrust (NaN there), and the run
        without closure.
    """

    s: Array
    Q1: Array
    Q2: Array
    V1: Array
    V2: Array
    p1: Array
    p2: Array
    HGL1: Array
    HGL2: Array
    EGL1: Array
    EGL2: Array
    theta: Array
    Fx: Array
    Fy: Array
    Fz: Array
    F: Array
    Fh: Array
    bearing: Array
    Fv: Array
    drag: Array
    W: Array
    L: Array
    Re: Array
    f: Array
    hf: Array
    hK: Array
    po: Array
    Vo: Array
    note: Codes
    fitting: Codes
    closure: Closure
    problems: tuple[Problem, ...]


def run(table: RunTable, start: RunStart) -> Run:
    """Flow, pressures and thrusts along a pipe run.

    Assumes steady flow of one incompressible fluid in a full pipe, losses by
    Darcy-Weisbach and by coefficients, and nodes without length or fluid of their
    own. Sections are treated with their mean velocity, ``alpha`` and ``beta``.

    Control volume of a node: the fluid between section 1 and section 2 and the
    face of an offtake. Thrust of the fluid on the node, ambient pressure outside::

        F = (p1 Aj1 + beta1 rho Q1 V1) u1 - (p2 Aj2 + beta2 rho Q2 V2) u2
            - (po Ao + rho Qo Vo) uo

    with u the directions of the legs in the order of the nodes and Aj the area at
    the joint's diameter. It is the same for either direction of flow. The reaction
    of the restraint is -F. Total head::

        EGL2 = EGL1 - K V2 |V2| / 2g + Hp,   EGL1[j+1] = EGL2[j] - f L/D V |V| / 2g

    Losses act along the true flow, so a negative flow works. An offtake takes the
    total head of that side of its node which carries the larger flow, less its own
    loss. A jet leaves in the line of the last leg at ambient pressure; its flow may
    be left out if p or H at the start is given. A closed end needs no flow: it
    follows from the offtakes. The pipe beyond an end that continues goes straight on.

    Parameters
    ----------
    table : RunTable
        The nodes, columns of shape (N,).
    start : RunStart
        Fluid, flow and pressure.

    Returns
    -------
    Run
        Arrays of shape (N,).

    Raises
    ------
    OutOfRange
        With every bad entry, named by column and index from 0 (``D[3]``). Such a
        fault fails the whole run, since every node depends on the others through
        flow and head. An offtake without direction or diameter and a joint smaller
        than the bore touch no flow: they leave NaN in the thrust of their nodes.
    NotClosed
        If a closed end leaves flow over.
    NoSolution
        If the head does not reach the jet, or no finite flow balances it.

    Notes
    -----
    Source: momentum balance and Bernoulli's equation, derived; Darcy-Weisbach.

    Examples
    --------
    A closed right-angle bend of 300 mm under 10 bar, 2 p A sin(45 deg):

    >>> table = RunTable(x=[0, 50, 50], y=[0, 0, 50], z=0.0, D=0.3, e=0.0)
    >>> result = run(table, RunStart(rho=1000.0, p=1e6, end="closed"))
    >>> round(float(result.F[1]), 3)
    99964.866
    """
    geometry, problems = build(table, start.start, start.end)
    problems += check_start(start)
    if geometry is None or problems:
        raise OutOfRange(problems, "run")
    return run_geometry(geometry, start, geometry.Qo, geometry.Hp)


def run_geometry(geometry: Geometry, start: RunStart, Qo: Array, Hp: Array, rise: Array | float = 0.0) -> Run:
    """:func:`run` on a checked geometry and start, with these offtakes, pump heads and surge."""
    try:
        at_end, problems = flow_at_end(geometry, start, Qo)
        if problems:
            raise OutOfRange(problems)
        flow = solve_flow(geometry, start, at_end, Qo, Hp)
    except EngineError as error:
        error.function = error.function or "run"
        raise
    return assemble(geometry, start, flow, rise)


def assemble(geometry: Geometry, start: RunStart, flow: Flow, rise: Array | float = 0.0) -> Run:
    """Thrusts, notes and closure from the flow.

    ``rise`` [Pa], shape (N,) or one number, is a surge pressure on top of the
    pressures of the flow; the water between two nodes of unequal rise takes up
    momentum, which enters the closure.
    """
    n = geometry.size
    rise = np.broadcast_to(np.asarray(rise, dtype=float), (n,))
    p1, p2, po = flow.p1 + rise, flow.p2 + rise, flow.po + np.where(geometry.offtake, rise, 0.0)
    if geometry.end == "jet":
        p2[-1] = flow.p2[-1]  # the jet stands in the open
    rho = flow.rho
    push1 = p1 * geometry.joint1 + geometry.beta1 * rho * flow.Q1 * flow.V1
    push2 = p2 * geometry.joint2 + geometry.beta2 * rho * flow.Q2 * flow.V2
    pusho = po * geometry.offtake_area + rho * flow.Qo * flow.Vo
    thrust = push1[:, None] * geometry.u1 - push2[:, None] * geometry.u2
    thrust -= pusho[:, None] * geometry.offtake_u
    faces = np.abs(push1) + np.abs(push2) + np.abs(pusho)
    Fx, Fy, Fz = thrust.T
    Fh = np.hypot(Fx, Fy)
    bearing = np.where(Fh > NOISE * faces, np.arctan2(Fx, Fy) % (2 * np.pi), 0.0)
    bearing[np.isnan(Fh)] = np.nan

    legs = slice(0, n - 1)
    V, area = flow.V2[legs], geometry.area2[legs]
    drag = flow.f / 8 * rho * V * np.abs(V) * np.pi * geometry.D2[legs] * geometry.L
    W = rho * G * area * geometry.L * flow.full
    head = np.zeros(n) if rho == 0 else rise / (rho * G)
    return Run(
        s=geometry.s,
        Q1=flow.Q1,
        Q2=flow.Q2,
        V1=flow.V1,
        V2=flow.V2,
        p1=p1,
        p2=p2,
        HGL1=flow.EGL1 + head - geometry.alpha1 * flow.V1**2 / (2 * G),
        HGL2=flow.EGL2 + head - geometry.alpha2 * flow.V2**2 / (2 * G),
        EGL1=flow.EGL1 + head,
        EGL2=flow.EGL2 + head,
        theta=geometry.theta,
        Fx=Fx,
        Fy=Fy,
        Fz=Fz,
        F=np.sqrt((thrust**2).sum(axis=1)),
        Fh=Fh,
        bearing=bearing,
        Fv=Fz,
        drag=_on_nodes(drag),
        W=_on_nodes(W),
        L=_on_nodes(geometry.L),
        Re=_on_nodes(flow.Re),
        f=_on_nodes(flow.f),
        hf=_on_nodes(flow.hf),
        hK=flow.hK,
        po=po,
        Vo=flow.Vo,
        note=notes(geometry, start, flow, p1, p2, po),
        fitting=fittings(geometry),
        closure=_closure(geometry, flow, p1, p2, pusho, thrust, drag, W, rise),
        problems=geometry.problems,
    )


def _on_nodes(leg: Array) -> Array:
    return np.append(leg, 0.0)


def _closure(
    geometry: Geometry,
    flow: Flow,
    p1: Array,
    p2: Array,
    pusho: Array,
    thrust: Array,
    drag: Array,
    W: Array,
    rise: Array,
) -> Closure:
    """Compare the parts with the whole.

    The drag comes from the wall shear f rho V^2/8, the pressures from the sum of
    heads and the weight from the volume, so the two sides meet only if heads, shear
    and weight agree along every leg.
    """
    u = geometry.u2[:-1]
    up = np.array([0.0, 0.0, 1.0])
    weight = -W[:, None] * up
    # Along the leg the water's weight is carried by its pressure; the pipe feels the part across.
    across = weight - (weight * u).sum(axis=1)[:, None] * u
    ring = geometry.joint2[:-1] - geometry.area2[:-1]
    rings = ((p2[:-1] - p1[1:]) * ring)[:, None] * u
    drags = drag[:, None] * u
    nodes = thrust.sum(axis=0)
    parts = nodes + drags.sum(axis=0) + across.sum(axis=0) + rings.sum(axis=0)

    first = p1[0] * geometry.joint1[0] + geometry.beta1[0] * flow.rho * flow.Q1[0] * flow.V1[0]
    last = p2[-1] * geometry.joint2[-1] + geometry.beta2[-1] * flow.rho * flow.Q2[-1] * flow.V2[-1]
    branches = pusho[:, None] * geometry.offtake_u
    column = ((rise[:-1] - rise[1:]) * geometry.area2[:-1])[:, None] * u
    whole = first * geometry.u1[0] - last * geometry.u2[-1]
    whole = whole - branches.sum(axis=0) + weight.sum(axis=0) - column.sum(axis=0)
    residual = float(np.sqrt(((parts - whole) ** 2).sum()))
    singles = [np.abs(a).max(initial=0.0) for a in (thrust, drag, W, pusho, [first], [last])]
    largest = float(max(singles))
    relative = residual / largest if largest > 0 else residual
    return Closure(
        nodes, drags.sum(axis=0), across.sum(axis=0), rings.sum(axis=0), parts, whole, residual, relative
    )
