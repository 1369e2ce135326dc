"""Formulas of the workings: names in braces put in, as cells or as plain symbols."""

from __future__ import annotations

import re
from collections.abc import Callable

from thrustbook.engine.guard import Bound

from ..catalogue.types import Arg, Row
from ..units import ROLES

_NAME = re.compile(r"\{([^{}]+)\}")


def fill(formula: str, cell_of: Callable[[str], str]) -> str:
    """A formula of a working with each {name} replaced by what ``cell_of`` gives for it."""
    return _NAME.sub(lambda match: cell_of(match[1]), formula)


def shown(formula: str) -> str:
    """A formula of a working as people read it: names without braces."""
    return _NAME.sub(lambda match: match[1], formula)


def names_in(formula: str) -> list[str]:
    """The names that a formula of a working uses, each once, in order."""
    return list(dict.fromkeys(_NAME.findall(formula)))


def si_unit(role: str) -> str:
    """The unit in which a working counts; a role that is no unit role is a unit itself."""
    if role == "angle":
        return "rad"
    if role in ("text", "choice", "any"):
        return ""
    known = ROLES.get(role)
    return role if known is None else known.si


def default_of(row: Row, arg: Arg) -> float | str | None:
    """What an argument left empty stands for: a number (SI) or a word; None where it stays empty."""
    parameters = getattr(row.routine, "parameters", ())
    found = next((p for p in parameters if p.name == arg.name), None)
    if found is None or found.required or found.default != found.default:
        return None
    return found.default if isinstance(found.default, str) else float(found.default)


def within(row: Row, arg: Arg, value: str) -> str:
    """A condition that a value (a cell) lies in the range allowed; empty where any number does."""
    return inside(row.bound(arg), value)


def inside(bound: Bound | None, value: str) -> str:
    """A condition that a value (a cell) lies in a range; empty where any number does."""
    if bound is None:
        return ""
    tests = []
    if bound.low > -1e300:
        tests.append(f"{value}{'>' if bound.open_low else '>='}{number(bound.low)}")
    if bound.high < 1e300:
        tests.append(f"{value}{'<' if bound.open_high else '<='}{number(bound.high)}")
    return tests[0] if len(tests) == 1 else f"AND({','.join(tests)})" if tests else ""


def number(value: float) -> str:
    """A number as a formula writes it, to the last digit."""
    text = repr(float(value))
    return (text[:-2] if text.endswith(".0") else text).upper()


def quoted(text: str) -> str:
    """A text as a formula writes it."""
    return '"' + text.replace('"', '""') + '"'
