"""Sections and energy as worksheet functions: units, omitted arguments, refusals, warnings."""

from __future__ import annotations

import math

import pytest

from thrustbook.addin import dispatch
from thrustbook.addin.cells import Cell, CellError


def number(name: str, *args: Cell) -> float:
    value = dispatch.call(name, args)
    assert isinstance(value, float), value
    return value


def refused(name: str, *args: Cell) -> CellError:
    value = dispatch.call(name, args)
    assert isinstance(value, CellError), value
    return value


def test_flow_area_and_velocity_in_three_unit_sets() -> None:
    assert number("TB_AREA", None, 0.3) == pytest.approx(math.pi / 4 * 0.09)
    assert number("TB_VELOCITY", "metric", 100.0, 300.0) == pytest.approx(0.1 / (math.pi / 4 * 0.09))
    # 1000 US gpm in a 12 in pipe: 2.8366 ft/s.
    feet = 1000.0 * 6.30901964e-5 / (math.pi / 4 * 0.3048**2) / 0.3048
    assert number("TB_VELOCITY", "US", 1000.0, 12.0) == pytest.approx(feet, rel=1e-8)
    assert number("TB_FLOW", "metric", 1.5, "0.3 m") == pytest.approx(1500.0 * math.pi / 4 * 0.09)


def test_junction_takes_a_range_of_any_shape() -> None:
    assert number("TB_BRANCHFLOW", "metric", [[300.0], [-180.0]]) == pytest.approx(-120.0)
    assert number("TB_BRANCHFLOW", "metric", [[300.0, None, "-0.18 m3/s"]]) == pytest.approx(-120.0)
    assert number("TB_BRANCHFLOW", "metric", 7.0) == pytest.approx(-7.0)
    text = CellError("REF")
    grid = dispatch.call("TB_BRANCHFLOW", ["metric", [[1.0, 2.0], [None, None], [3.0, "much"], [4.0, text]]])
    assert grid[0, 0] == pytest.approx(-3.0)  # type: ignore[index]
    assert grid[1, 0] == ""  # type: ignore[index]
    assert [str(grid[i, 0]) for i in (2, 3)] == ["#VALUE!", "#REF!"]  # type: ignore[index]


@pytest.mark.parametrize("flows", [None, [[None], [None]], [[1.0, True]], [["many"]]])
def test_junction_refuses_what_is_no_flow(flows: Cell) -> None:
    assert refused("TB_BRANCHFLOW", "metric", flows).kind == "VALUE"


def test_friction_takes_its_roughness_either_way() -> None:
    direct = number("TB_FRICTION", "f", "metric", 1e5, 1e-3)
    assert direct == pytest.approx(0.0221745359, rel=5e-9)
    assert number("TB_FRICTION", "f", "metric", 1e5, None, None, 0.3, 300.0) == pytest.approx(
        direct, rel=1e-13
    )
    other = number("TB_FRICTION", "f", "metric", 1e5, 1e-3, "Haaland")
    assert other != direct
    assert other == pytest.approx(direct, rel=0.02)
    assert "colebrook, swamee-jain, haaland" in refused("TB_FRICTION", "f", None, 1e5, 1e-3, "moody").message
    assert refused("TB_FRICTION", "f", None, 1e5).kind == "NUM"


def test_pipe_loss_in_units_and_at_rest() -> None:
    metric = number("TB_PIPELOSS", "dp", "metric", 998.0, 1.0, 300.0, 100.0, 0.1, 100.0)
    assert number("TB_PIPELOSS", "dp", None, 998.0, 1e-3, 0.3, 100.0, 1e-4, 0.1) == pytest.approx(
        1e3 * metric
    )
    assert number("TB_PIPELOSS", "dp", "metric", 998.0, 1.0, 300.0, 100.0, 0.1, -100.0) == -metric
    assert number("TB_PIPELOSS", "dp", "metric", 998.0, 1.0, 300.0, 100.0, 0.1, 0.0) == 0.0


def test_coefficient_of_a_step_needs_no_flow_but_its_loss_does() -> None:
    assert number("TB_EXPANSION", "K1", "metric", 100.0, 200.0) == pytest.approx(0.5625)
    error = refused("TB_EXPANSION", "dp", "metric", 100.0, 200.0)
    assert error.kind == "NUM"
    assert "dp" in error.message
    every = dispatch.call("TB_EXPANSION", ["all", "metric", 100.0, 200.0])
    assert every[0, 0] == pytest.approx(0.5625)  # type: ignore[index]
    assert [str(every[0, j]) for j in (2, 3)] == ["#NUM!", "#NUM!"]  # type: ignore[index]
    column = dispatch.call("TB_CONTRACTION", ["hL", "metric", 200.0, 100.0, [[10.0], [None], [-1.0]]])
    assert isinstance(column[0, 0], float)  # type: ignore[index]
    assert [str(column[i, 0]) for i in (1, 2)] == ["#NUM!", "#NUM!"]  # type: ignore[index]


