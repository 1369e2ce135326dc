"""Heads at a section, power of a machine and the margin to the vapour pressure."""

from __future__ import annotations

from typing import NamedTuple

from .constants import P_ATM, G
from .guard import AT_LEAST_ONE, NON_NEGATIVE, POSITIVE, Bound, routine
from .numeric import NOT_GIVEN, Num, choose


class Head(NamedTuple):
    """Results of :func:`head`."""

    H: Num
    HGL: Num
    hp: Num
    hV: Num


class Power(NamedTuple):
    """Results of :func:`power`."""

    P: Num
    Pshaft: Num


class Cavitation(NamedTuple):
    """Results of :func:`cavitation`."""

    margin: Num
    pabs: Num
    sigma: Num
    NPSH: Num


@routine(rho=POSITIVE, alpha=AT_LEAST_ONE)
def head(rho: Num, p: Num, V: Num, z: Num = 0.0, alpha: Num = 1.0) -> Head:
    """Total head and hydraulic grade at a section.

    Assumes constant density, and pressure that is hydrostatic over the section.
    All are heights above the datum of z, positive upwards.

    Formula: hp = p / (rho g), hV = alpha V^2 / (2 g), HGL = z + hp,
    H = z + hp + hV.

    Parameters
    ----------
    rho : float or array
        Density [kg/m3], above 0.
    p : float or array
        Gauge pressure [Pa].
    V : float or array
        Mean velocity [m/s], either sign.
    z : float or array, optional
        Level of the section [m]; 0 when left out.
    alpha : float or array, optional
        Kinetic energy correction [-], 1 when left out.

    Returns
    -------
    Head
        H (energy grade), HGL (hydraulic grade), hp (pressure head), hV
        (velocity head), all [m], of the broadcast shape.

    Raises
    ------
    OutOfRange
        If an argument is not allowed.

    Notes
    -----
    Source: Bernoulli equation.

    Examples
    --------
    >>> [round(x, 4) for x in head(1000.0, 98066.5, 2.0, 5.0)]
    [15.2039, 15.0, 10.0, 0.2039]
    """
    hp = p / (rho * G)
    hV = alpha * V * V / (2.0 * G)
    HGL = z + hp
    return Head(HGL + hV, HGL, hp, hV)


@routine(rho=POSITIVE, Q=NON_NEGATIVE, eta=Bound(low=0.0, high=1.0, open_low=True))
def power(rho: Num, Q: Num, H: Num, eta: Num = 1.0) -> Power:
    """Hydraulic power of a flow at a head, and the power at the shaft.

    Assumes steady flow of constant density. Control volume: the fluid between
    the flanges of the machine. H is the head given to the fluid: positive for a
    pump, negative for a turbine, whose powers are then negative (taken from the
    fluid, delivered by the shaft).

    Formula: P = rho g Q H; pump Pshaft = P / eta, turbine Pshaft = P eta.

    Parameters
    ----------
    rho : float or array
        Density [kg/m3], above 0.
    Q : float or array
        Volume flow through the machine [m3/s], at least 0.
    H : float or array
        Head given to the fluid [m].
    eta : float or array, optional
        Efficiency [-], above 0 to 1; left out it is 1, a machine without loss.

    Returns
    -------
    Power
        P, hydraulic, and Pshaft, both [W], of the broadcast shape.

    Raises
    ------
    OutOfRange
        If an argument is not allowed.

    Notes
    -----
    Source: definition; ISO 9906 for the pump's efficiency, from memory.

    Examples
    --------
    >>> [round(x, 2) for x in power(1000.0, 0.1, 20.0, 0.8)]
    [19613.3, 24516.62]
    """
    P = rho * G * Q * H
    return Power(P, choose(P >= 0.0, P / eta, P * eta))


@routine("sigma", "NPSH", pv=NON_NEGATIVE, rho=POSITIVE, pamb=POSITIVE)
def cavitation(p: Num, pv: Num, rho: Num = NOT_GIVEN, V: Num = NOT_GIVEN, pamb: Num = P_ATM) -> Cavitation:
    """Margin of the pressure at a section to the vapour pressure.

    A margin of 0 or less means that the liquid boils there: it is a result, not
    an error, and so is an absolute pressure below 0, which a liquid at rest
    cannot have and which says that the assumed flow is impossible. Assumes that
    p is the lowest pressure of the section.

    Formula: pabs = p + pamb, margin = pabs - pv,
    sigma = (pabs - pv) / (rho V^2 / 2), NPSH = (pabs - pv)/(rho g) + V^2/(2 g).

    Parameters
    ----------
    p : float or array
        Gauge pressure [Pa].
    pv : float or array
        Vapour pressure, absolute [Pa], at least 0.
    rho : float or array, optional
        Density [kg/m3], above 0. Without it sigma and NPSH are NaN.
    V : float or array, optional
        Mean velocity [m/s]. Without it sigma and NPSH are NaN; at V = 0 sigma
        is not defined and is NaN.
    pamb : float or array, optional
        Ambient absolute pressure [Pa], above 0; left out it is the standard
        atmosphere at sea level, 101 325 Pa.

    Returns
    -------
    Cavitation
        margin [Pa], pabs [Pa], sigma, the cavitation number [-], and NPSH [m],
        the net positive suction head available when the section is a pump's
        inlet and p is taken at its reference level. Of the broadcast shape.

    Raises
    ------
    OutOfRange
        If an argument is not allowed.

    Notes
    -----
    Source: definitions in general use; NPSH as in ISO 17769-1, from memory.

    Examples
    --------
    >>> c = cavitation(-60.0e3, 2339.0, 998.2, 3.0)
    >>> round(c.margin, 1), round(c.sigma, 3), round(c.NPSH, 3)
    (38986.0, 8.679, 4.442)
    """
    pabs = p + pamb
    margin = pabs - pv
    dynamic = rho * V * V / 2.0
    sigma = choose(dynamic > 0.0, margin / choose(dynamic > 0.0, dynamic, 1.0), NOT_GIVEN)
    return Cavitation(margin, pabs, sigma, margin / (rho * G) + V * V / (2.0 * G))
