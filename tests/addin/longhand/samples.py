"""Random valid calls of every element function, as an engineer might enter them."""

from __future__ import annotations

import random
from collections.abc import Iterator

from thrustbook.addin.catalogue.types import Arg, Row
from thrustbook.addin.cells import Cell, CellError
from thrustbook.addin.dispatch import call
from thrustbook.addin.units import named_set

# Usual sizes in SI: low, high, and whether to draw on a logarithmic scale.
_USUAL: dict[str, tuple[float, float, bool]] = {
    "diameter": (0.02, 3.0, True),
    "length": (0.5, 5000.0, True),
    "level": (-50.0, 50.0, False),
    "head": (-30.0, 80.0, False),
    "roughness": (1e-6, 1e-3, True),
    "area": (1e-3, 5.0, True),
    "velocity": (-8.0, 8.0, False),
    "flow": (-2.0, 2.0, False),
    "flowrate": (-0.5, 0.5, False),
    "massflow": (0.1, 500.0, True),
    "density": (600.0, 1300.0, False),
    "viscosity": (2e-4, 0.5, True),
    "pressure": (-5e4, 2e6, False),
    "loss": (0.0, 2e5, False),
    "absolute": (6e4, 1.1e5, False),
    "temperature": (273.2, 373.1, False),
    "force": (0.0, 1e5, False),
    "angle": (0.0, 3.14159, False),
    "ratio": (0.0, 5.0, False),
    "power": (1e3, 1e6, True),
}
_OF_NAME: dict[str, tuple[float, float, bool]] = {
    "Re": (50.0, 1e8, True),
    "eD": (0.0, 0.05, False),
    "f": (0.008, 0.09, False),
    "n": (4.0, 12.0, False),
    "pv": (500.0, 2e4, True),
}
_SETS = ("SI", "metric", "US")


def sample(row: Row, random_: random.Random) -> list[Cell]:
    """Draw arguments (after result and units) in SI until the engine takes them; the units are "SI"."""
    for _ in range(3000):
        cells = [_draw(row, arg, random_) for arg in row.args]
        outcome = call(row.name, [*_leading(row, "SI"), *cells])
        if not isinstance(outcome, CellError):
            return cells
    raise AssertionError(f"no valid call of {row.name} was found")


def _leading(row: Row, units: str) -> list[Cell]:
    return ["all", units] if row.has_result else [units]


def _draw(row: Row, arg: Arg, random_: random.Random) -> Cell:
    required = row.required(arg)
    if not required and random_.random() < 0.5:
        return None
    if arg.role == "choice":
        return random_.choice([*arg.choices, arg.choices[0].upper()])
    low, high, logarithmic = _OF_NAME.get(arg.name) or _USUAL[arg.role]
    bound = row.bound(arg)
    if bound is not None:
        low, high = max(low, bound.low), min(high, bound.high)
    if arg.role == "flow" and required and random_.random() < 0.05 and low <= 0:
        return 0.0
    value = low * (high / low) ** random_.random() if logarithmic else random_.uniform(low, high)
    if arg.role == "angle":
        value *= 180 / 3.141592653589793
    return value


def in_units(row: Row, cells: list[Cell], name: str) -> list[Cell]:
    """The same call with its numbers in another unit set."""
    units, si = named_set(name), named_set("SI")
    out = []
    for arg, cell in zip(row.args, cells, strict=True):
        if isinstance(cell, float):
            given, own = si.unit(arg.role), units.unit(arg.role)
            cell = (cell * given.factor + given.offset - own.offset) / own.factor
        out.append(cell)
    return out


def samples(row: Row, count: int) -> Iterator[tuple[str, list[Cell]]]:
    """Valid calls: the unit set and the arguments."""
    random_ = random.Random(row.name)
    for i in range(count):
        units = _SETS[i % 3]
        yield units, in_units(row, sample(row, random_), units)
