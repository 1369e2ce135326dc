"""Units at the cell boundary: published factors, spellings, traps."""

from __future__ import annotations

import pytest

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
    assert units.unit("pressure") == ("kPa(a)", 1000.0, -1)
    assert units.unit("angle").factor == 1.0
    assert unit_set(None).symbol("pressure") == "Pa"
    assert unit_set([["metric"]]).symbol("pressure") == "kPa"


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
