"""Bernoulli's equation between two sections: pressure, flow or pump head.

All three routines state one balance of heads from section 1 to section 2,

    p1/(rho g) + alpha1 V1^2/(2g) + Hp = p2/(rho g) + alpha2 V2^2/(2g) + dz + loss,

and solve it for a different quantity. The loss coefficient K applies to the
velocity head of the smaller section, which has the larger velocity V:
loss = K V^2/(2 g) + hL.
"""

from __future__ import annotations

from typing import NamedTuple

from .constants import G
from .guard import AT_LEAST_ONE, NON_NEGATIVE, POSITIVE, Bound, routine
from .numeric import NOT_GIVEN, Num, choose, default, is_given, maximum, refuse, sqrt
from .sections import circle


class Pressure(NamedTuple):
    """Results of :func:`pressure`."""

    p2: Num
    dp: Num
    hL: Num
    V1: Num
    V2: Num


class Discharge(NamedTuple):
    """Results of :func:`discharge`."""

    Q: Num
    p1: Num
    V1: Num
    V2: Num
    hL: Num


class PumpHead(NamedTuple):
    """Results of :func:`pumphead`."""

    Hp: Num
    dp: Num
    hL: Num
    V1: Num
    V2: Num


def loss_of_head(V1: Num, V2: Num, K: Num, hL: Num) -> Num:
    """Head lost between two sections [m], signed with the flow; no checks."""
    V = choose(abs(V1) >= abs(V2), V1, V2)
    given = choose(V > 0.0, hL, choose(V < 0.0, -hL, 0.0))
    return K * V * abs(V) / (2.0 * G) + given


@routine(
    rho=POSITIVE,
    D1=POSITIVE,
    D2=POSITIVE,
    K=NON_NEGATIVE,
    hL=NON_NEGATIVE,
    alpha1=AT_LEAST_ONE,
    alpha2=AT_LEAST_ONE,
)
def pressure(
    rho: Num,
    D1: Num,
    D2: Num,
    p1: Num,
    Q: Num,
    dz: Num = 0.0,
    K: Num = 0.0,
    hL: Num = 0.0,
    Hp: Num = 0.0,
    alpha1: Num = 1.0,
    alpha2: Num = 1.0,
) -> Pressure:
    """Pressure at section 2 from that at section 1.

    Assumes steady flow of constant density. Control volume: the fluid from
    section 1 to section 2. Flow is positive from 1 to 2; reverse flow works:
    losses then act from 2 to 1, while Hp keeps its direction from 1 to 2. At
    Q = 0 the losses vanish and the pressure is hydrostatic.

    Formula: p2 = p1 + rho/2 (alpha1 V1^2 - alpha2 V2^2) - rho g dz + rho g Hp
    - rho g loss, loss = (K V^2/(2 g) + hL) with the sign of the flow, V the
    larger of the two velocities.

    Parameters
    ----------
    rho : float or array
        Density [kg/m3], above 0.
    D1, D2 : float or array
        Inside diameters [m], above 0.
    p1 : float or array
        Gauge pressure at section 1 [Pa].
    Q : float or array
        Volume flow [m3/s], either sign.
    dz : float or array, optional
        Rise z2 - z1 [m], positive upwards.
    K : float or array, optional
        Loss coefficient on the velocity head of the smaller section [-].
    hL : float or array, optional
        Further loss of head, such as pipe friction [m], at least 0.
    Hp : float or array, optional
        Head given to the fluid between the sections [m]; negative for a turbine.
    alpha1, alpha2 : float or array, optional
        Kinetic energy corrections [-], 1 when left out.

    Returns
    -------
    Pressure
        p2 [Pa gauge], dp = p1 - p2 [Pa], hL, the whole loss of head signed with
        the flow [m], V1, V2 [m/s], of the broadcast shape.

    Raises
    ------
    OutOfRange
        If an argument is not allowed.

    Notes
    -----
    Source: Bernoulli equation extended by loss and pump head.

    Examples
    --------
    >>> [round(x, 3) for x in pressure(1000.0, 0.3, 0.2, 400.0e3, 0.1, dz=2.0)[:2]]
    [376321.344, 23678.656]
    """
    V1 = Q / circle(D1)
    V2 = Q / circle(D2)
    loss = loss_of_head(V1, V2, K, hL)
    dp = rho * (0.5 * (alpha2 * V2 * V2 - alpha1 * V1 * V1) + G * (dz - Hp + loss))
    return Pressure(p1 - dp, dp, loss, V1, V2)


