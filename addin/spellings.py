"""The units that are accepted, spelling by spelling, as engineers write them.

A spelling that means two things ("ton", "mb") is listed apart, with what to write.
"""

from __future__ import annotations

import re
from collections.abc import Mapping
from typing import Final, Literal

Datum = Literal["", "gauge", "absolute"]

# Spelling -> (expression that pint reads, datum of a pressure). Case matters.
SPELLINGS: Final[dict[str, tuple[str, Datum]]] = {}


def _spell(expression: str, *spellings: str, datum: Datum = "") -> None:
    for spelling in spellings:
        SPELLINGS[squeeze(spelling)] = (expression, datum)


def squeeze(text: str) -> str:
    """Fold what does not change the meaning: blanks, dots and superscripts."""
    folded = (
        text.strip().replace("²", "2").replace("³", "3").replace("^", "").replace("µ", "u").replace("μ", "u")
    )
    return re.sub(r"[\s·⋅*]+", " ", folded)


_spell("meter", "m")
_spell("millimeter", "mm")
_spell("centimeter", "cm")
_spell("kilometer", "km")
_spell("micrometer", "um", "micron")
_spell("inch", "in", '"', "in.")
_spell("foot", "ft", "'", "ft.")
_spell("meter**2", "m2")
_spell("millimeter**2", "mm2")
_spell("centimeter**2", "cm2")
_spell("inch**2", "in2", "sq in")
_spell("foot**2", "ft2", "sq ft")
_spell("meter**3", "m3")
_spell("liter", "L", "l")
_spell("foot**3", "ft3", "cu ft")
_spell("gallon", "US gal")
_spell("imperial_gallon", "UK gal")
_spell("meter/second", "m/s")
_spell("foot/second", "ft/s", "fps")
_spell("kilometer/hour", "km/h")
_spell("meter**3/second", "m3/s", "cumec")
_spell("meter**3/hour", "m3/h", "m3/hr")
_spell("meter**3/minute", "m3/min")
_spell("meter**3/day", "m3/d", "m3/day")
_spell("liter/second", "L/s", "l/s", "lps")
_spell("liter/minute", "L/min", "l/min", "lpm")
_spell("liter/hour", "L/h", "l/h")
_spell("megaliter/day", "ML/d", "Ml/d", "MLD")
_spell("gallon/minute", "gpm", "US gpm", "usgpm")
_spell("imperial_gallon/minute", "UK gpm", "igpm")
_spell("1e6*gallon/day", "mgd", "MGD", "US mgd")
_spell("foot**3/second", "cfs", "ft3/s")
_spell("foot**3/minute", "cfm", "ft3/min")
_spell("meter**3/second**2", "m3/s2")
_spell("liter/second**2", "L/s2", "l/s2")
_spell("gallon/minute/second", "gpm/s")
_spell("foot**3/second**2", "cfs/s", "ft3/s2")
_spell("kilogram/second", "kg/s")
_spell("kilogram/hour", "kg/h")
_spell("tonne/hour", "t/h")
_spell("pound/second", "lb/s", "lbm/s")
_spell("pound/hour", "lb/h", "lbm/h")
_spell("slug/second", "slug/s")
_spell("kilogram/meter**3", "kg/m3")
_spell("gram/centimeter**3", "g/cm3", "kg/L", "kg/l", "t/m3")
_spell("pound/foot**3", "lb/ft3", "lbm/ft3", "pcf")
_spell("slug/foot**3", "slug/ft3")
_spell("pascal*second", "Pa s", "Pas", "kg/(m s)")
_spell("millipascal*second", "mPa s", "mPas")
_spell("centipoise", "cP")
_spell("pound_force*second/foot**2", "lbf s/ft2")
_spell("meter**2/second", "m2/s")
_spell("millimeter**2/second", "mm2/s", "cSt")
_spell("foot**2/second", "ft2/s")
_spell("kelvin", "K")
_spell("delta_degree_Celsius", "degC", "°C", "C", "deg C")
_spell("delta_degree_Fahrenheit", "degF", "°F", "F", "deg F")
for _unit, _names in (
    ("pascal", ("Pa",)),
    ("hectopascal", ("hPa",)),
    ("kilopascal", ("kPa",)),
    ("megapascal", ("MPa",)),
    ("bar", ("bar",)),
    ("millibar", ("mbar",)),
    ("pound_force/inch**2", ("psi", "lbf/in2")),
    ("pound_force/foot**2", ("psf", "lbf/ft2")),
    # Conventional columns: NIST SP 811 appendix B.8, water at 1000 kg/m3 and standard gravity.
    ("9806.65*pascal", ("mH2O", "mwc", "mWC")),
    ("9.80665*pascal", ("mmH2O",)),
    ("2989.067*pascal", ("ftH2O", "ftwc")),
    ("3386.389*pascal", ("inHg",)),
    ("133.322387415*pascal", ("mmHg",)),
    ("101325*pascal", ("atm",)),
    ("kilogram_force/centimeter**2", ("kgf/cm2",)),
    ("newton/millimeter**2", ("N/mm2",)),
):
    _spell(_unit, *_names)
    for _name in _names:
        _spell(_unit, f"{_name}(g)", f"{_name} g", f"{_name} gauge", datum="gauge")
        _spell(_unit, f"{_name}(a)", f"{_name} a", f"{_name} abs", datum="absolute")
_spell("pound_force/inch**2", "psig", datum="gauge")
_spell("pound_force/inch**2", "psia", datum="absolute")
_spell("bar", "barg", datum="gauge")
_spell("bar", "bara", datum="absolute")
_spell("kilopascal", "kPag", datum="gauge")
_spell("kilopascal", "kPaa", datum="absolute")
_spell("newton", "N")
_spell("kilonewton", "kN")
_spell("meganewton", "MN")
_spell("kilogram_force", "kgf")
_spell("pound_force", "lbf")
_spell("1000*pound_force", "kip", "kips")
_spell("2000*pound_force", "tonf")
_spell("newton*meter", "N m", "Nm")
_spell("kilonewton*meter", "kN m", "kNm")
_spell("pound_force*foot", "lbf ft", "ft lbf", "lbf-ft", "ft-lbf")
_spell("1000*pound_force*foot", "kip ft", "kip-ft")
_spell("watt", "W")
_spell("kilowatt", "kW")
_spell("megawatt", "MW")
# NIST SP 811 appendix B.8: horsepower of 550 ft lbf/s.
_spell("550*foot*pound_force/second", "hp")
_spell("degree", "deg", "°", "degrees")
_spell("radian", "rad")
_spell("grade", "gon")
_spell("dimensionless", "-", "1", "")
_spell("1e-2", "%")

AMBIGUOUS: Final[Mapping[str, str]] = {
    "mb": "write mbar for millibar",
    "mB": "write mbar for millibar",
    "ton": "write tonf for the US short ton-force, kN, or kgf",
    "tons": "write tonf for the US short ton-force, kN, or kgf",
    "nm": "write N m for newton metre",
    "gal": "write US gal or UK gal",
    "lbs": "write lbf for force or lb for mass",
    "#": "write lbf for force or lb for mass",
    "psi(d)": "write psi",
}
MASS_FOR_FORCE: Final = ("lb", "lbm", "kg", "t", "slug")
_spell("pound", "lb", "lbm")
_spell("kilogram", "kg")
_spell("tonne", "t")
_spell("slug", "slug")
