"""Properties of liquid water at atmospheric pressure."""

from __future__ import annotations

from typing import Final, NamedTuple

from .guard import Bound, routine
from .numeric import Num, exp, sqrt

LIQUID: Final = Bound(low=273.15, high=373.12)
"""Liquid water at 101.325 kPa [K]: from the ice point to just below the boiling point."""


class Water(NamedTuple):
    """Results of :func:`water`."""

    rho: Num
    mu: Num
    nu: Num
    pv: Num


@routine(T=LIQUID)
def water(T: Num) -> Water:
    """Density, viscosity and vapour pressure of pure liquid water at 101.325 kPa.

    Assumes pure water free of air at atmospheric pressure. In a main under pressure
    the density is higher by 0.05 % a megapascal. All results are positive.

    Formula: density by Kell; dynamic viscosity mu0(T) mu1(T, rho) at that density;
    nu = mu / rho; vapour pressure at saturation.

    Parameters
    ----------
    T : float or array
        Temperature [K], 273.15 to 373.12.

    Returns
    -------
    Water
        rho [kg/m3], mu [Pa s], nu [m2/s] and pv [Pa, absolute], of the shape of ``T``.

    Raises
    ------
    OutOfRange
        If ``T`` is outside its range: ice, or steam.

    Notes
    -----
    Source: G. S. Kell, J. Chem. Eng. Data 20 (1975) 97, eq. 16; IAPWS R12-08 (2008),
    eqs. 11 and 12, without the critical enhancement; IAPWS R7-97(2012), eq. 30. Against
    IAPWS-95 the density is within 0.0005 %, the viscosity within 0.001 % and the vapour
    pressure within 0.01 %.

    Examples
    --------
    >>> found = water(293.15)
    >>> round(found.rho, 2), round(found.mu * 1e3, 4), round(found.pv)
    (998.2, 1.0016, 2339)
    """
    rho = kell_density(T)
    mu = viscosity(T, rho)
    return Water(rho, mu, mu / rho, saturation_pressure(T))


def kell_density(T: Num) -> Num:
    """Density of water at 101.325 kPa [kg/m3] from T [K]; no checks.

    Kell (1975), eq. 16, for t on the scale IPTS-68, which stands above ITS-90 by 0.024 % of t
    (P. M. Saunders, WOCE Newsletter 10 (1990); from memory).
    """
    t = 1.00024 * (T - 273.15)
    above = 999.83952 + t * (
        16.945176 + t * (-7.9870401e-3 + t * (-46.170461e-6 + t * (105.56302e-9 + t * -280.54253e-12)))
    )
    return above / (1.0 + 16.879850e-3 * t)


def viscosity(T: Num, rho: Num) -> Num:
    """Dynamic viscosity of water [Pa s] from T [K] and rho [kg/m3]; no checks.

    IAPWS R12-08: mu = 1e-6 mu0 mu1, eqs. 11 and 12; the critical enhancement mu2 is 1.
    """
    a = 647.096 / T
    mu0 = 100.0 / (sqrt(a) * (1.67752 + a * (2.20462 + a * (0.6366564 + a * -0.241605))))
    x, d = a - 1.0, rho / 322.0
    y = d - 1.0
    x2 = x * x
    x3 = x2 * x
    # The coefficients of y^j, each a polynomial in x.
    c0 = 0.520094 + 0.0850895 * x - 1.08374 * x2 - 0.289555 * x3
    c1 = 0.222531 + 0.999115 * x + 1.88797 * x2 + 1.26613 * x3 + 0.120573 * x2 * x3
    c2 = -0.281378 - 0.906851 * x - 0.772479 * x2 - 0.489837 * x3 - 0.257040 * x2 * x2
    c3 = 0.161913 + 0.257399 * x
    c4 = -0.0325372 + 0.0698452 * x3
    c5 = 0.00872102 * x2 * x2
    c6 = -0.00435673 * x3 - 0.000593264 * x2 * x3
    mu1 = exp(d * (c0 + y * (c1 + y * (c2 + y * (c3 + y * (c4 + y * (c5 + y * c6)))))))
    return 1e-6 * mu0 * mu1


def saturation_pressure(T: Num) -> Num:
    """Vapour pressure of water [Pa, absolute] from T [K], 273.15 to 647.096; no checks.

    IAPWS R7-97(2012), eq. 30 with the coefficients of table 34.
    """
    t = T + -0.23855557567849 / (T - 650.17534844798)
    A = (t + 1167.0521452767) * t - 724213.16703206
    B = (-17.073846940092 * t + 12020.824702470) * t - 3232555.0322333
    C = (14.915108613530 * t - 4823.2657361591) * t + 405113.40542057
    root = 2.0 * C / (sqrt(B * B - 4.0 * A * C) - B)
    return 1e6 * (root * root) * (root * root)
