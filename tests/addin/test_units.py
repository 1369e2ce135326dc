"""Units at the cell boundary: published factors, spellings, traps."""

from __future__ import annotations

import numpy as np
import pytest

from thrustbook.addin.cells import CellError
from thrustbook.addin.dispatch import call
from thrustbook.addin.tables import column_from_si, number, numbers
from thrustbook.addin.units import ROLES, UnitError, convert, named_set, quantity, unit, unit_set
from thrustbook.engine.constants import P_ATM

from ..published import load


@pytest.mark.parametrize("check", load("units"), ids=lambda c: c["topic"])
def test_published_factors(check: dict) -> None:
    value, _ = quantity(f"1 {check['inputs']['unit']}", check["inputs"]["role"])
    assert value == pytest.approx(check["expected"], rel=check["tolerance"])


@pytest.mark.parametrize(
    ("text", "role", "value"),
    [
        ("300 mm", "diameter", 0.3),
        ('12"', "diameter", 0.3048),
        ("12 in", "diameter", 0.3048),
        ("1.5e2 mm", "diameter", 0.15),
        ("-3 ft", "level", -0.9144),
        ("5 m³/s", "flow", 5.0),
        ("3600 m3/h", "flow", 1.0),
        ("60 m3/min", "flow", 1.0),
        ("600 lpm", "flow", 0.01),
        ("3600 l/h", "flow", 0.001),
        ("10 l/s", "flow", 0.01),
        ("10 L/s", "flow", 0.01),
        ("4.5 bar", "pressure", 4.5e5),
        ("4.5 barg", "pressure", 4.5e5),
        ("45 mH2O", "pressure", 45 * 9806.65),
        ("450 kPa(g)", "pressure", 4.5e5),
        ("100 psig", "pressure", 689475.7293168),
        ("90 °", "angle", 1.5707963267948966),
        ("3 N·m", "moment", 3.0),
        ("3 Nm", "moment", 3.0),
        ("2 kip", "force", 8896.443230521),
        ("50 %", "ratio", 0.5),
        ("1 cP", "viscosity", 1e-3),
        ("1 cSt", "kinematic", 1e-6),
        ("1 mm2/s", "kinematic", 1e-6),
        ("20 °C", "temperature", 293.15),
        ("20 degC", "temperature", 293.15),
        ("20C", "temperature", 293.15),
        ("-40 F", "temperature", 233.15),
        ("212 °F", "temperature", 373.15),
        ("212 degF", "temperature", 373.15),
        ("4.5 K", "temperature", 4.5),
    ],
)
def test_spellings_of_engineers(text: str, role: str, value: float) -> None:
    got, shift = quantity(text, role)
    assert got == pytest.approx(value, rel=1e-12)
    assert shift == 0


def test_absolute_pressures_shift_by_the_ambient_pressure() -> None:
    assert quantity("5 bara", "pressure") == (5e5, -1)
    assert quantity("101.325 kPa(a)", "pressure")[1] == -1
    assert quantity("0 psig", "absolute")[1] == 1
    assert quantity("14.7 psia", "absolute")[1] == 0
    assert convert(0.0, "psig", "psia") == pytest.approx(P_ATM / 6894.757293168361)
    assert convert(1.0, "bara", "barg", 90_000.0) == pytest.approx(0.1)


@pytest.mark.parametrize(
    ("value", "source", "target", "expected"),
    [
        # NIST SP 811, appendix B.9: the fixed points of the scales.
        (0.0, "degC", "K", 273.15),
        (20.0, "C", "degF", 68.0),
        (-40.0, "°F", "°C", -40.0),
        (32.0, "F", "degC", 0.0),
        (0.0, "K", "°F", -459.67),
        (98.6, "degF", "C", 37.0),
        (5.0, "degC", "C", 5.0),
    ],
)
def test_temperatures_have_a_zero_of_their_own(
    value: float, source: str, target: str, expected: float
) -> None:
    assert convert(value, source, target) == pytest.approx(expected, rel=1e-14, abs=1e-13)
    assert convert(expected, target, source) == pytest.approx(value, rel=1e-14, abs=1e-13)


