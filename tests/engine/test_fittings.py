"""Bends, reducers and tees against direct integration, the general balance and published values."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from tests.published import load
from thrustbook.engine.balance import balance
from thrustbook.engine.constants import G
from thrustbook.engine.errors import NoSolution, OutOfRange, Status
from thrustbook.engine.fittings import bend, reducer, tee

from .ranges import EAST, WEST, bounded, densities, diameters, flows, losses, powers, pressures
from .surface import Disc, corrections, thrust

angles = st.floats(0.0, math.pi)
rises = st.floats(-20.0, 20.0)


def turned(theta: float) -> tuple[float, float, float]:
    """Outward normal of an outlet turned by theta."""
    return (math.cos(theta), math.sin(theta), 0.0)


def size(*discs: Disc, rho: float) -> float:
    """The sum of the forces at the ports: what a difference is measured against."""
    hydrostatic = rho * G * max(disc.D for disc in discs) ** 3
    return float(sum(np.linalg.norm(disc.force(rho, g=0.0)) for disc in discs) + hydrostatic)


@bounded
@given(densities, diameters, pressures, flows, angles, diameters, losses, rises, powers, powers)
def test_bend_is_the_integral_over_its_ports(
    rho: float,
    D1: float,
    p1: float,
    Q: float,
    theta: float,
    D2: float,
    K: float,
    dz: float,
    n1: float,
    n2: float,
) -> None:
    (alpha1, beta1), (alpha2, beta2) = corrections(n1), corrections(n2)
    f = bend(rho, D1, p1, Q, theta, D2, K, dz, math.nan, alpha1, alpha2, beta1, beta2)
    inlet, outlet = Disc(WEST, D1, p1, -Q, n1), Disc(turned(theta), D2, f.p2, Q, n2)
    scale = size(inlet, outlet, rho=rho)
    assert np.abs(thrust([inlet, outlet], rho) - [f.Fx, f.Fy, 0.0])[:2].max() <= 1e-11 * scale
    assert (f.Rx, f.Ry, f.R) == (-f.Fx, -f.Fy, f.F)
    assert f.F * math.cos(f.dir) == pytest.approx(f.Fx, abs=1e-12 * scale)
    assert f.F * math.sin(f.dir) == pytest.approx(f.Fy, abs=1e-12 * scale)
    # Energy, written as heads at the two sections.
    V1, V2 = Q / (math.pi * D1**2 / 4), Q / (math.pi * D2**2 / 4)
    head1 = p1 / (rho * G) + alpha1 * V1**2 / (2 * G)
    head2 = f.p2 / (rho * G) + alpha2 * V2**2 / (2 * G) + dz
    loss = math.copysign(K * V1**2 / (2 * G), Q)
    assert head1 - head2 == pytest.approx(
        loss, rel=1e-9, abs=1e-12 * (abs(head1) + abs(head2) + alpha2 * V2**2 + abs(dz))
    )


@bounded
@given(densities, diameters, pressures, flows, angles, diameters, pressures)
def test_bend_is_the_general_balance(
    rho: float, D1: float, p1: float, Q: float, theta: float, D2: float, p2: float
) -> None:
    f = bend(rho, D1, p1, Q, theta, D2, p2=p2, beta1=1.03, beta2=1.01)
    areas = [math.pi * D1**2 / 4, math.pi * D2**2 / 4]
    b = balance([WEST, turned(theta)], areas, [p1, p2], [-Q, Q], rho, [1.03, 1.01])
    scale = size(Disc(WEST, D1, p1, Q), Disc(EAST, D2, p2, Q), rho=rho)
    assert [f.Fx, f.Fy, f.F] == pytest.approx([b.Fx, b.Fy, b.F], abs=1e-12 * scale)


@bounded
@given(densities, diameters, pressures, flows, angles, diameters, pressures)
def test_thrust_of_a_bend_does_not_depend_on_the_direction_of_flow(
    rho: float, D1: float, p1: float, Q: float, theta: float, D2: float, p2: float
) -> None:
    forth, back = bend(rho, D1, p1, Q, theta, D2, p2=p2), bend(rho, D1, p1, -Q, theta, D2, p2=p2)
    assert forth[:7] == back[:7]
    assert (forth.V1, forth.V2) == (-back.V1, -back.V2)


@bounded
@given(densities, diameters, pressures, flows, angles, diameters, losses, rises)
def test_a_bend_seen_from_its_other_end_is_the_same_bend(
    rho: float, D1: float, p1: float, Q: float, theta: float, D2: float, K: float, dz: float
) -> None:
    """Number the sections the other way round: the axes turn, the thrust stays."""
    f = bend(rho, D1, p1, Q, theta, D2, K, dz)
    # K is on the velocity of section 1; seen from the other end that is section 2.
    g = bend(rho, D2, f.p2, -Q, theta, D1, K * (D2 / D1) ** 4, -dz)
    scale = size(Disc(WEST, D1, p1, Q), Disc(EAST, D2, f.p2, Q), rho=rho)
    assert g.p2 == pytest.approx(p1, rel=1e-9, abs=1e-9 * scale / D1**2)
    # Section 2's axes: x against the outlet's direction, y so that the inlet lies on its positive side.
    Fx = -(f.Fx * math.cos(theta) + f.Fy * math.sin(theta))
    Fy = -f.Fx * math.sin(theta) + f.Fy * math.cos(theta)
    assert [g.Fx, g.Fy] == pytest.approx([Fx, Fy], abs=1e-9 * scale)


@bounded
@given(densities, diameters, pressures, flows, angles, diameters, losses, rises)
def test_model_to_scale_keeps_the_force_to_scale(
    rho: float, D1: float, p1: float, Q: float, theta: float, D2: float, K: float, dz: float
) -> None:
    """Froude's law: lengths by 1/10 in another fluid, forces by density and length cubed."""
    s, d = 0.1, 0.8
    full = bend(rho, D1, p1, Q, theta, D2, K, dz)
    model = bend(rho * d, D1 * s, p1 * s * d, Q * s**2.5, theta, D2 * s, K, dz * s)
    scale = size(Disc(WEST, D1, p1, Q), Disc(EAST, D2, full.p2, Q), rho=rho)
    assert model.Fx / (d * s**3) == pytest.approx(full.Fx, abs=1e-11 * scale)
    assert model.Fy / (d * s**3) == pytest.approx(full.Fy, abs=1e-11 * scale)


