"""Long-hand workings: the momentum balance of the single fittings.

Each is the balance of the fluid between the sections: what flows in brings its
momentum, pressure pushes on the cut faces, and the fitting feels the rest.
"""

from __future__ import annotations

from ..types import Longhand, Step

_G = Step("g", "standard acceleration of free fall", "m/s2", "9.80665")


def _area(i: str, d: str, text: str) -> Step:
    return Step(f"A{i}", f"area {text}", "area", f"PI()*{{{d}}}^2/4")


def _velocity(i: str, q: str, text: str) -> Step:
    return Step(f"V{i}", f"continuity: velocity {text}", "velocity", f"{{{q}}}/{{A{i}}}")


def _dynamic(i: str) -> Step:
    return Step(
        f"q{i}",
        f"dynamic pressure at section {i}, alpha rho V²/2",
        "loss",
        f"{{alpha{i}}}*{{rho}}*{{V{i}}}^2/2",
    )


def _push(i: str, p: str, q: str) -> Step:
    return Step(
        f"M{i}",
        f"push at section {i}: pressure on the face, and momentum flux beta rho Q V",
        "force",
        f"{{{p}}}*{{A{i}}}+{{beta{i}}}*{{rho}}*{{{q}}}*{{V{i}}}",
    )


_PRESSURE_2 = Step(
    "p2'",
    "pressure at section 2: as given, or by Bernoulli's equation",
    "pressure",
    'IF({p2}="",{p1}+{q1}-{q2}-{dpK}-{rho}*{g}*{dz},{p2})',
)
_MAGNITUDE = Step("F", "magnitude of the thrust", "force", "SQRT({Fx}^2+{Fy}^2)")
_DIRECTION = Step(
    "dir",
    "direction of the thrust, from x towards y",
    "angle",
    "IF({F}=0,0,ATAN2({Fx},{Fy}))",
)
_REACTIONS = (
    Step("Rx", "reaction: the opposite", "force", "0-{Fx}"),
    Step("Ry", "reaction: the opposite", "force", "0-{Fy}"),
    Step("R", "magnitude of the reaction", "force", "{F}"),
)
_ALONG = (
    Step("F", "magnitude of the thrust", "force", "ABS({Fx})"),
    Step("Rx", "reaction: the opposite", "force", "0-{Fx}"),
    Step("R", "magnitude of the reaction", "force", "{F}"),
)

TB_BEND = Longhand(
    steps=(
        _G,
        Step("D2'", "diameter at section 2: as given, or as at 1", "diameter", 'IF({D2}="",{D1},{D2})'),
        _area("1", "D1", "at section 1"),
        _area("2", "D2'", "at section 2"),
        _velocity("1", "Q", "at section 1"),
        _velocity("2", "Q", "at section 2"),
        _dynamic("1"),
        _dynamic("2"),
        Step("dpK", "loss K rho V1²/2, along the flow", "loss", "{K}*{rho}*{V1}^2/2*SIGN({Q})"),
        _PRESSURE_2,
        _push("1", "p1", "Q"),
        _push("2", "p2'", "Q"),
        Step("Fx", "thrust along x: push at 1 less that at 2", "force", "{M1}-{M2}*COS({theta})"),
        Step("Fy", "thrust along y", "force", "0-{M2}*SIN({theta})"),
        _MAGNITUDE,
        _DIRECTION,
        *_REACTIONS,
    ),
    results={"p2": "p2'"},
)

TB_REDUCER = Longhand(
    steps=(
        _G,
        _area("1", "D1", "at section 1"),
        _area("2", "D2", "at section 2"),
        _velocity("1", "Q", "at section 1"),
        _velocity("2", "Q", "at section 2"),
        _dynamic("1"),
        _dynamic("2"),
        Step(
            "dpK",
            "loss K rho V²/2 on the larger velocity, along the flow",
            "loss",
            "{K}*{rho}*MAX({V1}^2,{V2}^2)/2*SIGN({Q})",
        ),
        _PRESSURE_2,
        _push("1", "p1", "Q"),
        _push("2", "p2'", "Q"),
        Step("Fx", "thrust along x: push at 1 less that at 2", "force", "{M1}-{M2}"),
        *_ALONG,
    ),
    results={"p2": "p2'"},
)


def _tee_pressure(i: str) -> Step:
    return Step(
        f"p{i}'",
        f"pressure at section {i}: as given, or by Bernoulli's equation",
        "pressure",
        f'IF({{p{i}}}="",{{p1}}+{{q1}}-{{q{i}}}-{{rho}}*{{g}}*{{dz{i}}}'
        f"-IF({{K1{i}}}=0,0,{{K1{i}}}*{{dpV}}),{{p{i}}})",
    )


TB_TEE = Longhand(
    steps=(
        _G,
        Step("D2'", "diameter at section 2: as given, or as at 1", "diameter", 'IF({D2}="",{D1},{D2})'),
        _area("1", "D1", "at section 1"),
        _area("2", "D2'", "at section 2"),
        _area("3", "D3", "of the branch"),
        Step("Q2", "continuity: flow on along the run", "flow", "{Q1}-{Q3}"),
        _velocity("1", "Q1", "at section 1"),
        _velocity("2", "Q2", "at section 2"),
        _velocity("3", "Q3", "in the branch"),
        _dynamic("1"),
        _dynamic("2"),
        _dynamic("3"),
        Step(
            "dpV",
            "rho V1²/2 along the flow, for the losses; only where section 1 carries the whole flow",
            "loss",
            "IF({Q2}*{Q3}<-1E-12*{Q1}^2,#NUM!,{rho}*{V1}^2/2*SIGN({Q1}))",
        ),
        _tee_pressure("2"),
        _tee_pressure("3"),
        _push("1", "p1", "Q1"),
        _push("2", "p2'", "Q2"),
        _push("3", "p3'", "Q3"),
        Step("Fx", "thrust along x", "force", "{M1}-{M2}-{M3}*COS({theta})"),
        Step("Fy", "thrust along y: against the branch", "force", "0-{M3}*SIN({theta})"),
        _MAGNITUDE,
        _DIRECTION,
        *_REACTIONS,
    ),
    results={"p2": "p2'", "p3": "p3'"},
)

