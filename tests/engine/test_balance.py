"""The general balance: against direct integration, under rotation, and refusing what it must."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import numpy.typing as npt
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from thrustbook.engine.balance import balance, evaluate_balance
from thrustbook.engine.errors import NoSolution, NotClosed, OutOfRange, Status

from .surface import Disc, corrections, thrust

Drawn = list[tuple[tuple[float, float, float], float, float, float, float]]

bounded = settings(max_examples=40, deadline=None, derandomize=True)
diameters = st.floats(0.02, 3.0)
pressures = st.floats(-9e4, 5e6)
parts = st.floats(-1.0, 1.0)
directions = st.tuples(parts, parts, parts).filter(lambda n: math.hypot(*n) > 0.05)
ports = st.lists(
    st.tuples(directions, diameters, pressures, st.floats(-2.0, 2.0), st.sampled_from([math.inf, 7.0, 10.0])),
    min_size=1,
    max_size=6,
)


def closed_discs(drawn: Drawn) -> list[Disc]:
    """Make discs of drawn values; the last one takes the flow that closes."""
    discs = [Disc(*values) for values in drawn]
    last = discs[-1]
    out = -sum(disc.Q for disc in discs[:-1])
    return [*discs[:-1], Disc(last.normal, last.D, last.p, out, last.exponent)]


def of_discs(discs: list[Disc], rho: float, **more: Any) -> npt.NDArray[np.float64]:
    f = balance(
        [d.normal for d in discs],
        [math.pi / 4 * d.D**2 for d in discs],
        [d.p for d in discs],
        [d.Q for d in discs],
        rho,
        [corrections(d.exponent)[1] for d in discs],
        **more,
    )
    return np.array([f.Fx, f.Fy, f.Fz])


@bounded
@given(ports, st.floats(0.5, 2000.0))
def test_balance_is_the_integral_over_the_ports(drawn: Drawn, rho: float) -> None:
    discs = closed_discs(drawn)
    largest = max(np.linalg.norm(d.force(rho, g=0.0)) for d in discs)
    hydrostatic = rho * 9.80665 * max(d.D for d in discs) ** 3
    difference = of_discs(discs, rho) - thrust(discs, rho)
    assert np.abs(difference).max() <= 1e-11 * (largest + hydrostatic)


@bounded
@given(ports, st.floats(0.5, 2000.0), st.tuples(parts, parts, parts, parts))
def test_thrust_turns_with_the_axes(drawn: Drawn, rho: float, q: tuple[float, float, float, float]) -> None:
    discs = closed_discs(drawn)
    w, x, y, z = np.array([*q[:3], q[3] + 2.0]) / np.linalg.norm([*q[:3], q[3] + 2.0])
    turn = np.array(
        [
            [1 - 2 * (y * y + z * z), 2 * (x * y - z * w), 2 * (x * z + y * w)],
            [2 * (x * y + z * w), 1 - 2 * (x * x + z * z), 2 * (y * z - x * w)],
            [2 * (x * z - y * w), 2 * (y * z + x * w), 1 - 2 * (x * x + y * y)],
        ]
    )
    turned = [Disc(tuple(turn @ np.array(d.normal)), d.D, d.p, d.Q, d.exponent) for d in discs]
    scale = sum(np.linalg.norm(d.force(rho, g=0.0)) for d in discs) + 1e-12
    assert np.abs(of_discs(turned, rho) - turn @ of_discs(discs, rho)).max() <= 1e-12 * scale


@bounded
@given(ports, st.floats(0.5, 2000.0))
def test_reversing_every_flow_changes_nothing(drawn: Drawn, rho: float) -> None:
    discs = closed_discs(drawn)
    reversed_ = [Disc(d.normal, d.D, d.p, -d.Q, d.exponent) for d in discs]
    assert np.array_equal(of_discs(discs, rho), of_discs(reversed_, rho))


@bounded
@given(ports, st.floats(0.5, 2000.0), st.floats(0.01, 100.0), st.floats(0.01, 100.0), st.floats(0.01, 100.0))
def test_other_units_give_the_same_thrust(drawn: Drawn, rho: float, m: float, kg: float, s: float) -> None:
    """Measure in other units of length, mass and time: the force scales by kg m / s2."""
    discs = closed_discs(drawn)
    other = [Disc(d.normal, d.D * m, d.p * kg / (m * s * s), d.Q * m**3 / s, d.exponent) for d in discs]
    scale = (sum(np.linalg.norm(d.force(rho, g=0.0)) for d in discs) + 1e-9) * kg * m / s**2
    difference = of_discs(other, rho * kg / m**3) - of_discs(discs, rho) * kg * m / s**2
    assert np.abs(difference).max() <= 1e-12 * scale


def test_fluid_in_a_capped_box_presses_with_its_weight_only() -> None:
    """A straight upright piece of pipe, hydrostatic: the walls carry nothing, the ends cancel."""
    rho, g, A, h = 1000.0, 9.80665, 0.3, 2.0
    f = balance([[0, 0, 1], [0, 0, -1]], [A, A], [1e4, 1e4 + rho * g * h], [0, 0], rho, W=rho * g * A * h)
    assert f.Fz == pytest.approx(0.0, abs=1e-9)
    assert (f.Fx, f.Fy) == (0.0, 0.0)


def test_unsteady_term_and_weight_are_vectors() -> None:
    f = balance([[1, 0, 0]], [0.1], [0.0], [0.0], 1000.0, W=500.0, dMdt=[10.0, -20.0, 30.0])
    assert (f.Fx, f.Fy, f.Fz) == (-10.0, 20.0, -530.0)
    assert (f.Rx, f.Ry, f.Rz, f.R) == (10.0, -20.0, 530.0, f.F)
    assert f.F == pytest.approx(math.sqrt(100 + 400 + 530**2), rel=1e-15)


def test_many_balances_equal_one_by_one() -> None:
    rng = np.random.default_rng(7)
    n, A = rng.normal(size=(50, 4, 3)), rng.uniform(0.01, 1, (50, 4))
    p, Q = rng.uniform(-1e5, 1e6, (50, 4)), rng.uniform(-1, 1, (50, 4))
    Q[:, 3] = -Q[:, :3].sum(axis=1)
    rho, W, dMdt = rng.uniform(1, 1500, 50), rng.uniform(0, 1e4, 50), rng.normal(size=(50, 3))
    many = balance(n, A, p, Q, rho, 1.02, W, dMdt)
    for i in range(50):
        one = balance(n[i], A[i], p[i], Q[i], rho[i], 1.02, W[i], dMdt[i])
        assert [x[i] for x in many] == pytest.approx(list(one), rel=1e-13, abs=1e-9)
        assert all(type(x) is float for x in one)


def test_flows_that_do_not_close_are_refused() -> None:
    n, A, p = [[-1, 0, 0], [1, 0, 0]], [0.1, 0.1], [1e5, 1e5]
    with pytest.raises(NotClosed, match=r"add up to 0\.01 m3/s"):
        balance(n, A, p, [-0.3, 0.31], 1000.0)
    assert balance(n, A, p, [-0.3, 0.31], 1000.0, tol=0.05).residual == pytest.approx(0.01)
    values, status = evaluate_balance([n, n], A, p, [[-0.3, 0.31], [-0.3, 0.3]], 1000.0)
    assert status.tolist() == [Status.NO_SOLUTION, Status.OK]
    assert np.isnan([x[0] for x in values]).all()
    assert np.isfinite([x[1] for x in values]).all()


def test_every_bad_argument_is_named_with_its_port() -> None:
    with pytest.raises(OutOfRange) as caught:
        balance([[0, 0, 0], [1, 0, 0]], [0.1, -0.1], [1e5, math.nan], [0, 0], -1.0, [1.0, 0.9], math.inf)
    named = {problem.argument for problem in caught.value.problems}
    assert named == {"n of port 1", "A of port 2", "p of port 2", "beta of port 2", "rho", "W"}
    assert caught.value.function == "balance"


@pytest.mark.parametrize(
    ("n", "A", "dMdt"),
    [([1, 0, 0], [0.1], [0, 0, 0]), ([[1, 0]], [0.1], [0, 0, 0]), ([[1, 0, 0]], [0.1, 0.2], [0, 0, 0]),
     ([[1, 0, 0]], [0.1], [0, 0])],
)  # fmt: skip
def test_shapes_that_do_not_fit_are_refused(n: list[Any], A: list[float], dMdt: list[float]) -> None:
    with pytest.raises(ValueError, match="shape"):
        balance(n, A, 0.0, 0.0, 1000.0, dMdt=dMdt)


def test_overflow_is_no_result() -> None:
    with pytest.raises(NoSolution, match="finite"):
        balance([[1, 0, 0], [-1, 0, 0]], [1.0, 1.0], [0.0, 0.0], [1e200, -1e200], 1000.0)
