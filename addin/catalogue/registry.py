"""The families of functions, assembled into one catalogue."""

from __future__ import annotations

from collections.abc import Mapping
from types import MappingProxyType
from typing import Final

from . import bernoulli, ends, energy, fittings, properties, runs, schedule, sections, tools
from .glossary import GLOSSARY
from .types import Arg, Row

FAMILIES: Final[tuple[tuple[Row, ...], ...]] = (
    sections.ROWS,
    energy.ROWS,
    bernoulli.ROWS,
    fittings.ROWS,
    ends.ROWS,
    schedule.ROWS,
    runs.ROWS,
    properties.ROWS,
    tools.ROWS,
)

CATALOGUE: Final[Mapping[str, Row]] = MappingProxyType(
    {row.name: row for family in FAMILIES for row in family}
)


def wording(arg: Arg) -> str:
    """Give the wording of an argument: its own, or the glossary's."""
    return arg.text or GLOSSARY[arg.name]