@pytest.mark.parametrize("check", load("thrust"), ids=lambda check: check["topic"])
def test_published_thrust(check: dict[str, Any]) -> None:
    inputs = dict(check["inputs"])
    inputs["theta"] = math.radians(inputs["theta"])
    volume = inputs.pop("volume", 0.0)
    f = bend(**inputs)
    got = {"F": f.F, "R": f.R, "dir": math.degrees(f.dir)}
    if check["routine"] == "bend and weight":
        # The bend lies in a vertical plane; its y is up, and the weight acts along -y.
        D2 = inputs["D2"]
        b = balance(
            [WEST, (math.cos(inputs["theta"]), 0.0, math.sin(inputs["theta"]))],
            [math.pi / 4 * inputs["D1"] ** 2, math.pi / 4 * D2**2],
            [inputs["p1"], f.p2],
            [-inputs["Q"], inputs["Q"]],
            inputs["rho"],
            W=inputs["rho"] * G * volume,
        )
        got = {"F": b.F, "angle": math.degrees(math.atan2(abs(b.Fz), abs(b.Fx)))}
    for name, expected in check["expected"].items():
        assert got[name] == pytest.approx(expected, rel=check["tolerance"]), name


@pytest.mark.parametrize("theta", [0.0, 0.4, math.pi / 2, math.pi])
def test_static_bend_is_the_formula_of_the_tables(theta: float) -> None:
    f = bend(1000.0, 0.5, 1e6, 0.0, theta)
    assert f.R == pytest.approx(2e6 * math.pi / 16 * math.sin(theta / 2), rel=1e-12, abs=1e-9)
    assert (f.V1, f.V2, f.p2) == (0.0, 0.0, 1e6)


