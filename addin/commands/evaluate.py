"""``thrustbook evaluate``: compute every formula of a workbook and store the values."""

from __future__ import annotations

import argparse
import itertools
import json
import sys
import time
from collections.abc import Callable, Sequence
from pathlib import Path
from string import ascii_uppercase
from typing import Any

from .. import figures
from ..cells import CellError
from ..hosts.headless.evaluate import Evaluation, Failed, Kept, Table, evaluate_workbook
from ..xlsx.package import Package
from ..xlsx.refusals import Refusal
from .progress import ProgressLine

LIST = 20
"""Findings of one kind that are listed before the rest is counted."""


def configure(parser: argparse.ArgumentParser) -> None:
    """Add the command's arguments."""
    parser.add_argument("book", type=Path, help="the workbook, .xlsx or .xlsm")
    parser.add_argument(
        "-o", "--output", type=Path, help="write here; without it the values go into the workbook"
    )
    parser.add_argument(
        "--with",
        dest="host",
        choices=("headless", "calc"),
        default="headless",
        help="what evaluates: the embedded engine (default) or LibreOffice Calc",
    )
    parser.add_argument(
        "--fill",
        action="store_true",
        help="also store values of ordinary formulas that have none in the file",
    )
    parser.add_argument("--rows", type=int, default=60, help="rows printed of each table (default 60)")
    parser.add_argument("--json", action="store_true", help="write the findings for a machine")


def run(options: argparse.Namespace) -> int:
    """Evaluate and store; 0: every cell of ours has its value, 1: some failed or are stale, 2: refused."""
    started = time.perf_counter()
    target: Path = options.output or options.book
    try:
        package = Package.read(options.book)
        with ProgressLine() as progress:
            evaluation = _evaluator(options.host)(package, progress=progress, fill_native=options.fill)
        changed = {part: data for part, data in evaluation.replaced.items() if data != package.part(part)}
        wrote = bool(changed) or target.resolve() != options.book.resolve()
        if wrote:
            package.save(target, changed)
    except Refusal as refusal:
        return _refuse(options, f"{options.book}: {refusal}")
    except OSError as error:
        return _refuse(options, f"{target}: {error.strerror or error}; the workbook was not changed")
    seconds = time.perf_counter() - started
    if options.json:
        print(json.dumps(as_data(evaluation, options.book, target), indent=1, ensure_ascii=False))
    else:
        print("\n".join(report(evaluation, options.book, target, seconds, options.rows, wrote)))
    return 0 if evaluation.ok else 1


def _refuse(options: argparse.Namespace, reason: str) -> int:
    print(reason, file=sys.stderr)
    if options.json:
        print(json.dumps({"workbook": str(options.book), "ok": False, "refused": reason}, indent=1))
    return 2


def _evaluator(host: str) -> Callable[..., Evaluation]:
    if host == "headless":
        return evaluate_workbook
    from ..hosts.calc.evaluate import evaluate_workbook as evaluate_in_calc

    return evaluate_in_calc


def report(
    evaluation: Evaluation, book: Path, target: Path, seconds: float, rows: int, changed: bool
) -> list[str]:
    """Lay the outcome out for reading."""
    cells = figures.counted(len(evaluation.cells), "cell")
    values = figures.counted(evaluation.stored, "value")
    where = f"stored in {target}" if changed else "all as they stand in the file"
    out = [f"{book.name}: {cells} with our functions, {values}, {where} ({seconds:.2f} s)"]
    if evaluation.counts:
        out += ["", "Calls"]
        out += figures.table(
            [("function", "calls"), *((name, n) for name, n in sorted(evaluation.counts.items()))]
        )
    for table in evaluation.tables:
        out += ["", *table_text(table, rows)]
    out += _findings("Errors", error_lines(evaluation.errors))
    out += _findings(
        "Not computed here: the value stored in the file was kept",
        [
            (f"{k.sheet}!{k.a1}", "STALE" if k.depends_on_tb else "", k.reason, k.formula)
            for k in evaluation.native_kept
        ],
    )
    out += _findings(
        "Not evaluated: formulas in conditional formats and validations",
        [(e.sheet, e.where, e.formula) for e in evaluation.not_evaluated],
    )
    out += _findings("Remarks", [(w,) for w in evaluation.warnings])
    if evaluation.cells:
        out += ["", "Thrust is the force of the fluid on the pipework; the restraint supplies the opposite."]
        out += ["Hydraulic forces from a stated idealisation; local codes and licensed practice govern."]
    return out


def table_text(table: Table, rows: int) -> list[str]:
    """Write a table of results with its headings, units below them."""
    grid = table.grid.tolist()
    shown = grid if len(grid) <= rows else grid[:rows]
    headings = [list(table.labels), list(table.units)]
    out = [f"{table.sheet}!{table.a1}  {table.function}, {figures.counted(len(grid), 'row')}"]
    out += figures.table([*headings, *shown], headings=len(headings))
    if len(grid) > len(shown):
        out.append(f"  ... {len(grid) - len(shown)} more rows")
    return out


def error_lines(errors: Sequence[Failed]) -> list[tuple[str, ...]]:
    """List errors for a reader: the cells of one row of a block that share a reason make one line."""
    out: list[tuple[str, ...]] = []
    shared = itertools.groupby(
        errors, lambda e: (e.sheet, e.a1.lstrip(ascii_uppercase), e.error, e.reason, e.formula)
    )
    for (sheet, _, error, reason, formula), cells in shared:
        first, *others = (e.a1 for e in cells)
        place = f"{first}:{others[-1]}" if others else first
        out.append((f"{sheet}!{place}", error, reason, formula))
    return out


def _findings(title: str, findings: list[tuple[str, ...]]) -> list[str]:
    if not findings:
        return []
    out = ["", f"{title} ({len(findings)})", *figures.table(findings[:LIST], headings=0)]
    if len(findings) > LIST:
        out.append(f"  ... {len(findings) - LIST} more")
    return out


def as_data(evaluation: Evaluation, book: Path, target: Path) -> dict[str, Any]:
    """Give the outcome as plain data."""
    return {
        "workbook": str(book),
        "stored_in": str(target),
        "ok": evaluation.ok,
        "stored": evaluation.stored,
        "counts": dict(evaluation.counts),
        "cells": [
            {
                "sheet": c.sheet,
                "cell": c.a1,
                "functions": list(c.functions),
                "value": _plain(c.value),
            }
            for c in evaluation.cells
        ],
        "tables": [
            {
                "sheet": t.sheet,
                "cell": t.a1,
                "function": t.function,
                "labels": list(t.labels),
                "units": list(t.units),
                "rows": [[_plain(c) for c in line] for line in t.grid.tolist()],
            }
            for t in evaluation.tables
        ],
        "errors": [_finding(e) for e in evaluation.errors],
        "kept": [_finding(k) for k in evaluation.native_kept],
        "not_evaluated": [e._asdict() for e in evaluation.not_evaluated],
        "remarks": evaluation.warnings,
    }


def _finding(found: Failed | Kept) -> dict[str, Any]:
    return {("cell" if name == "a1" else name): value for name, value in found._asdict().items()}


def _plain(value: Any) -> Any:
    return str(value) if isinstance(value, CellError) else value
