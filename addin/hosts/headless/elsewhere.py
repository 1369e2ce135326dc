"""TB_ formulas outside cells: conditional formats and validations, which are not evaluated."""

from __future__ import annotations

import re
from collections.abc import Iterator

from lxml import etree

from .formulas import Unreadable, calls, take_apart

_BLOCK = re.compile(
    rb"<(?P<tag>(?:[\w.-]+:)?(?:conditionalFormatting|dataValidation))[\s>].*?</(?P=tag)>", re.DOTALL
)
_FORMULA_TAGS = frozenset(("formula", "formula1", "formula2", "f"))


def elsewhere(xml: bytes) -> Iterator[tuple[str, str]]:
    """(cells, formula) for each conditional format or validation of a sheet that calls a TB_ function."""
    if b"tb_" not in xml.lower():
        return
    namespaces = dict(re.findall(rb'xmlns:([\w.-]+)="([^"]*)"', xml))
    declared = b"".join(b' xmlns:%s="%s"' % pair for pair in namespaces.items())
    parser = etree.XMLParser(resolve_entities=False, no_network=True, recover=True)
    for match in _BLOCK.finditer(xml):
        block = match[0]
        if b"tb_" not in block.lower():
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
                if text and calls(take_apart(text)):
                    yield where, text
            except Unreadable:
                continue
