"""Text of cells and formulas to and from the bytes of a sheet part."""

from __future__ import annotations

import re

from .refusals import Refusal

_ENTITY = re.compile(r"&(#[0-9]+|#[xX][0-9A-Fa-f]+|[A-Za-z]+);")
_ENTITIES = {"amp": "&", "lt": "<", "gt": ">", "quot": '"', "apos": "'"}
_ESCAPED = re.compile(r"_x([0-9A-Fa-f]{4})_")
_LOOKS_ESCAPED = re.compile(r"_(?=x[0-9A-Fa-f]{4}_)")
# What XML 1.0 cannot hold, and the carriage return, which a reader would turn into a line feed.
_NOT_XML = re.compile("[\x00-\x08\x0b-\x1f\ud800-\udfff\ufffe\uffff]")
_SPECIAL = re.compile("[&<>_\x00-\x08\x0b-\x1f\ud800-\udfff\ufffe\uffff]")


def unescape_xstring(text: str) -> str:
    """``_x000D_`` and the like, by which a workbook writes what XML cannot hold."""
    if "_x" not in text:
        return text
    plain = _ESCAPED.sub(lambda m: chr(int(m[1], 16)), text)
    if any("\ud800" <= char <= "\udfff" for char in plain):
        plain = plain.encode("utf-16", "surrogatepass").decode("utf-16", "replace")
    return plain


def escape(text: str) -> str:
    """Text for the content of an element, with both kinds of escapes."""
    if _SPECIAL.search(text) is None:
        return text
    text = _LOOKS_ESCAPED.sub("_x005F_", text)
    text = _NOT_XML.sub(lambda m: f"_x{ord(m[0]):04X}_", text)
    return text.replace("&", "&amp;").replace("<", "&lt;").replace(">", "&gt;")


def _entity(match: re.Match[str]) -> str:
    name = match[1]
    try:
        if name[0] == "#":
            return chr(int(name[2:], 16) if name[1] in "xX" else int(name[1:]))
        return _ENTITIES[name]
    except (KeyError, ValueError, OverflowError):
        raise Refusal(
            f"A sheet of this workbook uses the entity &{name};, which a workbook may not define. "
            "Open it in the spreadsheet program and save it again."
        ) from None


def unescape(raw: bytes) -> str:
    """Text of an element's content: XML entities, line ends, then ``_xHHHH_``."""
    try:
        text = raw.decode()
    except UnicodeDecodeError as error:
        raise Refusal(
            "A sheet of this workbook holds text that is not UTF-8. "
            "Open it in the spreadsheet program and save it again."
        ) from error
    if "\r" in text:
        text = text.replace("\r\n", "\n").replace("\r", "\n")
    if "&" in text:
        text = _ENTITY.sub(_entity, text)
    return unescape_xstring(text)
