"""Formulas of the spreadsheet's own that the embedded evaluator cannot compute."""

from __future__ import annotations

from pathlib import Path

import pytest

from .books import change_part, evaluate, make, values, with_values


@pytest.fixture
def path(tmp_path: Path) -> Path:
    return tmp_path / "book.xlsx"


@pytest.mark.parametrize(
    ("formula", "reason"),
    [
        ("NOSUCHFUNCTION({})", "does not know the function NOSUCHFUNCTION"),
        ('CUBEVALUE("x",{})', "does not know the function CUBEVALUE"),
        ("_xlfn.LAMBDA(_xlpm.x,_xlpm.x+1)({})", "LAMBDA"),
        ("[1]Rates!$A$1+{}", "another workbook"),
        ("'[2]Other rates'!B2*{}", "another workbook"),
        ("[1]!OTHERADDIN({})", "function of another file"),
        ("SUM(Links,{})", "another workbook"),
        ("SUM(({},A1))+SUM(A1:A2 A2:A3)", "cannot compute this formula"),
    ],
)
def test_the_stored_value_stays_and_feeds_the_calls(path: Path, formula: str, reason: str) -> None:
    make(
        path,
        {"S": {"A1": 3, "A2": 4, "C1": "=" + formula.format("A2"), "C2": "=TB_TWICE(C1)",
               "D1": "=TB_TWICE(A1)", "D2": "=" + formula.format("D1")}},
        names={"Links": "[1]Rates!$A$1"},
        edit=with_values({"C1": "<v>42</v>", "D2": 't="str"|<v>kept</v>'}),
    )  # fmt: skip
    evaluation = evaluate(path)
    stored = values(path)
    assert stored["C1"] == 42
    assert stored["C2"] == 84
    assert stored["D2"] == "kept"
    assert [(kept.a1, kept.depends_on_tb) for kept in evaluation.native_kept] == [("C1", False), ("D2", True)]
    assert all(reason in kept.reason for kept in evaluation.native_kept)
    assert [kept.a1 for kept in evaluation.stale] == ["D2"]
    assert not evaluation.errors
    assert not evaluation.ok


def test_without_a_stored_value_the_calls_fail_and_say_why(path: Path) -> None:
    make(path, {"S": {"A1": 3, "C1": "=NOSUCHFUNCTION(A1)", "C2": "=C1+1", "C3": "=TB_TWICE(C2)"}})
    evaluation = evaluate(path)
    assert values(path) == {"A1": 3, "C3": "#N/A"}
    assert evaluation.errors[0].reason == "it follows from S!C2, which could not be computed"
    assert [kept.a1 for kept in evaluation.native_kept] == ["C1", "C2"]
    assert "S!C1" in evaluation.native_kept[1].reason


def test_a_tb_formula_that_cannot_be_computed_keeps_its_value_too(path: Path) -> None:
    make(
        path,
        {
            "S": {
                "A1": 3,
                "C1": "=TB_TWICE(NOSUCHFUNCTION(A1))",
                "C2": "=TB_TWICE(NOSUCHFUNCTION(A1))",
                "C3": "=C1",
            }
        },
        edit=with_values({"C1": "<v>42</v>"}),
    )
    evaluation = evaluate(path)
    assert values(path) == {"A1": 3, "C1": 42, "C2": "#NAME?", "C3": 42}
    assert [kept.a1 for kept in evaluation.stale] == ["C1"]
    assert [(failed.a1, failed.error) for failed in evaluation.errors] == [("C2", "#NAME?")]
    assert "NOSUCHFUNCTION" in evaluation.errors[0].reason


def test_an_error_out_of_sound_inputs_where_a_value_is_stored_is_not_believed(path: Path) -> None:
    """The evaluator is no judge of a formula that the spreadsheet has computed."""
    make(
        path,
        {"S": {"A1": "text", "C1": "=A1+1", "C2": "=TB_TWICE(C1)", "C3": "=1/0", "C4": "=C3+1"}},
        edit=with_values({"C1": "<v>5</v>", "C3": 't="e"|<v>#DIV/0!</v>', "C4": 't="e"|<v>#DIV/0!</v>'}),
    )
    evaluation = evaluate(path)
    assert values(path)["C2"] == 10
    assert [kept.a1 for kept in evaluation.native_kept] == ["C1"]
    assert "#VALUE! where the file holds 5" in evaluation.native_kept[0].reason


