"""TB_RUN and TB_RUNCASES, from ranges through the dispatcher."""

from __future__ import annotations

import copy
import math
from typing import Any

import numpy as np
import pytest

from thrustbook.addin.cells import CellError
from thrustbook.addin.dispatch import call, why
from thrustbook.engine.constants import G
from thrustbook.engine.properties import water
from thrustbook.engine.run import run
from thrustbook.engine.runflow import RunStart
from thrustbook.engine.runshape import RunTable

START: list[list[Any]] = [["rho", 1000.0], ["mu", 1.0], ["Q", 100.0], ["p", 500.0, "kPa"]]
WATER: list[list[Any]] = [["fluid", "Water"], ["T", 15.0], *START[2:]]
HEADINGS: list[list[Any]] = [["name", "x", "y", "z", "D [mm]", "e", "K"]]
TABLE: list[list[Any]] = [
    ["A", 0.0, 0.0, 10.0, 300.0, 0.1, None],
    ["B", 50.0, 0.0, 10.0, 300.0, 0.1, 0.2],
    ["C", 50.0, 60.0, 12.0, 200.0, 0.1, 0.1],
    ["D", 50.0, 90.0, 2.0, None, None, None],
]
CASES: list[list[Any]] = [
    ["case", "kind", "p [bar]", "dp", "Q"],
    ["normal", "operating", None, None, None],
    ["peak", "peak", None, None, 140.0],
    ["test", "test", 9.0, None, None],
    ["surge", "surge", None, 300.0, None],
    ["empty", "empty", None, None, None],
]


def table_with(row: int, column: int, value: Any) -> list[list[Any]]:
    table = copy.deepcopy(TABLE)
    table[row][column] = value
    return table


def tb_run(result: str, table: Any = TABLE, start: Any = START, headings: Any = HEADINGS) -> Any:
    return call("TB_RUN", [result, "metric", start, headings, table])


def tb_runcases(result: str, table: Any = TABLE, start: Any = START, cases: Any = CASES) -> Any:
    return call("TB_RUNCASES", [result, "metric", start, HEADINGS, table, cases])


def column(name: str, everything: Any, function: str = "TB_RUN") -> list[Any]:
    labels = call(function, ["labels"])
    assert isinstance(labels, np.ndarray)
    return everything[:, labels[0].tolist().index(name)].tolist()  # type: ignore[no-any-return]


def engine_run() -> Any:
    table = RunTable(
        x=[0, 50, 50, 50],
        y=[0, 0, 60, 90],
        z=[10, 10, 12, 2],
        D=[0.3, 0.3, 0.2, math.nan],
        e=1e-4,
        K=[0, 0.2, 0.1, 0],
    )
    return run(table, RunStart(rho=1000.0, mu=1e-3, Q=0.1, p=5e5))


def test_columns_are_the_engine_in_the_units_of_the_set() -> None:
    expected = engine_run()
    everything = tb_run("all")
    for name, values in (
        ("p2", expected.p2 / 1000),
        ("F", expected.F / 1000),
        ("Q1", expected.Q1 * 1000),
        ("EGL1", expected.EGL1),
        ("bearing", np.degrees(expected.bearing)),
        ("s", expected.s),
    ):
        found = np.array(column(name, everything), dtype=float)
        np.testing.assert_allclose(found, values, rtol=1e-12, atol=1e-12)
        np.testing.assert_array_equal(np.array(tb_run(name)[:, 0], dtype=float), found)
    assert column("name", everything) == ["A", "B", "C", "D"]
    assert column("fitting", everything) == ["straight", "bend", "bend, reducer", "straight"]
    assert column("note", everything)[0] == "ok"
    assert column("L", everything)[3] == ""  # no leg leaves the last node
    assert column("po", everything) == [""] * 4
    np.testing.assert_allclose(tb_run("fD")[:3, 0].astype(float), expected.f[:3], rtol=1e-12)


def test_closure_is_one_number() -> None:
    closure = tb_run("closure")
    assert isinstance(closure, float)
    assert closure < 1e-12
    assert tb_runcases("closure") < 1e-12


def test_labels_and_units_need_no_more_arguments() -> None:
    labels, units = call("TB_RUN", ["labels", "US"]), call("TB_RUN", ["units", "US"])
    assert isinstance(labels, np.ndarray)
    assert isinstance(units, np.ndarray)
    assert labels[0, 0] == "name"
    assert "closure" not in labels[0].tolist()
    assert units[0].tolist()[labels[0].tolist().index("p1")] == "psi"


