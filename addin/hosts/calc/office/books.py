"""Documents of the office: formulas bound to our functions after loading, plain names after saving.

Some releases of the office read TB_X( in an .xlsx as an unknown name, and write its
full programmatic name when saving. What is met decides, not the number of a release.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Iterator
from typing import Any

from .settings import FUNCTIONS

FULL = FUNCTIONS.upper() + "."
FORMULA = 16
"""com.sun.star.sheet.CellFlags.FORMULA"""

# A call of ours by a name that the office did not recognise, with the place that another
# program may have put before it: [1]!TB_BEND(, 'C:\\addins\\thrustbook.xlam'!TB_BEND(, _xll.TB_BEND(.
_PLACE = r"(?:\[\d+\]|'(?:[^']|'')+'|[\w.]+\.xlam?)[!\s]\s*"
_CALL = re.compile(
    r"(?<![\w.\"])(?:" + _PLACE + "(?:" + re.escape(FULL) + r")?|(?:_xll\.)?)(?P<name>TB_[A-Z][A-Z0-9_]*\()",
    re.IGNORECASE,
)
_TEXTS = re.compile(r'("[^"]*")')


def plain(formula: str) -> str:
    """Write a formula, as the office gives it, for entering anew; "" where it has no need of that."""
    if "TB_" not in formula.upper():
        return ""
    pieces = _TEXTS.split(formula)
    found = 0
    for i in range(0, len(pieces), 2):
        pieces[i], count = _CALL.subn(lambda match: match.group("name").upper(), pieces[i])
        found += count
    return "".join(pieces) if found else ""


def relink(document: Any) -> int:
    """Bind the TB_ formulas of a spreadsheet that the office did not recognise; gives their number."""
    sheets = document.getSheets()
    found = [
        (sheet, list(_unbound_areas(sheet))) for sheet in map(sheets.getByIndex, range(sheets.getCount()))
    ]
    names = _unbound_names(document)
    if not names and not any(areas for _, areas in found):
        return 0
    modified = document.isModified()
    undo = document.getUndoManager()
    document.lockControllers()
    undo.lock()
    automatic = document.isAutomaticCalculationEnabled()
    document.enableAutomaticCalculation(False)
    count = 0
    try:
        for name, content in names:
            name.setContent(content)
            count += 1
        for sheet, areas in found:
            for area in areas:
                count += _bind(sheet, area)
    finally:
        document.enableAutomaticCalculation(automatic)
        undo.unlock()
        document.unlockControllers()
    if automatic:
        document.calculate()
    if not modified:
        document.setModified(False)
    return count


def _unbound_names(document: Any) -> list[tuple[Any, str]]:
    found = []
    names = document.NamedRanges
    for word in names.getElementNames():
        name = names.getByName(word)
        content = plain(name.getContent())
        if content:
            found.append((name, content))
    return found


def _unbound_areas(sheet: Any) -> Iterator[tuple[Any, Any]]:
    """Give the formula areas of a sheet that hold an unbound call, with their formulas."""
    areas = sheet.queryContentCells(FORMULA)
    for index in range(areas.getCount()):
        area = areas.getByIndex(index)
        formulas = area.getFormulaArray()
        if any(plain(text) for line in formulas for text in line):
            yield area, formulas


def _bind(sheet: Any, found: tuple[Any, Any]) -> int:
    area, formulas = found
    arrays = any(text.startswith("{") for line in formulas for text in line)
    # A whole area at once is quick; a protected sheet takes only cell by cell.
    if not arrays and not sheet.isProtected():
        new = tuple(tuple(plain(text) or text for text in line) for line in formulas)
        area.setFormulaArray(new)
        return sum(bool(plain(text)) for line in formulas for text in line)
    count = 0
    place = area.getRangeAddress()
    done: set[tuple[int, int]] = set()
    for i, line in enumerate(formulas):
        for j, text in enumerate(line):
            row, column = place.StartRow + i, place.StartColumn + j
            new_text = plain(text)
            if not new_text or (row, column) in done:
                continue
            count += 1
            cell = sheet.getCellByPosition(column, row)
            if not text.startswith("{"):
                cell.setFormula(new_text)
                continue
            cursor = sheet.createCursorByRange(cell)
            cursor.collapseToCurrentArray()
            inside = cursor.getRangeAddress()
            done.update(
                (r, c)
                for r in range(inside.StartRow, inside.EndRow + 1)
                for c in range(inside.StartColumn, inside.EndColumn + 1)
            )
            cursor.setArrayFormula(new_text[1:-1])
    return count


def is_spreadsheet(document: Any) -> bool:
    """Tell whether a component of the office is a spreadsheet document."""
    try:
        return document is not None and document.supportsService("com.sun.star.sheet.SpreadsheetDocument")
    except Exception:
        return False


LOADED = ("OnLoadFinished",)
SAVED = ("OnSaveDone", "OnSaveAsDone")


def _native(document: Any) -> bool:
    """Tell whether a document was read from the office's own format, which keeps the bound names."""
    return any(entry.Name == "FilterName" and "calc8" in str(entry.Value) for entry in document.getArgs())


def after_event(
    name: str, document: Any, system_path: Callable[[str], str], write_plain: Callable[[str], str]
) -> str:
    """Do what is due after an event of a document; gives "" or what went wrong."""
    if (name not in LOADED and name not in SAVED) or not is_spreadsheet(document):
        return ""
    if name in LOADED:
        if not _native(document):
            relink(document)
        return ""
    url = document.getURL()
    if not url.startswith("file:") or not url.lower().endswith((".xlsx", ".xlsm")):
        return ""
    path = system_path(url)
    if not holds_full_names(path):
        return ""
    return write_plain(path)


def holds_full_names(path: str) -> bool:
    """Tell whether a saved .xlsx holds a full programmatic name of ours."""
    import zipfile

    needle = FULL.encode("ascii")
    try:
        with zipfile.ZipFile(path) as archive:
            for entry in archive.infolist():
                sheet = entry.filename.startswith("xl/") and entry.filename.endswith(".xml")
                if sheet and needle in archive.read(entry).upper():
                    return True
    except (OSError, zipfile.BadZipFile):
        return False
    return False
