"""The cell contract, through the dispatcher."""

from __future__ import annotations

import math

import numpy as np
import pytest

from thrustbook.addin import dispatch
from thrustbook.addin.cells import Cell, CellError
from thrustbook.addin.dispatch import call, why
from thrustbook.engine import fittings, sections

NA = CellError("NA")
BEND: list[Cell] = ["Fx", "metric", 1000.0, 300.0, 400.0, 120.0, 90.0]


def with_argument(i: int, value: Cell) -> list[Cell]:
    return [*BEND[:i], value, *BEND[i + 1 :]]


def test_a_number_is_used_in_the_unit_set() -> None:
    expected = fittings.bend(1000.0, 0.3, 4e5, 0.12, math.pi / 2).Fx
    assert call("TB_BEND", BEND) == pytest.approx(expected / 1000, rel=1e-14)
    assert call("TB_BEND", ["Fx", None, 1000.0, 0.3, 4e5, 0.12, 90.0]) == pytest.approx(expected, rel=1e-14)


def test_text_that_is_a_quantity_is_used() -> None:
    assert call("TB_BEND", with_argument(3, "0.3 m")) == pytest.approx(call("TB_BEND", BEND), rel=1e-14)
    assert call("TB_BEND", with_argument(4, "4 bar")) == pytest.approx(call("TB_BEND", BEND), rel=1e-14)


def test_absolute_pressure_becomes_gauge_with_the_ambient_pressure() -> None:
    absolute = f"{400 + 101.325} kPa(a)"
    assert call("TB_BEND", with_argument(4, absolute)) == pytest.approx(call("TB_BEND", BEND), rel=1e-12)
    units = [["set", "metric"], ["pressure", "kPa(a)"]]
    args = ["p2", units, 1000.0, 300.0, 400 + 101.325, 0.0, 90.0]
    assert call("TB_BEND", args) == pytest.approx(400 + 101.325, rel=1e-12)


def test_an_empty_optional_argument_has_its_default() -> None:
    full = call("TB_BEND", [*BEND, 300.0, 0.0])
    assert call("TB_BEND", BEND) == full
    assert call("TB_BEND", [*BEND, None, None, None]) == full
    assert call("TB_BEND", [*BEND, "", " "]) == full


@pytest.mark.parametrize("i", range(2, 7))
@pytest.mark.parametrize(
    ("value", "kind"),
    [
        (None, "VALUE"),  # empty, required; also omitted between two commas
        ("", "VALUE"),
        ("three", "VALUE"),
        ("3 furlong", "VALUE"),
        (True, "VALUE"),
        (False, "VALUE"),
        (CellError("DIV0"), "DIV0"),
        (NA, "NA"),
        (CellError("REF"), "REF"),
        (math.nan, "NUM"),
        (math.inf, "NUM"),
        (-math.inf, "NUM"),
    ],
)
def test_what_is_no_number_is_a_true_error(i: int, value: Cell, kind: str) -> None:
    outcome = call("TB_BEND", with_argument(i, value))
    assert isinstance(outcome, CellError)
    assert outcome.kind == kind


def test_out_of_range_is_num_and_says_argument_value_and_range() -> None:
    outcome = call("TB_BEND", with_argument(3, -300.0))
    assert isinstance(outcome, CellError)
    assert outcome.kind == "NUM"
    assert "D1" in outcome.message
    assert "above 0" in outcome.message


def test_all_bad_arguments_are_reported_together() -> None:
    args = with_argument(3, "three")
    args[2] = "x kg"
    message = why("TB_BEND", args)
    assert "D1" in message
    assert "rho" in message
    message = why("TB_BEND", ["Fx", "metric", -1.0, -300.0, 400.0, 120.0, 90.0])
    assert "rho" in message
    assert "D1" in message


