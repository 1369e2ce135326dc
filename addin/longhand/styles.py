"""Cell formats of the checking sheets, added to the formats that a workbook has."""

from __future__ import annotations

import copy
from typing import Final, NamedTuple

from lxml import etree

from ..xlsx.opc import MAIN, parse


class Style(NamedTuple):
    """One cell format: font, fill, border, number format, alignment."""

    font: str = "plain"
    fill: str = ""
    border: str = ""
    number: str = ""
    across: str = ""
    wrap: bool = False


_DIFFERENCE: Final = "0.0E+00"
STYLES: Final[dict[str, Style]] = {
    "text": Style(),
    "wrapped": Style(wrap=True),
    "title": Style(font="title"),
    "note": Style(font="note"),
    "block": Style(font="bold", fill="block", border="top"),
    "head": Style(font="bold", fill="head", border="bottom", wrap=True),
    "headmono": Style(font="mono", fill="head", border="bottom", wrap=True),
    "headnote": Style(font="note", fill="head", wrap=True),
    "link": Style(font="link"),
    "mono": Style(font="mono", wrap=True),
    "linked": Style(font="linked", across="right"),
    "linkedtext": Style(font="linked"),
    "number": Style(across="right"),
    "factor": Style(font="note", across="right"),
    "result": Style(font="bold", across="right", border="top"),
    "resulttext": Style(font="bold", border="top", wrap=True),
    "difference": Style(number=_DIFFERENCE, across="right"),
    "verdict": Style(font="bold", across="center"),
}

_FONTS: Final = {
    "plain": "",
    "title": '<b/><sz val="14"/>',
    "bold": "<b/>",
    "note": '<i/><color rgb="FF595959"/>',
    "mono": "",
    "link": '<u/><color rgb="FF0563C1"/>',
    "linked": '<color rgb="FF1F5E2E"/>',
}
_FILLS: Final = {"block": "FFD9E2EF", "head": "FFEDEDED"}
_BORDERS: Final = {"top": ("top", "FF7F7F7F"), "bottom": ("bottom", "FF7F7F7F")}
_DXFS: Final = {"good": ("FF006100", "FFC6EFCE"), "bad": ("FF9C0006", "FFFFC7CE")}
_ORDER: Final = (
    "numFmts",
    "fonts",
    "fills",
    "borders",
    "cellStyleXfs",
    "cellXfs",
    "cellStyles",
    "dxfs",
    "tableStyles",
    "colors",
    "extLst",
)


class Formats(NamedTuple):
    """The changed part, and the numbers of the formats by name."""

    content: bytes
    cells: dict[str, int]
    dxfs: dict[str, int]


def with_formats(content: bytes, part: str, label: str) -> Formats:
    """The styles part with the formats of the checking sheets behind its own."""
    root = parse(content, part, label)
    fonts = {name: _append(root, "fonts", _font(name, extra)) for name, extra in _FONTS.items()}
    fills = {
        name: _append(
            root,
            "fills",
            f'<fill><patternFill patternType="solid"><fgColor rgb="{rgb}"/><bgColor indexed="64"/>'
            "</patternFill></fill>",
        )
        for name, rgb in _FILLS.items()
    }
    borders = {name: _append(root, "borders", _border(*side)) for name, side in _BORDERS.items()}
    numbers = {_DIFFERENCE: _number_format(root, _DIFFERENCE)}
    plain = {name: _append(root, part, xml) for name, part, xml in _PLAIN}
    cells = {}
    for name, style in STYLES.items():
        fill = fills.get(style.fill, plain["fill"])
        border = borders.get(style.border, plain["border"])
        number = numbers.get(style.number, 0)
        align = f' horizontal="{style.across}"' if style.across else ""
        wrap = ' wrapText="1"' if style.wrap else ""
        cells[name] = _append(
            root,
            "cellXfs",
            f'<xf numFmtId="{number}" fontId="{fonts[style.font]}" fillId="{fill}" borderId="{border}" '
            'xfId="0" applyNumberFormat="1" applyFont="1" applyFill="1" applyBorder="1" applyAlignment="1">'
            f'<alignment vertical="top"{align}{wrap}/></xf>',
        )
    dxfs = {
        name: _append(
            root,
            "dxfs",
            f'<dxf><font><color rgb="{ink}"/></font><fill><patternFill><bgColor rgb="{paper}"/>'
            "</patternFill></fill></dxf>",
        )
        for name, (ink, paper) in _DXFS.items()
    }
    return Formats(etree.tostring(root, xml_declaration=True, encoding="UTF-8", standalone=True), cells, dxfs)


# Fill 0 and border 0 are empty by convention, yet not in every file.
_PLAIN: Final = (
    ("fill", "fills", '<fill><patternFill patternType="none"/></fill>'),
    ("border", "borders", "<border><left/><right/><top/><bottom/><diagonal/></border>"),
)


def _font(name: str, extra: str) -> str:
    face = "Consolas" if name == "mono" else "Calibri"
    size = "" if "<sz" in extra else '<sz val="9"/>' if name == "mono" else '<sz val="10"/>'
    return f'<font>{extra}{size}<name val="{face}"/><family val="2"/></font>'


def _border(side: str, rgb: str) -> str:
    drawn = f'<{side} style="thin"><color rgb="{rgb}"/></{side}>'
    sides = "".join(drawn if s == side else f"<{s}/>" for s in ("left", "right", "top", "bottom"))
    return f"<border>{sides}<diagonal/></border>"


def _section(root: etree._Element, name: str) -> etree._Element:
    found = root.find(f"{{{MAIN}}}{name}")
    if found is not None:
        return found
    section = etree.Element(f"{{{MAIN}}}{name}")
    later = {f"{{{MAIN}}}{n}" for n in _ORDER[_ORDER.index(name) + 1 :]}
    at = next((i for i, child in enumerate(root) if child.tag in later), len(root))
    root.insert(at, section)
    return section


def _append(root: etree._Element, name: str, xml: str) -> int:
    """Add an entry to a section; give its number."""
    section = _section(root, name)
    entry = etree.fromstring(f'<x xmlns="{MAIN}">{xml}</x>')[0]
    number = sum(1 for child in section if isinstance(child.tag, str))
    section.append(copy.deepcopy(entry))
    section.set("count", str(number + 1))
    return number


def _number_format(root: etree._Element, code: str) -> int:
    section = _section(root, "numFmts")
    used = [int(child.get("numFmtId", "0")) for child in section if isinstance(child.tag, str)]
    number = max([200, *used]) + 1
    entry = etree.SubElement(section, f"{{{MAIN}}}numFmt")
    entry.set("numFmtId", str(number))
    entry.set("formatCode", code)
    section.set("count", str(len(used) + 1))
    return number
