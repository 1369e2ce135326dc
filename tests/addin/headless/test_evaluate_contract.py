"""The contract of what a cell gets, through real functions in a real workbook."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import pytest

from thrustbook.addin import dispatch
from thrustbook.addin.catalogue.registry import CATALOGUE
from thrustbook.addin.cells import ERROR_TEXT
from thrustbook.addin.hosts.headless.evaluate import Evaluation
from thrustbook.addin.hosts.headless.host import Functions

from .books import evaluate, make, values

REAL = Functions.of_catalogue()

# A sound call of each function: name, the arguments as formulas, and which of them is a required number.
CALLS = [
    ("TB_AREA", ['"metric"', "300"], 1),
    ("TB_VELOCITY", ['"metric"', "100", "300"], 2),
    ("TB_BEND", ['"Fx"', '"metric"', "998", "300", "400", "100", "90"], 3),
    ("TB_REDUCER", ['"Fx"', '"metric"', "998", "300", "200", "400", "100"], 4),
    ("TB_CLOSED", ['"F"', '"metric"', "300", "1000"], 2),
]


@pytest.fixture
def path(tmp_path: Path) -> Path:
    return tmp_path / "book.xlsx"


def run(
    path: Path, formulas: dict[str, str], cells: dict[str, Any] | None = None
) -> tuple[dict[str, Any], Evaluation]:
    make(path, {"S": {**(cells or {}), **formulas}})
    evaluation = evaluate(path, REAL)
    return values(path), evaluation


def call(name: str, arguments: list[str], place: int | None = None, argument: str = "") -> str:
    given = list(arguments)
    if place is not None:
        given[place] = argument
    return f"={name}({','.join(given)})"


@pytest.mark.parametrize(("name", "arguments", "place"), CALLS)
def test_each_row_of_the_contract(path: Path, name: str, arguments: list[str], place: int) -> None:
    number = arguments[place]
    cases = {
        "A1": call(name, arguments),
        "A2": call(name, arguments, place, f'"{number} mm"'),
        "A3": call(name, arguments, place, "Z1"),
        "A4": call(name, arguments, place, ""),
        "A5": call(name, arguments, place, '"wide"'),
        "A6": call(name, arguments, place, "TRUE"),
        "A7": call(name, arguments, place, "Z2"),
        "A8": call(name, arguments, place, "-1"),
        "A9": call(name, arguments, place, "0"),
        "A10": call(name, arguments, place, '"300 kg"'),
        "A11": call(name, arguments, place, "1E308*10"),
    }
    stored, evaluation = run(path, cases, {"Z2": "three hundred"})
    assert isinstance(stored["A1"], (int, float))
    assert stored["A2"] == pytest.approx(stored["A1"], rel=1e-12)
    for cell in ("A3", "A4", "A5", "A6", "A7", "A10"):
        assert stored[cell] == "#VALUE!", cell
    for cell in ("A8", "A9", "A11"):
        assert stored[cell] == "#NUM!", cell
    reasons = {failed.a1: failed.reason for failed in evaluation.errors}
    assert set(reasons) == set(cases) - {"A1", "A2"}
    assert all(len(reason) > 10 for reason in reasons.values())
    assert "wide" in reasons["A5"]


@pytest.mark.parametrize(("name", "arguments", "place"), CALLS)
def test_an_error_value_is_passed_on(path: Path, name: str, arguments: list[str], place: int) -> None:
    errors = sorted(ERROR_TEXT.values())
    stored, _ = run(
        path,
        {f"A{i}": call(name, arguments, place, f"B{i}") for i in range(1, len(errors) + 1)},
        {f"B{i}": error for i, error in enumerate(errors, 1)},
    )
    assert [stored[f"A{i}"] for i in range(1, len(errors) + 1)] == errors


def test_an_optional_argument_left_empty_has_its_default(path: Path) -> None:
    stored, _ = run(
        path,
        {
            "A1": '=TB_REDUCER("Fx","metric",998,300,200,400,100)',
            "A2": '=TB_REDUCER("Fx","metric",998,300,200,400,100,Z1)',
            "A3": '=TB_REDUCER("Fx","metric",998,300,200,400,100,)',
            "A4": '=TB_REDUCER("Fx","metric",998,300,200,400,100, )',
            "A5": "=TB_AREA(,0.3)",
            "A6": '=TB_AREA("SI",0.3)',
            "A7": "=TB_AREA(Z1,0.3)",
        },
    )
    assert stored["A1"] == stored["A2"] == stored["A3"] == stored["A4"]
    assert stored["A5"] == stored["A6"] == stored["A7"]


HEADINGS = ("fitting", "rho", "D1", "p1", "Q", "theta")
TABLE = [
    ("bend", 1000, 300, 400, 120, 90),
    ("bend", 1000, -300, 400, 120, 90),
    ("bend", 1000, 200, 400, 60, 45),
]


def table_cells() -> dict[str, Any]:
    cells: dict[str, Any] = {f"{'ABCDEF'[i]}1": heading for i, heading in enumerate(HEADINGS)}
    for row, line in enumerate(TABLE, 2):
        cells |= {f"{'ABCDEF'[i]}{row}": item for i, item in enumerate(line)}
    return cells


def test_a_bad_row_of_a_block_fails_alone_and_says_why(path: Path) -> None:
    make(
        path,
        {
            "S": table_cells()
            | {
                "H1": ("H1:H3", '=TB_SCHEDULE("F","metric",A1:F1,A2:F4)'),
                "I1": "=SUM(H1:H3)",
                "I2": '=SUM(TB_SCHEDULE("F","metric",A1:F1,A2:F4))',
                "I3": '=IFERROR(SUM(TB_SCHEDULE("F","metric",A1:F1,A2:F4)),0)',
                "I4": '=TB_SCHEDULE("F","metric",A1:F1,A4:F4)',
                "K1": ("K1:AH1", '=TB_SCHEDULE("labels","metric")'),
                "K2": ("K2:AH4", '=TB_SCHEDULE("all","metric",A1:F1,A2:F4)'),
            }
        },
    )
    evaluation = evaluate(path, REAL)
    stored = values(path)
    assert isinstance(stored["H1"], (int, float))
    assert stored["H2"] == "#NUM!"
    assert stored["H3"] == pytest.approx(stored["I4"])
    assert stored["I1"] == "#NUM!"
    assert stored["I2"] == "#NUM!"
    assert stored["I3"] == 0
    assert "D1" in next(failed.reason for failed in evaluation.errors if failed.a1 == "H2")
    # Headings and single values are no tables; a table comes with its headings.
    tables = {table.a1: table for table in evaluation.tables}
    assert set(tables) == {"H1", "K2"}
    assert tables["H1"].labels == ("F",)
    assert tables["H1"].units == ("kN",)
    assert tables["K2"].labels[0] == "name"
    labels = {stored[cell] for cell in stored if cell.endswith("1") and cell[0] in "KLMNOPQRSTUVWXYZA"}
    assert any("note" in str(label).lower() for label in labels)


def test_the_reason_is_one_formula_away(path: Path) -> None:
    stored, evaluation = run(
        path,
        {
            "A1": '=TB_AREA("metric",B1)',
            "A2": '=TB_WHY("TB_AREA","metric",B1)',
            "A3": '=TB_WHY("TB_AREA","metric",5)',
        },
        {"B1": -300},
    )
    assert stored["A1"] == "#NUM!"
    assert stored["A2"] == evaluation.errors[0].reason
    assert stored["A3"] == "ok"


@pytest.mark.parametrize("name", sorted(CATALOGUE))
def test_the_example_of_every_function(path: Path, name: str) -> None:
    """The example of each catalogue row gives in a workbook what the dispatcher gives."""
    example = CATALOGUE[name].example.removeprefix("=")
    stored, evaluation = run(path, {"A1": "=" + example})
    assert evaluation.ok, evaluation.errors
    assert stored["A1"] not in (None, "")
    assert not str(stored["A1"]).startswith("#")


def test_cells_and_dispatcher_agree(path: Path) -> None:
    arguments = ["Fx", "metric", 998.0, 300.0, 400.0, 100.0, 37.0]
    cells = {f"{'ABCDEFG'[i]}1": value for i, value in enumerate(arguments)}
    stored, _ = run(
        path, {"H1": "=TB_BEND(A1,B1,C1,D1,E1,F1,G1)", "H2": "=SUM(TB_BEND(A1,B1,C1,D1,E1,F1,G1))"}, cells
    )
    expected = dispatch.call("TB_BEND", arguments)
    assert stored["H1"] == expected
    assert stored["H2"] == expected
