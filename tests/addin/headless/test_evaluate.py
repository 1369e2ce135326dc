"""Whole workbooks through the evaluator: spellings, references, errors and what is stored."""

from __future__ import annotations

import re
import zipfile
from datetime import datetime
from pathlib import Path
from typing import Any

import pytest

from thrustbook.addin.hosts.headless.host import Functions
from thrustbook.addin.hosts.headless.model import Model
from thrustbook.addin.hosts.headless.run import reader
from thrustbook.addin.xlsx.package import Package

from .books import FUNCTIONS, evaluate, make, values, with_values


@pytest.fixture
def path(tmp_path: Path) -> Path:
    return tmp_path / "book.xlsx"


def formulas(path: Path, part: str = "xl/worksheets/sheet1.xml") -> list[str]:
    with zipfile.ZipFile(path) as book:
        return re.findall(r"<f.*?(?:/>|</f>)", book.read(part).decode())


@pytest.mark.parametrize(
    ("formula", "value"),
    [
        ("=TB_TWICE(A1)", 6),
        ("=tb_twice(A1)", 6),
        ("=[1]!TB_TWICE(A1)", 6),
        ("='C:\\a b\\it''s.xlam'!TB_TWICE(A1)", 6),
        ("=thrustbook.xlam!TB_TWICE(A1)+_xll.TB_TWICE(1)", 8),
        ("=TB_DEFAULT(1,2,3)", 123),
        ("=TB_DEFAULT(1,,3)", 173),
        ("=TB_DEFAULT(,,)", 777),
        ("=TB_DEFAULT( , 2 , )", 727),
        ("=TB_DEFAULT()", 777),
        ("=TB_DEFAULT(1,0,3)", 103),
        ("=TB_DEFAULT(1,Z9,3)", 173),
        ("=TB_DEFAULT(1,IF(A1>0,2,0),3)", 123),
        ("=IF(A1>0,TB_TWICE(A1),0)", 6),
        ("=IFERROR(TB_TWICE(A2),0)", 0),
        ('=IF(ISERROR(TB_TWICE(A2)),"bad","good")', "bad"),
        ("=TB_TWICE(TB_TWICE(A1))", 12),
        ("=-TB_TWICE(A1)^2", 36),
        ('="F = "&TB_TWICE(A1)&" kN"', "F = 6 kN"),
        ('=TB_ECHO("a,""b",TRUE,A1)', "['a,\"b', True, 3.0]"),
        ("=TB_ECHO(Z1,A1:B2)", "[None, [[3.0, 'text'], [-1.0, None]]]"),
        ("=TB_ECHO({1,2;3,4})", "[[[1.0, 2.0], [3.0, 4.0]]]"),
        ("=SUM(TB_TABLE(A3:A5))", 24),
        ("=SUM(A:A,TB_TABLE(A3:A5))", 40),
        ("=SUMPRODUCT(TB_TABLE(A3:A5),A3:A5)", 100),
        ("=INDEX(TB_TABLE(A3:A5),2,1)", 8),
        ("=SUM(TB_TABLE(Pipes[Flow]))", 60),
        ("=SUM(TB_TABLE(Pipes))", 66),
        ("=TB_TWICE(Pipes[[#Totals],[Flow]])", "#REF!"),
        ("=TB_TWICE('In puts'!B2)", 20),
        ("=SUM(TB_TABLE('In puts'!B:B))", "#NUM!"),
        ("=SUM(TB_TABLE('In puts'!B2:B3))", 60),
        ("=TB_TWICE(Flow)", 20),
        ("=Doubled", 20),
        ("=Doubled+1", 21),
        ("=SUM(Nested)", 60),
        ("=SUM(Nested,Doubled)", 80),
        ("=LET(x,A1,TB_TWICE(x)+x)", 9),
    ],
)
def test_calls_work_wherever_a_formula_allows_them(path: Path, formula: str, value: Any) -> None:
    make(
        path,
        {
            "S": {"A1": 3, "A2": -1, "A3": 3, "A4": 4, "A5": 5, "A6": 2, "B1": "text", "D1": formula},
            "In puts": {"A1": "No", "B1": "Flow", "A2": 1, "B2": 10, "A3": 2, "B3": 20, "B4": -5},
        },
        names={"Flow": "'In puts'!$B$2", "Doubled": "TB_TWICE(Flow)", "Nested": "Table2+0",
               "Table2": "TB_TABLE('In puts'!$B$2:$B$3)"},
        tables=[("In puts", "Pipes", "A1:B3")],
    )  # fmt: skip
    evaluate(path)
    assert values(path)["D1"] == value


