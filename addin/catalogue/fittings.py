"""Rows of the fittings along a run: bend, reducer, tee, and the general balance."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from typing import Any, Final

from thrustbook.engine import fittings
from thrustbook.engine.constants import G

from ..blocks.balance import PORT_COLUMNS, balance
from .types import Arg, Caution, Result, Row
from .workings import balance as workings_balance
from .workings import fittings as workings_fittings

FAMILY: Final = "Fittings"

RHO: Final = Arg(name="rho", role="density")
P1: Final = Arg(name="p1", role="pressure")
P2: Final = Arg(name="p2", role="pressure", empty="by Bernoulli's equation")
FLOW: Final = Arg(name="Q", role="flow")
DZ: Final = Arg(name="dz", role="level", empty="0")
ALPHAS: Final = (Arg(name="alpha1", role="ratio", empty="1"), Arg(name="alpha2", role="ratio", empty="1"))
BETAS: Final = (Arg(name="beta1", role="ratio", empty="1"), Arg(name="beta2", role="ratio", empty="1"))

_X: Final = "thrust of the fluid along x"
ALONG: Final = (
    Result(name="Fx", role="force", text=_X),
    Result(name="F", role="force", text="thrust of the fluid, magnitude"),
    Result(name="Rx", role="force", text="reaction of the restraint along x, opposite to Fx"),
    Result(name="R", role="force", text="reaction of the restraint, magnitude"),
)
PLANE: Final = (
    Result(name="Fx", role="force", text=_X),
    Result(name="Fy", role="force", text="thrust of the fluid along y"),
    Result(name="F", role="force", text="thrust of the fluid, magnitude"),
    Result(name="dir", role="angle", text="direction of the thrust, from x towards y"),
    Result(name="Rx", role="force", text="reaction of the restraint along x, opposite to Fx"),
    Result(name="Ry", role="force", text="reaction of the restraint along y, opposite to Fy"),
    Result(name="R", role="force", text="reaction of the restraint, magnitude"),
)
VELOCITIES: Final = (
    Result(name="V1", role="velocity", text="mean velocity at section 1"),
    Result(name="V2", role="velocity", text="mean velocity at section 2"),
)
PRESSURE: Final = Result(name="p2", role="pressure", text="gauge pressure at section 2")

BOILING: Final = -98e3
"""Gauge pressure [Pa] of boiling cold water: about 2.3 kPa absolute at 20 C, below 101.3 kPa."""


def boils(*pressures: str) -> Caution:
    """Warn where a pressure is one at which cold water boils."""

    def test(k: Mapping[str, Any]) -> Any:
        return sum((k[p] < BOILING) * 1 for p in pressures) > 0

    return Caution(
        text=f"{' or '.join(pressures)} is below -98 kPa: cold water boils at such a pressure under a "
        "standard atmosphere",
        test=test,
    )


def fast(*velocities: str) -> Caution:
    """Warn where a liquid is faster than is usual in pipes."""

    def test(k: Mapping[str, Any]) -> Any:
        return (k["rho"] > 500.0) & (sum((abs(k[v]) > 6.0) * 1 for v in velocities) > 0)

    return Caution(
        text=f"{' or '.join(velocities)} is above 6 m/s: beyond usual practice for liquids in pipes "
        "(common practice)",
        test=test,
    )


def _gains(Q: str, V: str, p: str, dz: str, alpha: str) -> Callable[[Mapping[str, Any]], Any]:
    def test(k: Mapping[str, Any]) -> Any:
        before = k["p1"] + k["rho"] * k["alpha1"] * k["V1"] ** 2 / 2
        after = k[p] + k["rho"] * (k[alpha] * k[V] ** 2 / 2 + G * k[dz])
        margin = 1e-9 * (abs(k["p1"]) + abs(k[p]) + k["rho"] * (k["V1"] ** 2 + k[V] ** 2 + G * abs(k[dz])))
        return (after - before) * ((k[Q] > 0) * 1 - (k[Q] < 0) * 1) > margin

    return test


def gains(Q: str = "Q", V: str = "V2", p: str = "p2", dz: str = "dz", alpha: str = "alpha2") -> Caution:
    """Warn where the pressures given would have the flow gain energy in the fitting."""
    return Caution(
        text=f"the flow gains energy between section 1 and the section of {p}: check {p}",
        test=_gains(Q, V, p, dz, alpha),
    )


_BERNOULLI: Final = "p2 = p1 + rho/2 (alpha1 V1^2 - alpha2 V2^2 - K V |V|) - rho g dz"
_PLANE_SIGN: Final = (
    "x along the incoming flow at section 1, y towards the side to which the fitting turns. F is the "
    "thrust of the fluid on the fitting, R the opposite reaction of the restraint. The weight of the fluid "
    "is left out."
)
_ALONG_SIGN: Final = (
    "x along the flow from section 1 to section 2. F is the thrust of the fluid on the fitting, R the "
    "opposite reaction of the restraint. The weight of the fluid is left out."
)

ROWS: Final = (
    Row(
        name="TB_BALANCE",
        family=FAMILY,
        summary="Thrust on any fitting by the momentum balance: any number of ports in three dimensions, "
        "weight and unsteady term. One row of the table is one port.",
        kind="table",
        args=(
            Arg(name="rho", role="density"),
            Arg(
                name="headings",
                role="headings",
                text="names of the columns: nx ny nz, D or A, p, Q, beta; units in brackets if they differ",
            ),
            Arg(
                name="ports",
                role="table",
                text="one row a port: outward normal, diameter or area, gauge pressure, flow out, beta",
                columns=PORT_COLUMNS,
            ),
            Arg(
                name="W",
                role="force",
                text="weight of the fluid in the fitting, acting along -z",
                empty="0",
                required=False,
            ),
            *(
                Arg(
                    name=f"dM{axis}",
                    role="force",
                    text=f"rate of change of the momentum of the fluid in the fitting along {axis}",
                    empty="0, steady",
                    required=False,
                )
                for axis in "xyz"
            ),
            Arg(
                name="tol",
                role="ratio",
                text="net outflow that is accepted, as a fraction of the largest flow",
                empty="0.000001",
                required=False,
            ),
        ),
        results=(
            *(Result(name=f"F{a}", role="force", text=f"thrust of the fluid along {a}") for a in "xyz"),
            Result(name="F", role="force", text="thrust of the fluid, magnitude"),
            *(Result(name=f"R{a}", role="force", text=f"reaction of the restraint along {a}") for a in "xyz"),
            Result(name="R", role="force", text="reaction of the restraint, magnitude"),
            Result(name="residual", role="flow", text="sum of the flows out, 0 where they close"),
        ),
        routine=balance,
        sign="x east, y north, z up. Normals point outward, flows are positive outward. F is the thrust of "
        "the fluid on the fitting, R the opposite reaction of the restraint.",
        longhand=workings_balance.TB_BALANCE,
        reference="Momentum theorem: F = - sum (p + beta rho V^2) A n - W z - dM/dt",
        example='TB_BALANCE("Fx", "metric", 998, {"nx","ny","nz","D","p","Q"}, '
        "{-1,0,0,300,400,-100; 0,1,0,300,400,100})",
    ),
    Row(
        name="TB_BEND",
        family=FAMILY,
        summary="Thrust on a bend, which may reduce or expand, and the pressure that leaves it.",
        kind="element",
        args=(
            RHO,
            Arg(name="D1", role="diameter"),
            P1,
            FLOW,
            Arg(name="theta", role="angle", text="deflection, 0 (straight) to 180 degrees (return bend)"),
            Arg(name="D2", role="diameter", empty="as D1"),
            Arg(
                name="K",
                role="ratio",
                text="loss coefficient on the velocity V1 of section 1",
                empty="0",
            ),
            DZ,
            P2,
            *ALPHAS,
            *BETAS,
        ),
        results=(*PLANE, *VELOCITIES, PRESSURE),
        routine=fittings.bend,
        sign=_PLANE_SIGN,
        longhand=workings_fittings.TB_BEND,
        reference="Momentum balance: Fx = (p1 + beta1 rho V1^2) A1 - (p2 + beta2 rho V2^2) A2 cos theta, "
        f"Fy = - (p2 + beta2 rho V2^2) A2 sin theta; {_BERNOULLI} with V = V1",
        example='TB_BEND("Fx", "metric", 998, 300, 400, 100, 90)',
        cautions=(boils("p1", "p2"), fast("V1", "V2"), gains()),
    ),
    Row(
        name="TB_REDUCER",
        family=FAMILY,
        summary="Thrust on a reducer or expander in a straight run, and the pressure that leaves it.",
        kind="element",
        args=(
            RHO,
            Arg(name="D1", role="diameter"),
            Arg(name="D2", role="diameter"),
            P1,
            FLOW,
            Arg(
                name="K",
                role="ratio",
                text="loss coefficient on the velocity of the smaller pipe",
                empty="0",
            ),
            DZ,
            P2,
            *ALPHAS,
            *BETAS,
        ),
        results=(*ALONG, *VELOCITIES, PRESSURE),
        routine=fittings.reducer,
        sign=_ALONG_SIGN,
        longhand=workings_fittings.TB_REDUCER,
        reference="Momentum balance: Fx = (p1 + beta1 rho V1^2) A1 - (p2 + beta2 rho V2^2) A2; "
        f"{_BERNOULLI} with V in the smaller pipe",
        example='TB_REDUCER("Fx", "metric", 998, 300, 200, 400, 100, 0.05)',
        cautions=(boils("p1", "p2"), fast("V1", "V2"), gains()),
    ),
    Row(
        name="TB_TEE",
        family=FAMILY,
        summary="Thrust on a tee or wye with a branch at any angle; the run's outflow follows by continuity.",
        kind="element",
        args=(
            RHO,
            Arg(name="D1", role="diameter", text="inside diameter of the run at section 1 (inlet)"),
            P1,
            Arg(name="Q1", role="flow"),
            Arg(name="D3", role="diameter"),
            Arg(name="Q3", role="flow"),
            Arg(
                name="theta",
                role="angle",
                text="angle of the branch to the flow of the run; under 90 degrees it points downstream",
                empty="90 degrees",
            ),
            Arg(
                name="D2",
                role="diameter",
                text="inside diameter of the run at section 2 (outlet)",
                empty="as D1",
            ),
            Arg(
                name="K12",
                role="ratio",
                text="loss coefficient along the run, on the velocity V1 of section 1",
                empty="0",
            ),
            Arg(
                name="K13",
                role="ratio",
                text="loss coefficient into the branch, on the velocity V1 of section 1",
                empty="0",
            ),
            Arg(name="dz2", role="level", text="rise from section 1 to section 2", empty="0"),
            Arg(name="dz3", role="level", text="rise from section 1 to section 3", empty="0"),
            P2,
            Arg(name="p3", role="pressure", empty="by Bernoulli's equation"),
            *(Arg(name=f"alpha{i}", role="ratio", empty="1") for i in "123"),
            *(Arg(name=f"beta{i}", role="ratio", empty="1") for i in "123"),
        ),
        results=(
            *PLANE,
            Result(name="Q2", role="flow", text="flow that goes on along the run, Q1 - Q3"),
            *VELOCITIES,
            Result(name="V3", role="velocity", text="mean velocity in the branch"),
            PRESSURE,
            Result(name="p3", role="pressure", text="gauge pressure in the branch, section 3"),
        ),
        routine=fittings.tee,
        sign="x along the run from section 1 to section 2, y towards the branch. Q1 is positive into the "
        "tee, Q2 and Q3 out of it. F is the thrust of the fluid on the tee, R the opposite reaction of the "
        "restraint.",
        longhand=workings_fittings.TB_TEE,
        reference="Momentum balance: Fx = M1 - M2 - M3 cos theta, Fy = - M3 sin theta, "
        "Mi = (pi + betai rho Vi^2) Ai; pi = p1 + rho/2 (alpha1 V1^2 - alphai Vi^2 - K1i V1 |V1|) "
        "- rho g dzi",
        example='TB_TEE("Fy", "metric", 998, 400, 500, 200, 200, 60)',
        cautions=(
            boils("p1", "p2", "p3"),
            fast("V1", "V2", "V3"),
            Caution(
                text="section 1 does not carry the whole flow: pressures not given are those without loss",
                test=lambda k: k["Q2"] * k["Q3"] < -fittings.ROUNDING * k["Q1"] ** 2,
            ),
        ),
    ),
)
