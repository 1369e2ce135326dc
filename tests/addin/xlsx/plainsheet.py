"""A worksheet part with nothing but its rows."""

from __future__ import annotations

MAIN = "http://schemas.openxmlformats.org/spreadsheetml/2006/main"


def sheet(rows: str, before: str = "") -> bytes:
    """The part; ``before`` stands in front of the rows."""
    return f'<worksheet xmlns="{MAIN}">{before}<sheetData>{rows}</sheetData></worksheet>'.encode()


def rows_of(xml: bytes) -> str:
    """The rows of such a part."""
    return xml.decode().split("<sheetData>")[1].split("</sheetData>")[0]
