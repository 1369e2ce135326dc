"""The two sums that every fitting is made of: force at a section, pressure at the next.

Every fitting is the general balance of :mod:`~thrustbook.engine.balance` written
out for its few ports. These helpers take floats and arrays alike and check
nothing: the routines' guards do.
"""

from __future__ import annotations

from .constants import G
from .numeric import Num, is_given, sqrt


def section_force(p: Num, A: Num, rho: Num, Q: Num, V: Num, beta: Num) -> Num:
    """Pressure and momentum at a section, (p + beta rho V^2) A [N].

    It is the same for either direction of flow.
    """
    return p * A + beta * (rho * (Q * V))


def next_pressure(p1: Num, rho: Num, V1: Num, V2: Num, dz: Num, loss: Num, alpha1: Num, alpha2: Num) -> Num:
    """Pressure at section 2 from section 1 by Bernoulli's equation [Pa].

    p2 = p1 + rho/2 (alpha1 V1^2 - alpha2 V2^2 - loss) - rho g dz, where ``loss``
    is K V |V| [m2/s2]: the loss acts along the true direction of flow, and dz = z2 - z1.
    """
    return p1 + rho * (0.5 * (alpha1 * (V1 * V1) - alpha2 * (V2 * V2) - loss) - G * dz)


def magnitude(Fx: Num, Fy: Num) -> Num:
    """Length of a plane force [N]; a plain root is quicker than hypot and forces never overflow it."""
    return sqrt(Fx * Fx + Fy * Fy)


def count_given(*quantities: Num) -> Num:
    """Count how many of some optional quantities were given, element by element."""
    return sum(is_given(x) * 1 for x in quantities)
