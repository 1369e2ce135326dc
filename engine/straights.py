"""Thrust along a straight pipe: restrictions in the line, wall drag, accelerating columns.

Incompressible fluid, full pipe of one diameter; gauge pressures; x along the
pipe in the direction of positive flow; F is the thrust of the fluid on the
fitting or pipe, R = -F the reaction of the restraint.
"""

from __future__ import annotations

from typing import NamedTuple

from .constants import G
from .guard import AT_LEAST_ONE, NON_NEGATIVE, POSITIVE, routine
from .momentum import count_given
from .numeric import NOT_GIVEN, Num, default, refuse
from .sections import circle


class InlineForces(NamedTuple):
    """Results of :func:`inline`."""

    Fx: Num
    """Thrust on the restriction along x [N]."""
    F: Num
    """Magnitude of the thrust [N]."""
    Rx: Num
    """Reaction of the restraint along x [N]."""
    R: Num
    """Magnitude of the reaction [N]."""
    V: Num
    """Velocity in the pipe [m/s]."""
    p2: Num
    """Gauge pressure downstream, where the flow fills the pipe again [Pa]."""
    dp: Num
    """Pressure loss p1 - p2 [Pa]."""


@routine(rho=POSITIVE, D=POSITIVE, K=NON_NEGATIVE, beta1=AT_LEAST_ONE, beta2=AT_LEAST_ONE)
def inline(
    rho: Num,
    D: Num,
    p1: Num,
    Q: Num,
    K: Num = NOT_GIVEN,
    dp: Num = NOT_GIVEN,
    p2: Num = NOT_GIVEN,
    beta1: Num = 1.0,
    beta2: Num = 1.0,
) -> InlineForces:
    """Thrust on a restriction in the line: valve, gate, orifice plate or strainer.

    Assumptions, axes and signs: see the module. The pipe has the same diameter on
    both sides, its length between the sections is short (no wall friction, no rise).
    Control volume: the fluid from section 1 upstream to section 2, so far
    downstream that the flow fills the pipe again and the pressure has recovered:
    dp is the lasting loss, not the reading of an orifice meter.
    Reverse flow (Q < 0) works: with K the loss, and so the thrust, turns round with
    the flow; dp and p2 are taken as given. A closed valve is Q = 0 with p2 or dp.

    Formula::

        dp = K rho V |V| / 2,    p2 = p1 - dp
        Fx = (p1 - p2) A + (beta1 - beta2) rho V^2 A

    Parameters
    ----------
    rho : density [kg/m3]
    D : inside diameter of the pipe [m]
    p1 : gauge pressure at section 1 [Pa]
    Q : flow from section 1 to section 2 [m3/s]
    K : loss coefficient on the velocity in the pipe [-]
    dp : lasting pressure loss p1 - p2 [Pa]
    p2 : gauge pressure at section 2 [Pa]; exactly one of K, dp and p2 is given
    beta1, beta2 : momentum corrections [-]

    All are floats or arrays that broadcast together.

    Returns
    -------
    InlineForces
        Of the broadcast shape.

    Raises
    ------
    OutOfRange
        A float call with arguments out of range (an array call gets NaN there).
    NoSolution
        A float call with none of K, dp and p2, or more than one.

    Examples
    --------
    A closed valve with 6 bar on one side and 1 bar on the other:

    >>> print(f"{inline(1000.0, 0.2, 6e5, 0.0, p2=1e5).Fx:.1f} N")
    15708.0 N

    Source: derived from the momentum balance.
    """
    p1 = refuse(count_given(K, dp, p2) != 1, p1, "give exactly one of K, dp and p2")
    A = circle(D)
    V = Q / A
    dp = default(dp, default(p1 - p2, K * (0.5 * rho * (V * abs(V)))))
    Fx = dp * A + (beta1 - beta2) * (rho * (Q * V))
    F = abs(Fx)
    return InlineForces(Fx, F, 0.0 - Fx, F, V, p1 - dp, dp)


class StraightForces(NamedTuple):
    """Results of :func:`straight`."""

    Fx: Num
    """Wall drag: thrust of the fluid on the pipe along x [N]."""
    F: Num
    """Magnitude of the wall drag [N]."""
    Rx: Num
    """Reaction of the restraint along x [N]."""
    R: Num
    """Magnitude of the reaction [N]."""
    V: Num
    """Velocity [m/s]."""
    dp: Num
    """Pressure loss by friction [Pa], signed as the flow."""
    tau: Num
    """Shear stress on the wall [Pa]."""
    W: Num
    """Weight of the fluid in the pipe [N]."""


