"""A small workbook with every kind of cell that the checking sheets must follow."""

from __future__ import annotations

from pathlib import Path

import openpyxl
from openpyxl.workbook.defined_name import DefinedName
from openpyxl.worksheet.formula import ArrayFormula

from thrustbook.addin.hosts.headless.evaluate import evaluate_workbook
from thrustbook.addin.xlsx.package import Package

SHEET = "Calc's sheet"
UNITS = (("set", "metric"), ("pressure", "bar"), ("flow", "m³/h"), ("force", "kN"), ("diameter", "mm"))


def make(path: Path) -> Path:
    """Write the workbook, with values."""
    book = openpyxl.Workbook()
    sheet = book.active
    sheet.title = SHEET
    units = book.create_sheet("Units")
    for pair in UNITS:
        units.append(pair)
    book.defined_names["Units"] = DefinedName("Units", attr_text="Units!$A$1:$B$5")
    book.defined_names["rho"] = DefinedName("rho", attr_text="'Calc''s sheet'!$B$1")
    sheet["A1"], sheet["B1"] = "rho", 1000
    for col, head in enumerate(("D1", "p1", "Q", "theta", "D2", "K", "Fx", "Fy", "sum", "V"), 1):
        sheet.cell(3, col, head)
    for row in range(4, 10):
        given = [300, 5, 400 + 10 * row, 90 if row % 2 else 45, None if row % 2 else 250, 0.2]
        for col, value in enumerate(given, 1):
            sheet.cell(row, col, value)
        rest = f"Units,rho,A{row},B{row},C{row},D{row},E{row},F{row}"
        sheet.cell(row, 7, f"=TB_BEND(G$3,{rest})")
        sheet.cell(row, 8, f'=TB_BEND("Fy",{rest})')
        sheet.cell(row, 9, f'=ABS(H{row})+TB_BEND("F",{rest})*2')
        sheet.cell(row, 10, f'=TB_VELOCITY(Units,TB_FLOW("SI",2,"300 mm")*3600,A{row})')
    sheet["A5"] = "300 mm"
    sheet["B6"] = "4.8 bar(g)"
    sheet["L3"] = '=TB_BEND("labels",Units)'
    sheet["L4"] = ArrayFormula("L4:L9", "=TB_AREA(Units,A4:A9)")
    sheet["M4"] = ArrayFormula("M4:O9", '=TB_REDUCER("Fx,p2,V1",Units,rho,A4:A9,200,B4:B9,C4:C9)')
    sheet["P4"] = "=SUM(TB_AREA(Units,A4:A9))"
    sheet["Q4"] = '=TB_CONVERT(B4,"bar","psi")'
    sheet["R4"] = '=TB_WHY("TB_AREA",,-5)'
    sheet["S4"] = ArrayFormula("S4:AB4", '=TB_BEND("all",Units,rho,A4,B4,C4,D4)')
    sheet["AC4"] = '=TB_FRICTION("f",,1E5,,"haaland",0.0001,0.3)'
    sheet["AD4"] = '=TB_PRESSURE("p2",,1000,0.3,0.2,"5 bar",0.1)'
    sheet["AE4"] = '=TB_CAVITATION("pabs","metric","150 kPa(a)",2)'
    book.save(path)
    package = Package.read(path)
    package.save(path, evaluate_workbook(package, fill_native=True).replaced)
    return path
