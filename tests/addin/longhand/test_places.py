"""Formulas that mean the place where they stand, in a copy whose workings stand on other sheets."""

from __future__ import annotations

from pathlib import Path

import openpyxl
import pytest
from openpyxl.workbook.defined_name import DefinedName
from openpyxl.worksheet.formula import ArrayFormula

from thrustbook.addin.longhand.make import Made
from thrustbook.addin.xlsx.package import Package

from .office import recalculated
from .test_detach import changed, detached, evaluated, same, values


@pytest.fixture
def book(tmp_path: Path) -> Path:
    """Diameters 100, 120, ... mm and flows 10, 11, ... L/s in rows 2 to 7."""
    book = openpyxl.Workbook()
    sheet = book.worksheets[0]
    sheet.title = "A"
    for row in range(2, 8):
        sheet.cell(row, 1, 60.0 + 20 * row)
        sheet.cell(row, 2, 8.0 + row)
        sheet.cell(row, 3, '=TB_VELOCITY("metric",INDEX(B:B,ROW()),INDEX($A:$A,ROW()))')
    other = book.create_sheet("B")
    other["A1"] = 500.0
    book.defined_names["dia"] = DefinedName("dia", attr_text="A!$A$2")
    other.defined_names["dia"] = DefinedName("dia", attr_text="B!$A$1")
    path = tmp_path / "book.xlsx"
    sheet["D2"] = other["B1"] = '=TB_AREA("metric",dia)'
    # One column of results fills every column of the array formula; one value fills all of it.
    sheet["F2"] = ArrayFormula("F2:G7", '=TB_VELOCITY("metric",B2:B7,A2:A7)')
    sheet["H2"] = ArrayFormula("H2:I3", '=TB_AREA("metric",A2)')
    sheet["J2"] = '=TB_AREA("metric",INDIRECT("A!A3"))'
    sheet["K2"] = '=TB_AREA("metric",TRUE)'
    sheet["A9"], sheet["A10"] = True, "100"
    sheet["K3"] = '=TB_AREA("metric",A9)'
    sheet["K4"], sheet["K5"] = '=TB_AREA("metric","100")', '=TB_AREA("metric",A10)'
    book.save(path)
    return evaluated(path)


def test_every_cell_agrees(book: Path) -> None:
    found = Made(Package.read(book)).verdicts()
    assert {e.cell.where for e in found["error"]} == {"A!K2", "A!K3", "A!K4", "A!K5"}
    assert not found["differs"]
    assert not found["not worked"]


def test_detached_copy_after_a_change(book: Path, tmp_path: Path) -> None:
    copy = tmp_path / "copy.xlsx"
    assert not detached(book, copy).frozen
    assert values(copy, "A", "C2:K7") == values(book, "A", "C2:K7")
    # A number that becomes a text, or TRUE, is none any more.
    changes = {"A": {"A3": 220.0, "B5": 33.0, "A6": "140", "B7": True}, "B": {"A1": 450.0}}
    engine = evaluated(changed(book, changes, tmp_path / "engine.xlsx"))
    without = recalculated(changed(copy, changes, tmp_path / "plain.xlsx"), tmp_path)
    assert same(values(engine, "A", "C2:K7"), values(without, "A", "C2:K7")) == 18
    assert same(values(engine, "B", "B1:B1"), values(without, "B", "B1:B1")) == 1
    assert values(without, "A", "K2:K5") == [["#VALUE!"]] * 4


@pytest.mark.parametrize(
    ("formula", "words"),
    [
        ('=TB_AREA("metric",INDIRECT("R2C1",FALSE))', "INDIRECT"),
        ('=TB_AREA("metric",INDIRECT("A"&ROW()))', "INDIRECT"),
        ('=TB_AREA("metric",IF(CELL("row")>0,A2,A3))', "CELL"),
        ('=TB_AREA("metric",A2)*SHEET()', "SHEET"),
        ('=MAP(A2:A3,LAMBDA(d,TB_AREA("metric",d)))', "LAMBDA"),
    ],
)
def test_what_cannot_be_placed_is_said(tmp_path: Path, formula: str, words: str) -> None:
    book = openpyxl.Workbook()
    sheet = book.worksheets[0]
    sheet.title = "A"
    sheet["A2"], sheet["B2"] = 100.0, formula
    path = tmp_path / "book.xlsx"
    book.save(path)
    found = Made(Package.read(changed(path, {"A": {"B2": 1.0}}, tmp_path / "stored.xlsx"))).verdicts()
    assert [words in e.trouble for e in found["not worked"]] == [True]