def test_empty_rows_are_no_nodes() -> None:
    full = tb_run("all")
    longer = [*TABLE[:2], [None] * 7, *TABLE[2:], [None] * 7, [""] * 7]
    found = tb_run("all", longer)
    np.testing.assert_array_equal(found[[0, 1, 3, 4]], full)
    assert set(found[[2, 5, 6]].reshape(-1).tolist()) == {""}


def test_absolute_pressures_take_the_ambient_pressure_of_the_run() -> None:
    start: list[list[Any]] = [*START[:3], ["p", 580.0, "kPa(a)"], ["pamb", 80.0]]
    np.testing.assert_allclose(
        tb_run("p1", start=start)[:, 0].astype(float), tb_run("p1")[:, 0].astype(float), rtol=1e-12
    )
    units: list[list[Any]] = [["set", "metric"], ["pressure", "kPa(a)"]]
    found = call("TB_RUN", ["p1", units, start, HEADINGS, TABLE])
    assert isinstance(found, np.ndarray)
    assert found[0, 0] == pytest.approx(580.0, rel=1e-12)


def test_vapour_pressure_is_a_remark_and_no_error() -> None:
    start: list[list[Any]] = [*START[:3], ["p", -98.0], ["pv", 5.0]]
    everything = tb_run("all", start=start)
    assert "column separates" in column("note", everything)[1]
    assert not any(isinstance(v, CellError) for v in everything.reshape(-1))
    assert "column separates" in why("TB_RUN", ["F", "metric", start, HEADINGS, TABLE])


@pytest.mark.parametrize(
    ("row", "col", "value", "kind", "message"),
    [
        (1, 4, -300.0, "NUM", "D = -300 mm (allowed: above 0)"),
        (1, 3, "high", "VALUE", 'z: "high"'),
        (1, 3, None, "VALUE", "z = not given"),
        (1, 4, CellError("DIV0"), "DIV0", "#DIV/0!"),
        (1, 4, True, "VALUE", "D = TRUE"),
        (1, 4, "300 kg", "VALUE", "kg"),
        (1, 1, 0.0, "NUM", "from the node before"),
        (1, 5, None, "VALUE", "a roughness, or a friction factor"),
    ],
)
def test_a_bad_row_spoils_the_run_and_every_row_says_whose_fault_it_is(
    row: int, col: int, value: Any, kind: str, message: str
) -> None:
    everything = tb_run("all", table_with(row, col, value))
    notes = column("note", everything)
    assert message in notes[row]
    assert notes[3] == f'no result: node "B" (row 2): {notes[row]}'
    for name in ("F", "p1", "s"):
        for value in column(name, everything):
            assert isinstance(value, CellError)
            assert value.kind == kind
    assert column("name", everything) == ["A", "B", "C", "D"]
    closure = tb_run("closure", table_with(row, col, value))
    assert isinstance(closure, CellError)


def test_an_offtake_without_direction_spoils_its_own_row_only() -> None:
    headings = [[*HEADINGS[0], "Qo"]]
    table = [[*row, 10.0 if row[0] == "B" else None] for row in TABLE]
    everything = tb_run("all", table, headings=headings)
    forces = column("F", everything)
    assert [isinstance(v, CellError) for v in forces] == [False, True, False, False]
    assert "direction and a diameter" in column("note", everything)[1]
    closure = tb_run("closure", table, headings=headings)
    assert isinstance(closure, CellError)
    assert 'node "B"' in closure.message


