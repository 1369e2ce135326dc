"""What a pipe run refuses, and how it says so."""

from __future__ import annotations

import math
from dataclasses import replace
from typing import Any

import numpy as np
import pytest

from thrustbook.engine.errors import NotClosed, OutOfRange
from thrustbook.engine.run import run
from thrustbook.engine.runflow import RunStart
from thrustbook.engine.runnotes import FAULTS, Note, note_text
from thrustbook.engine.runshape import RunTable

TABLE = RunTable(x=[0, 50, 90, 120], y=[0, 0, 20, 20], z=0.0, D=0.2, e=1e-4)
START = RunStart(rho=1000.0, mu=1e-3, Q=0.05, p=5e5)


def arguments(table: RunTable, start: RunStart) -> set[str]:
    with pytest.raises(OutOfRange) as caught:
        run(table, start)
    assert caught.value.function == "run"
    return {problem.argument for problem in caught.value.problems}


@pytest.mark.parametrize(
    ("columns", "expected"),
    [
        ({"D": [0.2, 0.0, 0.2, 0.2]}, {"D[1]"}),
        ({"D": [0.2, -0.1, math.nan, math.nan]}, {"D[1]", "D[2]"}),
        ({"x": [0, 50, math.nan, 120]}, {"x[2]"}),
        ({"z": [0, math.inf, 0, 0]}, {"z[1]"}),
        ({"x": [0, 50, 50, 120], "y": [0, 0, 0, 20]}, {"x[2], y[2], z[2]"}),
        ({"e": [1e-4, math.nan, 1e-4, 1e-4]}, {"e[1]"}),
        ({"e": [1e-4, -1e-4, 1e-4, 1e-4]}, {"e[1]"}),
        ({"e": [1e-4, 0.05, 1e-4, 1e-4]}, {"e[1]"}),
        ({"K": [0, 0, -1, 0]}, {"K[2]"}),
        ({"Hp": math.inf}, {"Hp[0]", "Hp[1]", "Hp[2]", "Hp[3]"}),
        ({"Do": [math.nan, -0.1, math.nan, math.nan]}, {"Do[1]"}),
        ({"alpha": 0.5}, {"alpha[0]", "alpha[1]", "alpha[2]", "alpha[3]"}),
        ({"x": [0, 50, 90]}, {"x"}),
        ({"D": [0.2, 0.0, 0.2, 0.2], "K": [0, -1, 0, 0], "z": [0, 0, math.nan, 0]}, {"D[1]", "K[1]", "z[2]"}),
    ],
)
def test_bad_columns_are_named(columns: dict[str, Any], expected: set[str]) -> None:
    assert arguments(replace(TABLE, **columns), START) == expected


@pytest.mark.parametrize(
    ("values", "expected"),
    [
        ({"rho": 0.0}, {"rho"}),
        ({"rho": math.nan}, {"rho"}),
        ({"mu": -1.0}, {"mu"}),
        ({"mu": math.nan}, {"mu"}),
        ({"nu": 1e-6}, {"nu"}),
        ({"H": 10.0}, {"H"}),
        ({"p": math.nan}, {"p"}),
        ({"Q": math.nan}, {"Q"}),
        ({"Q": math.inf}, {"Q"}),
        ({"at": "middle"}, {"at"}),
        ({"flow_at": "middle"}, {"flow_at"}),
        ({"start": "jet"}, {"start"}),
        ({"end": "open"}, {"end"}),
        ({"method": "manning"}, {"method"}),
        ({"pv": -1.0, "pamb": math.nan, "Vmax": 0.0}, {"pv", "pamb", "Vmax"}),
        ({"end": "jet"}, {"p"}),
        ({"end": "jet", "Q": math.nan, "p": math.nan}, {"Q"}),
        ({"end": "jet", "Q": math.nan, "at": "end"}, {"at"}),
        ({"end": "jet", "Q": -0.05, "p": math.nan}, {"Q"}),
    ],
)
def test_bad_start_is_named(values: dict[str, Any], expected: set[str]) -> None:
    assert arguments(TABLE, replace(START, **values)) == expected


def test_all_problems_come_together() -> None:
    found = arguments(replace(TABLE, D=[0.2, -1, 0.2, 0.2]), replace(START, rho=-1.0, end="open"))
    assert found == {"D[1]", "rho", "end"}


