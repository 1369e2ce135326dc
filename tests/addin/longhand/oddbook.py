"""A workbook of formulas as people come to write them: arrays around calls, arguments computed on the way."""

from __future__ import annotations

from pathlib import Path
from typing import NamedTuple

import openpyxl
from openpyxl.packaging.relationship import Relationship
from openpyxl.workbook.defined_name import DefinedName
from openpyxl.workbook.external_link.external import (
    ExternalBook,
    ExternalCell,
    ExternalLink,
    ExternalRow,
    ExternalSheetData,
    ExternalSheetDataSet,
    ExternalSheetNames,
)
from openpyxl.worksheet.formula import ArrayFormula

from thrustbook.addin.hosts.headless.evaluate import evaluate_workbook
from thrustbook.addin.xlsx.a1 import to_a1
from thrustbook.addin.xlsx.package import Package

SHEET = "S"
COLUMN = 8
FIRST = 20
TALL = 5
"""Rows from one formula to the next."""


class Odd(NamedTuple):
    """A formula; with a size it is an array formula over so many rows and columns."""

    text: str
    size: tuple[int, int] | None = None


BEND = "1000,0.3,200000,0.2,90"
FORMULAS = (
    # Formulas around calls
    Odd('TB_AREA("SI",A1:A3)*2', (3, 1)),
    Odd('TRANSPOSE(TB_AREA("SI",A1:A3))', (1, 3)),
    Odd('TB_AREA("SI",A1:A3)*B1:B3', (3, 1)),
    Odd('TB_AREA("SI",A1:A3)*TRANSPOSE(B1:B3)', (3, 3)),
    Odd('SUM(TB_AREA("SI",A1:A3)*B1:B3)', (1, 1)),
    Odd('SUM(TB_AREA("SI",A1:A3))'),
    Odd('SUMPRODUCT(TB_AREA("SI",A1:A3),B1:B3)'),
    Odd('INDEX(TB_AREA("SI",A1:A3),2)'),
    Odd('MAX(TB_AREA("SI",A1:A3),0.01)'),
    Odd('TB_AREA("SI",A1:A3)*2'),
    Odd('TB_AREA("SI",A1)*2', (3, 1)),
    Odd('TB_AREA("SI",A1)*B1:B3', (3, 1)),
    Odd('IFERROR(TB_AREA("SI",A1:A3),0)', (3, 1)),
    Odd('IF(B1:B3>1,TB_AREA("SI",A1:A3),-1)', (3, 1)),
    Odd(f'SUM(TB_BEND("Fx,Fy","SI",{BEND}))'),
    Odd(f'SQRT(SUMSQ(TB_BEND("Fx,Fy","SI",{BEND})))'),
    Odd(f'TB_BEND("Fx,Fy","SI",{BEND})/1000', (1, 2)),
    Odd(f'"d="&TB_BEND("units: Fx","SI",{BEND})'),
    Odd('TB_BRANCHFLOW("metric",B1:D3)*-1', (3, 1)),
    Odd('TB_SCHEDULE("Fx","SI",E1:K1,E2:K4)/1000', (3, 1)),
    Odd('TB_AREA("SI",A1:A3)*ROW(A1:A3)', (3, 1)),
    Odd('CHOOSE({1,2},B1:B3,TB_AREA("SI",A1:A3))', (3, 2)),
    Odd('VLOOKUP(B2,IF({1,0},B1:B3,TB_AREA("SI",A1:A3)),2,FALSE)', (1, 1)),
    Odd('TB_AREA("SI",A1)*SUMPRODUCT(ROUND(B1:B3/2,0),A1:A3)'),
    # Units and wanted results computed on the way
    Odd('TB_AREA("S"&"I",A1)'),
    Odd('TB_AREA(E5&"",A1:A3)', (3, 1)),
    Odd(f'TB_BEND("F"&"x","SI",{BEND})'),
    Odd(f'TB_BEND(E6&",Fy",E5,{BEND})', (1, 2)),
    Odd(f'TB_BEND(INDEX(E6:F6,1),CHOOSE(2,"SI","metric"),{BEND})'),
    # Arguments that are arrays, by whatever function
    Odd('TB_AREA("SI",TRANSPOSE(A1:A3))', (1, 3)),
    Odd('TB_AREA("SI",IF(A1:A3>0.15,A1:A3,1))', (3, 1)),
    Odd('TB_AREA("SI",A1:A3/SUM(A1:A3))', (3, 1)),
    Odd('TB_AREA("SI",SUM(A1:A3*B1:B3))', (1, 1)),
    Odd('TB_AREA("SI",A1:A3/SUM(A1:A3*B1:B3))', (3, 1)),
    Odd('TB_AREA("SI",OFFSET(A1,0,0,3,1))', (3, 1)),
    Odd('TB_AREA("SI",INDEX(A1:B3,0,1))', (3, 1)),
    Odd('TB_AREA("SI",A1:INDEX(A1:A9,COUNT(A1:A9)))', (3, 1)),
    Odd('SUM(TB_AREA("SI",A1:INDEX(A1:A9,3)))'),
    Odd('TB_AREA("SI",INDEX(A1:B3,2,1))'),
    Odd("ROUND(TB_VELOCITY(INDEX(E5:E9,1),A1,A2),2)", (1, 1)),
    Odd('TB_AREA("SI",A1:A3*B1:B3)', (3, 1)),
    Odd('TB_AREA("SI",A1:A3*TRANSPOSE(A1:A3))', (3, 3)),
    Odd('TB_VELOCITY("SI",A1:A3,TB_AREA("SI",A1:A3)*2)', (3, 1)),
    Odd('TB_AREA("SI",TB_AREA("SI",A1:A3))', (3, 1)),
    Odd('TB_AREA("SI",SUM(TB_AREA("SI",A1:A3)))'),
    Odd('TB_AREA("SI",{0.1;0.2}*2)', (2, 1)),
    Odd('TB_AREA("SI",VLOOKUP(2,B1:C3,2,FALSE))'),
    Odd('TB_AREA("SI",A1*1000&" mm")'),
    Odd('TB_AREA("SI",IF(A1>0,E7,1))'),
    Odd('TB_AREA("SI",IF(A1:A3>0.15,E7,A1:A3))', (3, 1)),
    Odd('LET(x,A1*2,d,x+A2,TB_AREA("SI",d)*x)'),
    Odd('_xlfn.LET(_xlpm.d,A1:A3,TB_AREA("SI",_xlpm.d))', (3, 1)),
    Odd('LAMBDA(d,k,TB_AREA("SI",d)*k)(A2,1+1)'),
    Odd('_xlfn.LAMBDA(_xlpm.d,SUM(TB_AREA("SI",_xlpm.d)))(A1:A3)'),
    Odd("ROUND(TWICE(A2)+TWICE(A1*2),6)"),
    Odd("TWICE(A1:A3)", (3, 1)),
    Odd('TB_AREA("SI",_xlfn.SINGLE($M$1:$M$999))'),
    Odd('TB_AREA("SI",_xlfn.ANCHORARRAY(H20))', (3, 1)),
    # Names: of a cell, of an expression, of the cell that stands four columns to the right
    Odd('TB_AREA("SI",diameters)', (3, 1)),
    Odd('TB_AREA("SI",doubled)', (3, 1)),
    Odd('TB_AREA("SI",beside)*2'),
    # Formulas that depend on where they stand
    Odd('TB_AREA("SI",INDIRECT("A2"))'),
    Odd('TB_AREA("SI",INDIRECT("S!A2"))*INDIRECT("A3")'),
    Odd('TB_AREA("SI",A1)*ROW()+COLUMN()'),
    # Ranges of which a plain formula means the cell in its own row
    Odd('SUM($M$1:$M$999*2)+TB_AREA("SI",A1)'),
    Odd('ABS($M$1:$M$999)*TB_AREA("SI",A1)'),
    Odd('$M$1:$M$999*TB_AREA("SI",A1)'),
    # Cells of another workbook, of which this one keeps the values
    Odd('TB_AREA("SI",[1]Data!$A$1)'),
    Odd('TB_AREA("SI",[1]Data!$A$1:$A$3)', (3, 1)),
    Odd('TB_AREA("SI",A1:A3)*[1]Data!$B$1', (3, 1)),
    Odd("TB_AREA([1]Data!$B$2,A1:A3)", (3, 1)),
    Odd('TB_AREA("SI",linked)'),
    # Tables computed on the way
    Odd('TB_BRANCHFLOW("metric",B1:D3)', (3, 1)),
    Odd('TB_BRANCHFLOW("metric",B1:C3*2)', (3, 1)),
    Odd('TB_BRANCHFLOW("metric",B1:B3*2)'),
    Odd('TB_BRANCHFLOW("metric",B1*2)'),
    Odd('TB_SCHEDULE("name,Fx,Fy","SI",E1:K1,OFFSET(E1,1,0,3,7))', (3, 3)),
    Odd('TB_SCHEDULE("name,Fx,Fy","SI",TRANSPOSE(E10:E16),E2:K4)', (3, 3)),
    Odd('TB_SCHEDULE("name,Fx,Fy","SI",E10:E16,E2:K4)', (3, 3)),
    # Conversions
    Odd('TB_CONVERT(A1:A3,"m","mm")', (3, 1)),
    Odd('TB_CONVERT(A1:A3*2,"m",E8&"m")', (3, 1)),
    Odd('TB_CONVERT(A1,"m","m"&"m")'),
    Odd('TB_CONVERT({1;2;3},"m","mm")', (3, 1)),
    Odd('TB_CONVERT(A1:A3-B1:B3,"m","mm")', (3, 1)),
    Odd('TB_AREA("metric",TB_CONVERT(A1+1,"m","mm"))'),
    Odd('10-TB_CONVERT(B1+1,"degC","degF")^2'),
    Odd('1/TB_CONVERT(100,"kPa(a)","bar",B1*90000)'),
    # Pressures against different data in one range
    Odd('TB_CLOSED("Fx","metric",A1*1000,L1:L3)', (3, 1)),
)


