"""The flow of a jet at the end of a run, sought in trials, for the long-hand working."""

from __future__ import annotations

from collections.abc import Iterator

from ..types import RowStep, Step

# Without a flow given, that of a jet is found so that the head at the start is used up. The head left
# over is nearly linear in Q², so the secant method on Q² has no error but rounding after a few trials.
TRIALS = 9


def trial(k: int) -> Iterator[RowStep]:
    """What one trial of the flow loses at a node and along its leg."""
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


def trial_flow(k: int) -> Step:
    """The flow that a trial starts from: none, then that without losses, then by the secant."""
    if k == 0:
        formula = "0"
    elif k == 1:
        formula = "IF({Rest0}<0,#NUM!,{A2.last}*SQRT(2*{g}*{Rest0}))"
    else:
        a, b = f"{{Qt{k - 1}}}", f"{{Qt{k - 2}}}"
        ra, rb = f"{{Rest{k - 1}}}", f"{{Rest{k - 2}}}"
        formula = f"IF({ra}={rb},{a},SQRT({a}^2-{ra}*({a}^2-{b}^2)/({ra}-{rb})))"
    return Step(f"Qt{k}", f"trial {k}: flow out of the jet", "flow", formula)


def trial_rest(k: int) -> Step:
    """The head that the flow of a trial leaves over."""
    return Step(
        f"Rest{k}",
        f"trial {k}: head left over",
        "head",
        f"IF({{H'}}<>\"\",{{H'}},IF({{p'}}=\"\",#NUM!,{{z.first}}+{{p'}}/({{rho'}}*{{g}})"
        f"+{{a1.first}}*(({{Qt{k}}}+{{QT}})/{{A1.first}})^2/(2*{{g}})))-SUM({{ht{k}.column}})"
        f"-{{z.last}}-{{alpha.last}}*{{Vt{k}.last}}^2/(2*{{g}})",
    )
