"""Long-hand working of a pipe run: continuity, Bernoulli's equation and the momentum balance, node by node.

The working is that of one load case; the run by itself is the case "operating". Entries
of the case begin with c.
"""

from __future__ import annotations

from collections.abc import Iterator

from thrustbook.engine.properties import LIQUID
from thrustbook.engine.runcases import CASE_BOUNDS
from thrustbook.engine.runflow import START_BOUNDS
from thrustbook.engine.runshape import COLUMN_BOUNDS

from ..types import RowStep, Step, TableLonghand
from .friction import friction_steps
from .properties import fluid_steps

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

_PRESSURE = (
    RowStep(
        "far1",
        "1 where section 1 lies beyond a shut valve",
        "ratio",
        'IF({v}=0,0,IF({at\'}="start",IF({i}>{v},1,0),IF({i}<={v},1,0)))',
    ),
    RowStep(
        "far2",
        "1 where section 2 lies beyond it",
        "ratio",
        'IF({v}=0,0,IF({at\'}="start",IF({i}>={v},1,0),IF({i}<{v},1,0)))',
    ),
    RowStep("zf", "head beyond it: as given, or drained", "head", 'IF({cH2}="",{z},{cH2})'),
    RowStep(
        "dp",
        "surge pressure here",
        "loss",
        'IF({kind}="surge",{cdp}+(IF({cdp2}="",{cdp},{cdp2})-{cdp})*{s}/{s.last},0)',
    ),
    RowStep("dh", "the same as a head", "head", "IF({dp}=0,0,{dp}/({rho'}*{g}))"),
    *(
        RowStep(
            f"H{i}",
            f"total head at section {i}, before surge",
            "head",
            f'IF({{kind}}="empty",{{z}},IF({{far{i}}}=1,{{zf}},{{E0}}+{{e{i}}}))',
        )
        for i in "12"
    ),
    RowStep("EGL1", "energy grade line before", "head", "{H1}+{dh}"),
    RowStep("EGL2", "energy grade line behind", "head", "{H2}+{dh}"),
    RowStep("HGL1", "hydraulic grade line before", "head", "{EGL1}-{a1}*{V1}^2/(2*{g})"),
    RowStep("HGL2", "hydraulic grade line behind", "head", "{EGL2}-{alpha}*{V2}^2/(2*{g})"),
    RowStep("p1", "pressure before: rho g (HGL - z)", "pressure", "{rho'}*{g}*({HGL1}-{z})"),
    RowStep(
        "p2",
        "pressure behind; a jet stands at ambient pressure",
        "pressure",
        "{rho'}*{g}*({HGL2}-{z})",
        last="IF({end'}=\"jet\",0,{rho'}*{g}*({HGL2}-{z}))",
    ),
    RowStep("tee", "1 where there is an offtake", "ratio", 'IF(OR({Qo}<>0,{Do}<>""),1,0)'),
    RowStep(
        "lo",
        "length of its direction",
        "ratio",
        "IF({tee}=0,1,IF(SUMSQ({ox},{oy},{oz})=0,#VALUE!,SQRT({ox}^2+{oy}^2+{oz}^2)))",
    ),
    RowStep("Ao", "area of the offtake", "area", 'IF({tee}=0,0,IF({Do}="",#VALUE!,PI()*{Do}^2/4))'),
    RowStep("Vo", "velocity in the offtake", "velocity", "IF({tee}=0,0,{Qo'}/{Ao})"),
    RowStep(
        "Ho",
        "total head at the offtake: of the side with the larger flow, less its loss",
        "head",
        'IF({kind}="empty",{z},{E0}+IF(ABS({Q2})>ABS({Q1}),{e2},{e1})-{Ko}*{Vo}*ABS({Vo})/(2*{g}))',
    ),
    RowStep(
        "po",
        "pressure in the offtake",
        "pressure",
        "IF({tee}=0,0,{rho'}*{g}*(IF({far1}*{far2}=1,{zf},{Ho})-{Vo}^2/(2*{g})-{z})+{dp})",
    ),
)