def place(number: int) -> str:
    """The cell of a formula, counted from 0."""
    return to_a1(FIRST + TALL * number, COLUMN)


def area(number: int) -> str:
    """All cells of a formula."""
    rows, cols = FORMULAS[number].size or (1, 1)
    top = FIRST + TALL * number
    return f"{to_a1(top, COLUMN)}:{to_a1(top + rows - 1, COLUMN + cols - 1)}"


def _link(kept: dict[str, float | str]) -> ExternalLink:
    """A link to a workbook that is nowhere, with the values kept of it."""
    rows = [
        ExternalRow(
            r=row,
            cell=[
                ExternalCell(r=at, t="str" if isinstance(value, str) else "n", v=str(value))
                for at, value in kept.items()
                if at[1:] == str(row)
            ],
        )
        for row in (1, 2, 3)
    ]
    data = ExternalSheetDataSet(sheetData=[ExternalSheetData(sheetId=0, row=rows)])
    names = ExternalSheetNames(sheetName=["Data"])
    link = ExternalLink(externalBook=ExternalBook(sheetNames=names, sheetDataSet=data, id="rId1"))
    link.file_link = Relationship(
        type="externalLinkPath", Target="elsewhere.xlsx", TargetMode="External", Id="rId1"
    )
    return link


def make(path: Path) -> Path:
    """Write the workbook, with values."""
    book = openpyxl.Workbook()
    sheet = book.active
    sheet.title = SHEET
    columns = {
        "A": (0.1, 0.2, 0.3),
        "B": (1.0, 2.0, 3.0),
        "C": (-0.5, 0.7, None),
        "D": (0.25, -0.6, "40 L/s"),
        "L": (250.0, "3 bar(g)", "400 kPa(a)"),
    }
    for letter, values in columns.items():
        for row, value in enumerate(values, 1):
            sheet[f"{letter}{row}"] = value
    table = (
        ("name", "fitting", "rho", "D1", "p1 [bar]", "Q", "theta"),
        ("B1", "bend", 1000.0, 0.3, 2.0, 0.2, 90.0),
        ("C1", "bend", 998.0, 0.25, 3.0, 0.1, 45.0),
        ("B2", "bend", 1000.0, 0.2, "400 kPa(a)", 0.05, 30.0),
    )
    for i, line in enumerate(table, 1):
        for j, value in enumerate(line):
            sheet.cell(i, 5 + j, value)
    for i, head in enumerate(table[0]):
        sheet.cell(10 + i, 5, head)
    sheet["E5"], sheet["E6"], sheet["F6"], sheet["E7"], sheet["E8"] = "SI", "Fx", "Fy", "150 mm", "m"
    for name, text in (("diameters", "$A$1:$A$3"), ("doubled", "$A$1:$A$3*2"), ("beside", "F1")):
        book.defined_names[name] = DefinedName(name, attr_text=f"{SHEET}!{text}")
    function = '_xlfn.LAMBDA(_xlpm.d,TB_AREA("SI",_xlpm.d)*2)'
    book.defined_names["TWICE"] = DefinedName("TWICE", attr_text=function)
    book.defined_names["linked"] = DefinedName("linked", attr_text="[1]Data!$A$2")
    book._external_links.append(_link({"A1": 0.11, "A2": 0.12, "A3": 0.13, "B1": 3.0, "B2": "SI"}))
    for number, odd in enumerate(FORMULAS):
        text, at = f"={odd.text}", place(number)
        sheet.cell(FIRST + TALL * number, 13, 0.1 + 0.001 * number)
        sheet[at] = text if odd.size is None else ArrayFormula(area(number), text)
    book.save(path)
    package = Package.read(path)
    package.save(path, evaluate_workbook(package, fill_native=True).replaced)
    return path
