"""The general momentum balance of a control volume with any number of ports, in 3-D.

Every fitting of this package follows from this balance.
"""

from __future__ import annotations

from typing import Any, Final, NamedTuple

import numpy as np
import numpy.typing as npt

from .errors import EngineError, NoSolution, NotClosed, OutOfRange, Problem, Status
from .guard import ANY, AT_LEAST_ONE, NON_NEGATIVE, POSITIVE, Bound
from .numeric import Num

Array = npt.NDArray[np.float64]

CLOSURE_TOLERANCE: Final = 1e-6
"""Flow that may be missing, as a fraction of the largest flow at a port."""

# The ranges of the arguments, for the worksheet catalogue as well.
PORT_BOUNDS: Final[dict[str, Bound]] = {"A": POSITIVE, "p": ANY, "Q": ANY, "beta": AT_LEAST_ONE}
VOLUME_BOUNDS: Final[dict[str, Bound]] = {"rho": POSITIVE, "W": NON_NEGATIVE, "tol": NON_NEGATIVE}
_NORMAL_ALLOWED = "a direction of finite length above 0"


class BalanceForces(NamedTuple):
    """Results of :func:`balance`, each of shape (...)."""

    Fx: Num
    """Thrust on the fitting, component x [N]."""
    Fy: Num
    """Thrust on the fitting, component y [N]."""
    Fz: Num
    """Thrust on the fitting, component z (up) [N]."""
    F: Num
    """Magnitude of the thrust [N]."""
    Rx: Num
    """Reaction of the restraint, component x [N]."""
    Ry: Num
    """Reaction of the restraint, component y [N]."""
    Rz: Num
    """Reaction of the restraint, component z [N]."""
    R: Num
    """Magnitude of the reaction [N]."""
    residual: Num
    """Net outflow, sum of Q [m3/s]: 0 when the flows close."""


def balance(
    n: Num,
    A: Num,
    p: Num,
    Q: Num,
    rho: Num,
    beta: Num = 1.0,
    W: Num = 0.0,
    dMdt: Num = (0.0, 0.0, 0.0),
    tol: Num = CLOSURE_TOLERANCE,
) -> BalanceForces:
    """Thrust on a fitting with any number of ports, by the momentum balance.

    Assumptions: incompressible fluid of one density; pressure over each port
    given by its value at the port's centre (hydrostatic variation across a port
    integrates to the same force); flow at a port normal to it; wall and ports
    enclosed by the ambient pressure, to which p is gauge.

    Control volume: the fluid inside the fitting, cut at the ports, each with
    its outward normal. Sign convention: x east, y north, z up (any right-handed
    axes with z up); Q positive outward. F is the thrust of the fluid on the
    fitting, R the reaction that the restraint supplies, R = -F.

    Formula::

        F = - sum (p + beta rho V^2) A n  -  W z  -  dM/dt,    V = Q / A

    The direction of flow at a port does not matter to its force. Reverse flow
    and no flow work as they stand.

    Parameters
    ----------
    n : array (..., n_ports, 3)
        Outward normal of each port; its length does not matter, but may not be 0.
    A : array (..., n_ports)
        Area of each port [m2].
    p : array (..., n_ports)
        Gauge pressure at the centre of each port [Pa].
    Q : array (..., n_ports)
        Flow through each port, positive outward [m3/s].
    rho : array (...)
        Density [kg/m3].
    beta : array (..., n_ports), optional
        Momentum correction at each port [-].
    W : array (...), optional
        Weight of the fluid in the volume [N], acting along -z.
    dMdt : array (..., 3), optional
        Rate of change of the momentum of the fluid in the volume [N].
    tol : array (...), optional
        Net outflow that is accepted, as a fraction of the largest flow.

    A port with p = 0 and Q = 0 adds nothing, which serves to fill a table of
    fittings with unequal numbers of ports.

    Returns
    -------
    BalanceForces
        Floats for one balance, arrays of shape (...) for many. Where one of
        many cannot be answered its results are NaN (see :func:`evaluate_balance`).

    Raises
    ------
    OutOfRange
        One balance with bad arguments; the error names each, with its port.
    NotClosed
        One balance whose flows do not add up to zero.
    ValueError
        Shapes that do not fit together, whether of one balance or many.

    Examples
    --------
    A right-angled bend of 0.1 m2 under 2 bar with 0.3 m3/s, in at the west, out to the north:

    >>> f = balance([[-1, 0, 0], [0, 1, 0]], [0.1, 0.1], [2e5, 2e5], [-0.3, 0.3], 1000.0)
    >>> print(f"{f.Fx:.0f} {f.Fy:.0f} {f.R:.1f} {f.residual:.0f}")
    20900 -20900 29557.1 0

    Source: Reynolds transport theorem for linear momentum, in any text of fluid
    mechanics, for example F. M. White, Fluid Mechanics, chapter 3 (from memory).
    """
    values, status = evaluate_balance(n, A, p, Q, rho, beta, W, dMdt, tol)
    if status.ndim:
        return values
    if status != Status.OK:
        raise _reason(n, A, p, Q, rho, beta, W, dMdt, tol)
    return BalanceForces(*(float(x) for x in values))


