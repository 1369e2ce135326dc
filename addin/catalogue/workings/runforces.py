"""Pressures, forces, closure and remarks of the long-hand working of a pipe run."""

from __future__ import annotations

from collections.abc import Iterator

from ..types import RowStep, Step

PRESSURE = (
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

FORCE = (
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

CLOSURE = (
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


def remarks() -> Iterator[RowStep]:
    """A step for each remark that a node can have, and the note that joins them."""
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


def fitting() -> RowStep:
    """What a node is, in words."""

    def words(at: int) -> str:
        parts = "&".join(f'IF({row[at] or row[1]},", {row[0]}","")' for row in _FITTING)
        return f'MID({parts}&IF(({parts})="",", straight",""),3,99)'

    return RowStep("fitting", "what the node is", "text", words(1), first=words(2), last=words(3))


RESULTS = (
    RowStep("po'", "pressure in the offtake, where there is one", "pressure", 'IF({tee}=1,{po},"")'),
    RowStep("Vo'", "velocity in the offtake, where there is one", "velocity", 'IF({tee}=1,{Vo},"")'),
)
