"""Rows of Bernoulli's equation between two sections: pressure, discharge, pump head."""

from __future__ import annotations

from typing import Final

from thrustbook.engine import bernoulli

from .energy import FAMILY
from .types import Arg, Caution, Result, Row
from .workings import energy as workings_energy

_DZ: Final = Arg(name="dz", role="level", empty="0")
_K: Final = Arg(
    name="K", role="ratio", text="loss coefficient on the velocity head of the smaller section", empty="0"
)
_HL: Final = Arg(name="hL", role="head", text="further loss of head, such as pipe friction", empty="0")
_ALPHAS: Final = (Arg(name="alpha1", role="ratio", empty="1"), Arg(name="alpha2", role="ratio", empty="1"))
_VELOCITIES: Final = (
    Result(name="V1", role="velocity", text="mean velocity at section 1"),
    Result(name="V2", role="velocity", text="mean velocity at section 2"),
)
_LOSS: Final = Result(name="hL", role="head", text="whole loss of head, with the sign of the flow")

ROWS: Final = (
    Row(
        name="TB_PRESSURE",
        family=FAMILY,
        summary="Pressure at section 2 from that at section 1, with losses, rise and pump head.",
        kind="element",
        args=(
            Arg(name="rho", role="density"),
            Arg(name="D1", role="diameter"),
            Arg(name="D2", role="diameter"),
            Arg(name="p1", role="pressure"),
            Arg(name="Q", role="flow"),
            _DZ,
            _K,
            _HL,
            Arg(name="Hp", role="head", empty="0, no pump"),
            *_ALPHAS,
        ),
        results=(
            Result(name="p2", role="pressure", text="gauge pressure at section 2"),
            Result(name="dp", role="loss", text="fall of pressure, p1 - p2"),
            _LOSS,
            *_VELOCITIES,
        ),
        routine=bernoulli.pressure,
        sign="Flow, rise and pump head are positive from section 1 to section 2; losses act along the flow.",
        longhand=workings_energy.TB_PRESSURE,
        reference="Bernoulli: p2 = p1 + rho/2 (alpha1 V1^2 - alpha2 V2^2) - rho g (dz - Hp + loss), "
        "loss = K V^2/(2 g) + hL",
        example='TB_PRESSURE("p2", "metric", 998, 300, 200, 400, 100, 2, 0.2)',
        cautions=(
            Caution(
                text="p2 is below -98 kPa: cold water boils at such a pressure under a standard atmosphere",
                test=lambda k: k["p2"] < -98e3,
            ),
        ),
    ),
    Row(
        name="TB_DISCHARGE",
        family=FAMILY,
        summary="Flow through a contraction or nozzle from the pressure before it, or that pressure "
        "from the flow: give exactly one of p1 and Q.",
        kind="element",
        args=(
            Arg(name="rho", role="density"),
            Arg(name="D1", role="diameter"),
            Arg(name="D2", role="diameter"),
            Arg(name="p1", role="pressure", empty="found from Q"),
            Arg(name="Q", role="flow", empty="found from p1"),
            Arg(name="p2", role="pressure", empty="0, the atmosphere"),
            _K,
            Arg(name="Cd", role="ratio", text="discharge coefficient, above 0 to 1", empty="1"),
            _DZ,
            *_ALPHAS,
        ),
        results=(
            Result(name="Q", role="flow", text="volume flow from section 1 to section 2"),
            Result(name="p1", role="pressure", text="gauge pressure at section 1"),
            *_VELOCITIES,
            Result(name="hL", role="head", text="head loss"),
        ),
        routine=bernoulli.discharge,
        sign="Flow from section 1 to section 2; reverse flow is refused.",
        longhand=workings_energy.TB_DISCHARGE,
        reference="Continuity and Bernoulli: p1 - p2 - rho g dz = rho/2 (Q/(Cd A2))^2 "
        "(alpha2 - alpha1 (A2/A1)^2 + K)",
        example='TB_DISCHARGE("Q", "metric", 998, 100, 50, 300)',
    ),
    Row(
        name="TB_PUMPHEAD",
        family=FAMILY,
        summary="Head that a pump must give between two sections, losses included.",
        kind="element",
        args=(
            Arg(name="rho", role="density"),
            Arg(name="D1", role="diameter"),
            Arg(name="D2", role="diameter"),
            Arg(name="p1", role="pressure"),
            Arg(name="p2", role="pressure"),
            Arg(name="Q", role="flow"),
            _DZ,
            _K,
            _HL,
            *_ALPHAS,
        ),
        results=(
            Result(name="Hp", role="head", text="head given to the fluid by the pump"),
            Result(name="dp", role="loss", text="rise of total pressure in the pump, rho g Hp"),
            _LOSS,
            *_VELOCITIES,
        ),
        routine=bernoulli.pumphead,
        sign="Positive where the pump drives from section 1 to section 2; losses act along the flow.",
        longhand=workings_energy.TB_PUMPHEAD,
        reference="Bernoulli: Hp = (p2 - p1)/(rho g) + (alpha2 V2^2 - alpha1 V1^2)/(2 g) + dz + loss, "
        "loss = K V^2/(2 g) + hL",
        example='TB_PUMPHEAD("Hp", "metric", 998, 300, 300, 0, 200, 100, 10, 0, 3)',
    ),
)
