"""Evaluation of a workbook in an office started for that alone.

The request is a JSON file: the workbook to load, the areas to read, the file for the
answer, and copies to store. The answer is JSON too: a list of rows for each area, an
error as {"error": number}.
"""

from __future__ import annotations

import json
import os
import traceback
from typing import Any, Dict, List
from urllib.parse import unquote

from . import books

_NEVER = 0  # MacroExecutionMode.NEVER_EXECUTE, and UpdateDocMode.NO_UPDATE
_SMALL = 64
_REPLACE = {"xlsx": "Calc MS Excel 2007 XML", "ods": "calc8", "pdf": "calc_pdf_Export"}


def desktop(context: Any) -> Any:
    """Give the office's desktop."""
    return context.ServiceManager.createInstanceWithContext("com.sun.star.frame.Desktop", context)


def run(context: Any, path: str) -> None:
    """Answer the request in a file, its path percent-encoded, and end the office."""
    import uno

    office = desktop(context)
    try:
        with open(unquote(path), encoding="utf-8") as file:
            request = json.load(file)
        try:
            answer = evaluate(office, request, uno.systemPathToFileUrl)
        except Exception:
            answer = {"trouble": traceback.format_exc()}
        beside = request["answer"] + ".part"
        with open(beside, "w", encoding="utf-8") as file:
            json.dump(answer, file)
        os.replace(beside, request["answer"])
    finally:
        _end_soon(context, office)


def _end_soon(context: Any, office: Any) -> None:
    """End the office once it is back at its own loop; from inside a request it would refuse."""
    import unohelper
    from com.sun.star.awt import XCallback

    class End(unohelper.Base, XCallback):  # type: ignore[misc]
        def notify(self, _data: Any) -> None:
            office.terminate()

    later = context.ServiceManager.createInstanceWithContext("com.sun.star.awt.AsyncCallback", context)
    later.addCallback(End(), None)


def evaluate(office: Any, request: Dict[str, Any], to_url: Any) -> Dict[str, Any]:
    """Load, bind, recalculate, read."""
    document = load(office, to_url(request["book"]))
    if document is None:
        return {"trouble": "the office could not load the workbook"}
    try:
        linked = books.relink(document)
        document.calculateAll()
        sheets = document.getSheets()
        areas = [read_area(sheets.getByName(a[0]), *a[1:]) for a in request["areas"]]
        for target in request.get("copies", ()):
            store(document, to_url(target), target.rsplit(".", 1)[-1].lower())
        return {"linked": linked, "areas": areas}
    finally:
        document.close(True)


def load(office: Any, url: str, hidden: bool = True) -> Any:
    """Load a workbook without its macros and without following its links."""
    return office.loadComponentFromURL(
        url,
        "_blank",
        0,
        (_property("Hidden", hidden), _property("MacroExecutionMode", _NEVER), _property("UpdateDocMode", _NEVER)),
    )


def store(document: Any, url: str, kind: str) -> None:
    """Store a copy; the kind is the ending of its name."""
    document.storeToURL(url, (_property("FilterName", _REPLACE[kind]),))


def _property(name: str, value: Any) -> Any:
    import uno

    made = uno.createUnoStruct("com.sun.star.beans.PropertyValue")
    made.Name, made.Value = name, value
    return made


def read_area(sheet: Any, row1: int, column1: int, row2: int, column2: int) -> List[List[Any]]:
    """Read the values of an area, given by its rows and columns from 1 on."""
    area = sheet.getCellRangeByPosition(column1 - 1, row1 - 1, column2 - 1, row2 - 1)
    rows = [list(line) for line in area.getDataArray()]
    small = len(rows) * len(rows[0]) <= _SMALL
    for i, line in enumerate(rows):
        for j, value in enumerate(line):
            if value is None:
                line[j] = {"error": area.getCellByPosition(j, i).getError()}
            elif small and (value == 1.0 or value == 0.0):
                shown = area.getCellByPosition(j, i).getString()
                if shown in ("TRUE", "FALSE"):
                    line[j] = shown == "TRUE"
    return rows
