"""New sheets put into a workbook package; only the parts that must name them change."""

from __future__ import annotations

import posixpath
from collections.abc import Callable, Mapping, Sequence
from typing import Final, NamedTuple

from lxml import etree

from ..xlsx.opc import MAIN, RELATION_ID, parse
from ..xlsx.package import Package
from .grid import Formula, Sheet, as_written, fixed, quoted_sheet
from .sheetpart import Values, sheet_xml
from .styles import Formats, with_formats

_RELATIONS: Final = "http://schemas.openxmlformats.org/package/2006/relationships"
_TYPES: Final = "http://schemas.openxmlformats.org/package/2006/content-types"
_OFFICE: Final = "http://schemas.openxmlformats.org/officeDocument/2006/relationships"
_PROPERTIES: Final = "http://schemas.openxmlformats.org/officeDocument/2006/extended-properties"
_VARIANTS: Final = "http://schemas.openxmlformats.org/officeDocument/2006/docPropsVTypes"
_SHEET_TYPE: Final = "application/vnd.openxmlformats-officedocument.spreadsheetml.worksheet+xml"
_STYLES_TYPE: Final = "application/vnd.openxmlformats-officedocument.spreadsheetml.styles+xml"
_EMPTY_STYLES: Final = (
    f'<styleSheet xmlns="{MAIN}"><fonts count="1"><font><sz val="11"/><name val="Calibri"/></font></fonts>'
    '<fills count="2"><fill><patternFill patternType="none"/></fill>'
    '<fill><patternFill patternType="gray125"/></fill></fills>'
    '<borders count="1"><border><left/><right/><top/><bottom/><diagonal/></border></borders>'
    '<cellStyleXfs count="1"><xf numFmtId="0" fontId="0" fillId="0" borderId="0"/></cellStyleXfs>'
    '<cellXfs count="1"><xf numFmtId="0" fontId="0" fillId="0" borderId="0" xfId="0"/></cellXfs>'
    "</styleSheet>"
).encode()


class Parts(NamedTuple):
    """Parts that change and parts that are new."""

    replaced: dict[str, bytes]
    added: dict[str, bytes]


