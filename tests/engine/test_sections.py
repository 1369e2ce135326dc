"""Sections, continuity and velocity profiles."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.integrate import quad

from thrustbook.engine.errors import NoSolution, OutOfRange, Status
from thrustbook.engine.sections import area, branchflow, flow, massflow, profile, reynolds, velocity

bounded = settings(max_examples=60, deadline=None, derandomize=True)


def test_area_of_a_known_circle() -> None:
    assert area(2.0).A == pytest.approx(math.pi, rel=1e-15)


@bounded
@given(st.floats(-50.0, 50.0), st.floats(1e-3, 20.0))
def test_velocity_and_flow_undo_each_other(Q: float, D: float) -> None:
    assert flow(velocity(Q, D).V, D).Q == pytest.approx(Q, rel=1e-14)
    assert velocity(-Q, D).V == -velocity(Q, D).V


def test_mass_flow_and_reynolds_number() -> None:
    assert massflow(998.2, -0.25).mdot == pytest.approx(-249.55)
    # By hand: 998.2 * 2 * 0.5 / 1.0016e-3.
    assert reynolds(998.2, 1.0016e-3, -2.0, 0.5).Re == pytest.approx(996_605.431, rel=1e-9)


@pytest.mark.parametrize("D", [0.0, -0.3, math.nan, math.inf])
def test_a_bad_diameter_is_refused_by_name(D: float) -> None:
    with pytest.raises(OutOfRange, match=r"D = .* \(allowed: above 0\)"):
        velocity(0.1, D)


def test_one_bad_row_spoils_only_itself() -> None:
    values, status = velocity.evaluate([np.array([0.1, 0.1, math.nan]), np.array([0.3, -0.3, 0.3])])
    assert status.tolist() == [Status.OK, Status.OUT_OF_RANGE, Status.OUT_OF_RANGE]
    assert np.isfinite(values.V).tolist() == [True, False, False]


def moments(n: float) -> tuple[float, float, float]:
    """alpha, beta and V/Vmax of the power law by quadrature, with y/R = s and r dr = (1 - s) ds."""
    mean, square, cube = (
        2.0 * quad(lambda s, k=k: s ** (k / n) * (1.0 - s), 0.0, 1.0, epsabs=1e-13)[0] for k in (1, 2, 3)
    )
    return cube / mean**3, square / mean**2, mean


@pytest.mark.parametrize("n", [1.0, 2.5, 5.0, 7.0, 10.0, 40.0])
def test_power_law_is_the_integral_over_the_section(n: float) -> None:
    found = profile("turbulent", n)
    assert found[:3] == pytest.approx(moments(n), rel=1e-9)


def test_laminar_profile_is_the_integral_over_the_section() -> None:
    mean, square, cube = (2.0 * quad(lambda r, k=k: (1.0 - r * r) ** k * r, 0.0, 1.0)[0] for k in (1, 2, 3))
    assert profile("laminar")[:3] == pytest.approx((cube / mean**3, square / mean**2, mean), rel=1e-12)


def test_exponent_follows_from_the_friction_factor() -> None:
    assert profile(f=0.04).n == pytest.approx(5.0)
    assert profile(f=0.04) == profile(n=profile(f=0.04).n)


@bounded
@given(st.floats(0.006, 0.09))
def test_rougher_pipes_have_larger_corrections(f: float) -> None:
    smooth, rough = profile(f=f), profile(f=1.1 * f)
    assert 1.0 < smooth.beta < smooth.alpha < rough.alpha
    assert smooth.beta < rough.beta


def test_profile_refuses_what_it_cannot_use() -> None:
    with pytest.raises(NoSolution, match="exactly one of n"):
        profile()
    with pytest.raises(NoSolution, match="exactly one of n"):
        profile("turbulent", 7.0, 0.02)
    with pytest.raises(NoSolution, match="neither n nor f"):
        profile("laminar", 7.0)
    with pytest.raises(OutOfRange, match="regime"):
        profile("plug")
    with pytest.raises(OutOfRange, match=r"n = 0\.5"):
        profile("turbulent", 0.5)


def test_profile_of_a_table_equals_cell_by_cell() -> None:
    n = np.array([5.0, 7.0, math.nan, math.nan])
    f = np.array([math.nan, math.nan, 0.02, math.nan])
    values, status = profile.evaluate(["turbulent", n, f])
    assert status.tolist() == [0, 0, 0, Status.NO_SOLUTION]
    assert values.alpha[:2].tolist() == [profile(n=5.0).alpha, profile(n=7.0).alpha]
    assert values.alpha[2] == pytest.approx(profile(f=0.02).alpha, rel=1e-15)


def test_branch_flow_closes_the_junction() -> None:
    assert branchflow([0.3, -0.1, -0.05]).Q == pytest.approx(-0.15)
    assert branchflow([0.1, 0.2, -0.3]).Q == pytest.approx(0.0, abs=1e-16)
    assert branchflow(0.4).Q == -0.4


@bounded
@given(st.lists(st.floats(-1e3, 1e3), min_size=1, max_size=12))
def test_all_flows_of_a_junction_add_up_to_zero(flows: list[float]) -> None:
    assert math.fsum([*flows, branchflow(flows).Q]) == pytest.approx(0.0, abs=1e-12)


def test_branch_flow_by_rows_and_bad_flows() -> None:
    rows = branchflow([[0.3, -0.1], [0.2, math.nan], [1.0, math.inf]]).Q
    assert rows[0] == pytest.approx(-0.2)
    assert np.isnan(rows[1:]).all()
    with pytest.raises(OutOfRange, match=r"Q\[2\] = not given.*Q\[3\] = inf"):
        branchflow([0.1, math.nan, math.inf])
    with pytest.raises(OutOfRange, match="at least one"):
        branchflow([])
