"""Bad input of every kind: a true error that names what is wrong, and only where it is wrong."""

from __future__ import annotations

import math

import numpy as np
import pytest

from thrustbook.addin.cells import Cell, CellError
from thrustbook.addin.dispatch import call, why

NA = CellError("NA")
HEADINGS: list[list[Cell]] = [["name", "fitting", "rho", "D1", "p1", "Q", "theta"]]
GOOD: list[Cell] = ["B1", "bend", 1000.0, 300.0, 400.0, 120.0, 90.0]


def schedule(*rows: list[Cell], headings: Cell = HEADINGS, result: str = "F", units: Cell = "metric") -> Cell:
    return call("TB_SCHEDULE", [result, units, headings, list(rows)])


def refused(outcome: object, kind: str, *says: str) -> None:
    assert isinstance(outcome, CellError), outcome
    assert outcome.kind == kind, outcome
    for text in says:
        assert text in outcome.message, outcome.message


def one_bad_row(bad: list[Cell], kind: str, *says: str) -> None:
    """The bad row is an error with its reason in the note; the rows around it stand, a sum fails."""
    forces = schedule(GOOD, bad, GOOD)
    assert isinstance(forces, np.ndarray)
    assert forces[0, 0] == forces[2, 0] == call("TB_BEND", ["F", "metric", *GOOD[2:]])
    assert isinstance(forces[1, 0], CellError)
    assert forces[1, 0].kind == kind
    notes = schedule(GOOD, bad, GOOD, result="note")
    assert isinstance(notes, np.ndarray)
    assert notes[0, 0] == ""
    for text in says:
        assert text in notes[1, 0], notes[1, 0]


def changed(**values: Cell) -> list[Cell]:
    return [values.get(str(name), cell) for name, cell in zip(HEADINGS[0], GOOD, strict=True)]


def test_a_wrong_unit_names_the_argument_the_unit_and_what_was_expected() -> None:
    refused(call("TB_AREA", [None, "300 psi"]), "VALUE", "D", "psi", "mm")
    headings = [["fitting", "rho", "D1 [kPa]", "p1", "Q", "theta"]]
    refused(schedule(GOOD[1:], headings=headings), "VALUE", "D1", "kPa", "mm")
    refused(schedule(GOOD, units=[["diameter", "psi"]]), "VALUE", "psi", "diameter")


def test_an_unknown_heading_offers_the_nearest() -> None:
    headings = [["name", "fitting", "rho", "D1", "p1", "Q", "tetha"]]
    refused(schedule(GOOD, headings=headings), "VALUE", '"tetha"', "theta")


def test_a_missing_column_is_named() -> None:
    refused(schedule(GOOD[2:], headings=[HEADINGS[0][2:]]), "VALUE", "fitting", "missing")
    notes = schedule(GOOD[:3] + GOOD[4:], headings=[HEADINGS[0][:3] + HEADINGS[0][4:]], result="note")
    assert isinstance(notes, np.ndarray)
    assert "D1" in notes[0, 0]
    assert "not given" in notes[0, 0]


def test_a_doubled_heading_and_headings_that_do_not_fit() -> None:
    headings = [["name", "fitting", "rho", "D1", "p1", "Q", "Q"]]
    refused(schedule(GOOD, headings=headings), "VALUE", "Q", "twice")
    refused(schedule(GOOD, headings=[["fitting", "rho"]]), "VALUE", "2 columns", "7")


def test_a_negative_diameter() -> None:
    one_bad_row(changed(D1=-300.0), "NUM", "D1", "above 0")


def test_text_in_a_number_column() -> None:
    one_bad_row(changed(p1="four bar"), "VALUE", "p1", "four bar")


def test_a_logical_value_in_a_number_column() -> None:
    one_bad_row(changed(Q=True), "VALUE", "Q", "TRUE")


def test_an_error_cell_is_passed_on() -> None:
    one_bad_row(changed(Q=NA), "NA", "#N/A")


def test_an_unknown_fitting_names_those_there_are() -> None:
    one_bad_row(changed(fitting="bnd"), "VALUE", "bnd", "bend", "reducer", "nozzle")


def test_an_empty_row_stays_empty_and_an_empty_table_is_refused() -> None:
    forces = schedule(GOOD, [None] * 7, GOOD)
    assert isinstance(forces, np.ndarray)
    assert forces[1, 0] == ""
    refused(schedule([None] * 7, [None] * 7), "VALUE", "empty")
    refused(call("TB_SCHEDULE", ["F", "metric", HEADINGS, None]), "VALUE", "table", "empty")


