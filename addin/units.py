"""Units at the cell boundary.

Every argument and result of a worksheet function has a *role* (diameter,
pressure, flow, ...). A *unit set* gives each role a unit. A number crosses the
boundary by one multiplication (and, for an absolute pressure, one addition)
whose factor pint worked out once; pint never runs for a cell.

Units are accepted from an explicit list of spellings, see ``spellings.py``.
"""

from __future__ import annotations

import difflib
import functools
import re
from collections.abc import Mapping
from fractions import Fraction
from typing import Any, Final, NamedTuple

from thrustbook.engine.constants import P_ATM

from .cells import Scalar
from .spellings import AMBIGUOUS, MASS_FOR_FORCE, SPELLINGS, Datum, squeeze


class UnitError(ValueError):
    """A unit that is not known, ambiguous, or of the wrong dimension."""


class Role(NamedTuple):
    """A kind of quantity and its unit in each named set."""

    text: str
    si: str
    metric: str
    us: str
    datum: Datum = ""


ROLES: Final[Mapping[str, Role]] = {
    "diameter": Role("diameter of a section", "m", "mm", "in"),
    "length": Role("length along the pipe", "m", "m", "ft"),
    "level": Role("coordinate, level or lift", "m", "m", "ft"),
    "head": Role("head of the fluid", "m", "m", "ft"),
    "roughness": Role("roughness of the wall", "m", "mm", "in"),
    "area": Role("area", "m2", "m2", "ft2"),
    "volume": Role("volume", "m3", "m3", "ft3"),
    "velocity": Role("velocity", "m/s", "m/s", "ft/s"),
    "flow": Role("volume flow", "m3/s", "L/s", "gpm"),
    "flowrate": Role("rate of change of flow", "m3/s2", "L/s2", "gpm/s"),
    "massflow": Role("mass flow", "kg/s", "kg/s", "lb/s"),
    "density": Role("density", "kg/m3", "kg/m3", "lb/ft3"),
    "viscosity": Role("dynamic viscosity", "Pa s", "mPa s", "cP"),
    "kinematic": Role("kinematic viscosity", "m2/s", "mm2/s", "ft2/s"),
    "temperature": Role("temperature", "K", "degC", "degF"),
    "pressure": Role("gauge pressure", "Pa", "kPa", "psi", "gauge"),
    "loss": Role("pressure difference", "Pa", "kPa", "psi"),
    "absolute": Role("absolute pressure", "Pa", "kPa", "psi", "absolute"),
    "force": Role("force", "N", "kN", "lbf"),
    "moment": Role("moment of a force", "N m", "kN m", "lbf ft"),
    "power": Role("power", "W", "kW", "hp"),
    "angle": Role("angle", "deg", "deg", "deg"),
    "ratio": Role("plain number", "-", "-", "-"),
}

SETS: Final = {"si": "SI", "metric": "metric", "us": "US"}
"""Named unit set, its column in ``Role`` -> how it is written."""

_ZERO: Final[Mapping[str, Fraction]] = {
    # NIST SP 811 appendix B.8: the zero of each scale in kelvin. Exact, so that 20 degC is 68 degF.
    "delta_degree_Celsius": Fraction("273.15"),
    "delta_degree_Fahrenheit": Fraction("459.67") * 5 / 9,
}


class Unit(NamedTuple):
    """How a number in a unit becomes the engine's SI number: ``x * factor + offset`` (+ datum shift)."""

    symbol: str
    factor: float
    shift: int
    """-1: ambient pressure is taken off on the way in; +1: put on."""
    offset: float = 0.0
    """Of a temperature: the zero of its scale in kelvin."""


@functools.cache
def _registry() -> Any:
    import pint  # heavy, and needed only once a first unit is converted

    return pint.UnitRegistry(cache_folder=None)


@functools.cache
def _pint_unit(expression: str) -> Any:
    return _registry()(expression)


def _dimensions(expression: str) -> Any:
    quantity = _pint_unit(expression)
    return getattr(quantity, "dimensionality", _registry().dimensionless.dimensionality)


