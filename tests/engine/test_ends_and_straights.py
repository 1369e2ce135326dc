"""Nozzles, closed ends, restrictions, straight pipes and accelerating columns."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import pytest
from hypothesis import assume, given
from hypothesis import strategies as st

from thrustbook.engine.balance import balance
from thrustbook.engine.constants import G
from thrustbook.engine.ends import closed, nozzle
from thrustbook.engine.errors import NoSolution, OutOfRange, Status
from thrustbook.engine.straights import accel, inline, straight

from .ranges import EAST, WEST, bounded, densities, diameters, flows, losses, powers, pressures
from .surface import Disc, corrections, thrust


def disc_area(D: float) -> float:
    return math.pi * D * D / 4


@bounded
@given(
    densities,
    diameters,
    st.floats(0.1, 0.95),
    st.floats(0.0, 3.0),
    losses,
    st.floats(-9.0, 9.0),
    powers,
    powers,
)
def test_nozzle_is_the_integral_over_its_ports(
    rho: float, D1: float, ratio: float, Q: float, K: float, dz: float, n1: float, n2: float
) -> None:
    D2 = D1 * ratio
    (alpha1, beta1), (alpha2, beta2) = corrections(n1), corrections(n2)
    more = {"K": K, "dz": dz, "alpha1": alpha1, "alpha2": alpha2, "beta1": beta1, "beta2": beta2, "p2": 1e4}
    f = nozzle(rho, D1, D2, Q=Q, **more)
    discs = [Disc(WEST, D1, f.p1, -Q, n1), Disc(EAST, D2, 1e4, Q, n2)]
    scale = float(sum(np.linalg.norm(d.force(rho, g=0.0)) for d in discs))
    assert f.Fx == pytest.approx(thrust(discs, rho)[0], abs=1e-11 * scale)
    assert (f.F, f.Rx, f.R) == (abs(f.Fx), -f.Fx, abs(f.Fx))
    # Energy in heads.
    head1 = f.p1 / (rho * G) + alpha1 * f.V1**2 / (2 * G)
    head2 = 1e4 / (rho * G) + dz + (alpha2 + K) * f.V2**2 / (2 * G)
    assert head1 == pytest.approx(head2, rel=1e-9, abs=1e-9 * (1e4 / (rho * G) + abs(dz)))
    # The pressure leads back to the flow.
    assume(Q > 1e-3)
    back = nozzle(rho, D1, D2, p1=f.p1, **more)
    static = 1e4 + rho * G * abs(dz)
    assert back.Q == pytest.approx(Q, rel=1e-9 * (1 + static / (rho * f.V2**2)))


def test_nozzle_with_a_velocity_coefficient() -> None:
    """The velocity coefficient is the ratio to the ideal velocity of the same head over the nozzle."""
    f = nozzle(1000.0, 0.1, 0.04, p1=5e5, Cv=0.97)
    ideal = math.sqrt(2 * (5e5 / 1000 + f.V1**2 / 2))
    assert f.V2 / ideal == pytest.approx(0.97, rel=1e-12)
    assert f.M2 == pytest.approx(1000 * f.Q * f.V2, rel=1e-15)


def test_nozzle_equals_reducer_into_the_open() -> None:
    from thrustbook.engine.fittings import reducer

    f = nozzle(998.0, 0.15, 0.06, Q=0.03, K=0.05)
    g = reducer(998.0, 0.15, 0.06, f.p1, 0.03, K=0.05)
    assert g.p2 == pytest.approx(0.0, abs=1e-8)
    assert g.Fx == pytest.approx(f.Fx, rel=1e-12)


def test_nozzle_without_flow() -> None:
    f = nozzle(1000.0, 0.1, 0.05, Q=0.0, dz=2.0)
    assert (f.V1, f.V2, f.M2, f.p1) == (0.0, 0.0, 0.0, pytest.approx(2000 * G))
    assert nozzle(1000.0, 0.1, 0.05, p1=0.0).Q == 0.0


@pytest.mark.parametrize(
    ("arguments", "reason"),
    [
        ({}, "exactly one of p1 and Q"),
        ({"p1": 1e5, "Q": 0.1}, "exactly one of p1 and Q"),
        ({"p1": 1e5, "K": 0.1, "Cv": 0.98}, "K or Cv"),
        ({"p1": -1.0}, "drives no jet"),
        ({"p1": 1e5, "D2": 0.1}, "does not fix the flow"),
        ({"p1": 1e5, "D2": 0.2}, "does not fix the flow"),
    ],
)
def test_nozzle_says_what_it_cannot_answer(arguments: dict[str, float], reason: str) -> None:
    with pytest.raises(NoSolution, match=reason):
        nozzle(**({"rho": 1000.0, "D1": 0.1, "D2": 0.05} | arguments))


def test_nozzles_in_a_table_take_pressure_or_flow_row_by_row() -> None:
    nan = math.nan
    p1 = np.array([4e5, nan, nan, 4e5, -1.0, 4e5, 4e5])
    Q = np.array([nan, 0.02, nan, 0.02, nan, -0.02, nan])
    K = np.array([0.0, 0.0, 0.0, 0.0, 0.0, 0.0, 0.1])
    Cv = np.array([nan, nan, nan, nan, nan, nan, 0.98])
    rest = [p.default for p in nozzle.parameters[8:]]
    values, status = nozzle.evaluate([1000.0, 0.1, 0.05, p1, Q, 0.0, K, Cv, *rest])
    none = Status.NO_SOLUTION
    assert status.tolist() == [0, 0, none, none, none, Status.OUT_OF_RANGE, none]
    assert [x[0] for x in values] == pytest.approx(list(nozzle(1000.0, 0.1, 0.05, p1=4e5)), rel=1e-14)
    assert [x[1] for x in values] == pytest.approx(list(nozzle(1000.0, 0.1, 0.05, Q=0.02)), rel=1e-14)
    assert np.isnan(np.array(values)[:, 2:]).all()


@bounded
@given(diameters, pressures)
def test_closed_end_is_the_integral_over_its_port(D: float, p: float) -> None:
    f = closed(D, p)
    assert f.Fx == pytest.approx(thrust([Disc(WEST, D, p, 0.0)], 1000.0)[0], rel=1e-11, abs=1e-9 * D**3 * 1e4)
    assert (f.F, f.Rx, f.R) == (abs(f.Fx), -f.Fx, abs(f.Fx))


@bounded
@given(densities, diameters, pressures, flows, losses, powers, powers)
def test_inline_is_the_integral_over_its_ports(
    rho: float, D: float, p1: float, Q: float, K: float, n1: float, n2: float
) -> None:
    beta1, beta2 = corrections(n1)[1], corrections(n2)[1]
    f = inline(rho, D, p1, Q, K, beta1=beta1, beta2=beta2)
    discs = [Disc(WEST, D, p1, -Q, n1), Disc(EAST, D, f.p2, Q, n2)]
    scale = float(sum(np.linalg.norm(d.force(rho, g=0.0)) for d in discs)) + rho * G * D**3
    assert f.Fx == pytest.approx(thrust(discs, rho)[0], abs=1e-11 * scale)
    assert f.dp == pytest.approx(math.copysign(K * rho / 2 * (Q / disc_area(D)) ** 2, Q), rel=1e-12)
    for same in (inline(rho, D, p1, Q, dp=f.dp, beta1=beta1, beta2=beta2),
                 inline(rho, D, p1, Q, p2=f.p2, beta1=beta1, beta2=beta2)):  # fmt: skip
        assert list(same) == pytest.approx(list(f), rel=1e-9, abs=1e-10 * max(scale, scale / D**2))


def test_closed_valve_takes_the_difference_of_the_two_pressures() -> None:
    f = inline(1000.0, 0.2, 6e5, 0.0, p2=1e5)
    assert f.Fx == pytest.approx(closed(0.2, 6e5).Fx - closed(0.2, 1e5).Fx, rel=1e-14)
    assert inline(1000.0, 0.2, 1e5, 0.0, p2=6e5).Fx == -f.Fx


@pytest.mark.parametrize(
    "more", [{}, {"K": 1.0, "dp": 1e4}, {"dp": 1e4, "p2": 1e5}, {"K": 1.0, "dp": 1.0, "p2": 1.0}]
)
def test_inline_needs_exactly_one_of_three(more: dict[str, float]) -> None:
    with pytest.raises(NoSolution, match="exactly one of K, dp and p2"):
        inline(1000.0, 0.2, 6e5, 0.1, **more)


@bounded
@given(
    densities, diameters, st.floats(0.1, 500.0), flows, st.floats(0.0, 0.1), st.floats(-1.5, 1.5), pressures
)
def test_wall_drag_is_the_balance_of_a_sloping_pipe(
    rho: float, D: float, L: float, Q: float, f: float, slope: float, p1: float
) -> None:
    """Pressures and weight of a pipe that rises: the force along its axis is friction alone."""
    s = straight(rho, D, L, Q, f=f)
    axis = (math.cos(slope), 0.0, math.sin(slope))
    p2 = p1 - s.dp - rho * G * L * math.sin(slope)
    A = disc_area(D)
    back = tuple(-c for c in axis)
    b = balance([back, axis], [A, A], [p1, p2], [-Q, Q], rho, W=s.W)
    scale = (abs(p1) + abs(p2)) * A + s.W + abs(rho * Q * s.V)
    assert b.Fx * axis[0] + b.Fz * axis[2] == pytest.approx(s.Fx, abs=1e-11 * scale)
    assert b.Fx * -axis[2] + b.Fz * axis[0] == pytest.approx(-s.W * math.cos(slope), abs=1e-11 * scale)
    assert s.tau * math.pi * D * L == pytest.approx(s.Fx, rel=1e-12)
    assert s.W == pytest.approx(rho * G * A * L, rel=1e-13)


def test_straight_needs_exactly_one_of_f_and_dp() -> None:
    for more in ({}, {"f": 0.02, "dp": 1e3}):
        with pytest.raises(NoSolution, match="exactly one of f and dp"):
            straight(1000.0, 0.2, 10.0, 0.1, **more)
    assert straight(1000.0, 0.2, 10.0, 0.0, f=0.02).Fx == 0.0
    assert straight(1000.0, 0.2, 10.0, -0.1, f=0.02).Fx == -straight(1000.0, 0.2, 10.0, 0.1, f=0.02).Fx


@bounded
@given(densities, diameters, st.floats(0.0, 5000.0), flows, st.floats(0.1, 1000.0), flows, pressures)
def test_accelerating_leg_is_the_unsteady_balance(
    rho: float, D: float, L: float, dQ: float, dt: float, Q: float, p1: float
) -> None:
    """A leg along x between two ports along y: the balance has only its unsteady term along x."""
    f = accel(rho, D, L, dQ / dt)
    A = disc_area(D)
    momentum_rate = rho * A * L * (dQ / A) / dt
    b = balance([[0, 1, 0], [0, -1, 0]], [A, A], [p1, p1 - f.dp], [-Q, Q], rho, dMdt=[momentum_rate, 0, 0])
    assert b.Fx == pytest.approx(f.Fx, rel=1e-12)
    # Newton's second law on the column of fluid.
    assert f.dp * A == pytest.approx(momentum_rate, rel=1e-12)
    assert (f.Rx, f.F, f.R) == (-f.Fx, abs(f.Fx), abs(f.Fx))


@pytest.mark.parametrize(
    ("call", "named"),
    [
        (lambda: nozzle(0.0, 0.1, -0.05, p1=1e5), {"rho", "D2"}),
        (lambda: nozzle(1000.0, 0.1, 0.05, Q=-0.1), {"Q"}),
        (lambda: nozzle(1000.0, 0.1, 0.05, p1=1e5, Cv=1.1), {"Cv"}),
        (lambda: closed(0.0, math.nan), {"D", "p"}),
        (lambda: inline(1000.0, 0.2, 1e5, 0.1, K=-1.0), {"K"}),
        (lambda: straight(1000.0, 0.2, 0.0, 0.1, f=-0.02), {"L", "f"}),
        (lambda: accel(1000.0, 0.2, -10.0, math.inf), {"L", "dQdt"}),
    ],
)
def test_every_bad_argument_is_named(call: Any, named: set[str]) -> None:
    with pytest.raises(OutOfRange) as caught:
        call()
    assert {problem.argument for problem in caught.value.problems} == named
