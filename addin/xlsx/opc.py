"""Relationships and XML of a workbook package's own parts (not of its sheets)."""

from __future__ import annotations

import io
import posixpath
from collections.abc import Callable, Iterator, Sequence
from typing import NamedTuple, overload
from urllib.parse import unquote

from lxml import etree

from .refusals import Refusal
from .xmltext import unescape_xstring
from .ziparchive import ZipArchive

MAIN = "http://schemas.openxmlformats.org/spreadsheetml/2006/main"
STRICT = "http://purl.oclc.org/ooxml/"
RELATION_ID = "{http://schemas.openxmlformats.org/officeDocument/2006/relationships}id"


class Relation(NamedTuple):
    """One relationship: its id, the last word of its type, the type, and the part it points to."""

    id: str
    kind: str
    type: str
    part: str


def parse(content: bytes, part: str, label: str) -> etree._Element:
    """The root of one part; entities are not expanded and nothing is fetched."""
    parser = etree.XMLParser(resolve_entities=False, no_network=True, load_dtd=False)
    try:
        return etree.fromstring(content, parser)
    except etree.XMLSyntaxError as error:
        raise Refusal(
            f"{label} is damaged ({part} is not readable: {error}). Nothing was changed. "
            "Open it in the spreadsheet program, let it repair the file and save it, or use a backup."
        ) from error


def relations(archive: ZipArchive, source: str, label: str) -> list[Relation]:
    """Relationships of a part (of the package for ``""``) to other parts inside the file."""
    folder, base = posixpath.split(source)
    part = posixpath.join(folder, "_rels", f"{base}.rels")
    if not archive.has(part):
        return []
    found = []
    for node in parse(archive.read(part), part, label).iter("{*}Relationship"):
        if node.get("TargetMode") == "External":
            continue
        kind = node.get("Type", "")
        target = posixpath.normpath(posixpath.join("/", folder, node.get("Target", ""))).lstrip("/")
        if not archive.has(target) and archive.has(unquote(target)):
            target = unquote(target)
        found.append(Relation(node.get("Id", ""), kind.rstrip("/").rpartition("/")[2], kind, target))
    return found


def content_types(archive: ZipArchive, label: str) -> Callable[[str], str]:
    """A function that tells the content type of a part."""
    part = "[Content_Types].xml"
    if not archive.has(part):
        return lambda name: ""
    root = parse(archive.read(part), part, label)
    overrides = {
        node.get("PartName", "").lstrip("/").casefold(): node.get("ContentType", "")
        for node in root.iter("{*}Override")
    }
    defaults = {
        node.get("Extension", "").casefold(): node.get("ContentType", "") for node in root.iter("{*}Default")
    }

    def content_type(name: str) -> str:
        name = name.lstrip("/").casefold()
        return overrides.get(name) or defaults.get(name.rpartition(".")[2], "")

    return content_type


class SharedStrings(Sequence[str]):
    """The shared strings of a workbook, read when the first one is asked for."""

    def __init__(self, load: Callable[[], list[str]]) -> None:
        self._load = load
        self._strings: list[str] | None = None

    @property
    def _all(self) -> list[str]:
        if self._strings is None:
            self._strings = self._load()
        return self._strings

    @overload
    def __getitem__(self, index: int) -> str: ...
    @overload
    def __getitem__(self, index: slice) -> list[str]: ...
    def __getitem__(self, index: int | slice) -> str | list[str]:
        return self._all[index]

    def __len__(self) -> int:
        return len(self._all)

    def __iter__(self) -> Iterator[str]:
        return iter(self._all)


def shared_strings(content: bytes, part: str, label: str) -> list[str]:
    """The texts of a shared strings part; runs of rich text joined, phonetic readings left out."""
    strings: list[str] = []
    item = f"{{{MAIN}}}si"
    events = etree.iterparse(
        io.BytesIO(content), tag=item, resolve_entities=False, no_network=True, huge_tree=True
    )
    try:
        for _, node in events:
            texts = [
                piece.text or ""
                for child in node
                for piece in ([child] if child.tag == f"{{{MAIN}}}t" else child.findall(f"{{{MAIN}}}t"))
                if child.tag != f"{{{MAIN}}}rPh"
            ]
            strings.append(unescape_xstring("".join(texts)))
            node.clear()
            while node.getprevious() is not None:
                del node.getparent()[0]
    except etree.XMLSyntaxError as error:
        raise Refusal(
            f"{label} is damaged ({part} is not readable: {error}). Nothing was changed."
        ) from error
    return strings
