"""The generated VBA: its text against known limits, and run by the VBA interpreter of LibreOffice.

LibreOffice stands for Excel, and a double written in Basic for xlwings' link to
Python. Changed for the run are only the line that names the module, the word
``Private`` where a test calls an inner function, and ``Value2``, which LibreOffice knows
as ``Value``. What LibreOffice cannot show is how Excel itself spreads an array.
"""

from __future__ import annotations

import json
import re
import subprocess
from pathlib import Path
from typing import Any

import pytest

from tests import libreoffice
from thrustbook.addin.catalogue.registry import CATALOGUE
from thrustbook.addin.catalogue.types import Row
from thrustbook.addin.hosts.excel.names import identifier, parameters
from thrustbook.addin.hosts.excel.vba import CVERR, PYTHON_MODULE, functions_module, statement, wrapper
from thrustbook.addin.hosts.excel.vba_relink import relink_module

from . import basic_doubles as doubles
from .vba_lint import lint

MODES = {
    "number": "1.5",
    "text": "'a text'",
    "true": "TRUE",
    "empty": "error 2015",
    "row": "(1 to 1; 1 to 5)[1.5, error 2036, 'x', FALSE, error 2042]",
    "column": "(1 to 2; 1 to 1)[-2.5; error 2023]",
    "table": "(1 to 2; 1 to 3)[1.5, error 2015, 'note'; error 2015, '', error 2000]",
    "#VALUE! (see TB_WHY)": "error 2015",
    "#NUM! (see TB_WHY)": "error 2036",
    "#N/A (see TB_WHY)": "error 2042",
    "#DIV/0! (see TB_WHY)": "error 2007",
    "#REF! (see TB_WHY)": "error 2023",
    "#NAME? (see TB_WHY)": "error 2029",
    "#NULL! (see TB_WHY)": "error 2000",
    "#NUM!": "'#NUM!'",
    "ask (see TB_WHY)": "'ask (see TB_WHY)'",
    "raise": "error 2015",
    "raise once": "2.5",
}
"""What the link answers, and what the cell must then get."""

FORMULAS = {
    "=[1]!TB_AREA(A1,B1)": ("=TB_AREA(A1,B1)", 1),
    "='C:\\a b\\thrustbook.xlam'!TB_AREA(,1)+1": ("=TB_AREA(,1)+1", 1),
    "='C:\\it''s\\thrustbook.xlam'!tb_area(,1)": ("=TB_AREA(,1)", 1),
    '=thrustbook.xlam!TB_AREA(1)*[2]!TB_WHY("x")': ('=TB_AREA(1)*TB_WHY("x")', 2),
    "=_xll.TB_AREA(1)": ("=TB_AREA(1)", 1),
    "=_xlfn._xlws.TB_AREA(1)": ("=TB_AREA(1)", 1),
    "=@[1]!TB_AREA(1)": ("=@TB_AREA(1)", 1),
    "=TB_AREA(1)": ("=TB_AREA(1)", 1),
    "=SUM('Sheet 1'!A1:A3)+[1]Sheet1!$A$1": ("=SUM('Sheet 1'!A1:A3)+[1]Sheet1!$A$1", 0),
    '="say [1]!TB_AREA(1) and ""x"""&[1]!TB_WHY("a")': ('="say [1]!TB_AREA(1) and ""x"""&TB_WHY("a")', 1),
    "=[1]!TB_NOTOURS(1)+[1]!OTHER(2)": ("=[1]!TB_NOTOURS(1)+[1]!OTHER(2)", 0),
    "=TB_AREA+1": ("=TB_AREA+1", 0),
    "=MYTB_AREA(1)": ("=MYTB_AREA(1)", 0),
    "=Pipes[D '[mm']]*[1]!TB_AREA(Pipes[@D],1)": ("=Pipes[D '[mm']]*TB_AREA(Pipes[@D],1)", 1),
}


def quoted(text: str) -> str:
    return '"' + text.replace('"', '""') + '"'


def loaded(module: str, public: tuple[str, ...] = ()) -> str:
    """Give a generated module as LibreOffice loads it."""
    text = re.sub(r'Attribute VB_Name = "\w+"\n', doubles.STANDARD, module.replace("\r\n", "\n"))
    for name in public:
        text, changed = re.subn(rf"Private (Function|Sub) {name}\(", rf"Public \1 {name}(", text)
        assert changed == 1
    return text.replace(".Value2", ".Value")