def test_return_bend_carries_twice_the_section_force() -> None:
    f = bend(1000.0, 0.3, 4e5, 0.2, math.pi)
    V = 0.2 / (math.pi * 0.09 / 4)
    assert f.Fx == pytest.approx(2 * (4e5 * math.pi * 0.09 / 4 + 1000 * 0.2 * V))
    assert f.Fy == pytest.approx(0.0, abs=1e-9)


@bounded
@given(densities, diameters, diameters, pressures, flows, losses, rises, powers, powers)
def test_reducer_is_the_integral_over_its_ports(
    rho: float, D1: float, D2: float, p1: float, Q: float, K: float, dz: float, n1: float, n2: float
) -> None:
    (alpha1, beta1), (alpha2, beta2) = corrections(n1), corrections(n2)
    f = reducer(rho, D1, D2, p1, Q, K, dz, math.nan, alpha1, alpha2, beta1, beta2)
    discs = [Disc(WEST, D1, p1, -Q, n1), Disc(EAST, D2, f.p2, Q, n2)]
    scale = size(*discs, rho=rho)
    assert f.Fx == pytest.approx(thrust(discs, rho)[0], abs=1e-11 * scale)
    assert (f.F, f.R, f.Rx) == (abs(f.Fx), abs(f.Fx), -f.Fx)
    # K is on the small pipe: the same as a bend of no deflection with K moved to section 1.
    moved = K * (D1 / min(D1, D2)) ** 4
    same = bend(rho, D1, p1, Q, 0.0, D2, moved, dz, math.nan, alpha1, alpha2, beta1, beta2)
    assert f.p2 == pytest.approx(same.p2, rel=1e-9, abs=1e-12 * scale / min(D1, D2) ** 2)


def test_sudden_expansion_leaves_the_pressure_of_borda_on_the_step() -> None:
    """With Borda and Carnot's loss the step's ring takes the upstream pressure: its own derivation."""
    rho, D1, D2, p1, Q = 998.0, 0.2, 0.35, 2e5, 0.15
    f = reducer(rho, D1, D2, p1, Q, K=(1 - (D1 / D2) ** 2) ** 2)
    assert f.Fx == pytest.approx(-p1 * math.pi / 4 * (D2**2 - D1**2), rel=1e-12)


@bounded
@given(densities, diameters, pressures, flows, diameters, flows, angles, diameters, pressures, pressures)
def test_tee_is_the_integral_over_its_ports(
    rho: float,
    D1: float,
    p1: float,
    Q1: float,
    D3: float,
    Q3: float,
    theta: float,
    D2: float,
    p2: float,
    p3: float,
) -> None:
    beta = [corrections(n)[1] for n in (7.0, math.inf, 10.0)]
    f = tee(rho, D1, p1, Q1, D3, Q3, theta, D2, p2=p2, p3=p3, beta1=beta[0], beta2=beta[1], beta3=beta[2])
    discs = [
        Disc(WEST, D1, p1, -Q1, 7.0),
        Disc(EAST, D2, p2, Q1 - Q3),
        Disc(turned(theta), D3, p3, Q3, 10.0),
    ]
    scale = size(*discs, rho=rho)
    assert np.abs(thrust(discs, rho) - [f.Fx, f.Fy, 0.0])[:2].max() <= 1e-11 * scale
    b = balance(
        [d.normal for d in discs], [math.pi / 4 * d.D**2 for d in discs], [p1, p2, p3],
        [d.Q for d in discs], rho, beta,
    )  # fmt: skip
    assert [f.Fx, f.Fy, f.F] == pytest.approx([b.Fx, b.Fy, b.F], abs=1e-12 * scale)
    back = tee(
        rho, D1, p1, -Q1, D3, -Q3, theta, D2, p2=p2, p3=p3, beta1=beta[0], beta2=beta[1], beta3=beta[2]
    )
    assert back[:7] == f[:7]


