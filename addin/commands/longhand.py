"""``thrustbook longhand``: a copy of a workbook with the long-hand working of every cell."""

from __future__ import annotations

import argparse
import sys
import time
from pathlib import Path

from ..longhand.make import Made
from ..longhand.summary import Entry
from ..xlsx.package import Package
from ..xlsx.refusals import Refusal
from .progress import Progress

LIST = 20
"""Cells of one kind that are listed before the rest is counted."""


def configure(parser: argparse.ArgumentParser) -> None:
    """Add the command's arguments."""
    parser.add_argument("book", type=Path, help="the workbook, .xlsx or .xlsm, with its values stored")
    parser.add_argument(
        "-o", "--output", type=Path, help="the copy; without it BOOK-longhand beside the workbook"
    )


def run(options: argparse.Namespace) -> int:
    """Make the copy; 0: every cell agrees with its working, 1: some do not or have none, 2: refused."""
    started = time.perf_counter()
    book: Path = options.book
    target: Path = options.output or book.with_name(f"{book.stem}-longhand{book.suffix}")
    try:
        if target.exists() and book.exists() and target.samefile(book):
            raise Refusal("The copy must not replace the workbook. Give another name for it.")
        package = Package.read(book)
        with Progress() as progress:
            made = Made(package, progress)
            made.save(target)
    except Refusal as refusal:
        print(f"{book}: {refusal}", file=sys.stderr)
        return 2
    except OSError as error:
        print(f"{target}: {error.strerror or error}; nothing was written", file=sys.stderr)
        return 2
    found = made.verdicts()
    print("\n".join(report(found, target, time.perf_counter() - started)))
    return 1 if found["differs"] or found["not worked"] or found["error"] else 0


def report(found: dict[str, list[Entry]], target: Path, seconds: float) -> list[str]:
    """Lay the outcome out for reading."""
    total = sum(map(len, found.values()))
    out = [f"{total} cells of ours worked long-hand in {seconds:.1f} s: {target}"]
    for word, entries in found.items():
        if not entries:
            continue
        out.append(f"  {len(entries)} {word}")
        if word in ("agrees", "text"):
            continue
        for entry in entries[:LIST]:
            out.append(f"    {entry.cell.where}  {entry.trouble or '=' + entry.cell.cell.text}")
        if len(entries) > LIST:
            out.append(f"    and {len(entries) - LIST} more")
    return out
