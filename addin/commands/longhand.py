"""``thrustbook longhand``: a copy of a workbook with the long-hand working of every cell."""

from __future__ import annotations

import argparse
import time
from pathlib import Path

from ..figures import counted
from ..longhand.make import Made
from ..longhand.summary import Entry
from .copying import first_lines, write_copy


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
    made = write_copy(book, target, Made)
    if made is None:
        return 2
    found = made.verdicts()
    print("\n".join(report(found, target, time.perf_counter() - started)))
    return 1 if found["differs"] or found["not worked"] or found["error"] else 0


def report(found: dict[str, list[Entry]], target: Path, seconds: float) -> list[str]:
    """Lay the outcome out for reading."""
    total = sum(map(len, found.values()))
    out = [f"{counted(total, 'cell')} of ours worked long-hand in {seconds:.1f} s: {target}"]
    for word, entries in found.items():
        if not entries:
            continue
        out.append(f"  {len(entries)} {word}")
        if word in ("agrees", "text"):
            continue
        out += first_lines([f"{e.cell.where}  {e.trouble or '=' + e.cell.cell.text}" for e in entries])
    return out
