"""Physics of the pipe run, against independent sums."""

from __future__ import annotations

import math
from dataclasses import replace
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.optimize import brentq

from tests.published import load
from thrustbook.engine.balance import balance
from thrustbook.engine.constants import G
from thrustbook.engine.errors import NoSolution
from thrustbook.engine.friction import friction
from thrustbook.engine.run import Run, assemble, run
from thrustbook.engine.runflow import RunStart, flow_at_end, root, solve_flow
from thrustbook.engine.runnotes import Fitting, Note, fitting_text, note_text
from thrustbook.engine.runshape import RunTable, build

from .run_samples import reversed_table, starts, tables

check = settings(max_examples=60, deadline=None, derandomize=True)
WATER = RunStart(rho=1000.0, mu=1.0e-3)


def thrust(result: Run) -> np.ndarray:
    return np.stack([result.Fx, result.Fy, result.Fz], axis=1)


@check
@given(tables(), starts)
def test_closure_of_random_runs(table: RunTable, start: RunStart) -> None:
    assert run(table, start).closure.relative < 1e-9


@check
@given(tables(end="jet"), st.floats(5.0, 300.0))
def test_closure_of_random_jets(table: RunTable, Q_scale: float) -> None:
    total = np.nansum(np.maximum(np.asarray(table.Qo), 0))
    result = run(table, replace(WATER, Q=total + Q_scale * 1e-3, end="jet"))
    assert result.closure.relative < 1e-9
    assert result.p2[-1] == 0.0


@check
@given(tables())
def test_closure_of_random_closed_runs(table: RunTable) -> None:
    result = run(table, replace(WATER, p=8e5, end="closed"))
    assert result.closure.relative < 1e-9
    assert result.Q2[-1] == 0.0
    # The pipe between two caps without offtakes holds its pressure within itself.
    shut = run(replace(table, Qo=math.nan, Do=math.nan), replace(WATER, p=8e5, start="closed", end="closed"))
    assert shut.closure.relative < 1e-9
    np.testing.assert_allclose(shut.closure.whole, [0, 0, -shut.W.sum()], atol=1e-9 * shut.W.sum())


def test_closure_sees_a_pressure_that_does_not_fit_the_losses() -> None:
    table = RunTable(x=[0, 100, 100], y=[0, 0, 80], z=[0, 5, 9], D=0.3, e=1e-4)
    start = replace(WATER, Q=0.1, p=5e5)
    geometry, _ = build(table, "continues", "continues")
    assert geometry is not None
    at_end, _ = flow_at_end(geometry, start, geometry.Qo)
    flow = solve_flow(geometry, start, at_end, geometry.Qo, geometry.Hp)
    assert assemble(geometry, start, flow).closure.relative < 1e-12
    wrong = replace(flow, p1=flow.p1 + np.array([0.0, 10.0, 0.0]))
    assert assemble(geometry, start, wrong).closure.relative > 1e-6
    wrong = replace(flow, f=flow.f * 1.01)
    assert assemble(geometry, start, wrong).closure.relative > 1e-6


@check
@given(tables(), starts)
def test_every_node_is_a_general_balance(table: RunTable, start: RunStart) -> None:
    """At the bore diameters a node is a balance of two or three ports."""
    table = replace(table, Dj=math.nan)
    result = run(table, start)
    points = np.stack([np.asarray(a) for a in (table.x, table.y, table.z)], axis=1)
    u = np.diff(points, axis=0)
    u /= np.linalg.norm(u, axis=1)[:, None]
    D, beta = np.asarray(table.D), np.asarray(table.beta)
    scale = np.abs(thrust(result)).max()
    for j in range(len(points)):
        i = max(j - 1, 0)
        ports = [
            (-u[i], D[i], result.p1[j], -result.Q1[j], beta[i]),
            (u[min(j, len(u) - 1)], D[j], result.p2[j], result.Q2[j], beta[j]),
        ]
        if not np.isnan(np.asarray(table.Do)[j]):
            n = np.array([np.asarray(a)[j] for a in (table.ox, table.oy, table.oz)])
            ports.append((n, np.asarray(table.Do)[j], result.po[j], np.asarray(table.Qo)[j], 1.0))
        normals, d, p, Q, b = (np.array(a) for a in zip(*ports, strict=True))
        whole = balance(normals, np.pi / 4 * d**2, p, Q, start.rho, b)
        found = [whole.Fx, whole.Fy, whole.Fz]
        np.testing.assert_allclose(thrust(result)[j], found, atol=1e-9 * max(scale, 1.0))