def test_fewer_than_two_nodes() -> None:
    assert arguments(RunTable(x=0.0, y=0.0, z=0.0, D=0.2, e=0.0), START) == {"x"}
    assert arguments(RunTable(x=[0.0], y=0.0, z=0.0, D=0.2, e=0.0), START) == {"x"}
    assert arguments(RunTable(x=[], y=[], z=[], D=[], e=0.0), START) == {"x"}


def test_jet_needs_its_diameter() -> None:
    table = replace(TABLE, D=[0.2, 0.2, 0.2, math.nan])
    assert arguments(table, replace(START, p=math.nan, end="jet")) == {"D[3]"}
    # Where the pipe goes on, or is closed, no diameter means the one before.
    assert run(table, START).F[3] == pytest.approx(0.0, abs=1e-9)


def test_pump_at_a_closed_end() -> None:
    table = replace(TABLE, Hp=[0, 0, 0, 10.0])
    assert arguments(table, replace(START, Q=math.nan, end="closed")) == {"Hp[3]"}


def test_flow_into_a_closed_end() -> None:
    with pytest.raises(NotClosed, match=r"closed end leave 0\.05 m3/s") as caught:
        run(TABLE, replace(START, end="closed"))
    assert caught.value.function == "run"
    table = replace(TABLE, Qo=[0, 0.05, 0, 0], oz=1.0, Do=[math.nan, 0.1, math.nan, math.nan])
    assert run(table, replace(START, end="closed")).Q2[1] == 0.0
    with pytest.raises(NotClosed, match="closed start"):
        run(table, replace(START, Q=math.nan, start="closed", end="closed"))


@pytest.mark.parametrize("missing", [{"Do": math.nan}, {"oz": math.nan}, {"oz": 0.0}])
def test_offtake_without_direction_or_diameter_spoils_its_node_only(missing: dict[str, float]) -> None:
    columns: dict[str, Any] = {"Qo": [0, 0.01, 0, 0], "oz": 1.0, "Do": [math.nan, 0.1, math.nan, math.nan]}
    sound = run(replace(TABLE, **columns), START)
    result = run(replace(TABLE, **(columns | missing)), START)
    assert np.flatnonzero(np.isnan(result.F)).tolist() == [1]
    assert math.isnan(result.bearing[1])
    assert math.isnan(result.closure.relative)
    assert result.note[1] & FAULTS == Note.OFFTAKE
    assert "direction and a diameter" in note_text(result.note[1])
    assert {p.argument[:2] for p in result.problems} <= {"Do", "ox"}
    np.testing.assert_array_equal(result.p1, sound.p1)
    np.testing.assert_array_equal(result.F[[0, 2, 3]], sound.F[[0, 2, 3]])


def test_joint_smaller_than_the_bore_spoils_the_nodes_it_touches() -> None:
    result = run(replace(TABLE, Dj=[0.22, 0.19, 0.22, 0.22]), START)
    assert np.flatnonzero(np.isnan(result.F)).tolist() == [1, 2]
    assert [p.argument for p in result.problems] == ["Dj[1]"]
    assert note_text(result.note[1]).startswith("thrust not found: joint")
    assert np.isfinite(result.p1).all()


def test_error_text_names_value_and_range() -> None:
    with pytest.raises(OutOfRange, match=r"run: D\[1\] = 0 \(allowed: above 0\)"):
        run(replace(TABLE, D=[0.2, 0.0, 0.2, 0.2]), START)


def test_kinematic_viscosity_and_given_factor() -> None:
    by_mu = run(TABLE, START)
    by_nu = run(TABLE, replace(START, mu=math.nan, nu=1e-6))
    np.testing.assert_allclose(by_nu.p1, by_mu.p1, rtol=1e-12)
    given = run(replace(TABLE, f=0.02, e=math.nan), replace(START, mu=math.nan))
    assert given.hf[0] == pytest.approx(0.02 * 50 / 0.2 * given.V2[0] ** 2 / (2 * 9.80665), rel=1e-12)
    # Without flow no viscosity is needed.
    assert run(TABLE, replace(START, mu=math.nan, Q=0.0)).p1[3] == 5e5