def test_flows_that_do_not_close() -> None:
    headings = [["nx", "ny", "nz", "D", "p", "Q"]]
    ports = [[-1.0, 0.0, 0.0, 300.0, 400.0, -100.0], [0.0, 1.0, 0.0, 300.0, 395.0, 90.0]]
    outcome = call("TB_BALANCE", ["F", "metric", 1000.0, headings, ports])
    refused(outcome, "NUM", "add up")


def test_a_nozzle_with_neither_flow_nor_pressure_or_with_both() -> None:
    refused(call("TB_NOZZLE", ["F", "metric", 1000.0, 100.0, 50.0]), "NUM", "p1", "Q")
    refused(call("TB_NOZZLE", ["F", "metric", 1000.0, 100.0, 50.0, 300.0, 20.0]), "NUM", "p1", "Q")


def test_an_argument_omitted_between_commas_is_empty_and_never_zero() -> None:
    # Without the pressure the flow gives it; a pressure of 0 would be a contradiction.
    outcome = call("TB_NOZZLE", ["F", "metric", 1000.0, 100.0, 50.0, None, 20.0])
    assert isinstance(outcome, float)
    refused(call("TB_BEND", ["F", "metric", 1000.0, None, 400.0, 120.0, 90.0]), "VALUE", "D1")


def test_pressure_below_vapour_pressure_is_a_warning_in_the_note_and_no_error() -> None:
    row = changed(p1=-100.5)
    forces = schedule(row)
    assert isinstance(forces, np.ndarray)
    assert math.isfinite(forces[0, 0])
    notes = schedule(row, result="note")
    assert isinstance(notes, np.ndarray)
    assert "boils" in notes[0, 0]
    assert why("TB_BEND", ["F", "metric", *row[2:]]) == notes[0, 0]
    high = [[*NODES[0]], [*NODES[1][:3], 75.0, *NODES[1][4:]], [*NODES[2]]]
    start = [*START, ["pv", 2.3]]
    assert isinstance(run(high, start=start)[1, 0], float)  # type: ignore[index]
    assert "vapour" in str(run(high, "note", start)[1, 0])  # type: ignore[index]


START: list[list[Cell]] = [["rho", 1000.0], ["mu", 1.3], ["Q", 100.0], ["p", 500.0]]
NODE_HEADINGS: list[list[Cell]] = [["name", "x", "y", "z", "D", "e"]]
NODES: list[list[Cell]] = [
    ["A", 0.0, 0.0, 10.0, 300.0, 0.1],
    ["B", 50.0, 0.0, 10.0, 300.0, 0.1],
    ["C", 50.0, 60.0, 12.0, 300.0, 0.1],
]


def run(nodes: list[list[Cell]], result: str = "F", start: list[list[Cell]] = START) -> Cell:
    return call("TB_RUN", [result, "metric", start, NODE_HEADINGS, nodes])


def test_coincident_nodes_are_named() -> None:
    nodes = [NODES[0], ["A2", *NODES[0][1:]], NODES[2]]
    forces, notes = run(nodes), run(nodes, "note")
    assert isinstance(forces, np.ndarray)
    assert isinstance(notes, np.ndarray)
    assert all(isinstance(c, CellError) for c in forces[:, 0])
    assert all("0 m from the node before" in note for note in notes[:, 0])
    assert 'node "A2" (row 2)' in notes[0, 0]


@pytest.mark.parametrize(
    ("node", "column", "value", "kind", "says"),
    [
        (1, 4, -300.0, "NUM", "D"),
        (1, 4, "wide", "VALUE", "D"),
        (2, 1, None, "VALUE", "x"),
        (0, 3, NA, "NA", ""),
    ],
)
def test_a_bad_node_fails_the_run_and_says_which(
    node: int, column: int, value: Cell, kind: str, says: str
) -> None:
    nodes = [list(line) for line in NODES]
    nodes[node][column] = value
    forces, notes = run(nodes), run(nodes, "note")
    assert isinstance(forces, np.ndarray)
    assert isinstance(notes, np.ndarray)
    assert all(isinstance(c, CellError) for c in forces[:, 0])
    assert forces[node, 0].kind == kind
    assert says in notes[node, 0]


def test_a_start_block_with_an_unknown_or_missing_name() -> None:
    outcome = run(NODES, start=[["rho", 1000.0], ["mu", 1.3], ["flow", 100.0], ["p", 500.0]])
    refused(outcome, "VALUE", '"flow"')
    refused(run(NODES, start=[["mu", 1.3], ["Q", 100.0], ["p", 500.0]]), "VALUE", "rho")
