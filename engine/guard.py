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
import sys
from collections.abc import Callable
from typing import Any, Generic, NamedTuple, ParamSpec, TypeAlias, TypeVar, get_type_hints

import numpy as np
import numpy.typing as npt

from .errors import EngineError, NoSolution, OutOfRange, Problem, Status

P = ParamSpec("P")
R = TypeVar("R", bound=tuple[Any, ...])

_Check: TypeAlias = tuple[int, float, float, bool]
"""Position of an argument, smallest and largest number allowed, whether it is optional."""

CHUNK = 8192
"""Elements worked at a time: the temporaries of a routine then stay in the cache."""


class Bound(NamedTuple):
    """Range allowed for an argument, in SI units; open ends are excluded."""

    low: float = -math.inf
    high: float = math.inf
    open_low: bool = False
    open_high: bool = False

    def limits(self) -> tuple[float, float]:
        """Give the smallest and the largest number allowed; an infinite value is no quantity."""
        low, high = max(self.low, -sys.float_info.max), min(self.high, sys.float_info.max)
        return (
            _next(low, math.inf) if self.open_low else low,
            _next(high, -math.inf) if self.open_high else high,
        )

    def allows(self, x: Any) -> Any:
        """Tell where ``x`` (scalar or array) lies inside; NaN lies outside."""
        low, high = self.limits()
        return (x >= low) & (x <= high)

    def __str__(self) -> str:
        low, high = math.isfinite(self.low), math.isfinite(self.high)
        lower = f"{'above' if self.open_low else 'at least'} {self.low:g}" if low else ""
        upper = f"{'below' if self.open_high else 'at most'} {self.high:g}" if high else ""
        return " and ".join(filter(None, (lower, upper))) or "any number"


def _next(x: float, towards: float) -> float:
    """Give the next number; next to 0 the smallest normal one, which no processor mode takes for 0."""
    return math.copysign(sys.float_info.min, towards) if x == 0 else math.nextafter(x, towards)


ANY = Bound()
POSITIVE = Bound(low=0.0, open_low=True)
NON_NEGATIVE = Bound(low=0.0)
AT_LEAST_ONE = Bound(low=1.0)
HALF_TURN = Bound(low=0.0, high=math.pi)


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
        self._required = sum(p.required for p in self.parameters)
        # Plain tuples for the scalar path, which runs once a worksheet cell.
        self._checks: tuple[_Check, ...] = tuple(
            (i, *p.bound.limits(), not p.required)
            for i, p in enumerate(self.parameters)
            if p.bound is not None
        )

    def __call__(self, *args: P.args, **kwargs: P.kwargs) -> R:
        """Evaluate for floats (raises on bad input) or arrays (see ``evaluate``)."""
        values = self._bind(args, kwargs)
        for x in values:
            if type(x) is not float:
                break
        else:
            return self.scalar(values)
        for i, *_ in self._checks:
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
        if len(args) < self._required:
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
        for i, low, high, optional in self._checks:
            x = values[i]
            if not low <= x <= high and not (optional and x != x):
                raise OutOfRange(self.problems(values), self.name)
        try:
            result = self.body(*values)
        except EngineError as error:
            error.function = error.function or self.name
            raise
        except (ZeroDivisionError, OverflowError) as error:
            raise NoSolution("no finite result for these arguments", self.name) from error
        # A sum is finite only if every term is.
        return result if math.isfinite(sum(result)) else self._undefined(result)

    def _undefined(self, result: R) -> R:
        """Pass results of which some may not be finite, where the routine allows that."""
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
        flat, shape = self._flatten(values)
        size = math.prod(shape)
        arrays = [i for i, x in enumerate(flat) if isinstance(x, np.ndarray)]
        if not arrays and size:
            return self._one_element(flat, shape)
        # One block of memory: a result is a row of it, and a piece of all results one slice.
        out = np.empty((len(self.fields), size))
        status = np.zeros(size, dtype=np.uint8)
        shared = [c for c in self._checks if c[0] not in arrays]
        checks = [c for c in self._checks if c[0] in arrays]
        if all(
            low <= flat[i] <= high or (optional and flat[i] != flat[i]) for i, low, high, optional in shared
        ):
            with np.errstate(all="ignore"):
                for start in range(0, size, CHUNK):
                    piece = slice(start, min(start + CHUNK, size))
                    self._piece(flat, arrays, checks, piece, out[:, piece], status[piece])
        else:
            out[...] = math.nan
            status[...] = Status.OUT_OF_RANGE
        return self._pack([x.reshape(shape) for x in out]), status.reshape(shape)

    def _flatten(self, values: list[Any]) -> tuple[list[Any], tuple[int, ...]]:
        """Broadcast: each numeric argument becomes a float (one for all) or a flat array."""
        numeric = {c[0] for c in self._checks}
        arrays: list[Any] = [np.asarray(x, dtype=float) if i in numeric else x for i, x in enumerate(values)]
        shape = np.broadcast_shapes(*(arrays[i].shape for i in numeric))
        for i in numeric:
            x = arrays[i]
            arrays[i] = float(x.reshape(-1)[0]) if x.size == 1 else np.broadcast_to(x, shape).reshape(-1)
        return arrays, shape

    def _piece(
        self,
        flat: list[Any],
        arrays: list[int],
        checks: list[_Check],
        piece: slice,
        out: npt.NDArray[np.float64],
        status: npt.NDArray[np.uint8],
    ) -> None:
        """Work one piece. Whole columns are judged by their extremes; only a bad one is looked through."""
        values = flat.copy()
        for i in arrays:
            values[i] = flat[i][piece]
        bad: Any = False
        for i, low, high, optional in checks:
            x = values[i]
            if optional:  # the extremes pass over what is not given; NaN: nothing is given
                inside = not (np.fmin.reduce(x) < low) and not (np.fmax.reduce(x) > high)
            else:
                inside = low <= np.minimum.reduce(x) and np.maximum.reduce(x) <= high
            if not inside:
                outside = ~((x >= low) & (x <= high))
                bad = bad | (outside & (x == x) if optional else outside)
        try:
            results: tuple[Any, ...] = self.body(*values)
        except (EngineError, ZeroDivisionError, OverflowError):
            # A scalar argument shared by all elements makes every one of them fail.
            results = (math.nan,) * len(out)
        for target, x in zip(out, results, strict=True):
            target[:] = x
        # A sum is finite only if every term is.
        if bad is False and np.isfinite(np.add.reduce(out, axis=None)):
            return
        wrong = ~np.isfinite(out)
        for row, allowed in zip(range(len(out)), self._may_be_undefined, strict=True):
            if allowed:
                wrong[row] &= ~np.isnan(out[row])
        failed = bad | wrong.any(axis=0)
        out[:, failed] = math.nan
        status[failed] = Status.NO_SOLUTION
        status[np.broadcast_to(bad, failed.shape)] = Status.OUT_OF_RANGE

    def _one_element(self, flat: list[Any], shape: tuple[int, ...]) -> tuple[R, npt.NDArray[np.uint8]]:
        status = np.zeros(shape, dtype=np.uint8)
        try:
            values: tuple[float, ...] = self.scalar(flat)
        except EngineError as error:
            code = Status.OUT_OF_RANGE if isinstance(error, OutOfRange) else Status.NO_SOLUTION
            status[...] = code
            values = (math.nan,) * len(self.fields)
        return self._pack([np.full(shape, x) for x in values]), status

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