@check
@given(tables(), starts)
def test_either_end_gives_the_same_run(table: RunTable, start: RunStart) -> None:
    first = run(table, start)
    for at, V, p, EGL, Q in (
        ("start", first.V1[0], first.p1[0], first.EGL1[0], first.Q1[0]),
        ("end", first.V2[-1], first.p2[-1], first.EGL2[-1], first.Q2[-1]),
    ):
        by_p = run(table, replace(start, at=at, Q=Q, p=p))
        by_H = run(table, replace(start, at=at, Q=Q, p=math.nan, H=EGL))
        for again in (by_p, by_H):
            scale = max(1.0, np.abs(first.p1).max(), start.rho * V**2)
            np.testing.assert_allclose(again.p2, first.p2, atol=1e-8 * scale)
            np.testing.assert_allclose(again.Q2, first.Q2, atol=1e-12)
            np.testing.assert_allclose(thrust(again), thrust(first), atol=1e-8 * scale)


def test_flow_known_at_the_other_end() -> None:
    table = RunTable(
        x=[0, 100, 300],
        y=0.0,
        z=0.0,
        D=0.3,
        e=1e-4,
        Qo=[0, 0.03, 0],
        ox=0,
        oy=1,
        oz=0,
        Do=[np.nan, 0.1, np.nan],
    )
    a = run(table, replace(WATER, Q=0.1, p=3e5, at="end", flow_at="start"))
    b = run(table, replace(WATER, Q=0.07, p=3e5, at="end"))
    np.testing.assert_allclose(a.Q1, [0.1, 0.1, 0.07], atol=1e-15)
    np.testing.assert_allclose(a.p1, b.p1, rtol=1e-12)
    np.testing.assert_allclose(a.F, b.F, rtol=1e-9, atol=1e-6)


@check
@given(tables(), starts)
def test_listing_the_nodes_from_the_other_end_changes_nothing(table: RunTable, start: RunStart) -> None:
    # K sits on the velocity of the leaving leg, so it has no mirror image where D changes;
    # beyond the ends the diameter is the first leg's, so the last leg's must be the last entry.
    D = np.asarray(table.D).copy()
    columns = {k: np.asarray(getattr(table, k)).copy() for k in ("Dj", "alpha", "beta", "e", "f")}
    D[-1] = D[-2]
    for a in columns.values():
        a[-1] = a[-2]
    table = replace(table, D=D, K=0.0, Hp=math.nan, **columns)
    forward = run(table, start)
    backward = run(
        reversed_table(table),
        replace(start, Q=-start.Q, at="end" if start.at == "start" else "start"),
    )
    scale = max(1.0, np.abs(thrust(forward)).max(), np.abs(forward.p1).max())
    np.testing.assert_allclose(backward.p1[::-1], forward.p2, atol=1e-8 * scale)
    np.testing.assert_allclose(thrust(backward)[::-1], thrust(forward), atol=1e-8 * scale)


@check
@given(tables(), starts, st.floats(0, 2 * math.pi))
def test_turning_the_plan_turns_the_thrusts(table: RunTable, start: RunStart, turn: float) -> None:
    c, s = math.cos(turn), math.sin(turn)
    x, y = np.asarray(table.x), np.asarray(table.y)
    ox, oy = np.asarray(table.ox), np.asarray(table.oy)
    turned = replace(table, x=c * x - s * y, y=s * x + c * y, ox=c * ox - s * oy, oy=s * ox + c * oy)
    first, second = run(table, start), run(turned, start)
    scale = max(1.0, first.F.max(), np.abs(first.p1).max())
    expected = np.stack([c * first.Fx - s * first.Fy, s * first.Fx + c * first.Fy, first.Fz], axis=1)
    np.testing.assert_allclose(thrust(second), expected, atol=1e-8 * scale)
    np.testing.assert_allclose(second.F, first.F, atol=1e-8 * scale)