_FORCE = (
    RowStep("M1", "push at section 1: (p + beta rho V²) A", "force", "{p1}*{B1}+{b1}*{rho'}*{Q1}*{V1}"),
    RowStep("M2", "push at section 2", "force", "{p2}*{B2}+{beta}*{rho'}*{Q2}*{V2}"),
    RowStep("Mo", "push at the offtake", "force", "{po}*{Ao}+{rho'}*{Qo'}*{Vo}"),
    *(
        RowStep(
            f"F{a}",
            f"thrust on the node, {word}",
            "force",
            f"{{M1}}*{{w{a}}}-{{M2}}*{{u{a}}}-{{Mo}}*{{o{a}}}/{{lo}}",
        )
        for a, word in (("x", "east"), ("y", "north"), ("z", "up"))
    ),
    RowStep("F", "thrust, magnitude", "force", "SQRT({Fx}^2+{Fy}^2+{Fz}^2)"),
    RowStep("Fh", "thrust, horizontal part", "force", "SQRT({Fx}^2+{Fy}^2)"),
    RowStep(
        "bearing",
        "bearing of the horizontal part, clockwise from north; 0 where it is rounding",
        "angle",
        "IF({Fh}<=0.000000000001*(ABS({M1})+ABS({M2})+ABS({Mo})),0,MOD(ATAN2({Fy},{Fx}),2*PI()))",
    ),
    RowStep(
        "drag",
        "wall drag on the leg: its friction loss as a pressure on the bore",
        "force",
        "{rho'}*{g}*{hf}*PI()*{D2}^2/4",
        last='""',
    ),
    RowStep(
        "W",
        "weight of the water in the leg; none where it is drained",
        "force",
        'IF(AND({far2}=1,{cH2}=""),0,{rho\'}*{g}*PI()*{D2}^2/4*{L})',
        last='""',
    ),
    RowStep(
        "ring",
        "pressure difference on the rings of the joints, along the leg",
        "force",
        "({p2}-{p1.next})*({B2}-PI()*{D2}^2/4)",
        last="0",
    ),
    RowStep("col", "surge that accelerates the column", "force", "({dp}-{dp.next})*PI()*{D2}^2/4", last="0"),
    *(
        RowStep(
            f"l{a}",
            f"force on the leg, {a}: drag, rings, and the water's weight across it",
            "force",
            f"({{drag}}+{{ring}}+{{W}}*{{uz}})*{{u{a}}}" + ("-{W}" if a == "z" else ""),
            last="0",
        )
        for a in "xyz"
    ),
    *(
        RowStep(
            f"g{a}",
            f"outside forces, {a}: offtake, {'weight, ' if a == 'z' else ''}column",
            "force",
            f"0-{{Mo}}*{{o{a}}}/{{lo}}-{{col}}*{{u{a}}}" + ("-{W}" if a == "z" else ""),
            last=f"0-{{Mo}}*{{o{a}}}/{{lo}}",
        )
        for a in "xyz"
    ),
)

_CLOSURE = (
    *(
        Step(
            f"c{a}",
            f"closure {a}: forces on nodes and legs, less the balance of the whole run",
            "force",
            f"SUM({{F{a}.column}})+SUM({{l{a}.column}})-({{M1.first}}*{{w{a}.first}}-{{M2.last}}*{{u{a}.last}}"
            f"+SUM({{g{a}.column}}))",
        )
        for a in "xyz"
    ),
    Step(
        "big",
        "largest single force",
        "force",
        "MAX(MAX({Fx.column}),0-MIN({Fx.column}),MAX({Fy.column}),0-MIN({Fy.column}),MAX({Fz.column}),"
        "0-MIN({Fz.column}),MAX({drag.column}),0-MIN({drag.column}),MAX({W.column}),MAX({Mo.column}),"
        "0-MIN({Mo.column}),ABS({M1.first}),ABS({M2.last}))",
    ),
    Step(
        "closure",
        "what is left over, against the largest force",
        "ratio",
        "SQRT({cx}^2+{cy}^2+{cz}^2)/IF({big}=0,1,{big})",
    ),
)