def test_a_local_name_goes_before_the_workbooks(path: Path) -> None:
    make(
        path,
        {"S": {"A1": 1, "B1": "=K"}, "T": {"A1": 5, "B1": "=K", "B2": "=S!K"}},
        names={"K": "TB_TWICE(S!$A$1)"},
        local_names=[("T", "K", "TB_TWICE(T!$A$1)")],
    )
    evaluate(path)
    assert values(path, "S")["B1"] == 2
    assert values(path, "T")["B1"] == 10
    assert values(path, "T")["B2"] == 2


def test_a_name_with_free_references_counts_from_its_cell(path: Path) -> None:
    make(path, {"S": {"A2": 4, "A3": 6, "B2": "=Left", "B3": "=Left"}}, names={"Left": "TB_TWICE(S!$A1)"})
    evaluate(path)
    assert (values(path)["B2"], values(path)["B3"]) == (8, 12)


def test_names_in_a_circle_are_reported(path: Path) -> None:
    make(path, {"S": {"A1": "=One"}}, names={"One": "TB_TWICE(Two)", "Two": "One+1"})
    evaluation = evaluate(path)
    assert "refers to itself" in evaluation.errors[0].reason


def test_shared_formulas_as_a_fill_down_is_saved(path: Path) -> None:
    def share(xml: str) -> str:
        xml = xml.replace(
            "<f>TB_TWICE(A1)+$A$1</f>", '<f t="shared" ref="B1:B4" si="0">TB_TWICE(A1)+$A$1</f>'
        )
        for row in (2, 3, 4):
            xml = xml.replace(f"<f>GAP{row}</f>", '<f t="shared" si="0"/>')
        return xml

    make(
        path,
        {"S": {"A1": 1, "A2": 2, "A3": -3, "A4": 4, "B1": "=TB_TWICE(A1)+$A$1"}
         | {f"B{r}": f"=GAP{r}" for r in (2, 3, 4)}},
        edit=share,
    )  # fmt: skip
    before = formulas(path)
    evaluation = evaluate(path)
    assert [values(path)[f"B{r}"] for r in range(1, 5)] == [3, 5, "#NUM!", 9]
    assert formulas(path) == before
    assert [(e.a1, e.error, e.reason) for e in evaluation.errors] == [
        ("B3", "#NUM!", "x = -3 is out of range; it must not be negative")
    ]


def test_only_tb_cells_and_their_dependents_are_stored(path: Path) -> None:
    make(
        path,
        {
            "S": {
                "A1": 3, "B1": "=TB_TWICE(A1)", "B2": "=B1+1", "B3": "=SUM(B:B)*0+SUM(A1:A2)", "B4": "=A1+1",
                "C1": "=SUM(B1:B2)", "C2": "=Total", "C3": "=INDIRECT(\"B1\")", "C4": "=SUM(A1:A3)",
                "D1": "=T!A1", "D9": "=COUNTA(C:C)",
            },
            "T": {"A1": "=SUM(S!B1:S!B2)", "A2": "=S!A1*2", "B1": 1, "B2": "=SUM(Wide[f])"},
            "U": {"A1": "e", "B1": "f", "A2": 1, "B2": "=S!B1"},
        },
        names={"Total": "SUM(S!$B$1:$B$2)"},
        tables=[("U", "Wide", "A1:B2")],
    )  # fmt: skip
    evaluate(path)
    stored = {place for place in values(path) if place != "A1"}
    assert stored == {"B1", "B2", "B3", "C1", "C2", "C3", "D1", "D9"}
    assert set(values(path, "T")) == {"A1", "B1", "B2"}
    assert values(path, "T")["B2"] == 6
    assert values(path, "U")["B2"] == 6


