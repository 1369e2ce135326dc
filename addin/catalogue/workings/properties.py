"""Long-hand workings: properties of fluids."""

from __future__ import annotations

import re
from typing import Final

from ..types import Longhand, Step

# IAPWS R12-08, table 2: for each power of (1/Tr - 1), the factors of the powers of (rho/322 - 1) from 0 on.
_VISCOSITY: Final = (
    (0.520094, 0.222531, -0.281378, 0.161913, -0.0325372),
    (0.0850895, 0.999115, -0.906851, 0.257399),
    (-1.08374, 1.88797, -0.772479),
    (-0.289555, 1.26613, -0.489837, 0.0, 0.0698452, 0.0, -0.00435673),
    (0.0, 0.0, -0.257040, 0.0, 0.0, 0.00872102),
    (0.0, 0.120573, 0.0, 0.0, 0.0, 0.0, -0.000593264),
)


def _powers(x: str, factors: tuple[float, ...]) -> str:
    """A sum of powers of x, from 0 on."""
    terms = []
    for power, factor in enumerate(factors):
        if factor:
            size = f"{abs(factor):.10f}".rstrip("0")
            terms.append(f"{'-' if factor < 0 else '+'}{size}" + (f"*{x}^{power}" if power else ""))
    text = "".join(terms).removeprefix("+")
    # A spreadsheet takes the sign in front before the power: -2^2 is 4 there.
    return f"0{text}" if text.startswith("-") else text


def _viscosity() -> tuple[Step, ...]:
    return tuple(
        Step(f"q{i}", f"viscosity: factor of x^{i}, powers of y", "ratio", _powers("{y}", factors))
        for i, factors in enumerate(_VISCOSITY)
    )


def water_steps(T: str) -> tuple[Step, ...]:
    """Properties rho, mu, nu and pv of water from the name of the temperature."""
    return (
        Step(
            "t",
            "temperature in degrees Celsius on the scale of 1968, that of Kell's formula",
            "degC",
            f"1.00024*({T}-273.15)",
        ),
        Step(
            "k1",
            "density: numerator of Kell's formula",
            "ratio",
            "999.83952+16.945176*{t}-0.0079870401*{t}^2-0.000046170461*{t}^3+0.00000010556302*{t}^4"
            "-0.00000000028054253*{t}^5",
        ),
        Step("k2", "density: its denominator", "ratio", "1+0.01687985*{t}"),
        Step("rho", "density of water at 101.325 kPa (Kell)", "density", "{k1}/{k2}"),
        Step("Tr", "temperature over the critical one", "ratio", f"{T}/647.096"),
        Step(
            "m0",
            "viscosity of the thin gas (IAPWS R12-08, eq. 11)",
            "ratio",
            "100*SQRT({Tr})/(1.67752+2.20462/{Tr}+0.6366564/{Tr}^2-0.241605/{Tr}^3)",
        ),
        Step("x", "1/Tr - 1", "ratio", "1/{Tr}-1"),
        Step("y", "density over 322 kg/m3, less 1", "ratio", "{rho}/322-1"),
        *_viscosity(),
        Step(
            "m1",
            "factor of the density (eq. 12)",
            "ratio",
            "EXP({rho}/322*({q0}+{q1}*{x}+{q2}*{x}^2+{q3}*{x}^3+{q4}*{x}^4+{q5}*{x}^5))",
        ),
        Step("mu", "dynamic viscosity", "viscosity", "0.000001*{m0}*{m1}"),
        Step("nu", "kinematic viscosity mu/rho", "kinematic", "{mu}/{rho}"),
        Step(
            "th",
            "vapour pressure (IAPWS R7-97, eq. 30): temperature with its correction",
            "K",
            f"{T}-0.23855557567849/({T}-650.17534844798)",
        ),
        Step("sa", "factor A", "ratio", "{th}^2+1167.0521452767*{th}-724213.16703206"),
        Step("sb", "factor B", "ratio", "12020.82470247*{th}-17.073846940092*{th}^2-3232555.0322333"),
        Step("sc", "factor C", "ratio", "14.91510861353*{th}^2-4823.2657361591*{th}+405113.40542057"),
        Step("pv", "vapour pressure", "absolute", "1000000*(2*{sc}/(SQRT({sb}^2-4*{sa}*{sc})-{sb}))^4"),
    )


TB_WATER = Longhand(steps=water_steps("{T}"))


def fluid_steps(water: bool) -> tuple[Step, ...]:
    """Density, viscosity and vapour pressure in use in a run: rho0, mu' and pv'.

    An entry of its own goes before what the temperature of the water gives; with
    ``water`` False there is no fluid.
    """
    rho, mu, pv = ("{rho_w}", "{mu_w}", "{pv_w}") if water else ("#VALUE!", '""', "0")
    steps = (
        Step("rho0", "density of the start block", "density", f'IF({{rho}}="",{rho},{{rho}})'),
        Step(
            "mu'",
            "dynamic viscosity in use, where there is one",
            "viscosity",
            f'IF({{mu}}<>"",{{mu}},IF({{nu}}<>"",{{nu}}*IF({{crho}}="",{{rho0}},{{crho}}),{mu}))',
        ),
        Step("pv'", "vapour pressure in use", "absolute", f'IF({{pv}}="",{pv},{{pv}})'),
    )
    if not water:
        return steps
    T = Step("T'", "temperature of the water", "temperature", 'IF({fluid}="water",{T},#VALUE!)')
    return T, *(_marked(step, "_w") for step in water_steps("{T'}")), *steps


def _marked(step: Step, mark: str) -> Step:
    """A step of the water under a name that no step of a run has."""
    own = {known.symbol for known in TB_WATER.steps}
    formula = re.sub(r"\{(\w+)\}", lambda m: f"{{{m[1]}{mark}}}" if m[1] in own else m[0], step.formula)
    return Step(step.symbol + mark, step.text, step.role, formula)
