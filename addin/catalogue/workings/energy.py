"""Long-hand workings: friction, losses and Bernoulli's equation."""

from __future__ import annotations

from ..types import Longhand, Step
from .friction import friction_steps

_G = Step("g", "standard acceleration of free fall", "m/s2", "9.80665")
_WEIGHT = Step("gam", "weight of unit volume, rho g", "N/m3", "{rho}*{g}")
_A1 = Step("A1", "area at section 1", "area", "PI()*{D1}^2/4")
_A2 = Step("A2", "area at section 2", "area", "PI()*{D2}^2/4")
_V1 = Step("V1", "continuity: velocity at section 1", "velocity", "{Q}/{A1}")
_V2 = Step("V2", "continuity: velocity at section 2", "velocity", "{Q}/{A2}")

TB_FRICTION = Longhand(
    steps=(
        Step(
            "eD'",
            "relative roughness in use: as given, or e/D",
            "ratio",
            'IF({eD}="",IF({e}/{D}>0.1,#NUM!,{e}/{D}),IF(AND({e}="",{D}=""),{eD},#NUM!))',
        ),
        *friction_steps("{Re}", "{eD'}", "{method}"),
        Step(
            "regime",
            "1 laminar, 2 between, 3 turbulent",
            "ratio",
            "IF({Re}<=2300,1,IF({Re}<4000,2,3))",
        ),
    ),
    method="unrolled",
)

TB_PIPELOSS = Longhand(
    steps=(
        _G,
        Step("A", "area of the section", "area", "PI()*{D}^2/4"),
        Step("V", "continuity: mean velocity", "velocity", "{Q}/{A}"),
        Step("Re", "Reynolds number", "ratio", "ABS({V})*{D}*{rho}/{mu}"),
        Step("eD", "relative roughness", "ratio", "IF({e}/{D}>0.1,#NUM!,{e}/{D})"),
        *friction_steps("{Re}", "{eD}", "{method}"),
        Step("tau", "wall shear stress f rho V|V|/8", "loss", "{f}*{rho}*{V}*ABS({V})/8"),
        Step("F", "drag on the wall: shear times wetted surface", "force", "{tau}*PI()*{D}*{L}"),
        Step("dp", "pressure that balances the drag", "loss", "{F}/{A}"),
        Step("hL", "head lost, dp/(rho g)", "head", "{dp}/({rho}*{g})"),
    ),
    method="unrolled",
)

TB_FITTINGLOSS = Longhand(
    steps=(
        _G,
        Step("A", "area of the section", "area", "PI()*{D}^2/4"),
        Step("V", "continuity: mean velocity", "velocity", "{Q}/{A}"),
        Step("hV", "velocity head", "head", "{V}^2/(2*{g})"),
        Step("hL", "head lost, along the flow", "head", "{K}*{hV}*SIGN({V})"),
        Step("dp", "pressure lost", "loss", "{rho}*{g}*{hL}"),
    )
)

TB_EXPANSION = Longhand(
    steps=(
        _G,
        Step("A1", "area of the small pipe", "area", "PI()*{D1}^2/4"),
        Step("A2", "area of the large pipe", "area", "IF({D2}<{D1},#NUM!,PI()*{D2}^2/4)"),
        Step("K1", "coefficient on the small pipe, (1 - A1/A2)²", "ratio", "(1-{A1}/{A2})^2"),
        Step("K2", "coefficient on the large pipe, (A2/A1 - 1)²", "ratio", "({A2}/{A1}-1)^2"),
        Step("V1", "velocity in the small pipe", "velocity", 'IF({Q}="",NA(),{Q}/{A1})'),
        Step("V2", "velocity in the large pipe", "velocity", 'IF({Q}="",NA(),{Q}/{A2})'),
        Step("hL", "Borda and Carnot: (V1 - V2)²/(2 g)", "head", "({V1}-{V2})^2/(2*{g})"),
        Step("dp", "loss of total pressure", "loss", 'IF({rho}="",NA(),{rho}*{g}*{hL})'),
    )
)

TB_CONTRACTION = Longhand(
    steps=(
        _G,
        Step("A1", "area of the large pipe", "area", "PI()*{D1}^2/4"),
        Step("A2", "area of the small pipe", "area", "IF({D2}>{D1},#NUM!,PI()*{D2}^2/4)"),
        Step("K2", "coefficient on the small pipe, (1 - A2/A1)/2", "ratio", "(1-{A2}/{A1})/2"),
        Step("K1", "the same loss on the large pipe's velocity head", "ratio", "{K2}*({A1}/{A2})^2"),
        Step("V2", "velocity in the small pipe", "velocity", 'IF({Q}="",NA(),{Q}/{A2})'),
        Step("hL", "head lost", "head", "{K2}*{V2}^2/(2*{g})"),
        Step("dp", "loss of total pressure", "loss", 'IF({rho}="",NA(),{rho}*{g}*{hL})'),
    )
)

