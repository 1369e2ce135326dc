"""An independent reckoning of thrust: integrals over the discs at the ports.

Nothing here uses the engine. The velocity has the profile of a power law,
u = umax (y/R)^(1/n), and the pressure may vary hydrostatically over the disc; both
are summed point by point with Gauss-Legendre quadrature.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

GRAVITY = 9.80665
_NODES, _WEIGHTS = np.polynomial.legendre.leggauss(24)
_ANGLES = 2 * math.pi * np.arange(16) / 16

Vector = npt.NDArray[np.float64]


def profile(exponent: float) -> tuple[Vector, Vector, Vector]:
    """Radii (of a unit disc), shape of the velocity there and weights of the radii.

    With 1 - r = t^n the power law becomes a polynomial in t, which the quadrature
    sums exactly. ``exponent`` inf is uniform flow.
    """
    t, w = (_NODES + 1) / 2, _WEIGHTS / 2
    if math.isinf(exponent):
        return t, np.ones_like(t), w * t
    r = 1 - t**exponent
    return r, t, w * exponent * t ** (exponent - 1) * r


def corrections(exponent: float) -> tuple[float, float]:
    """Kinetic energy and momentum corrections alpha and beta of the profile."""
    _, u, w = profile(exponent)
    mean = np.sum(w * u) / np.sum(w)
    alpha = np.sum(w * (u / mean) ** 3) / np.sum(w)
    beta = np.sum(w * (u / mean) ** 2) / np.sum(w)
    return float(alpha), float(beta)


@dataclass(frozen=True)
class Disc:
    """A port: outward normal, diameter, pressure at its centre, flow out, power of its profile."""

    normal: tuple[float, float, float]
    D: float
    p: float
    Q: float
    exponent: float = math.inf

    def force(self, rho: float, g: float = GRAVITY) -> Vector:
        """Integrate - (p n + rho u (u . n)) over the disc: its share of the thrust."""
        n = np.array(self.normal, dtype=float)
        n /= np.linalg.norm(n)
        # Two directions that lie in the disc.
        a = np.cross(n, [1.0, 0.0, 0.0] if abs(n[0]) < 0.9 else [0.0, 1.0, 0.0])
        a /= np.linalg.norm(a)
        b = np.cross(n, a)
        r, shape, weights = profile(self.exponent)
        radius = self.D / 2
        scale = self.Q / (2 * math.pi * radius**2 * np.sum(weights * shape))
        # Points of the disc: a row for each angle, a column for each radius.
        height = radius * r * (np.cos(_ANGLES) * a[2] + np.sin(_ANGLES) * b[2])[:, None]
        area = np.broadcast_to(weights * radius**2 * 2 * math.pi / len(_ANGLES), height.shape)
        speed = scale * shape
        return -n * float(np.sum((self.p - rho * g * height + rho * speed * speed) * area))


def thrust(discs: list[Disc], rho: float) -> Vector:
    """Thrust of the fluid on a fitting without weight, by direct integration over its ports."""
    total: Vector = np.sum([disc.force(rho) for disc in discs], axis=0)
    return total
