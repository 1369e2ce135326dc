"""Cells with the same remark, one below the other, as one finding."""

from __future__ import annotations

import hashlib
from collections.abc import Iterable, Iterator
from typing import NamedTuple

from ..xlsx.a1 import to_a1
from .types import Finding, Severity


class Remark(NamedTuple):
    """What is to be said of one cell. Only remarks of equal ``kind`` may be joined."""

    sheet: str
    row: int
    col: int
    kind: str
    what: str
    why: str
    basis: str


def joined(code: str, severity: Severity, remarks: Iterable[Remark]) -> Iterator[Finding]:
    """A finding for every run of cells below each other whose remarks are of one kind."""
    ordered = sorted(remarks, key=lambda r: (r.sheet, r.col, r.kind, r.row))
    run: list[Remark] = []
    found = []
    for remark in ordered:
        if run and not _continues(run[-1], remark):
            found.append(run)
            run = []
        run.append(remark)
    if run:
        found.append(run)
    for run in sorted(found, key=lambda r: (r[0].sheet, r[0].row, r[0].col)):
        yield _finding(code, severity, run)


def _continues(last: Remark, new: Remark) -> bool:
    return last[0] == new[0] and last[2:4] == new[2:4] and new.row <= last.row + 1


def _finding(code: str, severity: Severity, run: list[Remark]) -> Finding:
    first, last = run[0], run[-1]
    cell = to_a1(first.row, first.col)
    what = first.what
    count = last.row - first.row + 1
    if count > 1:
        cell += f":{to_a1(last.row, last.col)}"
        what = f"{count} cells; in the first, {what}"
    return Finding(code, severity, first.sheet, cell, what, first.why, "\n".join(r.basis for r in run))


def digest(values: object) -> str:
    """A short stand-in for many values, equal for equal values to twelve figures."""
    return hashlib.sha256(figures(values).encode()).hexdigest()[:20]


def figures(value: object) -> str:
    """A value as a fingerprint takes it: numbers to twelve figures, so that rounding does not matter."""
    if isinstance(value, float):
        return f"{value:.12g}"
    if isinstance(value, list):
        return "[" + ";".join(figures(item) for item in value) + "]"
    return str(value)
