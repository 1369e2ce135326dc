"""Long-hand working of the general momentum balance: one row a port."""

from __future__ import annotations

from thrustbook.engine.balance import PORT_BOUNDS, VOLUME_BOUNDS
from thrustbook.engine.guard import POSITIVE

from ..types import RowStep, Step, TableLonghand

_AXES = (("x", ""), ("y", ""), ("z", " and the weight"))

TB_BALANCE = TableLonghand(
    rows=(
        RowStep("ln", "length of the normal as given", "ratio", "SQRT({nx}^2+{ny}^2+{nz}^2)"),
        RowStep(
            "A'",
            "area: given, or pi D²/4",
            "area",
            'IF(({A}<>"")+({D}<>"")<>1,#VALUE!,IF({A}<>"",{A},PI()*{D}^2/4))',
        ),
        RowStep("V", "continuity: velocity through the port", "velocity", "{Q}/{A'}"),
        RowStep(
            "M",
            "push on the fluid at the port: (p + beta rho V²) A, along the normal inwards",
            "force",
            "({p}+{beta}*{rho}*{V}^2)*{A'}",
        ),
        *(
            RowStep(f"M{a}", f"its part along {a}, for the thrust", "force", f"0-{{M}}*{{n{a}}}/{{ln}}")
            for a in "xyz"
        ),
        RowStep("Qa", "size of the flow", "flow", "ABS({Q})"),
    ),
    single=(
        Step("residual", "sum of the flows out", "flow", "SUM({Q.column})"),
        Step(
            "ok",
            "1 where they close within the tolerance, else an error",
            "ratio",
            "IF(ABS({residual})>{tol}*MAX({Qa.column}),#NUM!,1)",
        ),
        *(
            Step(
                f"F{a}",
                f"thrust along {a}: sum over the ports, less the rate of momentum{more}",
                "force",
                f"(SUM({{M{a}.column}})-{{dM{a}}}{'-{W}' if a == 'z' else ''})*{{ok}}",
            )
            for a, more in _AXES
        ),
        Step("F", "thrust, magnitude", "force", "SQRT({Fx}^2+{Fy}^2+{Fz}^2)"),
        *(Step(f"R{a}", f"reaction along {a}: the opposite", "force", f"0-{{F{a}}}") for a in "xyz"),
        Step("R", "reaction, magnitude", "force", "{F}"),
    ),
    defaults={"beta": "1", "W": "0", "dMx": "0", "dMy": "0", "dMz": "0", "tol": "0.000001"},
    bounds={**PORT_BOUNDS, **VOLUME_BOUNDS, "D": POSITIVE},
)
