"""Long-hand working of a pipe run: continuity, Bernoulli's equation and the momentum balance, node by node.

The working is that of one load case; the run by itself is the case "operating". Entries
of the case begin with c.
"""

from __future__ import annotations

from thrustbook.engine.properties import LIQUID
from thrustbook.engine.runcases import CASE_BOUNDS
from thrustbook.engine.runflow import START_BOUNDS
from thrustbook.engine.runshape import COLUMN_BOUNDS

from ..types import RowStep, Step, TableLonghand
from .friction import friction_steps
from .properties import fluid_steps
from .runforces import CLOSURE, FORCE, PRESSURE, RESULTS, fitting, remarks
from .runjet import TRIALS, trial, trial_flow, trial_rest

_SINGLE = (
    Step("g", "standard acceleration of free fall", "m/s2", "9.80665"),
    Step("still", "1 where nothing flows", "ratio", 'IF(OR({kind}="shut",{kind}="test",{kind}="empty"),1,0)'),
    Step("rho'", "density in use", "density", 'IF({kind}="empty",0,IF({crho}="",{rho0},{crho}))'),
    Step(
        "end'",
        "last node in use: a jet is shut where nothing flows",
        "text",
        'IF(AND({still}=1,{end}="jet"),"closed",{end})',
    ),
    Step("head'", "1 where the case gives p or H", "ratio", 'IF(AND({cp}="",{cH}=""),0,1)'),
    Step("flow'", "1 where the case gives Q", "ratio", 'IF({cQ}="",0,1)'),
    Step("at'", "end where p or H holds", "text", 'IF(AND({head\'}=1,{cat}<>""),{cat},{at})'),
    Step(
        "fat",
        "end where Q holds",
        "text",
        'IF(AND({flow\'}=1,{cat}<>""),{cat},IF({flow_at}="",{at},{flow_at}))',
    ),
    Step(
        "Q'",
        "flow in use; none where a jet's flow follows from the head",
        "flow",
        'IF({still}=1,0,IF({flow\'}=1,{cQ},IF(AND({end}="jet",{head\'}=1),"",{Q})))',
    ),
    Step(
        "p'",
        "pressure in use",
        "pressure",
        'IF({kind}="test","",IF({head\'}=1,{cp},IF(AND({end\'}="jet",{flow\'}=1),"",{p})))',
    ),
    Step(
        "H'",
        "total head in use; in a test, gauge level and test pressure",
        "head",
        'IF({kind}="test",IF({czp}="",MIN({z.column}),{czp})+{cp}/({rho\'}*{g}),'
        'IF({head\'}=1,{cH},IF(AND({end\'}="jet",{flow\'}=1),"",{H})))',
    ),
    Step("kp", "factor on pump heads", "ratio", 'IF({kind}="test",0,IF({cpump}="",1,{cpump}))'),
    Step("ko", "factor on offtakes", "ratio", 'IF({still}=1,0,IF({cofftakes}="",1,{cofftakes}))'),
    Step(
        "v", "node whose valve is shut, 0: none", "ratio", 'IF({cvalve}="",0,MATCH({cvalve},{name.column},0))'
    ),
    Step("QT", "all offtakes together", "flow", "SUM({Qo'.column})"),
    Step("QA", "their sizes together", "flow", "SUM({Qoa.column})"),
    Step(
        "k1",
        "flow out of the last node by Q",
        "flow",
        'IF({Q\'}="","",IF({fat}="end",{Q\'},{Q\'}-{QT}))',
    ),
    Step("k2", "the same by a closed start", "flow", 'IF({start}="closed",0-{QT},"")'),
    Step("k3", "the same by a closed end", "flow", 'IF({end\'}="closed",0,"")'),
    Step(
        "miss",
        "flow by which these disagree",
        "flow",
        "IF(COUNT({k1},{k2},{k3})=0,0,MAX({k1},{k2},{k3})-MIN({k1},{k2},{k3}))",
    ),
    Step(
        "Qe",
        "continuity: flow out of the last node",
        "flow",
        "IF({miss}>0.000000001*({QA}+ABS(N({Q'}))),#NUM!,"
        'IF({k3}<>"",{k3},IF({k2}<>"",{k2},IF({k1}<>"",{k1},{Qj}))))',
    ),
    Step(
        "Ek",
        "total head where it is known",
        "head",
        'IF({end\'}="jet",{z.last}+{alpha.last}*{V2.last}^2/(2*{g}),IF({H\'}<>"",{H\'},'
        "IF({p'}=\"\",#NUM!,IF({at'}=\"end\",{z.last}+{p'}/({rho'}*{g})+{alpha.last}*{V2.last}^2/(2*{g}),"
        "{z.first}+{p'}/({rho'}*{g})+{a1.first}*{V1.first}^2/(2*{g})))))",
    ),
    Step(
        "E0",
        "total head before the first node",
        "head",
        'IF(OR({end\'}="jet",{at\'}="end"),{Ek}-{e2.last},{Ek})',
    ),
)

