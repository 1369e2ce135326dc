"""The types of a catalogue row.

One row describes one worksheet function completely. Host registration,
function-wizard texts, help, the reference page and the conformance tests are
all made from it. The order of arguments follows from the row: the wanted result
(only where there are several), the units, then the arguments as listed.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from typing import Any, Literal

from thrustbook.engine.guard import Bound, Routine

Kind = Literal["element", "table", "tool"]
"""element: one call, one set of numbers (or ranges, element by element);
table: reads ranges as tables; tool: no quantities at all."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Column:
    """A column of a table argument."""

    name: str
    role: str
    """A unit role, or "text"."""
    text: str = ""
    required: bool = False
    empty: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class Arg:
    """An argument of a worksheet function, after result and units.

    ``role`` is a unit role; or "choice" (one of ``choices``), "text", "table" or
    "headings" (ranges read by the row's own reader), "any".
    """

    name: str
    role: str
    text: str = ""
    """Wording; left empty it comes from the glossary."""
    empty: str = ""
    """What leaving it empty means, in words; required arguments have none."""
    required: bool = True
    """Read for table and tool rows only; an element row has it from its routine."""
    choices: tuple[str, ...] = ()
    columns: tuple[Column, ...] = ()
    repeats: bool = False
    """The last argument of a tool that takes any number more."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Result:
    """A result of a worksheet function; ``role`` is a unit role or "text"."""

    name: str
    role: str
    text: str
    alone: bool = False
    """Given when asked for by name, but no column of "all": it has a shape of its own."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Caution:
    """A physical warning: not an error, told by TB_WHY, notes and the check.

    ``test`` takes the arguments and the results by name, in SI units, floats or
    arrays, and tells where the warning applies.
    """

    text: str
    test: Callable[[Mapping[str, Any]], Any]


@dataclass(frozen=True, slots=True)
class Step:
    """A step of the long-hand working.

    ``formula`` is an ordinary worksheet formula without "=", in SI units, in
    which {name} stands for an argument or an earlier step. An optional argument left
    empty reads there as its default number or word, or as "" where it has none.
    ``role`` is a unit role, "text", or a unit where no role has it ("m/s2").
    """

    symbol: str
    text: str
    role: str
    formula: str


@dataclass(frozen=True, slots=True, kw_only=True)
class Longhand:
    """The long-hand working of a row: steps, in order, and which of them is which result.

    ``results`` maps result names to step symbols where the two differ.
    ``method`` says how an iterated result is shown: "" (closed form),
    "unrolled" or "residual".
    """

    steps: tuple[Step, ...]
    results: Mapping[str, str] = field(default_factory=dict)
    method: Literal["", "unrolled", "residual"] = ""


@dataclass(frozen=True, slots=True)
class RowStep(Step):
    """A step worked on every row of a table.

    In its formula {name} is a column or an earlier step on the same row, or else a single
    step or an entry of the start block; {name.prev} and {name.next} are the same on the row
    before and after, {name.first} and {name.last} on the first and the last row, and
    {name.column} all rows of it. ``first`` and ``last`` are the formulas of the first and
    the last row where those differ.
    """

    first: str = ""
    last: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class TableLonghand:
    """The long-hand working of a table function: one row a port, fitting or node.

    ``single`` are steps worked once; their formulas may use whole columns, and those of
    the rows may use them. A result is a row step, or a single step where the answer is
    one value. ``defaults`` are what empty cells of a column or entry stand for, as
    formulas; without one they read as "". ``bounds`` are the ranges allowed, in SI.
    """

    rows: tuple[RowStep, ...]
    single: tuple[Step, ...] = ()
    results: Mapping[str, str] = field(default_factory=dict)
    defaults: Mapping[str, str] = field(default_factory=dict)
    bounds: Mapping[str, Bound] = field(default_factory=dict)
    method: Literal["", "unrolled", "residual"] = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class NoLonghand:
    """Why a row has no long-hand working."""

    reason: str


@dataclass(frozen=True, slots=True, kw_only=True)
class Row:
    """One worksheet function."""

    name: str
    family: str
    summary: str
    """One line for the function wizard, at most 255 characters."""
    kind: Kind
    args: tuple[Arg, ...]
    results: tuple[Result, ...]
    routine: Any
    """element: the guarded engine routine; table and tool: the reader in addin/blocks or addin/tools."""
    sign: str
    """Sign convention; for a plain quantity, say what is positive."""
    reference: str
    example: str
    """A call as it stands in a cell, without "="; all its arguments are constants."""
    since: str = "0.1"
    longhand: Longhand | TableLonghand | NoLonghand | None = None
    cautions: tuple[Caution, ...] = ()
    has_units: bool = True
    block: bool = False
    """True where the natural answer is a table with a row for every row of the input."""

    @property
    def has_result(self) -> bool:
        """Tell whether the first argument names the wanted result."""
        return self.has_units and (self.block or len(self.results) > 1)

    @property
    def leading(self) -> int:
        """Number of arguments in front of ``args``."""
        return int(self.has_result) + int(self.has_units)

    def required(self, arg: Arg) -> bool:
        """Tell whether an argument must be given."""
        if isinstance(self.routine, Routine):
            return next(p.required for p in self.routine.parameters if p.name == arg.name)
        return arg.required

    def bound(self, arg: Arg) -> Bound | None:
        """Give the range allowed for an argument, in SI units, where there is one."""
        if isinstance(self.routine, Routine):
            return next(p.bound for p in self.routine.parameters if p.name == arg.name)
        return None

    @property
    def max_args(self) -> int | None:
        """Largest number of worksheet arguments; None where there is no limit."""
        if self.args and self.args[-1].repeats:
            return None
        return self.leading + len(self.args)

    def signature(self) -> str:
        """Write the call with its argument names, optional ones in brackets."""
        names = (["result"] if self.has_result else []) + (["units"] if self.has_units else [])
        names += [a.name if self.required(a) else f"[{a.name}]" for a in self.args]
        return f"{self.name}({', '.join(names)}{', ...' if self.max_args is None else ''})"