@pytest.mark.parametrize(
    ("start", "message"),
    [
        ([["mu", 1.0], ["Q", 100.0], ["p", 500.0]], "rho is missing (allowed: rho, or fluid and T)"),
        ([["fluid", "oil"], *WATER[1:]], 'fluid = "oil" (allowed: water)'),
        ([WATER[0], *START[2:]], "T is missing"),
        ([["T", 15.0], *START], "T is given, but no fluid"),
        ([WATER[0], ["T", 150.0], *START[2:]], "T = 150 degC (allowed: at least 0 and at most 99.97)"),
        ([WATER[0], ["T", 15.0, "kPa"], *START[2:]], "kPa"),
        ([*START, ["nu", 1.0]], "only one of mu and nu"),
        ([*START, ["colour", "blue"]], '"colour" is not known'),
        ([*START, ["H", 80.0]], "only one of p and H"),
        ([*START, ["end", "open"]], "continues, jet, closed"),
        ([*START, ["end", "closed"]], "flows do not close"),
        ([*START[:2], ["p", 500.0]], "a flow, or a closed end"),
        ([["rho", -1.0], *START[1:]], "rho = -1"),
        ([["rho", CellError("NA")], *START[1:]], "#N/A"),
        ([["rho", 1000.0, "psi"], *START[1:]], "psi"),
        (None, "start is empty"),
    ],
)
def test_a_bad_start_is_one_error(start: Any, message: str) -> None:
    outcome = tb_run("F", start=start)
    assert isinstance(outcome, CellError)
    assert message in outcome.message


@pytest.mark.parametrize(
    ("headings", "table", "message"),
    [
        ([["name", "x", "y", "z", "D [psi]", "e", "K"]], TABLE, "psi"),
        ([["name", "x", "y", "z", "bore", "e", "K"]], TABLE, '"bore" is not known'),
        ([["name", "x", "y", "z", "", "e", "K"]], TABLE, "column D is missing"),
        ([["name", "x", "y", "y", "D", "e", "K"]], TABLE, "given twice"),
        (HEADINGS, [[None] * 7], "table is empty"),
        (HEADINGS, TABLE[:1], "at least 2 nodes"),
        ([["name", "x"]], TABLE, "headings have 2 columns"),
    ],
)
def test_a_bad_table_is_one_error(headings: Any, table: Any, message: str) -> None:
    outcome = tb_run("F", table, headings=headings)
    assert isinstance(outcome, CellError)
    assert message in outcome.message


def water_at(T: float) -> list[list[Any]]:
    found = water(T + 273.15)
    return [["rho", found.rho], ["mu", found.mu, "Pa s"], ["pv", found.pv, "Pa"], *START[2:]]


def test_a_fluid_and_its_temperature_stand_for_its_properties() -> None:
    low: list[list[Any]] = [["p", -98.0]]
    for found, given in ((WATER, water_at(15.0)), ([*WATER[:3], *low], [*water_at(15.0)[:4], *low])):
        np.testing.assert_array_equal(tb_run("all", start=found), tb_run("all", start=given))
        np.testing.assert_array_equal(tb_runcases("all", start=found), tb_runcases("all", start=given))
    for T in (["T", "59 °F"], ["T [degF]", 59.0], ["T", 288.15, "K"]):
        forces = tb_run("F", start=[WATER[0], T, *START[2:]])[:, 0].astype(float)
        np.testing.assert_allclose(forces, tb_run("F", start=WATER)[:, 0].astype(float), rtol=1e-12)


def test_vapour_pressure_of_hot_water_is_that_of_its_temperature() -> None:
    def remark(*more: list[Any]) -> str:
        start = [["fluid", "water"], ["T", 95.0], ["Q", 1.0], ["p", -25.0], *more]
        return str(tb_run("note", start=start)[0, 0])

    assert "column separates" in remark()  # it boils at 84.6 kPa, and 76.3 kPa are left
    assert "column separates" not in remark(["pv", 2.0])


@pytest.mark.parametrize(
    ("entry", "plain"),
    [
        (["rho", 1030.0], {0: ["rho", 1030.0]}),
        (["mu", 5.0], {1: ["mu", 5.0]}),
        (["pv", 90.0], {2: ["pv", 90.0]}),
        (["nu", 4.0, "cSt"], {1: ["nu", 4.0, "mm2/s"]}),
    ],
)
def test_an_entry_of_its_own_goes_before_the_fluid(entry: list[Any], plain: dict[int, list[Any]]) -> None:
    given = [plain.get(i, row) for i, row in enumerate(water_at(15.0))]
    np.testing.assert_array_equal(tb_run("all", start=[*WATER, entry]), tb_run("all", start=given))


def test_kinematic_viscosity_in_place_of_the_dynamic_one() -> None:
    start: list[list[Any]] = [["rho", 800.0], ["nu", 2.5], *START[2:]]
    plain: list[list[Any]] = [["rho", 800.0], ["mu", 2.0], *START[2:]]
    for name in ("Re", "fD"):
        found = tb_run(name, start=start)[:3, 0].astype(float)
        np.testing.assert_allclose(found, tb_run(name, start=plain)[:3, 0].astype(float), rtol=1e-12)


