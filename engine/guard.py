"""The guard that every element-wise routine stands behind.

``@routine(D=POSITIVE, ...)`` states the range of each argument once. Around the
body it does what would otherwise be written in every routine:

- bad arguments of a scalar call are collected and raised together;
- array arguments are broadcast, worked in pieces that fit the cache, and a bad
  element spoils only itself: its results are NaN and ``status`` says so;
- a result that is not finite is no result: NoSolution, or its status (except a
  result that the routine declares undefined without some optional argument).

The ranges are kept on the routine (``bounds``), so the worksheet catalogue, the
reference page and the tests read them from here and nowhere else.
"""

from __future__ import annotations

import functools
import inspect
import math
from collections.abc import Callable
from typing import Any, Generic, NamedTuple, ParamSpec, TypeVar, cast, get_type_hints

import numpy as np
import numpy.typing as npt

from .errors import EngineError, NoSolution, OutOfRange, Problem, Status

P = ParamSpec("P")
R = TypeVar("R", bound=tuple[Any, ...])

CHUNK = 8192
"""Elements worked at a time: the temporaries of a routine then stay in the cache."""


class Bound(NamedTuple):
    """Range allowed for an argument, in SI units; open ends are excluded."""

    low: float = -math.inf
    high: float = math.inf
    open_low: bool = False
    open_high: bool = False

    def allows(self, x: Any) -> Any:
        """Tell where ``x`` (scalar or array) lies inside; NaN lies outside."""
        above = x > self.low if self.open_low else x >= self.low
        below = x < self.high if self.open_high else x <= self.high
        finite = (x - x) == 0  # an infinite value is no quantity
        return above & below & finite

    def __str__(self) -> str:
        low, high = math.isfinite(self.low), math.isfinite(self.high)
        lower = f"{'above' if self.open_low else 'at least'} {self.low:g}" if low else ""
        upper = f"{'below' if self.open_high else 'at most'} {self.high:g}" if high else ""
        return " and ".join(filter(None, (lower, upper))) or "any number"


ANY = Bound()
POSITIVE = Bound(low=0.0, open_low=True)
NON_NEGATIVE = Bound(low=0.0)
AT_LEAST_ONE = Bound(low=1.0)
FRACTION = Bound(low=0.0, high=1.0)
HALF_TURN = Bound(low=0.0, high=math.pi)
FULL_TURN = Bound(low=-2 * math.pi, high=2 * math.pi)


class Parameter(NamedTuple):
    """What the guard knows of one argument of a routine."""

    name: str
    required: bool
    default: Any
    bound: Bound | None  # None: a word, not a number


