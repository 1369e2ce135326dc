"""Thrust on bends, reducers and tees: the plane fittings of a pipe run.

All three are the momentum balance of :mod:`~thrustbook.engine.balance` on the
fluid between the flanges. Common to all:

- incompressible, steady flow, full pipes; gauge pressures, ambient pressure outside;
- x along the pipe at section 1 in the direction of positive flow, y towards the
  side to which the outlet or branch turns;
- F is the thrust of the fluid on the fitting, R = -F the reaction of the restraint;
- the weight of the fluid is left out, because a plane fitting does not say which
  way is down: take it with ``balance`` where it matters;
- no flow (static or test pressure) and reverse flow work unless a routine says otherwise.
"""

from __future__ import annotations

import math
from typing import Final, NamedTuple

from .guard import AT_LEAST_ONE, HALF_TURN, NON_NEGATIVE, POSITIVE, routine
from .momentum import magnitude, next_pressure, section_force
from .numeric import NOT_GIVEN, Num, atan2, cos, default, is_given, minimum, refuse, sin
from .sections import circle

ROUNDING: Final = 1e-12
"""A flow that is this small against the flow at section 1 is the rounding of a difference."""


class BendForces(NamedTuple):
    """Results of :func:`bend`."""

    Fx: Num
    """Thrust on the bend along the incoming pipe [N]."""
    Fy: Num
    """Thrust on the bend towards the side to which it turns [N]; negative: outwards."""
    F: Num
    """Magnitude of the thrust [N]."""
    dir: Num
    """Direction of the thrust from x towards y [rad], above -pi to pi."""
    Rx: Num
    """Reaction of the restraint along x [N]."""
    Ry: Num
    """Reaction of the restraint along y [N]."""
    R: Num
    """Magnitude of the reaction [N]."""
    V1: Num
    """Velocity at section 1 [m/s]."""
    V2: Num
    """Velocity at section 2 [m/s]."""
    p2: Num
    """Gauge pressure at section 2 [Pa]."""


@routine(
    rho=POSITIVE,
    D1=POSITIVE,
    theta=HALF_TURN,
    D2=POSITIVE,
    K=NON_NEGATIVE,
    alpha1=AT_LEAST_ONE,
    alpha2=AT_LEAST_ONE,
    beta1=AT_LEAST_ONE,
    beta2=AT_LEAST_ONE,
)
def bend(
    rho: Num,
    D1: Num,
    p1: Num,
    Q: Num,
    theta: Num,
    D2: Num = NOT_GIVEN,
    K: Num = 0.0,
    dz: Num = 0.0,
    p2: Num = NOT_GIVEN,
    alpha1: Num = 1.0,
    alpha2: Num = 1.0,
    beta1: Num = 1.0,
    beta2: Num = 1.0,
) -> BendForces:
    """Thrust on a bend, which may reduce or expand, and the pressure that leaves it.

    Assumptions, axes and signs: see the module. Control volume: the fluid from
    section 1 (inlet, along x) to section 2 (outlet, turned by theta towards y).
    Reverse flow (Q < 0) works: the loss then acts from section 2 to section 1,
    and K still refers to the velocity at section 1.

    Formula, with A = pi D^2/4 and V = Q/A::

        p2 = p1 + rho/2 (alpha1 V1^2 - alpha2 V2^2 - K V1 |V1|) - rho g dz
        Fx = (p1 + beta1 rho V1^2) A1 - (p2 + beta2 rho V2^2) A2 cos theta
        Fy = - (p2 + beta2 rho V2^2) A2 sin theta

    Parameters
    ----------
    rho : density [kg/m3]
    D1 : inside diameter at section 1 [m]
    p1 : gauge pressure at section 1 [Pa]
    Q : flow from section 1 to section 2 [m3/s]
    theta : deflection [rad], 0 (straight) to pi (return bend)
    D2 : diameter at section 2 [m]; not given: D1
    K : loss coefficient on the velocity V1 of section 1 [-]
    dz : rise z2 - z1 [m]
    p2 : gauge pressure at section 2 [Pa]; given, it stands in place of Bernoulli's
        equation, and K, dz, alpha1 and alpha2 are not used
    alpha1, alpha2 : kinetic energy corrections [-]
    beta1, beta2 : momentum corrections [-]

    All are floats or arrays that broadcast together.

    Returns
    -------
    BendForces
        Of the broadcast shape.

    Raises
    ------
    OutOfRange
        A float call with arguments out of range (an array call gets NaN there).

    Examples
    --------
    >>> f = bend(1000.0, 0.3, 4e5, 0.2, 1.5707963267948966)
    >>> print(f"{f.Fx:.1f} {f.Fy:.1f} {f.R:.1f} N")
    28840.2 -28840.2 40786.2 N

    Source: derived from the momentum balance; static form 2 p A sin(theta/2) as in
    AWWA M23 and Moser and Folkman, Buried Pipe Design, chapter 4.
    """
    D2 = default(D2, D1)
    A1 = circle(D1)
    A2 = circle(D2)
    V1 = Q / A1
    V2 = Q / A2
    p2 = default(p2, next_pressure(p1, rho, V1, V2, dz, K * (V1 * abs(V1)), alpha1, alpha2))
    M2 = section_force(p2, A2, rho, Q, V2, beta2)
    Fx = section_force(p1, A1, rho, Q, V1, beta1) - M2 * cos(theta)
    Fy = 0.0 - M2 * sin(theta)
    F = magnitude(Fx, Fy)
    return BendForces(Fx, Fy, F, atan2(Fy, Fx), 0.0 - Fx, 0.0 - Fy, F, V1, V2, p2)