def basic_function(name: str, body: list[str]) -> str:
    return "\n".join(
        [f"Public Function {name}() As String", *(f"    {line}" for line in body), "End Function"]
    )


def wrapper_calls(row: Row) -> tuple[list[str], list[str]]:
    """Give Basic that calls a wrapper with every count of arguments, and what it must tell."""
    values = [f"{i + 1}.25" if i % 2 else quoted(f"a{i}") for i in range(len(parameters(row)))]
    told = [f"{i + 1}.25" if i % 2 else f"'a{i}'" for i in range(len(values))]
    if row.max_args is None:
        values, told = [*values, "7.5", ""], [*told, "7.5", "empty"]
        values, told = [*values, "8.5"], [*told, "8.5"]
    least = 0 if row.max_args is not None else len(parameters(row)) - 1
    body, expected = ["Dim s As String", 'Start "number"'], []
    for count in range(least, len(values) + 1):
        padded = told[:count]
        if row.max_args is not None:
            padded += ["empty"] * (len(values) - count)
        if count and values[count - 1] == "":
            continue
        body.append(f's = s & Told({row.name}({", ".join(values[:count])})) & " " & link_log & Chr(10)')
        expected.append(f"1.5 {PYTHON_MODULE} {row.name}(0 to {len(padded) - 1})[{', '.join(padded)}]")
    if row.max_args is not None and len(values) > 1:
        body.append(f's = s & Told({row.name}(, {values[1]})) & " " & link_log & Chr(10)')
        padded = ["empty", told[1], *["empty"] * (len(values) - 2)]
        expected.append(f"1.5 {PYTHON_MODULE} {row.name}(0 to {len(padded) - 1})[{', '.join(padded)}]")
    for mode in ("#NUM! (see TB_WHY)", "row", "raise"):
        body += [f"Start {quoted(mode)}", f"s = s & Told({row.name}({', '.join(values[:1])})) & Chr(10)"]
        expected.append(MODES[mode])
    return [*body, f"Check_{row.name} = s"], expected


@pytest.fixture(scope="module")
def office(tmp_path_factory: pytest.TempPathFactory) -> dict[str, Any]:
    """Run everything in one office; give the answers by the name of the Basic function."""
    checks = {f"Check_{name}": wrapper_calls(row)[0] for name, row in CATALOGUE.items()}
    for i, mode in enumerate(MODES):
        checks[f"Mode{i}"] = [f"Start {quoted(mode)}", f"Mode{i} = Told(TB_VERSION(1))"]
    checks["LongText"] = ['Start "long text"', "LongText = Len(TB_VERSION()) & Right(TB_VERSION(), 1)"]
    checks["Faults"] = [
        "Dim s As String",
        'Start "raise"',
        's = Told(TB_VERSION()) & " " & link_faults & " " & link_starts',
        'Start "number"',
        's = s & "; " & Told(TB_VERSION()) & " " & link_starts',
        "Faults = s",
    ]
    checks["Refused"] = [
        "Dim s As String",
        'Start "raise"',
        "s = Told(TB_VERSION())",
        'Start "refuse"',
        "s = Told(TB_VERSION()) & Told(TB_VERSION()) & Told(TB_VERSION())",
        'Refused = s & " " & link_starts',
    ]
    for i, formula in enumerate(FORMULAS):
        checks[f"Plain{i}"] = [
            "Dim n As Long, s As String",
            f"s = TbPlain({quoted(formula)}, n)",
            f'Plain{i} = s & " " & n',
        ]
    checks["RelinkFault"] = [
        "Dim b As Object",
        "Set b = New Book",
        "b.Calculation = -4105",
        "RelinkFault = TbRelinkBook(b, b) & Chr(10) & b.Calculation",
    ]
    checks["Relink"] = RELINK.strip().split("\n")
    job = {
        "modules": {
            "Python": doubles.PYTHON,
            "Link": doubles.LINK,
            "Cell": doubles.CELL,
            "Sheet": doubles.SHEET,
            "Book": doubles.BOOK,
            "NameOf": doubles.NAME,
            "Wrappers": loaded(functions_module()),
            "Relinker": loaded(relink_module(), ("TbPlain", "TbRelinkBook")),
            "Checks": doubles.STANDARD
            + RELINK_PARTS
            + "\n".join(basic_function(n, b) for n, b in checks.items()),
        },
        "cells": {
            "A1": 300,
            "A2": "=1/0",
            "A3": "text",
            "A5": 4,
            "C1": "=TB_VERSION(A1)",
            "C2": "=TB_VERSION(A1:A3)",
            "C3": "=TB_VERSION(A3:B3)",
            "C4": "=TB_VERSION(A4)",
        },
        "calls": [f"Checks.{name}" for name in checks],
        "read": ["C1", "C2", "C3", "C4"],
    }
    folder = tmp_path_factory.mktemp("office")
    (folder / "job").write_text(json.dumps(job), encoding="utf-8")
    script = Path(__file__).with_name("office_run.py")
    subprocess.run(
        [libreoffice.uno_python(), str(script), str(folder / "job"), str(folder / "answers")],
        check=True,
        timeout=400,
        stdin=subprocess.DEVNULL,
    )
    told = json.loads((folder / "answers").read_text(encoding="utf-8"))
    return {**dict(zip(checks, told["answers"], strict=True)), **told["shown"]}