def evaluate_balance(
    n: Num,
    A: Num,
    p: Num,
    Q: Num,
    rho: Num,
    beta: Num = 1.0,
    W: Num = 0.0,
    dMdt: Num = (0.0, 0.0, 0.0),
    tol: Num = CLOSURE_TOLERANCE,
) -> tuple[BalanceForces, npt.NDArray[np.uint8]]:
    """Evaluate as :func:`balance` does, never raising for a bad balance among many.

    Returns
    -------
    values : BalanceForces
        Arrays of shape (...); NaN where the balance failed.
    status : array (...) of uint8
        :class:`~thrustbook.engine.errors.Status` of each balance; flows that do
        not close are NO_SOLUTION.

    Examples
    --------
    >>> caps = evaluate_balance([[[1, 0, 0]], [[0, 0, 0]]], [[0.1]], [[1e5]], [[0.0]], 1000.0)
    >>> print(caps[0].Fx, caps[1])
    [-10000.     nan] [0 1]
    """
    normals, vector, ports, volume = _shaped(n, A, p, Q, rho, beta, W, dMdt, tol)
    A_, p_, Q_, beta_ = ports
    rho_, W_, tol_ = volume
    with np.errstate(all="ignore"):
        length = np.sqrt(np.sum(normals * normals, axis=-1))
        bad = ~np.all((length > 0) & (length < np.inf), axis=-1) | ~np.all(np.isfinite(vector), axis=-1)
        for x, bound in zip(ports, PORT_BOUNDS.values(), strict=True):
            bad = bad | ~np.all(bound.allows(x), axis=-1)
        for x, bound in zip(volume, VOLUME_BOUNDS.values(), strict=True):
            bad = bad | ~bound.allows(x)
        residual = np.sum(Q_, axis=-1)
        open_ = np.abs(residual) > tol_ * np.max(np.abs(Q_), axis=-1)
        force = (p_ * A_ + beta_ * rho_[..., None] * Q_ * Q_ / A_) / length
        F = -np.sum(force[..., None] * normals, axis=-2) - vector
        F[..., 2] -= W_
        size = np.sqrt(np.sum(F * F, axis=-1))
        failed = bad | open_ | ~np.isfinite(size)
    status = np.where(bad, Status.OUT_OF_RANGE, np.where(failed, Status.NO_SOLUTION, Status.OK))
    F[failed] = np.nan
    size = np.where(failed, np.nan, size)
    Fx, Fy, Fz = F[..., 0], F[..., 1], F[..., 2]
    values = BalanceForces(
        Fx, Fy, Fz, size, 0.0 - Fx, 0.0 - Fy, 0.0 - Fz, size.copy(), np.where(failed, np.nan, residual)
    )
    return values, np.asarray(status, dtype=np.uint8)


def _shaped(
    n: Num, A: Num, p: Num, Q: Num, rho: Num, beta: Num, W: Num, dMdt: Num, tol: Num
) -> tuple[Array, Array, list[Array], list[Array]]:
    """Broadcast everything to (..., n_ports, 3), (..., 3), (..., n_ports) and (...)."""
    normals, vector = (np.asarray(x, dtype=float) for x in (n, dMdt))
    ports = [np.asarray(x, dtype=float) for x in (A, p, Q, beta)]
    volume = [np.asarray(x, dtype=float) for x in (rho, W, tol)]
    if normals.ndim < 2 or normals.shape[-1] != 3 or normals.shape[-2] == 0:
        raise ValueError(f"normals n need the shape (..., n_ports, 3), not {normals.shape}")
    if vector.ndim < 1 or vector.shape[-1] != 3:
        raise ValueError(f"dMdt needs the shape (..., 3), not {vector.shape}")
    try:
        shape = np.broadcast_shapes(normals.shape[:-1], *(x.shape for x in ports))
        if shape[-1] != normals.shape[-2]:
            raise ValueError("more ports than normals")
        outer = np.broadcast_shapes(shape[:-1], vector.shape[:-1], *(x.shape for x in volume))
    except ValueError as error:
        raise ValueError(f"the shapes of the ports and of the volume do not fit together: {error}") from None
    shape = (*outer, shape[-1])
    return (
        np.broadcast_to(normals, (*shape, 3)),
        np.broadcast_to(vector, (*outer, 3)),
        [np.broadcast_to(x, shape) for x in ports],
        [np.broadcast_to(x, outer) for x in volume],
    )


def _reason(n: Num, A: Num, p: Num, Q: Num, rho: Num, beta: Num, W: Num, dMdt: Num, tol: Num) -> EngineError:
    """Say why one balance failed, with every bad argument and its port."""
    normals, vector, ports, volume = _shaped(n, A, p, Q, rho, beta, W, dMdt, tol)
    problems: list[Problem] = []
    for port, direction in enumerate(normals, start=1):
        length = float(np.sqrt(direction @ direction))
        if not 0 < length < np.inf:
            shown: Any = tuple(float(c) for c in direction)
            problems.append(Problem(f"n of port {port}", shown, _NORMAL_ALLOWED))
        for (name, bound), x in zip(PORT_BOUNDS.items(), ports, strict=True):
            if not bound.allows(float(x[port - 1])):
                problems.append(Problem(f"{name} of port {port}", float(x[port - 1]), str(bound)))
    for (name, bound), value in zip(VOLUME_BOUNDS.items(), volume, strict=True):
        if not bound.allows(float(value)):
            problems.append(Problem(name, float(value), str(bound)))
    for axis, component in zip("xyz", vector, strict=True):
        if not np.isfinite(component):
            problems.append(Problem(f"dMdt {axis}", float(component), str(ANY)))
    if problems:
        return OutOfRange(problems, "balance")
    residual, largest = float(np.sum(ports[2])), float(np.max(np.abs(ports[2])))
    if abs(residual) > float(volume[2]) * largest:
        return NotClosed(
            f"the flows do not close: they add up to {residual:.6g} m3/s (positive outward), "
            f"more than {float(volume[2]):g} of the largest flow, {largest:.6g} m3/s",
            "balance",
        )
    return NoSolution("no finite result for these arguments", "balance")
