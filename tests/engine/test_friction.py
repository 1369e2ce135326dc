"""The Darcy friction factor: published values, the equation itself, other programs, the rules between."""

from __future__ import annotations

import math

import fluids.friction
import mpmath
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.optimize import brentq

from thrustbook.engine.errors import NoSolution, OutOfRange, Status
from thrustbook.engine.friction import METHODS, darcy, friction

bounded = settings(max_examples=150, deadline=None, derandomize=True)
turbulent = st.floats(math.log10(4000.0), 9.0).map(lambda x: max(10.0**x, 4000.0))
roughness = st.one_of(st.just(0.0), st.floats(-8.0, -1.0).map(lambda x: 10.0**x))


def residual(f: float, Re: float, eD: float) -> float:
    x = 1.0 / math.sqrt(f)
    return x + 2.0 * math.log10(eD / 3.7 + 2.51 * x / Re)


@bounded
@given(turbulent, roughness)
def test_colebrook_residual_vanishes(Re: float, eD: float) -> None:
    assert abs(residual(friction(Re, eD).f, Re, eD)) < 1e-12


def test_colebrook_residual_vanishes_on_a_dense_grid() -> None:
    Re = np.geomspace(4000.0, 1e12, 700)[:, None]
    eD = np.concatenate([[0.0], np.geomspace(1e-9, 0.1, 300)])
    x = 1.0 / np.sqrt(friction(Re, eD).f)
    assert np.abs(x + 2.0 * np.log10(eD / 3.7 + 2.51 * x / Re)).max() < 1e-13


@pytest.mark.parametrize(("Re", "eD"), [(4000.0, 0.0), (1e5, 1e-4), (3e7, 2e-6), (2.5e4, 0.05), (1e8, 0.0)])
def test_colebrook_equals_a_root_in_fifty_digits(Re: float, eD: float) -> None:
    with mpmath.workdps(50):
        a, b = mpmath.mpf(eD) / mpmath.mpf("3.7"), mpmath.mpf("2.51") / Re
        exact = float(1 / mpmath.findroot(lambda x: x + 2 * mpmath.log10(a + b * x), 8) ** 2)
    assert friction(Re, eD).f == pytest.approx(exact, rel=3e-15)


@bounded
@given(turbulent, roughness)
def test_colebrook_equals_a_bracketed_root(Re: float, eD: float) -> None:
    root = brentq(lambda f: residual(f, Re, eD), 1e-4, 1.0, xtol=1e-16, rtol=1e-13)
    assert friction(Re, eD).f == pytest.approx(root, rel=1e-11)


@pytest.mark.parametrize(
    ("method", "other"),
    [
        ("colebrook", fluids.friction.Colebrook),
        ("swamee-jain", fluids.friction.Swamee_Jain_1976),
        ("haaland", fluids.friction.Haaland),
    ],
)
def test_each_method_agrees_with_the_fluids_library(method: str, other: object) -> None:
    for Re in np.geomspace(4000.0, 1e8, 12):
        for eD in (0.0, 1e-6, 1e-4, 1e-3, 0.01, 0.05):
            # The library's Colebrook equation has 3.7 and 2.51 as well; its Swamee-Jain takes 1/0.27.
            tolerance = 2e-4 if method == "swamee-jain" else 1e-9
            expected = other(float(Re), eD)  # type: ignore[operator]
            assert friction(float(Re), eD, method).f == pytest.approx(expected, rel=tolerance)


@bounded
@given(st.floats(5e3, 1e8), st.floats(1e-6, 1e-2))
def test_explicit_formulas_keep_their_authors_accuracy(Re: float, eD: float) -> None:
    exact = friction(Re, eD).f
    assert friction(Re, eD, "haaland").f == pytest.approx(exact, rel=0.02)
    assert friction(Re, eD, "swamee-jain").f == pytest.approx(exact, rel=0.035)


@bounded
@given(st.floats(1e-6, 2300.0), roughness)
def test_laminar_flow_knows_no_roughness(Re: float, eD: float) -> None:
    found = friction(Re, eD)
    assert found.f == 64.0 / Re
    assert found.regime == 1.0


@pytest.mark.parametrize("method", METHODS)
@pytest.mark.parametrize("eD", [0.0, 1e-4, 0.01, 0.1])
def test_transition_joins_both_laws_and_loss_rises_with_flow(method: str, eD: float) -> None:
    for edge in (2300.0, 4000.0):
        below, above = (friction(edge * (1.0 + s), eD, method).f for s in (-1e-10, 1e-10))
        assert below == pytest.approx(above, rel=1e-8)
    middle = friction(3150.0, eD, method)
    assert middle.f == pytest.approx((64.0 / 2300.0 + friction(4000.0, eD, method).f) / 2.0, rel=1e-14)
    assert middle.regime == 2.0
    Re = np.geomspace(10.0, 1e7, 5000)
    loss = friction(Re, eD, method).f * Re**2
    assert (np.diff(loss) > 0.0).all()


def test_regimes_at_their_edges() -> None:
    found = friction(np.array([2300.0, 2300.1, 3999.9, 4000.0]), 1e-3)
    assert found.regime.tolist() == [1.0, 2.0, 2.0, 3.0]


@pytest.mark.parametrize("method", METHODS)
def test_scalar_equals_array(method: str) -> None:
    rng = np.random.default_rng(7)
    Re, eD = 10.0 ** rng.uniform(1.0, 8.0, 400), 10.0 ** rng.uniform(-7.0, -1.0, 400)
    table = friction(Re, eD, method)
    for i in range(400):
        assert friction(float(Re[i]), float(eD[i]), method).f == pytest.approx(table.f[i], rel=4e-15)


def test_roughness_either_way() -> None:
    assert friction(1e5, e=0.3e-3, D=0.3).f == pytest.approx(friction(1e5, 1e-3).f, rel=1e-14)
    for wrong in ({}, {"e": 1e-4}, {"D": 0.3}, {"eD": 1e-3, "e": 3e-4, "D": 0.3}, {"eD": 1e-3, "D": 0.3}):
        with pytest.raises(NoSolution, match="eD"):
            friction(1e5, **wrong)
    with pytest.raises(NoSolution, match=r"above 0\.1 of the diameter"):
        friction(1e5, e=0.05, D=0.3)


def test_bad_arguments_are_named_together() -> None:
    with pytest.raises(OutOfRange, match=r"Re = -1 .*eD = 0\.2"):
        friction(-1.0, 0.2)
    with pytest.raises(OutOfRange, match="Re = 0 "):
        friction(0.0, 1e-3)
    with pytest.raises(OutOfRange, match="method = 'moody'"):
        friction(1e5, 1e-3, "moody")


def test_one_bad_row_spoils_only_itself() -> None:
    Re, eD = np.array([1e5, -1e5, 1e5, 1e5]), np.array([1e-3, 1e-3, 0.5, math.nan])
    values, status = friction.evaluate([Re, eD, "colebrook", math.nan, math.nan])
    assert status.tolist() == [Status.OK, Status.OUT_OF_RANGE, Status.OUT_OF_RANGE, Status.NO_SOLUTION]
    assert np.isfinite(values.f).tolist() == [True, False, False, False]


def test_nothing_flows_nothing_is_lost() -> None:
    assert darcy(0.0, 1e-3) == 0.0
    assert darcy(np.array([0.0, 1000.0]), 1e-3).tolist() == [0.0, 0.064]