@routine(
    rho=POSITIVE,
    D1=POSITIVE,
    D2=POSITIVE,
    Q=NON_NEGATIVE,
    Cd=Bound(low=0.0, high=1.0, open_low=True),
    K=NON_NEGATIVE,
    alpha1=AT_LEAST_ONE,
    alpha2=AT_LEAST_ONE,
)
def discharge(
    rho: Num,
    D1: Num,
    D2: Num,
    p1: Num = NOT_GIVEN,
    Q: Num = NOT_GIVEN,
    p2: Num = 0.0,
    K: Num = 0.0,
    Cd: Num = 1.0,
    dz: Num = 0.0,
    alpha1: Num = 1.0,
    alpha2: Num = 1.0,
) -> Discharge:
    """Flow through a contraction or nozzle from its pressure, or the pressure from the flow.

    Continuity and Bernoulli's equation solved together. Control volume: the fluid
    from section 1 to section 2. Assumes steady flow of constant density that fills
    section 2. Exactly one of ``p1`` and ``Q`` is
    given. Flow runs from 1 to 2; reverse flow is refused. Q = 0 gives the
    hydrostatic pressure.

    Formula, with A1, A2 the areas and A the smaller of them:
    p1 - p2 - rho g dz = (rho/2) (Q / (Cd A2))^2 C,
    C = alpha2 - alpha1 (A2/A1)^2 + K (A2/A)^2.
    With Cd alone this is the usual Q = Cd A2 sqrt(2 dp / (rho (1 - (D2/D1)^4))).
    Use either K or Cd for the loss; with both, both act.

    Parameters
    ----------
    rho : float or array
        Density [kg/m3], above 0.
    D1, D2 : float or array
        Inside diameters [m], above 0; D2 may exceed D1 as long as C is above 0.
    p1 : float or array, optional
        Gauge pressure at section 1 [Pa].
    Q : float or array, optional
        Volume flow [m3/s], at least 0.
    p2 : float or array, optional
        Gauge pressure at section 2 [Pa]; 0, the atmosphere, when left out.
    K : float or array, optional
        Loss coefficient on the velocity head of the smaller section [-].
    Cd : float or array, optional
        Discharge coefficient [-], above 0 to 1.
    dz : float or array, optional
        Rise z2 - z1 [m], positive upwards.
    alpha1, alpha2 : float or array, optional
        Kinetic energy corrections [-], 1 when left out.

    Returns
    -------
    Discharge
        Q [m3/s], p1 [Pa gauge], V1, V2 [m/s] (Q over the area of the section)
        and hL [m], the head lost, of the broadcast shape.

    Raises
    ------
    OutOfRange
        If an argument is not allowed.
    NoSolution
        If not exactly one of ``p1`` and ``Q`` is given, if the pressure would
        drive the flow backwards, or if C is not above 0.

    Notes
    -----
    Source: Bernoulli equation and continuity; Cd as in ISO 5167-1 without its
    expansibility factor (from memory).

    Examples
    --------
    >>> d = discharge(1000.0, 0.1, 0.05, p1=300.0e3)
    >>> round(d.Q, 6), round(d.V2, 4)
    (0.049673, 25.2982)
    >>> round(discharge(1000.0, 0.1, 0.05, Q=d.Q).p1, 3)
    300000.0
    """
    A1, A2 = circle(D1), circle(D2)
    m = A2 / A1
    larger = maximum(m, 1.0)
    kinetic = alpha2 - alpha1 * m * m
    C = (kinetic + K * larger * larger) / (Cd * Cd)
    C = refuse(C <= 0.0, C, "section 2 is too large: the pressure does not fix the flow")
    lift = rho * G * dz
    drive = p1 - p2 - lift
    V2 = default(Q / A2, sqrt(drive / (0.5 * rho * C)))
    V2 = refuse(is_given(p1) == is_given(Q), V2, "give exactly one of p1 and Q")
    V2 = refuse(drive < 0.0, V2, "the pressure p1 is too low: the flow would run backwards")
    needed = p2 + lift + 0.5 * rho * C * V2 * V2
    return Discharge(
        Q=default(Q, V2 * A2),
        p1=default(p1, needed),
        V1=V2 * m,
        V2=V2,
        hL=(C - kinetic) * V2 * V2 / (2.0 * G),
    )


