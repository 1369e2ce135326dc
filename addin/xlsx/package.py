"""A workbook file as a package of parts: what is in it, and how it is saved whole."""

from __future__ import annotations

import hashlib
import os
from collections.abc import Mapping, Sequence
from functools import cached_property
from os import PathLike
from pathlib import Path
from typing import NamedTuple

from lxml import etree

from .externals import Externals
from .filetype import SAVE_AS, refuse_other_formats
from .opc import (
    MAIN,
    RELATION_ID,
    STRICT,
    Relation,
    SharedStrings,
    content_types,
    parse,
    relations,
    shared_strings,
)
from .refusals import Refusal
from .safesave import replace_file
from .xmltext import unescape_xstring
from .ziparchive import MAX_FILE, ZipArchive

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
    """The parts of one workbook file, held as they were when it was read.

    ``sheets`` lists worksheets alone, not chart sheets. ``signed`` tells of a package
    signature, which any change makes invalid. ``date1904`` tells the date system, ``sha256``
    is the digest of the whole file.
    """

    path: Path
    sheets: tuple[SheetRef, ...]
    tables: tuple[TableRef, ...]
    defined_names: tuple[NameRef, ...]
    shared_strings: Sequence[str]
    workbook_part: str
    signed: bool
    has_macros: bool
    external_links: bool
    date1904: bool
    sha256: str

    def __init__(self, path: Path, raw: bytes, seen: tuple[int, int, int] | None = None) -> None:
        self.path = path
        self._seen = seen
        self.sha256 = hashlib.sha256(raw).hexdigest()
        label = path.name
        refuse_other_formats(raw, path)
        archive = self._archive = ZipArchive(raw, label)
        self.workbook_part = _workbook_part(archive, label)
        root = parse(archive.read(self.workbook_part), self.workbook_part, label)
        if root.tag.startswith(f"{{{STRICT}"):
            raise _strict(label)
        if root.tag != f"{{{MAIN}}}workbook":
            raise Refusal(f"{label} holds no workbook: its main part is a {root.tag}. {SAVE_AS}")
        links = relations(archive, self.workbook_part, label)
        tabs, self.sheets = _sheets(root, {link.id: link for link in links}, archive, label)
        self.defined_names = _defined_names(root, tabs)
        self.tables = tuple(table for sheet in self.sheets for table in _tables(archive, sheet, label))
        strings = next((link.part for link in links if link.kind == "sharedStrings"), None)
        self.shared_strings = SharedStrings(
            lambda: [] if strings is None else shared_strings(self.part(strings), strings, label)
        )
        properties = root.find(f"{{{MAIN}}}workbookPr")
        self.date1904 = properties is not None and properties.get("date1904") in ("1", "true")
        parts = [name.casefold() for name in archive.names()]
        self.signed = any(name.startswith("_xmlsignatures/") for name in parts)
        self.has_macros = any(
            name.endswith("vbaproject.bin") or name.startswith("xl/macrosheets/") for name in parts
        )
        by_id = {link.id: link.part for link in links if link.kind == "externalLink"}
        self._linked = [
            by_id.get(node.get(RELATION_ID, ""), "") for node in root.iter(f"{{{MAIN}}}externalReference")
        ]
        self.external_links = bool(by_id)

    @cached_property
    def externals(self) -> Externals:
        """What the file keeps of the workbooks that it is linked to."""
        parts = [part for part in self._linked if self.has(part)]
        return Externals([parse(self.part(part), part, self.path.name) for part in parts])

    @classmethod
    def read(cls, path: str | PathLike[str]) -> Package:
        """Read an .xlsx or .xlsm workbook.

        Raises :class:`Refusal` when the file cannot be read, is no such workbook, is
        encrypted, Strict or damaged, or would unpack to an unreasonable size.
        """
        path = Path(path)
        try:
            if path.is_dir():
                raise Refusal(f"{path} is a folder. Give the name of a workbook file.")
            if path.exists() and not path.is_file():
                raise Refusal(f"{path} is not an ordinary file. Give the name of a workbook file.")
            with path.open("rb") as file:
                status = os.fstat(file.fileno())
                if status.st_size > MAX_FILE:
                    raise Refusal(f"{path.name} is larger than {MAX_FILE / 1e9:.1f} GB, which is the limit.")
                raw = file.read()
        except FileNotFoundError as error:
            raise Refusal(f"There is no file {path}. Look at the name and the folder.") from error
        except PermissionError as error:
            raise Refusal(f"{path} may not be read: its rights, or another program, forbid it.") from error
        except OSError as error:
            raise Refusal(f"{path} could not be read ({error.strerror or error}).") from error
        return cls(path, raw, _mark(status))

    def names(self) -> list[str]:
        """Names of all members of the zip, in the order of its directory."""
        return self._archive.names()

    def has(self, name: str) -> bool:
        """Whether there is a part of that name; case does not count."""
        return self._archive.has(name)

    def part(self, name: str) -> bytes:
        """The bytes of one part. KeyError when there is none, :class:`Refusal` when it is damaged."""
        return self._archive.read(name)

    def to_bytes(
        self,
        replaced: Mapping[str, bytes],
        added: Mapping[str, bytes] = {},
    ) -> bytes:
        """The whole file with some parts replaced and some added; every other one byte for byte.

        Raises KeyError for a replaced part that is not there, ValueError for an added one that is.
        """
        return b"".join(self._archive.written(replaced, added))

    def save(
        self,
        target: str | PathLike[str],
        replaced: Mapping[str, bytes],
        added: Mapping[str, bytes] = {},
    ) -> None:
        """Write :meth:`to_bytes` beside the target and rename, so that no crash harms an old file.

        Raises :class:`Refusal` when the place cannot be written, when its name ends
        otherwise than the workbook's, or when the target is this workbook and somebody
        else has saved it since it was read.
        """
        target = Path(target)
        if target.suffix.lower() != self.path.suffix.lower():
            # A spreadsheet program opens no file whose content and name disagree.
            raise Refusal(
                f"{target} would hold a copy of {self.path.name}, so its name must end in "
                f"{self.path.suffix or 'no extension'} too. Nothing was written."
            )
        own = target.exists() and self.path.exists() and target.samefile(self.path)
        if own and self._seen is not None and _mark(target.stat()) != self._seen:
            raise Refusal(
                f"{target} was saved by another program while it was being evaluated. "
                "Nothing was changed. Evaluate it again."
            )
        replace_file(target, self._archive.written(replaced, added), like=self.path)
        if own:
            self._seen = _mark(target.stat())


