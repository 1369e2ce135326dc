"""What a file is when it is not the zip of an .xlsx or .xlsm workbook."""

from __future__ import annotations

import struct
from pathlib import Path

from .refusals import Refusal

OLE_MAGIC = bytes.fromhex("d0cf11e0a1b11ae1")
SAVE_AS = "Open it in the spreadsheet program, save it as .xlsx or .xlsm, and use that file."


def ole_has(raw: bytes, name: str) -> bool:
    """Whether a compound file has a storage or stream of that name.

    Directory entries are 128 bytes long on a 128 byte grid; the name comes first, in
    UTF-16, and its length in bytes with the closing zero follows at byte 64.
    """
    needle = name.encode("utf-16-le") + b"\0\0"
    at = raw.find(needle)
    while at >= 0:
        length = raw[at + 64 : at + 66]
        if at % 128 == 0 and len(length) == 2 and struct.unpack("<H", length)[0] == len(needle):
            return True
        at = raw.find(needle, at + 1)
    return False


def refuse_other_formats(raw: bytes, path: Path) -> None:
    """Raise :class:`Refusal` for content that is no zip file, named for what it is."""
    name = path.name
    renamed = (
        f", although its name ends in {path.suffix}" if path.suffix.lower() in (".xlsx", ".xlsm") else ""
    )
    if not raw:
        raise Refusal(f"{name} is empty (0 bytes), so there is no workbook in it. Use a backup.")
    if raw.startswith(OLE_MAGIC):
        if ole_has(raw, "EncryptedPackage"):
            raise Refusal(
                f"{name} is encrypted with a password or a rights policy, so it cannot be read. "
                "Remove the password in the spreadsheet program, save it and use that file."
            )
        if ole_has(raw, "Workbook") or ole_has(raw, "Book"):
            raise Refusal(f"{name} is in the old binary format .xls{renamed}. {SAVE_AS}")
        raise Refusal(f"{name} is an old binary document without a workbook{renamed}. {SAVE_AS}")
    if raw.startswith(b"PK"):
        return
    head = raw[:2048].lstrip(b"\xef\xbb\xbf \t\r\n").lower()
    if raw[:2] in (b"\x09\x00", b"\x09\x02", b"\x09\x04", b"\x09\x08"):
        raise Refusal(f"{name} is in the old binary format .xls{renamed}. {SAVE_AS}")
    if head.startswith((b"<!doctype html", b"<html")):
        raise Refusal(f"{name} is a web page (HTML){renamed}. {SAVE_AS}")
    if head.startswith(b"<"):
        raise Refusal(f"{name} is an XML document, not a workbook package{renamed}. {SAVE_AS}")
    raise Refusal(
        f"{name} is not a workbook, or it is damaged from its first byte on: an .xlsx or .xlsm file is a zip "
        f"package, and this one is not. {SAVE_AS}"
    )
