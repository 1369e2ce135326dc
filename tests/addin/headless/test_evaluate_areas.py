"""Formulas that fill several cells: arrays, spilling formulas, large results."""

from __future__ import annotations

import zipfile
from pathlib import Path
from typing import Any

import pytest
from openpyxl.utils import get_column_letter

from .books import change_part, dynamic, evaluate, make, values


@pytest.fixture
def path(tmp_path: Path) -> Path:
    return tmp_path / "book.xlsx"


def sheet_xml(path: Path) -> str:
    with zipfile.ZipFile(path) as book:
        return book.read("xl/worksheets/sheet1.xml").decode()


def block(stored: dict[str, Any], cells: str) -> list[list[Any]]:
    first, last = cells.split(":")
    rows = range(int(first[1:]), int(last[1:]) + 1)
    columns = range(ord(first[0]), ord(last[0]) + 1)
    return [[stored.get(f"{chr(col)}{row}") for col in columns] for row in rows]


NA = "#N/A"


@pytest.mark.parametrize(
    ("ref", "formula", "expected"),
    [
        ("D1:E2", "=TB_GRID(2,2)", [[1, 2], [3, 4]]),
        ("D1:F3", "=TB_GRID(2,2)", [[1, 2, NA], [3, 4, NA], [NA, NA, NA]]),
        ("D1:E2", "=TB_GRID(3,3)", [[1, 2], [4, 5]]),
        ("D1:E2", "=TB_GRID(1,1)", [[1, 1], [1, 1]]),
        ("D1:E3", "=TB_GRID(1,2)", [[1, 2], [1, 2], [1, 2]]),
        ("D1:F2", "=TB_GRID(2,1)", [[1, 1, 1], [2, 2, 2]]),
        ("D1:E2", "=TB_TWICE(A1)", [[6, 6], [6, 6]]),
        ("D1:E2", "=TB_GRID(2,2)*10", [[10, 20], [30, 40]]),
        ("D1:F1", "=TB_ROW()", [[1, 2, "three"]]),
        ("D1:D1", "=TB_GRID(2,2)", [[1]]),
        ("D1:D2", "=A1:A2*TB_TWICE(1)", [[6], [10]]),
    ],
)
def test_an_array_formula_is_fitted_to_its_extent(
    path: Path, ref: str, formula: str, expected: list[list[Any]]
) -> None:
    make(path, {"S": {"A1": 3, "A2": 5, "D1": (ref, formula), "G9": f"=COUNT({ref})"}})
    evaluate(path)
    assert block(values(path), ref) == expected
    numbers = sum(type(item) is int for row in expected for item in row)
    assert values(path)["G9"] == numbers


def test_too_large_an_extent_is_a_warning(path: Path) -> None:
    make(path, {"S": {"D1": ("D1:F3", "=TB_GRID(2,2)")}})
    evaluation = evaluate(path)
    assert evaluation.ok
    assert "S!D1: the array formula covers more cells than its result has" in evaluation.warnings[0]


def test_an_array_that_fails_as_a_whole(path: Path) -> None:
    make(path, {"S": {"A1": -1, "D1": ("D1:E2", "=TB_TWICE(A1)"), "F1": "=SUM(D1:E2)"}})
    evaluation = evaluate(path)
    assert block(values(path), "D1:E2") == [["#NUM!", "#NUM!"]] * 2
    assert {failed.a1 for failed in evaluation.errors} == {"D1", "E1", "D2", "E2", "F1"}
    assert all("x = -1" in failed.reason for failed in evaluation.errors if failed.a1 != "F1")


def test_one_bad_row_spoils_one_row_and_every_sum_over_it(path: Path) -> None:
    make(
        path,
        {
            "S": {
                "A1": 1,
                "A2": -2,
                "A3": 3,
                "B1": ("B1:B3", "=TB_TABLE(A1:A3)"),
                "C1": "=SUM(B1:B3)",
                "C2": "=B3",
            }
        },
    )
    evaluation = evaluate(path)
    assert block(values(path), "B1:B3") == [[2], ["#NUM!"], [6]]
    assert values(path)["C1"] == "#NUM!"
    assert values(path)["C2"] == 6
    assert [(e.a1, e.reason) for e in evaluation.errors if e.a1 == "B2"] == [
        ("B2", "x = -2 is out of range; it must not be negative")
    ]