_GEOMETRY = (
    RowStep("i", "number of the node", "ratio", "{i.prev}+1", first="1"),
    RowStep(
        "L",
        "length of the leg that leaves",
        "length",
        "SQRT(({x.next}-{x})^2+({y.next}-{y})^2+({z.next}-{z})^2)",
        last='""',
    ),
    RowStep("s", "chainage", "length", "{s.prev}+{L.prev}", first="0"),
    *(
        RowStep(
            f"u{a}",
            f"direction of the leg that leaves, {a}; beyond the last node straight on",
            "ratio",
            f"({{{a}.next}}-{{{a}}})/{{L}}",
            last=f"{{u{a}.prev}}",
        )
        for a in "xyz"
    ),
    *(
        RowStep(
            f"w{a}",
            f"direction of the leg that arrives, {a}",
            "ratio",
            f"{{u{a}.prev}}",
            first=f"{{u{a}}}",
        )
        for a in "xyz"
    ),
    RowStep(
        "theta",
        "deflection: twice the angle whose tangent is |u - w|/|u + w|",
        "angle",
        "2*ATAN2(SQRT(({ux}+{wx})^2+({uy}+{wy})^2+({uz}+{wz})^2),"
        "SQRT(({ux}-{wx})^2+({uy}-{wy})^2+({uz}-{wz})^2))",
    ),
    RowStep(
        "D2",
        "diameter behind the node",
        "diameter",
        "{D}",
        last='IF(OR({D}="",{end}="closed"),{D2.prev},{D})',
    ),
    RowStep("D1", "diameter before the node", "diameter", "{D2.prev}", first="{D2}"),
    RowStep(
        "A1", "area before the node", "area", "PI()*{D1}^2/4", first='IF({start}="closed",0,PI()*{D1}^2/4)'
    ),
    RowStep(
        "A2", "area behind the node", "area", "PI()*{D2}^2/4", last='IF({end\'}="closed",0,PI()*{D2}^2/4)'
    ),
    RowStep(
        "Dj'",
        "diameter of the joint behind",
        "diameter",
        'IF({Dj}="",{D2},IF({Dj}<{D2},#VALUE!,{Dj}))',
        last='IF({end}<>"continues",{D2},IF({Dj}="",IF({D2}={D2.prev},{Dj\'.prev},{D2}),'
        "IF({Dj}<{D2},#VALUE!,{Dj})))",
    ),
    RowStep("B2", "area of the joint behind", "area", "PI()*{Dj'}^2/4", last="IF({A2}=0,0,PI()*{Dj'}^2/4)"),
    RowStep("B1", "area of the joint before", "area", "{B2.prev}", first="IF({A1}=0,0,{B2})"),
    RowStep("a1", "alpha before the node", "ratio", "{alpha.prev}", first="{alpha}"),
    RowStep("b1", "beta before the node", "ratio", "{beta.prev}", first="{beta}"),
)