@bounded
@given(
    densities,
    diameters,
    pressures,
    st.floats(0.0, 3.0),
    diameters,
    st.floats(0.0, 1.0),
    losses,
    losses,
    rises,
)
def test_pressures_that_leave_a_tee(
    rho: float, D1: float, p1: float, Q1: float, D3: float, share: float, K12: float, K13: float, dz3: float
) -> None:
    Q3 = Q1 * share
    for sign in (1.0, -1.0):
        f = tee(rho, D1, p1, sign * Q1, D3, sign * Q3, K12=K12, K13=K13, dz3=dz3, alpha3=1.06)
        run = bend(rho, D1, p1, sign * Q1, 0.0, K=K12)  # the same losses, but of the whole flow
        V1, V2, V3 = f.V1, f.V2, f.V3
        scale = abs(p1) + rho * (V1**2 * (1 + K12 + K13) + V3**2 + abs(dz3) * G)
        assert f.p2 == pytest.approx(run.p2 + rho / 2 * (V1**2 - V2**2), abs=1e-9 * scale)
        branch = p1 + rho / 2 * (V1**2 - 1.06 * V3**2 - sign * K13 * V1**2) - rho * G * dz3
        assert f.p3 == pytest.approx(branch, abs=1e-9 * scale)


def test_tee_with_a_closed_branch_or_a_closed_run() -> None:
    rho, D, p, Q = 1000.0, 0.3, 3e5, 0.1
    stagnation = p + rho / 2 * (Q / (math.pi / 4 * D**2)) ** 2
    branch = tee(rho, D, p, Q, D, 0.0)
    assert (branch.V3, branch.Q2, branch.p2) == (0.0, Q, p)
    assert branch.p3 == pytest.approx(stagnation)
    assert branch.Fx == pytest.approx(0.0, abs=1e-9)
    run = tee(rho, D, p, Q, D, Q)
    assert run.V2 == 0.0
    assert run.p2 == pytest.approx(stagnation)
    still = tee(rho, D, p, 0.0, D, 0.0)
    assert (still.Fx, still.Fy) == (pytest.approx(0.0, abs=1e-9), pytest.approx(-p * math.pi / 4 * D**2))


def test_straight_tee_branch_of_no_angle_is_a_parallel_pipe() -> None:
    f = tee(1000.0, 0.3, 3e5, 0.2, 0.2, 0.1, 0.0, p2=3e5, p3=2e5)
    assert f.Fy == 0.0


@pytest.mark.parametrize(("Q1", "Q3"), [(0.1, -0.05), (0.1, 0.2), (0.0, 0.1), (-0.1, 0.05)])
def test_losses_of_a_combining_tee_are_refused_unless_the_pressures_are_given(Q1: float, Q3: float) -> None:
    with pytest.raises(NoSolution, match="does not carry the whole flow"):
        tee(1000.0, 0.3, 3e5, Q1, 0.2, Q3, K12=0.4, K13=0.9)
    with pytest.raises(NoSolution, match="does not carry the whole flow"):
        tee(1000.0, 0.3, 3e5, Q1, 0.2, Q3, K12=0.4, K13=0.9, p2=2.9e5)
    given_ = tee(1000.0, 0.3, 3e5, Q1, 0.2, Q3, K12=0.4, K13=0.9, p2=2.9e5, p3=2.8e5)
    assert math.isfinite(given_.F)
    assert math.isfinite(tee(1000.0, 0.3, 3e5, Q1, 0.2, Q3).F)


