"""Load cases of a pipe run and the case that governs."""

from __future__ import annotations

import math
from dataclasses import replace
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings

from thrustbook.engine.constants import G
from thrustbook.engine.errors import NoSolution, OutOfRange
from thrustbook.engine.run import run
from thrustbook.engine.runcases import KINDS, LoadCase, governing, run_cases
from thrustbook.engine.runflow import RunStart
from thrustbook.engine.runnotes import Fitting
from thrustbook.engine.runshape import RunTable

from .run_samples import tables

TABLE = RunTable(
    x=[0, 50, 90, 120, 150],
    y=[0, 0, 20, 20, 60],
    z=[10, 8, 12, 12, 5],
    D=[0.3, 0.3, 0.2, 0.2, 0.1],
    e=1e-4,
    K=[0, 0.2, 0.2, 0, 0.05],
    Hp=[0, 25, 0, 0, 0],
    Qo=[0, 0, 0.01, 0, 0],
    oy=1.0,
    Do=[np.nan, np.nan, 0.1, np.nan, np.nan],
)
START = RunStart(rho=1000.0, mu=1e-3, Q=0.05, p=4e5)
CASES = [
    LoadCase("normal", "operating"),
    LoadCase("peak", "peak", Q=0.09, offtakes=1.5),
    LoadCase("valve shut", "shut", H=80.0),
    LoadCase("test", "test", p=9e5),
    LoadCase("surge", "surge", dp=3e5, dp2=1e5),
    LoadCase("empty", "empty"),
]


def test_each_case_is_the_run_it_says() -> None:
    result = run_cases(TABLE, START, CASES)
    assert result.names == tuple(case.name for case in CASES)
    normal, peak, shut, test, surge, empty = result.runs
    plain = run(TABLE, START)
    np.testing.assert_array_equal(normal.F, plain.F)

    Qo = np.array(TABLE.Qo) * 1.5
    np.testing.assert_allclose(peak.F, run(replace(TABLE, Qo=Qo), replace(START, Q=0.09)).F, rtol=1e-12)

    z = np.array(TABLE.z)
    # The pump at node 1 still adds its head against the shut valve.
    np.testing.assert_allclose(shut.p1, 1000 * G * (80 + np.array([0, 0, 25, 25, 25]) - z), rtol=1e-12)
    np.testing.assert_allclose(test.p1, 9e5 + 1000 * G * (5 - z), rtol=1e-12)
    for still in (shut, test, empty):
        assert not still.Q1.any()
        assert not still.Vo.any()
    np.testing.assert_allclose(surge.p1 - plain.p1, 3e5 - 2e5 * plain.s / plain.s[-1], rtol=1e-9)
    np.testing.assert_array_equal(surge.Q1, plain.Q1)
    for name in ("F", "p1", "p2", "drag", "W", "V1"):
        assert not getattr(empty, name).any()
    for one in result.runs:
        assert one.closure.relative < 1e-9


@settings(max_examples=40, deadline=None, derandomize=True)
@given(tables())
def test_closure_of_every_kind(table: RunTable) -> None:
    for one in run_cases(table, START, CASES).runs:
        assert one.closure.relative < 1e-9


def test_governing_case_by_plain_search() -> None:
    result = run_cases(TABLE, START, CASES)
    for name in ("F", "Fh", "Fx", "Fy", "Fz"):
        found = getattr(result, name)
        for j in range(5):
            values = [float(getattr(r, name)[j]) for r in result.runs]
            largest = max(values, key=abs)
            assert found.value[j] == largest
            assert found.case[j] == values.index(largest)
    for j in range(5):
        highest = max(max(r.p1[j], r.p2[j]) for r in result.runs)
        assert result.p.value[j] == highest


def test_governing_keeps_the_sign_and_takes_the_first_of_equals() -> None:
    found = governing(np.array([[1.0, -2.0, 5.0, np.nan], [-3.0, 2.0, 5.0, 1.0]]))
    np.testing.assert_array_equal(found.value, [-3.0, -2.0, 5.0, np.nan])
    np.testing.assert_array_equal(found.case, [1, 0, 0, -1])
    highest = governing(np.array([[1.0, -2.0], [-3.0, -1.0]]), signed=True)
    np.testing.assert_array_equal(highest.value, [1.0, -1.0])


def test_test_pressure_at_a_level() -> None:
    result = run_cases(TABLE, START, [LoadCase("t", "test", p=9e5, zp=12.0)])
    np.testing.assert_allclose(result.runs[0].p1, 9e5 + 1000 * G * (12 - np.array(TABLE.z)), rtol=1e-12)


def test_jet_is_shut_where_nothing_flows() -> None:
    start = replace(START, Q=math.nan, H=90.0, p=math.nan, end="jet")
    flowing, shut, test, surge, drawn = run_cases(
        TABLE,
        start,
        [
            LoadCase("a", "operating"),
            LoadCase("b", "shut"),
            LoadCase("c", "test", p=1e6),
            LoadCase("d", "surge", dp=1e5),
            LoadCase("e", "peak", Q=0.05),
        ],
    ).runs
    assert Fitting.JET in Fitting(int(flowing.fitting[-1]))
    area = math.pi / 4 * 0.2**2
    for still in (shut, test):
        assert Fitting.CAP in Fitting(int(still.fitting[-1]))
        assert still.F[-1] == pytest.approx(still.p1[-1] * area, rel=1e-12)
    assert surge.p2[-1] == 0.0
    assert surge.p1[-1] == pytest.approx(flowing.p1[-1] + 1e5, rel=1e-12)
    assert surge.closure.relative < 1e-9
    assert drawn.Q1[0] == 0.05  # a flow given in a case stands in place of the head
    assert drawn.Q2[-1] == pytest.approx(0.04, rel=1e-12)


