"""A report of a check: for the terminal, for a machine, and as a sheet."""

from __future__ import annotations

import textwrap
from collections.abc import Iterable
from typing import Any

from .. import describe
from ..longhand.grid import Link, Sheet, quoted_sheet
from .accept import Entry
from .run import Report
from .types import Finding

LIST = 20
"""Findings of one code that are written out on the terminal before the rest is counted."""
_WIDE = 96
CAUTION = "Hydraulic forces from a stated idealisation; local codes and licensed practice govern."


def text(report: Report, everything: bool = False) -> list[str]:
    """Lay a report out for the terminal."""
    out = [_summary(report)]
    by_code: dict[str, list[Finding]] = {}
    for finding in report.open:
        by_code.setdefault(f"{finding.severity} {finding.code}", []).append(finding)
    for found in by_code.values():
        shown = found if everything else found[:LIST]
        for finding in shown:
            out += ["", *_finding(finding)]
        if len(found) > len(shown):
            out += ["", f"  ... {len(found) - len(shown)} more of {found[0].code}; --all lists them"]
    if report.accepted:
        out += ["", f"Accepted ({len(report.accepted)})"]
        out += describe.in_columns(
            [(f.code, f.place, e.initials, e.date, e.reason) for f, e in report.accepted], widest=60
        )
    if report.outdated:
        out += [
            "",
            f"Accepted before, but no longer found as it was ({len(report.outdated)}): take these out",
        ]
        out += describe.in_columns([(*_short(e), e.what) for e in report.outdated], widest=60)
    if report.refused:
        out += ["", f"Entries that accept nothing ({len(report.refused)})"]
        out += describe.in_columns([(*_short(e), why) for e, why in report.refused], widest=60)
    for remark in report.remarks:
        out += ["", *textwrap.wrap(f"Remark: {remark}", _WIDE)]
    out += ["", "Record of the check", *describe.in_columns(report.record.lines(), widest=72), "", CAUTION]
    return out


def _short(entry: Entry) -> tuple[str, str]:
    return entry.code, entry.place


def _summary(report: Report) -> str:
    counts = [f"{n} {severity}{'s' if n != 1 else ''}" for severity, n in report.record.counts.items() if n]
    found = (
        f"{len(report.open)} finding{'s' if len(report.open) != 1 else ''}" if report.open else "no finding"
    )
    accepted = f"; {len(report.accepted)} accepted" if report.accepted else ""
    detail = f" ({', '.join(counts)})" if counts else ""
    return f"{report.record.workbook}: {found}{detail}{accepted}"


def _finding(finding: Finding) -> list[str]:
    head = f"{finding.severity.upper():<8} {finding.code}  {finding.place}"
    lines = textwrap.wrap(finding.what, _WIDE - 9) + textwrap.wrap(finding.why, _WIDE - 9)
    return [head, *(" " * 9 + line for line in lines)]


def data(report: Report) -> dict[str, Any]:
    """Give a report as plain data."""
    record = report.record
    return {
        "record": {name: getattr(record, name) for name in record.__slots__},
        "findings": [finding_data(f) for f in report.open],
        "accepted": [finding_data(f) | {"acceptance": _signed(e)} for f, e in report.accepted],
        "no_longer_apply": [e._asdict() for e in report.outdated],
        "refused_entries": [e._asdict() | {"lacks": why} for e, why in report.refused],
        "remarks": report.remarks,
        "exit_status": report.exit_status,
    }


def finding_data(finding: Finding) -> dict[str, str]:
    """Give a finding as plain data."""
    return {
        "code": finding.code,
        "severity": str(finding.severity),
        "sheet": finding.sheet,
        "cell": finding.cell,
        "what": finding.what,
        "why": finding.why,
        "fingerprint": finding.fingerprint,
    }


def _signed(entry: Entry) -> dict[str, str]:
    return {"reason": entry.reason, "initials": entry.initials, "date": entry.date}


_HEADS = ("severity", "code", "where", "what", "why", "accepted by", "reason")
_WIDTHS = (10, 7, 20, 52, 52, 16, 32)


def sheet(report: Report, taken: Iterable[str]) -> Sheet:
    """Lay a report out as a sheet; ``taken`` are the names of sheets that there are."""
    used = {name.casefold() for name in taken}
    names = ("Findings", *(f"Findings {n}" for n in range(2, len(used) + 3)))
    out = Sheet(next(name for name in names if name.casefold() not in used))
    out.footer = "Findings of the check"
    out.widths = dict(enumerate(map(float, _WIDTHS), 1))
    out.put(1, 1, f"Findings of the check of {report.record.workbook}", "title")
    row = 3
    for name, value in report.record.lines():
        out.put(row, 1, name, "head")
        out.put(row, 3, value)
        row += 1
    row += 1
    out.line(row, list(_HEADS), "head")
    out.title_rows = (row, row)
    out.freeze = (row, 0)
    signed: list[tuple[Finding, Entry | None]] = [(f, None) for f in report.open]
    for finding, entry in [*signed, *report.accepted]:
        row += 1
        severity = f"{finding.severity} (accepted)" if entry is not None else str(finding.severity)
        out.line(row, [severity, finding.code, finding.place, finding.what, finding.why], "wrapped")
        if entry is not None:
            out.line(row, [f"{entry.initials} {entry.date}", entry.reason], "wrapped", col=6)
        out.fit_height(row)
        target = finding.cell or "A1"
        out.links.append(Link(row, 3, f"{quoted_sheet(finding.sheet)}!{target}"))
    if not report.open and not report.accepted:
        out.put(row + 1, 1, "no finding")
    out.put(row + 3, 1, CAUTION)
    return out