@pytest.mark.parametrize("degrees", [1e-3, 5, 11.25, 22.5, 45, 90, 135])
def test_static_thrust_of_a_bend(degrees: float) -> None:
    """2 p A sin(theta/2), outwards along the bisector."""
    theta = math.radians(degrees)
    table = RunTable(
        x=[0, 30, 30 + 40 * math.cos(theta)], y=[0, 0, 40 * math.sin(theta)], z=0.0, D=0.5, e=0.0, Dj=0.532
    )
    result = run(table, replace(WATER, Q=0.0, p=1.2e6))
    area = math.pi / 4 * 0.532**2
    assert result.theta[1] == pytest.approx(theta, rel=1e-9)
    assert result.F[1] == pytest.approx(2 * 1.2e6 * area * math.sin(theta / 2), rel=1e-9)
    # Turning north from an easterly run, the bend is pushed south-east.
    assert result.bearing[1] == pytest.approx(math.pi / 2 + (math.pi - theta) / 2, rel=1e-6)


PUBLISHED = [
    c
    for c in load("thrust")
    if c["routine"] == "bend" and set(c["inputs"]) == {"rho", "D1", "p1", "Q", "theta"}
]


@pytest.mark.parametrize("published", PUBLISHED, ids=lambda c: c["topic"])
def test_published_bends_as_the_middle_of_a_run(published: dict[str, Any]) -> None:
    """With no flow the printed diameter is the joint's: the bore does not matter."""
    given = published["inputs"]
    theta, D1 = math.radians(given["theta"]), given["D1"]
    bore = D1 if given["Q"] else 0.8 * D1
    table = RunTable(x=[0, 1, 1 + math.cos(theta)], y=[0, 0, math.sin(theta)], z=0.0, D=bore, Dj=D1, f=0.0)
    result = run(table, RunStart(rho=given["rho"], Q=given["Q"], p=given["p1"]))
    expected = published["expected"]
    printed = expected["F"] if "F" in expected else expected["R"]
    assert result.F[1] == pytest.approx(printed, rel=published["tolerance"])


def test_vertical_bend_pushes_up_over_a_summit_and_down_in_a_sag() -> None:
    table = RunTable(x=[0, 100, 200, 300, 400], y=0.0, z=[0, 0, 20, 0, 0], D=0.3, e=1e-4)
    result = run(table, replace(WATER, Q=0.1, p=1e6))
    assert result.Fv[2] > 0 > result.Fv[1]
    assert result.Fv[2] == result.Fz[2]
    np.testing.assert_allclose(result.Fy, 0.0, atol=1e-9)
    straight_up = RunTable(x=0.0, y=0.0, z=[0, 10, 30], D=[0.3, 0.2, 0.2], e=1e-4)
    upward = run(straight_up, replace(WATER, Q=0.05, p=1e6))
    assert upward.Fh[1] == pytest.approx(0.0, abs=1e-9)
    assert upward.bearing[1] == 0.0
    assert upward.Fz[1] > 0


def test_reducer_by_hand() -> None:
    """Bernoulli and momentum written out with plain numbers."""
    table = RunTable(x=[0, 10, 20], y=0.0, z=0.0, D=[0.4, 0.2, 0.2], f=0.0, K=[0, 0.1, 0])
    result = run(table, replace(WATER, Q=0.12, p=4e5))
    A1, A2 = math.pi * 0.04, math.pi * 0.01
    V1, V2 = 0.12 / A1, 0.12 / A2
    p2 = 4e5 + 500 * (V1**2 - V2**2) - 0.1 * 500 * V2**2
    assert result.p2[1] == pytest.approx(p2, rel=1e-12)
    assert result.Fx[1] == pytest.approx(4e5 * A1 + 120 * V1 - p2 * A2 - 120 * V2, rel=1e-12)
    assert result.hK[1] == pytest.approx(0.1 * V2**2 / (2 * G), rel=1e-12)


def test_pump_raises_the_pressure_and_is_pushed_back() -> None:
    table = RunTable(x=[0, 10, 20], y=0.0, z=0.0, D=0.3, f=0.0, Hp=[0, 40, 0])
    result = run(table, replace(WATER, Q=0.1, p=1e5))
    rise = 1000 * G * 40
    assert result.p2[1] - result.p1[1] == pytest.approx(rise, rel=1e-12)
    assert result.Fx[1] == pytest.approx(-rise * math.pi / 4 * 0.09, rel=1e-12)
    assert fitting_text(result.fitting[1]) == "pump"