@pytest.mark.parametrize(
    ("result", "says"),
    [("Fq", "allowed"), (None, "empty"), (3.0, "not a word"), ("", "empty")],
)
def test_an_unknown_result_names_those_there_are(result: Cell, says: str) -> None:
    outcome = call("TB_BEND", [result, *BEND[1:]])
    assert isinstance(outcome, CellError)
    assert outcome.kind == "VALUE"
    assert says in outcome.message
    assert "Fx" in outcome.message


def test_a_result_is_found_without_regard_to_case() -> None:
    assert call("TB_BEND", ["FX", *BEND[1:]]) == call("TB_BEND", BEND)


def test_several_results_are_asked_for_by_name() -> None:
    some = call("TB_BEND", ["Fy, fx", *BEND[1:]])
    assert isinstance(some, np.ndarray)
    assert some.shape == (1, 2)
    assert some[0, 1] == call("TB_BEND", BEND)
    assert call("TB_BEND", ["labels: Fy, fx", *BEND[1:]]).tolist() == [["Fy", "Fx"]]
    assert call("TB_BEND", ["units:Fy,V1", *BEND[1:]]).tolist() == [["kN", "m/s"]]
    table = call("TB_BEND", ["V1,F", "metric", 1000.0, [[300.0], [200.0]], 400.0, 120.0, 90.0])
    assert isinstance(table, np.ndarray)
    assert table.shape == (2, 2)


def test_too_many_arguments_and_unknown_functions_are_errors() -> None:
    outcome = call("TB_BEND", [*BEND, *[1.0] * 30])
    assert isinstance(outcome, CellError)
    assert outcome.kind == "VALUE"
    outcome = call("TB_NOTHING", [])
    assert isinstance(outcome, CellError)
    assert outcome.kind == "NAME"


def test_a_unit_set_may_be_a_range_and_its_errors_are_passed_on() -> None:
    units = [["set", "metric"], ["force", "N"]]
    assert call("TB_BEND", ["Fx", units, *BEND[2:]]) == pytest.approx(1000 * call("TB_BEND", BEND), rel=1e-14)
    outcome = call("TB_BEND", ["Fx", [["force", NA]], *BEND[2:]])
    assert isinstance(outcome, CellError)
    assert outcome.kind == "NA"


def test_ranges_are_worked_element_by_element() -> None:
    diameters = [[200.0], [300.0], [None], [-1.0], ["x"], [NA], [0.4]]
    outcome = call("TB_AREA", ["metric", diameters])
    assert isinstance(outcome, np.ndarray)
    assert outcome.shape == (7, 1)
    assert outcome[1, 0] == pytest.approx(sections.area(0.3).A)
    kinds = [c.kind if isinstance(c, CellError) else "" for c in outcome[:, 0]]
    assert kinds == ["", "", "VALUE", "NUM", "VALUE", "NA", ""]
    assert "D" in outcome[3, 0].message


def test_a_row_and_a_column_make_a_table() -> None:
    outcome = call("TB_VELOCITY", ["metric", [[100.0, 200.0]], [[300.0], [400.0], [500.0]]])
    assert isinstance(outcome, np.ndarray)
    assert outcome.shape == (3, 2)
    assert outcome[2, 1] == pytest.approx(0.2 / sections.area(0.5).A)


def test_all_results_of_a_column_are_a_table_and_equal_single_calls() -> None:
    flows = [[0.0], [120.0], [-120.0]]
    outcome = call("TB_BEND", ["all", "US", 62.4, 12.0, 60.0, flows, 45.0])
    assert isinstance(outcome, np.ndarray)
    labels = call("TB_BEND", ["labels", "US"])
    for i, (q,) in enumerate(flows):
        for j, name in enumerate(labels[0]):
            assert outcome[i, j] == pytest.approx(call("TB_BEND", [name, "US", 62.4, 12.0, 60.0, q, 45.0]))


def test_ranges_that_do_not_fit_are_refused() -> None:
    outcome = call("TB_VELOCITY", ["metric", [[1.0], [2.0]], [[1.0], [2.0], [3.0]]])
    assert isinstance(outcome, CellError)
    assert "fit" in outcome.message