def test_one_bad_row_spoils_one_row() -> None:
    D = np.array([0.3, -0.3, 0.3, 0.3, 0.3])
    K13 = np.array([0.9, 0.9, 0.9, 0.0, np.nan])
    Q3 = np.array([0.05, 0.05, -0.05, -0.05, 0.05])
    given_ = {"rho": 1000.0, "D1": D, "p1": 3e5, "Q1": 0.1, "D3": 0.2, "Q3": Q3, "K13": K13}
    values, status = tee.evaluate([given_.get(p.name, p.default) for p in tee.parameters])
    assert status.tolist()[:4] == [Status.OK, Status.OUT_OF_RANGE, Status.NO_SOLUTION, Status.OK]
    assert np.isnan(np.array(values)[:, [1, 2]]).all()
    assert np.isfinite(np.array(values)[:, [0, 3]]).all()
    one = tee(1000.0, 0.3, 3e5, 0.1, 0.2, 0.05, K13=0.9)
    assert [x[0] for x in values] == pytest.approx(list(one), rel=1e-13)


@pytest.mark.parametrize("routine", [bend, reducer, tee])
def test_rows_equal_single_calls(routine: Any) -> None:
    rng = np.random.default_rng(11)
    columns = {
        p.name: rng.uniform(max(p.bound.low, -1.0), min(p.bound.high, max(p.bound.low, 0.0) + 3.0), 40)
        for p in routine.parameters
        if p.name not in ("K12", "K13")
    }
    optional = [p.name for p in routine.parameters if p.name in ("D2", "p2", "p3") and not p.required]
    columns.update({name: rng.uniform(-1e5, 1e6, 40) for name in columns if name.startswith("p")})
    columns = {name: np.where(rng.random(40) < 0.3, math.nan, x) if name in optional else x
               for name, x in columns.items()}  # fmt: skip
    many = routine(**columns)
    for i in range(40):
        one = routine(**{name: float(x[i]) for name, x in columns.items()})
        assert [x[i] for x in many] == pytest.approx(list(one), rel=1e-12, abs=1e-9)


@pytest.mark.parametrize(
    ("call", "named"),
    [
        (lambda: bend(-1.0, 0.0, 1e5, 0.1, 4.0), {"rho", "D1", "theta"}),
        (lambda: bend(1000.0, 0.3, math.nan, math.inf, 1.0), {"p1", "Q"}),
        (lambda: bend(1000.0, 0.3, 1e5, 0.1, 1.0, D2=0.0, K=-1.0, alpha1=0.9, beta2=0.5),
         {"D2", "K", "alpha1", "beta2"}),
        (lambda: reducer(1000.0, 0.3, -0.2, 1e5, 0.1), {"D2"}),
        (lambda: tee(1000.0, 0.3, 1e5, 0.1, 0.0, 0.1, -0.1), {"D3", "theta"}),
    ],
)  # fmt: skip
def test_every_bad_argument_is_named(call: Any, named: set[str]) -> None:
    with pytest.raises(OutOfRange) as caught:
        call()
    assert {problem.argument for problem in caught.value.problems} == named


def test_a_run_closed_but_for_rounding_still_takes_its_loss_coefficients() -> None:
    """0.1 + 0.2 is not quite 0.3: what is left of the run's flow is no reverse flow."""
    exact = tee(1000.0, 0.4, 5e5, 0.3, 0.2, 0.3, K13=1.0)
    rounded = tee(1000.0, 0.4, 5e5, 0.3, 0.2, 0.1 + 0.2, K13=1.0)
    assert rounded.Q2 < 0
    assert rounded.F == pytest.approx(exact.F, rel=1e-12)
    assert tee(1000.0, 0.4, 5e5, 0.3, 0.2, 0.3 - 0.1 - 0.2, K12=1.0).p2 == pytest.approx(
        tee(1000.0, 0.4, 5e5, 0.3, 0.2, 0.0, K12=1.0).p2
    )
    with pytest.raises(NoSolution):
        tee(1000.0, 0.4, 5e5, 0.3, 0.2, 0.3001, K13=1.0)