RELINK_PARTS = r"""
Private Function NewCell(ByVal address As String, ByVal text As String, ByVal modern As Boolean) As Object
    Dim c As Object
    Set c = New Cell
    c.Address = address
    c.Text = text
    c.Modern = modern
    Set NewCell = c
End Function
"""

RELINK = r"""
Dim b As Object, s As Object, c As Object, kept As New Collection, sheets As New Collection
Dim names As New Collection, n As Object, t As String, one As New Collection
kept.Add NewCell("$B$1", "=[1]!TB_AREA(1)", True)
kept.Add NewCell("$B$2", "=TB_AREA(1)", False)
kept.Add NewCell("$B$3", "=SUM(A1)", True)
kept.Add NewCell("$B$4", "=[1]!TB_AREA(4)", True)
kept(4).Refuses = True
kept.Add NewCell("$A$1", "=[1]!TB_AREA(5)", True)
kept(5).HasArray = True
kept.Add NewCell("$A$2", "=[1]!TB_AREA(5)", True)
kept(6).HasArray = True
kept.Add NewCell("$D$1", "=[1]!TB_AREA(7)", True)
kept(7).HasArray = True
kept(7).Spilled = True
kept(7).Parent = "$D$1"
kept.Add NewCell("$D$2", "=[1]!TB_AREA(7)", True)
kept(8).Parent = "$D$1"
Set s = New Sheet
s.Name = "Calc"
Set s.Kept = kept
sheets.Add s
Set s = New Sheet
s.Name = "Blank"
sheets.Add s
Set s = New Sheet
s.Name = "Locked"
s.ProtectContents = True
one.Add NewCell("$A$1", "=[1]!TB_AREA(9)", True)
Set s.Kept = one
sheets.Add s
Set n = New NameOf
n.Name = "Area"
n.RefersTo = "=[1]!TB_AREA(Data!$A$1)"
names.Add n
Set b = New Book
Set b.Worksheets = sheets
Set b.Names = names
b.Calculation = -4105
t = TbRelinkBook(b, b) & Chr(10)
For Each c In kept
    t = t & c.Text & " " & c.Writes & Chr(10)
Next c
t = t & one(1).Text & Chr(10) & n.RefersTo & Chr(10) & b.Calculation
Relink = t
"""


@pytest.mark.parametrize("name", CATALOGUE)
def test_every_wrapper_runs_with_every_count_of_arguments(name: str, office: dict[str, Any]) -> None:
    expected = wrapper_calls(CATALOGUE[name])[1]
    assert office[f"Check_{name}"].split("\n")[:-1] == expected


@pytest.mark.parametrize(("i", "mode"), list(enumerate(MODES)))
def test_answers_become_cell_values(i: int, mode: str, office: dict[str, Any]) -> None:
    assert office[f"Mode{i}"] == MODES[mode]


def test_long_texts_are_whole(office: dict[str, Any]) -> None:
    assert office["LongText"] == "3001#"


def test_a_fault_shows_as_value_error_and_python_is_started_once_more(office: dict[str, Any]) -> None:
    assert office["Faults"] == "error 2015 2 1; 1.5 1"


def test_a_python_that_refuses_is_not_asked_for_every_formula(office: dict[str, Any]) -> None:
    assert office["Refused"] == "error 2015error 2015error 2015 1"


