"""``thrustbook functions``: the catalogue on the terminal."""

from __future__ import annotations

import argparse
import difflib
import json
import sys
from typing import Any

from .. import describe
from ..catalogue.registry import CATALOGUE
from ..catalogue.types import Row


def configure(parser: argparse.ArgumentParser) -> None:
    """Add the command's arguments."""
    parser.add_argument(
        "name", nargs="?", help="a function to describe, such as TB_BEND; without it, all are listed"
    )
    parser.add_argument("--json", action="store_true", help="write the catalogue for a machine")


def run(options: argparse.Namespace) -> int:
    """List the functions, or describe one."""
    if options.name is None:
        if options.json:
            print(json.dumps([as_data(row) for row in CATALOGUE.values()], indent=1))
            return 0
        print("\n".join(listing()))
        return 0
    name = options.name.strip().upper()
    row = CATALOGUE.get(name) or CATALOGUE.get(f"TB_{name}")
    if row is None:
        near = difflib.get_close_matches(name, CATALOGUE, n=3, cutoff=0.5)
        print(
            f"there is no function {options.name}" + (f"; did you mean {', '.join(near)}?" if near else ""),
            file=sys.stderr,
        )
        return 2
    if options.json:
        print(json.dumps(as_data(row), indent=1))
        return 0
    print("\n".join(describe.full_text(row, example_value(row))))
    return 0


def listing() -> list[str]:
    """List all functions by family, a line each."""
    width = max(map(len, CATALOGUE))
    out = []
    for family, rows in describe.families(CATALOGUE.values()).items():
        out += [family, *describe.in_columns([(r.name.ljust(width), r.summary) for r in rows], widest=78), ""]
    return [*out, "thrustbook functions NAME describes one of them."]


def example_value(row: Row) -> str:
    """Evaluate a row's example and write its value."""
    # Imported late: a listing needs no numbers.
    from .. import dispatch
    from ..figures import figure
    from ..formula_text import read_call

    outcome: Any = dispatch.call(*read_call(row.example))
    if hasattr(outcome, "tolist"):
        return "; ".join(", ".join(figure(c) for c in line) for line in outcome.tolist())
    return figure(outcome)


def as_data(row: Row) -> dict[str, Any]:
    """Give a row as plain data."""
    return {
        "name": row.name,
        "family": row.family,
        "summary": row.summary,
        "call": row.signature(),
        "arguments": [describe.argument(row, a)._asdict() for a in row.args],
        "results": [
            {"name": r.name, "text": r.text, "unit": describe.unit_names(r.role)} for r in row.results
        ],
        "sign": row.sign,
        "source": row.reference,
        "example": f"={row.example}",
        "since": row.since,
    }