class ReducerForces(NamedTuple):
    """Results of :func:`reducer`."""

    Fx: Num
    """Thrust on the reducer along x [N]; an expander is usually pushed back, Fx < 0."""
    F: Num
    """Magnitude of the thrust [N]."""
    Rx: Num
    """Reaction of the restraint along x [N]."""
    R: Num
    """Magnitude of the reaction [N]."""
    V1: Num
    """Velocity at section 1 [m/s]."""
    V2: Num
    """Velocity at section 2 [m/s]."""
    p2: Num
    """Gauge pressure at section 2 [Pa]."""


@routine(
    rho=POSITIVE,
    D1=POSITIVE,
    D2=POSITIVE,
    K=NON_NEGATIVE,
    alpha1=AT_LEAST_ONE,
    alpha2=AT_LEAST_ONE,
    beta1=AT_LEAST_ONE,
    beta2=AT_LEAST_ONE,
)
def reducer(
    rho: Num,
    D1: Num,
    D2: Num,
    p1: Num,
    Q: Num,
    K: Num = 0.0,
    dz: Num = 0.0,
    p2: Num = NOT_GIVEN,
    alpha1: Num = 1.0,
    alpha2: Num = 1.0,
    beta1: Num = 1.0,
    beta2: Num = 1.0,
) -> ReducerForces:
    """Thrust on a reducer or expander, and the pressure that leaves it.

    Assumptions, axes and signs: see the module. Control volume: the fluid from
    section 1 to section 2, both square to x. Reverse flow (Q < 0) works: the
    loss then acts from section 2 to section 1.

    Formula, with V the velocity in the smaller of the two pipes::

        p2 = p1 + rho/2 (alpha1 V1^2 - alpha2 V2^2 - K V |V|) - rho g dz
        Fx = (p1 + beta1 rho V1^2) A1 - (p2 + beta2 rho V2^2) A2

    Parameters
    ----------
    rho : density [kg/m3]
    D1, D2 : inside diameters at sections 1 and 2 [m]; D2 > D1 is an expander
    p1 : gauge pressure at section 1 [Pa]
    Q : flow from section 1 to section 2 [m3/s]
    K : loss coefficient on the velocity of the small pipe [-]
    dz : rise z2 - z1 [m]
    p2 : gauge pressure at section 2 [Pa]; given, it stands in place of Bernoulli's
        equation, and K, dz, alpha1 and alpha2 are not used
    alpha1, alpha2 : kinetic energy corrections [-]
    beta1, beta2 : momentum corrections [-]

    All are floats or arrays that broadcast together.

    Returns
    -------
    ReducerForces
        Of the broadcast shape.

    Raises
    ------
    OutOfRange
        A float call with arguments out of range (an array call gets NaN there).

    Examples
    --------
    >>> f = reducer(1000.0, 0.3, 0.2, 4e5, 0.2)
    >>> print(f"{f.Fx:.1f} N, p2 = {f.p2:.0f} Pa")
    15511.5 N, p2 = 383739 Pa

    Source: derived from the momentum balance.
    """
    A1 = circle(D1)
    A2 = circle(D2)
    V1 = Q / A1
    V2 = Q / A2
    V = Q / minimum(A1, A2)
    p2 = default(p2, next_pressure(p1, rho, V1, V2, dz, K * (V * abs(V)), alpha1, alpha2))
    Fx = section_force(p1, A1, rho, Q, V1, beta1) - section_force(p2, A2, rho, Q, V2, beta2)
    F = abs(Fx)
    return ReducerForces(Fx, F, 0.0 - Fx, F, V1, V2, p2)