_LOW = "MIN({p1},{p2},IF({tee}=1,{po},{p1}))"
_REMARKS = (
    (
        "n1",
        "pressure at or below vapour pressure: the column separates, results do not hold",
        f"AND({{rho'}}>0,{_LOW}+{{pamb}}<={{pv'}})",
        "",
    ),
    (
        "n2",
        "pressure below ambient",
        f"{_LOW}<0-0.000000000001*(ABS({{p1}})+{{rho0}}*{{g}}*(ABS({{H1}})+ABS({{z}})))",
        "",
    ),
    (
        "n3",
        "velocity above usual practice",
        "OR(ABS({V1})>{Vmax},ABS({V2})>{Vmax})",
        'OR(ABS({V1})>{Vmax},AND({end\'}<>"jet",ABS({V2})>{Vmax}))',
    ),
    (
        "n4",
        "flow between laminar and turbulent: friction uncertain",
        'AND({Re}>2300,{Re}<4000,{f}="")',
        "FALSE",
    ),
    ("n5", "flow against the order of the nodes", "OR({Q1}<0,{Q2}<0)", ""),
    ("n6", "deflection above 90 deg: check the coordinates", "{theta}>PI()/2+0.000000001", ""),
)


def _remarks() -> Iterator[RowStep]:
    for symbol, text, test, last in _REMARKS:
        yield RowStep(
            symbol,
            f"remark: {text}",
            "text",
            f'IF({test},"; {text}","")',
            last=f'IF({last},"; {text}","")' if last else "",
        )
    joined = "&".join(f"{{{symbol}}}" for symbol, *_ in _REMARKS)
    yield RowStep("note", "remarks", "text", f'IF({joined}="","ok",MID({joined},3,500))')


_FITTING = (
    ("bend", "{theta}>0.000000001", "", ""),
    (
        "reducer",
        "{D1}<>{D2}",
        'AND({D1}<>{D2},{start}<>"closed")',
        'AND({D1}<>{D2},{end\'}<>"closed",{end\'}<>"jet")',
    ),
    ("tee", "{tee}=1", "", ""),
    ("pump", "{Hp}<>0", "", ""),
    ("loss", "AND({K}>0,{theta}<=0.000000001,{D1}={D2})", "", ""),
    ("cap", "FALSE", '{start}="closed"', '{end\'}="closed"'),
    ("jet", "FALSE", "FALSE", '{end\'}="jet"'),
)


def _fitting() -> RowStep:
    def words(at: int) -> str:
        parts = "&".join(f'IF({row[at] or row[1]},", {row[0]}","")' for row in _FITTING)
        return f'MID({parts}&IF(({parts})="",", straight",""),3,99)'

    return RowStep("fitting", "what the node is", "text", words(1), first=words(2), last=words(3))


