"""Rows of the sections and of continuity."""

from __future__ import annotations

from thrustbook.engine import sections

from ..blocks.branchflow import branchflow
from .types import Arg, Caution, Result, Row
from .workings import sections as workings_sections

FAMILY = "Sections and continuity"

ROWS = (
    Row(
        name="TB_AREA",
        family=FAMILY,
        summary="Area of a full circular section.",
        kind="element",
        args=(Arg(name="D", role="diameter"),),
        results=(Result(name="A", role="area", text="area of the section"),),
        routine=sections.area,
        sign="The area is positive.",
        longhand=workings_sections.TB_AREA,
        reference="Geometry of the circle: A = pi D^2 / 4",
        example='TB_AREA("metric", 300)',
    ),
    Row(
        name="TB_VELOCITY",
        family=FAMILY,
        summary="Mean velocity in a full circular pipe from its flow.",
        kind="element",
        args=(Arg(name="Q", role="flow", text="volume flow"), Arg(name="D", role="diameter")),
        results=(Result(name="V", role="velocity", text="mean velocity"),),
        routine=sections.velocity,
        sign="The velocity has the sign of the flow.",
        longhand=workings_sections.TB_VELOCITY,
        reference="Continuity: V = Q / A",
        example='TB_VELOCITY("metric", 100, 300)',
    ),
    Row(
        name="TB_FLOW",
        family=FAMILY,
        summary="Volume flow of a full circular pipe from its mean velocity.",
        kind="element",
        args=(Arg(name="V", role="velocity"), Arg(name="D", role="diameter")),
        results=(Result(name="Q", role="flow", text="volume flow"),),
        routine=sections.flow,
        sign="The flow has the sign of the velocity.",
        longhand=workings_sections.TB_FLOW,
        reference="Continuity: Q = V A",
        example='TB_FLOW("metric", 1.5, 300)',
    ),
    Row(
        name="TB_MASSFLOW",
        family=FAMILY,
        summary="Mass flow from density and volume flow.",
        kind="element",
        args=(Arg(name="rho", role="density"), Arg(name="Q", role="flow", text="volume flow")),
        results=(Result(name="mdot", role="massflow", text="mass flow"),),
        routine=sections.massflow,
        sign="The mass flow has the sign of the volume flow.",
        longhand=workings_sections.TB_MASSFLOW,
        reference="Definition: mdot = rho Q",
        example='TB_MASSFLOW("metric", 998, 100)',
    ),
    Row(
        name="TB_BRANCHFLOW",
        family=FAMILY,
        summary="Flow that closes a junction: the opposite of the sum of the known flows. "
        "One row or column of flows is one junction; in a larger range each row is one.",
        kind="table",
        args=(
            Arg(
                name="Q",
                role="table",
                text="known flows of the junction, positive into it; empty cells are left out",
            ),
        ),
        results=(
            Result(name="Q", role="flow", text="flow of the remaining branch, positive into the junction"),
        ),
        routine=branchflow,
        sign="Flows are positive into the junction; a negative result leaves it.",
        longhand=workings_sections.TB_BRANCHFLOW,
        reference="Continuity at a junction, steady flow of constant density: the flows add up to zero",
        example='TB_BRANCHFLOW("metric", {300; -180})',
    ),
    Row(
        name="TB_REYNOLDS",
        family=FAMILY,
        summary="Reynolds number of a full circular pipe.",
        kind="element",
        args=(
            Arg(name="rho", role="density"),
            Arg(name="mu", role="viscosity"),
            Arg(name="V", role="velocity"),
            Arg(name="D", role="diameter"),
        ),
        results=(Result(name="Re", role="ratio", text="Reynolds number"),),
        routine=sections.reynolds,
        sign="Positive for either direction of flow.",
        longhand=workings_sections.TB_REYNOLDS,
        reference="ISO 80000-11: Re = rho V D / mu",
        example='TB_REYNOLDS("metric", 998, 1, 1.5, 300)',
    ),
    Row(
        name="TB_PROFILE",
        family=FAMILY,
        summary="Kinetic energy and momentum corrections of a developed velocity profile: "
        "laminar, or turbulent by the power law.",
        kind="element",
        args=(
            Arg(
                name="regime",
                role="choice",
                text="kind of the profile",
                choices=sections.PROFILES,
                empty="turbulent",
            ),
            Arg(
                name="n",
                role="ratio",
                text="exponent of the power law u/Vmax = (y/R)^(1/n), at least 1; 7 is usual",
                empty="from f; one of the two is needed in turbulent flow",
            ),
            Arg(
                name="f",
                role="ratio",
                text="Darcy friction factor, from which n = 1/sqrt(f)",
                empty="n is given",
            ),
        ),
        results=(
            Result(name="alpha", role="ratio", text="kinetic energy correction"),
            Result(name="beta", role="ratio", text="momentum correction"),
            Result(name="ratio", role="ratio", text="mean velocity over the largest velocity"),
            Result(name="n", role="ratio", text="exponent of the power law used, 0 where laminar"),
        ),
        routine=sections.profile,
        sign="Positive for either direction of flow.",
        longhand=workings_sections.TB_PROFILE,
        reference="Profiles integrated over the section (power law as in C. L. Chen, J. Hydraul. Eng. 118 "
        "(1992) 1571); n = 1/sqrt(f) after W. Nunner, VDI-Forschungsheft 455 (1956); both from memory",
        example='TB_PROFILE("alpha", "SI", "turbulent", 7)',
        cautions=(
            Caution(
                text="exponent n outside 5 to 12, the range usual in turbulent pipe flow (common practice)",
                test=lambda k: (k["n"] > 0.0) & ((k["n"] < 5.0) | (k["n"] > 12.0)),
            ),
        ),
    ),
)
