"""What the commands that make a copy of a workbook share."""

from __future__ import annotations

import sys
from collections.abc import Callable, Iterator, Sequence
from pathlib import Path
from typing import Protocol, TypeVar

from ..progress import Progress
from ..xlsx.package import Package
from ..xlsx.refusals import Refusal
from . import progress as terminal

LIST = 20
"""Cells of one kind that are listed before the rest is counted."""


class Copy(Protocol):
    """A copy that was made of a workbook and can be saved."""

    def save(self, target: Path) -> object:
        """Write the copy."""


AnyCopy = TypeVar("AnyCopy", bound=Copy)


def write_copy(book: Path, target: Path, make: Callable[[Package, Progress], AnyCopy]) -> AnyCopy | None:
    """Read a workbook, make the copy, write it; None where that is refused, with the reason on stderr."""
    try:
        if target.exists() and book.exists() and target.samefile(book):
            raise Refusal("The copy must not replace the workbook. Give another name for it.")
        package = Package.read(book)
        with terminal.ProgressLine() as progress:
            copy = make(package, progress)
            copy.save(target)
    except Refusal as refusal:
        print(f"{book}: {refusal}", file=sys.stderr)
        return None
    except OSError as error:
        print(f"{target}: {error.strerror or error}; nothing was written", file=sys.stderr)
        return None
    return copy


def first_lines(lines: Sequence[str]) -> Iterator[str]:
    """The first of many lines, indented, and how many are left."""
    for line in lines[:LIST]:
        yield f"    {line}"
    if len(lines) > LIST:
        yield f"    and {len(lines) - LIST} more"
