"""Losses of pipes and fittings.

A loss coefficient applies to the velocity head of a stated section.
"""

from __future__ import annotations

from typing import NamedTuple

from .constants import G
from .friction import darcy, relative_roughness
from .guard import NON_NEGATIVE, POSITIVE, routine
from .numeric import NOT_GIVEN, Num, refuse
from .sections import circle


class PipeLoss(NamedTuple):
    """Results of :func:`pipeloss`."""

    dp: Num
    hL: Num
    f: Num
    Re: Num
    V: Num
    F: Num


class FittingLoss(NamedTuple):
    """Results of :func:`fittingloss`."""

    dp: Num
    hL: Num
    V: Num


class StepLoss(NamedTuple):
    """Results of :func:`expansion` and of :func:`contraction`."""

    K1: Num
    K2: Num
    dp: Num
    hL: Num


def ratio_of_areas(small: Num, large: Num, reason: str) -> Num:
    """Area ratio of two diameters, at most 1; else refused with ``reason``."""
    d = small / large
    return refuse(small > large, d * d, reason)


@routine(rho=POSITIVE, mu=POSITIVE, D=POSITIVE, L=NON_NEGATIVE, e=NON_NEGATIVE)
def pipeloss(rho: Num, mu: Num, D: Num, L: Num, e: Num, Q: Num, method: str = "colebrook") -> PipeLoss:
    """Friction loss of a straight full pipe of one diameter.

    Assumes steady, fully developed flow of constant density. Control volume:
    the fluid in the pipe. Loss, velocity and drag have the sign of the flow; a
    reversed flow gives the opposite values. Nothing is lost at Q = 0, where f,
    undefined at rest, is given as 0.

    Formula: hL = f (L/D) V |V| / (2 g), dp = rho g hL, F = dp A, with f as in
    :func:`~thrustbook.engine.friction.friction`. F is the drag, the force of the
    fluid on the wall along the pipe; it does not depend on the slope.

    Parameters
    ----------
    rho, mu : float or array
        Density [kg/m3] and dynamic viscosity [Pa s], above 0.
    D, L : float or array
        Inside diameter [m], above 0, and length [m], at least 0.
    e : float or array
        Roughness of the wall, equivalent sand grain [m], 0 to 0.1 D.
    Q : float or array
        Volume flow [m3/s], either sign.
    method : {"colebrook", "swamee-jain", "haaland"}
        Turbulent friction formula.

    Returns
    -------
    PipeLoss
        dp [Pa], hL [m], f [-], Re [-], V [m/s], F [N], of the broadcast shape.

    Raises
    ------
    OutOfRange
        If an argument is not allowed.
    NoSolution
        If ``e`` exceeds 0.1 D.

    Notes
    -----
    Source: Darcy-Weisbach equation; F from the momentum balance of the fluid.

    Examples
    --------
    >>> loss = pipeloss(998.0, 1.0e-3, 0.3, 100.0, 0.1e-3, 0.1)
    >>> round(loss.hL, 4), round(loss.f, 6)
    (0.5687, 0.016721)
    """
    A = circle(D)
    V = Q / A
    Re = rho * abs(V) * D / mu
    f = darcy(Re, relative_roughness(e / D), method)
    hL = f * L / D * V * abs(V) / (2.0 * G)
    dp = rho * G * hL
    return PipeLoss(dp, hL, f, Re, V, dp * A)


@routine(rho=POSITIVE, D=POSITIVE, K=NON_NEGATIVE)
def fittingloss(rho: Num, D: Num, Q: Num, K: Num) -> FittingLoss:
    """Loss of a fitting with a known loss coefficient.

    Assumes steady flow of constant density and a fitting that stands far enough
    from its neighbours for its own K to hold. Control volume: from the section
    before the fitting to where its disturbance has died out. K applies to the
    velocity head in the pipe of diameter D. The loss has the sign of the flow.

    Formula: hL = K V |V| / (2 g), dp = rho g hL.

    Parameters
    ----------
    rho, D : float or array
        Density [kg/m3] and inside diameter [m], above 0.
    Q : float or array
        Volume flow [m3/s], either sign.
    K : float or array
        Loss coefficient [-], at least 0; the sum of several is taken as well.

    Returns
    -------
    FittingLoss
        dp [Pa], hL [m], V [m/s], of the broadcast shape.

    Raises
    ------
    OutOfRange
        If an argument is not allowed.

    Notes
    -----
    Source: definition of the loss coefficient.

    Examples
    --------
    >>> [round(x, 4) for x in fittingloss(1000.0, 0.3, 0.1, 0.5)]
    [500.3515, 0.051, 1.4147]
    """
    V = Q / circle(D)
    hL = K * V * abs(V) / (2.0 * G)
    return FittingLoss(rho * G * hL, hL, V)


