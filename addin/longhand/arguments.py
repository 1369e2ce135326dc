"""The arguments of one call: where each comes from, and what the checking sheet puts for it."""

from __future__ import annotations

import re
from collections.abc import Callable
from dataclasses import dataclass
from typing import Any, Literal

from ..catalogue.types import Arg, Column
from ..cells import Scalar
from ..hosts.headless.formulas import Kind, Part
from ..tables import is_blank
from ..units import UnitError, quantity, unit
from .calls import Call, Items, NotWorked, render
from .convert import Conversion
from .grid import Content, Formula
from .source import Area, Source, literal
from .symbols import number, quoted

Shape = tuple[int, int]
Written = Callable[[Call], str]
"""How a call inside an argument is written: a reference to its long-hand result."""

_QUANTITY = re.compile(r"\s*[-+]?(?:\d+\.?\d*|\.\d+)(?:[eE][-+]?\d+)?\s*(\S.*?)\s*")
_WORDS = ("choice", "text", "any")
"""Roles of arguments that are no numbers."""


@dataclass(slots=True, eq=False)
class Argument:
    """One argument of a call.

    ``form``: "empty"; "literal" or "array" (constants); "area" (cells); "call" (another
    TB_ call alone); "expression". ``values`` are the stored values of constants and cells.
    """

    form: Literal["empty", "literal", "array", "area", "call", "expression"]
    sheet: str
    items: Items
    source: Source
    area: Area | None = None
    values: list[list[Any]] | None = None

    @property
    def shape(self) -> Shape:
        """Rows and columns, (1, 1) for a single value."""
        if self.form in ("area", "array"):
            assert self.values is not None
            return len(self.values), len(self.values[0])
        if self.form == "expression":
            shapes = {a.shape for a in self._loose_areas()} - {(1, 1)}
            if len(shapes) > 1:
                raise NotWorked("an argument joins ranges of different sizes")
            return shapes.pop() if shapes else (1, 1)
        if self.form == "call":
            return outcome_shape(self.items[0])
        return 1, 1

    def value(self, i: int = 0, j: int = 0) -> Scalar:
        """The value stored now, where it is known without evaluating anything."""
        if self.form == "empty":
            return None
        if self.values is None:
            raise NotWorked("an argument that must be read beforehand is an expression")
        i, j = self._inside(i, j)
        value: Scalar = self.values[i][j]
        return value

    def _inside(self, i: int, j: int) -> Shape:
        """The place in this argument that serves the place (i, j) of the whole call."""
        rows, cols = self.shape
        return (i if rows > 1 else 0), (j if cols > 1 else 0)

    def text(self, written: Written, i: int = 0, j: int = 0) -> str:
        """The argument, or one element of it, as a formula on another sheet writes it."""
        i, j = self._inside(i, j)
        if self.form == "area" and self.area is not None:
            if self.shape == (1, 1):
                return self.source.operand(_only(self.items).text, self.sheet)
            return self.area.ref(i, j)
        if self.form == "call":
            return element_text(self.items[0], written, i, j)

        def operand(text: str) -> str:
            area = self.source.area(text, self.sheet) if self.shape != (1, 1) else None
            if area is not None and area.shape != (1, 1):
                return area.ref(i, j)
            return self.source.operand(text, self.sheet)

        return render(self.items, operand, written)

    def shown(self) -> str:
        """The argument as it stands in the formula."""
        return render(self.items, lambda text: text, lambda call: f"{call.name}(...)")

    def _loose_areas(self) -> list[Area]:
        """The ranges that stand in no function of the spreadsheet."""
        found = []
        depth = 0
        for item in self.items:
            if isinstance(item, Call):
                if outcome_shape(item) != (1, 1):
                    raise NotWorked("an argument computes with a call that gives several values")
                continue
            depth += (item.kind is Kind.OPEN) - (item.kind is Kind.CLOSE)
            if item.kind is Kind.REFERENCE:
                area = self.source.area(item.text, self.sheet)
                if area is not None and depth == 0:
                    found.append(area)
        return found


def outcome_shape(item: Part | Call) -> Shape:
    """Rows and columns of what an item gives."""
    outcome = item.outcome if isinstance(item, Call) else None
    return (1, 1) if outcome is None else outcome.shape


def element_text(item: Part | Call, written: Written, i: int, j: int) -> str:
    """One element of what a call gives."""
    assert isinstance(item, Call)
    return written(item) if item.outcome is None else item.outcome.at(i, j)


def _only(items: Items) -> Part:
    assert len(items) == 1
    assert isinstance(items[0], Part)
    return items[0]


def resolve(items: Items, sheet: str, source: Source) -> Argument:
    """Find out where an argument comes from."""
    if not items:
        return Argument("empty", sheet, items, source)
    if len(items) == 1:
        item = items[0]
        if isinstance(item, Call):
            return Argument("call", sheet, items, source)
        if item.kind is Kind.LITERAL:
            return Argument("literal", sheet, items, source, None, [[literal(item)]])
        if item.kind is Kind.REFERENCE:
            area = source.area(item.text, sheet)
            if area is not None:
                return Argument("area", sheet, items, source, area, source.grid(area))
        return Argument("expression", sheet, items, source)
    signed = _signed(items)
    if signed is not None:
        return Argument("literal", sheet, items, source, None, [[signed]])
    if isinstance(items[0], Part) and items[0].kind is Kind.ARRAY_OPEN:
        return Argument("array", sheet, items, source, None, _array(items))
    return Argument("expression", sheet, items, source)