def test_two_nodes_and_wall_drag() -> None:
    table = RunTable(x=[0, 300], y=[0, 400], z=[0, 0], D=0.25, e=2e-4)
    result = run(table, replace(WATER, Q=0.08, p=6e5))
    area = math.pi / 4 * 0.25**2
    Re = 1000 * (0.08 / area) * 0.25 / 1e-3
    f = float(friction(Re, 2e-4 / 0.25).f)
    assert result.s[-1] == 500.0
    assert result.Re[0] == pytest.approx(Re, rel=1e-12)
    loss = f * 500 / 0.25 * (0.08 / area) ** 2 / 2
    assert result.p1[0] - result.p1[1] == pytest.approx(1000 * loss, rel=1e-9)
    # On a level leg of one bore the wall takes the whole pressure difference.
    assert result.drag[0] == pytest.approx((result.p2[0] - result.p1[1]) * area, rel=1e-9)
    np.testing.assert_allclose(result.F, 0.0, atol=1e-9)
    assert result.bearing[0] == 0.0


def test_jet_solved_for_its_flow() -> None:
    table = RunTable(
        x=[0, 200, 200], y=[0, 0, 50], z=[30, 10, 12], D=[0.3, 0.2, 0.08], e=1e-4, K=[0.5, 0.2, 0.04]
    )
    result = run(table, replace(WATER, H=45.0, end="jet"))

    def surplus(Q: float) -> float:
        head = 45.0
        for D, L, K in ((0.3, math.dist((0, 30), (200, 10)), 0.5), (0.2, math.hypot(50, 2), 0.2)):
            V = Q / (math.pi / 4 * D**2)
            f = float(friction(1000 * V * D / 1e-3, 1e-4 / D).f)
            head -= (K + f * L / D) * V**2 / (2 * G)
        V = Q / (math.pi / 4 * 0.08**2)
        return head - 1.04 * V**2 / (2 * G) - 12

    assert result.Q2[-1] == pytest.approx(brentq(surplus, 1e-6, 1.0, xtol=1e-15), rel=1e-10)
    assert result.EGL1[0] == pytest.approx(45.0, rel=1e-12)
    assert result.p2[-1] == 0.0
    given_flow = run(table, replace(WATER, Q=float(result.Q2[-1]), end="jet"))
    np.testing.assert_allclose(given_flow.F, result.F, rtol=1e-12, atol=1e-9)
    by_pressure = run(table, replace(WATER, p=float(result.p1[0]), end="jet"))
    np.testing.assert_allclose(by_pressure.Q2, result.Q2, rtol=1e-9)


def test_lossless_jet_is_torricelli() -> None:
    table = RunTable(x=[0, 5], y=0.0, z=0.0, D=[10.0, 0.1], f=0.0)
    result = run(table, RunStart(rho=1000.0, H=20.0, end="jet"))
    assert result.V2[-1] == pytest.approx(math.sqrt(2 * G * 20), rel=1e-12)


def test_jet_with_an_offtake_on_the_way() -> None:
    table = RunTable(
        x=[0, 100, 200], y=0.0, z=[20, 10, 0], D=[0.3, 0.2, 0.05], e=1e-4, Qo=[0, 0.02, 0], oy=1.0, Do=0.1
    )
    result = run(table, replace(WATER, H=60.0, end="jet"))
    assert result.EGL1[0] == pytest.approx(60.0, rel=1e-12)
    assert result.Q1[1] - result.Q2[1] == pytest.approx(0.02, rel=1e-12)


@pytest.mark.parametrize(
    ("start", "z_jet", "message"),
    [({"H": 5.0}, 9.0, "too low to reach the jet"), ({"p": 1e5}, 0.0, "no finite flow")],
)
def test_jet_without_solution(start: dict[str, Any], z_jet: float, message: str) -> None:
    table = RunTable(x=[0, 10], y=0.0, z=[0, z_jet], D=0.1, f=0.0)
    with pytest.raises(NoSolution, match=message):
        run(table, replace(WATER, **start, end="jet"))


