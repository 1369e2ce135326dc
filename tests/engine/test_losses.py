"""Losses of pipes and fittings, and every published check of the energy family."""

from __future__ import annotations

import math
from typing import Any

import fluids.fittings
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tests.published import load
from thrustbook.engine import friction, losses, sections
from thrustbook.engine.constants import G
from thrustbook.engine.errors import NoSolution, OutOfRange, Status
from thrustbook.engine.losses import contraction, expansion, fittingloss, pipeloss

bounded = settings(max_examples=80, deadline=None, derandomize=True)
diameters = st.floats(0.01, 4.0)

ROUTINES = {
    "friction": friction.friction,
    "expansion": losses.expansion,
    "contraction": losses.contraction,
    "profile": sections.profile,
}


@pytest.mark.parametrize("check", load("energy"), ids=lambda check: check["topic"])
def test_published_value(check: dict[str, Any]) -> None:
    found = ROUTINES[check["routine"]](**check["inputs"])
    for name, expected in check["expected"].items():
        assert getattr(found, name) == pytest.approx(expected, rel=check["tolerance"])


def test_pipe_loss_by_hand_in_laminar_flow() -> None:
    """Hagen-Poiseuille: dp = 128 mu L Q / (pi D^4), no friction factor in sight."""
    rho, mu, D, L, Q = 900.0, 0.2, 0.1, 50.0, 0.01
    found = pipeloss(rho, mu, D, L, 1e-4, Q)
    assert found.Re < 2300.0
    assert found.dp == pytest.approx(128.0 * mu * L * Q / (math.pi * D**4), rel=1e-13)
    assert found.F == pytest.approx(found.dp * math.pi / 4.0 * D**2, rel=1e-14)


@bounded
@given(diameters, st.floats(0.0, 1e4), st.floats(0.0, 1e-3), st.floats(1e-6, 20.0))
def test_pipe_loss_is_darcys_and_reverses_with_the_flow(D: float, L: float, e: float, Q: float) -> None:
    forward, back = pipeloss(998.0, 1e-3, D, L, e, Q), pipeloss(998.0, 1e-3, D, L, e, -Q)
    assert forward.hL == pytest.approx(forward.f * L / D * forward.V**2 / (2.0 * G), rel=1e-13, abs=1e-300)
    assert forward.dp == pytest.approx(998.0 * G * forward.hL, rel=1e-13, abs=1e-300)
    for name in ("dp", "hL", "V", "F"):
        assert getattr(back, name) == -getattr(forward, name)
    assert (back.f, back.Re) == (forward.f, forward.Re)


def test_a_pipe_at_rest_loses_nothing() -> None:
    assert pipeloss(998.0, 1e-3, 0.3, 100.0, 1e-4, 0.0) == (0.0, 0.0, 0.0, 0.0, 0.0, 0.0)
    table = pipeloss(998.0, 1e-3, 0.3, 100.0, 1e-4, np.array([-0.1, 0.0, 0.1]))
    assert table.dp[1] == 0.0
    assert table.dp[0] == -table.dp[2] != 0.0


def test_pipe_loss_of_a_table_equals_cell_by_cell() -> None:
    rng = np.random.default_rng(3)
    D, L, e, Q = (
        rng.uniform(0.1, 2, 200),
        rng.uniform(1, 999, 200),
        rng.uniform(0, 1e-3, 200),
        rng.normal(size=200),
    )
    table = pipeloss(998.0, 1e-3, D, L, e, Q)
    for i in range(200):
        one = pipeloss(998.0, 1e-3, float(D[i]), float(L[i]), float(e[i]), float(Q[i]))
        assert [float(x[i]) for x in table] == pytest.approx(list(one), rel=1e-14)