def _si_factor(expression: str) -> float:
    quantity = _pint_unit(expression)
    factor = float(quantity.to_base_units().magnitude if hasattr(quantity, "to_base_units") else quantity)
    # pint multiplies prefixes in floating point: a litre comes out as 0.0010000000000000002 m3.
    clean = float(f"{factor:.12g}")
    return clean if abs(clean - factor) <= 4e-16 * factor else factor


@functools.cache
def unit(text: str, role: str) -> Unit:
    """Look up a unit for a role.

    Raises
    ------
    UnitError
        Unknown or ambiguous spelling, or wrong dimension; the message says what was expected.
    """
    wanted = ROLES[role]
    key = squeeze(text)
    if key in AMBIGUOUS:
        raise UnitError(f'unit "{text}" is ambiguous: {AMBIGUOUS[key]}')
    if key not in SPELLINGS:
        near = difflib.get_close_matches(key, SPELLINGS, n=3, cutoff=0.6)
        hint = f"; did you mean {', '.join(near)}?" if near else ""
        raise UnitError(
            f'unit "{text}" is not known; expected a unit of {role}, such as {examples(role)}{hint}'
        )
    expression, datum = SPELLINGS[key]
    if _dimensions(expression) != _dimensions(SPELLINGS[squeeze(wanted.si)][0]) or (
        (wanted.si == "-") != (expression in ("dimensionless", "1e-2"))
    ):
        hint = "; that is a mass, write lbf, kgf or kN" if key in MASS_FOR_FORCE and role == "force" else ""
        raise UnitError(f'unit "{text}" is not a unit of {role}; expected one such as {examples(role)}{hint}')
    if datum and not wanted.datum:
        raise UnitError(f'unit "{text}" is for a pressure against a datum; {wanted.text} takes {wanted.si}')
    shift = 0 if not datum or datum == wanted.datum else (-1 if datum == "absolute" else 1)
    return Unit(text.strip() or "-", _si_factor(expression), shift, float(_ZERO.get(expression, 0)))


@functools.cache
def _free(text: str) -> tuple[str, float, Datum]:
    """Look up a unit for no role in particular: expression, factor, datum."""
    key = squeeze(text)
    if key in AMBIGUOUS:
        raise UnitError(f'unit "{text}" is ambiguous: {AMBIGUOUS[key]}')
    if key not in SPELLINGS:
        near = difflib.get_close_matches(key, SPELLINGS, n=3, cutoff=0.6)
        raise UnitError(
            f'unit "{text}" is not known' + (f"; did you mean {', '.join(near)}?" if near else "")
        )
    expression, datum = SPELLINGS[key]
    return expression, _si_factor(expression), datum


def convert(value: float, source: str, target: str, ambient: float = P_ATM) -> float:
    """Convert a number between two units; between gauge and absolute by the ambient pressure [Pa].

    Raises
    ------
    UnitError
        Unknown or ambiguous units, or units of different dimensions.
    """
    (a, factor_a, datum_a), (b, factor_b, datum_b) = _free(source), _free(target)
    angle = {"degree", "radian", "grade"}
    if _dimensions(a) != _dimensions(b) or (a in angle) != (b in angle):
        raise UnitError(f'unit "{source}" cannot be converted to "{target}": they measure different things')
    shift = 0.0
    if datum_a and datum_b and datum_a != datum_b:
        shift = ambient if datum_b == "absolute" else -ambient
    shift += float(_ZERO.get(a, 0) - _ZERO.get(b, 0))
    return (value * factor_a + shift) / factor_b


@functools.cache
def known_units(role: str) -> tuple[str, ...]:
    """List every spelling of a unit that a role takes."""
    found = []
    for spelling in SPELLINGS:
        try:
            unit(spelling, role)
        except UnitError:
            continue
        found.append(spelling)
    return tuple(found)


def examples(role: str) -> str:
    """Name a few units of a role for an error message."""
    known = ROLES[role]
    return ", ".join(dict.fromkeys((known.si, known.metric, known.us)))