def test_closed_end_takes_its_flow_from_the_offtakes() -> None:
    table = RunTable(
        x=[0, 50, 90], y=0.0, z=0.0, D=0.2, e=1e-4, Qo=[0, 0.03, 0], oz=1.0, Do=[np.nan, 0.1, np.nan]
    )
    result = run(table, replace(WATER, p=5e5, end="closed"))
    assert result.Q1[0] == 0.03
    assert result.Q2[1] == 0.0
    assert result.Fx[-1] == pytest.approx(result.p1[-1] * math.pi / 4 * 0.04, rel=1e-12)
    assert Fitting(int(result.fitting[-1])) == Fitting.CAP
    assert Fitting(int(result.fitting[1])) == Fitting.TEE


def test_branch_without_flow_still_pushes() -> None:
    """A dead branch on a straight pipe: the tee is pushed away from it by p A."""
    table = RunTable(x=[0, 50, 90], y=0.0, z=0.0, D=0.2, e=1e-4, oy=1.0, Do=[np.nan, 0.15, np.nan])
    result = run(table, replace(WATER, Q=0.0, p=5e5))
    assert result.Fy[1] == pytest.approx(-5e5 * math.pi / 4 * 0.15**2, rel=1e-12)


def test_ten_thousand_nodes() -> None:
    rng = np.random.default_rng(4)
    n = 10_000
    x, y, z = np.cumsum(rng.normal(size=(n, 3)) * [60, 60, 2], axis=0).T
    Qo = np.where(rng.random(n) < 0.02, 1e-4, 0.0)
    Do = np.where(Qo > 0, 0.05, np.nan)
    table = RunTable(x, y, z, D=rng.choice([0.4, 0.5], n), e=1e-4, K=0.1, Qo=Qo, oz=1.0, Do=Do)
    result = run(table, replace(WATER, Q=0.2, p=2e6))
    assert result.closure.relative < 1e-9
    # The same heads by a plain loop over the nodes.
    EGL = result.EGL1[0]
    for j in range(n):
        assert math.isclose(EGL, result.EGL1[j], rel_tol=1e-9, abs_tol=1e-6)
        EGL -= result.hK[j] + result.hf[j]


def test_notes() -> None:
    table = RunTable(x=[0, 100, 200, 300], y=0.0, z=[0, 0, 60, 0], D=0.2, e=1e-4)
    result = run(table, replace(WATER, Q=0.2, p=3e5, pv=2339.0))
    assert result.note[2] & Note.SEPARATION
    assert "column separates" in note_text(result.note[2])
    assert all(code & Note.FAST for code in result.note)
    back = run(table, replace(WATER, Q=-0.2, p=3e5))
    assert all(code & Note.REVERSE for code in back.note)
    slow = run(table, replace(WATER, Q=3000 * math.pi / 4 * 0.2 * 1e-6, p=1e6))
    assert slow.note[0] & Note.TRANSITION
    assert note_text(slow.note[3]) == "ok"
    assert fitting_text(slow.fitting[1]) == "bend"
    assert fitting_text(slow.fitting[0]) == "straight"
    square = run(RunTable(x=[0, 10, 10], y=[0, 0, 9], z=0.0, D=0.2, e=0.0), replace(WATER, Q=0.0, p=1e5))
    assert square.note.tolist() == [0, 0, 0]
    back = run(RunTable(x=[0, 10, 1], y=[0, 0, 1], z=0.0, D=0.2, e=0.0), replace(WATER, Q=0.0, p=1e5))
    assert back.note[1] == Note.SHARP
    assert run(table, replace(WATER, Q=0.0, p=0.0)).note[0] == 0


def test_root_finds_what_it_should() -> None:
    assert root(lambda x: 2.0 - x * x, 0.0, 2.0) == pytest.approx(math.sqrt(2), rel=1e-15)
    assert root(lambda x: math.cos(x) - x, 0.0, 1.0) == pytest.approx(0.7390851332151607, rel=1e-15)
    assert root(lambda x: 1.0 if x < 0.3 else -1.0, 0.0, 1.0) == pytest.approx(0.3, rel=1e-15)
