"""Sections of a pipe and continuity: areas, velocities, flows, velocity profiles.

Flows and velocities carry a sign: positive in the direction that the caller
calls positive, usually from section 1 to section 2.
"""

from __future__ import annotations

import math
from typing import Any, Final, NamedTuple

import numpy as np
import numpy.typing as npt

from .errors import OutOfRange, Problem
from .guard import AT_LEAST_ONE, POSITIVE, Bound, routine
from .numeric import NOT_GIVEN, Num, choose, is_given, refuse, sqrt

QUARTER_PI: Final = math.pi / 4

PROFILES: Final = ("turbulent", "laminar")
"""The words that TB_PROFILE takes."""


class Area(NamedTuple):
    """Result of :func:`area`."""

    A: Num


class Velocity(NamedTuple):
    """Result of :func:`velocity`."""

    V: Num


class Flow(NamedTuple):
    """Result of :func:`flow` and of :func:`branchflow`."""

    Q: Num


class MassFlow(NamedTuple):
    """Result of :func:`massflow`."""

    mdot: Num


class Reynolds(NamedTuple):
    """Result of :func:`reynolds`."""

    Re: Num


class Profile(NamedTuple):
    """Results of :func:`profile`."""

    alpha: Num
    beta: Num
    ratio: Num
    n: Num


def circle(D: Num) -> Num:
    """Area of a circle of diameter D [m] -> [m2], for other routines; no checks."""
    return QUARTER_PI * (D * D)


@routine(D=POSITIVE)
def area(D: Num) -> Area:
    """Area of a full circular section.

    Assumes a round bore that is full. Formula: A = pi D^2 / 4.

    Parameters
    ----------
    D : float or array
        Inside diameter [m], above 0.

    Returns
    -------
    Area
        A [m2], of the shape of ``D``.

    Raises
    ------
    OutOfRange
        If ``D`` is not above 0.

    Notes
    -----
    Source: geometry of the circle.

    Examples
    --------
    >>> round(area(0.3).A, 6)
    0.070686
    """
    return Area(circle(D))


@routine(D=POSITIVE)
def velocity(Q: Num, D: Num) -> Velocity:
    """Mean velocity in a full circular pipe.

    Assumes a pipe that runs full. The velocity has the sign of the flow.
    Formula: V = Q / A, A = pi D^2 / 4.

    Parameters
    ----------
    Q : float or array
        Volume flow [m3/s], either sign.
    D : float or array
        Inside diameter [m], above 0.

    Returns
    -------
    Velocity
        V [m/s], of the broadcast shape.

    Raises
    ------
    OutOfRange
        If ``D`` is not above 0.

    Notes
    -----
    Source: continuity, the definition of the mean velocity.

    Examples
    --------
    >>> round(velocity(0.1, 0.3).V, 5)
    1.41471
    """
    return Velocity(Q / circle(D))


@routine(D=POSITIVE)
def flow(V: Num, D: Num) -> Flow:
    """Volume flow of a full circular pipe.

    Assumes a pipe that runs full. The flow has the sign of the velocity.
    Formula: Q = V A, A = pi D^2 / 4.

    Parameters
    ----------
    V : float or array
        Mean velocity [m/s], either sign.
    D : float or array
        Inside diameter [m], above 0.

    Returns
    -------
    Flow
        Q [m3/s], of the broadcast shape.

    Raises
    ------
    OutOfRange
        If ``D`` is not above 0.

    Notes
    -----
    Source: continuity.

    Examples
    --------
    >>> round(flow(1.5, 0.3).Q, 6)
    0.106029
    """
    return Flow(V * circle(D))


@routine(rho=POSITIVE)
def massflow(rho: Num, Q: Num) -> MassFlow:
    """Mass flow of a known volume flow.

    Assumes one density over the section. The mass flow has the sign of the flow.
    Formula: mdot = rho Q.

    Parameters
    ----------
    rho : float or array
        Density [kg/m3], above 0.
    Q : float or array
        Volume flow [m3/s], either sign.

    Returns
    -------
    MassFlow
        mdot [kg/s], of the broadcast shape.

    Raises
    ------
    OutOfRange
        If ``rho`` is not above 0.

    Notes
    -----
    Source: definition.

    Examples
    --------
    >>> massflow(1000.0, 0.1).mdot
    100.0
    """
    return MassFlow(rho * Q)


@routine(rho=POSITIVE, mu=POSITIVE, D=POSITIVE)
def reynolds(rho: Num, mu: Num, V: Num, D: Num) -> Reynolds:
    """Reynolds number of a full circular pipe.

    Assumes a Newtonian fluid in a full bore. Formula: Re = rho |V| D / mu. It has
    no sign: a reversed flow has the same Reynolds number.

    Parameters
    ----------
    rho : float or array
        Density [kg/m3], above 0.
    mu : float or array
        Dynamic viscosity [Pa s], above 0.
    V : float or array
        Mean velocity [m/s], either sign.
    D : float or array
        Inside diameter [m], above 0.

    Returns
    -------
    Reynolds
        Re [-], of the broadcast shape.

    Raises
    ------
    OutOfRange
        If ``rho``, ``mu`` or ``D`` is not above 0.

    Notes
    -----
    Source: definition of the Reynolds number, ISO 80000-11.

    Examples
    --------
    >>> round(reynolds(998.0, 1.0e-3, 1.5, 0.3).Re, 3)
    449100.0
    """
    return Reynolds(rho * abs(V) * D / mu)


