"""A workbook checked by every rule, and what remains to be looked at after what was accepted."""

from __future__ import annotations

import datetime
from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass, field

from ..progress import Progress
from ..tools import catalogue_version, engine_version, product_version
from ..xlsx.package import Package
from .accept import Accepted, Entry, match
from .book import Book
from .rules import RULES
from .types import ORDER, Finding, Rules, Severity


@dataclass(frozen=True, slots=True)
class Record:
    """The record that a checker signs: which file, which program, when, and what it came to."""

    workbook: str
    sha256: str
    product: str
    catalogue: str
    engine: str
    when: str
    """Date and time with the offset from UTC."""
    tb_cells: int
    counts: dict[str, int]
    """Findings that are not accepted, by severity."""
    accepted: int

    def lines(self) -> list[tuple[str, str]]:
        """The record as name and value, for reading."""
        counts = ", ".join(f"{n} {severity}{'s' if n != 1 else ''}" for severity, n in self.counts.items())
        return [
            ("workbook", self.workbook),
            ("SHA-256", self.sha256),
            ("thrustbook", self.product),
            ("catalogue", self.catalogue),
            ("engine", self.engine),
            ("checked", self.when),
            ("TB_ cells", str(self.tb_cells)),
            ("findings", f"{counts}; {self.accepted} accepted"),
        ]


@dataclass(frozen=True, slots=True)
class Report:
    """The outcome of a check. ``open`` are the findings to look at, worst first."""

    record: Record
    open: list[Finding]
    accepted: list[tuple[Finding, Entry]] = field(default_factory=list)
    outdated: list[Entry] = field(default_factory=list)
    """Accepted entries that no longer apply."""
    refused: list[tuple[Entry, str]] = field(default_factory=list)
    """Entries that accept nothing, and what they lack."""
    remarks: list[str] = field(default_factory=list)

    @property
    def exit_status(self) -> int:
        """0: nothing, or notes alone; 1: warnings; 3: errors."""
        worst = {f.severity for f in self.open}
        return 3 if Severity.ERROR in worst else 1 if Severity.WARNING in worst else 0


def find(
    package: Package, progress: Progress | None = None, rules: Rules = RULES
) -> tuple[Book, list[Finding]]:
    """Let every rule look; findings worst first, then in the order of the workbook.

    Raises :class:`~thrustbook.addin.xlsx.refusals.Refusal` when the workbook
    cannot be evaluated.
    """
    book = Book(package, progress)
    found: list[Finding] = []
    for done, rule in enumerate(rules):
        book.tell(f"check: {rule.title}", done, len(rules))
        found += rule.look(book)
    position = {name: i for i, name in enumerate(book.model.sheet_names)}
    return book, sorted(found, key=lambda f: (ORDER.index(f.severity), f.code, position[f.sheet]))


def check(
    package: Package,
    accepted: Accepted | None = None,
    *,
    progress: Progress | None = None,
    rules: Rules = RULES,
) -> Report:
    """Check a workbook. Raises as :func:`find`."""
    book, found = find(package, progress, rules)
    sorted_out = match(found, accepted.entries if accepted is not None else ())
    cells = sum(1 for node in book.model.nodes if node.calls)
    remarks = [] if cells else ["no cell of this workbook holds a TB_ formula"]
    remarks += [*book.settlement.warnings, *book.remarks]
    return Report(
        record=_record(package, cells, sorted_out.open, len(sorted_out.accepted)),
        open=sorted_out.open,
        accepted=sorted_out.accepted,
        outdated=sorted_out.outdated,
        refused=sorted_out.refused,
        remarks=remarks,
    )


def _record(package: Package, cells: int, found: Sequence[Finding], accepted: int) -> Record:
    counts = Counter(f.severity for f in found)
    return Record(
        workbook=package.path.name,
        sha256=package.sha256,
        product=product_version(),
        catalogue=catalogue_version(),
        engine=engine_version(),
        when=datetime.datetime.now().astimezone().isoformat(sep=" ", timespec="seconds"),
        tb_cells=cells,
        counts={str(severity): counts[severity] for severity in ORDER},
        accepted=accepted,
    )