def test_columns_of_a_table_beside_a_tb_column_stay(path: Path) -> None:
    make(
        path,
        {"S": {"A1": "x", "B1": "F", "C1": "own", "D1": "of F",
               "A2": 2, "B2": "=TB_TWICE(T[[#This Row],[x]])", "C2": "=T[[#This Row],[x]]+1",
               "D2": "=T[[#This Row],[F]]+1",
               "A3": 3, "B3": "=TB_TWICE(T[[#This Row],[x]])", "C3": "=T[[#This Row],[x]]+1",
               "D3": "=T[[#This Row],[F]]+1"}},
        tables=[("S", "T", "A1:D3")],
    )  # fmt: skip
    evaluate(path)
    found = values(path)
    assert (found["B2"], found["B3"], found["D2"], found["D3"]) == (4, 6, 5, 7)
    assert "C2" not in found
    assert "C3" not in found


def test_fill_native_adds_what_has_no_value(path: Path) -> None:
    make(
        path,
        {"S": {"A1": 3, "B1": "=TB_TWICE(A1)", "C1": "=A1*5", "C2": "=A1*7"}},
        edit=with_values({"C2": "<v>1</v>"}),
    )
    evaluate(path, fill_native=True)
    assert values(path) == {"A1": 3, "B1": 6, "C1": 15, "C2": 1}


def test_fill_native_works_without_tb_formulas(path: Path) -> None:
    make(path, {"S": {"A1": 3, "C1": "=A1*5"}})
    evaluation = evaluate(path, fill_native=True)
    assert values(path)["C1"] == 15
    assert evaluation.warnings == ["no cell of this workbook holds a TB_ formula"]


def test_a_workbook_without_tb_formulas_is_left_alone(path: Path) -> None:
    make(path, {"S": {"A1": 3, "C1": "=A1*5"}})
    before = path.read_bytes()
    evaluation = evaluate(path)
    assert evaluation.replaced == {}
    assert evaluation.warnings
    assert evaluation.ok
    assert path.read_bytes() == before


def test_a_second_evaluation_changes_nothing(path: Path) -> None:
    make(path, {"S": {"A1": 3, "B1": "=TB_TWICE(A1)/7", "C1": ("C1:D2", "=TB_GRID(2,2)"), "E1": '=B1&"x"'}})
    evaluate(path)
    assert evaluate(path).replaced == {}


def test_kinds_of_values(path: Path) -> None:
    make(
        path,
        {"S": {"A1": 2, "B1": "=TB_TWICE(A1)>3", "B2": '=TB_TWICE(A1)&""', "B3": "=TB_TWICE(A1)/0",
               "B4": "=IF(TB_TWICE(A1)>0,Z1,1)", "B5": "=DATE(2024,1,TB_TWICE(A1))",
               "B6": "=TB_TWICE(1E300)*1E300"}},
    )  # fmt: skip
    evaluate(path)
    found = values(path)
    assert found["B1"] is True
    assert found["B2"] == "4"
    assert found["B3"] == "#DIV/0!"
    assert found["B4"] == 0
    assert found["B5"] == 45295
    assert found["B6"] == "#NUM!"


def test_a_date_reaches_the_function_as_its_number(path: Path) -> None:
    make(path, {"S": {"A1": datetime(2024, 1, 5), "B1": "=TB_TWICE(A1)", "B2": "=TB_ECHO(A1:A1)"}})
    evaluate(path)
    assert values(path)["B1"] == 2 * 45296
    assert "45296.0" in values(path)["B2"]