class Routine(Generic[P, R]):
    """A guarded routine: call it with floats or with arrays."""

    def __init__(
        self, body: Callable[P, R], bounds: dict[str, Bound], undefined: frozenset[str] = frozenset()
    ) -> None:
        functools.update_wrapper(self, body)
        self.body: Callable[..., R] = body
        self.name = body.__name__
        self.result_type: type[R] = get_type_hints(body)["return"]
        self.fields: tuple[str, ...] = self.result_type._fields
        self.parameters = tuple(
            Parameter(
                name,
                parameter.default is inspect.Parameter.empty,
                parameter.default,
                bounds.get(name, None if isinstance(parameter.default, str) else ANY),
            )
            for name, parameter in inspect.signature(body).parameters.items()
        )
        unknown = (set(bounds) - {p.name for p in self.parameters}) | (undefined - set(self.fields))
        if unknown:
            raise TypeError(f"{self.name}: unknown arguments or results {sorted(unknown)}")
        self._may_be_undefined = tuple(name in undefined for name in self.fields)
        self._names = tuple(p.name for p in self.parameters)
        self._defaults = tuple(p.default for p in self.parameters)
        # Plain tuples for the scalar path, which runs once a worksheet cell.
        self._checks = tuple(
            (i, p.bound.low, p.bound.high, p.bound.open_low, p.bound.open_high, not p.required)
            for i, p in enumerate(self.parameters)
            if p.bound is not None
        )

    def __call__(self, *args: P.args, **kwargs: P.kwargs) -> R:
        """Evaluate for floats (raises on bad input) or arrays (see ``evaluate``)."""
        values = self._bind(args, kwargs)
        for i, *_ in self._checks:
            if type(values[i]) is not float:
                value = values[i]
                if (isinstance(value, np.ndarray) and value.ndim) or isinstance(value, list | tuple):
                    return self.evaluate(values)[0]
                values[i] = float(value)
        return self.scalar(values)

    def _bind(self, args: tuple[Any, ...], kwargs: dict[str, Any]) -> list[Any]:
        if len(args) > len(self._names):
            raise TypeError(f"{self.name} takes {len(self._names)} arguments, {len(args)} given")
        values = [*args, *self._defaults[len(args) :]]
        for name, value in kwargs.items():
            if name not in self._names or self._names.index(name) < len(args):
                raise TypeError(f"{self.name}: argument {name!r} is not known or given twice")
            values[self._names.index(name)] = value
        missing = [n for n, v in zip(self._names, values, strict=True) if v is inspect.Parameter.empty]
        if missing:
            raise TypeError(f"{self.name}: {', '.join(missing)} not given")
        return values

    def scalar(self, values: list[Any]) -> R:
        """Evaluate for one set of floats, in the order of the arguments.

        Raises
        ------
        OutOfRange
            With every bad argument.
        NoSolution
            Where the arguments have no physical solution.
        """
        for i, low, high, open_low, open_high, optional in self._checks:
            x = values[i]
            if not (low <= x <= high) or (open_low and x == low) or (open_high and x == high) or x - x != 0:
                if optional and x != x:
                    continue
                raise OutOfRange(self.problems(values), self.name)
        try:
            result = self.body(*values)
        except EngineError as error:
            error.function = error.function or self.name
            raise
        except (ZeroDivisionError, OverflowError) as error:
            raise NoSolution("no finite result for these arguments", self.name) from error
        for x in result:
            if x - x != 0:
                return self._undefined(result)
        return result

    def _undefined(self, result: R) -> R:
        """Pass results of which some are not finite, where the routine allows that."""
        for x, allowed in zip(result, self._may_be_undefined, strict=True):
            if x - x != 0 and not (allowed and x != x):
                raise NoSolution("no finite result for these arguments", self.name)
        return result

    def problems(self, values: list[Any]) -> list[Problem]:
        """List every bad argument of one set of floats."""
        return [
            Problem(p.name, x, str(p.bound))
            for p, x in zip(self.parameters, values, strict=True)
            if p.bound is not None and not p.bound.allows(x) and not (not p.required and x != x)
        ]

    def evaluate(self, values: list[Any]) -> tuple[R, npt.NDArray[np.uint8]]:
        """Evaluate for arrays: results of the broadcast shape, and the status of each element.

        A result whose element failed is NaN; the status array (see
        :class:`~thrustbook.engine.errors.Status`) tells a failure apart.
        """
        numeric = {i for i, *_ in self._checks}
        arrays: list[Any] = [np.asarray(x, dtype=float) if i in numeric else x for i, x in enumerate(values)]
        shape = np.broadcast_shapes(*(arrays[i].shape for i in numeric))
        flat: list[Any] = [
            x
            if i not in numeric
            else (float(x.reshape(-1)[0]) if x.size == 1 else np.broadcast_to(x, shape).reshape(-1))
            for i, x in enumerate(arrays)
        ]
        size = math.prod(shape)
        if not any(isinstance(x, np.ndarray) for x in flat) and size:
            return self._one_element(flat, shape)
        out = [np.empty(size) for _ in self.fields]
        status = np.zeros(size, dtype=np.uint8)
        with np.errstate(all="ignore"):
            for start in range(0, size, CHUNK):
                piece = slice(start, min(start + CHUNK, size))
                self._piece(flat, piece, out, status)
        return self._pack([x.reshape(shape) for x in out]), status.reshape(shape)

    def _piece(
        self, flat: list[Any], piece: slice, out: list[npt.NDArray[Any]], status: npt.NDArray[np.uint8]
    ) -> None:
        values = [x[piece] if isinstance(x, np.ndarray) else x for x in flat]
        bad: Any = False
        for (i, *_), parameter in zip(self._checks, self._numeric_parameters(), strict=True):
            x, bound = values[i], cast(Bound, parameter.bound)
            wrong = np.logical_not(bound.allows(x))
            if not parameter.required:
                wrong = wrong & (x == x)
            bad = bad | wrong
        try:
            results = self.body(*values)
        except (EngineError, ZeroDivisionError, OverflowError):
            # A scalar argument shared by all elements makes every one of them fail.
            results = self._pack([math.nan] * len(out))
        finite: Any = 0.0
        for target, x, may_be_nan in zip(out, results, self._may_be_undefined, strict=True):
            target[piece] = x
            wrong = x - x
            finite = finite + (np.where(np.isnan(x), 0.0, wrong) if may_be_nan else wrong)
        failed = bad | np.isnan(finite)
        if np.any(failed):
            status[piece] = np.where(failed, Status.NO_SOLUTION, Status.OK)
            status[piece][np.broadcast_to(bad, failed.shape)] = Status.OUT_OF_RANGE
            for target in out:
                target[piece] = np.where(failed, np.nan, target[piece])

    def _one_element(self, flat: list[Any], shape: tuple[int, ...]) -> tuple[R, npt.NDArray[np.uint8]]:
        status = np.zeros(shape, dtype=np.uint8)
        try:
            values: tuple[float, ...] = self.scalar(flat)
        except EngineError as error:
            code = Status.OUT_OF_RANGE if isinstance(error, OutOfRange) else Status.NO_SOLUTION
            status[...] = code
            values = (math.nan,) * len(self.fields)
        return self._pack([np.full(shape, x) for x in values]), status

    def _numeric_parameters(self) -> list[Parameter]:
        return [p for p in self.parameters if p.bound is not None]

    def _pack(self, values: list[Any]) -> R:
        return self.result_type(*values)


def routine(*undefined: str, **bounds: Bound) -> Callable[[Callable[P, R]], Routine[P, R]]:
    """Guard a routine whose body returns a NamedTuple of results.

    Keyword arguments give the range of each numeric argument, in SI units; one
    that is not named may be any number. An optional quantity has the default
    ``NOT_GIVEN`` (or a number) and may be NaN; an argument whose default is a
    word is passed on unchecked. ``undefined`` names results that are NaN where an
    optional argument they need is not given; the other results then stand.
    """

    def decorate(body: Callable[P, R]) -> Routine[P, R]:
        return Routine(body, bounds, frozenset(undefined))

    return decorate
