"""A workbook file as a package of parts: what is in it, and how it is saved whole."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from os import PathLike
from pathlib import Path
from typing import NamedTuple

from .refusals import Refusal

__all__ = ["NameRef", "Package", "Refusal", "SheetRef", "TableRef"]


class SheetRef(NamedTuple):
    """One worksheet: the name on its tab, its part, and visible, hidden or veryHidden."""

    name: str
    part: str
    state: str


class TableRef(NamedTuple):
    """One table: its name in formulas, its sheet, its extent and its column headings."""

    name: str
    sheet: str
    ref: str
    columns: tuple[str, ...]
    header_rows: int
    totals_rows: int


class NameRef(NamedTuple):
    """One defined name; ``sheet`` is set when the name is local to that sheet."""

    name: str
    text: str
    sheet: str | None


class Package:
    """The parts of one workbook file."""

    path: Path
    sheets: tuple[SheetRef, ...]
    tables: tuple[TableRef, ...]
    defined_names: tuple[NameRef, ...]
    shared_strings: Sequence[str]
    signed: bool
    has_macros: bool
    external_links: bool

    @classmethod
    def read(cls, path: str | PathLike[str]) -> Package:
        """Read a workbook, or raise :class:`Refusal`."""
        raise NotImplementedError

    def names(self) -> list[str]:
        """Names of all parts, in the order of the file."""
        raise NotImplementedError

    def has(self, name: str) -> bool:
        """Whether there is a part of that name."""
        raise NotImplementedError

    def part(self, name: str) -> bytes:
        """The bytes of one part. KeyError when there is none."""
        raise NotImplementedError

    def to_bytes(self, replaced: Mapping[str, bytes], added: Mapping[str, bytes] = {}) -> bytes:  # noqa: B006
        """The whole file with some parts replaced and some added."""
        raise NotImplementedError

    def save(
        self,
        target: str | PathLike[str],
        replaced: Mapping[str, bytes],
        added: Mapping[str, bytes] = {},  # noqa: B006
    ) -> None:
        """Save beside the target and rename."""
        raise NotImplementedError
