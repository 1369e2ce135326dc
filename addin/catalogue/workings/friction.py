"""Long-hand steps of the friction factor, shared by the workings that need one."""

from __future__ import annotations

from ..types import Step

# 1/sqrt(f) = X solves X + 2 log10(a + b X) = 0 with a = (e/D)/3.7, b = 2.51/Re. Newton's method from
# the explicit formula of Swamee and Jain, which is within 3 %; every step squares the relative error.
NEWTON_STEPS = 4


def friction_steps(Re: str, eD: str, method: str, f: str = "f") -> tuple[Step, ...]:
    """Darcy factor ``f`` from the names of the Reynolds number, relative roughness and method."""
    steps = [
        Step("Ret", "Reynolds number for the turbulent formula, at least 4000", "ratio", f"MAX({Re},4000)"),
        Step("a", "roughness term of Colebrook and White, (e/D)/3.7", "ratio", f"{eD}/3.7"),
        Step("b", "viscous term, 2.51/Re", "ratio", "2.51/{Ret}"),
        Step("X0", "1/sqrt(f) to start from (Swamee and Jain)", "ratio", "-2*LOG10({a}+5.74/{Ret}^0.9)"),
    ]
    for i in range(NEWTON_STEPS):
        x = f"{{X{i}}}"
        steps.append(
            Step(
                f"X{i + 1}",
                f"Newton step {i + 1} on X + 2 log10(a + b X) = 0",
                "ratio",
                f"{x}-({x}+2*LOG10({{a}}+{{b}}*{x}))/(1+2*{{b}}/(LN(10)*({{a}}+{{b}}*{x})))",
            )
        )
    steps += [
        Step(
            "ft",
            "turbulent factor by the method chosen",
            "ratio",
            f'IF({method}="haaland",1/(1.8*LOG10({{a}}^1.11+6.9/{{Ret}}))^2,'
            f'IF({method}="swamee-jain",1/{{X0}}^2,1/{{X{NEWTON_STEPS}}}^2))',
        ),
        Step("fl", "laminar factor 64/Re, up to 2300", "ratio", f"IF({Re}>0,64/MIN({Re},2300),0)"),
        Step(
            "w",
            "share of the turbulent factor: 0 up to Re 2300, 1 from 4000, linear between",
            "ratio",
            f"MIN(1,MAX(0,({Re}-2300)/(4000-2300)))",
        ),
        Step(f, "Darcy friction factor", "ratio", "{fl}+{w}*({ft}-{fl})"),
    ]
    return tuple(steps)
