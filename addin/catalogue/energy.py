"""Rows of friction, losses, heads, power and cavitation."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any, Final

from thrustbook.engine import energy, friction, losses

from .types import Arg, Caution, Result, Row
from .workings import energy as workings_energy

FAMILY: Final = "Energy"

METHOD: Final = Arg(
    name="method",
    role="choice",
    text="formula of the turbulent friction factor",
    choices=friction.METHODS,
    empty="colebrook",
)
_FRICTION_SOURCE: Final = (
    "f = 64/Re up to Re 2300; from 4000 Colebrook-White (J. Inst. Civ. Eng. 11 (1939) 133), Swamee-Jain "
    "(J. Hydraul. Div. ASCE 102 (1976) 657) or Haaland (J. Fluids Eng. 105 (1983) 89); linear in Re "
    "between (own rule)"
)


def _transition(k: Mapping[str, Any]) -> Any:
    return (k["Re"] > friction.RE_LAMINAR) & (k["Re"] < friction.RE_TURBULENT)


TRANSITION: Final = Caution(
    text="Reynolds number between 2300 and 4000: the flow is unstable and f follows an interpolation",
    test=_transition,
)
FAST: Final = Caution(
    text="velocity above 3 m/s in a liquid: beyond usual practice for long pipes (common practice)",
    test=lambda k: (k["rho"] > 500.0) & (abs(k["V"]) > 3.0),
)

_STEP_RESULTS: Final = (
    Result(name="K1", role="ratio", text="loss coefficient on the velocity head at section 1"),
    Result(name="K2", role="ratio", text="loss coefficient on the velocity head at section 2"),
    Result(name="dp", role="loss", text="loss of total pressure; needs Q and rho"),
    Result(name="hL", role="head", text="head loss; needs Q"),
)
_STEP_ARGS: Final = (
    Arg(name="D1", role="diameter"),
    Arg(name="D2", role="diameter"),
    Arg(name="Q", role="flow", empty="only K1 and K2 are given"),
    Arg(name="rho", role="density", empty="no pressure loss is given"),
)

ROWS: Final = (
    Row(
        name="TB_FRICTION",
        family=FAMILY,
        summary="Darcy friction factor of a full circular pipe: laminar, transition and turbulent.",
        kind="element",
        args=(
            Arg(name="Re", role="ratio"),
            Arg(name="eD", role="ratio", text="relative roughness e/D, 0 to 0.1", empty="from e and D"),
            METHOD,
            Arg(name="e", role="roughness", empty="eD is given"),
            Arg(name="D", role="diameter", empty="eD is given"),
        ),
        results=(
            Result(name="f", role="ratio", text="Darcy friction factor"),
            Result(name="regime", role="ratio", text="1 laminar, 2 transition, 3 turbulent"),
        ),
        routine=friction.friction,
        sign="Positive for either direction of flow.",
        longhand=workings_energy.TB_FRICTION,
        reference=_FRICTION_SOURCE,
        example='TB_FRICTION("f", "SI", 100000, 0.0001)',
        cautions=(
            TRANSITION,
            Caution(
                text="relative roughness above 0.05, the end of the usual friction chart",
                test=lambda k: (k["eD"] > 0.05) | (k["e"] > 0.05 * k["D"]),
            ),
            Caution(
                text="Reynolds number above 1e8, the end of the usual friction chart",
                test=lambda k: k["Re"] > 1e8,
            ),
        ),
    ),
    Row(
        name="TB_PIPELOSS",
        family=FAMILY,
        summary="Friction loss of a straight full pipe, and the drag of the fluid on its wall.",
        kind="element",
        args=(
            Arg(name="rho", role="density"),
            Arg(name="mu", role="viscosity"),
            Arg(name="D", role="diameter"),
            Arg(name="L", role="length"),
            Arg(name="e", role="roughness"),
            Arg(name="Q", role="flow", text="volume flow"),
            METHOD,
        ),
        results=(
            Result(name="dp", role="loss", text="pressure loss by friction"),
            Result(name="hL", role="head", text="head loss by friction"),
            Result(name="f", role="ratio", text="Darcy friction factor, 0 where nothing flows"),
            Result(name="Re", role="ratio", text="Reynolds number"),
            Result(name="V", role="velocity", text="mean velocity"),
            Result(name="F", role="force", text="drag, force of the fluid on the wall along the pipe"),
        ),
        routine=losses.pipeloss,
        sign="Loss, velocity and drag have the sign of the flow; Q = 0 loses nothing.",
        longhand=workings_energy.TB_PIPELOSS,
        reference="Darcy-Weisbach: hL = f (L/D) V |V| / (2 g); F = dp A. " + _FRICTION_SOURCE,
        example='TB_PIPELOSS("hL", "metric", 998, 1, 300, 100, 0.1, 100)',
        cautions=(TRANSITION, FAST),
    ),
    Row(
        name="TB_FITTINGLOSS",
        family=FAMILY,
        summary="Loss of a fitting from its loss coefficient.",
        kind="element",
        args=(
            Arg(name="rho", role="density"),
            Arg(name="D", role="diameter"),
            Arg(name="Q", role="flow", text="volume flow"),
            Arg(name="K", role="ratio", text="loss coefficient on the velocity head in the diameter D"),
        ),
        results=(
            Result(name="dp", role="loss", text="pressure loss"),
            Result(name="hL", role="head", text="head loss"),
            Result(name="V", role="velocity", text="mean velocity"),
        ),
        routine=losses.fittingloss,
        sign="The loss has the sign of the flow.",
        longhand=workings_energy.TB_FITTINGLOSS,
        reference="Definition of the loss coefficient: hL = K V |V| / (2 g)",
        example='TB_FITTINGLOSS("dp", "metric", 998, 300, 100, 0.5)',
        cautions=(FAST,),
    ),
    Row(
        name="TB_EXPANSION",
        family=FAMILY,
        summary="Loss of a sudden expansion from D1 to the larger D2, after Borda and Carnot.",
        kind="element",
        args=_STEP_ARGS,
        results=_STEP_RESULTS,
        routine=losses.expansion,
        sign="Flow from section 1 to section 2; reverse flow is refused. Losses are positive.",
        longhand=workings_energy.TB_EXPANSION,
        reference="Borda-Carnot: hL = (V1 - V2)^2 / (2 g), K1 = (1 - A1/A2)^2",
        example='TB_EXPANSION("K1", "metric", 100, 200)',
    ),
    Row(
        name="TB_CONTRACTION",
        family=FAMILY,
        summary="Loss of a sudden sharp-edged contraction from D1 to the smaller D2.",
        kind="element",
        args=_STEP_ARGS,
        results=_STEP_RESULTS,
        routine=losses.contraction,
        sign="Flow from section 1 to section 2; reverse flow is refused. Losses are positive.",
        longhand=workings_energy.TB_CONTRACTION,
        reference="K2 = (1 - (D2/D1)^2) / 2 on the small pipe, as in Crane Technical Paper 410 (from memory)",
        example='TB_CONTRACTION("K2", "metric", 300, 200)',
    ),
    Row(
        name="TB_HEAD",
        family=FAMILY,
        summary="Total head, hydraulic grade, pressure head and velocity head at a section.",
        kind="element",
        args=(
            Arg(name="rho", role="density"),
            Arg(name="p", role="pressure"),
            Arg(name="V", role="velocity"),
            Arg(name="z", role="level", empty="0"),
            Arg(name="alpha", role="ratio", text="kinetic energy correction", empty="1"),
        ),
        results=(
            Result(name="H", role="head", text="total head, the energy grade"),
            Result(name="HGL", role="head", text="hydraulic grade"),
            Result(name="hp", role="head", text="pressure head"),
            Result(name="hV", role="head", text="velocity head"),
        ),
        routine=energy.head,
        sign="Heights above the datum of z, positive upwards.",
        longhand=workings_energy.TB_HEAD,
        reference="Bernoulli: H = z + p/(rho g) + alpha V^2/(2 g)",
        example='TB_HEAD("H", "metric", 998, 400, 1.5, 12)',
    ),
    Row(
        name="TB_POWER",
        family=FAMILY,
        summary="Hydraulic power of a flow at a head, and the power at the shaft of a pump or turbine.",
        kind="element",
        args=(
            Arg(name="rho", role="density"),
            Arg(name="Q", role="flow", text="volume flow through the machine"),
            Arg(name="H", role="head", text="head given to the fluid, negative in a turbine"),
            Arg(name="eta", role="ratio", text="efficiency, above 0 to 1", empty="1, a machine without loss"),
        ),
        results=(
            Result(name="P", role="power", text="hydraulic power, given to the fluid"),
            Result(name="Pshaft", role="power", text="power taken by the shaft"),
        ),
        routine=energy.power,
        sign="Power given to the fluid is positive; a turbine's powers are negative.",
        longhand=workings_energy.TB_POWER,
        reference="P = rho g Q H; pump Pshaft = P / eta, turbine Pshaft = P eta (definitions)",
        example='TB_POWER("Pshaft", "metric", 998, 100, 20, 0.8)',
    ),
    Row(
        name="TB_CAVITATION",
        family=FAMILY,
        summary="Margin of the absolute pressure to the vapour pressure, cavitation number and NPSH.",
        kind="element",
        args=(
            Arg(name="p", role="pressure"),
            Arg(name="pv", role="absolute"),
            Arg(name="rho", role="density", empty="sigma and NPSH are not given"),
            Arg(name="V", role="velocity", empty="sigma and NPSH are not given"),
            Arg(name="pamb", role="absolute", empty="standard atmosphere, 101 325 Pa"),
        ),
        results=(
            Result(name="margin", role="loss", text="absolute pressure less vapour pressure"),
            Result(name="pabs", role="absolute", text="absolute pressure"),
            Result(name="sigma", role="ratio", text="cavitation number; needs rho and V"),
            Result(name="NPSH", role="head", text="net positive suction head available; needs rho and V"),
        ),
        routine=energy.cavitation,
        sign="A negative margin means that the liquid boils; it is a result, not an error.",
        longhand=workings_energy.TB_CAVITATION,
        reference="margin = p + pamb - pv, sigma = margin / (rho V^2/2); NPSH: ISO 17769-1 (from memory)",
        example='TB_CAVITATION("margin", "metric", -60, 2.339)',
        cautions=(
            Caution(
                text="pressure at or below vapour pressure: the liquid boils, the column may separate",
                test=lambda k: k["margin"] <= 0.0,
            ),
            Caution(
                text="absolute pressure below zero: no such flow exists",
                test=lambda k: k["pabs"] < 0.0,
            ),
        ),
    ),
)