@routine(n=AT_LEAST_ONE, f=Bound(low=0.0, high=1.0, open_low=True))
def profile(regime: str = "turbulent", n: Num = NOT_GIVEN, f: Num = NOT_GIVEN) -> Profile:
    """Kinetic energy and momentum corrections of a developed profile in a circular pipe.

    Assumes fully developed flow, far from bends and fittings; behind them the
    corrections are larger. alpha is the true kinetic energy flux over that of
    the mean velocity V, beta the true momentum flux over that of V.

    - "laminar": the parabola u/Vmax = 1 - (r/R)^2, so that alpha = 2,
      beta = 4/3, V/Vmax = 1/2. Neither ``n`` nor ``f`` is taken, and the
      result ``n`` is 0: there is no power law.
    - "turbulent": the power law u/Vmax = (y/R)^(1/n), y from the wall. Give
      either n or the friction factor f, from which n = 1/sqrt(f).

      V/Vmax = 2 n^2 / ((n + 1)(2 n + 1))
      alpha = (n + 1)^3 (2 n + 1)^3 / (4 n^4 (n + 3)(2 n + 3))
      beta = (n + 1)(2 n + 1)^2 / (4 n^2 (n + 2))

    Parameters
    ----------
    regime : {"turbulent", "laminar"}
        The kind of profile.
    n : float or array, optional
        Exponent of the power law [-], at least 1; 7 is the usual value.
    f : float or array, optional
        Darcy friction factor [-], above 0 and at most 1.

    Returns
    -------
    Profile
        alpha, beta, ratio (V/Vmax) and n used, all [-], of the broadcast shape.

    Raises
    ------
    OutOfRange
        If ``n``, ``f`` or ``regime`` is not allowed.
    NoSolution
        Turbulent, if not exactly one of ``n`` and ``f`` is given; laminar, if
        either is given.

    Notes
    -----
    Source: alpha, beta and V/Vmax are derived by integrating the profile over
    the section (they appear in this form in C. L. Chen, Momentum and energy
    coefficients based on power-law velocity profile, J. Hydraul. Eng. 118
    (1992) 1571, from memory). n = 1/sqrt(f): W. Nunner, VDI-Forschungsheft 455
    (1956), from memory.

    Examples
    --------
    >>> [round(x, 4) for x in profile("turbulent", 7.0)]
    [1.0584, 1.0204, 0.8167, 7.0]
    >>> [round(x, 4) for x in profile("laminar")]
    [2.0, 1.3333, 0.5, 0.0]
    """
    if regime not in PROFILES:
        raise OutOfRange([Problem("regime", regime, " or ".join(PROFILES))])
    if regime == "laminar":
        given = is_given(n) | is_given(f)
        one = refuse(given, 1.0, "a laminar profile takes neither n nor f")
        return Profile(2.0 * one, 4.0 / 3.0 * one, 0.5 * one, 0.0 * one)
    n = refuse(
        is_given(n) == is_given(f),
        choose(is_given(n), n, 1.0 / sqrt(f)),
        "give exactly one of n (7 is usual) and f",
    )
    a, b = n + 1.0, 2.0 * n + 1.0
    nn = n * n
    return Profile(
        alpha=(a * b) ** 3 / (4.0 * nn * nn * (n + 3.0) * (2.0 * n + 3.0)),
        beta=a * b * b / (4.0 * nn * (n + 2.0)),
        ratio=2.0 * nn / (a * b),
        n=n,
    )


def branchflow(Q: npt.ArrayLike) -> Flow:
    """Flow that closes a junction.

    Assumes steady flow of a fluid of constant density, so that volume flows
    add up. Control volume: the junction. Flows are positive into it, so the
    result is positive where the missing branch feeds the junction and negative
    where it drains it. Formula: Q = - sum of the known flows.

    Parameters
    ----------
    Q : sequence of float, or array (..., m)
        The m known flows [m3/s], m at least 1; with more dimensions each row
        (last axis) is a junction of its own.

    Returns
    -------
    Flow
        Q [m3/s]: a float for one junction, else an array (...), NaN for a
        junction with a flow that is not a finite number.

    Raises
    ------
    OutOfRange
        If no flow is given; for one junction also with every flow that is not
        a finite number.

    Notes
    -----
    Source: continuity at a junction.

    Examples
    --------
    >>> round(branchflow([0.30, -0.18]).Q, 12)
    -0.12
    """
    flows = np.asarray(Q, dtype=float)
    if flows.ndim == 0:
        flows = flows.reshape(1)
    if flows.shape[-1] == 0:
        raise OutOfRange([Problem("Q", "no flow", "at least one known flow")], "branchflow")
    if flows.ndim > 1:
        with np.errstate(invalid="ignore", over="ignore"):
            total: Any = -flows.sum(axis=-1)
        return Flow(np.where(np.isfinite(total), total, np.nan))
    problems = [
        Problem(f"Q[{i}]", float(x), "any finite number")
        for i, x in enumerate(flows, 1)
        if not math.isfinite(x)
    ]
    if problems:
        raise OutOfRange(problems, "branchflow")
    # fsum: a junction whose flows cancel gives exactly 0, not a rounding residue.
    return Flow(0.0 - math.fsum(flows))
