"""The arguments of one call: where each comes from, and what the checking sheet puts for it."""

from __future__ import annotations

import re
from collections.abc import Callable
from dataclasses import dataclass
from typing import Any, Literal

from ..catalogue.types import Arg, Column
from ..cells import Scalar
from ..hosts.headless.formulas import Kind, Part
from ..hosts.headless.formulas import literal as formula_text
from ..tables import is_blank
from ..units import UnitError, quantity, unit
from .calls import Call, Items, NotWorked, Shape, render
from .convert import AMBIENT, Conversion
from .expressions import SINGLE, Survey, element, hands_on_cells, outcome_shape, survey, within
from .grid import Content, Formula
from .source import Area, Source, literal
from .symbols import number, quoted

Written = Callable[[Call], str]
"""How a call inside an argument is written: a reference to its long-hand result."""

_QUANTITY = re.compile(r"\s*[-+]?(?:\d+\.?\d*|\.\d+)(?:[eE][-+]?\d+)?\s*(\S.*?)\s*")
WORDS = ("choice", "text", "any")
"""Roles of arguments that are no numbers."""


@dataclass(slots=True, eq=False)
class Argument:
    """One argument of a call.

    ``form``: "empty"; "literal" or "array" (constants); "area" (cells); "call" (another
    TB_ call alone); "expression". ``values`` are the stored values of constants and cells.
    ``extent`` are rows and columns of an expression, ``survey`` what its text tells.
    """

    form: Literal["empty", "literal", "array", "area", "call", "expression"]
    sheet: str
    items: Items
    source: Source
    area: Area | None = None
    values: list[list[Any]] | None = None
    survey: Survey | None = None
    extent: Shape = SINGLE

    @property
    def shape(self) -> Shape:
        """Rows and columns, (1, 1) for a single value."""
        if self.form in ("area", "array"):
            assert self.values is not None
            return len(self.values), len(self.values[0])
        if self.form == "expression":
            return self.extent
        return outcome_shape(self._call) if self.form == "call" else SINGLE

    @property
    def _call(self) -> Call:
        (call,) = self.items
        assert isinstance(call, Call)
        return call

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
        return within(self.shape, i, j)

    def text(self, written: Written, i: int = 0, j: int = 0) -> str:
        """The argument, or one element of it, as a formula on another sheet writes it."""
        i, j = self._inside(i, j)
        if self.form == "area" and self.area is not None:
            written_as = _only(self.items).text
            if self.shape == SINGLE and ":" not in written_as:
                return self.source.operand(written_as, self.sheet)
            return self.area.ref(i, j)
        if self.form == "call":
            return element_text(self._call, written, i, j)
        if self.form == "array":
            return formula_text(self.value(i, j))
        items = self.items
        if self.survey is not None and self.extent != SINGLE:
            items = element(self.survey, items, i, j, self._cell)
        return render(items, lambda text: self.source.operand(text, self.sheet), written)

    def _cell(self, operand: Part, i: int, j: int) -> str:
        """One cell of a range."""
        area = self.source.area(operand.text, self.sheet)
        assert area is not None
        return area.ref(i, j)

    def shown(self) -> str:
        """The argument as it stands in the formula."""
        return render(self.items, lambda text: text, lambda call: f"{call.name}(...)")


def element_text(call: Call, written: Written, i: int, j: int) -> str:
    """One element of what a call gives."""
    return written(call) if call.outcome is None else call.outcome.at(i, j)


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
        return _expression(items, sheet, source)
    signed = _signed(items)
    if signed is not None:
        return Argument("literal", sheet, items, source, None, [[signed]])
    kinds = [item.kind for item in items if isinstance(item, Part)]
    if kinds[0] is Kind.ARRAY_OPEN and kinds.index(Kind.ARRAY_CLOSE) == len(items) - 1:
        return Argument("array", sheet, items, source, None, _array(items))
    return _expression(items, sheet, source)


def _expression(items: Items, sheet: str, source: Source) -> Argument:
    found = surveyed(items, sheet, source)
    extent = found.shape if found.elementwise else SINGLE
    return Argument("expression", sheet, items, source, survey=found, extent=extent)


def surveyed(items: Items, sheet: str, source: Source) -> Survey:
    """What the text of an expression on a sheet tells of its result."""

    def shape_of(operand: Part) -> Shape | None:
        area = source.area(operand.text, sheet)
        return None if area is None else area.shape

    return survey(items, shape_of)


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


def number_of(ref: str) -> Formula:
    """The number in a cell; a text that looks like one, and TRUE, are none."""
    # Some spreadsheets count TRUE as a number.
    return Formula(f'IF(ISLOGICAL({ref}),#VALUE!,IF(ISNUMBER({ref}),{ref},IF({ref}="","",#VALUE!)))')


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
        if arg.role in WORDS:
            return value, None
        own = own_unit(value, arg.role)
        if own is None:
            return Formula("#VALUE!"), None  # a spreadsheet would take "10" for a number
        return float(value.strip()[: -len(str(own.unit))].strip()), own
    text = argument.text(written, i, j)
    if argument.form == "area":
        value = argument.value(i, j)
        if arg.role in WORDS:
            return linked(text), None
        if isinstance(value, str) and not is_blank(value):
            own = own_unit(value, arg.role)
            if own is not None:
                name = str(own.unit)
                trimmed = f"TRIM({text})"
                digits = f"TRIM(LEFT({trimmed},LEN({trimmed})-{len(name)}))"
                same = f"EXACT(RIGHT({trimmed},{len(name)}),{quoted(name)})"
                return Formula(f"IF({same},VALUE({digits}),#VALUE!)"), own
        return number_of(text), None
    if not hands_on_cells(argument.items):
        return Formula(text), None
    return linked(text) if arg.role in WORDS else number_of(text), None


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
    if own.shift != group.shift:  # pressures against different data
        si = f"({si}{'+' if own.shift > group.shift else '-'}{AMBIENT})"
    return Formula(f"{si}/{factor}")