def test_a_temperature_keeps_its_zero_in_every_way_through_a_cell() -> None:
    for name, given, back in (("SI", 288.15, "K"), ("metric", 15.0, "degC"), ("US", 59.0, "degF")):
        units = named_set(name)
        assert units.symbol("temperature") == back
        own = units.unit("temperature")
        assert number(given, "T", "temperature", own) == pytest.approx(288.15, rel=1e-15)
        many, errors = numbers([given, f"{given} {back}", None], "T", "temperature", own)
        assert not errors
        assert many[:2].tolist() == pytest.approx([288.15, 288.15], rel=1e-15)
        plain, _ = numbers([given, given], "T", "temperature", own)
        assert plain.tolist() == pytest.approx([288.15, 288.15], rel=1e-15)
        assert column_from_si(288.15, "temperature", units) == pytest.approx(given, rel=1e-14)
        one = call("TB_WATER", ["rho", name, given])
        grid = call("TB_WATER", ["rho", name, [[given], ["15 °C"], ["15 kg"]]])
        assert isinstance(grid, np.ndarray)
        assert grid[0, 0] == pytest.approx(one, rel=1e-14)
        assert grid[1, 0] == pytest.approx(one, rel=1e-14)
        assert isinstance(grid[2, 0], CellError)


@pytest.mark.parametrize(
    ("units", "T", "allowed"),
    [
        ("SI", 15.0, "273.15 and at most 373.12"),
        ("metric", -1.0, "0 and at most 99.97"),
        ("US", 31.0, "32 and at"),
    ],
)
def test_a_temperature_out_of_range_is_told_on_its_own_scale(units: str, T: float, allowed: str) -> None:
    outcome = call("TB_WATER", ["rho", units, T])
    assert isinstance(outcome, CellError)
    assert outcome.kind == "NUM"
    assert f"T = {T:g}" in outcome.message
    assert f"at least {allowed}" in outcome.message


@pytest.mark.parametrize(
    ("text", "role", "says"),
    [
        ("1 mb", "pressure", "mbar"),  # pint alone would read a millibarn
        ("1 ton", "force", "tonf"),
        ("10 lb", "force", "lbf"),  # a mass
        ("10 lbs", "force", "ambiguous"),
        ("3 nm", "moment", "N m"),
        ("3 ft", "pressure", "Pa"),
        ("3 psia", "loss", "datum"),
        ("3 furlong", "length", "not known"),
        ("3", "length", "number with its unit"),
        ("three m", "length", "number with its unit"),
        ("0.21", "ratio", "number with its unit"),  # never 0.2 of a unit "1"
        ("11", "ratio", "number with its unit"),
        ("0,3 m", "length", "number with its unit"),
        ("1.000,5 m", "length", "number with its unit"),
        ("2 deg", "ratio", "not a unit of ratio"),
        ("2 kpa", "pressure", "kPa"),  # case matters, and the nearest is offered
    ],
)
def test_traps_are_refused_with_what_to_write(text: str, role: str, says: str) -> None:
    with pytest.raises(UnitError, match=says):
        quantity(text, role)


def test_every_named_set_has_a_unit_of_the_right_dimension_for_every_role() -> None:
    for name in ("SI", "metric", "us"):
        for role in ROLES:
            assert named_set(name).unit(role).factor > 0


def test_a_range_of_role_and_unit() -> None:
    units = unit_set(
        [["Quantity", "Unit"], ["set", "US"], ["pressure", "kPa(a)"], [None, None], ["angle", "rad"]]
    )
    assert units.symbol("diameter") == "in"
    assert units.unit("pressure") == ("kPa(a)", 1000.0, -1, 0.0)
    assert units.unit("angle").factor == 1.0
    assert unit_set(None).symbol("pressure") == "Pa"
    assert unit_set([["metric"]]).symbol("pressure") == "kPa"


def test_differences_and_absolute_pressures_follow_the_unit_of_pressure() -> None:
    units = unit_set([["pressure", "psig"]])
    assert units.symbol("loss") == units.symbol("absolute") == "psi"
    units = unit_set([["pressure", "kPa(a)"], ["loss", "mbar"]])
    assert units.symbol("loss") == "mbar"
    assert units.symbol("absolute") == "kPa"
    assert units.unit("absolute").shift == 0
    assert unit_set([["set", "metric"], ["pressure", "bar"]]).symbol("loss") == "bar"


@pytest.mark.parametrize(
    ("cell", "says"),
    [
        ("imperial", "not known"),
        ([["presure", "kPa"]], 'did you mean "pressure"'),
        ([["pressure", "mm"]], "not a unit of pressure"),
        ([["pressure", None]], "no unit is given"),
        ([["flow", "L/s"], ["flow", "gpm"]], "given twice"),
        (3.0, "allowed"),
        (True, "allowed"),
    ],
)
def test_bad_unit_sets_name_what_is_wrong(cell: object, says: str) -> None:
    with pytest.raises(UnitError, match=says):
        unit_set(cell)


def test_units_that_measure_different_things_do_not_convert() -> None:
    with pytest.raises(UnitError, match="different things"):
        convert(1.0, "psi", "m")
    with pytest.raises(UnitError, match="different things"):
        convert(1.0, "deg", "%")
    assert unit("kPa", "loss").factor == 1000.0
