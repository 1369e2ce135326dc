"""Sheets as projects have them: inputs of several fittings, chains, mixed columns. Figures are invented."""

from __future__ import annotations

from collections.abc import Iterable
from pathlib import Path

import pytest
from openpyxl import Workbook
from openpyxl.worksheet.formula import ArrayFormula
from openpyxl.worksheet.worksheet import Worksheet

from thrustbook.addin.check.types import Severity

from .books import clean_book, findings, stored

Line = tuple[object, ...]


def _sheet(book: Workbook, title: str, lines: Iterable[Line]) -> Worksheet:
    ws = book.create_sheet(title)
    for row, line in enumerate(lines, 1):
        for col, value in enumerate(line, 1):
            ws.cell(row, col, value)
    return ws


def _empty() -> Workbook:
    book = Workbook()
    book.remove(book.worksheets[0])
    return book


def _found(book: Workbook, path: Path) -> list[tuple[str, str]]:
    return [(f.code, f.place) for f in findings(stored(book, path / "book.xlsx"))]


def _bend(title: str, flow: object, diameter: object, pressure: object, angle: object) -> list[Line]:
    return [
        (title,),
        ("Quantity", "Symbol", "Value", "Unit"),
        ("Density", "rho", 998.0, "kg/m3"),
        ("Flow", "Q", flow, "L/s"),
        ("Inside diameter", "D", diameter, "mm"),
        ("Pressure", "p", pressure, "kPa"),
        ("Deflection", "θ", angle, "°"),
        ("Velocity", "V", '=TB_VELOCITY("metric",C4,C5)', "m/s"),
        ("Thrust", "F", '=TB_BEND("F","metric",C3,C5,C6,C4,C7)', "kN"),
    ]


def _fittings(**second: object) -> Workbook:
    """Two bends and a cap, each on a sheet; what is not given is linked to the first."""
    book = _empty()
    _sheet(book, "B1", _bend("Bend B1", 120.0, 400.0, 600.0, 45.0))
    linked = {"flow": "='B1'!C4", "diameter": "='B1'!C5", "pressure": "='B1'!C6", "angle": "='B1'!C7"}
    _sheet(book, "B2", _bend("Bend B2", **{**linked, **second}))
    _sheet(
        book,
        "C1",
        [
            ("Cap C1",),
            ("Inside diameter", "D", 200.0, "mm"),
            ("Pressure", "p", "='B1'!C6", "kPa"),
            ("Thrust", "F", '=TB_CLOSED("F","metric",C2,C3)', "kN"),
        ],
    )
    return book


@pytest.mark.parametrize("own", [{"angle": 90.0}, {"diameter": 350.0}, {"pressure": 450.0}], ids=str)
def test_each_fitting_has_its_own_size_and_pressure(tmp_path: Path, own: dict[str, float]) -> None:
    assert _found(_fittings(**own), tmp_path) == []


def test_the_flow_of_a_main_is_one_flow(tmp_path: Path) -> None:
    assert _found(_fittings(flow=130.0), tmp_path) == [("D01", "B2!C4")]


def test_a_diameter_typed_again_beside_a_fitting_is_found(tmp_path: Path) -> None:
    book = _fittings()
    _sheet(book, "Check", [("Inside diameter", 450.0, "mm"), ("Area", '=TB_AREA("metric",B1)', "m2")])
    del book["C1"]
    assert _found(book, tmp_path) == [("D01", "Check!B1")]


def test_a_named_input_typed_twice_is_found_whatever_its_unit_is_written_like(tmp_path: Path) -> None:
    book = _empty()
    for title, label, value in (("A", "Test pressure [kPa]", 900.0), ("B", "Test pressure (kPa)", 950.0)):
        _sheet(book, title, [(label, value), ("Thrust", '=TB_CLOSED("F","metric",300,B1)', "kN")])
    assert _found(book, tmp_path) == [("D01", "B!B1")]


def test_load_cases_on_sheets_of_their_own(tmp_path: Path) -> None:
    book = _empty()
    for title, pressure, flow in (("Duty", 500.0, 150.0), ("Test", 900.0, 0.0), ("Surge", 700.0, 150.0)):
        _sheet(book, title, _bend("Bend B1", flow, 400.0 if title == "Duty" else "=Duty!C5", pressure, 45.0))
        if title != "Duty":
            book[title]["C7"] = "=Duty!C7"
    assert _found(book, tmp_path) == []