def test_words_are_read_without_regard_to_case() -> None:
    start: list[list[Any]] = [
        ["rho", 1000.0],
        ["mu", 1.0],
        ["p", 500.0],
        ["End", "Closed"],
        ["at", " START "],
    ]
    assert tb_run("fitting", start=start)[-1, 0] == "cap"


def test_cases_give_what_governs() -> None:
    everything = tb_runcases("all")
    by_case = tb_runcases("F_by_case")
    assert by_case.shape == (4, 5)
    values = by_case.astype(float)
    np.testing.assert_array_equal(values[:, 0], tb_run("F")[:, 0].astype(float))
    np.testing.assert_array_equal(values[:, 4], 0.0)
    names = [row[0] for row in CASES[1:]]
    assert column("F", everything, "TB_RUNCASES") == values.max(axis=1).tolist()
    assert column("case_F", everything, "TB_RUNCASES") == [names[i] for i in values.argmax(axis=1)]
    for component in ("Fx", "Fy", "Fz"):
        signed = tb_runcases(f"{component}_by_case").astype(float)
        largest = signed[np.arange(4), np.abs(signed).argmax(axis=1)]
        assert column(component, everything, "TB_RUNCASES") == largest.tolist()
    pressures = tb_runcases("p_by_case").astype(float)
    assert pressures[3, 2] == pytest.approx(900.0, rel=1e-12)  # the test gauge is at the lowest node
    assert pressures[0, 2] == pytest.approx(900.0 - 8 * G, rel=1e-12)
    assert column("case_p", everything, "TB_RUNCASES")[3] == "test"


def test_the_shut_valve_is_found_by_its_name() -> None:
    cases: list[list[Any]] = [
        ["case", "kind", "H", "valve"],
        ["shut", "shut", 80.0, "C"],
        ["all", "shut", 80.0, None],
    ]
    pressures = tb_runcases("p_by_case", cases=cases).astype(float)
    assert pressures[3, 0] == 0.0  # drained behind the valve
    assert pressures[3, 1] > 0.0
    cases[1][3] = "X"
    outcome = tb_runcases("F", cases=cases)
    assert isinstance(outcome, CellError)
    assert 'no node has the name of the valve, "X"' in outcome.message


def test_notes_name_their_cases() -> None:
    notes = tb_runcases("note")[:, 0].tolist()
    assert notes[0] == "ok"
    assert notes[2] == "normal, peak, surge: velocity above usual practice"


@pytest.mark.parametrize(
    ("cases", "message"),
    [
        (CASES[:1], "cases has one row"),
        ([CASES[0], ["a", "storm", None, None, None]], "case a: kind = 'storm'"),
        ([CASES[0], ["a", "surge", None, None, None]], "case a: dp = not given"),
        ([CASES[0], ["a", "test", "much", None, None]], "cases, row 1"),
        ([["case", "sort"], ["a", "test"]], '"sort" is not known'),
        ([["case", "p"], ["a", 3.0]], "kind is missing"),
        ([CASES[0], [None] * 5], "cases is empty"),
    ],
)
def test_bad_cases_are_one_error(cases: Any, message: str) -> None:
    outcome = tb_runcases("F", cases=cases)
    assert isinstance(outcome, CellError)
    assert message in outcome.message


def test_a_bad_node_under_cases_spoils_every_row() -> None:
    for name, width in (("F", 1), ("F_by_case", 5)):
        found = tb_runcases(name, table_with(1, 4, -3.0))
        assert found.shape == (4, width)
        assert all(isinstance(v, CellError) for v in found.reshape(-1))
        assert found[1, 0].message == "D = -3 mm (allowed: above 0)"


def test_ten_thousand_nodes_through_the_dispatcher() -> None:
    n = 10_000
    table = [[f"N{i}", 30.0 * i, 20.0 * (i % 2), 5.0, 300.0, 0.1, None] for i in range(n)]
    found = tb_run("all", table)
    assert found.shape[0] == n
    assert not any(isinstance(v, CellError) for v in found.reshape(-1))
    assert tb_run("closure", table) < 1e-9