class TeeForces(NamedTuple):
    """Results of :func:`tee`."""

    Fx: Num
    """Thrust on the tee along the run [N]."""
    Fy: Num
    """Thrust on the tee towards the branch [N]; negative: away from the branch."""
    F: Num
    """Magnitude of the thrust [N]."""
    dir: Num
    """Direction of the thrust from x towards y [rad], above -pi to pi."""
    Rx: Num
    """Reaction of the restraint along x [N]."""
    Ry: Num
    """Reaction of the restraint along y [N]."""
    R: Num
    """Magnitude of the reaction [N]."""
    Q2: Num
    """Flow that goes on along the run, Q1 - Q3 [m3/s]."""
    V1: Num
    """Velocity at section 1 [m/s]."""
    V2: Num
    """Velocity at section 2 [m/s]."""
    V3: Num
    """Velocity in the branch [m/s]."""
    p2: Num
    """Gauge pressure at section 2 [Pa]."""
    p3: Num
    """Gauge pressure at section 3 [Pa]."""


@routine(
    rho=POSITIVE,
    D1=POSITIVE,
    D3=POSITIVE,
    theta=HALF_TURN,
    D2=POSITIVE,
    K12=NON_NEGATIVE,
    K13=NON_NEGATIVE,
    alpha1=AT_LEAST_ONE,
    alpha2=AT_LEAST_ONE,
    alpha3=AT_LEAST_ONE,
    beta1=AT_LEAST_ONE,
    beta2=AT_LEAST_ONE,
    beta3=AT_LEAST_ONE,
)
def tee(
    rho: Num,
    D1: Num,
    p1: Num,
    Q1: Num,
    D3: Num,
    Q3: Num,
    theta: Num = math.pi / 2,
    D2: Num = NOT_GIVEN,
    K12: Num = 0.0,
    K13: Num = 0.0,
    dz2: Num = 0.0,
    dz3: Num = 0.0,
    p2: Num = NOT_GIVEN,
    p3: Num = NOT_GIVEN,
    alpha1: Num = 1.0,
    alpha2: Num = 1.0,
    alpha3: Num = 1.0,
    beta1: Num = 1.0,
    beta2: Num = 1.0,
    beta3: Num = 1.0,
) -> TeeForces:
    """Thrust on a tee or wye with a branch at any angle, and the pressures that leave it.

    Assumptions, axes and signs: see the module. Control volume: the fluid between
    section 1 (run in), section 2 (run out, straight on along x) and section 3
    (branch, leaving at theta from x towards y: pi/2 for a tee, less for a wye that
    points downstream, more for one that points back). The run goes on with
    Q2 = Q1 - Q3.

    Direction of flow: dividing flow, a closed run (Q3 = Q1), a closed branch
    (Q3 = 0), no flow, and the whole reversed (sections 2 and 3 feed section 1) all
    work; the losses act along the true flow, on V1. Where section 1 does not carry
    the whole flow (Q2 and Q3 of opposite signs), K12 and K13 have no meaning: a
    pressure that would rest on one is refused; give p2 and p3, or set the
    coefficient to 0.

    Formula, for i = 2, 3::

        pi = p1 + rho/2 (alpha1 V1^2 - alphai Vi^2 - K1i V1 |V1|) - rho g dzi
        Mi = (pi + betai rho Vi^2) Ai
        Fx = M1 - M2 - M3 cos theta
        Fy = - M3 sin theta

    Parameters
    ----------
    rho : density [kg/m3]
    D1 : inside diameter of the run at section 1 [m]
    p1 : gauge pressure at section 1 [Pa]
    Q1 : flow into the tee at section 1 [m3/s]
    D3 : inside diameter of the branch [m]
    Q3 : flow out through the branch [m3/s]
    theta : angle of the branch to the run's direction of flow [rad], 0 to pi
    D2 : inside diameter of the run at section 2 [m]; not given: D1
    K12, K13 : loss coefficients from 1 to 2 and from 1 to 3 on the velocity V1 [-]
    dz2, dz3 : rises z2 - z1 and z3 - z1 [m]
    p2, p3 : gauge pressures [Pa]; given, they stand in place of Bernoulli's equation
    alpha1, alpha2, alpha3 : kinetic energy corrections [-]
    beta1, beta2, beta3 : momentum corrections [-]

    All are floats or arrays that broadcast together.

    Returns
    -------
    TeeForces
        Of the broadcast shape.

    Raises
    ------
    OutOfRange
        A float call with arguments out of range (an array call gets NaN there).
    NoSolution
        A float call that rests on K12 or K13 where section 1 does not carry the whole flow.

    Examples
    --------
    >>> f = tee(1000.0, 0.4, 5e5, 0.3, 0.2, 0.1)
    >>> print(f"{f.Fx:.1f} {f.Fy:.1f} N, Q2 = {f.Q2:.1f} m3/s")
    198.9 -15956.6 N, Q2 = 0.2 m3/s

    Source: derived from the momentum balance.
    """
    D2 = default(D2, D1)
    A1 = circle(D1)
    A2 = circle(D2)
    A3 = circle(D3)
    Q2 = Q1 - Q3
    V1 = Q1 / A1
    V2 = Q2 / A2
    V3 = Q3 / A3
    crossed = Q2 * Q3 < -ROUNDING * (Q1 * Q1)
    # Products of conditions, not "and", so that one line serves floats and arrays.
    needs_K = (K12 * (1 - is_given(p2) * 1) > 0) | (K13 * (1 - is_given(p3) * 1) > 0)
    V1V1 = refuse(
        crossed & needs_K,
        V1 * abs(V1),
        "section 1 does not carry the whole flow, so that loss coefficients K12 and K13 on its "
        "velocity have no meaning; give p2 and p3",
    )
    p2 = default(p2, next_pressure(p1, rho, V1, V2, dz2, K12 * V1V1, alpha1, alpha2))
    p3 = default(p3, next_pressure(p1, rho, V1, V3, dz3, K13 * V1V1, alpha1, alpha3))
    M3 = section_force(p3, A3, rho, Q3, V3, beta3)
    Fx = (
        section_force(p1, A1, rho, Q1, V1, beta1)
        - section_force(p2, A2, rho, Q2, V2, beta2)
        - M3 * cos(theta)
    )
    Fy = 0.0 - M3 * sin(theta)
    F = magnitude(Fx, Fy)
    return TeeForces(Fx, Fy, F, atan2(Fy, Fx), 0.0 - Fx, 0.0 - Fy, F, Q2, V1, V2, V3, p2, p3)
