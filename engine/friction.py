"""Darcy friction factor of full circular pipes.

The factor is defined by hL = f (L/D) V^2 / (2 g), after Darcy and Weisbach;
Fanning's is a quarter of it.
"""

from __future__ import annotations

import math
from typing import Final, NamedTuple

from .errors import OutOfRange, Problem
from .guard import NON_NEGATIVE, POSITIVE, Bound, routine
from .numeric import NOT_GIVEN, Num, choose, default, log, log10, maximum, minimum, refuse

RE_LAMINAR: Final = 2300.0
"""Reynolds number up to which pipe flow is taken as laminar."""

RE_TURBULENT: Final = 4000.0
"""Reynolds number from which pipe flow is taken as fully turbulent."""

MAX_ROUGHNESS: Final = 0.1
"""Largest relative roughness taken; the usual charts end at 0.05."""

METHODS: Final = ("colebrook", "swamee-jain", "haaland")
"""The words for the turbulent formula; the first is the default."""

HALF_LN10: Final = math.log(10.0) / 2


class Friction(NamedTuple):
    """Results of :func:`friction`."""

    f: Num
    regime: Num


def colebrook(Re: Num, eD: Num) -> Num:
    """Colebrook-White factor to full precision, for turbulent ``Re``; no checks.

    Solves 1/sqrt(f) = -2 log10(eD/3.7 + 2.51/(Re sqrt(f))). With
    y = ln(10)/2 / sqrt(f) this is F(y) = y + ln(a + b y) = 0, smooth, rising and
    nearly straight, so that two steps of Halley's method from a start within 1
    of the root leave no error but rounding, for every Re above 1000. The number
    of steps is fixed, so that arrays need no test of convergence.
    """
    a = eD / 3.7
    b = 2.51 / HALF_LN10 / Re
    y = -log(a + 9.0 * b)
    for _ in range(2):
        s = a + b * y
        F = y + log(s)
        r = b / s
        slope = 1.0 + r
        y = y - 2.0 * F * slope / (2.0 * slope * slope + F * r * r)
    x = y / HALF_LN10
    return 1.0 / (x * x)


def swamee_jain(Re: Num, eD: Num) -> Num:
    """Swamee and Jain's explicit factor, see :func:`friction`, for turbulent ``Re``; no checks."""
    x = log10(eD / 3.7 + 5.74 / Re**0.9)
    return 0.25 / (x * x)


def haaland(Re: Num, eD: Num) -> Num:
    """Haaland's explicit factor, see :func:`friction`, for turbulent ``Re``; no checks."""
    x = 1.8 * log10((eD / 3.7) ** 1.11 + 6.9 / Re)
    return 1.0 / (x * x)


_TURBULENT: Final = {"colebrook": colebrook, "swamee-jain": swamee_jain, "haaland": haaland}


def darcy(Re: Num, eD: Num, method: str = "colebrook") -> Num:
    """Darcy friction factor by the rule of :func:`friction`, for other routines.

    Checks only the word ``method``. It is 0 where ``Re`` is 0: nothing flows and
    nothing is lost, and a loss formula needs a finite factor there.
    """
    turbulent = _TURBULENT.get(method)
    if turbulent is None:
        raise OutOfRange([Problem("method", method, ", ".join(METHODS))])
    flowing = Re > 0.0
    laminar = 64.0 / choose(flowing, minimum(Re, RE_LAMINAR), RE_LAMINAR)
    # Weights of exactly 0 and 1 outside the transition leave both laws untouched.
    w = minimum(maximum((Re - RE_LAMINAR) / (RE_TURBULENT - RE_LAMINAR), 0.0), 1.0)
    f = (1.0 - w) * laminar + w * turbulent(maximum(Re, RE_TURBULENT), eD)
    return choose(flowing, f, 0.0)


@routine(Re=POSITIVE, eD=Bound(low=0.0, high=MAX_ROUGHNESS), e=NON_NEGATIVE, D=POSITIVE)
def friction(
    Re: Num, eD: Num = NOT_GIVEN, method: str = "colebrook", e: Num = NOT_GIVEN, D: Num = NOT_GIVEN
) -> Friction:
    """Darcy friction factor of a full circular pipe.

    Assumes steady, fully developed flow of a Newtonian fluid.

    - Re up to 2300, laminar: f = 64/Re, whatever the roughness.
    - Re from 4000, turbulent, by ``method``: "colebrook" (Colebrook-White),
      1/sqrt(f) = -2 log10(eD/3.7 + 2.51/(Re sqrt(f))), solved to full
      precision; "swamee-jain", f = 0.25 / log10(eD/3.7 + 5.74/Re^0.9)^2, stated
      by its authors for eD 1e-6 to 1e-2 and Re 5e3 to 1e8; "haaland",
      1/sqrt(f) = -1.8 log10((eD/3.7)^1.11 + 6.9/Re), for Re 4e3 to 1e8.
    - Between them, transition: f is interpolated linearly in Re between the
      laminar value at 2300 and the turbulent one at 4000. Flow is unstable
      there and no formula is standard; this rule is our own. It is continuous
      and the loss rises steadily with the flow.

    Parameters
    ----------
    Re : float or array
        Reynolds number rho |V| D / mu [-], above 0.
    eD : float or array, optional
        Relative roughness e/D [-], 0 (smooth) to 0.1. Left out, it follows from
        ``e`` and ``D``.
    method : {"colebrook", "swamee-jain", "haaland"}
        Turbulent formula.
    e : float or array, optional
        Roughness of the wall, equivalent sand grain [m].
    D : float or array, optional
        Inside diameter [m], above 0.

    Returns
    -------
    Friction
        f [-], Darcy's; regime [-]: 1 laminar, 2 transition, 3 turbulent. Of the
        broadcast shape.

    Raises
    ------
    OutOfRange
        If an argument is not allowed.
    NoSolution
        If the roughness is not given, is given twice, or exceeds 0.1 D.

    Notes
    -----
    Source: laminar, Hagen-Poiseuille. C. F. Colebrook, J. Inst. Civ. Eng. 11
    (1939) 133, with the constants 3.7 and 2.51. P. K. Swamee and A. K. Jain,
    J. Hydraul. Div. ASCE 102 (1976) 657. S. E. Haaland, J. Fluids Eng. 105 (1983)
    89. Citations from memory; the formulas are in general use.

    Examples
    --------
    >>> round(friction(1.0e5, 1.0e-4).f, 10)
    0.0185138661
    >>> round(friction(1.0e5, e=0.03e-3, D=0.3).f, 10)
    0.0185138661
    """
    derived = e / D
    eD = refuse(
        (eD == eD) == ((e == e) | (D == D)),
        default(eD, derived),
        "give either the relative roughness eD, or both e and D",
    )
    eD = relative_roughness(eD)
    regime = 1.0 + choose(Re > RE_LAMINAR, 1.0, 0.0) + choose(Re >= RE_TURBULENT, 1.0, 0.0)
    return Friction(darcy(Re, eD, method), regime)


def relative_roughness(eD: Num) -> Num:
    """Pass a computed relative roughness, or refuse one that no formula covers."""
    eD = refuse(eD != eD, eD, "give either the relative roughness eD, or both e and D")
    return refuse(eD > MAX_ROUGHNESS, eD, f"the roughness e is above {MAX_ROUGHNESS:g} of the diameter D")
