"""Conversions of a working: between the numbers of the cells and SI, as formulas."""

from __future__ import annotations

from typing import NamedTuple

from ..catalogue.types import Arg, Row
from ..units import Unit
from .grid import Content, Formula
from .symbols import default_of, number, quoted, within

P_ATM = "101325"
"""The ambient pressure of a function that takes none [Pa]."""


ANGLE_SCALE = "1000"
"""Scale of an angle [rad]: below a thousandth of a millionth of a millionth it is rounding."""


AMBIENT = "\N{WHITE SQUARE}"
"""Stands for the ambient pressure in a formula that has no place yet."""


def with_ambient(content: Content, ambient: str) -> Content:
    """A content with the cell of the ambient pressure put in."""
    if isinstance(content, Formula) and AMBIENT in content.text:
        return Formula(content.text.replace(AMBIENT, ambient))
    return content


class Conversion(NamedTuple):
    """The unit of a column: its name, its factor to SI, and where its zero stands."""

    unit: Content
    factor: Content
    shift: int = 0
    """-1: ambient pressure is taken off on the way to SI; +1: put on."""
    offset: float = 0.0
    """Of a temperature: the zero of its scale in kelvin."""

    @classmethod
    def of(cls, unit: Unit) -> Conversion:
        return cls(unit.symbol, unit.factor, unit.shift, unit.offset)

    def datum(self, ambient: str, sign: int = 1) -> str:
        """What is added on the way to SI (``sign`` -1: on the way back), "" for nothing."""
        text = ambient if self.shift else number(self.offset) if self.offset else ""
        return f"{'+' if (self.shift or 1) * sign > 0 else '-'}{text}" if text else ""


PLAIN = Conversion("", 1.0)
"""No unit: what is no quantity."""


def to_si(raw: str, factor: str, unit: Conversion, ambient: str) -> str:
    """A number in its unit as a number in SI."""
    plain = raw if factor == "1" else f"{raw}*{factor}"
    return plain + unit.datum(ambient)


def from_si(value: str, factor: str, unit: Conversion, ambient: str) -> str:
    """A number in SI as a number in a unit."""
    back = unit.datum(ambient, -1)
    plain = f"({value}{back})" if back else value
    return plain if factor == "1" else f"{plain}/{factor}"


def in_use(row: Row, arg: Arg, raw: str, si: str) -> str:
    """The value of an argument in the working: SI, its default put in, its range kept.

    ``raw`` is the cell as given, ``si`` the formula of its SI value.
    """
    default = default_of(row, arg)
    if arg.role == "choice":
        allowed = ",".join(f"{{0}}={quoted(choice)}" for choice in arg.choices)
        word = f"LOWER(TRIM({raw}))"
        chosen = f"IF(OR({allowed.replace('{0}', word)}),{word},#VALUE!)"
    else:
        test = within(row, arg, f"({si})" if any(sign in si for sign in "+-") else si)
        chosen = f"IF({test},{si},#NUM!)" if test else si
    if row.required(arg):
        return chosen
    if default is None:
        empty = '""'
    else:
        empty = quoted(default) if isinstance(default, str) else number(default)
    return f'IF({raw}="",{empty},{chosen})'


def not_given(row: Row, arg: Arg) -> Content | None:
    """What stands in the working for an argument that a call leaves out."""
    if row.required(arg):
        return Formula("#VALUE!")
    return default_of(row, arg)


def agreement(
    value: str, own: str, tolerance: str, scale: str, figures: bool = False, apart: str = '"differs"'
) -> str:
    """The verdict on a cell: "agrees", "differs", or "error" where both sides are errors.

    With ``figures`` the cell holds a text into which a number is written, whose last
    figures may be rounded another way: "text" where nothing but figures differs.
    ``apart`` is the verdict on numbers that the tolerance does not cover.
    """
    allowed = f"{tolerance}*MAX(ABS({value}),ABS({own})"
    allowed += f",0.0001*{scale})" if scale else ")"
    other = '"differs"'
    if figures:
        other = f'IF({_without_figures(value)}={_without_figures(own)},"text","differs")'
    return (
        f'IF(ISERROR({own}),IF(ISERROR({value}),"error","differs"),'
        f'IF(ISERROR({value}),"differs",IF(ISTEXT({own})<>ISTEXT({value}),"differs",'
        f'IF(ISTEXT({own}),IF({value}={own},"agrees",{other}),'
        f'IF(ABS({value}-{own})<={allowed},"agrees",{apart})))))'
    )


def _without_figures(text: str) -> str:
    for figure in "0123456789.":
        text = f'SUBSTITUTE({text},"{figure}","")'
    return text