_RESULTS = (
    RowStep("po'", "pressure in the offtake, where there is one", "pressure", 'IF({tee}=1,{po},"")'),
    RowStep("Vo'", "velocity in the offtake, where there is one", "velocity", 'IF({tee}=1,{Vo},"")'),
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

# Without a flow given, that of a jet is found so that the head at the start is used up. The head left
# over is nearly linear in Q², so the secant method on Q² has no error but rounding after a few trials.
TRIALS = 9


def _trial(k: int) -> Iterator[RowStep]:
    re = f"MAX({{Rt{k}}},4000)"
    yield RowStep(
        f"Vt{k}", f"trial {k}: velocity", "velocity", f"IF({{A2}}=0,0,({{Qt{k}}}+({{QT}}-{{SQ}}))/{{A2}})"
    )
    yield RowStep(
        f"Rt{k}",
        f"trial {k}: Reynolds number",
        "ratio",
        f"IF({{mu'}}=\"\",0,{{rho'}}*ABS({{Vt{k}}})*{{D2}}/{{mu'}})",
        last='""',
    )
    yield RowStep(
        f"Xt{k}_0",
        f"trial {k}: 1/sqrt(f) to start from",
        "ratio",
        f"-2*LOG10({{a}}+5.74/{re}^0.9)",
        last='""',
    )
    for n in range(3):
        old, b = f"{{Xt{k}_{n}}}", f"2.51/{re}"
        yield RowStep(
            f"Xt{k}_{n + 1}",
            f"trial {k}: Newton step {n + 1}",
            "ratio",
            f"{old}-({old}+2*LOG10({{a}}+{b}*{old}))/(1+2*({b})/(LN(10)*({{a}}+{b}*{old})))",
            last='""',
        )
    yield RowStep(
        f"ft{k}",
        f"trial {k}: friction factor in use",
        "ratio",
        f'IF({{f}}<>"",{{f}},IF({{Rt{k}}}=0,0,64/MIN({{Rt{k}}},2300)+MIN(1,MAX(0,({{Rt{k}}}-2300)/1700))'
        f'*(IF({{method}}="haaland",1/(1.8*LOG10({{a}}^1.11+6.9/{re}))^2,'
        f'IF({{method}}="swamee-jain",1/{{Xt{k}_0}}^2,1/{{Xt{k}_3}}^2))-64/MIN({{Rt{k}}},2300))))',
        last='""',
    )
    yield RowStep(
        f"ht{k}",
        f"trial {k}: head lost at the node and along its leg",
        "head",
        f"({{K}}+{{ft{k}}}*{{L}}/{{D2}})*{{Vt{k}}}*ABS({{Vt{k}}})/(2*{{g}})-{{Hp}}*{{kp}}",
        last=f"{{K}}*{{Vt{k}}}*ABS({{Vt{k}}})/(2*{{g}})-{{Hp}}*{{kp}}",
    )


def _trial_flow(k: int) -> Step:
    if k == 0:
        formula = "0"
    elif k == 1:
        formula = "IF({Rest0}<0,#NUM!,{A2.last}*SQRT(2*{g}*{Rest0}))"
    else:
        a, b = f"{{Qt{k - 1}}}", f"{{Qt{k - 2}}}"
        ra, rb = f"{{Rest{k - 1}}}", f"{{Rest{k - 2}}}"
        formula = f"IF({ra}={rb},{a},SQRT({a}^2-{ra}*({a}^2-{b}^2)/({ra}-{rb})))"
    return Step(f"Qt{k}", f"trial {k}: flow out of the jet", "flow", formula)


def _trial_rest(k: int) -> Step:
    return Step(
        f"Rest{k}",
        f"trial {k}: head left over",
        "head",
        f"IF({{H'}}<>\"\",{{H'}},IF({{p'}}=\"\",#NUM!,{{z.first}}+{{p'}}/({{rho'}}*{{g}})"
        f"+{{a1.first}}*(({{Qt{k}}}+{{QT}})/{{A1.first}})^2/(2*{{g}})))-SUM({{ht{k}.column}})"
        f"-{{z.last}}-{{alpha.last}}*{{Vt{k}.last}}^2/(2*{{g}})",
    )


def run_working(solve: bool, fluid: bool = False) -> TableLonghand:
    """The working of a run.

    With ``solve`` the flow of a jet is found from the head at the start; with ``fluid`` the
    properties of water follow from its temperature.
    """
    trials = range(TRIALS if solve else 0)
    trial_rows = tuple(step for k in trials for step in _trial(k))
    trial_single = tuple(step for k in trials for step in (_trial_flow(k), _trial_rest(k)))
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
            *_PRESSURE,
            *_FORCE,
            *_RESULTS,
            _fitting(),
            *_remarks(),
        ),
        single=(*fluid_steps(fluid), *_SINGLE[:split], *trial_single, found, *_SINGLE[split:], *_CLOSURE),
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