@pytest.mark.parametrize("at", ["start", "end"])
@pytest.mark.parametrize("H2", [math.nan, 30.0])
def test_shut_valve_within_the_run(at: str, H2: float) -> None:
    table = replace(TABLE, Hp=0.0)
    case = LoadCase("v", "shut", H=80.0, at=at, valve=3, H2=H2)
    result = run_cases(table, START, [case]).runs[0]
    z = np.array(TABLE.z)
    near = 1000 * G * (80 - z)
    far = np.zeros(5) if math.isnan(H2) else 1000 * G * (H2 - z)
    # Section 1 of the valve's node lies before the valve, section 2 behind it.
    before, behind = (near, far) if at == "start" else (far, near)
    np.testing.assert_allclose(result.p1, [*before[:4], behind[4]], rtol=1e-12)
    np.testing.assert_allclose(result.p2, [*before[:3], *behind[3:]], rtol=1e-12)
    assert result.closure.relative < 1e-9
    if math.isnan(H2):
        assert (
            (result.W > 0)
            == ([True, True, True, False, False] if at == "start" else [False] * 3 + [True, False])
        ).all()
    pressures = near if at == "start" else far
    assert result.po[2] == pytest.approx(pressures[2], rel=1e-12)
    # On its axis the valve carries the difference of the two sides over the bore.
    straight = RunTable(x=[0, 10, 20], y=0.0, z=0.0, D=0.2, e=0.0)
    pushed = run_cases(straight, START, [replace(case, valve=1)]).runs[0]
    difference = 1000 * G * (80 - (0 if math.isnan(H2) else H2)) * math.pi / 4 * 0.04
    assert pushed.Fx[1] == pytest.approx(difference if at == "start" else -difference, rel=1e-12)


def test_case_at_the_other_end_and_other_density() -> None:
    case = LoadCase("x", "operating", Q=0.04, p=2e5, at="end", rho=1025.0)
    result = run_cases(TABLE, START, [case]).runs[0]
    expected = run(TABLE, replace(START, Q=0.04, p=2e5, at="end", rho=1025.0))
    np.testing.assert_array_equal(result.p1, expected.p1)
    assert result.p2[-1] == pytest.approx(2e5, rel=1e-9)


def test_closed_branch_in_every_kind() -> None:
    start = replace(START, Q=math.nan, end="closed")
    result = run_cases(TABLE, start, [replace(c, Q=math.nan) for c in CASES])
    assert result.runs[1].Q1[0] == pytest.approx(0.015)
    assert all(r.closure.relative < 1e-9 for r in result.runs)


@pytest.mark.parametrize(
    ("fields", "expected"),
    [
        ({"kind": "dynamic"}, {"kind[0]"}),
        ({"kind": "surge"}, {"dp[0]"}),
        ({"kind": "test"}, {"p[0]"}),
        ({"kind": "operating", "dp": 1e5}, {"dp[0]"}),
        ({"kind": "shut", "Q": 0.1}, {"Q[0]"}),
        ({"kind": "shut", "offtakes": 1.0}, {"offtakes[0]"}),
        ({"kind": "peak", "p": 1e5, "H": 10.0}, {"H[0]"}),
        ({"kind": "peak", "at": "end"}, {"at[0]"}),
        ({"kind": "peak", "at": "top", "Q": 1.0}, {"at[0]"}),
        ({"kind": "operating", "rho": -1.0, "pump": -1.0}, {"rho[0]", "pump[0]"}),
        ({"kind": "operating", "zp": 3.0}, {"zp[0]"}),
        ({"kind": "test", "p": math.inf}, {"p[0]"}),
        ({"kind": "empty", "H": 3.0}, {"H[0]"}),
        ({"kind": "peak", "valve": 2}, {"valve[0]"}),
        ({"kind": "shut", "valve": 5}, {"valve[0]"}),
        ({"kind": "shut", "H2": 5.0}, {"H2[0]"}),
    ],
)
def test_bad_cases_are_named(fields: dict[str, Any], expected: set[str]) -> None:
    with pytest.raises(OutOfRange) as caught:
        run_cases(TABLE, START, [LoadCase("c", **fields)])
    assert {p.argument for p in caught.value.problems} == expected
    assert caught.value.function == "run_cases"


def test_problems_of_table_start_and_cases_come_together() -> None:
    with pytest.raises(OutOfRange) as caught:
        run_cases(replace(TABLE, D=-1.0), replace(START, rho=0.0), [*CASES, LoadCase("s", "surge")])
    found = {p.argument for p in caught.value.problems}
    assert {"D[0]", "rho", "dp[6]"} <= found


def test_case_without_what_it_needs() -> None:
    start = replace(START, p=math.nan)
    with pytest.raises(OutOfRange, match=r"p\[0\]"):
        run_cases(TABLE, start, [LoadCase("c", "operating"), LoadCase("d", "peak", p=1e5)])
    with pytest.raises(OutOfRange, match="cases"):
        run_cases(TABLE, START, [])
    with pytest.raises(NoSolution, match="case 'low'"):
        run_cases(
            replace(TABLE, Hp=0.0),
            replace(START, Q=math.nan, end="jet"),
            [LoadCase("low", "operating", H=-5.0)],
        )


def test_kinds_are_those_documented() -> None:
    for kind in KINDS:
        assert f'"{kind}"' in (LoadCase.__doc__ or "")