@routine(rho=POSITIVE, D=POSITIVE, L=POSITIVE, f=NON_NEGATIVE)
def straight(rho: Num, D: Num, L: Num, Q: Num, f: Num = NOT_GIVEN, dp: Num = NOT_GIVEN) -> StraightForces:
    """Drag of the flow on the wall of a straight pipe.

    Assumptions, axes and signs: see the module. The flow is steady and its
    profile does not change along the pipe. Control volume: the fluid in the pipe.
    The slope of the pipe does not matter: along the axis, the weight of the fluid
    is carried by the pressures at the two ends, and only friction reaches the
    wall. Square to the axis the pipe carries the weight W of the fluid times the
    cosine of the slope, which is not part of Fx.
    Reverse flow (Q < 0) works: friction turns round with the flow. A friction
    loss dp is taken with the sign given. No flow gives no drag.

    Formula::

        dp = f L/D rho V |V| / 2
        Fx = dp pi D^2/4 = tau pi D L,    tau = dp D/(4 L),    W = rho g L pi D^2/4

    Parameters
    ----------
    rho : density [kg/m3]
    D : inside diameter [m]
    L : length [m]
    Q : flow along x [m3/s]
    f : Darcy friction factor [-]
    dp : pressure loss by friction alone, without the part due to a rise [Pa];
        exactly one of f and dp is given

    All are floats or arrays that broadcast together.

    Returns
    -------
    StraightForces
        Of the broadcast shape.

    Raises
    ------
    OutOfRange
        A float call with arguments out of range (an array call gets NaN there).
    NoSolution
        A float call with both or neither of f and dp.

    Examples
    --------
    >>> f = straight(1000.0, 0.3, 100.0, 0.15, f=0.018)
    >>> print(f"{f.Fx:.1f} N, dp = {f.dp:.0f} Pa, tau = {f.tau:.2f} Pa")
    954.9 N, dp = 13509 Pa, tau = 10.13 Pa

    Source: derived from the momentum balance; Darcy-Weisbach equation.
    """
    Q = refuse(count_given(f, dp) != 1, Q, "give exactly one of f and dp")
    A = circle(D)
    V = Q / A
    dp = default(dp, f * (L / D) * (0.5 * rho * (V * abs(V))))
    Fx = dp * A
    F = abs(Fx)
    return StraightForces(Fx, F, 0.0 - Fx, F, V, dp, dp * D / (4 * L), rho * G * L * A)


class AccelForces(NamedTuple):
    """Results of :func:`accel`."""

    Fx: Num
    """Unbalanced thrust of the fluid on the leg along x [N]."""
    F: Num
    """Magnitude of the thrust [N]."""
    Rx: Num
    """Reaction of the restraint along x [N]."""
    R: Num
    """Magnitude of the reaction [N]."""
    dp: Num
    """Pressure difference p1 - p2 that accelerates the column [Pa]."""


@routine(rho=POSITIVE, D=POSITIVE, L=NON_NEGATIVE)
def accel(rho: Num, D: Num, L: Num, dQdt: Num) -> AccelForces:
    """Pressure difference and thrust of a column of fluid that speeds up or slows down.

    Assumptions, axes and signs: see the module. Rigid column: the change is slow
    compared with the travel of a pressure wave along the pipe and back (2 L/a;
    otherwise use the surge functions). Friction acts besides and is not included in dp.
    Control volume: the fluid of a straight leg between two fittings that turn the
    flow off its axis or close it, so that no momentum leaves along x. The fittings
    at its ends take p1 A and p2 A; what is left over for the leg is Fx, and
    friction, which acts inside the leg, does not change it.
    Either direction of flow and of change works.

    Formula::

        dp = rho L dQdt / A
        Fx = - dM/dt = - rho L dQdt

    Parameters
    ----------
    rho : density [kg/m3]
    D : inside diameter [m]
    L : length of the leg [m]
    dQdt : rate of change of the flow along x [m3/s2]; negative where a flow along x slows down

    All are floats or arrays that broadcast together.

    Returns
    -------
    AccelForces
        Of the broadcast shape.

    Raises
    ------
    OutOfRange
        A float call with arguments out of range (an array call gets NaN there).

    Examples
    --------
    A flow of 0.1 m3/s is stopped evenly in 20 s:

    >>> f = accel(1000.0, 0.3, 500.0, -0.1 / 20.0)
    >>> print(f"{f.dp:.0f} Pa, {f.Fx:.0f} N")
    -35368 Pa, 2500 N

    Source: derived from the momentum balance (its unsteady term).
    """
    rate = rho * L * dQdt
    Fx = 0.0 - rate
    F = abs(rate)
    return AccelForces(Fx, F, rate, F, rate / circle(D))
