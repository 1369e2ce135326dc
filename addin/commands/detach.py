"""``thrustbook detach``: a copy of a workbook that recalculates without the add-in."""

from __future__ import annotations

import argparse
import time
from pathlib import Path

from ..figures import counted
from ..longhand.detach import Detached
from .copying import first_lines, write_copy


def configure(parser: argparse.ArgumentParser) -> None:
    """Add the command's arguments."""
    parser.add_argument("book", type=Path, help="the workbook, .xlsx or .xlsm, with its values stored")
    parser.add_argument("-o", "--output", type=Path, required=True, help="the copy")


def run(options: argparse.Namespace) -> int:
    """Make the copy; 0: all recalculates, 1: some stand as constants or need the add-in still, 2: refused."""
    started = time.perf_counter()
    detached = write_copy(options.book, options.output, Detached)
    if detached is None:
        return 2
    seconds = time.perf_counter() - started
    print(f"{counted(detached.cells, 'cell')} of ours detached in {seconds:.1f} s: {options.output}")
    texts = [cell for cell in detached.frozen if cell.reason == "it is a text"]
    lost = [cell for cell in detached.frozen if cell.reason != "it is a text"]
    if texts:
        print(f"  texts and headings that stand as constants: {len(texts)}")
    if lost:
        print(f"  cells that could not be worked and stand as constants: {len(lost)}")
        print("\n".join(first_lines([f"{cell.where}  {cell.reason}" for cell in lost])))
    if detached.outside:
        print(f"  conditional formats and validations that need the add-in still: {len(detached.outside)}")
        print("\n".join(first_lines(detached.outside)))
    return 1 if lost or detached.outside else 0
