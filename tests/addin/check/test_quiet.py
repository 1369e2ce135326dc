"""What is no fault: layouts as calculation sheets have them, and the template workbooks."""

from __future__ import annotations

from pathlib import Path

import openpyxl
import pytest
from openpyxl import Workbook

from thrustbook.addin.check.labels import unit_in
from thrustbook.workbooks.templates import TEMPLATES, shipped

from .books import clean_book, findings, stored
from .test_faults import FAULTS


@pytest.mark.parametrize("name", TEMPLATES)
def test_the_templates_give_no_finding(name: str) -> None:
    found = [f for f in findings(shipped(name)) if f.severity != "note"]
    assert [(f.code, f.place, f.what) for f in found] == []


def test_sections_that_repeat_a_calculation_are_no_contradiction(tmp_path: Path) -> None:
    book = openpyxl.Workbook()
    ws = book.worksheets[0]
    for n, (flow, diameter) in enumerate(((100.0, 300.0), (120.0, 350.0), (140.0, 350.0))):
        top = 1 + 16 * n
        b = [f"B{top + i}" for i in range(16)]
        bend = f'"metric",{b[1]},{b[3]},{b[4]},{b[2]},{b[5]}'
        for i, line in enumerate(
            (
                (f"Bend {n + 1}", None, None),
                ("Density", 998.0, "kg/m3"),
                ("Flow Q", flow, "L/s"),
                ("Diameter D", diameter, "mm"),
                ("Pressure p", 400.0, "kPa"),
                ("Deflection", 90.0, "°"),
                ("Velocity", f'=TB_VELOCITY("metric",{b[2]},{b[3]})', "m/s"),
                ("Area", f'=TB_AREA("metric",{b[3]})', "m²"),
                ("Thrust Fx", f'=TB_BEND("Fx",{bend})', "kN"),
                ("Thrust Fy", f'=TB_BEND("Fy",{bend})', "kN"),
                ("Thrust", f"=SQRT({b[8]}^2+{b[9]}^2)", "kN"),
                ("Remark", f'=TB_WHY("TB_BEND","Fx",{bend})', None),
                ("Design value", f"=1.5*{b[10]}", "kN"),
                ("the same", f'=TB_CONVERT({b[12]},"kN","lbf")', "lbf"),
            )
        ):
            for col, value in enumerate(line, 1):
                ws.cell(top + i, col, value)
    assert findings(stored(book, tmp_path / "book.xlsx")) == []


def _cases() -> Workbook:
    """Load cases side by side, formulas filled across, maxima at the end."""
    book = openpyxl.Workbook()
    ws = book.worksheets[0]
    ws.append(("case", "duty", "test", "surge", "largest"))
    ws.append(("p (kPa)", 400.0, 900.0, 600.0))
    ws.append(("Q, L/s", 100.0, 0.0, 100.0))
    ws.append(("D in mm", 300.0, 300.0, 300.0))
    for row, result in ((5, "Fx"), (6, "Fy")):
        ws.cell(row, 1, f"{result} (kN)")
        for col in "BCD":
            ws[f"{col}{row}"] = f'=TB_BEND("{result}","metric",998,{col}4,{col}2,{col}3,45)'
        ws.cell(row, 5, f"=MAX(B{row}:D{row})")
    return book


def test_cases_side_by_side(tmp_path: Path) -> None:
    assert findings(stored(_cases(), tmp_path / "book.xlsx")) == []


@pytest.mark.parametrize(
    ("place", "value", "code", "where"),
    [
        ("A2", "p (bar)", "U02", "A2"),
        ("A3", "Q, gpm", "U02", "A3"),
        ("A4", "D in inch", None, ""),  # no spelling of a unit: nothing is concluded
        ("C5", 3.0, "P01", "C5"),
        ("D6", 3.0, "P01", "D6"),
        ("C5", '=TB_BEND("Fx","metric",998,B4,C2,C3,45)', "P02", "C5"),
    ],
)
def test_faults_in_cases_side_by_side(
    tmp_path: Path, place: str, value: object, code: str | None, where: str
) -> None:
    book = _cases()
    book.worksheets[0][place] = value
    found = findings(stored(book, tmp_path / "book.xlsx"))
    assert [(f.code, f.cell) for f in found] == ([(code, where)] if code else [])


