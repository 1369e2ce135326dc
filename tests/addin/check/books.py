"""A small workbook without a fault, and the ways to put one fault into it. All figures are invented."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from pathlib import Path

from openpyxl import Workbook
from openpyxl.workbook.defined_name import DefinedName
from openpyxl.worksheet.formula import ArrayFormula
from openpyxl.worksheet.worksheet import Worksheet

from thrustbook.addin.check.run import find
from thrustbook.addin.check.types import Finding
from thrustbook.addin.hosts.headless.evaluate import evaluate_workbook
from thrustbook.addin.xlsx.package import Package
from thrustbook.addin.xlsx.sheetxml import Scalar, store

FIRST, LAST = 5, 10
"""Rows of the table of bends."""

Change = Callable[[Workbook], None]
Values = Mapping[str, Mapping[tuple[int, int], Scalar]]


def clean_book() -> Workbook:
    """Inputs, a table of bends, a balance and a run with its load cases."""
    book = Workbook()
    inputs = book.active
    assert isinstance(inputs, Worksheet)
    inputs.title = "Inputs"
    rows = (
        ("Inputs (invented)", "value", "unit"),
        ("density", 998.0, "kg/m3"),
        ("test pressure", 900.0, "kPa"),
        (None, None, None),
        ("role", "unit", None),
        ("set", "metric", None),
        ("force", "kN", None),
    )
    for row in rows:
        inputs.append(row)
    book.defined_names["Units"] = DefinedName("Units", attr_text="Inputs!$A$5:$B$7")
    book.defined_names["rho"] = DefinedName("rho", attr_text="Inputs!$B$2")
    _bends(book.create_sheet("Bends"))
    _balance(book.create_sheet("Balance"))
    _run(book.create_sheet("Run"))
    return book


def _bends(ws: Worksheet) -> None:
    ws["A1"] = "Bends along the main"
    heads = ("name", "D1 [mm]", "p1 [kPa]", "Q [L/s]", "theta [deg]", "V [m/s]", "Fx [kN]", "Fy [kN]")
    for col, text in enumerate((*heads, "design Fx [kN]"), 1):
        ws.cell(4, col, text)
    for i, row in enumerate(range(FIRST, LAST + 1)):
        for col, value in enumerate((f"B{i + 1}", 300.0 + 50 * i, 400.0 - 10 * i, 100.0, 30.0 + 10 * i), 1):
            ws.cell(row, col, value)
        ws.cell(row, 6, f"=TB_VELOCITY(Units,D{row},B{row})")
        for col, name in ((7, "Fx"), (8, "Fy")):
            ws.cell(row, col, f'=TB_BEND("{name}",Units,rho,B{row},C{row},D{row},E{row})')
        ws.cell(row, 9, f"=1.5*G{row}")
    ws.cell(LAST + 1, 1, "sum")
    ws.cell(LAST + 1, 9, f"=SUM(I{FIRST}:I{LAST})")
    ws["A14"] = "cap, under test"
    ws["B14"] = '=TB_CLOSED("F",Units,B5,Inputs!B3)'
    ws["C14"] = "kN"


def _balance(ws: Worksheet) -> None:
    for row in (
        ("Balance of a wye",),
        ("nx", "ny", "nz", "D", "p", "Q"),
        (None, None, None, "mm", "kPa", "L/s"),
        (-1.0, 0.0, 0.0, 400.0, 300.0, -200.0),
        (1.0, 0.0, 0.0, 300.0, 300.0, 120.0),
        (0.0, 1.0, 0.0, 250.0, 300.0, 80.0),
    ):
        ws.append(row)
    ws["A8"], ws["C8"] = "thrust along x", "kN"
    ws["B8"] = '=TB_BALANCE("Fx",Units,rho,A2:F3,A4:F6)'


def _run(ws: Worksheet) -> None:
    for row in (
        ("Run (invented)",),
        ("rho", "=rho", "kg/m3"),
        ("mu", 1.0, "mPa s"),
        ("Q", 100.0, "L/s"),
        ("p", 500.0, "kPa"),
        (None,),
        ("name", "x", "y", "z", "D [mm]", "e [mm]"),
        ("N1", 0.0, 0.0, 10.0, 300.0, 0.1),
        ("N2", 50.0, 0.0, 10.0, 300.0, 0.1),
        ("N3", 50.0, 60.0, 12.0, 300.0, 0.1),
        ("N4", 90.0, 60.0, 12.0, 300.0, None),
        (None,),
        ("case", "kind", "p", "dp"),
        ("duty", "operating", 500.0, None),
        ("test", "test", 900.0, None),
        ("pump trip", "surge", None, 200.0),
    ):
        ws.append(row)
    ws["I6"] = ArrayFormula("I6:M6", '=TB_RUN("labels: name, V2, p2, F, note",Units)')
    ws["I7"] = ArrayFormula("I7:M7", '=TB_RUN("units: name, V2, p2, F, note",Units)')
    ws["I8"] = ArrayFormula("I8:M11", '=TB_RUN("name, V2, p2, F, note",Units,A2:C5,A7:F7,A8:F11)')
    ws["O7"] = "governing F [kN]"
    ws["O8"] = ArrayFormula("O8:O11", '=TB_RUNCASES("F",Units,A2:C5,A7:F7,A8:F11,A13:D16)')
    ws["A18"] = "closure"
    ws["B18"] = '=TB_RUN("closure",Units,A2:C5,A7:F7,A8:F11)'


def stored(book: Workbook, path: Path, before: Values | None = None, after: Values | None = None) -> Path:
    """Save a workbook with its values: some put in before the evaluation, some after it."""
    book.save(path)
    if before:
        _put(path, before)
    package = Package.read(path)
    package.save(path, evaluate_workbook(package, fill_native=True).replaced)
    if after:
        _put(path, after)
    return path


def _put(path: Path, values: Values) -> None:
    package = Package.read(path)
    parts = {sheet.name: sheet.part for sheet in package.sheets}
    package.save(
        path, {parts[name]: store(package.part(parts[name]), cells) for name, cells in values.items()}
    )


def findings(path: Path) -> list[Finding]:
    """What the check finds."""
    return find(Package.read(path))[1]
