"""Workbooks as Excel saves them: calls of an add-in through a link to its file."""

from __future__ import annotations

import re
import zipfile
from pathlib import Path

_REL = "http://schemas.openxmlformats.org/officeDocument/2006/relationships"
_PACKAGE = "http://schemas.openxmlformats.org/package/2006/relationships"
_MAIN = "http://schemas.openxmlformats.org/spreadsheetml/2006/main"
_LINK = "xl/externalLinks/externalLink1.xml"
_KIND = "application/vnd.openxmlformats-officedocument.spreadsheetml.externalLink+xml"


def as_saved_by_excel(path: Path) -> None:
    """Write every TB_ call of a workbook as ``[1]!TB_...``, with the link to the add-in's file."""
    with zipfile.ZipFile(path) as archive:
        parts = {name: archive.read(name).decode() for name in archive.namelist()}
    for name, text in parts.items():
        if name.startswith("xl/worksheets/"):
            parts[name] = re.sub(
                r"(<f[^>]*>)([^<]*)", lambda m: m[1] + re.sub(r'(?<!")TB_', "[1]!TB_", m[2]), text
            )
    book = parts["xl/workbook.xml"]
    entry = f'<externalReferences><externalReference xmlns:r="{_REL}" r:id="rId99"/></externalReferences>'
    parts["xl/workbook.xml"] = book.replace("</sheets>", "</sheets>" + entry)
    rels = "xl/_rels/workbook.xml.rels"
    parts[rels] = _with_relation(parts[rels], f'Id="rId99" Type="{_REL}/externalLink" Target="/{_LINK}"')
    parts["[Content_Types].xml"] = parts["[Content_Types].xml"].replace(
        "</Types>", f'<Override PartName="/{_LINK}" ContentType="{_KIND}"/></Types>'
    )
    parts[_LINK] = (
        f'<externalLink xmlns="{_MAIN}"><externalBook xmlns:r="{_REL}" r:id="rId1"/></externalLink>'
    )
    target = r"file:///C:\Users\engineer\AppData\Roaming\Microsoft\Excel\XLSTART\thrustbook.xlam"
    parts["xl/externalLinks/_rels/externalLink1.xml.rels"] = _with_relation(
        f'<Relationships xmlns="{_PACKAGE}"></Relationships>',
        f'Id="rId1" Type="{_REL}/externalLinkPath" Target="{target}" TargetMode="External"',
    )
    with zipfile.ZipFile(path, "w", zipfile.ZIP_DEFLATED) as archive:
        for name, text in parts.items():
            archive.writestr(name, text)


def _with_relation(text: str, attributes: str) -> str:
    return text.replace("</Relationships>", f"<Relationship {attributes}/></Relationships>")


def as_spilling(path: Path, place: str) -> None:
    """Mark an array formula as one that spills, as Excel does (the cell's ``cm`` attribute)."""
    with zipfile.ZipFile(path) as archive:
        parts = {name: archive.read(name) for name in archive.namelist()}
    name = "xl/worksheets/sheet1.xml"
    old = parts[name].decode()
    parts[name] = old.replace(f'<c r="{place}"', f'<c r="{place}" cm="1"').encode()
    assert parts[name].decode() != old
    with zipfile.ZipFile(path, "w", zipfile.ZIP_DEFLATED) as archive:
        for part, data in parts.items():
            archive.writestr(part, data)
