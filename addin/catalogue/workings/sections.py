"""Long-hand workings: sections and continuity."""

from __future__ import annotations

from ..types import Longhand, RowStep, Step, TableLonghand

TB_AREA = Longhand(
    steps=(
        Step("r", "radius of the section", "diameter", "{D}/2"),
        Step("A", "area of the circle, pi r²", "area", "PI()*{r}^2"),
    )
)

TB_VELOCITY = Longhand(
    steps=(
        Step("A", "area of the section, pi D²/4", "area", "PI()*{D}^2/4"),
        Step("V", "continuity: mean velocity Q/A", "velocity", "{Q}/{A}"),
    )
)

TB_FLOW = Longhand(
    steps=(
        Step("A", "area of the section, pi D²/4", "area", "PI()*{D}^2/4"),
        Step("Q", "continuity: flow V A", "flow", "{V}*{A}"),
    )
)

TB_MASSFLOW = Longhand(steps=(Step("mdot", "mass that passes in unit time", "massflow", "{rho}*{Q}"),))

TB_REYNOLDS = Longhand(
    steps=(
        Step("nu", "kinematic viscosity mu/rho", "m2/s", "{mu}/{rho}"),
        Step("Re", "Reynolds number |V| D/nu", "ratio", "ABS({V})*{D}/{nu}"),
    )
)

# The power law u/Vmax = (y/R)^(1/n) integrated over the circle: with m = k/n, the mean of u^k is
# 2 Vmax^k / ((m + 1)(m + 2)); the mean velocity has k = 1, beta k = 2, alpha k = 3.
TB_PROFILE = Longhand(
    steps=(
        Step(
            "n'",
            "exponent in use: as given, or 1/sqrt(f)",
            "ratio",
            'IF({regime}="laminar",IF(AND({n}="",{f}=""),0,#NUM!),'
            'IF({n}="",1/SQRT({f}),IF({f}="",{n},#NUM!)))',
        ),
        Step(
            "c1",
            "V/Vmax: mean of u/Vmax over the section",
            "ratio",
            "IF({n'}=0,1/2,2/((1/{n'}+1)*(1/{n'}+2)))",
        ),
        Step("c2", "mean of (u/Vmax)²", "ratio", "IF({n'}=0,1/3,2/((2/{n'}+1)*(2/{n'}+2)))"),
        Step("c3", "mean of (u/Vmax)³", "ratio", "IF({n'}=0,1/4,2/((3/{n'}+1)*(3/{n'}+2)))"),
        Step("beta", "momentum flux over that of the mean velocity", "ratio", "{c2}/{c1}^2"),
        Step("alpha", "kinetic energy flux over that of the mean velocity", "ratio", "{c3}/{c1}^3"),
    ),
    results={"ratio": "c1", "n": "n'"},
)

TB_BRANCHFLOW = TableLonghand(
    rows=(),
    single=(Step("Q'", "what must flow in to make the sum zero", "flow", "0-SUM({Q.column})"),),
    results={"Q": "Q'"},
)


def junctions(width: int) -> TableLonghand:
    """The working of several junctions, a row each, of up to so many flows."""
    flows = ",".join(f"{{Q_{n}}}" for n in range(1, width + 1))
    step = RowStep("Q'", "what must flow in to make the sum zero", "flow", f"0-SUM({flows})")
    return TableLonghand(rows=(step,), results={"Q": "Q'"})
