"""The list of findings that somebody has looked at and accepted: a TOML file that people read and edit."""

from __future__ import annotations

import datetime
import tomllib
from collections.abc import Iterable, Sequence
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any, NamedTuple

from .types import Finding

_HEAD = """\
# Findings of `thrustbook check` that were looked at and accepted.
# An entry counts only with a reason, the initials of the person who accepts it, and the date.
# It holds for one code at one place with one fingerprint: when what was accepted changes,
# the finding appears again.
"""
_ID = ("code", "sheet", "cell", "fingerprint")
_SIGNED = ("reason", "initials", "date")
_KEYS = (*_ID, "what", *_SIGNED)


class BadList(Exception):
    """A file that is no list of accepted findings; the text says where and why."""


class Entry(NamedTuple):
    """One accepted finding."""

    code: str
    sheet: str
    cell: str
    fingerprint: str
    what: str = ""
    reason: str = ""
    initials: str = ""
    date: str = ""

    @property
    def place(self) -> str:
        """``Sheet!B3``."""
        return f"{self.sheet}!{self.cell}" if self.cell else self.sheet

    @property
    def lacks(self) -> str:
        """What keeps the entry from counting, "" when nothing does."""
        missing = [name for name in _SIGNED if not getattr(self, name).strip()]
        if missing:
            return "no " + ", no ".join(missing)
        try:
            datetime.date.fromisoformat(self.date)
        except ValueError:
            return f'the date "{self.date}" is not written as 2026-01-31'
        return ""


@dataclass(frozen=True)
class Accepted:
    """The entries of one file."""

    entries: Sequence[Entry] = ()

    @classmethod
    def read(cls, path: Path) -> Accepted:
        """Read a file. Raises :class:`BadList`, OSError."""
        try:
            data = tomllib.loads(path.read_text(encoding="utf-8-sig"))
        except (tomllib.TOMLDecodeError, UnicodeDecodeError) as error:
            raise BadList(f"{path} is not readable TOML ({error})") from error
        tables = data.pop("accepted", [])
        if data:
            raise BadList(f'{path} may hold nothing but [[accepted]] entries, not "{next(iter(data))}"')
        if not isinstance(tables, list):
            raise BadList(f"{path}: an entry begins with [[accepted]], in two pairs of brackets")
        return cls([_entry(path, number, table) for number, table in enumerate(tables, 1)])


def _entry(path: Path, number: int, table: Any) -> Entry:
    where = f"{path}, entry {number}"
    if not isinstance(table, dict):
        raise BadList(f"{where} is not a table")
    for key in table:
        if key not in _KEYS:
            raise BadList(f'{where}: "{key}" is not known (allowed: {", ".join(_KEYS)})')
    for key in _ID:
        if key not in table:
            raise BadList(f"{where}: {key} is missing")
    return Entry(**{key: _text(where, key, value) for key, value in table.items()})


def _text(where: str, key: str, value: Any) -> str:
    if key == "date" and isinstance(value, datetime.datetime | datetime.date):
        day = value.date() if isinstance(value, datetime.datetime) else value
        return day.isoformat()
    if not isinstance(value, str):
        raise BadList(f"{where}: {key} must be text in quotation marks")
    return value


@dataclass(frozen=True)
class Matched:
    """Findings and entries held against each other."""

    open: list[Finding] = field(default_factory=list)
    accepted: list[tuple[Finding, Entry]] = field(default_factory=list)
    outdated: list[Entry] = field(default_factory=list)
    refused: list[tuple[Entry, str]] = field(default_factory=list)


def match(found: Iterable[Finding], entries: Iterable[Entry]) -> Matched:
    """Tell the findings that are accepted from those that are not, and the entries that no longer apply.

    Code, sheet, cell and fingerprint must be the same. An entry that lacks its reason,
    initials or date accepts nothing.
    """
    out = Matched()
    known: dict[tuple[str, ...], Entry] = {}
    every: list[tuple[tuple[str, ...], Entry]] = []
    for entry in entries:
        key = entry[:4]
        every.append((key, entry))
        if entry.lacks:
            out.refused.append((entry, entry.lacks))
        else:
            known[key] = entry
    used = set()
    for finding in found:
        key = (finding.code, finding.sheet, finding.cell, finding.fingerprint)
        used.add(key)
        if key in known:
            out.accepted.append((finding, known[key]))
        else:
            out.open.append(finding)
    out.outdated.extend(entry for key, entry in every if key not in used and not entry.lacks)
    return out


def written(findings: Iterable[Finding], entries: Iterable[Entry] = ()) -> str:
    """The text of a list: entries as they are, and findings to be signed."""
    fresh = (Entry(f.code, f.sheet, f.cell, f.fingerprint, f.what) for f in findings)
    blocks = [_HEAD]
    for entry in [*entries, *fresh]:
        lines = ["[[accepted]]", *(f"{key} = {_quoted(getattr(entry, key))}" for key in _KEYS)]
        blocks.append("\n".join(lines) + "\n")
    return "\n".join(blocks)


def _quoted(text: str) -> str:
    out = text.replace("\\", "\\\\").replace('"', '\\"')
    return '"' + "".join(c if c >= " " and c != "\x7f" else f"\\u{ord(c):04x}" for c in out) + '"'