def test_an_ordinary_error_after_changed_inputs_is_a_result(path: Path) -> None:
    make(
        path,
        {"S": {"A1": 3, "B1": "=TB_TWICE(A1)", "B2": "=1/(B1-6)", "B3": "=B2+1", "B4": "=1/(B1-6)"}},
        edit=with_values({"B1": "<v>8</v>", "B2": "<v>0.5</v>", "B3": "<v>1.5</v>"}),
    )
    evaluation = evaluate(path)
    assert values(path) == {"A1": 3, "B1": 6, "B2": "#DIV/0!", "B3": "#DIV/0!", "B4": "#DIV/0!"}
    assert not evaluation.native_kept
    assert {failed.a1 for failed in evaluation.errors} == {"B2", "B3", "B4"}


def test_the_same_error_with_unchanged_inputs_is_not(path: Path) -> None:
    make(
        path,
        {"S": {"A1": 3, "B1": "=TB_TWICE(A1)", "B2": "=1/(B1-6)"}},
        edit=with_values({"B1": "<v>6</v>", "B2": "<v>0.5</v>"}),
    )
    evaluation = evaluate(path)
    assert values(path)["B2"] == 0.5
    assert [kept.a1 for kept in evaluation.stale] == ["B2"]


def test_an_error_that_follows_from_a_tb_error_is_stored(path: Path) -> None:
    make(
        path,
        {"S": {"A1": -3, "B1": "=TB_TWICE(A1)", "B2": "=B1+1", "B3": "=SUM(B1:B2)"}},
        edit=with_values({"B1": "<v>6</v>", "B2": "<v>7</v>", "B3": "<v>13</v>"}),
    )
    evaluation = evaluate(path)
    assert values(path) == {"A1": -3, "B1": "#NUM!", "B2": "#NUM!", "B3": "#NUM!"}
    assert not evaluation.native_kept


def test_a_circle_without_tb_cells_keeps_its_values(path: Path) -> None:
    make(
        path,
        {"S": {"A1": "=A2+1", "A2": "=A1*0.5", "B1": "=TB_TWICE(A1)"}},
        edit=with_values({"A1": "<v>2</v>", "A2": "<v>1</v>"}),
    )
    evaluation = evaluate(path)
    assert values(path) == {"A1": 2, "A2": 1, "B1": 4}
    assert all("circular" in kept.reason for kept in evaluation.native_kept)
    assert not evaluation.stale


def test_a_data_table_is_never_touched(path: Path) -> None:
    def table(xml: str) -> str:
        new = '<c r="C2"><f t="dataTable" ref="C2:C3" dt2D="0" dtr="0" r1="A1"/><v>10</v></c>'
        return xml.replace('<c r="C2" t="n"><v>10</v></c>', new)

    make(
        path,
        {"S": {"A1": 3, "B2": 1, "B3": 2, "C1": "=TB_TWICE(A1)", "C2": 10, "C3": 20, "D1": "=TB_TWICE(C3)"}},
        edit=table,
    )
    evaluation = evaluate(path)
    stored = values(path)
    assert (stored["C1"], stored["C2"], stored["C3"], stored["D1"]) == (6, 10, 20, 40)
    assert [(kept.a1, kept.depends_on_tb) for kept in evaluation.native_kept] == [("C2", True)]


def test_a_kept_array_formula_keeps_all_its_cells(path: Path) -> None:
    make(
        path,
        {
            "S": {
                "A1": 3,
                "B1": ("B1:B2", "=NOSUCHFUNCTION(A1)"),
                "C1": "=TB_TWICE(B2)",
                "C2": "=TB_TWICE(B1)",
            }
        },
    )
    change_part(
        path,
        "xl/worksheets/sheet1.xml",
        lambda xml: xml.replace("</f><v></v></c>", "</f><v>7</v></c>", 1).replace(
            '<row r="2">', '<row r="2"><c r="B2"><v>8</v></c>'
        ),
    )
    evaluate(path)
    assert values(path) == {"A1": 3, "B1": 7, "B2": 8, "C1": 16, "C2": 14}


def test_results_that_rest_on_a_stale_value_are_named(path: Path) -> None:
    make(
        path,
        {"S": {"A1": 3, "B1": "=TB_TWICE(A1)", "B2": "=NOSUCHFUNCTION(B1)", "B3": "=TB_TWICE(B2)"}},
        edit=with_values({"B2": "<v>5</v>"}),
    )
    evaluation = evaluate(path)
    assert values(path)["B3"] == 10
    assert evaluation.warnings == ["1 cells were computed from values that could not be renewed: S!B3"]
