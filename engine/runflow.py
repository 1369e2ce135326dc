"""Flows, heads and pressures along a pipe run: continuity and Bernoulli, node after node.

Flows come from one cumulative sum of the offtakes, total heads from one cumulative
sum of the losses and pump heads, so a run of any length is one vectorised pass. A
jet whose flow is not given needs a root of one unknown; each trial is one pass.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass, replace
from itertools import pairwise
from typing import Final

import numpy as np

from .constants import P_ATM, G
from .errors import NoSolution, NotClosed, Problem
from .friction import METHODS, darcy
from .guard import ANY, NON_NEGATIVE, POSITIVE, Bound
from .numeric import NOT_GIVEN
from .runshape import Array, Geometry

ENDS: Final = ("start", "end")
V_USUAL: Final = 3.0
"""Velocity above which a water main is usually questioned [m/s]: common practice."""

CLOSING: Final = 1e-9
"""Flows that must cancel may miss by this fraction of the flows involved (input rounding)."""

ROUNDING: Final = 1e-13
"""A flow below this fraction of the flows it is the difference of is no flow."""

START_BOUNDS: Final[dict[str, Bound]] = {
    "rho": POSITIVE,
    "mu": POSITIVE,
    "nu": POSITIVE,
    "Q": ANY,
    "p": ANY,
    "H": ANY,
    "pamb": NON_NEGATIVE,
    "pv": NON_NEGATIVE,
    "Vmax": POSITIVE,
}
"""Range of each number of the start block, SI units."""


@dataclass(frozen=True)
class RunStart:
    """What is known of the flow in a run. SI units; NaN means not given.

    Attributes
    ----------
    rho : density [kg/m3].
    mu, nu : dynamic viscosity [Pa s] or kinematic viscosity [m2/s]: one of them,
        unless every leg that flows has its friction factor given.
    Q : flow along the run, positive in the order of the nodes [m3/s].
    p, H : gauge pressure [Pa], or total head above the datum of z [m]: one of them.
    at : the end where p or H holds, "start" or "end". At the start that is section 1
        of the first node, at the end section 2 of the last.
    flow_at : the end where Q holds; not given: the same end.
    start, end : what the first node is ("continues" or "closed") and what the last
        node is ("continues", "jet" or "closed"). Beyond an end that continues the
        pipe goes straight on.
    pamb, pv : ambient and vapour pressure [Pa absolute], for the warnings.
    Vmax : velocity above which a leg is marked [m/s].
    method : rule of the friction factor, see :func:`~thrustbook.engine.friction.friction`.
    """

    rho: float
    mu: float = NOT_GIVEN
    nu: float = NOT_GIVEN
    Q: float = NOT_GIVEN
    p: float = NOT_GIVEN
    H: float = NOT_GIVEN
    at: str = "start"
    flow_at: str = ""
    start: str = "continues"
    end: str = "continues"
    pamb: float = P_ATM
    pv: float = 0.0
    Vmax: float = V_USUAL
    method: str = "colebrook"

    @property
    def viscosity(self) -> float:
        """Dynamic viscosity [Pa s]; NaN if none was given."""
        return self.mu if not math.isnan(self.mu) else self.nu * self.rho


@dataclass(frozen=True)
class Flow:
    """Flows and heads at both sections of every node, shape (N,); losses of legs (N - 1,)."""

    rho: float
    Q1: Array
    Q2: Array
    V1: Array
    V2: Array
    EGL1: Array
    EGL2: Array
    p1: Array
    p2: Array
    Qo: Array
    Vo: Array
    po: Array
    Re: Array
    f: Array
    hf: Array
    hK: Array
    full: Array | float = 1.0
    """1 where a leg holds water, 0 where it is drained."""


@dataclass(frozen=True)
class _Drops:
    """One pass along the run for a given flow, before the level of the head is known."""

    Q1: Array
    Q2: Array
    V1: Array
    V2: Array
    Re: Array
    f: Array
    hf: Array
    hK: Array
    fall: Array  # total head lost from section 1 of the first node, shape (2 N,)


def check_start(start: RunStart) -> list[Problem]:
    """Collect every entry of the start block outside its range."""
    problems = []
    for name, bound in START_BOUNDS.items():
        value = float(getattr(start, name))
        optional = name not in ("rho", "pamb", "pv", "Vmax")
        if not bound.allows(value) and not (optional and math.isnan(value)):
            problems.append(Problem(name, value, str(bound)))
    if start.at not in ENDS:
        problems.append(Problem("at", start.at, " or ".join(ENDS)))
    if start.flow_at not in ("", *ENDS):
        problems.append(Problem("flow_at", start.flow_at, " or ".join(ENDS)))
    if start.method not in METHODS:
        problems.append(Problem("method", start.method, ", ".join(METHODS)))
    if not math.isnan(start.mu) and not math.isnan(start.nu):
        problems.append(Problem("nu", start.nu, "only one of mu and nu"))
    if not math.isnan(start.p) and not math.isnan(start.H):
        problems.append(Problem("H", start.H, "only one of p and H"))
    return problems


def flow_at_end(geometry: Geometry, start: RunStart, Qo: Array) -> tuple[float, list[Problem]]:
    """Flow that leaves section 2 of the last node, from what is given; NaN if a jet must be solved.

    Raises
    ------
    NotClosed
        A closed end leaves no way out for the flow that is given.
    """
    problems = []
    total = float(np.cumsum(Qo)[-1])
    knowns: list[tuple[str, float]] = []
    if not math.isnan(start.Q):
        place = start.flow_at or start.at
        knowns.append((f"Q = {start.Q:.6g} at the {place}", start.Q if place == "end" else start.Q - total))
    if geometry.start == "closed":
        knowns.append(("the closed start", -total))
    if geometry.end == "closed":
        knowns.append(("the closed end", 0.0))
    scale = float(np.abs(Qo).sum()) + (0.0 if math.isnan(start.Q) else abs(start.Q))
    for (name, flow), (other, second) in pairwise(knowns):
        if abs(flow - second) > CLOSING * scale:
            raise NotClosed(
                f"flows do not close: {name}, offtakes of {total:.6g} and {other} "
                f"leave {abs(flow - second):.6g} m3/s over"
            )
    headed = not (math.isnan(start.p) and math.isnan(start.H))
    if geometry.end != "jet":
        if not knowns:
            problems.append(Problem("Q", NOT_GIVEN, "a flow, or a closed end"))
        if not headed:
            problems.append(Problem("p", NOT_GIVEN, "a pressure p or a total head H at one end"))
    elif knowns and headed:
        given = "H" if math.isnan(start.p) else "p"
        problems.append(
            Problem(given, getattr(start, given), "not with the flow of a jet known: its pressure is ambient")
        )
    elif not knowns and not headed:
        problems.append(Problem("Q", NOT_GIVEN, "with a jet, the flow, or p or H at the start"))
    elif headed and start.at == "end":
        problems.append(Problem("at", start.at, "start: at the jet the pressure is ambient"))
    at_end = knowns[-1][1] if knowns else math.nan
    if geometry.end == "jet" and at_end < 0:
        problems.append(Problem("Q", at_end, "out of the jet, not into it"))
    moving = math.isnan(at_end) or at_end != 0 or bool(np.any(Qo != 0))
    if moving and math.isnan(start.viscosity) and np.isnan(geometry.f[:-1]).any():
        problems.append(Problem("mu", NOT_GIVEN, "a viscosity, or f on every leg"))
    return at_end, problems


def solve_flow(geometry: Geometry, start: RunStart, at_end: float, Qo: Array, Hp: Array) -> Flow:
    """March along the run from the end where the head is known."""
    if math.isnan(at_end):
        at_end = _jet_flow(geometry, start, Qo, Hp)
    drops = _pass(geometry, start, at_end, Qo, Hp)
    if geometry.end == "jet":
        anchored = replace(start, p=0.0, H=NOT_GIVEN, at="end")
    else:
        anchored = start
    head = _known_head(geometry, anchored, drops)
    top = head if anchored.at == "start" else head + drops.fall[-1]
    EGL = top - drops.fall
    EGL1, EGL2 = EGL[0::2], EGL[1::2]
    weight = start.rho * G
    half = start.rho / 2
    p1 = weight * (EGL1 - geometry.z) - half * geometry.alpha1 * drops.V1**2
    p2 = weight * (EGL2 - geometry.z) - half * geometry.alpha2 * drops.V2**2
    if geometry.end == "jet":
        p2[-1] = 0.0
    Vo, po = _offtakes(geometry, start.rho, drops, EGL1, EGL2, Qo)
    return Flow(
        rho=start.rho,
        Q1=drops.Q1,
        Q2=drops.Q2,
        V1=drops.V1,
        V2=drops.V2,
        EGL1=EGL1,
        EGL2=EGL2,
        p1=p1,
        p2=p2,
        Qo=Qo,
        Vo=Vo,
        po=po,
        Re=drops.Re,
        f=drops.f,
        hf=drops.hf,
        hK=drops.hK,
    )


def _pass(geometry: Geometry, start: RunStart, at_end: float, Qo: Array, Hp: Array) -> _Drops:
    running = np.cumsum(Qo)
    Q2 = at_end + (running[-1] - running)
    entering = at_end + running[-1]
    Q2[np.abs(Q2) <= ROUNDING * (abs(entering) + np.abs(Qo).sum())] = 0.0
    Q1 = np.concatenate([[0.0 if geometry.start == "closed" else entering], Q2[:-1]])
    V1 = np.divide(Q1, geometry.area1, out=np.zeros_like(Q1), where=geometry.area1 > 0)
    V2 = np.divide(Q2, geometry.area2, out=np.zeros_like(Q2), where=geometry.area2 > 0)
    V, D, L = V2[:-1], geometry.D2[:-1], geometry.L
    Re, f = _friction_factors(geometry, start, V, D)
    hf = f * L / D * V * np.abs(V) / (2 * G)
    hK = geometry.K * V2 * np.abs(V2) / (2 * G)
    falls = np.empty(2 * geometry.size - 1)
    falls[0::2] = hK - Hp
    falls[1::2] = hf
    fall = np.concatenate([[0.0], np.cumsum(falls)])
    return _Drops(Q1, Q2, V1, V2, Re, f, hf, hK, fall)


def _friction_factors(geometry: Geometry, start: RunStart, V: Array, D: Array) -> tuple[Array, Array]:
    """Reynolds number and Darcy factor of every leg."""
    mu = start.viscosity
    Re = np.zeros_like(V) if math.isnan(mu) else start.rho * np.abs(V) * D / mu
    given = ~np.isnan(geometry.f[:-1])
    f = np.where(given, np.nan_to_num(geometry.f[:-1]), 0.0)
    if not given.all() and not math.isnan(mu):
        rough = np.where(given, 0.0, geometry.e[:-1]) / D
        f = np.where(given, f, darcy(Re, rough, start.method))
    return Re, f


def _known_head(geometry: Geometry, start: RunStart, drops: _Drops) -> float:
    """Total head at the end where p or H is given [m]."""
    if not math.isnan(start.H):
        return start.H
    j = 0 if start.at == "start" else -1
    V = float(drops.V1[0] if j == 0 else drops.V2[-1])
    alpha = float(geometry.alpha1[0] if j == 0 else geometry.alpha2[-1])
    return float(geometry.z[j]) + start.p / (start.rho * G) + alpha * V * V / (2 * G)


def _offtakes(
    geometry: Geometry, rho: float, drops: _Drops, EGL1: Array, EGL2: Array, Qo: Array
) -> tuple[Array, Array]:
    """Velocity and pressure in each offtake; zero where there is none.

    The offtake's total head is that of the side of its node that carries the larger
    (the combined) flow, less its own loss.
    """
    known = geometry.offtake & ~geometry.offtake_fault
    Vo = np.divide(Qo, geometry.offtake_area, out=np.zeros_like(Qo), where=known)
    combined = np.where(np.abs(drops.Q2) > np.abs(drops.Q1), EGL2, EGL1)
    head = combined - geometry.Ko * Vo * np.abs(Vo) / (2 * G) - Vo**2 / (2 * G) - geometry.z
    return Vo, np.where(known, rho * G * head, 0.0)


def _jet_flow(geometry: Geometry, start: RunStart, Qo: Array, Hp: Array) -> float:
    """Flow of the jet that the head at the start sustains: continuity, Bernoulli and losses together."""

    def surplus(Q: float) -> float:
        drops = _pass(geometry, start, Q, Qo, Hp)
        Vj = float(drops.V2[-1])
        at_jet = float(geometry.z[-1]) + float(geometry.alpha2[-1]) * Vj * Vj / (2 * G)
        return _known_head(geometry, start, drops) - float(drops.fall[-1]) - at_jet

    available = surplus(0.0)
    if available < 0:
        raise NoSolution(f"the head at the start lies {-available:.4g} m too low to reach the jet")
    if available == 0:
        return 0.0
    high = float(geometry.area2[-1]) * math.sqrt(2 * G * available)
    # Beyond a million times the lossless velocity only rounding could balance the heads.
    for _ in range(20):
        if surplus(high) <= 0:
            return root(surplus, 0.0, high)
        high *= 2
    raise NoSolution("no finite flow balances the head at the start: the run offers no resistance")


def root(function: Callable[[float], float], low: float, high: float) -> float:
    """Root of a function between two points where its signs differ, to the last digits.

    Inverse quadratic interpolation where it is safe, else bisection: T. R.
    Chandrupatla, Advances in Engineering Software 28 (1997) 145-149 (from memory).
    """
    a, b = high, low
    fa, fb = function(a), function(b)
    c, fc = a, fa
    t = 0.5
    for _ in range(200):
        x = a + t * (b - a)
        fx = function(x)
        if (fx > 0) == (fa > 0):
            c, fc = a, fa
        else:
            c, b, fc, fb = b, a, fb, fa
        a, fa = x, fx
        best, value = (a, fa) if abs(fa) < abs(fb) else (b, fb)
        tolerance = 4e-16 * abs(best)
        if value == 0 or abs(b - a) <= 2 * tolerance:
            return best
        t = 0.5
        xi, phi = (a - b) / (c - b), (fa - fb) / (fc - fb)
        if phi**2 < xi and (1 - phi) ** 2 < 1 - xi:
            t = fa / (fb - fa) * fc / (fb - fc) + (c - a) / (b - a) * fa / (fc - fa) * fb / (fc - fb)
        least = tolerance / abs(b - a)
        t = min(1 - least, max(least, t))
    raise NoSolution("the flow of the jet was not found")  # pragma: no cover
