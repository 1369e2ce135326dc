"""The fittings as worksheet functions: units, the table of ports, errors and cautions."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import pytest

from thrustbook.addin.cells import CellError
from thrustbook.addin.dispatch import call, why
from thrustbook.engine.ends import closed, nozzle
from thrustbook.engine.fittings import bend, tee

HEADINGS: list[list[Any]] = [["nx", "ny", "nz", "D", "p", "Q"]]
PORTS: list[list[Any]] = [[-1.0, 0.0, 0.0, 300.0, 400.0, -100.0], [0.0, 1.0, 0.0, 300.0, 400.0, 100.0]]


def refused(answer: object, kind: str, *words: str) -> None:
    assert isinstance(answer, CellError)
    assert answer.kind == kind
    for word in words:
        assert word in answer.message


def test_bend_in_metric_units() -> None:
    f = bend(998.0, 0.3, 4e5, 0.1, math.pi / 2, 0.2, 0.3)
    answer = call("TB_BEND", ["all", "metric", 998.0, 300.0, 400.0, 100.0, 90.0, 200.0, 0.3])
    expected = [f.Fx / 1e3, f.Fy / 1e3, f.F / 1e3, math.degrees(f.dir), f.Rx / 1e3, f.Ry / 1e3, f.R / 1e3]
    assert isinstance(answer, np.ndarray)
    assert answer[0].tolist() == pytest.approx([*expected, f.V1, f.V2, f.p2 / 1e3], rel=1e-12)


def test_a_return_bend_of_180_degrees_is_inside_the_range() -> None:
    assert call("TB_BEND", ["Fy", None, 1000.0, 0.3, 4e5, 0.2, 180.0]) == pytest.approx(0.0, abs=1e-9)
    refused(call("TB_BEND", ["Fy", None, 1000.0, 0.3, 4e5, 0.2, 180.1]), "NUM", "theta")


def test_bend_in_us_units_gives_the_thrust_of_the_tables() -> None:
    """Moser and Folkman, Buried Pipe Design, table 4.13: 13 680 lbf for 100 psi, 10 in, 90 degrees."""
    answer = call("TB_BEND", ["R", "US", 62.4, 11.10, 100.0, 0.0, 90.0])
    assert answer == pytest.approx(13680.0, rel=1e-3)


def test_an_empty_angle_of_a_tee_is_a_right_angle() -> None:
    f = tee(998.0, 0.4, 5e5, 0.2, 0.2, 0.06)
    for theta in (None, 90.0):
        answer = call("TB_TEE", ["Fy", "metric", 998.0, 400.0, 500.0, 200.0, 200.0, 60.0, theta])
        assert answer == pytest.approx(f.Fy / 1e3, rel=1e-12)
    combining: list[Any] = ["F", "SI", 998.0, 0.4, 5e5, 0.2, 0.2, -0.06, None, None, 0.1]
    refused(call("TB_TEE", combining), "NUM", "does not carry the whole flow")


def test_nozzle_takes_pressure_or_flow() -> None:
    assert call("TB_NOZZLE", ["Q", "metric", 998.0, 100.0, 50.0, 300.0]) == pytest.approx(
        nozzle(998.0, 0.1, 0.05, p1=3e5).Q * 1e3, rel=1e-12
    )
    by_flow = call("TB_NOZZLE", ["p1", "metric", 998.0, 100.0, 50.0, None, 40.0])
    assert by_flow == pytest.approx(nozzle(998.0, 0.1, 0.05, Q=0.04).p1 / 1e3, rel=1e-12)
    refused(call("TB_NOZZLE", ["Q", "metric", 998.0, 100.0, 50.0]), "NUM", "exactly one of p1 and Q")


def test_a_range_is_worked_element_by_element() -> None:
    answer = call("TB_CLOSED", ["F", "metric", [[100.0], [-100.0], [300.0]], 1000.0])
    assert isinstance(answer, np.ndarray)
    assert answer[0, 0] == pytest.approx(closed(0.1, 1e6).F / 1e3)
    refused(answer[1, 0], "NUM", "D")
    assert answer[2, 0] == pytest.approx(closed(0.3, 1e6).F / 1e3)


def test_balance_reads_a_table_of_ports() -> None:
    f = bend(998.0, 0.3, 4e5, 0.1, math.pi / 2, p2=4e5)
    assert call("TB_BALANCE", ["Fx", "metric", 998.0, HEADINGS, PORTS]) == pytest.approx(f.Fx / 1e3)
    # Blank rows are no ports; weight acts downward; momentum that grows pushes back.
    ports = [*PORTS, [None] * 6]
    assert call("TB_BALANCE", ["Fz", "metric", 998.0, HEADINGS, ports, 2.0, None, None, 0.5]) == -2.5
    labels = call("TB_BALANCE", ["labels"])
    assert isinstance(labels, np.ndarray)
    assert labels[0].tolist() == ["Fx", "Fy", "Fz", "F", "Rx", "Ry", "Rz", "R", "residual"]
    everything = call("TB_BALANCE", ["all", "metric", 998.0, HEADINGS, PORTS])
    assert isinstance(everything, np.ndarray)
    assert everything.shape == (1, 9)


def test_a_port_may_have_an_area_in_its_own_unit() -> None:
    headings: list[list[Any]] = [["nx", "ny", "nz", "A [cm2]", "p [bar]", "Q", "beta"]]
    ports: list[list[Any]] = [[1.0, 0.0, 0.0, 1000.0, 2.0, 0.0, None]]
    assert call("TB_BALANCE", ["Fx", "SI", 998.0, headings, ports]) == pytest.approx(-2e4)


@pytest.mark.parametrize(
    ("change", "kind", "words"),
    [
        ((0, 5, -101.0), "NUM", ("do not close",)),
        ((0, 0, 0.0), "NUM", ("n of port 1",)),
        ((1, 3, -300.0), "NUM", ("D of port 2 = -300 mm",)),
        ((1, 4, None), "VALUE", ("row 2", "p is empty")),
        ((1, 3, None), "VALUE", ("row 2", "exactly one of D and A")),
        ((1, 4, "high"), "VALUE", ("row 2", "p")),
        ((0, 4, CellError("DIV0", "")), "DIV0", ()),
    ],
)
def test_a_bad_port_is_refused_by_name(
    change: tuple[int, int, Any], kind: str, words: tuple[str, ...]
) -> None:
    row, column, value = change
    ports = [list(port) for port in PORTS]
    ports[row][column] = value
    refused(call("TB_BALANCE", ["Fx", "metric", 998.0, HEADINGS, ports]), kind, *words)


def test_a_balance_with_an_unknown_heading_or_no_density_is_refused() -> None:
    headings: list[list[Any]] = [["nx", "ny", "nz", "dia", "p", "Q"]]
    refused(call("TB_BALANCE", ["Fx", "metric", 998.0, headings, PORTS]), "VALUE", '"dia" is not known')
    refused(call("TB_BALANCE", ["Fx", "metric", None, HEADINGS, PORTS]), "VALUE", "rho is empty")
    missing: list[list[Any]] = [row[:5] for row in PORTS]
    refused(
        call("TB_BALANCE", ["Fx", "metric", 998.0, [list(HEADINGS[0][:5])], missing]), "VALUE", "column Q"
    )


@pytest.mark.parametrize(
    ("name", "args", "word"),
    [
        ("TB_BEND", ["F", "metric", 998.0, 300.0, -99.0, 0.0, 90.0], "boils"),
        ("TB_BEND", ["F", "metric", 998.0, 300.0, 10.0, 0.0, 90.0, None, None, 12.0], "p2 is below -98 kPa"),
        ("TB_BEND", ["F", "metric", 998.0, 100.0, 400.0, 100.0, 90.0], "6 m/s"),
        (
            "TB_BEND",
            ["F", "metric", 998.0, 300.0, 400.0, 100.0, 90.0, None, None, None, 410.0],
            "gains energy",
        ),
        ("TB_INLINE", ["F", "metric", 998.0, 300.0, 400.0, 100.0, None, None, 410.0], "pressure rises"),
        ("TB_TEE", ["F", "SI", 998.0, 0.4, 5e5, 0.1, 0.2, -0.06], "without loss"),
        ("TB_NOZZLE", ["F", "metric", 998.0, 100.0, 120.0, None, 10.0], "wider than the pipe"),
    ],
)
def test_cautions_are_told(name: str, args: list[Any], word: str) -> None:
    assert word in why(name, args)
    assert not isinstance(call(name, args), CellError)


@pytest.mark.parametrize(
    ("name", "args"),
    [
        ("TB_BEND", ["F", "metric", 998.0, 300.0, 400.0, 100.0, 90.0, 200.0, 0.3]),
        ("TB_BEND", ["F", "metric", 998.0, 300.0, 400.0, -100.0, 90.0]),
        ("TB_BEND", ["F", "metric", 1.2, 300.0, 0.1, 1000.0, 90.0]),
        ("TB_REDUCER", ["F", "metric", 998.0, 300.0, 200.0, 400.0, 100.0, 0.05]),
        ("TB_TEE", ["F", "metric", 998.0, 400.0, 500.0, 200.0, 200.0, 60.0]),
        ("TB_ACCEL", ["dp", "metric", 998.0, 300.0, 500.0, -5.0]),
        ("TB_BALANCE", ["Fx", "metric", 998.0, HEADINGS, PORTS]),
    ],
)
def test_an_ordinary_call_has_no_caution(name: str, args: list[Any]) -> None:
    assert why(name, args) == "ok"
