"""``thrustbook detach``: a copy of a workbook that recalculates without the add-in."""

from __future__ import annotations

import argparse
import sys
import time
from pathlib import Path

from ..longhand.detach import Detached
from ..xlsx.package import Package
from ..xlsx.refusals import Refusal
from .progress import Progress

LIST = 20
"""Cells that are listed before the rest is counted."""


def configure(parser: argparse.ArgumentParser) -> None:
    """Add the command's arguments."""
    parser.add_argument("book", type=Path, help="the workbook, .xlsx or .xlsm, with its values stored")
    parser.add_argument("-o", "--output", type=Path, required=True, help="the copy")


def run(options: argparse.Namespace) -> int:
    """Make the copy; 0: every number recalculates, 1: some stand as constants, 2: refused."""
    started = time.perf_counter()
    book, target = options.book, options.output
    try:
        if target.exists() and book.exists() and target.samefile(book):
            raise Refusal("The copy must not replace the workbook. Give another name for it.")
        package = Package.read(book)
        with Progress() as progress:
            detached = Detached(package, progress)
            detached.save(target)
    except Refusal as refusal:
        print(f"{book}: {refusal}", file=sys.stderr)
        return 2
    except OSError as error:
        print(f"{target}: {error.strerror or error}; nothing was written", file=sys.stderr)
        return 2
    seconds = time.perf_counter() - started
    print(f"{detached.cells} cells of ours detached in {seconds:.1f} s: {target}")
    texts = [cell for cell in detached.frozen if cell.reason == "it is a text"]
    lost = [cell for cell in detached.frozen if cell.reason != "it is a text"]
    if texts:
        print(f"  {len(texts)} texts and headings stand as constants")
    if lost:
        print(f"  {len(lost)} cells could not be worked and stand as constants:")
        for cell in lost[:LIST]:
            print(f"    {cell.where}  {cell.reason}")
        if len(lost) > LIST:
            print(f"    and {len(lost) - LIST} more")
    return 1 if lost else 0