@routine(
    rho=POSITIVE,
    D1=POSITIVE,
    D2=POSITIVE,
    K=NON_NEGATIVE,
    hL=NON_NEGATIVE,
    alpha1=AT_LEAST_ONE,
    alpha2=AT_LEAST_ONE,
)
def pumphead(
    rho: Num,
    D1: Num,
    D2: Num,
    p1: Num,
    p2: Num,
    Q: Num,
    dz: Num = 0.0,
    K: Num = 0.0,
    hL: Num = 0.0,
    alpha1: Num = 1.0,
    alpha2: Num = 1.0,
) -> PumpHead:
    """Head that a pump must give between two sections.

    Assumes steady flow of constant density. Control volume: the fluid from
    section 1, before the pump, to section 2, after it. Flow is positive from 1
    to 2; reverse flow works, with losses from 2 to 1. A negative head means
    that the fluid can give up head there (a turbine or a throttle).

    Formula: Hp = (p2 - p1)/(rho g) + (alpha2 V2^2 - alpha1 V1^2)/(2 g) + dz
    + loss, loss = (K V^2/(2 g) + hL) with the sign of the flow, V the larger
    of the two velocities.

    Parameters
    ----------
    rho : float or array
        Density [kg/m3], above 0.
    D1, D2 : float or array
        Inside diameters [m], above 0.
    p1, p2 : float or array
        Gauge pressures at the sections [Pa].
    Q : float or array
        Volume flow [m3/s], either sign.
    dz : float or array, optional
        Rise z2 - z1 [m], positive upwards.
    K : float or array, optional
        Loss coefficient on the velocity head of the smaller section [-].
    hL : float or array, optional
        Further loss of head, such as pipe friction [m], at least 0.
    alpha1, alpha2 : float or array, optional
        Kinetic energy corrections [-], 1 when left out.

    Returns
    -------
    PumpHead
        Hp [m], dp = rho g Hp, the rise of total pressure in the pump [Pa], hL,
        the whole loss of head signed with the flow [m], V1, V2 [m/s], of the
        broadcast shape.

    Raises
    ------
    OutOfRange
        If an argument is not allowed.

    Notes
    -----
    Source: Bernoulli equation extended by loss and pump head.

    Examples
    --------
    >>> round(pumphead(1000.0, 0.3, 0.3, 0.0, 200.0e3, 0.1, dz=10.0, hL=3.0).Hp, 3)
    33.394
    """
    V1 = Q / circle(D1)
    V2 = Q / circle(D2)
    loss = loss_of_head(V1, V2, K, hL)
    Hp = (p2 - p1) / (rho * G) + (alpha2 * V2 * V2 - alpha1 * V1 * V1) / (2.0 * G) + dz + loss
    return PumpHead(Hp, rho * G * Hp, loss, V1, V2)