def test_a_native_array_formula_feeds_a_call_cell_by_cell(path: Path) -> None:
    make(path, {"S": {"A1": 1, "A2": 2, "A3": 3, "B1": ("B1:B4", "=A1:A3*10"), "C1": ("C1:C2", "=5"),
                      "D2": "=TB_TWICE(B3)", "D3": "=TB_TWICE(B4)", "D4": "=TB_TWICE(C2)"}})  # fmt: skip
    evaluate(path)
    assert values(path)["D2"] == 60
    assert values(path)["D3"] == NA
    assert values(path)["D4"] == 10
    assert "B1" not in values(path)


def test_a_native_array_over_a_tb_cell_is_stored_whole(path: Path) -> None:
    make(path, {"S": {"A1": "=TB_TWICE(1)", "A2": 5, "B1": ("B1:B2", "=A1:A2+1"), "D1": "=B2"}})
    evaluate(path)
    assert block(values(path), "B1:B2") == [[3], [6]]
    assert values(path)["D1"] == 6


def test_a_plain_formula_shows_the_first_cell_and_leaves_its_neighbours(path: Path) -> None:
    make(
        path,
        {"S": {"A1": 1, "A2": 2, "D1": "=TB_GRID(3,3)", "D2": 99, "G1": "=TB_ROW()", "H1": 98,
               "D5": "=TB_TABLE(A1:A2)+1", "D6": 97, "J1": "=SUM(D1:D6)", "K1": "=TB_TWICE(1)"}},
    )  # fmt: skip
    evaluation = evaluate(path)
    stored = values(path)
    assert (stored["D1"], stored["D2"], stored["G1"], stored["H1"], stored["D5"], stored["D6"]) == (
        1,
        99,
        1,
        98,
        3,
        97,
    )
    assert stored["J1"] == 200
    assert "E1" not in stored
    assert [warning.split(":")[0] for warning in evaluation.warnings] == ["S!D1", "S!G1"]


def test_a_plain_range_means_the_formulas_own_row(path: Path) -> None:
    make(path, {"S": {"A1": 10, "A2": 20, "A3": 30, "B2": "=A1:A3+TB_TWICE(1)",
                      "C3": "=TB_TWICE(_xlfn.SINGLE(A1:A3))", "D1": "=A1:A3*2",
                      "E1": "=TB_TWICE(D1)"}})  # fmt: skip
    evaluate(path)
    assert values(path)["B2"] == 22
    assert values(path)["C3"] == 60
    assert values(path)["E1"] == 40


def test_a_spilling_formula_sets_its_own_extent(path: Path) -> None:
    make(path, {"S": {"A1": 3, "D1": ("D1:D1", "=TB_GRID(A1,2)"), "G1": "=SUM(D1:E9)",
                      "G2": "=SUM(_xlfn.ANCHORARRAY(D1))", "G3": "=E2", "H1": "=Free"}},
         names={"Free": "S!$E$3"}, edit=dynamic("D1"))  # fmt: skip
    evaluate(path)
    assert block(values(path), "D1:E3") == [[1, 2], [3, 4], [5, 6]]
    assert 'ref="D1:E3"' in sheet_xml(path)
    assert (values(path)["G1"], values(path)["G2"], values(path)["G3"], values(path)["H1"]) == (21, 21, 4, 6)
    # The result becomes smaller: what spilled before goes.
    change_part(path, "xl/worksheets/sheet1.xml", lambda xml: xml.replace("<v>3</v>", "<v>2</v>", 1))
    evaluate(path)
    assert block(values(path), "D1:E3") == [[1, 2], [3, 4], [None, None]]
    assert 'ref="D1:E2"' in sheet_xml(path)
    assert values(path)["G1"] == 10