TB_NOZZLE = Longhand(
    steps=(
        _G,
        _area("1", "D1", "of the pipe"),
        _area("2", "D2", "of the jet"),
        Step(
            "K'",
            "loss coefficient on the jet: as given, or 1/Cv² - 1",
            "ratio",
            'IF({Cv}="",{K},IF({K}>0,#NUM!,1/{Cv}^2-1))',
        ),
        Step(
            "C",
            "pressure difference over rho V2²/2, with V1 = V2 A2/A1",
            "ratio",
            "{alpha2}+{K'}-{alpha1}*({A2}/{A1})^2",
        ),
        Step("ph", "pressure that the rise takes", "loss", "{rho}*{g}*{dz}"),
        Step(
            "V2",
            "velocity of the jet: from the pressure by Bernoulli, or from the flow given",
            "velocity",
            'IF(AND({p1}<>"",{Q}<>""),#NUM!,IF({Q}<>"",{Q}/{A2},'
            'IF({p1}="",#NUM!,IF({C}>0,SQRT(2*({p1}-{p2}-{ph})/({rho}*{C})),#NUM!))))',
        ),
        Step("Q'", "continuity: flow", "flow", "{V2}*{A2}"),
        Step("V1", "continuity: velocity in the pipe", "velocity", "{Q'}/{A1}"),
        Step(
            "p1'",
            "pressure in the pipe: as given, or by Bernoulli's equation",
            "pressure",
            'IF({p1}="",{p2}+{ph}+{C}*{rho}*{V2}^2/2,{p1})',
        ),
        Step("M2", "momentum flux of the jet", "force", "{beta2}*{rho}*{V2}^2*{A2}"),
        Step("M1", "momentum flux in the pipe", "force", "{beta1}*{rho}*{V1}^2*{A1}"),
        Step("Fx", "thrust along x: pressures and momentum", "force", "{p1'}*{A1}-{p2}*{A2}+{M1}-{M2}"),
        *_ALONG,
    ),
    results={"Q": "Q'", "p1": "p1'"},
)

TB_CLOSED = Longhand(
    steps=(
        Step("A", "area on which the pressure acts", "area", "PI()*{D}^2/4"),
        Step("Fx", "thrust along x", "force", "{p}*{A}"),
        *_ALONG,
    )
)

TB_INLINE = Longhand(
    steps=(
        Step("A", "area of the pipe", "area", "PI()*{D}^2/4"),
        Step("V", "continuity: velocity", "velocity", "{Q}/{A}"),
        Step(
            "dp'",
            "lasting pressure loss: given, or from p2, or K rho V|V|/2",
            "loss",
            'IF(({K}<>"")+({dp}<>"")+({p2}<>"")<>1,#NUM!,'
            'IF({dp}<>"",{dp},IF({p2}<>"",{p1}-{p2},{K}*{rho}*{V}*ABS({V})/2)))',
        ),
        Step("p2'", "pressure downstream", "pressure", "{p1}-{dp'}"),
        Step(
            "Mn",
            "momentum flux in less momentum flux out",
            "force",
            "({beta1}-{beta2})*{rho}*{V}^2*{A}",
        ),
        Step("Fx", "thrust along x", "force", "{dp'}*{A}+{Mn}"),
        *_ALONG,
    ),
    results={"p2": "p2'", "dp": "dp'"},
)

TB_STRAIGHT = Longhand(
    steps=(
        _G,
        Step("A", "area of the pipe", "area", "PI()*{D}^2/4"),
        Step("V", "continuity: velocity", "velocity", "{Q}/{A}"),
        Step(
            "tau",
            "wall shear stress: f rho V|V|/8, or from the loss given, dp D/(4 L)",
            "loss",
            'IF(({f}<>"")+({dp}<>"")<>1,#NUM!,IF({f}<>"",{f}*{rho}*{V}*ABS({V})/8,{dp}*{D}/(4*{L})))',
        ),
        Step("Fx", "wall drag: shear stress on the wetted surface", "force", "{tau}*PI()*{D}*{L}"),
        Step("dp'", "pressure loss that balances the drag", "loss", "{Fx}/{A}"),
        *_ALONG,
        Step("W", "weight of the fluid", "force", "{rho}*{g}*{A}*{L}"),
    ),
    results={"dp": "dp'"},
)

TB_ACCEL = Longhand(
    steps=(
        Step("A", "area of the pipe", "area", "PI()*{D}^2/4"),
        Step("m", "mass of the column", "kg", "{rho}*{A}*{L}"),
        Step("a", "its acceleration, dV/dt", "m/s2", "{dQdt}/{A}"),
        Step("dp", "pressure difference that accelerates it", "loss", "{m}*{a}/{A}"),
        Step("Fx", "thrust: against the acceleration", "force", "0-{m}*{a}"),
        *_ALONG,
    )
)
