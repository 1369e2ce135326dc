"""Geometry of a pipe run: the table of nodes as given, checked and turned into faces.

Node ``j`` is a point where two legs meet. Leg ``j`` goes from node ``j`` to node
``j+1``. Section 1 of a node is the face towards the leg that arrives in the order
of the table, section 2 the face towards the leg that leaves. The names do not
depend on the direction of flow: a negative flow runs against the table.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np
import numpy.typing as npt

from .errors import Problem
from .friction import MAX_ROUGHNESS
from .guard import ANY, NON_NEGATIVE, POSITIVE, Bound
from .numeric import NOT_GIVEN
from .sections import circle

Array = npt.NDArray[np.float64]
Column = npt.ArrayLike

MIN_LENGTH: Final = 1e-6
"""Nodes closer than this [m] are coincident: the leg between them has no direction."""

START_KINDS: Final = ("continues", "closed")
END_KINDS: Final = ("continues", "jet", "closed")

COLUMN_BOUNDS: Final[dict[str, Bound]] = {
    "x": ANY,
    "y": ANY,
    "z": ANY,
    "D": POSITIVE,
    "e": NON_NEGATIVE,
    "K": NON_NEGATIVE,
    "Hp": ANY,
    "Qo": ANY,
    "ox": ANY,
    "oy": ANY,
    "oz": ANY,
    "Do": POSITIVE,
    "Ko": NON_NEGATIVE,
    "Dj": POSITIVE,
    "f": NON_NEGATIVE,
    "alpha": Bound(low=1.0, high=2.0),
    "beta": Bound(low=1.0, high=2.0),
}
"""Range of each column of the table, SI units."""

REQUIRED_COLUMNS: Final = ("x", "y", "z", "D")
_FILL: Final[dict[str, float]] = {"K": 0.0, "Hp": 0.0, "Qo": 0.0, "Ko": 0.0, "alpha": 1.0, "beta": 1.0}


@dataclass(frozen=True)
class RunTable:
    """The table of nodes of a run, one entry a node, in order along the pipe.

    Every column is an array of shape (N,) or one number for all nodes. An entry
    that is NaN was not given. SI units.

    Attributes
    ----------
    x, y, z : coordinates east, north and up [m]; required.
    D : inside diameter of the leg that leaves the node [m]; required. On the last
        row it is the diameter beyond: of the jet (required there) or of the pipe
        that continues (not given: as the leg before). A closed end ignores it.
    e : absolute roughness of the leg that leaves the node [m]. Needed on every leg
        that has no ``f``.
    K : loss coefficient of the node [-], on the velocity of the leg that leaves it
        (the jet's velocity at a jet). The loss acts along the true direction of
        flow. Not given: 0.
    Hp : pump head added at the node in the order of the table [m]. Not given: 0.
    Qo : flow leaving through an offtake at the node, positive outwards [m3/s].
    ox, oy, oz : direction in which the offtake leaves; any length [-].
    Do : inside diameter of the offtake [m]. Given with no flow it is a branch that
        stands under the pressure of the run.
    Ko : loss coefficient of the offtake, on the offtake's velocity [-].
    Dj : diameter on which pressure acts at the joints of the leg that leaves the
        node [m], not below ``D``; for unrestrained joints the outside diameter of
        the spigot. Not given: ``D``.
    f : Darcy friction factor of the leg, in place of roughness and viscosity [-].
    alpha, beta : kinetic energy and momentum corrections of the leg [-].
    """

    x: Column
    y: Column
    z: Column
    D: Column
    e: Column = NOT_GIVEN
    K: Column = NOT_GIVEN
    Hp: Column = NOT_GIVEN
    Qo: Column = NOT_GIVEN
    ox: Column = NOT_GIVEN
    oy: Column = NOT_GIVEN
    oz: Column = NOT_GIVEN
    Do: Column = NOT_GIVEN
    Ko: Column = NOT_GIVEN
    Dj: Column = NOT_GIVEN
    f: Column = NOT_GIVEN
    alpha: Column = NOT_GIVEN
    beta: Column = NOT_GIVEN


@dataclass(frozen=True)
class Geometry:
    """A checked run: what all load cases share. N nodes, N - 1 legs.

    ``u1``, ``u2`` (N, 3) are the directions of the arriving and of the leaving leg;
    beyond the two ends the pipe is taken to go straight on. ``area1``, ``area2`` are
    the bores at sections 1 and 2 with the diameters ``D1``, ``D2``; ``joint1`` and
    ``joint2`` the areas on which pressure acts there. A closed end has no area.
    ``joint_fault`` and ``offtake_fault`` mark nodes whose thrust cannot be found;
    the flows and pressures do not depend on those entries.
    """

    start: str
    end: str
    z: Array
    L: Array
    s: Array
    u1: Array
    u2: Array
    theta: Array
    D1: Array
    D2: Array
    area1: Array
    area2: Array
    joint1: Array
    joint2: Array
    alpha1: Array
    alpha2: Array
    beta1: Array
    beta2: Array
    e: Array
    f: Array
    K: Array
    Hp: Array
    Qo: Array
    Ko: Array
    offtake: npt.NDArray[np.bool_]
    offtake_u: Array
    offtake_area: Array
    joint_fault: npt.NDArray[np.bool_]
    offtake_fault: npt.NDArray[np.bool_]
    problems: tuple[Problem, ...]

    @property
    def size(self) -> int:
        """Number of nodes."""
        return len(self.z)


def read_columns(table: RunTable) -> tuple[dict[str, Array], list[Problem]]:
    """Broadcast the columns to N nodes and collect every entry outside its range.

    An entry is named by column and index, counted from 0: ``D[3]``.
    """
    given = {name: np.asarray(getattr(table, name), dtype=float) for name in COLUMN_BOUNDS}
    sizes = {name: a.size for name, a in given.items() if a.ndim}
    count = max(sizes.values(), default=1)
    problems = [
        Problem(name, f"{size} entries", f"{count} entries, one a node, or one number for all")
        for name, size in sizes.items()
        if size != count or given[name].ndim > 1
    ]
    if count < 2:
        problems.append(Problem("x", f"{count} node", "at least 2 nodes"))
    if problems:
        return {}, problems
    columns: dict[str, Array] = {}
    for name, values in given.items():
        column = np.broadcast_to(values, (count,)).copy()
        with np.errstate(invalid="ignore"):
            wrong = ~COLUMN_BOUNDS[name].allows(column)
        if name not in REQUIRED_COLUMNS:
            wrong &= ~np.isnan(column)
        elif name == "D" and np.isnan(column[-1]):
            wrong[-1] = False  # the diameter beyond the last node has a default
        problems += [
            Problem(f"{name}[{j}]", float(column[j]), str(COLUMN_BOUNDS[name])) for j in np.flatnonzero(wrong)
        ]
        if name in _FILL:
            column[np.isnan(column)] = _FILL[name]
        columns[name] = column
    return columns, problems


def build(table: RunTable, start: str, end: str) -> tuple[Geometry | None, list[Problem]]:
    """Check the table and build the faces of every node.

    Returns the geometry, or None with every problem that leaves the run without
    one: all nodes of a run hang on each other through flow and pressure, so such a
    fault fails the whole run. Faults that touch one node's thrust only are kept in
    ``Geometry.problems``.
    """
    problems = []
    if start not in START_KINDS:
        problems.append(Problem("start", start, " or ".join(START_KINDS)))
    if end not in END_KINDS:
        problems.append(Problem("end", end, ", ".join(END_KINDS)))
    c, bad = read_columns(table)
    problems += bad
    if not c:
        return None, problems
    n = len(c["x"])
    with np.errstate(invalid="ignore"):  # coordinates that are not finite are reported already
        legs = np.diff(np.stack([c["x"], c["y"], c["z"]], axis=1), axis=0)
    L = np.sqrt((legs**2).sum(axis=1))
    problems += [
        Problem(f"x[{j + 1}], y[{j + 1}], z[{j + 1}]", f"{L[j]:.3g} m from the node before", "a node apart")
        for j in np.flatnonzero(L < MIN_LENGTH)
    ]
    for j in np.flatnonzero(np.isnan(c["e"][:-1]) & np.isnan(c["f"][:-1])):
        problems.append(Problem(f"e[{j}]", float(c["e"][j]), "a roughness, or a friction factor f"))
    D = c["D"][:-1]
    too_rough = np.isnan(c["f"][:-1]) & (D > 0) & (c["e"][:-1] > MAX_ROUGHNESS * D)
    for j in np.flatnonzero(too_rough):
        problems.append(Problem(f"e[{j}]", float(c["e"][j]), f"at most {MAX_ROUGHNESS:g} of the diameter"))
    if end == "jet" and np.isnan(c["D"][-1]):
        problems.append(Problem(f"D[{n - 1}]", float(c["D"][-1]), "the diameter of the jet"))
    for kind, i in ((start, 0), (end, n - 1)):
        if kind == "closed" and c["Hp"][i] != 0:
            problems.append(Problem(f"Hp[{i}]", float(c["Hp"][i]), "no pump at a closed end"))
    if problems:
        return None, problems
    return _faces(c, legs, L, start, end), []


def _faces(c: dict[str, Array], legs: Array, L: Array, start: str, end: str) -> Geometry:
    u = legs / L[:, None]
    u1 = np.concatenate([u[:1], u])
    u2 = np.concatenate([u, u[-1:]])
    cross = np.cross(u1, u2)
    # The arc tangent keeps its precision at small deflections, where the cosine loses it.
    theta = np.arctan2(np.sqrt((cross**2).sum(axis=1)), (u1 * u2).sum(axis=1))

    D2 = c["D"]
    if np.isnan(D2[-1]) or end == "closed":
        D2[-1] = D2[-2]
    Dj = c["Dj"]
    if np.isnan(Dj[-1]) and D2[-1] == D2[-2] and end == "continues":
        Dj[-1] = Dj[-2]
    Dj = np.where(np.isnan(Dj), D2, Dj)
    if end != "continues":
        Dj[-1] = D2[-1]  # no joint there: a cap, or a jet at no pressure
    joint_bad = Dj < D2
    joint2 = np.where(joint_bad, np.nan, circle(Dj))
    D1, joint1 = _shift(D2), _shift(joint2)
    area1, area2 = circle(D1), circle(D2)
    if start == "closed":
        area1[0] = joint1[0] = 0.0
    if end == "closed":
        area2[-1] = joint2[-1] = 0.0
    joint_fault = np.isnan(joint1) | np.isnan(joint2)

    direction = np.stack([c[k] for k in ("ox", "oy", "oz")], axis=1)
    # One or two components are enough: the others are then zero.
    some = ~np.isnan(direction).all(axis=1)
    direction[some] = np.nan_to_num(direction[some])
    length = np.sqrt((direction**2).sum(axis=1))
    offtake = (c["Qo"] != 0) | ~np.isnan(c["Do"])
    no_direction = offtake & ~(length > 0)
    no_diameter = offtake & np.isnan(c["Do"])
    fault = no_direction | no_diameter
    sound = offtake & ~fault
    offtake_u = np.zeros_like(direction)
    offtake_u[sound] = direction[sound] / length[sound, None]
    offtake_area = np.where(sound, circle(c["Do"]), np.where(fault, np.nan, 0.0))

    local = [
        Problem(f"Dj[{j}]", float(Dj[j]), f"at least the diameter {D2[j]:g}")
        for j in np.flatnonzero(joint_bad)
    ]
    local += [
        Problem(f"ox[{j}], oy[{j}], oz[{j}]", "no direction", "a direction for the offtake")
        for j in np.flatnonzero(no_direction)
    ]
    local += [
        Problem(f"Do[{j}]", float(c["Do"][j]), "a diameter for the offtake")
        for j in np.flatnonzero(no_diameter)
    ]
    return Geometry(
        start=start,
        end=end,
        z=c["z"],
        L=L,
        s=np.concatenate([[0.0], np.cumsum(L)]),
        u1=u1,
        u2=u2,
        theta=theta,
        D1=D1,
        D2=D2,
        area1=area1,
        area2=area2,
        joint1=joint1,
        joint2=joint2,
        alpha1=_shift(c["alpha"]),
        alpha2=c["alpha"],
        beta1=_shift(c["beta"]),
        beta2=c["beta"],
        e=c["e"],
        f=c["f"],
        K=c["K"],
        Hp=c["Hp"],
        Qo=c["Qo"],
        Ko=c["Ko"],
        offtake=offtake,
        offtake_u=offtake_u,
        offtake_area=offtake_area,
        joint_fault=joint_fault,
        offtake_fault=fault,
        problems=tuple(local),
    )


def _shift(a: Array) -> Array:
    """The values of the arriving leg; before the first node the pipe is as after it."""
    return np.concatenate([a[:1], a[:-1]])