def test_pipe_loss_names_every_bad_argument() -> None:
    with pytest.raises(OutOfRange, match=r"mu = 0 .*D = -0\.3.*L = -1"):
        pipeloss(998.0, 0.0, -0.3, -1.0, 1e-4, 0.1)
    with pytest.raises(NoSolution, match="roughness"):
        pipeloss(998.0, 1e-3, 0.3, 1.0, 0.04, 0.1)
    _, status = pipeloss.evaluate(
        [998.0, 1e-3, np.array([0.3, 0.3, -0.3]), 1.0, np.array([1e-4, 0.04, 1e-4]), 0.1, "colebrook"]
    )
    assert status.tolist() == [Status.OK, Status.NO_SOLUTION, Status.OUT_OF_RANGE]


def test_fitting_loss() -> None:
    found = fittingloss(1000.0, 0.2, -0.1, 2.0)
    V = 0.1 / (math.pi * 0.01)
    assert found.V == pytest.approx(-V)
    assert found.dp == pytest.approx(-2.0 * 500.0 * V * V)
    assert found.hL == pytest.approx(-2.0 * V * V / (2.0 * G))


@bounded
@given(diameters, diameters, st.floats(0.0, 10.0), st.floats(0.5, 2000.0))
def test_borda_carnot_is_the_momentum_balance(D1: float, D2: float, Q: float, rho: float) -> None:
    """Pressure on the face is the upstream one: p2 A2 = p1 A2 + rho Q (V1 - V2)."""
    D1, D2 = min(D1, D2), max(D1, D2)
    A1, A2 = math.pi / 4 * D1**2, math.pi / 4 * D2**2
    V1, V2 = Q / A1, Q / A2
    rise = rho * Q * (V1 - V2) / A2
    lost = rho / 2.0 * (V1**2 - V2**2) - rise
    found = expansion(D1, D2, Q, rho)
    scale = 1e-13 * rho * V1**2
    assert found.dp == pytest.approx(lost, rel=1e-9, abs=scale)
    assert found.K1 * rho * V1**2 / 2.0 == pytest.approx(found.dp, rel=1e-12, abs=1e-300)
    assert found.K2 * rho * V2**2 / 2.0 == pytest.approx(found.dp, rel=1e-12, abs=1e-300)
    assert found.hL == pytest.approx(found.dp / (rho * G), rel=1e-12, abs=1e-300)


@pytest.mark.parametrize(("small", "large"), [(1.0, 2.0), (0.3, 0.35), (0.05, 3.0), (2.0, 2.0)])
def test_steps_agree_with_the_fluids_library(small: float, large: float) -> None:
    assert expansion(small, large).K1 == pytest.approx(
        fluids.fittings.diffuser_sharp(small, large), abs=1e-15
    )
    crane = fluids.fittings.contraction_conical_Crane(large, small, l=0.0)
    assert contraction(large, small).K2 == pytest.approx(crane, rel=1e-9, abs=1e-15)


def test_coefficients_of_a_step_stand_without_a_flow() -> None:
    for routine, D1, D2 in ((expansion, 0.1, 0.2), (contraction, 0.2, 0.1)):
        bare, full = routine(D1, D2), routine(D1, D2, 0.02, 998.0)
        assert bare[:2] == full[:2]
        assert math.isnan(bare.dp)
        assert math.isnan(bare.hL)
        assert full.dp > 0.0
        headed = routine(D1, D2, 0.02)
        assert headed.hL == full.hL
        assert math.isnan(headed.dp)
        table, status = routine.evaluate([np.array([D1, D1]), D2, np.array([math.nan, 0.02]), 998.0])
        assert status.tolist() == [Status.OK, Status.OK]
        assert np.isnan(table.dp).tolist() == [True, False]


def test_a_step_the_wrong_way_is_refused() -> None:
    with pytest.raises(NoSolution, match="D2 is smaller than D1"):
        expansion(0.2, 0.1)
    with pytest.raises(NoSolution, match="D2 is larger than D1"):
        contraction(0.1, 0.2)
    with pytest.raises(OutOfRange, match="Q = -1"):
        expansion(0.1, 0.2, -1.0)
    _, status = expansion.evaluate([np.array([0.1, 0.3]), 0.2, math.nan, math.nan])
    assert status.tolist() == [Status.OK, Status.NO_SOLUTION]
