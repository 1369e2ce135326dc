"""What a check finds, and the one signature of its rules."""

from __future__ import annotations

import hashlib
from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass
from enum import StrEnum
from typing import TYPE_CHECKING, NamedTuple

if TYPE_CHECKING:
    from .book import Book


class Severity(StrEnum):
    """How bad a finding is: a wrong number, something to be looked at, or something to know."""

    ERROR = "error"
    WARNING = "warning"
    NOTE = "note"


ORDER = tuple(Severity)
"""The severities, worst first."""


@dataclass(frozen=True, slots=True)
class Finding:
    """One thing found.

    ``cell`` is a cell ("F7"), several below each other ("F7:F9"), a row ("7:7"), a column
    ("C:C"), or "" for the whole sheet. ``what`` says what is the case, ``why`` why it matters
    or where it comes from. ``basis`` is all that an acceptance holds for: when it changes, the
    finding appears again.
    """

    code: str
    severity: Severity
    sheet: str
    cell: str
    what: str
    why: str
    basis: str

    @property
    def place(self) -> str:
        """``Sheet!B3``."""
        return f"{self.sheet}!{self.cell}" if self.cell else self.sheet

    @property
    def fingerprint(self) -> str:
        """Twelve hexadecimal digits that stand for the code, the place and the basis."""
        text = "\n".join((self.code, self.sheet, self.cell, self.basis))
        return hashlib.sha256(text.encode()).hexdigest()[:12]


class Rule(NamedTuple):
    """One kind of finding: its code, what it looks for, and the function that looks.

    The function takes the workbook as the check sees it and gives findings of this code alone.
    """

    code: str
    title: str
    look: Callable[[Book], Iterable[Finding]]


Rules = Sequence[Rule]