def test_a_range_of_one_cell_is_that_cell() -> None:
    assert call("TB_AREA", [[["metric"]], [[300.0]]]) == call("TB_AREA", ["metric", 300.0])


def test_why_answers_ok_warns_and_explains() -> None:
    assert why("TB_BEND", BEND) == "ok"
    assert "above 0" in why("TB_BEND", with_argument(3, -300.0))
    assert "error" in why("TB_BEND", with_argument(3, NA))
    deep = ["Fx", "metric", 1000.0, 300.0, -150.0, 120.0, 90.0]  # below absolute zero pressure
    assert why("TB_BEND", deep) != "ok"
    assert call("TB_WHY", ["TB_BEND", *BEND]) == "ok"


def test_the_answer_never_holds_an_empty_cell_or_a_number_that_is_none() -> None:
    outcome = call("TB_BEND", ["all", "metric", 1000.0, [[300.0], [None], [0.0]], 400.0, 120.0, 90.0])
    assert isinstance(outcome, np.ndarray)
    for cell in outcome.reshape(-1):
        assert isinstance(cell, CellError) or math.isfinite(cell)


def test_a_fault_of_ours_is_an_error_value_not_an_exception(monkeypatch: pytest.MonkeyPatch) -> None:
    def broken(row: object, args: object) -> None:
        raise RuntimeError("planted")

    monkeypatch.setattr(dispatch.elements, "evaluate", broken)
    outcome = call("TB_AREA", ["metric", 300.0])
    assert isinstance(outcome, CellError)
    assert "planted" in outcome.message


def test_convert() -> None:
    assert call("TB_CONVERT", [100.0, "psi", "kPa"]) == pytest.approx(689.4757293168361, rel=1e-14)
    outcome = call("TB_CONVERT", [[[1.0, "x"], [None, NA]], "ft", "m"])
    assert isinstance(outcome, np.ndarray)
    assert outcome[0, 0] == pytest.approx(0.3048)
    assert [c.kind for c in (outcome[0, 1], outcome[1, 0], outcome[1, 1])] == ["VALUE", "VALUE", "NA"]
    for bad in ([None, "ft", "m"], [1.0, "ft"], [1.0, "ft", "psi"], [True, "ft", "m"], [1.0, 3.0, "m"]):
        assert isinstance(call("TB_CONVERT", bad), CellError)


@pytest.mark.parametrize(
    ("name", "args", "words"),
    [
        (
            "TB_BEND",
            ["F", "metric", 998.0, -300.0, 4.0, 100.0, 200.0],
            "D1 = -300 mm (allowed: above 0); theta = 200 deg (allowed: at least 0 and at most 180)",
        ),
        ("TB_AREA", ["US", [[12.0], [-12.0]]], "element 2: D = -12 in (allowed: above 0)"),
        (
            "TB_SCHEDULE",
            ["F", "metric", [["fitting", "D1", "p1"]], [["closed", -200.0, 3.0], ["closed", 200.0, 3.0]]],
            "row 1: D1 = -200 mm (allowed: above 0)",
        ),
    ],
)
def test_a_reason_speaks_in_the_units_and_symbols_of_the_call(
    name: str, args: list[Cell], words: str
) -> None:
    assert why(name, args) == words


@pytest.mark.parametrize(
    ("name", "args", "words"),
    [
        ("TB_BEND", ["labels"], "ok"),
        ("TB_BEND", ["units", "US"], "ok"),
        ("TB_BEND", ["F", "metric", 998.0, 300.0, 4.0, 100.0], "theta is not given (it is required)"),
        ("TB_CONVERT", [[[1.0, "x"]], "bar", "psi"], "element 2: value is 'x' (allowed: a number)"),
    ],
)
def test_why_answers_for_headings_gaps_and_converted_ranges(name: str, args: list[Cell], words: str) -> None:
    assert why(name, args) == words
