"""TB_CONVERT written out refuses what the function refuses."""

from __future__ import annotations

from pathlib import Path

import openpyxl
from openpyxl.worksheet.formula import ArrayFormula

from thrustbook.addin.longhand.make import Made
from thrustbook.addin.xlsx.package import Package

from .office import recalculated
from .test_detach import changed, detached, evaluated, values

REFUSED = (
    'TB_CONVERT(A1,"m","mm")',  # an empty cell
    'TB_CONVERT(A2,"m","mm")',  # "5"
    'TB_CONVERT("5","m","mm")',
    'TB_CONVERT(A3&"","m","mm")',
    'TB_CONVERT(A3,"m","K")',
    'TB_CONVERT(A3,A3,"mm")',
    'TB_CONVERT(A3,"m")',
    'TB_CONVERT(A3,A4:A5,"mm")',
    'TB_CONVERT(A3,A6,"bar",A7)',  # "0.9 bar(a)"
    'TB_CONVERT(A3,A6,"bar",A3:A4)',
)


def test_refused_conversions(tmp_path: Path) -> None:
    path = tmp_path / "book.xlsx"
    book = openpyxl.Workbook()
    sheet = book.worksheets[0]
    sheet.title = "S"
    for row, value in ((2, "5"), (3, 20.0), (4, "m"), (5, "cm"), (6, "kPa(a)"), (7, "0.9 bar(a)")):
        sheet.cell(row, 1, value)
    for row, formula in enumerate(REFUSED, 1):
        sheet.cell(row, 3, f"={formula}")
    sheet["D1"] = ArrayFormula("D1:D3", '=TB_CONVERT(A1:A3,"m","mm")')
    sheet["E1"] = '=TB_CONVERT(A3,A6,"bar",A1)'
    book.save(path)
    found = Made(Package.read(evaluated(path))).verdicts()
    assert {e.cell.a1 for e in found["error"]} == {f"C{row}" for row in range(1, len(REFUSED) + 1)}
    assert {e.cell.a1 for e in found["agrees"]} == {"D1", "E1"}
    copy = tmp_path / "copy.xlsx"
    detached(path, copy)
    plain = recalculated(changed(copy, {"S": {"A1": 2.0}}, tmp_path / "plain.xlsx"), tmp_path)
    assert values(plain, "S", "D1:D3") == [[2000], ["#VALUE!"], [20000]]
    assert values(plain, "S", "C1:C4") == [[2000], ["#VALUE!"], ["#VALUE!"], ["#VALUE!"]]