def _mark(status: os.stat_result) -> tuple[int, int, int]:
    return status.st_ino, status.st_size, status.st_mtime_ns


def _strict(label: str) -> Refusal:
    return Refusal(
        f"{label} is saved as Strict Open XML, whose parts are named differently. "
        'Save it as an ordinary "Excel Workbook (.xlsx)" and use that file.'
    )


def _workbook_part(archive: ZipArchive, label: str) -> str:
    if archive.has("mimetype"):
        kind = archive.read("mimetype").decode("latin-1")
        if "opendocument.spreadsheet" in kind:
            raise Refusal(f"{label} is an OpenDocument spreadsheet (.ods). {SAVE_AS}")
        if "opendocument" in kind:
            raise Refusal(f"{label} is an OpenDocument file, but no spreadsheet ({kind.strip()}). {SAVE_AS}")
    content_type = content_types(archive, label)
    roots = [link for link in relations(archive, "", label) if link.kind == "officeDocument"]
    for link in roots:
        kind = content_type(link.part).lower()
        if "sheet.binary" in kind or link.part.lower().endswith(".bin"):
            raise Refusal(f"{label} is a binary workbook (.xlsb). {SAVE_AS}")
        if "wordprocessingml" in kind or "presentationml" in kind:
            raise Refusal(f"{label} is a text document or a presentation, not a workbook. {SAVE_AS}")
        if link.type.startswith(STRICT):
            raise _strict(label)
        if not archive.has(link.part):
            raise Refusal(f"{label} is damaged: its main part {link.part} is missing. Use a backup.")
        return link.part
    raise Refusal(f"{label} is a zip file, but there is no workbook in it. {SAVE_AS}")


def _sheets(
    root: etree._Element, links: Mapping[str, Relation], archive: ZipArchive, label: str
) -> tuple[list[str], tuple[SheetRef, ...]]:
    """Names of all tabs in order, and the worksheets among them."""
    tabs: list[str] = []
    sheets: list[SheetRef] = []
    for node in root.iterfind(f"{{{MAIN}}}sheets/{{{MAIN}}}sheet"):
        name = unescape_xstring(node.get("name", ""))
        tabs.append(name)
        link = links.get(node.get(RELATION_ID, ""))
        if link is None or not archive.has(link.part):
            raise Refusal(
                f"{label} is damaged: the part of sheet {name!r} is missing. Nothing was changed. "
                "Open it in the spreadsheet program, let it repair the file and save it, or use a backup."
            )
        if link.kind == "worksheet":
            sheets.append(SheetRef(name, link.part, node.get("state", "visible")))
    return tabs, tuple(sheets)


def _defined_names(root: etree._Element, tabs: Sequence[str]) -> tuple[NameRef, ...]:
    names = []
    for node in root.iterfind(f"{{{MAIN}}}definedNames/{{{MAIN}}}definedName"):
        local = _count(node.get("localSheetId"), len(tabs))
        sheet = tabs[local] if local < len(tabs) else None
        names.append(
            NameRef(unescape_xstring(node.get("name", "")), unescape_xstring(node.text or ""), sheet)
        )
    return tuple(names)


def _count(text: str | None, default: int) -> int:
    return int(text) if text is not None and text.isascii() and text.isdigit() else default


def _tables(archive: ZipArchive, sheet: SheetRef, label: str) -> list[TableRef]:
    tables = []
    for link in relations(archive, sheet.part, label):
        if link.kind != "table" or not archive.has(link.part):
            continue
        root = parse(archive.read(link.part), link.part, label)
        name = root.get("displayName") or root.get("name") or ""
        columns = tuple(
            unescape_xstring(node.get("name", ""))
            for node in root.iterfind(f"{{{MAIN}}}tableColumns/{{{MAIN}}}tableColumn")
        )
        header, totals = _count(root.get("headerRowCount"), 1), _count(root.get("totalsRowCount"), 0)
        tables.append(
            TableRef(unescape_xstring(name), sheet.name, root.get("ref", ""), columns, header, totals)
        )
    return tables