def test_input_and_formula_in_turn_are_no_run_with_a_hole(tmp_path: Path) -> None:
    book = openpyxl.Workbook()
    ws = book.worksheets[0]
    for row, value in enumerate(
        (100.0, '=TB_AREA("metric",B1)', 150.0, '=TB_AREA("metric",B3)', 200.0, '=TB_AREA("metric",B5)'), 1
    ):
        ws.cell(row, 2, value)
    assert findings(stored(book, tmp_path / "book.xlsx")) == []


def test_subtotals_inside_a_column_are_no_odd_formulas(tmp_path: Path) -> None:
    book = openpyxl.Workbook()
    ws = book.worksheets[0]
    for row in (*range(1, 5), *range(6, 10)):
        ws.cell(row, 1, 200.0 + 10 * row)
        ws.cell(row, 2, f'=TB_AREA("metric",A{row})')
    ws["B5"], ws["B10"], ws["B11"] = "=SUM(B1:B4)", "=SUM(B6:B9)", "=B5+B10"
    assert findings(stored(book, tmp_path / "book.xlsx")) == []


def test_several_fluids_with_their_own_labels_are_no_contradiction(tmp_path: Path) -> None:
    book = clean_book()
    ws = book["Balance"]
    ws["A10"], ws["B10"], ws["C10"] = "density of the brine", 1180.0, "kg/m3"
    ws["A11"], ws["B11"], ws["C11"] = "viscosity of the brine", 1.5, "mPa s"
    ws["A12"], ws["B12"] = "Reynolds number of the brine", "=TB_REYNOLDS(Units,B10,B11,2,300)"
    assert findings(stored(book, tmp_path / "book.xlsx")) == []


def test_results_computed_further_have_units_of_their_own(tmp_path: Path) -> None:
    book = clean_book()
    ws = book["Bends"]
    ws["A15"], ws["C15"] = "the same in newtons, rounded", "N"
    ws["B15"] = '=ROUND(TB_CLOSED("F",Units,B5,Inputs!B3)*1000,0)'
    ws["A16"], ws["C16"] = "and so", "N"
    ws["B16"] = '=ROUND(TB_CLOSED("F",Units,B5,Inputs!B3),0)*1000'
    assert findings(stored(book, tmp_path / "book.xlsx")) == []


def test_errors_covered_by_a_text_show_themselves(tmp_path: Path) -> None:
    book = clean_book()
    book["Bends"]["B15"] = '=IFERROR(TB_CLOSED("F",Units,-5,Inputs!B3),"not in use")'
    book["Bends"]["B16"] = '=IFERROR(TB_CLOSED("F",Units,B5,Inputs!B3),0)'
    assert findings(stored(book, tmp_path / "book.xlsx")) == []


def test_changing_formulas_are_not_stale(tmp_path: Path) -> None:
    book = clean_book()
    book["Inputs"]["E1"] = "=NOW()"
    book["Inputs"]["E2"] = "=E1+1"
    path = stored(book, tmp_path / "book.xlsx", after={"Inputs": {(1, 5): 40000.0, (2, 5): 40001.0}})
    assert findings(path) == []


def test_several_faults_at_once_are_all_found(tmp_path: Path) -> None:
    book = clean_book()
    wanted = []
    for name in (
        "unit above an argument",
        "fast flow",
        "odd formula",
        "hidden row",
        "flows that do not close",
        "number over the last formula",
        "circle",
    ):
        FAULTS[name].change(book)
        wanted += [(FAULTS[name].code, place) for place in FAULTS[name].places]
    found = findings(stored(book, tmp_path / "book.xlsx"))
    assert sorted((f.code, f.place) for f in found) == sorted(wanted)


@pytest.mark.parametrize(
    ("text", "role", "unit"),
    [
        ("Q [L/s]", "flow", "L/s"),
        ("flow (gpm)", "flow", "gpm"),
        ("p, kPa", "pressure", "kPa"),
        ("pressure p [kPa(g)]", "pressure", "kPa(g)"),
        ("p (bar(g))", "pressure", "bar(g)"),
        ("diameter in mm", "diameter", "mm"),
        ("mm", "diameter", "mm"),
        ("p1 [mm]", "pressure", "mm"),
        ("L", "length", None),
        ("Q (max)", "flow", None),
        ("Fx [1]", "force", None),
        ("Q [-]", "flow", None),
        ("see note 3", "flow", None),
        ("", "flow", None),
    ],
)
def test_units_in_headings(text: str, role: str, unit: str | None) -> None:
    found = unit_in(text, role)
    assert (found[0] if found else None) == unit