def _signed(items: Items) -> float | None:
    """A number with a sign in front."""
    if len(items) != 2 or not all(isinstance(item, Part) for item in items):
        return None
    sign, value = _only(items[:1]), _only(items[1:])
    if sign.text not in ("-", "+") or value.kind is not Kind.LITERAL:
        return None
    number_ = literal(value)
    if not isinstance(number_, float):
        return None
    return -number_ if sign.text == "-" else number_


def _array(items: Items) -> list[list[Scalar]]:
    """The values of an array constant."""
    rows: list[list[Scalar]] = [[]]
    waiting: Items = []

    def take() -> None:
        nonlocal waiting
        signed = _signed(waiting)
        if signed is not None:
            rows[-1].append(signed)
        elif len(waiting) == 1 and isinstance(waiting[0], Part):
            rows[-1].append(literal(waiting[0]))
        else:
            raise NotWorked("an array constant cannot be read")
        waiting = []

    for item in items[1:-1]:
        if isinstance(item, Part) and item.kind is Kind.SPACE:
            continue
        if isinstance(item, Part) and item.text in (",", ";") and item.kind is not Kind.LITERAL:
            take()
            if item.text == ";":
                rows.append([])
        else:
            waiting.append(item)
    take()
    if len({len(row) for row in rows}) > 1:
        raise NotWorked("an array constant has rows of different lengths")
    return rows


def linked(ref: str) -> Formula:
    """A cell taken over: an empty one stays empty and does not become 0."""
    return Formula(f'IF({ref}="","",{ref})')


def taken(
    argument: Argument, arg: Arg | Column, written: Written, i: int = 0, j: int = 0
) -> tuple[Content | None, Conversion | None]:
    """What the checking sheet puts for an element of an argument, and its own unit where it brings one."""
    if argument.form == "empty":
        return None, None
    if argument.form in ("literal", "array"):
        value = argument.value(i, j)
        if is_blank(value):
            return None, None
        if isinstance(value, bool):
            return Formula("#VALUE!"), None  # as in every host
        if isinstance(value, float):
            return value, None
        if not isinstance(value, str):
            return Formula(str(value)), None
        if arg.role in _WORDS:
            return value, None
        own = own_unit(value, arg.role)
        if own is None:
            return Formula("#VALUE!"), None  # a spreadsheet would take "10" for a number
        return float(value.strip()[: -len(str(own.unit))].strip()), own
    text = argument.text(written, i, j)
    if argument.form == "area":
        value = argument.value(i, j)
        if arg.role in _WORDS:
            return linked(text), None
        if isinstance(value, str) and not is_blank(value):
            own = own_unit(value, arg.role)
            if own is not None:
                name = str(own.unit)
                trimmed = f"TRIM({text})"
                digits = f"TRIM(LEFT({trimmed},LEN({trimmed})-{len(name)}))"
                same = f"EXACT(RIGHT({trimmed},{len(name)}),{quoted(name)})"
                return Formula(f"IF({same},VALUE({digits}),#VALUE!)"), own
        if isinstance(value, bool) or (isinstance(value, str) and not is_blank(value)):
            return Formula(f"IF(OR(ISTEXT({text}),ISLOGICAL({text})),#VALUE!,{linked(text).text})"), None
        return linked(text), None
    return Formula(text), None


def own_unit(text: str, role: str) -> Conversion | None:
    """The unit that a text such as "300 mm" brings; None where it is no quantity."""
    match = _QUANTITY.fullmatch(text)
    if match is None:
        return None
    try:
        _, shift = quantity(text, role)
        found = unit(match[1], role)
    except UnitError:
        return None
    return Conversion(match[1], found.factor, shift, found.offset)


def in_group(content: Content | None, own: Conversion | None, group: Conversion) -> Content | None:
    """A quantity with its own unit as a number in the unit of its group."""
    if own is None or content is None:
        return content
    inside = content.text if isinstance(content, Formula) else number(float(content))
    factor = group.factor.text if isinstance(group.factor, Formula) else number(float(group.factor))
    si = f"({inside})*{number(float(own.factor))}"  # type: ignore[arg-type]
    if own.offset or group.offset:  # scales of temperature with different zeros
        si = f"({si}+{number(own.offset)}-{number(group.offset)})"
    return Formula(f"{si}/{factor}")


def same_datum(argument: Argument, arg: Arg | Column, group: Conversion) -> None:
    """Refuse elements that bring a unit against another datum than their column. Raises NotWorked."""
    for line in argument.values or []:
        for cell in line:
            own = own_unit(cell, arg.role) if isinstance(cell, str) and arg.role != "choice" else None
            if own is not None and own.shift != group.shift:
                raise NotWorked(f"an element of {arg.name} has a unit of its own, {own.unit}")