@routine("dp", "hL", D1=POSITIVE, D2=POSITIVE, Q=NON_NEGATIVE, rho=POSITIVE)
def expansion(D1: Num, D2: Num, Q: Num = NOT_GIVEN, rho: Num = NOT_GIVEN) -> StepLoss:
    """Loss of a sudden expansion, after Borda and Carnot.

    Assumes uniform velocity at both sections, the upstream pressure on the
    whole face of the step, no wall friction. Control volume: from the step to
    where the jet fills the large pipe. Flow runs from D1 into the larger D2;
    reverse flow is refused, it is a contraction.

    Formula: hL = (V1 - V2)^2 / (2 g), so K1 = (1 - A1/A2)^2 on the small pipe's
    velocity head and K2 = (A2/A1 - 1)^2 on the large pipe's.

    Parameters
    ----------
    D1, D2 : float or array
        Inside diameters [m], above 0, D2 at least D1.
    Q : float or array, optional
        Volume flow [m3/s], at least 0. Without it dp and hL are NaN.
    rho : float or array, optional
        Density [kg/m3], above 0. Without it dp is NaN.

    Returns
    -------
    StepLoss
        K1 on V1 (small pipe) [-], K2 on V2 (large pipe) [-], dp [Pa] and hL [m]:
        loss of total pressure and of head, at least 0. The static pressure
        rises by less than in a flow without loss. Of the broadcast shape.

    Raises
    ------
    OutOfRange
        If an argument is not allowed.
    NoSolution
        If D2 is smaller than D1.

    Notes
    -----
    Source: Borda-Carnot equation; derived from the momentum balance.

    Examples
    --------
    >>> step = expansion(0.1, 0.2)
    >>> round(step.K1, 4), round(step.K2, 4)
    (0.5625, 9.0)
    """
    m = ratio_of_areas(D1, D2, "D2 is smaller than D1: use the contraction")
    K1 = (1.0 - m) * (1.0 - m)
    V1 = Q / circle(D1)
    hL = K1 * V1 * V1 / (2.0 * G)
    return StepLoss(K1, K1 / (m * m), rho * G * hL, hL)


@routine("dp", "hL", D1=POSITIVE, D2=POSITIVE, Q=NON_NEGATIVE, rho=POSITIVE)
def contraction(D1: Num, D2: Num, Q: Num = NOT_GIVEN, rho: Num = NOT_GIVEN) -> StepLoss:
    """Loss of a sudden contraction with a sharp edge.

    Assumes steady flow of constant density. Control volume: from the large pipe
    to where the contracted jet, whose widening makes the loss, fills the small
    one. Flow runs from D1 into the smaller D2; reverse flow is refused, it is an
    expansion.

    Formula: K2 = (1 - (D2/D1)^2) / 2 on the small pipe's velocity head, which is
    0.5 from a large vessel; K1 = K2 (A1/A2)^2 on the large pipe's. It is an
    empirical rule for turbulent flow.

    Parameters
    ----------
    D1, D2 : float or array
        Inside diameters [m], above 0, D2 at most D1.
    Q : float or array, optional
        Volume flow [m3/s], at least 0. Without it dp and hL are NaN.
    rho : float or array, optional
        Density [kg/m3], above 0. Without it dp is NaN.

    Returns
    -------
    StepLoss
        K1 on V1 (large pipe) [-], K2 on V2 (small pipe) [-], dp [Pa] and hL [m]:
        loss of total pressure and of head, at least 0. Of the broadcast shape.

    Raises
    ------
    OutOfRange
        If an argument is not allowed.
    NoSolution
        If D2 is larger than D1.

    Notes
    -----
    Source: Crane Technical Paper 410, formula for a sudden contraction (180
    degrees), from memory.

    Examples
    --------
    >>> round(contraction(3.0, 2.0).K2, 7)
    0.2777778
    """
    m = ratio_of_areas(D2, D1, "D2 is larger than D1: use the expansion")
    K2 = 0.5 * (1.0 - m)
    V2 = Q / circle(D2)
    hL = K2 * V2 * V2 / (2.0 * G)
    return StepLoss(K2 / (m * m), K2, rho * G * hL, hL)