def test_ranges_of_a_sheet_arrive_as_values(office: dict[str, Any]) -> None:
    assert office["C1"] == "(0 to 0)[300]"
    assert office["C2"].startswith("(0 to 0)[(1 to 3; 1 to 1)[300; ")
    assert office["C2"].endswith("; 'text']]")
    assert office["C3"] == "(0 to 0)[(1 to 1; 1 to 2)['text', empty]]"
    assert office["C4"] == "(0 to 0)[empty]"


@pytest.mark.parametrize(("i", "formula"), list(enumerate(FORMULAS)))
def test_prefixes_are_stripped_from_our_functions_only(i: int, formula: str, office: dict[str, Any]) -> None:
    plain, calls = FORMULAS[formula]
    assert office[f"Plain{i}"] == f"{plain} {calls}"


def test_relink_puts_the_calculation_back_after_a_fault(office: dict[str, Any]) -> None:
    told = office["RelinkFault"].split("\n")
    assert told[0].startswith("0 formulas")
    assert told[2].startswith("the rest: ")
    assert told[-1] == "-4105"


def test_relink_enters_our_formulas_again_and_reports_the_rest(office: dict[str, Any]) -> None:
    assert office["Relink"].split("\n") == [
        "5 formulas with functions of thrustbook were entered again.",
        "Left as they were:",
        "Calc!$B$4: Excel does not take it",
        "Locked (the sheet is protected)",
        "=TB_AREA(1) 1",
        "=TB_AREA(1) 1",
        "=SUM(A1) 0",
        "=[1]!TB_AREA(4) 0",
        "=TB_AREA(5) 1",
        "=[1]!TB_AREA(5) 0",
        "=TB_AREA(7) 1",
        "=[1]!TB_AREA(7) 0",
        "=[1]!TB_AREA(9)",
        "=TB_AREA(Data!$A$1)",
        "-4105",
    ]


@pytest.mark.parametrize("text", [functions_module(), relink_module()], ids=["functions", "relink"])
def test_vba_keeps_the_limits(text: str) -> None:
    assert lint(text) == []


@pytest.mark.parametrize(
    ("text", "finding"),
    [
        ("Sub A()\r\nEnd Sub\r\nSub a()\r\nEnd Sub\r\n", "one name"),
        ("Sub A(b, B)\r\nEnd Sub\r\n", "stands twice"),
        ("Sub A(to)\r\nEnd Sub\r\n", "word of VBA"),
        ("Sub A(" + ", ".join(f"x{i}" for i in range(61)) + ")\r\nEnd Sub\r\n", "61 parameters"),
        ("x = " + "1" * 1020 + "\r\n", "1024 characters"),
        ("x = 1 _\r\n" * 25 + "+ 1\r\n", "continuations"),
        ('x = "a\r\n', "does not end"),
        ("Sub A()\r\n", "does not end"),
        ('x = "\u00b3"\r\n', "ASCII"),
        ("Sub A(x)\r\nDim x\r\nEnd Sub\r\n", "both a parameter and a variable"),
        ("Sub A" + "b" * 260 + "()\r\nEnd Sub\r\n", "no identifier"),
        ("x = 1\n", "Windows"),
    ],
)
def test_lint_finds_what_it_is_for(text: str, finding: str) -> None:
    assert finding in "; ".join(lint(text))


def test_names_differ_where_vba_tells_no_difference() -> None:
    assert identifier("to") == "to_"
    assert identifier("lambda") == "lambda_"
    assert identifier("D", frozenset({"d"})) == "D_"
    assert identifier("D1") == "D1"


def test_long_statements_are_continued_between_items() -> None:
    lines = statement("Public Function F(", [f"Optional a{i} As Variant" for i in range(40)], ") As Variant")
    assert all(len(line) <= 102 for line in lines)
    assert all(line.endswith(", _") for line in lines[:-1])
    joined = " ".join(line.removesuffix(" _").strip() for line in lines)
    assert joined.count("Optional") == 40
    assert joined.endswith("a39 As Variant) As Variant")


def test_every_function_has_one_wrapper() -> None:
    text = functions_module()
    for name, row in CATALOGUE.items():
        assert text.count(f"Public Function {name}(") == 1
        assert wrapper(row).replace("\n", "\r\n") in text
    assert set(CVERR.values()) == {2000, 2007, 2015, 2023, 2029, 2036, 2042}