def test_discharge_takes_exactly_one_of_pressure_and_flow() -> None:
    Q = number("TB_DISCHARGE", "Q", "metric", 998.0, 100.0, 50.0, 300.0)
    assert number("TB_DISCHARGE", "p1", "metric", 998.0, 100.0, 50.0, None, Q) == pytest.approx(300.0)
    for args in ((), (300.0, 10.0)):
        error = refused("TB_DISCHARGE", "Q", "metric", 998.0, 100.0, 50.0, *args)
        assert error.message == "give exactly one of p1 and Q"
    absolute = number("TB_DISCHARGE", "Q", "metric", 998.0, 100.0, 50.0, "401.325 kPa(a)")
    assert absolute == pytest.approx(Q, rel=1e-12)


def test_an_omitted_argument_is_its_default_and_not_zero() -> None:
    """alpha2 omitted between commas must stay 1, Cd must stay 1."""
    full = number(
        "TB_PRESSURE", "p2", "metric", 998.0, 300.0, 200.0, 400.0, 100.0, 0.0, 0.0, 0.0, 0.0, 1.0, 1.0
    )
    short = number(
        "TB_PRESSURE", "p2", "metric", 998.0, 300.0, 200.0, 400.0, 100.0, None, None, None, None, None
    )
    assert short == full
    assert number("TB_DISCHARGE", "Q", "metric", 998.0, 100.0, 50.0, 300.0, None, 0.0, 0.0, None) == number(
        "TB_DISCHARGE", "Q", "metric", 998.0, 100.0, 50.0, 300.0
    )


def test_boiling_is_warned_of_and_not_refused() -> None:
    args: list[Cell] = ["margin", "metric", -100.0, 2.339]
    assert number("TB_CAVITATION", *args) == pytest.approx(-1.014)
    assert "boils" in dispatch.why("TB_CAVITATION", args)
    assert dispatch.why("TB_CAVITATION", ["margin", "metric", -60.0, 2.339]) == "ok"


@pytest.mark.parametrize(
    ("name", "args", "words"),
    [
        ("TB_FRICTION", ["f", None, 3000.0, 1e-3], "between 2300 and 4000"),
        ("TB_FRICTION", ["f", None, 1e5, 0.06], "above 0.05"),
        ("TB_PIPELOSS", ["hL", "metric", 998.0, 1.0, 300.0, 100.0, 0.1, 500.0], "above 3 m/s"),
        ("TB_PROFILE", ["alpha", None, None, None, 0.09], "outside 5 to 12"),
        ("TB_PRESSURE", ["p2", "metric", 998.0, 300.0, 300.0, 0.0, 50.0, 12.0], "below -98 kPa"),
    ],
)
def test_warnings(name: str, args: list[Cell], words: str) -> None:
    assert isinstance(dispatch.call(name, args), float)
    assert words in dispatch.why(name, args)


def test_negative_diameter_and_every_bad_argument_are_named() -> None:
    error = refused("TB_PIPELOSS", "dp", "metric", -998.0, 1.0, -300.0, 100.0, 0.1, 100.0)
    assert error.kind == "NUM"
    assert "rho = -998" in error.message
    assert "D = -300 mm (allowed: above 0)" in error.message


@pytest.mark.parametrize(
    ("name", "args"),
    [
        ("TB_HEAD", ["H", "SI", 998.0, 4e5, 1.5, 12.0, 0.9]),
        ("TB_PRESSURE", ["p2", "SI", 998.0, 0.3, 0.2, 4e5, 0.1, None, None, None, None, 0.9]),
        ("TB_DISCHARGE", ["Q", "SI", 998.0, 0.3, 0.2, 4e5, None, None, None, None, None, 0.9]),
    ],
)
def test_a_kinetic_energy_correction_is_at_least_one(name: str, args: list[Cell]) -> None:
    """The mean of the cube of a velocity is never below the cube of its mean."""
    assert refused(name, *args).kind == "NUM"
    assert "at least 1" in dispatch.why(name, args)