def test_a_label_is_not_the_unit_that_stands_before_the_value(tmp_path: Path) -> None:
    book = _empty()
    lines: list[Line] = [
        ("Density", "lb/ft3", 62.4),
        ("Inside diameter", "in", 24.0),
        ("Working pressure", "psi", 100.0),
        ("Test pressure", "psi", 150.0),
        ("Thrust, working", "lbf", '=TB_CLOSED("F","US",C2,C3)'),
        ("Thrust, test", "lbf", '=TB_CLOSED("F","US",C2,C4)'),
    ]
    _sheet(book, "Cap", lines)
    assert _found(book, tmp_path) == []


def _mixed() -> Workbook:
    """A column of fittings of several kinds; a cap has no angle and no thrust across."""
    book = _empty()
    ws = _sheet(book, "Fittings", [("node", "kind", "D", "p", "Q", "angle", "Fx", "Fy")])
    for row in range(2, 10):
        for col, value in enumerate((f"N{row}", "bend", 300.0, 500.0, 80.0, 45.0), 1):
            ws.cell(row, col, value)
        for col, name in ((7, "Fx"), (8, "Fy")):
            ws.cell(row, col, f'=TB_BEND("{name}","metric",998,C{row},D{row},E{row},F{row})')
    ws["B5"], ws["F5"], ws["G5"], ws["H5"] = "closed", None, '=TB_CLOSED("F","metric",C5,D5)', 0.0
    return book


def test_rows_of_another_kind_in_a_table_of_fittings(tmp_path: Path) -> None:
    assert _found(_mixed(), tmp_path) == []


def test_another_function_without_another_kind_is_found(tmp_path: Path) -> None:
    book = _mixed()
    book["Fittings"]["B5"], book["Fittings"]["F5"] = "bend", 45.0
    assert _found(book, tmp_path) == [("P01", "Fittings!H5"), ("P02", "Fittings!G5")]


@pytest.mark.parametrize("start", [90.0, "=$B$12", "=$B$12-E2"], ids=str)
def test_the_start_of_a_chain_is_not_like_the_rest(tmp_path: Path, start: object) -> None:
    book = _empty()
    ws = _sheet(book, "Chain", [("node", "D", "dz", "p [kPa]", "hf [m]", "HGL [m]")])
    ws["A11"], ws["B11"], ws["A12"], ws["B12"] = "pressure at the pumps", 600.0, "level at the pumps", 90.0
    for row in range(2, 9):
        pressure = "$B$11" if row == 2 else f"D{row - 1}"
        line = (
            f"N{row}",
            300.0,
            1.0,
            f'=TB_PRESSURE("p2","metric",998,B{row},B{row},{pressure},80,C{row})',
            f'=TB_PIPELOSS("hL","metric",998,1,B{row},100,0.1,80)',
            start if row == 2 else f"=F{row - 1}-E{row}",
        )
        for col, value in enumerate(line, 1):
            ws.cell(row, col, value)
    assert _found(book, tmp_path) == []


def test_subtotals_of_groups_below_a_column_leave_nothing_out(tmp_path: Path) -> None:
    book = _empty()
    ws = _sheet(book, "Areas", [("D [mm]", "A [m2]")])
    for row in range(2, 10):
        ws.cell(row, 1, 100.0 * row)
        ws.cell(row, 2, f'=TB_AREA("metric",A{row})')
    ws["A11"], ws["B11"] = "first four", "=SUM(B2:B5)"
    ws["A12"], ws["B12"] = "last four", "=SUM(B6:B9)"
    ws["A13"], ws["B13"] = "all", "=B11+B12"
    assert _found(book, tmp_path) == []


def _rows_of_arrays() -> Workbook:
    """A table whose formulas are array formulas, one or two cells wide, filled down."""
    book = _empty()
    heads = ("name", "D [mm]", "p [kPa]", "Q [L/s]", "angle [deg]", "Fx [kN]", "Fy [kN]", "V [m/s]")
    ws = _sheet(book, "Rows", [heads])
    for r in range(2, 9):
        for col, value in enumerate((f"N{r}", 300.0, 400.0 + r, 80.0 + r, 15.0 * r - 10), 1):
            ws.cell(r, col, value)
        ws[f"F{r}"] = ArrayFormula(f"F{r}:G{r}", f'=TB_BEND("Fx,Fy","metric",998,B{r},C{r},D{r},E{r})')
        ws[f"H{r}"] = ArrayFormula(f"H{r}", f'=TB_VELOCITY("metric",D{r},B{r})')
    return book


