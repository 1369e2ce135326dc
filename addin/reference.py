"""The reference page, written from the catalogue: ``python -m thrustbook.addin.reference``."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

from . import describe
from .catalogue.registry import CATALOGUE
from .catalogue.types import Longhand, Row
from .commands.functions import example_value
from .units import ROLES

PAGE = Path(__file__).with_name("REFERENCE.md")

_INTRODUCTION = """\
# Worksheet functions

This page is generated from the catalogue by `python -m thrustbook.addin.reference`; do not edit it.

The order of arguments is the same everywhere: the wanted result (where there are several), the
units, the required quantities, the optional ones. An argument left empty, or omitted between two
commas, has its default. A dimensional argument may also be text with its unit, such as `"300 mm"`.
The result `"all"` gives every result in a row, `"labels"` and `"units"` the headings for them. An
element function takes ranges too and then answers element by element.

A failed result is a true error value: `#VALUE!` for an argument that is missing, is not a number or
has a wrong unit, `#NUM!` for one out of range or a case with no solution; an error in an argument is
passed on. `TB_WHY` tells the reason. *Thrust* is the force of the fluid on the fitting (ambient
pressure outside); *reaction* is what the restraint must supply, the exact opposite.

Results are hydraulic forces from a stated idealisation. Local codes and licensed practice govern.
"""


def write(text: str) -> str:
    """Make text safe for a table cell."""
    return text.replace("|", "\\|")


def table(headings: Sequence[str], rows: Sequence[Sequence[str]]) -> list[str]:
    """Write a table."""
    lines = ["| " + " | ".join(headings) + " |", "| " + " | ".join("---" for _ in headings) + " |"]
    return lines + ["| " + " | ".join(write(c) for c in row) + " |" for row in rows] + [""]


def section(row: Row) -> list[str]:
    """Write one function."""
    out = [f"### {row.name}", "", row.summary, "", f"`={row.signature()}`", ""]
    rows = [describe.argument(row, arg) for arg in row.args]
    out += table(
        ("argument", "meaning", "unit: SI, metric, US", "allowed (SI; angles deg)", "when empty"),
        [(a.name, a.text, a.unit, a.allowed, a.empty.removeprefix("empty: ")) for a in rows],
    )
    for arg in row.args:
        if arg.columns:
            out += [f"Columns of `{arg.name}`:", ""]
            out += table(
                ("column", "meaning", "unit: SI, metric, US", ""),
                [
                    (c.name, c.text, describe.unit_names(c.role), "required" if c.required else c.empty)
                    for c in arg.columns
                ],
            )
    if row.has_units:
        out += table(
            ("result", "meaning", "unit: SI, metric, US"),
            [(r.name, r.text, describe.unit_names(r.role)) for r in row.results],
        )
    out += [f"- Sign convention: {row.sign}", f"- Source: {row.reference}", f"- Since: {row.since}"]
    out += [f"- Caution: {c.text}" for c in row.cautions]
    out += [f"- Long-hand working: {describe.longhand_note(row)}"]
    out += [f"- Example: `={row.example}` gives {write(_example(row))}", ""]
    if isinstance(row.longhand, Longhand):
        out += table(
            ("step", "meaning", "SI unit", "formula"),
            [
                (s.symbol, s.text, ROLES[s.role].si if s.role in ROLES else "", f"`{s.formula}`")
                for s in row.longhand.steps
            ],
        )
    return out


def _example(row: Row) -> str:
    # The version's own value changes with every release and every installation.
    return "the installed version" if row.name == "TB_VERSION" else example_value(row)


def page() -> str:
    """Write the whole page."""
    out = [_INTRODUCTION, "## Unit sets", ""]
    out += table(
        ("role", "quantity", "SI", "metric", "US"),
        [(name, r.text, r.si, r.metric, r.us) for name, r in ROLES.items()],
    )
    for family, rows in describe.families(CATALOGUE.values()).items():
        out += [f"## {family}", ""]
        for row in rows:
            out += section(row)
    return "\n".join(out).rstrip() + "\n"


if __name__ == "__main__":
    PAGE.write_text(page(), encoding="utf-8")
    print(f"wrote {PAGE}")
