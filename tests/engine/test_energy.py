"""Heads, Bernoulli between two sections, power and the margin to the vapour pressure."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st

from thrustbook.engine.bernoulli import discharge, pressure, pumphead
from thrustbook.engine.constants import P_ATM, G
from thrustbook.engine.energy import cavitation, head, power
from thrustbook.engine.errors import NoSolution, OutOfRange, Status
from thrustbook.engine.losses import contraction, expansion

bounded = settings(max_examples=100, deadline=None, derandomize=True)
densities = st.floats(500.0, 2000.0)
diameters = st.floats(0.05, 2.0)
pressures = st.floats(-9e4, 3e6)
flows = st.floats(-3.0, 3.0)
lifts = st.floats(-100.0, 100.0)
coefficients = st.floats(0.0, 10.0)
corrections = st.floats(1.0, 2.0)


def total_head(rho: float, D: float, p: float, Q: float, z: float, alpha: float) -> float:
    return head(rho, p, Q / (math.pi / 4 * D * D), z, alpha).H


@bounded
@given(
    densities, diameters, diameters, pressures, flows, lifts, coefficients, coefficients, lifts,
    corrections, corrections,
)  # fmt: skip
def test_heads_of_both_sections_balance(
    rho: float, D1: float, D2: float, p1: float, Q: float, dz: float, K: float, hL: float, Hp: float,
    alpha1: float, alpha2: float,
) -> None:  # fmt: skip
    found = pressure(rho, D1, D2, p1, Q, dz, K, hL, Hp, alpha1, alpha2)
    H1 = total_head(rho, D1, p1, Q, 0.0, alpha1)
    H2 = total_head(rho, D2, found.p2, Q, dz, alpha2)
    small = math.pi / 4 * min(D1, D2) ** 2
    loss = math.copysign(K * (Q / small) ** 2 / (2.0 * G) + hL, Q) if Q else 0.0
    scale = 1.0 + abs(H1) + abs(H2) + abs(Hp) + abs(loss) + 4.0 * (Q / small) ** 2 / G
    assert found.hL == pytest.approx(loss, rel=1e-12, abs=1e-300)
    assert H1 + Hp == pytest.approx(H2 + loss, abs=1e-11 * scale)
    back = pumphead(rho, D1, D2, p1, found.p2, Q, dz, K, hL, alpha1, alpha2)
    assert back.Hp == pytest.approx(Hp, abs=1e-11 * scale)
    assert back.dp == pytest.approx(rho * G * back.Hp, rel=1e-14)


@bounded
@given(densities, diameters, diameters, pressures, st.floats(0.0, 3.0), lifts, coefficients)
def test_reversed_flow_seen_from_the_other_end(
    rho: float, D1: float, D2: float, p1: float, Q: float, dz: float, K: float
) -> None:
    p2 = pressure(rho, D1, D2, p1, -Q, dz, K).p2
    there = pressure(rho, D2, D1, p2, Q, -dz, K).p2
    V = Q / (math.pi / 4 * min(D1, D2) ** 2)
    assert there == pytest.approx(p1, abs=1e-11 * (abs(p1) + rho * G * 100.0 + rho * V * V * (1.0 + K)))


def test_water_at_rest_is_hydrostatic() -> None:
    found = pressure(1000.0, 0.3, 0.2, 5e5, 0.0, dz=10.0, K=3.0, hL=2.0)
    assert found.p2 == pytest.approx(5e5 - 98_066.5, rel=1e-14)
    assert found.hL == 0.0


def test_coefficient_of_a_step_is_taken_as_it_is() -> None:
    """K of the small pipe from the step routines is the K that the balance expects, both ways."""
    wide = expansion(0.1, 0.2, 0.02, 998.0)
    assert pressure(998.0, 0.1, 0.2, 0.0, 0.02, K=wide.K1).hL == pytest.approx(wide.hL, rel=1e-14)
    narrow = contraction(0.2, 0.1, 0.02, 998.0)
    assert pressure(998.0, 0.2, 0.1, 0.0, 0.02, K=narrow.K2).hL == pytest.approx(narrow.hL, rel=1e-14)


@bounded
@given(
    densities, diameters, st.floats(0.1, 1.0), st.floats(1e-3, 3.0), pressures, coefficients,
    st.floats(-20.0, 20.0),
)  # fmt: skip
def test_discharge_and_pressure_undo_each_other(
    rho: float, D1: float, ratio: float, Q: float, p2: float, K: float, dz: float
) -> None:
    assume(ratio < 0.97 or K > 0.1)
    D2 = ratio * D1
    from_flow = discharge(rho, D1, D2, Q=Q, p2=p2, K=K, dz=dz)
    V = from_flow.V2
    scale = abs(p2) + rho * G * 20.0 + rho * V * V * (1.0 + K)
    assert pressure(rho, D1, D2, from_flow.p1, Q, dz, K).p2 == pytest.approx(p2, abs=1e-11 * scale)
    drive = from_flow.p1 - p2 - rho * G * dz
    assume(drive > 1e-6 * scale)
    from_pressure = discharge(rho, D1, D2, p1=from_flow.p1, p2=p2, K=K, dz=dz)
    assert from_pressure.Q == pytest.approx(Q, rel=1e-8)
    assert from_pressure.V1 == pytest.approx(from_pressure.Q / (math.pi / 4 * D1**2), rel=1e-12)
    head = from_pressure.V2**2 / (2.0 * G)
    assert from_pressure.hL == pytest.approx(K * head, rel=1e-9, abs=1e-12 * (1.0 + head))


def test_discharge_with_a_coefficient_is_the_meter_formula() -> None:
    Cd, D1, D2, dp, rho = 0.61, 0.2, 0.1, 20e3, 998.0
    A2 = math.pi / 4 * D2**2
    expected = Cd * A2 * math.sqrt(2.0 * dp / (rho * (1.0 - (D2 / D1) ** 4)))
    found = discharge(rho, D1, D2, p1=150e3, p2=130e3, Cd=Cd)
    assert found.Q == pytest.approx(expected, rel=1e-14)
    # What is lost closes the balance of heads of the two sections.
    H1 = head(rho, 150e3, found.V1).H
    H2 = head(rho, 130e3, found.V2).H
    assert H1 - H2 == pytest.approx(found.hL, rel=1e-12)


def test_jet_from_a_vessel_is_torricellis() -> None:
    assert discharge(1000.0, 1e4, 0.05, p1=1000.0 * G * 5.0).V2 == pytest.approx(
        math.sqrt(2 * G * 5), rel=1e-9
    )


def test_discharge_at_rest() -> None:
    assert discharge(1000.0, 0.2, 0.1, Q=0.0, dz=3.0).p1 == pytest.approx(3000.0 * G)
    assert discharge(1000.0, 0.2, 0.1, p1=0.0).Q == 0.0


def test_discharge_refuses_what_it_cannot_solve() -> None:
    for wrong in ({}, {"p1": 1e5, "Q": 0.1}):
        with pytest.raises(NoSolution, match="exactly one of p1 and Q"):
            discharge(1000.0, 0.2, 0.1, **wrong)
    with pytest.raises(NoSolution, match="backwards"):
        discharge(1000.0, 0.2, 0.1, p1=-1.0)
    with pytest.raises(NoSolution, match="too large"):
        discharge(1000.0, 0.1, 0.1, p1=1e5)
    with pytest.raises(OutOfRange, match=r"Q = -0\.1.*Cd = 1\.2"):
        discharge(1000.0, 0.2, 0.1, Q=-0.1, Cd=1.2)


def test_discharge_of_a_table_equals_cell_by_cell() -> None:
    nan = math.nan
    p1 = np.array([1e5, nan, 2e5, nan, -5.0, 1e5])
    Q = np.array([nan, 0.05, nan, nan, nan, 0.1])
    values, status = discharge.evaluate([1000.0, 0.2, 0.1, p1, Q, 0.0, 0.1, 0.98, 0.0, 1.0, 1.0])
    bad = Status.NO_SOLUTION
    assert status.tolist() == [0, 0, 0, bad, bad, bad]
    for i in range(3):
        one = discharge(1000.0, 0.2, 0.1, float(p1[i]), float(Q[i]), 0.0, 0.1, 0.98)
        assert [float(x[i]) for x in values] == pytest.approx(list(one), rel=1e-14)


def test_head_by_hand() -> None:
    found = head(1000.0, 200e3, -3.0, 12.0, 1.1)
    assert found.hp == pytest.approx(20.394324)
    assert found.hV == pytest.approx(1.1 * 9.0 / 19.6133)
    assert found.HGL == pytest.approx(32.394324)
    assert found.H == pytest.approx(found.HGL + found.hV)


def test_power_of_pump_and_turbine() -> None:
    pump = power(1000.0, 0.2, 50.0, 0.8)
    assert pump.P == pytest.approx(98_066.5)
    assert pump.Pshaft == pytest.approx(98_066.5 / 0.8)
    turbine = power(1000.0, 0.2, -50.0, 0.8)
    assert turbine.P == -pump.P
    assert turbine.Pshaft == pytest.approx(-98_066.5 * 0.8)
    both = power(1000.0, 0.2, np.array([50.0, -50.0]), 0.8)
    assert both.Pshaft.tolist() == [pump.Pshaft, turbine.Pshaft]
    with pytest.raises(OutOfRange, match="eta = 0 "):
        power(1000.0, 0.2, 50.0, 0.0)


def test_cavitation_margin_by_hand() -> None:
    found = cavitation(-60e3, 2339.0, 998.2, 3.0, 95e3)
    assert found.pabs == 35e3
    assert found.margin == 32_661.0
    assert found.sigma == pytest.approx(32_661.0 / (0.5 * 998.2 * 9.0))
    assert found.NPSH == pytest.approx(32_661.0 / (998.2 * G) + 9.0 / (2.0 * G))


def test_boiling_is_a_result_and_not_an_error() -> None:
    assert cavitation(-100e3, 2339.0).margin == pytest.approx(P_ATM - 102_339.0)
    assert cavitation(-100e3, 2339.0).margin < 0.0


def test_cavitation_without_density_or_velocity() -> None:
    bare = cavitation(0.0, 2339.0)
    assert bare.margin == pytest.approx(P_ATM - 2339.0)
    assert math.isnan(bare.sigma)
    assert math.isnan(bare.NPSH)
    still = cavitation(0.0, 2339.0, 998.0, 0.0)
    assert math.isnan(still.sigma)
    assert still.NPSH == pytest.approx((P_ATM - 2339.0) / (998.0 * G))
    table, status = cavitation.evaluate([np.zeros(3), 2339.0, 998.0, np.array([math.nan, 0.0, 2.0]), P_ATM])
    assert status.tolist() == [0, 0, 0]
    assert np.isnan(table.sigma).tolist() == [True, True, False]
    assert np.isnan(table.NPSH).tolist() == [True, False, False]
    with pytest.raises(OutOfRange, match="pv = -1"):
        cavitation(0.0, -1.0)
