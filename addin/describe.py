"""What the catalogue says of a function, in words: for the terminal and for the reference page."""

from __future__ import annotations

import math
import textwrap
from collections.abc import Iterable, Sequence
from typing import NamedTuple

from thrustbook.engine.guard import Bound

from .catalogue.registry import wording
from .catalogue.types import Arg, Longhand, NoLonghand, Row
from .units import ROLES


class ArgumentText(NamedTuple):
    """One argument, ready to be shown."""

    name: str
    text: str
    unit: str
    allowed: str
    empty: str


def unit_names(role: str) -> str:
    """Name the unit of a role in the sets SI, metric and US."""
    if role not in ROLES:
        return ""
    known = ROLES[role]
    return " | ".join((known.si, known.metric, known.us)) if known.si != "-" else "-"


def allowed(bound: Bound | None, role: str) -> str:
    """Say which numbers an argument may take, angles in degrees as a worksheet has them."""
    if bound is None:
        return ""
    if role == "angle":
        bound = bound._replace(low=math.degrees(bound.low), high=math.degrees(bound.high))
    return str(bound)


def argument(row: Row, arg: Arg) -> ArgumentText:
    """Describe one argument of a row."""
    limits = ", ".join(arg.choices) if arg.choices else allowed(row.bound(arg), arg.role)
    empty = "required" if row.required(arg) else f"empty: {arg.empty}" if arg.empty else "optional"
    return ArgumentText(arg.name, wording(arg), unit_names(arg.role), limits, empty)


def longhand_note(row: Row) -> str:
    """Say how the long-hand working of a row is made."""
    if isinstance(row.longhand, NoLonghand):
        return f"none: {row.longhand.reason}"
    if isinstance(row.longhand, Longhand):
        return {
            "": "closed form, step by step",
            "unrolled": "iteration unrolled to full precision, step by step",
            "residual": "residual of the defining equation at the engine's value",
        }[row.longhand.method]
    return "as a table, a row for each row of the input" if row.longhand else ""


def in_columns(rows: Sequence[Sequence[str]], indent: str = "  ", widest: int = 78) -> list[str]:
    """Align texts in columns; the last column wraps."""
    if not rows:
        return []
    widths = [max(len(r[j]) for r in rows) for j in range(len(rows[0]) - 1)]
    out = []
    for r in rows:
        lead = indent + "".join(f"{text:<{w}}  " for text, w in zip(r, widths, strict=False))
        lines = textwrap.wrap(r[-1], widest) or [""]
        out.append((lead + lines[0]).rstrip())
        out += [" " * len(lead) + line for line in lines[1:]]
    return out


def full_text(row: Row, value: str) -> list[str]:
    """Describe a function for the terminal, at most about 100 characters wide."""
    out = [row.signature(), "", *textwrap.wrap(row.summary, 96), "", "Arguments"]
    lines = []
    if row.has_result:
        lines.append(("result", "", "", 'wanted result by name, or "all", "labels", "units"'))
    if row.has_units:
        lines.append(("units", "", "", 'SI (when empty), "metric", "US", or a range of role | unit'))
    for arg in row.args:
        a = argument(row, arg)
        lines.append((a.name, a.unit, a.allowed, f"{a.text} ({a.empty})"))
    out += in_columns(lines)
    for arg in row.args:
        if arg.columns:
            out += ["", f"Columns of {arg.name}"]
            out += in_columns(
                [(c.name, unit_names(c.role), "required" if c.required else "", c.text) for c in arg.columns]
            )
    out += ["", "Results"]
    out += in_columns([(r.name, unit_names(r.role), r.text) for r in row.results])
    out += [
        "",
        *textwrap.wrap(f"Sign convention: {row.sign}", 96),
        *textwrap.wrap(f"Source: {row.reference}", 96),
        f"Long-hand working: {longhand_note(row)}",
    ]
    for caution in row.cautions:
        out += textwrap.wrap(f"Caution: {caution.text}", 96)
    return [*out, "", "Example", f"  ={row.example}", f"  gives {value}"]


def families(rows: Iterable[Row]) -> dict[str, list[Row]]:
    """Group rows by family, in the catalogue's order."""
    out: dict[str, list[Row]] = {}
    for row in rows:
        out.setdefault(row.family, []).append(row)
    return out