_LOSS = Step(
    "hL'",
    "head lost: K on the larger velocity, and the loss given, along the flow",
    "head",
    "({K}*MAX({V1}^2,{V2}^2)/(2*{g})+{hL})*SIGN({Q})",
)
_E1 = Step(
    "E1",
    "energy head at section 1, from its own level",
    "head",
    "{p1}/{gam}+{alpha1}*{V1}^2/(2*{g})",
)

TB_PRESSURE = Longhand(
    steps=(
        _G,
        _WEIGHT,
        _A1,
        _A2,
        _V1,
        _V2,
        _LOSS,
        _E1,
        Step("E2", "energy head left at section 2, above its level", "head", "{E1}+{Hp}-{hL'}-{dz}"),
        Step(
            "p2", "pressure: what the velocity head leaves", "pressure", "{gam}*{E2}-{alpha2}*{rho}*{V2}^2/2"
        ),
        Step("dp", "fall of pressure from 1 to 2", "loss", "{p1}-{p2}"),
    ),
    results={"hL": "hL'"},
)

TB_DISCHARGE = Longhand(
    steps=(
        _G,
        _A1,
        _A2,
        Step("m", "velocity at 1 for unit velocity at 2, A2/A1", "ratio", "{A2}/{A1}"),
        Step(
            "C",
            "pressure difference over rho V2²/2: rise of velocity head and loss, over Cd²",
            "ratio",
            "IF({alpha2}-{alpha1}*{m}^2+{K}*MAX(1,{m})^2>0,"
            "({alpha2}-{alpha1}*{m}^2+{K}*MAX(1,{m})^2)/{Cd}^2,#NUM!)",
        ),
        Step(
            "V2",
            "velocity at section 2: from the pressure difference, or from the flow given",
            "velocity",
            'IF(AND({p1}<>"",{Q}<>""),#NUM!,IF({Q}="",'
            'IF({p1}="",#NUM!,SQRT(2*({p1}-{p2}-{rho}*{g}*{dz})/({rho}*{C}))),{Q}/{A2}))',
        ),
        Step("Q'", "continuity: flow", "flow", "{V2}*{A2}"),
        Step("V1", "continuity: velocity at section 1", "velocity", "{Q'}/{A1}"),
        Step(
            "p1'",
            "Bernoulli: pressure at section 1",
            "pressure",
            "{p2}+{rho}*{g}*{dz}+{C}*{rho}*{V2}^2/2",
        ),
        Step(
            "hL",
            "head lost: the pressure difference less the rise of velocity head and lift",
            "head",
            "({C}*{V2}^2-{alpha2}*{V2}^2+{alpha1}*{V1}^2)/(2*{g})",
        ),
    ),
    results={"Q": "Q'", "p1": "p1'"},
)

TB_HEAD = Longhand(
    steps=(
        _G,
        Step("hp", "pressure head", "head", "{p}/({rho}*{g})"),
        Step("hV", "velocity head", "head", "{alpha}*{V}^2/(2*{g})"),
        Step("HGL", "hydraulic grade: level and pressure head", "head", "{z}+{hp}"),
        Step("H", "total head: hydraulic grade and velocity head", "head", "{HGL}+{hV}"),
    )
)

TB_PUMPHEAD = Longhand(
    steps=(
        _G,
        _WEIGHT,
        _A1,
        _A2,
        _V1,
        _V2,
        _LOSS,
        Step(
            "E1", "energy head at section 1, from its own level", "head", "{p1}/{gam}+{alpha1}*{V1}^2/(2*{g})"
        ),
        Step(
            "E2",
            "energy head at section 2, from the level of section 1",
            "head",
            "{p2}/{gam}+{alpha2}*{V2}^2/(2*{g})+{dz}",
        ),
        Step("Hp", "head that the pump adds: the rise and the loss", "head", "{E2}-{E1}+{hL'}"),
        Step("dp", "rise of total pressure in the pump", "loss", "{gam}*{Hp}"),
    ),
    results={"hL": "hL'"},
)

TB_POWER = Longhand(
    steps=(
        _G,
        Step("G", "weight of fluid that passes in unit time", "N/s", "{rho}*{g}*{Q}"),
        Step("P", "its gain of energy: hydraulic power", "power", "{G}*{H}"),
        Step(
            "Pshaft",
            "shaft: a pump takes more, a turbine gives less",
            "power",
            "IF({H}<0,{P}*{eta},{P}/{eta})",
        ),
    )
)

TB_CAVITATION = Longhand(
    steps=(
        _G,
        Step("pabs", "absolute pressure", "absolute", "{pamb}+{p}"),
        Step("margin", "margin to the vapour pressure", "loss", "{pabs}-{pv}"),
        Step(
            "q",
            "dynamic pressure rho V²/2",
            "loss",
            'IF(OR({rho}="",{V}=""),NA(),{rho}*{V}^2/2)',
        ),
        Step("sigma", "cavitation number", "ratio", "{margin}/{q}"),
        Step(
            "NPSH",
            "net positive suction head: margin and dynamic pressure as a head",
            "head",
            "({margin}+{q})/({rho}*{g})",
        ),
    )
)
