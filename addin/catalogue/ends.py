"""Rows of the ends of a pipe and of straight pipe."""

from __future__ import annotations

from typing import Final

from thrustbook.engine import ends, straights

from .fittings import (
    ALONG,
    ALPHAS,
    BETAS,
    DZ,
    FAMILY,
    FLOW,
    P1,
    PRESSURE,
    RHO,
    VELOCITIES,
    boils,
    fast,
)
from .types import Arg, Caution, Result, Row
from .workings import fittings as workings_fittings

_SIGN: Final = (
    "x along the flow from section 1 to section 2. F is the thrust of the fluid, R the opposite reaction "
    "of the restraint."
)

ROWS: Final = (
    Row(
        name="TB_NOZZLE",
        family=FAMILY,
        summary="Thrust on a nozzle at the end of a pipe, with its flow from the pressure or its pressure "
        "from the flow: give exactly one of p1 and Q.",
        kind="element",
        args=(
            RHO,
            Arg(name="D1", role="diameter", text="inside diameter of the pipe"),
            Arg(name="D2", role="diameter", text="diameter of the jet where it is parallel"),
            Arg(name="p1", role="pressure", text="gauge pressure in the pipe", empty="found from Q"),
            Arg(name="Q", role="flow", text="volume flow, not negative", empty="found from p1"),
            Arg(name="p2", role="pressure", text="gauge pressure around the jet", empty="0, the atmosphere"),
            Arg(name="K", role="ratio", text="loss coefficient on the velocity of the jet", empty="0"),
            Arg(
                name="Cv",
                role="ratio",
                text="velocity coefficient, above 0 to 1, in place of K",
                empty="K is used",
            ),
            DZ,
            *ALPHAS,
            *BETAS,
        ),
        results=(
            *ALONG,
            Result(name="Q", role="flow", text="volume flow"),
            *VELOCITIES,
            Result(name="p1", role="pressure", text="gauge pressure in the pipe"),
            Result(name="M2", role="force", text="momentum flux of the jet, beta2 rho Q V2"),
        ),
        routine=ends.nozzle,
        sign="x along the flow. F is the thrust of the fluid on the nozzle; positive, it pulls on the joint. "
        "R is the opposite reaction of the joint. Reverse flow is refused.",
        longhand=workings_fittings.TB_NOZZLE,
        reference="Continuity and Bernoulli: p1 = p2 + rho g dz + rho/2 ((alpha2 + K) V2^2 - alpha1 V1^2), "
        "K = 1/Cv^2 - 1; balance: Fx = (p1 + beta1 rho V1^2) A1 - (p2 + beta2 rho V2^2) A2",
        example='TB_NOZZLE("F", "metric", 998, 100, 50, 300)',
        cautions=(
            fast("V1"),
            Caution(
                text="the jet is wider than the pipe: a flow from a pipe does not widen by itself",
                test=lambda k: k["D2"] > k["D1"],
            ),
            boils("p1"),
        ),
    ),
    Row(
        name="TB_CLOSED",
        family=FAMILY,
        summary="Thrust on a closed end: dead end, cap, blank flange or bulkhead.",
        kind="element",
        args=(
            Arg(
                name="D",
                role="diameter",
                text="diameter on which the pressure acts, the joint's if it can slip",
            ),
            Arg(name="p", role="pressure"),
        ),
        results=ALONG,
        routine=ends.closed,
        sign="x outward along the pipe. F is the thrust of the fluid on the end, R the opposite reaction of "
        "the restraint.",
        longhand=workings_fittings.TB_CLOSED,
        reference="Momentum balance without flow: Fx = p pi D^2 / 4; the same form in AWWA M11 and M23",
        example='TB_CLOSED("F", "metric", 300, 1000)',
        cautions=(boils("p"),),
    ),
    Row(
        name="TB_INLINE",
        family=FAMILY,
        summary="Thrust on a restriction in the line (valve, gate, orifice plate, strainer): give exactly "
        "one of K, dp and p2. A closed valve is Q = 0 with dp or p2.",
        kind="element",
        args=(
            RHO,
            Arg(name="D", role="diameter"),
            P1,
            FLOW,
            Arg(
                name="K",
                role="ratio",
                text="loss coefficient on the velocity in the pipe",
                empty="dp or p2 is given",
            ),
            Arg(name="dp", role="loss", text="lasting pressure loss, p1 - p2", empty="K or p2 is given"),
            Arg(name="p2", role="pressure", empty="K or dp is given"),
            *BETAS,
        ),
        results=(
            *ALONG,
            Result(name="V", role="velocity", text="mean velocity in the pipe"),
            PRESSURE,
            Result(name="dp", role="loss", text="lasting pressure loss, p1 - p2"),
        ),
        routine=straights.inline,
        sign=_SIGN,
        longhand=workings_fittings.TB_INLINE,
        reference="Momentum balance: Fx = (p1 - p2) A + (beta1 - beta2) rho V^2 A, dp = K rho V |V| / 2",
        example='TB_INLINE("F", "metric", 998, 300, 400, 100, 2.5)',
        cautions=(
            boils("p1", "p2"),
            fast("V"),
            Caution(
                text="the pressure rises along the flow: a restriction cannot do that",
                test=lambda k: k["dp"] * k["Q"] < 0,
            ),
        ),
    ),
    Row(
        name="TB_STRAIGHT",
        family=FAMILY,
        summary="Drag of the flow on the wall of a straight pipe: give exactly one of f and dp.",
        kind="element",
        args=(
            RHO,
            Arg(name="D", role="diameter"),
            Arg(name="L", role="length"),
            Arg(name="Q", role="flow", text="volume flow along x"),
            Arg(name="f", role="ratio", empty="dp is given"),
            Arg(
                name="dp",
                role="loss",
                text="pressure loss by friction alone, without the part due to a rise",
                empty="found from f",
            ),
        ),
        results=(
            *ALONG,
            Result(name="V", role="velocity", text="mean velocity"),
            Result(name="dp", role="loss", text="pressure loss by friction"),
            Result(name="tau", role="loss", text="shear stress on the wall"),
            Result(name="W", role="force", text="weight of the fluid in the pipe"),
        ),
        routine=straights.straight,
        sign="x along the pipe. F is the drag of the fluid on the wall, along the flow whatever the slope of "
        "the pipe, R the opposite reaction of the restraint. W is not part of F.",
        longhand=workings_fittings.TB_STRAIGHT,
        reference="Momentum balance: Fx = dp pi D^2/4 = tau pi D L; Darcy-Weisbach: dp = f L/D rho V |V| / 2",
        example='TB_STRAIGHT("F", "metric", 998, 300, 100, 100, 0.018)',
        cautions=(
            fast("V"),
            Caution(
                text="dp has not the sign of the flow: friction cannot do that",
                test=lambda k: k["dp"] * k["Q"] < 0,
            ),
        ),
    ),
    Row(
        name="TB_ACCEL",
        family=FAMILY,
        summary="Pressure difference and unbalanced thrust of a column of fluid that speeds up or slows down "
        "(rigid column).",
        kind="element",
        args=(
            RHO,
            Arg(name="D", role="diameter"),
            Arg(name="L", role="length", text="length of the straight leg"),
            Arg(name="dQdt", role="flowrate", text="rate of change of the flow along x"),
        ),
        results=(
            *ALONG,
            Result(name="dp", role="loss", text="pressure difference p1 - p2 that accelerates the column"),
        ),
        routine=straights.accel,
        sign="x along the leg. F is the thrust on the leg with the fittings at its ends, against the "
        "acceleration; R the opposite reaction of the restraint. Friction is not in dp.",
        longhand=workings_fittings.TB_ACCEL,
        reference="Unsteady term of the momentum balance: Fx = - rho L dQ/dt, dp = rho L (dQ/dt) / A",
        example='TB_ACCEL("dp", "metric", 998, 300, 500, -5)',
    ),
)
