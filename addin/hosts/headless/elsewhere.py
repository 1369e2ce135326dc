"""TB_ formulas outside cells: conditional formats and validations, which are not evaluated."""

from __future__ import annotations

import re
from collections.abc import Iterator

from lxml import etree

from .formulas import Kind, Unreadable, calls, take_apart
from .names import Names

_BLOCK = re.compile(
    rb"<(?P<tag>(?:[\w.-]+:)?(?:conditionalFormatting|dataValidation))[\s>].*?</(?P=tag)>", re.DOTALL
)
_FORMULA_TAGS = frozenset(("formula", "formula1", "formula2", "f"))


def elsewhere(xml: bytes, names: Names | None = None, sheet: str = "") -> Iterator[tuple[str, str]]:
    """(cells, formula) for each conditional format or validation of a sheet that calls a TB_ function.

    With the ``names`` of the workbook also those that call one through a defined name.
    """
    marks = [b"tb_", *(name.lower().encode() for name in (names.that_call() if names else ()))]
    if not _holds(xml, marks):
        return
    namespaces = dict(re.findall(rb'xmlns:([\w.-]+)="([^"]*)"', xml))
    declared = b"".join(b' xmlns:%s="%s"' % pair for pair in namespaces.items())
    parser = etree.XMLParser(resolve_entities=False, no_network=True, recover=True)
    for match in _BLOCK.finditer(xml):
        block = match[0]
        if not _holds(block, marks):
            continue
        root = etree.fromstring(b"<r" + declared + b">" + block + b"</r>", parser)
        if root is None or not len(root):
            continue
        node = root[0]
        where = node.get("sqref") or ""
        for child in node.iter():
            if isinstance(child.tag, str) and etree.QName(child).localname == "sqref" and child.text:
                where = child.text
        for child in node.iter():
            if not isinstance(child.tag, str) or etree.QName(child).localname not in _FORMULA_TAGS:
                continue
            text = (child.text or "").strip()
            try:
                if text and _calls(text, names, sheet):
                    yield where, text
            except Unreadable:
                continue


def _holds(xml: bytes, marks: list[bytes]) -> bool:
    lowered = xml.lower()
    return any(mark in lowered for mark in marks)


def _calls(text: str, names: Names | None, sheet: str) -> bool:
    parts = take_apart(text)
    if calls(parts):
        return True
    found = (names.find(part.text, sheet) for part in parts if names and part.kind is Kind.REFERENCE)
    return any(name is not None and names is not None and names.calling(name) for name in found)
