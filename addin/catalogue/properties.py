"""Rows of the properties of fluids."""

from __future__ import annotations

from thrustbook.engine import properties

from .types import Arg, Result, Row
from .workings import properties as workings_properties

FAMILY = "Properties"

ROWS = (
    Row(
        name="TB_WATER",
        family=FAMILY,
        summary="Density, viscosity and vapour pressure of pure liquid water at atmospheric pressure.",
        kind="element",
        args=(Arg(name="T", role="temperature", text="temperature of the water"),),
        results=(
            Result(name="rho", role="density", text="density at 101.325 kPa"),
            Result(name="mu", role="viscosity", text="dynamic viscosity"),
            Result(name="nu", role="kinematic", text="kinematic viscosity"),
            Result(name="pv", role="absolute", text="vapour pressure, absolute"),
        ),
        routine=properties.water,
        sign="All results are positive; the vapour pressure is absolute.",
        longhand=workings_properties.TB_WATER,
        reference="Density: G. S. Kell, J. Chem. Eng. Data 20 (1975) 97, eq. 16. Viscosity: IAPWS R12-08, "
        "eqs. 11 and 12. Vapour pressure: IAPWS R7-97(2012), eq. 30",
        example='TB_WATER("mu", "metric", 15)',
    ),
)
