"""Thrust on the ends of a pipe: nozzles and closed ends.

Incompressible, steady flow; gauge pressures, ambient pressure outside; x along
the pipe towards its end; F is the thrust of the fluid, R = -F the reaction of
the restraint. The weight of the fluid is left out.
"""

from __future__ import annotations

from typing import NamedTuple

from .constants import G
from .guard import AT_LEAST_ONE, NON_NEGATIVE, POSITIVE, Bound, routine
from .momentum import count_given, section_force
from .numeric import NOT_GIVEN, Num, choose, default, is_given, refuse, sqrt
from .sections import circle


class NozzleForces(NamedTuple):
    """Results of :func:`nozzle`."""

    Fx: Num
    """Thrust on the nozzle along the flow [N]: it pulls on its joint when positive."""
    F: Num
    """Magnitude of the thrust [N]."""
    Rx: Num
    """Reaction of the joint along the flow [N]."""
    R: Num
    """Magnitude of the reaction [N]."""
    Q: Num
    """Flow [m3/s]."""
    V1: Num
    """Velocity in the pipe [m/s]."""
    V2: Num
    """Velocity of the jet [m/s]."""
    p1: Num
    """Gauge pressure in the pipe [Pa]."""
    M2: Num
    """Momentum flux of the jet, beta2 rho Q V2 [N]."""


@routine(
    rho=POSITIVE,
    D1=POSITIVE,
    D2=POSITIVE,
    Q=NON_NEGATIVE,
    K=NON_NEGATIVE,
    Cv=Bound(low=0.0, high=1.0, open_low=True),
    alpha1=AT_LEAST_ONE,
    alpha2=AT_LEAST_ONE,
    beta1=AT_LEAST_ONE,
    beta2=AT_LEAST_ONE,
)
def nozzle(
    rho: Num,
    D1: Num,
    D2: Num,
    p1: Num = NOT_GIVEN,
    Q: Num = NOT_GIVEN,
    p2: Num = 0.0,
    K: Num = 0.0,
    Cv: Num = NOT_GIVEN,
    dz: Num = 0.0,
    alpha1: Num = 1.0,
    alpha2: Num = 1.0,
    beta1: Num = 1.0,
    beta2: Num = 1.0,
) -> NozzleForces:
    """Thrust on a nozzle at the end of a pipe; flow from pressure or pressure from flow.

    Assumptions, axes and signs: see the module. The jet is parallel where its
    diameter is D2 (for a nozzle with a contracting jet, the vena contracta).
    Control volume: the fluid from section 1 in the pipe to section 2 in the jet.
    Reverse flow (Q < 0) is refused: what flows in from outside forms no jet at
    section 2. No flow works, with Q = 0; p1 is then p2 + rho g dz.

    Formula: continuity and Bernoulli's equation together, then the balance::

        V1 A1 = V2 A2 = Q
        p1 + alpha1 rho V1^2/2 = p2 + rho g dz + (alpha2 + K) rho V2^2/2
        Fx = (p1 + beta1 rho V1^2) A1 - (p2 + beta2 rho V2^2) A2

    Parameters
    ----------
    rho : density [kg/m3]
    D1 : inside diameter of the pipe [m]
    D2 : diameter of the jet [m]
    p1 : gauge pressure in the pipe [Pa]
    Q : flow [m3/s]; exactly one of p1 and Q is given
    p2 : gauge pressure around the jet [Pa], 0 in the open
    K : loss coefficient on the jet velocity V2 [-]
    Cv : velocity coefficient [-], in place of K: K = 1/Cv^2 - 1
    dz : rise z2 - z1 [m]
    alpha1, alpha2 : kinetic energy corrections [-]
    beta1, beta2 : momentum corrections [-]

    All are floats or arrays that broadcast together.

    Returns
    -------
    NozzleForces
        Of the broadcast shape.

    Raises
    ------
    OutOfRange
        A float call with arguments out of range (an array call gets NaN there).
    NoSolution
        A float call with both or neither of p1 and Q; with K and Cv together;
        with a pressure that drives no jet; or with p1 where D2 is so large that
        the pressure does not fix the flow.

    Examples
    --------
    >>> f = nozzle(1000.0, 0.1, 0.05, p1=4e5)
    >>> print(f"{f.Q:.5f} m3/s, thrust {f.Fx:.1f} N, jet {f.M2:.1f} N")
    0.05736 m3/s, thrust 1885.0 N, jet 1675.5 N

    Source: derived from continuity, Bernoulli's equation and the momentum balance.
    """
    # A refused row is marked on the area: a mark on p1 would read as "not given".
    A1 = refuse(count_given(p1, Q) != 1, circle(D1), "give exactly one of p1 and Q")
    A1 = refuse(is_given(Cv) & (K > 0), A1, "give K or Cv, not both")
    A2 = circle(D2)
    loss = alpha2 + choose(is_given(Cv), 1 / (Cv * Cv) - 1, K)
    ratio = A2 / A1
    # What is left of the jet's kinetic energy when the approach velocity has helped.
    net = loss - alpha1 * (ratio * ratio)
    head = p1 - p2 - rho * G * dz
    driven = is_given(p1)
    net_safe = refuse(
        driven & (net <= 0),
        choose(driven, net, 1.0),
        "the pressure does not fix the flow where the jet is as wide as the pipe; give Q",
    )
    head = refuse(driven & (head < 0), head, "p1 is below p2 + rho g dz and drives no jet")
    V2 = choose(driven, sqrt(2 * head / (rho * net_safe)), Q / A2)
    Q = default(Q, V2 * A2)
    V1 = Q / A1
    p1 = default(p1, p2 + rho * (G * dz + 0.5 * net * (V2 * V2)))
    M2 = beta2 * (rho * (Q * V2))
    Fx = section_force(p1, A1, rho, Q, V1, beta1) - (p2 * A2 + M2)
    F = abs(Fx)
    return NozzleForces(Fx, F, 0.0 - Fx, F, Q, V1, V2, p1, M2)


class ClosedForces(NamedTuple):
    """Results of :func:`closed`."""

    Fx: Num
    """Thrust on the closed end, outwards along the pipe [N]."""
    F: Num
    """Magnitude of the thrust [N]."""
    Rx: Num
    """Reaction of the restraint, outwards along the pipe [N]."""
    R: Num
    """Magnitude of the reaction [N]."""


@routine(D=POSITIVE)
def closed(D: Num, p: Num) -> ClosedForces:
    """Thrust on a closed end: dead end, cap, blank flange or bulkhead.

    Assumptions, axes and signs: see the module. Nothing flows, so that no
    density is needed. Control volume: the fluid behind the end. For a closed
    valve with pressure on both sides use ``inline`` with Q = 0.

    Formula::

        Fx = p pi D^2 / 4

    Parameters
    ----------
    D : diameter on which the pressure acts [m]: that of the joint where the joint can slip
    p : gauge pressure [Pa]

    Both are floats or arrays that broadcast together.

    Returns
    -------
    ClosedForces
        Of the broadcast shape.

    Raises
    ------
    OutOfRange
        A float call with arguments out of range (an array call gets NaN there).

    Examples
    --------
    >>> print(f"{closed(0.3, 1e6).Fx:.1f} N")
    70685.8 N

    Source: derived from the momentum balance; AWWA M23 and M11 give the same form.
    """
    Fx = p * circle(D)
    F = abs(Fx)
    return ClosedForces(Fx, F, 0.0 - Fx, F)