# A unit starts with no digit, point or comma: "0.25" must not read as 0.2 of the unit "5".
_QUANTITY = re.compile(r"\s*([-+]?(?:\d+\.?\d*|\.\d+)(?:[eE][-+]?\d+)?)\s*([^\s\d.,].*?)\s*$")


def quantity(text: str, role: str) -> tuple[float, int]:
    """Read text such as "300 mm" for a role: SI value and datum shift.

    Raises
    ------
    UnitError
        Text that is not a number with its unit.
    """
    match = _QUANTITY.match(text)
    if not match:
        raise UnitError(
            f'"{text}" is not a number with its unit, such as "1.5 {examples(role).split(", ")[-1]}"'
        )
    found = unit(match[2], role)
    return float(match[1]) * found.factor + found.offset, found.shift


class UnitSet:
    """A unit for every role."""

    def __init__(self, name: str, base: str, changed: Mapping[str, str] | None = None) -> None:
        self.name = name
        self._symbols: dict[str, str] = {role: getattr(row, base) for role, row in ROLES.items()}
        self._symbols.update(changed or {})

    def unit(self, role: str) -> Unit:
        """Give the unit of a role in this set."""
        return unit(self._symbols[role], role)

    def symbol(self, role: str) -> str:
        """Give the unit of a role as it is written in a heading."""
        return self._symbols[role]


@functools.cache
def named_set(name: str) -> UnitSet:
    """Give one of the named sets; the name's case does not matter."""
    key = name.strip().lower()
    if key not in SETS:
        raise UnitError(f'unit set "{name}" is not known; expected SI, metric, US or a range of role | unit')
    return UnitSet(SETS[key], key)


@functools.lru_cache(maxsize=256)
def _ranged_set(rows: tuple[tuple[Scalar, ...], ...]) -> UnitSet:
    base = "si"
    changed: dict[str, str] = {}
    for row in rows:
        role, symbol = row[0], row[1] if len(row) > 1 else None
        if role in (None, ""):
            continue
        key = str(role).strip().lower()
        if key in ("role", "quantity", "units"):
            continue
        if not isinstance(symbol, str) or not symbol.strip():
            raise UnitError(f'units: no unit is given for "{role}"')
        if key in ("set", "base"):
            base = named_set(symbol).name.lower()
            continue
        if key not in ROLES:
            near = difflib.get_close_matches(key, ROLES, n=1, cutoff=0.6)
            hint = f'; did you mean "{near[0]}"?' if near else ""
            raise UnitError(f'units: role "{role}" is not known (allowed: {", ".join(ROLES)}){hint}')
        unit(symbol, key)
        if changed.setdefault(key, symbol.strip()) != symbol.strip():
            raise UnitError(f'units: role "{role}" is given twice')
    if "pressure" in changed:
        # Who states pressures in bar means differences and absolute pressures in bar too.
        for role in ("loss", "absolute"):
            changed.setdefault(role, _without_datum(changed["pressure"]))
    return UnitSet("range", base, changed)


def _without_datum(symbol: str) -> str:
    """Give the unit of a pressure without gauge or absolute: psig and psia are both psi."""
    expression, datum = SPELLINGS[squeeze(symbol)]
    return symbol if not datum else next(s for s, known in SPELLINGS.items() if known == (expression, ""))


def unit_set(cell: Any) -> UnitSet:
    """Read the ``units`` argument: empty, a set's name, or a range of role | unit.

    Raises
    ------
    UnitError
        With the role and unit that are wrong.
    """
    if cell is None or cell == "":
        return named_set("SI")
    if isinstance(cell, str):
        return named_set(cell)
    if isinstance(cell, list):
        if len(cell) == 1 and len(cell[0]) == 1:
            return unit_set(cell[0][0])
        return _ranged_set(tuple(map(tuple, cell)))
    raise UnitError(f"units = {cell!r} (allowed: SI, metric, US or a range of role | unit)")