class Addition:
    """The sheets that are to come into a workbook: names of parts and formats chosen once."""

    def __init__(self, package: Package, sheets: Sequence[Sheet]) -> None:
        self.package = package
        self.sheets = sheets
        self._folder = posixpath.dirname(package.workbook_part)
        self._label = package.path.name
        self._names = self._free_names()
        self._styles_part, self._formats, self._new_styles = self._styled()
        self._common = self._register()

    def parts(
        self, values: Mapping[str, Values] | None, text_of: Callable[[Formula], str] = as_written
    ) -> Parts:
        """All parts; with ``values`` (by sheet) the formulas of the new sheets carry their results.

        ``text_of`` may write the formulas another way.
        """
        added = {
            part: sheet_xml(
                sheet,
                self._formats.cells,
                self._formats.dxfs,
                None if values is None else values[sheet.name],
                text_of,
            )
            for part, sheet in zip(self._names, self.sheets, strict=True)
        }
        return Parts(dict(self._common.replaced), {**self._common.added, **added})

    def _part(self, *steps: str) -> str:
        return posixpath.join(self._folder, *steps).lstrip("/")

    def _free_names(self) -> list[str]:
        names: list[str] = []
        number = 1
        while len(names) < len(self.sheets):
            part = self._part("worksheets", f"longhand{number}.xml")
            if not self.package.has(part):
                names.append(part)
            number += 1
        return names

    def _relations_part(self) -> str:
        return self._part("_rels", posixpath.basename(self.package.workbook_part) + ".rels")

    def _parsed(self, part: str) -> etree._Element:
        return parse(self.package.part(part), part, self._label)

    def _styled(self) -> tuple[str, Formats, bool]:
        for link in self._parsed(self._relations_part()):
            if link.get("Type", "").endswith("/styles"):
                target = posixpath.join("/", self._folder, link.get("Target", ""))
                part = posixpath.normpath(target).lstrip("/")
                return part, with_formats(self.package.part(part), part, self._label), False
        part = self._part("styles.xml")
        return part, with_formats(_EMPTY_STYLES, part, self._label), True

    def _register(self) -> Parts:
        links = self._parsed(self._relations_part())
        types = self._parsed("[Content_Types].xml")
        workbook = self._parsed(self.package.workbook_part)
        ids = {link.get("Id", "") for link in links}
        listed = workbook.find(f"{{{MAIN}}}sheets")
        assert listed is not None
        numbers = [int(node.get("sheetId", "0")) for node in listed]
        count = len(numbers)
        added: dict[str, bytes] = {}
        replaced: dict[str, bytes] = {}
        if self._new_styles:
            added[self._styles_part] = self._formats.content
            _relate(links, ids, "styles", posixpath.relpath(self._styles_part, self._folder or "."))
            _declare(types, self._styles_part, _STYLES_TYPE)
        else:
            replaced[self._styles_part] = self._formats.content
        for i, (sheet, part) in enumerate(zip(self.sheets, self._names, strict=True)):
            link = _relate(links, ids, "worksheet", posixpath.relpath(part, self._folder or "."))
            _declare(types, part, _SHEET_TYPE)
            node = etree.SubElement(listed, f"{{{MAIN}}}sheet")
            node.set("name", sheet.name)
            node.set("sheetId", str(max(numbers) + 1 + i))
            node.set(RELATION_ID, link)
        self._name_titles(workbook, count)
        replaced[self._relations_part()] = _bytes(links)
        replaced["[Content_Types].xml"] = _bytes(types)
        replaced[self.package.workbook_part] = _bytes(workbook)
        properties = "docProps/app.xml"
        if self.package.has(properties):
            changed = self._properties(properties)
            if changed is not None:
                replaced[properties] = changed
        return Parts(replaced, added)

    def _name_titles(self, workbook: etree._Element, count: int) -> None:
        """What is printed, and what is repeated on every page, are defined names of the sheet."""
        wanted = []
        for i, sheet in enumerate(self.sheets):
            for name, text in (("Print_Area", print_areas(sheet)), ("Print_Titles", print_titles(sheet))):
                if text:
                    wanted.append((count + i, f"_xlnm.{name}", text))
        if not wanted:
            return
        names = workbook.find(f"{{{MAIN}}}definedNames")
        if names is None:
            names = etree.Element(f"{{{MAIN}}}definedNames")
            before = {f"{{{MAIN}}}{n}" for n in ("sheets", "functionGroups", "externalReferences")}
            at = max(i for i, child in enumerate(workbook) if child.tag in before)
            workbook.insert(at + 1, names)
        for index, name, text in wanted:
            node = etree.SubElement(names, f"{{{MAIN}}}definedName")
            node.set("name", name)
            node.set("localSheetId", str(index))
            node.text = text

    def _properties(self, part: str) -> bytes | None:
        """The list of sheets in the document's properties; None where it is not as expected."""
        root = self._parsed(part)
        titles = root.find(f"{{{_PROPERTIES}}}TitlesOfParts/{{{_VARIANTS}}}vector")
        pairs = root.find(f"{{{_PROPERTIES}}}HeadingPairs/{{{_VARIANTS}}}vector")
        if titles is None or pairs is None or len(pairs) < 2:
            return None
        known = len(self.package.sheets)
        if (pairs[1].findtext(f"{{{_VARIANTS}}}i4") or "") != str(known) or len(titles) < known:
            return None  # chart sheets, or a writer's own order: the list is for show only
        pairs[1][0].text = str(known + len(self.sheets))
        for i, sheet in enumerate(self.sheets):
            node = etree.Element(f"{{{_VARIANTS}}}lpstr")
            node.text = sheet.name
            titles.insert(known + i, node)
        titles.set("size", str(len(titles)))
        return _bytes(root)


def print_areas(sheet: Sheet) -> str:
    """The parts of a sheet that are printed, as a defined name holds them."""
    name = quoted_sheet(sheet.name)
    return ",".join(f"{name}!{fixed(r1, c1)}:{fixed(r2, c2)}" for r1, c1, r2, c2 in sheet.print_areas)


def print_titles(sheet: Sheet) -> str:
    """The rows and columns of a sheet that are repeated on every page, as a defined name holds them."""
    from ..xlsx.a1 import column_letters

    name = quoted_sheet(sheet.name)
    found = []
    if sheet.title_columns:
        first, last = (column_letters(c) for c in sheet.title_columns)
        found.append(f"{name}!${first}:${last}")
    if sheet.title_rows:
        found.append(f"{name}!${sheet.title_rows[0]}:${sheet.title_rows[1]}")
    return ",".join(found)


def _bytes(root: etree._Element) -> bytes:
    return etree.tostring(root, xml_declaration=True, encoding="UTF-8", standalone=True)


def _relate(links: etree._Element, ids: set[str], kind: str, target: str) -> str:
    number = len(ids) + 1
    while f"rId{number}" in ids:
        number += 1
    name = f"rId{number}"
    ids.add(name)
    node = etree.SubElement(links, f"{{{_RELATIONS}}}Relationship")
    node.set("Id", name)
    node.set("Type", f"{_OFFICE}/{kind}")
    node.set("Target", target)
    return name


def _declare(types: etree._Element, part: str, content_type: str) -> None:
    node = etree.SubElement(types, f"{{{_TYPES}}}Override")
    node.set("PartName", "/" + part)
    node.set("ContentType", content_type)