def test_errors_with_their_reasons(path: Path) -> None:
    make(
        path,
        {"S": {"A1": -3, "A2": "wide", "A3": "=1/0", "B1": "=TB_TWICE(A1)", "B2": "=TB_TWICE(A2)",
               "B3": "=TB_TWICE(A3)", "B4": "=TB_TWICE(1,2)", "B5": "=TB_NOPE(1)", "B6": "=B1*2",
               "B7": "=SUM(B1:B2)", "B8": "=TB_TWICE(1)+TB_TWICE(A1)", "B9": "=TB_TWICE(1)/0",
               "B10": "=TB_TWICE([1]Other!A1)", "B11": "=SUM(TB_TABLE(A1:A1))", "B12": "=TB_TWICE(Nowhere)"}},
    )  # fmt: skip
    evaluation = evaluate(path)
    found = {failed.a1: (failed.error, failed.reason) for failed in evaluation.errors}
    negative = "x = -3 is out of range; it must not be negative"
    assert found["B1"] == ("#NUM!", negative)
    assert found["B2"] == ("#VALUE!", "a number is wanted, not 'wide'")
    assert found["B3"][0] == "#DIV/0!"
    assert found["B4"] == ("#VALUE!", "one argument is wanted, 2 were given")
    assert found["B5"] == ("#NAME?", "there is no function TB_NOPE")
    assert found["B6"] == ("#NUM!", "it follows from S!B1")
    assert found["B7"] == ("#NUM!", "it follows from S!B1")
    assert found["B8"] == ("#NUM!", f"TB_TWICE: {negative}")
    assert found["B9"] == ("#DIV/0!", "the TB_ functions gave values, but the formula around them fails")
    assert "another workbook" in found["B10"][1]
    assert found["B11"] == ("#NUM!", negative)
    assert found["B12"][0] == "#NAME?"
    stored = values(path)
    assert all(stored[a1] == error for a1, (error, _) in found.items())
    assert not evaluation.ok
    assert next(failed for failed in evaluation.errors if failed.a1 == "B1").formula == "=TB_TWICE(A1)"


def test_a_circle_is_reported_and_does_not_hang(path: Path) -> None:
    make(
        path,
        {
            "S": {
                "A1": "=TB_TWICE(A2)",
                "A2": "=A1+1",
                "A3": "=TB_TWICE(4)",
                "A4": "=IF(FALSE,A5,1)",
                "A5": "=A4+A3",
            }
        },
    )
    evaluation = evaluate(path)
    assert {failed.a1 for failed in evaluation.errors} == {"A1", "A2"}
    assert all("circular" in failed.reason for failed in evaluation.errors)
    assert values(path) == {"A1": "#VALUE!", "A2": "#VALUE!", "A3": 8, "A4": 1, "A5": 9}


def test_a_function_that_breaks_its_word_never_stores_nonsense(path: Path) -> None:
    answers = {"TB_NAN": float("nan"), "TB_NONE": None, "TB_INT": 5}
    broken = Functions(lambda name, args: answers[name], dict.fromkeys(answers, False))
    make(path, {"S": {"A1": "=TB_NAN()", "A2": "=TB_NONE()", "A3": "=TB_INT()", "A4": "=SUM(A1:A3)"}})
    evaluate(path, broken)
    assert values(path)["A1"] == "#NUM!"
    assert values(path)["A2"] == "#N/A"
    assert values(path)["A3"] == 5
    assert values(path)["A4"] in ("#NUM!", "#N/A")


def test_the_report(path: Path) -> None:
    make(
        path,
        {"S": {"A1": 3, "B1": "=TB_TWICE(TB_TWICE(A1))", "C1": ("C1:D2", "=TB_GRID(2,2)"), "E1": "=B1"}},
    )
    evaluation = evaluate(path)
    assert evaluation.counts == {"TB_TWICE": 2, "TB_GRID": 1}
    assert [(c.sheet, c.a1, c.functions, c.value, c.kind) for c in evaluation.cells] == [
        ("S", "B1", ("TB_TWICE",), 12.0, "plain"),
        ("S", "C1", ("TB_GRID",), 1.0, "array"),
    ]
    assert evaluation.stored == 6
    table = evaluation.tables[0]
    assert (table.sheet, table.a1, table.function, table.grid.tolist()) == (
        "S",
        "C1",
        "TB_GRID",
        [[1, 2], [3, 4]],
    )


def test_progress_is_told(path: Path) -> None:
    make(path, {"S": {f"A{row}": f"=TB_TWICE({row})" for row in range(1, 601)}})
    told: list[tuple[str, int, int]] = []
    evaluate(path, progress=lambda stage, done, total: told.append((stage, done, total)))
    assert [stage for stage in dict.fromkeys(stage for stage, _, _ in told)] == ["read", "evaluate", "store"]
    assert ("evaluate", 512, 600) in told


