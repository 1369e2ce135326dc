"""``thrustbook check``: find what a second engineer should look at in a workbook."""

from __future__ import annotations

import argparse
import json
import sys
from pathlib import Path

from ..check import report as reports
from ..check.accept import Accepted, BadList, written
from ..check.run import Report, check
from ..xlsx.package import Package
from ..xlsx.refusals import Refusal
from .progress import ProgressLine

_EXIT = "exit status: 0 no finding, or notes alone; 1 warnings; 2 refused, nothing was checked; 3 errors"


def configure(parser: argparse.ArgumentParser) -> None:
    """Add the command's arguments."""
    parser.add_argument("book", type=Path, help="the workbook, .xlsx or .xlsm; it is never changed")
    parser.add_argument(
        "-o",
        "--output",
        type=Path,
        metavar="OUT",
        help="write a copy with a sheet of findings",
    )
    parser.add_argument("--json", action="store_true", help="write the findings for a machine")
    parser.add_argument("--all", action="store_true", help="list every finding, however many of one kind")
    parser.add_argument(
        "--accept",
        type=Path,
        metavar="FILE",
        help="findings that were looked at and accepted, each with reason, initials and date (TOML)",
    )
    parser.add_argument(
        "--write-accept",
        type=Path,
        metavar="FILE",
        help="write such a file for the findings of now, to be filled in and signed; it must not exist",
    )
    parser.epilog = _EXIT


def run(options: argparse.Namespace) -> int:
    """Check and report; 0: nothing or notes, 1: warnings, 2: refused, 3: errors."""
    book: Path = options.book
    output: Path | None = options.output
    try:
        if output is not None and output.resolve() == book.resolve():
            raise Refusal(
                f"{output} is the workbook itself. Give another name for the copy with the findings."
            )
        accepted = Accepted.read(options.accept) if options.accept is not None else None
        package = Package.read(book)
        with ProgressLine() as progress:
            report = check(package, accepted, progress=progress)
        if output is not None:
            _save(package, report, output)
        if options.write_accept is not None:
            _write_list(options.write_accept, report)
    except (Refusal, BadList) as refusal:
        print(f"{book}: {refusal}", file=sys.stderr)
        return 2
    except OSError as error:
        print(f"{error.filename or book}: {error.strerror or error}", file=sys.stderr)
        return 2
    if options.json:
        print(json.dumps(reports.data(report), indent=1, ensure_ascii=False))
    else:
        print("\n".join(reports.text(report, options.all)))
        if output is not None:
            print(f"\nA copy with the findings is in {output}.")
    return report.exit_status


def _save(package: Package, report: Report, output: Path) -> None:
    # Imported late: most checks write no sheet.
    from ..longhand.parts import Addition

    sheet = reports.sheet(report, [s.name for s in package.sheets])
    parts = Addition(package, [sheet]).parts(None)
    package.save(output, parts.replaced, parts.added)


def _write_list(target: Path, report: Report) -> None:
    text = written(report.open, [entry for _, entry in report.accepted])
    try:
        with target.open("x", encoding="utf-8") as file:
            file.write(text)
    except FileExistsError:
        raise Refusal(
            f"{target} exists and may hold signed entries. Give another name for the list."
        ) from None