@pytest.mark.parametrize(
    ("cells", "expected"),
    [
        ({}, []),
        ({"H5": 1.2}, [("P01", "Rows!H5")]),
        ({"H8": 1.2}, [("P01", "Rows!H8")]),
        ({"F5": 1.2, "G5": 3.0}, [("P01", "Rows!F5")]),
        ({"H5": ArrayFormula("H5", '=TB_VELOCITY("metric",D4,B5)')}, [("P02", "Rows!H5")]),
        (
            {"F8": ArrayFormula("F8:G8", '=TB_BEND("Fy,Fx","metric",998,B8,C8,D8,E8)')},
            [("P02", "Rows!F8")],
        ),
    ],
    ids=str,
)
def test_array_formulas_filled_down(
    tmp_path: Path, cells: dict[str, object], expected: list[tuple[str, str]]
) -> None:
    book = _rows_of_arrays()
    for place, value in cells.items():
        book["Rows"][place] = value
    assert _found(book, tmp_path) == expected


@pytest.mark.parametrize("typed", [None, "D5", "D13"], ids=str)
def test_a_number_over_a_subtotal_is_found(tmp_path: Path, typed: str | None) -> None:
    book = _empty()
    ws = _sheet(book, "Caps", [("node", "D", "p", "F [kN]")])
    for r in range(2, 14):
        if r in (5, 9, 13):
            ws[f"D{r}"] = f"=SUM(D{r - 3}:D{r - 1})"
        else:
            ws[f"B{r}"], ws[f"C{r}"] = 300.0, 400.0 + r
            ws[f"D{r}"] = f'=TB_CLOSED("F","metric",B{r},C{r})'
    ws["D14"] = "=D5+D9+D13"
    if typed:
        ws[typed] = 90.0
    assert _found(book, tmp_path) == ([("P01", f"Caps!{typed}")] if typed else [])


@pytest.mark.parametrize(
    ("cells", "expected"),
    [
        ({}, []),
        ({"B1": "D [ft]"}, [("U02", "Dual!B1")]),
        ({"C1": "F [kip]"}, [("U02", "Dual!C1")]),
    ],
    ids=str,
)
def test_headings_of_conversions(
    tmp_path: Path, cells: dict[str, str], expected: list[tuple[str, str]]
) -> None:
    book = _empty()
    ws = _sheet(book, "Dual", [("D [mm]", "D [in]", "F [lbf]", "F [kN]")])
    for r in range(2, 7):
        ws[f"A{r}"], ws[f"B{r}"] = 100.0 * r, f'=TB_CONVERT(A{r},"mm","in")'
        ws[f"C{r}"], ws[f"D{r}"] = f'=TB_CONVERT(D{r},"kN","lbf")', f'=TB_CLOSED("F","metric",A{r},400)'
    for place, value in cells.items():
        ws[place] = value
    assert _found(book, tmp_path) == expected


@pytest.mark.parametrize(("pressure", "expected"), [(None, []), (-900.0, [("V06", "Cap!B3")])], ids=str)
def test_an_error_covered_by_nothing_counts_where_the_inputs_are_there(
    tmp_path: Path, pressure: object, expected: list[tuple[str, str]]
) -> None:
    book = _empty()
    formula = '=IFERROR(TB_BEND("F","metric",998,300,B2,80,B1),"")'
    _sheet(book, "Cap", [("angle", 400.0), ("p", -pressure if pressure else None), ("F", formula)])
    assert _found(book, tmp_path) == expected


def test_a_circle_through_a_block_is_named(tmp_path: Path) -> None:
    # The evaluator gives up on such a workbook, so it is saved without values.
    book = clean_book()
    book["Run"]["B4"], book["Inputs"]["E1"] = "=Inputs!E1/5", "=Run!K8"
    book.save(tmp_path / "book.xlsx")
    errors = [f for f in findings(tmp_path / "book.xlsx") if f.severity is Severity.ERROR]
    assert [(f.code, f.place) for f in errors] == [("S01", "Inputs!E1")]
    assert "Inputs!E1 -> Run!I8 -> Run!B4 -> Inputs!E1" in errors[0].what


@pytest.mark.parametrize("value", [None, 0.5], ids=str)
def test_a_hidden_column_that_a_block_does_not_use(tmp_path: Path, value: float | None) -> None:
    book = clean_book()
    ws = book["Run"]
    ws["G7"], ws["G9"] = "K", value
    for row in ws.iter_rows():
        for cell in row:
            if isinstance(cell.value, ArrayFormula):
                cell.value.text = cell.value.text.replace("A7:F7,A8:F11", "A7:G7,A8:G11")
    ws["B18"] = ws["B18"].value.replace("A7:F7,A8:F11", "A7:G7,A8:G11")
    ws.column_dimensions["G"].hidden = True
    assert _found(book, tmp_path) == ([] if value is None else [("S02", "Run!G:G")])