def test_conditional_formats_and_validations_are_reported(path: Path) -> None:
    from openpyxl import load_workbook
    from openpyxl.formatting.rule import FormulaRule
    from openpyxl.worksheet.datavalidation import DataValidation

    names = {"Twice": "TB_TWICE(S!$A$1)", "Plain": "S!$A$1"}
    make(path, {"S": {"A1": 3, "B1": "=TB_TWICE(A1)"}}, names=names)
    book = load_workbook(path)
    book["S"].conditional_formatting.add("A1:A9", FormulaRule(formula=["TB_TWICE(A1)>5"], stopIfTrue=True))
    book["S"].conditional_formatting.add("C1:C9", FormulaRule(formula=["A1>5"], stopIfTrue=True))
    rule = DataValidation(type="custom", formula1="TB_TWICE(B1)<9")
    rule.add("B1:B3")
    book["S"].add_data_validation(rule)
    for place, formula in (("D1:D3", "twice>5"), ("E1:E3", "Plain>5")):
        through = DataValidation(type="custom", formula1=formula)
        through.add(place)
        book["S"].add_data_validation(through)
    book.save(path)
    evaluation = evaluate(path)
    assert [tuple(found) for found in evaluation.not_evaluated] == [
        ("S", "A1:A9", "TB_TWICE(A1)>5"),
        ("S", "B1:B3", "TB_TWICE(B1)<9"),
        ("S", "D1:D3", "twice>5"),
    ]
    assert evaluation.ok


def test_many_single_cells_with_errors(path: Path) -> None:
    cells: dict[str, Any] = {f"A{row}": -row for row in range(1, 1001)}
    cells |= {f"B{row}": f"=TB_TWICE(A{row})" for row in range(1, 1001)}
    make(path, {"S": cells})
    evaluation = evaluate(path)
    assert len(evaluation.errors) == 1000
    assert evaluation.errors[499].reason == "x = -500 is out of range; it must not be negative"


def test_functions_are_called_once_for_a_cell(path: Path) -> None:
    made: list[str] = []

    def call(name: str, args: Any) -> Any:
        made.append(name)
        return FUNCTIONS.call(name, args)

    make(path, {"S": {"A1": 3, "B1": "=TB_TWICE(A1)", "B2": "=B1+1", "B3": "=SUM(B1:B2)"}})
    evaluate(path, Functions(call, FUNCTIONS.block))
    assert made == ["TB_TWICE"]


@pytest.mark.parametrize("chosen", ["native", "umya"])
def test_both_readers_of_the_evaluator_see_the_same_workbook(
    path: Path, monkeypatch: pytest.MonkeyPatch, chosen: str
) -> None:
    monkeypatch.setattr("thrustbook.addin.hosts.headless.run.reader", lambda model: chosen)
    make(
        path,
        {
            "S": {"A1": 3, "A2": "text", "A3": True, "A4": "#DIV/0!", "A5": datetime(2024, 1, 5),
                  "B1": "=TB_ECHO(A1:A6)",
                  "C1": ("C1:D2", "=TB_GRID(2,2)"), "E1": "=SUM(C1:D2)+TB_TWICE(Q)",
                  "E2": "=TB_DEFAULT(1,,3)"},
            "In puts": {"A1": "Flow", "A2": 10, "B1": "=SUM(T[Flow])+S!E1"},
        },
        names={"Q": "'In puts'!$A$2"},
        tables=[("In puts", "T", "A1:A2")],
    )  # fmt: skip
    evaluate(path)
    stored = values(path)
    assert stored["B1"] == (
        "[[[3.0], ['text'], [True], [CellError(kind='DIV0', message='')], [45296.0], [None]]]"
    )
    assert (stored["E1"], stored["E2"], values(path, "In puts")["B1"]) == (30, 173, 40)


def test_the_slow_reader_is_for_many_formulas_with_ranges(path: Path) -> None:
    chosen: dict[int, str] = {}
    for rows in (20, 6000):
        make(path, {"S": {f"B{row}": f"=TB_TWICE(1)+SUM(A{row}:A{row + 1})" for row in range(1, rows + 1)}})
        chosen[rows] = reader(Model(Package.read(path), FUNCTIONS))
    assert chosen == {20: "native", 6000: "umya"}
