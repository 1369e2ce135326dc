"""Evaluation of a workbook in an office started for that alone.

The request is a JSON file: the workbook to load, the formulas to read, the file for
the answer, and copies to store. The answer is JSON too: for each formula its rows of
values, an error as {"error": number, "why": text}.
"""

from __future__ import annotations

import json
import os
import traceback
from typing import Any
from urllib.parse import unquote

from . import books

_NEVER = 0  # MacroExecutionMode.NEVER_EXECUTE, and UpdateDocMode.NO_UPDATE
SMALL = 64
"""Cells of an area that are looked at for TRUE and FALSE, which the office shows but does not tell."""
MOST_REASONS = 200
SCRATCH = (1000, 0)
"""Column and row of a cell beside everything that people write."""
OF_CELLS = 1 | 2 | 4 | 16
"""com.sun.star.sheet.CellFlags: VALUE, DATETIME, STRING, FORMULA"""
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

    class End(unohelper.Base, XCallback):
        def notify(self, _data: Any) -> None:
            office.terminate()

    later = context.ServiceManager.createInstanceWithContext("com.sun.star.awt.AsyncCallback", context)
    later.addCallback(End(), None)


def evaluate(office: Any, request: dict[str, Any], to_url: Any) -> dict[str, Any]:
    """Load, bind, recalculate, read."""
    document = load(office, to_url(request["book"]))
    if document is None:
        return {"trouble": "the office could not load the workbook"}
    try:
        linked = books.relink(document)
        document.calculateAll()
        sheets = document.getSheets()
        wanted = [Formula(sheets.getByName(f["sheet"]), f) for f in request["formulas"]]
        spilling = [formula for formula in wanted if formula.spills]
        for formula in spilling:
            formula.fit()
        if spilling:
            document.calculateAll()
        answers = [formula.read() for formula in wanted]
        left = MOST_REASONS
        for formula, rows in zip(wanted, answers):
            left -= formula.explain(rows) if left > 0 else 0
        for target in request.get("copies", ()):
            store(document, to_url(target), target.rsplit(".", 1)[-1].lower())
        return {"linked": linked, "formulas": answers}
    finally:
        document.close(True)


def load(office: Any, url: str, hidden: bool = True) -> Any:
    """Load a workbook without its macros and without following its links."""
    return office.loadComponentFromURL(
        url,
        "_blank",
        0,
        (
            _property("Hidden", hidden),
            _property("MacroExecutionMode", _NEVER),
            _property("UpdateDocMode", _NEVER),
        ),
    )


def store(document: Any, url: str, kind: str) -> None:
    """Store a copy; the kind is the ending of its name."""
    document.storeToURL(url, (_property("FilterName", _REPLACE[kind]),))


def _property(name: str, value: Any) -> Any:
    import uno

    made = uno.createUnoStruct("com.sun.star.beans.PropertyValue")
    made.Name, made.Value = name, value
    return made


class Formula:
    """One formula of the request: its sheet, and the area that it fills."""

    def __init__(self, sheet: Any, wanted: dict[str, Any]) -> None:
        self.sheet = sheet
        self.row, self.column, self.row2, self.column2 = (n - 1 for n in wanted["area"])
        self.spills = wanted.get("spills", False)
        self.call = wanted.get("call", "")
        self.blocked = ""

    def _area(self) -> Any:
        return self.sheet.getCellRangeByPosition(self.column, self.row, self.column2, self.row2)

    def _expression(self) -> str:
        text = self.sheet.getCellByPosition(self.column, self.row).getFormula()
        return text.strip("{}")[1:]

    def _try(self, formula: str) -> Any:
        """Give the cell in which a formula was tried; the caller clears it."""
        cell = self.sheet.getCellByPosition(*SCRATCH)
        cell.setFormula("=" + formula)
        return cell

    def fit(self) -> None:
        """Give an array formula that spills the extent of its result, where the cells for it are free."""
        expression = self._expression()
        size = []
        for count in ("ROWS", "COLUMNS"):
            cell = self._try(f"SUMPRODUCT({count}({expression}))")
            size.append(0 if cell.getError() else int(cell.getValue()))
            cell.setFormula("")
        if 0 in size or size == [self.row2 - self.row + 1, self.column2 - self.column + 1]:
            return
        old = self._area()
        row2, column2 = self.row + size[0] - 1, self.column + size[1] - 1
        old.clearContents(OF_CELLS)
        new = self.sheet.getCellRangeByPosition(self.column, self.row, column2, row2)
        taken = new.queryContentCells(OF_CELLS)
        if taken.getCount():
            self.blocked = taken.getByIndex(0).getCellByPosition(0, 0).AbsoluteName
            # What refers to the formula must fail with it.
            self.sheet.getCellByPosition(self.column, self.row).setFormula("=#VALUE!")
            return
        new.setArrayFormula("=" + expression)
        self.row2, self.column2 = row2, column2

    def read(self) -> Any:
        """Read the values of the area."""
        if self.blocked:
            return {"blocked": self.blocked}
        area = self._area()
        rows = [list(line) for line in area.getDataArray()]
        small = len(rows) * len(rows[0]) <= SMALL
        for i, line in enumerate(rows):
            for j, value in enumerate(line):
                if value is None:
                    line[j] = {"error": area.getCellByPosition(j, i).getError()}
                elif small and (value == 1.0 or value == 0.0):
                    shown = area.getCellByPosition(j, i).getString()
                    if shown in ("TRUE", "FALSE"):
                        line[j] = shown == "TRUE"
        return rows

    def explain(self, rows: Any) -> int:
        """Add the reason to a failed call that is the whole formula; gives how many were added."""
        first = rows[0][0] if isinstance(rows, list) else None
        if not self.call or not isinstance(first, dict):
            return 0
        inside = self._expression().strip()
        inside = inside[inside.index("(") + 1 : inside.rindex(")")]
        more = ";" + inside if inside.strip() else ""
        cell = self._try(f'TB_WHY("{self.call}"{more})')
        if not cell.getError():
            first["why"] = cell.getString()
        cell.setFormula("")
        return 1
