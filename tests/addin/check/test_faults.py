"""Each kind of fault, put into a workbook without one: the check finds it, and nothing else."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass, field, replace
from pathlib import Path
from types import MappingProxyType

import openpyxl
import pytest
from openpyxl import Workbook
from openpyxl.formatting.rule import FormulaRule
from openpyxl.workbook.defined_name import DefinedName
from openpyxl.worksheet.datavalidation import DataValidation
from openpyxl.worksheet.formula import ArrayFormula
from openpyxl.worksheet.table import Table

from thrustbook.addin.catalogue.registry import CATALOGUE
from thrustbook.addin.catalogue.types import Longhand, TableLonghand
from thrustbook.addin.check import calls, rules_physics
from thrustbook.addin.check.rules import RULES
from thrustbook.addin.check.types import Severity
from thrustbook.addin.longhand import book as workings

from .books import FIRST, LAST, Values, clean_book, findings, stored


def test_a_clean_workbook_gives_no_finding(tmp_path: Path) -> None:
    path = stored(clean_book(), tmp_path / "clean.xlsx")
    assert findings(path) == []
    # The workbook is one with results in it, not one in which there is nothing to find.
    values = openpyxl.load_workbook(path, data_only=True)
    area, rho_v2 = math.pi * 0.3**2 / 4, 998.0 * (0.1 / (math.pi * 0.3**2 / 4)) ** 2
    expected = (400e3 + rho_v2) * area * (1 - math.cos(math.radians(30))) / 1e3
    assert values["Bends"]["G5"].value == pytest.approx(expected, rel=1e-9)
    assert values["Run"]["L10"].value > 0
    assert values["Balance"]["B8"].value != 0
    assert values["Run"]["B18"].value < 1e-9


@dataclass
class Fault:
    """A fault: how it gets into the workbook, and what is to be found."""

    change: Callable[[Workbook], object]
    code: str
    places: tuple[str, ...]
    words: str
    severity: Severity = Severity.ERROR
    before: Values = field(default_factory=dict)
    after: Values = field(default_factory=dict)


def _put(sheet: str, **cells: object) -> Callable[[Workbook], None]:
    def change(book: Workbook) -> None:
        for place, value in cells.items():
            book[sheet][place] = value

    return change


def _nothing(book: Workbook) -> None:
    pass


def _hide_row(book: Workbook) -> None:
    book["Bends"].row_dimensions[7].hidden = True


def _hide_columns(book: Workbook) -> None:
    for letter in "CD":
        book["Bends"].column_dimensions[letter].hidden = True


def _hide_sheet(book: Workbook) -> None:
    book["Inputs"].sheet_state = "hidden"


def _format_with_a_call(book: Workbook) -> None:
    book["Bends"].conditional_formatting.add("A5:A10", FormulaRule(formula=["TB_AREA(Units,$B5)>0.2"]))


def _validation_through_a_name(book: Workbook) -> None:
    book.defined_names["Enough"] = DefinedName("Enough", attr_text="TB_AREA(Units,Bends!$B$5)")
    rule = DataValidation(type="custom", formula1="B5<Enough")
    rule.add("B5:B10")
    book["Bends"].add_data_validation(rule)


def _no_surge(book: Workbook) -> None:
    book["Run"]["B16"] = "peak"
    book["Run"]["D16"] = None


def _no_cases(book: Workbook) -> None:
    for row in range(8, 12):
        book["Run"].cell(row, 15).value = None


def _table_of_areas(book: Workbook) -> None:
    ws = book.create_sheet("Areas")
    ws.append(("D", "A"))
    for row in range(2, 8):
        ws.append((100.0 * row, "=TB_AREA(Units,Pipes[[#This Row],[D]])"))
    ws["B2"] = 0.03
    ws.add_table(Table(displayName="Pipes", ref="A1:B7"))


def _uneven_units(book: Workbook) -> None:
    book["Bends"]["A16"] = "bore of the drain, area"
    book["Bends"]["B16"] = '=TB_AREA("US",12)'


W = Severity.WARNING
FAULTS = {
    "stored value": Fault(_nothing, "V01", ("Bends!G7",), "99", after={"Bends": {(7, 7): 99.0}}),
    "stored value of a block": Fault(_nothing, "V01", ("Run!L9",), "1.5", after={"Run": {(9, 12): 1.5}}),
    "stored value of a formula that depends on a call": Fault(
        _nothing, "V01", ("Bends!I11",), "1.5", after={"Bends": {(11, 9): 1.5}}
    ),
    "missing value": Fault(_nothing, "V02", ("Bends!G7",), "no value", W, after={"Bends": {(7, 7): None}}),
    "error": Fault(_put("Bends", E7=400.0), "V03", ("Bends!G7",), "theta = 400 deg"),
    "error in a row of a table": Fault(
        _put("Run", D10="x", B18=None), "V03", ("Run!J10",), '"x" is not a number'
    ),
    "not recomputed": Fault(
        _put("Inputs", B2='=CUBEVALUE("c","m")'),
        "V04",
        ("Inputs!B2",),
        "CUBEVALUE",
        W,
        before={"Inputs": {(2, 2): 998.0}},
    ),
    "formula in a format": Fault(_format_with_a_call, "V05", ("Bends!A5:A10",), "TB_AREA", Severity.NOTE),
    "formula in a validation, through a name": Fault(
        _validation_through_a_name, "V05", ("Bends!B5:B10",), "B5<Enough", Severity.NOTE
    ),
    "error covered by a number": Fault(
        _put("Bends", B14='=IFERROR(TB_CLOSED("F",Units,-5,Inputs!B3),0)'),
        "V06",
        ("Bends!B14",),
        "#NUM!",
        W,
    ),
    "number over a formula": Fault(_put("Bends", G8=5.0), "P01", ("Bends!G8",), "5 stands"),
    "number over the last formula": Fault(
        _put("Bends", **{f"G{LAST}": 5.0}), "P01", (f"Bends!G{LAST}",), "5"
    ),
    "number over a formula that depends on a call": Fault(
        _put("Bends", I8=5.0), "P01", ("Bends!I8",), "1.5*G"
    ),
    "number over the first formula": Fault(
        _put("Bends", **{f"G{FIRST}": 5.0}), "P01", (f"Bends!G{FIRST}",), "5"
    ),
    "number typed as text over a formula": Fault(_put("Bends", G8="5.0"), "P01", ("Bends!G8",), "5"),
    "number over a total beside another": Fault(
        _put("Bends", G11="=SUM(G5:G10)", H11=-99.0, I11=None), "P01", ("Bends!H11",), "SUM(G5:G10)"
    ),
    "number over a formula of a table": Fault(_table_of_areas, "P01", ("Areas!B2",), "stands in place"),
    "total without its last row": Fault(
        _put("Bends", I11="=SUM(I5:I9)"), "P03", ("Bends!I11",), "leaves out I10", W
    ),
    "total without its first row": Fault(
        _put("Bends", I11="=SUM(I6:I10)"), "P03", ("Bends!I11",), "leaves out I5", W
    ),
    "odd last formula before a total": Fault(_put("Bends", I10="=1.4*G10"), "P02", ("Bends!I10",), "1.4", W),
    "odd formula": Fault(
        _put("Bends", G8='=TB_BEND("Fx",Units,rho,B8,C8,$D$5,E8)'), "P02", ("Bends!G8",), "$D$5", W
    ),
    "two numbers over the last formulas": Fault(
        _put("Bends", G9=5.0, G10=5.5), "P01", ("Bends!G9:G10",), "2 cells"
    ),
    "two odd formulas filled alike": Fault(
        _put("Bends", **{f"G{r}": f'=TB_BEND("Fx",Units,rho,B{r},C{r},$D$5,E{r})' for r in (7, 8)}),
        "P02",
        ("Bends!G7:G8",),
        "$D$5",
        W,
    ),
    "odd last formula that computes on": Fault(
        _put("Bends", **{f"J{r}": f"=I{r}/$B$5" for r in range(FIRST, LAST)}, J10="=I9/$B$5"),
        "P02",
        ("Bends!J10",),
        "=I9",
        W,
    ),
    "odd constant": Fault(_put("Bends", I7="=1.4*G7"), "P02", ("Bends!I7",), "1.4", W),
    "odd last formula": Fault(
        _put("Bends", **{f"F{LAST}": f"=TB_VELOCITY(Units,D{LAST},B{LAST - 1})"}),
        "P02",
        (f"Bends!F{LAST}",),
        "TB_VELOCITY",
        W,
    ),
    "two sets of units": Fault(_uneven_units, "U01", ("Bends!B16",), "diameter in in", W),
    "another set of units in one cell": Fault(
        _put("Bends", B14='=TB_CLOSED("F","SI",B5,Inputs!B3)'), "U02", ("Bends!B14",), "pressure in Pa"
    ),
    "unit above an argument": Fault(_put("Bends", D4="Q [gpm]"), "U02", ("Bends!D4",), '"gpm"'),
    "unit above a result": Fault(_put("Bends", G4="Fx [N]"), "U02", ("Bends!G4",), '"N"'),
    "unit beside a result": Fault(_put("Bends", C14="N"), "U02", ("Bends!C14",), '"N"'),
    "unit beside an input": Fault(_put("Inputs", C3="bar"), "U02", ("Inputs!C3",), '"bar"'),
    "unit beside the source of an input": Fault(
        _put("Bends", C5="=F14", C14=None, B14=None, F14=400.0, G14="bar"), "U02", ("Bends!G14",), '"bar"'
    ),
    "unit above a rounded result": Fault(
        _put(
            "Bends",
            G4="Fx [N]",
            **{
                f"G{row}": f'=IFERROR(ROUND(TB_BEND("Fx",Units,rho,B{row},C{row},D{row},E{row}),-1),0)'
                for row in range(FIRST, LAST + 1)
            },
        ),
        "U02",
        ("Bends!G4",),
        '"N"',
    ),
    "unit beside the largest result": Fault(
        _put("Bends", B14='=MAX(TB_CLOSED("F",Units,B5,Inputs!B3),0)', C14="N"), "U02", ("Bends!C14",), '"N"'
    ),
    "unit of another quantity": Fault(_put("Bends", C4="p1 [mm]"), "U02", ("Bends!C4",), "no unit of"),
    "unit above a column of a block": Fault(
        lambda book: (
            _put("Balance", F3="gpm")(book),
            _put("Balance", B8='=TB_BALANCE("Fx",Units,rho,A2:F2,A4:F6)')(book),
        ),
        "U02",
        ("Balance!F3",),
        '"gpm"',
    ),
    "unit above a result of a block": Fault(_put("Run", O7="F [lbf]"), "U02", ("Run!O7",), '"lbf"'),
    "flows that do not close": Fault(_put("Balance", F6=70.0), "M01", ("Balance!B8",), "do not close"),
    "flows that do not close in several results": Fault(
        _put("Balance", F6=70.0, B9='=TB_BALANCE("Fy",Units,rho,A2:F3,A4:F6)'),
        "M01",
        ("Balance!B8",),
        "and 1 more cell",
    ),
    "flows that close only by a wide tolerance": Fault(
        _put("Balance", F6=79.0, B8='=TB_BALANCE("Fx",Units,rho,A2:F3,A4:F6,,,,,0.05)'),
        "M01",
        ("Balance!B8",),
        "0.005",
        W,
    ),
    "another density typed into a formula": Fault(
        _put("Balance", B8='=TB_BALANCE("Fx",Units,1000,A2:F3,A4:F6)'), "D01", ("Balance!B8",), "1000", W
    ),
    "another density in the start of a run": Fault(_put("Run", B2=1000.0), "D01", ("Run!B2",), "1000", W),
    "one label with two values": Fault(
        _put("Balance", A10="test pressure", B10=950.0, A11="cap", B11='=TB_CLOSED("F",Units,400,B10)'),
        "D01",
        ("Balance!B10",),
        "950",
        W,
    ),
    "circle": Fault(_put("Inputs", E1="=E2+1", E2="=E1*2"), "S01", ("Inputs!E1",), "E1 -> Inputs!E2"),
    "circle that a call is part of": Fault(
        _put("Inputs", B3="=Bends!B14+1"), "S01", ("Inputs!B3",), "Inputs!B3 -> Bends!B14"
    ),
    "hidden row": Fault(_hide_row, "S02", ("Bends!7:7",), "row 7", W),
    "hidden columns": Fault(_hide_columns, "S02", ("Bends!C:D",), "columns C to D", W),
    "hidden sheet": Fault(_hide_sheet, "S02", ("Inputs",), "sheet is hidden", W),
    "fast flow": Fault(_put("Bends", D6=700.0), "H01", ("Bends!G6",), "above 6 m/s", W),
    "low pressure in a run": Fault(
        lambda book: (_put("Run", D10=70.0)(book), _no_cases(book), _put("Run", O8=_cases(book))(book)),
        "H01",
        ("Run!I10", "Run!O10"),
        "below",
        W,
    ),
    "a kind of case that is none": Fault(_put("Run", B15="tets"), "V03", ("Run!O8:O11",), "'tets'"),
    "no surge case": Fault(_no_surge, "C01", ("Run!O8",), "no surge among", W),
    "no load case": Fault(_no_cases, "C01", ("Run!I8",), "no load cases", W),
}


def _cases(book: Workbook) -> ArrayFormula:
    return ArrayFormula("O8:O11", '=TB_RUNCASES("F",Units,A2:C5,A7:F7,A8:F11,A13:D16)')


@pytest.mark.parametrize("name", FAULTS)
def test_a_fault_is_found_and_nothing_else(name: str, tmp_path: Path) -> None:
    fault = FAULTS[name]
    book = clean_book()
    fault.change(book)
    found = findings(stored(book, tmp_path / "book.xlsx", fault.before, fault.after))
    assert [(f.code, f.place) for f in found] == [(fault.code, place) for place in fault.places]
    for finding in found:
        assert finding.severity is fault.severity
        assert fault.words in f"{finding.what} {finding.why}"
        assert finding.what
        assert finding.why


def test_a_run_that_does_not_close_is_found(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    # The engine's runs close; so one of them is made to miss, where the rule asks for the closure.
    call = rules_physics.dispatch.call

    def missing(name: str, args: list[object]) -> object:
        return 1e-3 if (name, args[0]) == ("TB_RUN", "closure") else call(name, args)

    path = stored(clean_book(), tmp_path / "book.xlsx")
    monkeypatch.setattr(rules_physics.dispatch, "call", missing)
    # The cell with the closure is stale then, and its working disagrees with it.
    found = [f for f in findings(path) if f.code not in ("V01", "L01")]
    assert [(f.code, f.place) for f in found] == [("M02", "Run!I8")]


def _working(monkeypatch: pytest.MonkeyPatch, name: str, symbol: str, formula: str) -> None:
    """Put another formula into one step of a working, as if function and working came apart."""
    row = CATALOGUE[name]
    assert isinstance(row.longhand, Longhand)
    steps = [replace(s, formula=formula) if s.symbol == symbol else s for s in row.longhand.steps]
    assert list(row.longhand.steps) != steps
    changed = MappingProxyType(
        dict(CATALOGUE) | {name: replace(row, longhand=replace(row.longhand, steps=tuple(steps)))}
    )
    monkeypatch.setattr(calls, "CATALOGUE", changed)


@pytest.mark.parametrize(
    ("formula", "words"), [("{Q}/{A}*(1+1E-7)", "1.41471"), ("{Q}/0", "#DIV/0!")], ids=["near", "error"]
)
def test_a_working_that_gives_another_value_is_found(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, formula: str, words: str
) -> None:
    path = stored(clean_book(), tmp_path / "book.xlsx")
    _working(monkeypatch, "TB_VELOCITY", "V", formula)
    found = findings(path)
    assert [(f.code, f.place, f.severity) for f in found] == [("L01", "Bends!F5:F10", Severity.ERROR)]
    assert words in found[0].what


def test_a_working_of_ranges_is_compared_element_by_element(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    book = clean_book()
    book["Bends"]["K5"] = ArrayFormula("K5:K10", "=TB_VELOCITY(Units,D5:D10,B5:B10)")
    path = stored(book, tmp_path / "book.xlsx")
    assert findings(path) == []
    _working(monkeypatch, "TB_VELOCITY", "V", "IF({D}>0.5,1.1,1)*{Q}/{A}")
    # The array comes first; the single cell F10 has the same arguments and is not told again.
    assert [(f.code, f.place) for f in findings(path)] == [("L01", "Bends!K10")]


def test_a_working_of_a_table_that_gives_another_value_is_found(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    path = stored(clean_book(), tmp_path / "book.xlsx")
    row = CATALOGUE["TB_BALANCE"]
    assert isinstance(row.longhand, TableLonghand)
    single = tuple(
        replace(s, formula=f"({s.formula})*(1+1E-7)") if s.symbol == "Fx" else s for s in row.longhand.single
    )
    assert single != row.longhand.single
    changed = dict(CATALOGUE) | {row.name: replace(row, longhand=replace(row.longhand, single=single))}
    monkeypatch.setattr(workings, "CATALOGUE", changed)
    assert [(f.code, f.place) for f in findings(path)] == [("L01", "Balance!B8")]


def test_every_rule_has_a_fault() -> None:
    codes = [rule.code for rule in RULES]
    assert len(set(codes)) == len(codes)
    assert {fault.code for fault in FAULTS.values()} | {"L01", "M02", "M03"} == set(codes)