@pytest.mark.parametrize("obstacle", [99, "text", "=1+1"])
def test_a_spilling_formula_never_overwrites_a_users_cell(path: Path, obstacle: Any) -> None:
    make(path, {"S": {"D1": ("D1:D1", "=TB_GRID(3,2)"), "E3": obstacle, "G1": "=D1"}}, edit=dynamic("D1"))
    evaluation = evaluate(path)
    stored = values(path)
    assert stored["D1"] == "#VALUE!"
    assert stored["G1"] == "#VALUE!"
    assert "D2" not in stored
    assert stored.get("E3") in (99, "text", None)
    reason = next(failed.reason for failed in evaluation.errors if failed.a1 == "D1")
    assert reason == "#SPILL!: the result needs 3 rows by 2 columns; E3 is not free"


def test_a_result_over_its_own_inputs_is_a_circle(path: Path) -> None:
    make(path, {"S": {"A1": 1, "A2": ("A2:A2", "=TB_TABLE(A1:A5)")}}, edit=dynamic("A2"))
    evaluation = evaluate(path)
    assert "circular" in evaluation.errors[0].reason
    assert values(path) == {"A1": 1, "A2": "#VALUE!"}


ROWS, COLS = 3000, 12
LAST = f"{get_column_letter(COLS)}{ROWS}"


def large(path: Path, extra: dict[str, Any], **options: Any) -> None:
    """A sheet whose A1:L3000 hold 1, 2, 3 ... row by row."""
    cells: dict[str, Any] = {
        f"{get_column_letter(c + 1)}{r + 1}": float(r * COLS + c + 1)
        for r in range(ROWS)
        for c in range(COLS)
    }
    make(path, {"S": cells | extra}, **options)


TOTAL = ROWS * COLS * (ROWS * COLS + 1) / 2


@pytest.mark.parametrize("ref", ["N1:N1", f"N1:Y{ROWS}"])
def test_a_result_beyond_the_spill_limit(path: Path, ref: str) -> None:
    large(
        path,
        {"N1": (ref, f"=TB_SCALED(A1:{LAST},2)"), "AA1": "=SUM(N:Y)", "AA2": f"=Y{ROWS}+1", "AA3": "=O2*10",
         "AA4": f"=SUM(TB_SCALED(A1:{LAST},3))", "AA5": "=TB_TWICE(P2500)"},
        edit=dynamic("N1"),
    )  # fmt: skip
    for _ in range(2):
        evaluation = evaluate(path)
        stored = values(path)
        assert evaluation.ok
        assert stored["AA1"] == 2 * TOTAL
        assert stored["AA2"] == 2 * ROWS * COLS + 1
        assert stored["AA3"] == 2 * 14 * 10
        assert stored["AA4"] == 3 * TOTAL
        assert stored["AA5"] == 4 * (2499 * COLS + 3)
        assert stored["S1777"] == 2 * (1776 * COLS + 6)
        assert evaluation.tables[0].grid.shape == (ROWS, COLS)
    assert f'ref="N1:Y{ROWS}"' in sheet_xml(path)


def test_large_results_that_feed_each_other(path: Path) -> None:
    large(
        path,
        {
            "N1": ("N1:N1", f"=TB_SCALED(A1:{LAST},2)"),
            "AA1": ("AA1:AA1", f"=TB_SCALED(N1:Y{ROWS},2)"),
            "AN1": (f"AN1:AY{ROWS}", f"=TB_SCALED(AA1:AL{ROWS},0.5)*1"),
            "BA1": f"=SUM(AN1:AY{ROWS})",
        },
        edit=dynamic("N1", "AA1"),
    )
    evaluation = evaluate(path)
    assert values(path)["BA1"] == 2 * TOTAL
    assert not evaluation.warnings


def test_a_large_result_with_something_in_its_way(path: Path) -> None:
    large(path, {"N1": ("N1:N1", f"=TB_SCALED(A1:{LAST},2)"), "P2000": "mine"}, edit=dynamic("N1"))
    evaluation = evaluate(path)
    assert (
        evaluation.errors[0].reason == "#SPILL!: the result needs 3000 rows by 12 columns; P2000 is not free"
    )
    assert values(path)["P2000"] == "mine"
    assert "O1" not in values(path)


def test_a_large_result_in_one_plain_cell(path: Path) -> None:
    large(path, {"N1": f"=TB_SCALED(A1:{LAST},2)", "O1": "=N1+1"})
    evaluation = evaluate(path)
    assert (values(path)["N1"], values(path)["O1"]) == (2, 3)
    assert len(evaluation.warnings) == 1