_FLOW = (
    RowStep("Qo'", "offtake in use", "flow", "{Qo}*{ko}"),
    RowStep("Qoa", "its size", "flow", "ABS({Qo'})"),
    RowStep("SQ", "offtakes up to here", "flow", "{SQ.prev}+{Qo'}", first="{Qo'}"),
    RowStep(
        "Q2",
        "continuity: flow behind the node (rounding set to 0)",
        "flow",
        "IF(ABS({Qe}+({QT}-{SQ}))<=0.0000000000001*(ABS({Qe}+{QT})+{QA}),0,{Qe}+({QT}-{SQ}))",
    ),
    RowStep("Q1", "flow before the node", "flow", "{Q2.prev}", first='IF({start}="closed",0,{Qe}+{QT})'),
    RowStep("V1", "velocity before", "velocity", "IF({A1}=0,0,{Q1}/{A1})"),
    RowStep("V2", "velocity behind", "velocity", "IF({A2}=0,0,{Q2}/{A2})"),
    RowStep(
        "Re", "Reynolds number of the leg", "ratio", "IF({mu'}=\"\",0,{rho'}*ABS({V2})*{D2}/{mu'})", last='""'
    ),
    RowStep("eD", "relative roughness", "ratio", 'IF({e}="",0,IF({e}/{D2}>0.1,#NUM!,{e}/{D2}))', last='""'),
    *(
        RowStep(s.symbol, s.text, s.role, s.formula, last='""')
        for s in friction_steps("{Re}", "{eD}", "{method}", "fc")
    ),
    RowStep("fD", "friction factor in use", "ratio", 'IF({f}="",{fc},{f})', last='""'),
    RowStep(
        "hf",
        "friction loss of the leg (Darcy-Weisbach)",
        "head",
        "{fD}*{L}/{D2}*{V2}*ABS({V2})/(2*{g})",
        last='""',
    ),
    RowStep("hK", "local loss of the node", "head", "{K}*{V2}*ABS({V2})/(2*{g})"),
    RowStep(
        "e1",
        "total head before the node, counted from the first",
        "head",
        "{e2.prev}-{hf.prev}",
        first="0",
    ),
    RowStep("e2", "the same behind the node", "head", "{e1}-{hK}+{Hp}*{kp}"),
)

_DEFAULTS = {
    "K": "0",
    "Hp": "0",
    "Qo": "0",
    "ox": "0",
    "oy": "0",
    "oz": "0",
    "Ko": "0",
    "alpha": "1",
    "beta": "1",
    "at": '"start"',
    "start": '"continues"',
    "end": '"continues"',
    "pamb": "101325",
    "Vmax": "3",
    "method": '"colebrook"',
    "kind": '"operating"',
}


def run_working(solve: bool, fluid: bool = False) -> TableLonghand:
    """The working of a run.

    With ``solve`` the flow of a jet is found from the head at the start; with ``fluid`` the
    properties of water follow from its temperature.
    """
    trials = range(TRIALS if solve else 0)
    trial_rows = tuple(step for k in trials for step in trial(k))
    trial_single = tuple(step for k in trials for step in (trial_flow(k), trial_rest(k)))
    found = Step(
        "Qj",
        "flow of the jet by the last trial" if solve else "flow of a jet: not sought, as the flow was known",
        "flow",
        f"{{Qt{TRIALS - 1}}}" if solve else "NA()",
    )
    split = next(i for i, step in enumerate(_SINGLE) if step.symbol == "Qe")
    return TableLonghand(
        rows=(
            *_GEOMETRY,
            *_FLOW[:3],
            *((*_roughness(), *trial_rows) if solve else ()),
            *(s for s in _FLOW[3:] if not (solve and s.symbol in ("eD", "a"))),
            *PRESSURE,
            *FORCE,
            *RESULTS,
            fitting(),
            *remarks(),
        ),
        single=(*fluid_steps(fluid), *_SINGLE[:split], *trial_single, found, *_SINGLE[split:], *CLOSURE),
        results={"po": "po'", "Vo": "Vo'", "Fv": "Fz"},
        defaults=_DEFAULTS,
        bounds={**COLUMN_BOUNDS, **START_BOUNDS, "T": LIQUID, **{f"c{n}": b for n, b in CASE_BOUNDS.items()}},
        method="unrolled",
    )


def _roughness() -> tuple[RowStep, ...]:
    """The steps of the friction factor that do not depend on the flow."""
    return tuple(step for step in _FLOW if step.symbol in ("eD", "a"))


TB_RUN = run_working(solve=True, fluid=True)

# The envelope of the cases: each case has a working of its own, as a run.
ENVELOPE = ("F", "Fh", "Fx", "Fy", "Fz", "p")
"""Quantities of which the governing case is sought; p is the higher of the pressures at a node."""
