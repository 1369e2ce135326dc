"""The guard around the routines: ranges, missing values, arrays in pieces, failures kept apart."""

from __future__ import annotations

import math
import sys
from typing import Any, NamedTuple

import numpy as np
import pytest

from thrustbook.engine.errors import NoSolution, OutOfRange, Status
from thrustbook.engine.guard import (
    ANY,
    CHUNK,
    NON_NEGATIVE,
    POSITIVE,
    Bound,
    routine,
)
from thrustbook.engine.numeric import NOT_GIVEN, Num, default, refuse


class Pair(NamedTuple):
    """Results of the routine tried here."""

    quotient: Num
    extra: Num


@routine("extra", a=POSITIVE, b=Bound(low=0.0, high=1.0), c=NON_NEGATIVE)
def tried(a: Num, b: Num, x: Num, c: Num = NOT_GIVEN, k: Num = 2.0, word: str = "plain") -> Pair:
    """Divide; ``extra`` needs c, a negative x has no solution."""
    x = refuse(x < 0, x, "x is negative")
    factor = 10.0 if word == "tenfold" else 1.0
    return Pair(factor * x / (a + b) * default(k, 2.0), c + 0 * x)


def outcome(*values: Any) -> tuple[list[float], list[int]]:
    results, status = tried.evaluate([*values, *(p.default for p in tried.parameters[len(values) :])])
    return results.quotient.tolist(), status.tolist()


@pytest.mark.parametrize(
    ("bound", "inside", "outside"),
    [
        (ANY, [0.0, -1e308, sys.float_info.max], [math.inf, -math.inf, math.nan]),
        (POSITIVE, [1e-300, 1e308], [0.0, -0.0, -1e-300, math.inf, math.nan]),
        (NON_NEGATIVE, [0.0, -0.0, 5.0], [-5e-324, math.inf, math.nan]),
        (Bound(1.0, 2.0, True, True), [math.nextafter(1, 2), math.nextafter(2, 1)], [1.0, 2.0, math.nan]),
        (Bound(-1.0, 0.0, open_high=True), [-1.0, -1e-300], [0.0, math.nextafter(-1, -2)]),
    ],
)
def test_a_bound_holds_at_its_ends(bound: Bound, inside: list[float], outside: list[float]) -> None:
    assert all(bound.allows(x) for x in inside)
    assert not any(bound.allows(x) for x in outside)
    assert bound.allows(np.array(inside)).all()
    assert not bound.allows(np.array(outside)).any()


def test_every_bad_argument_of_a_single_call_is_reported() -> None:
    with pytest.raises(OutOfRange) as caught:
        tried(0.0, 1.5, math.inf, -1.0)
    assert [p.argument for p in caught.value.problems] == ["a", "b", "x", "c"]
    assert str(caught.value.problems[0]) == "a = 0 (allowed: above 0)"
    with pytest.raises(OutOfRange, match="x = not given"):
        tried(1.0, 0.5, math.nan)


def test_scalars_in_scalars_out() -> None:
    assert type(tried(1, np.float64(0.5), np.array(3.0)).quotient) is float
    assert tried(1.0, 0.5, 3.0, word="tenfold").quotient == 40.0
    with pytest.raises(TypeError, match="x not given"):
        tried(1.0, 0.5)  # type: ignore[call-arg]


def test_a_result_may_be_undefined_only_where_that_is_declared() -> None:
    assert math.isnan(tried(1.0, 0.5, 3.0).extra)
    assert tried(1.0, 0.5, 3.0, 7.0).extra == 7.0
    with pytest.raises(NoSolution, match="finite"):
        tried(sys.float_info.min, 0.0, 1e300)


def test_one_bad_element_spoils_only_itself() -> None:
    a = np.array([1.0, -1.0, 1.0, math.nan, 1.0])
    x = np.array([3.0, 3.0, -3.0, 3.0, math.inf])
    quotient, status = outcome(a, 0.5, x)
    assert status == [
        Status.OK,
        Status.OUT_OF_RANGE,
        Status.NO_SOLUTION,
        Status.OUT_OF_RANGE,
        Status.OUT_OF_RANGE,
    ]
    assert quotient[0] == 4.0
    assert np.isnan(quotient[1:]).all()


def test_what_is_not_given_passes_in_an_optional_column_only() -> None:
    c = np.array([math.nan, 1.0, -1.0])
    assert outcome(1.0, 0.5, 3.0, c)[1] == [Status.OK, Status.OK, Status.OUT_OF_RANGE]
    assert outcome(1.0, 0.5, 3.0, np.full(3, math.nan))[1] == [Status.OK] * 3
    assert outcome(1.0, np.array([math.nan, 0.5]), 3.0)[1] == [Status.OUT_OF_RANGE, Status.OK]


def test_a_bad_scalar_spoils_every_element() -> None:
    quotient, status = outcome(np.ones(4), 1.5, 3.0)
    assert status == [Status.OUT_OF_RANGE] * 4
    assert np.isnan(quotient).all()
    # A scalar refused by the body: no solution, but a row out of range keeps its own status.
    status = outcome(np.array([1.0, -1.0]), 0.5, -3.0)[1]
    assert status == [Status.NO_SOLUTION, Status.OUT_OF_RANGE]


@pytest.mark.parametrize("size", [0, 1, 2, CHUNK - 1, CHUNK, CHUNK + 1, 2 * CHUNK + 3])
def test_pieces_join_without_a_seam(size: int) -> None:
    rng = np.random.default_rng(3)
    a, x = rng.uniform(0.1, 5, size), rng.uniform(-0.2, 5, size)
    a[rng.random(size) < 0.1] = -1.0
    quotient, status = outcome(a, 0.5, x)
    expected = np.where(a < 0, Status.OUT_OF_RANGE, np.where(x < 0, Status.NO_SOLUTION, Status.OK))
    assert status == expected.tolist()
    good = expected == Status.OK
    assert np.array(quotient)[good].tolist() == (1.0 * x / (a + 0.5) * 2.0)[good].tolist()
    assert np.isnan(np.array(quotient)[~good]).all()


def test_arguments_broadcast() -> None:
    results = tried(np.array([[1.0], [2.0]]), 0.5, np.array([1.0, 2.0, 3.0]))
    assert results.quotient.shape == results.extra.shape == (2, 3)
    assert results.quotient[1].tolist() == [x / 2.5 * 2 for x in (1.0, 2.0, 3.0)]
    with pytest.raises(ValueError, match="shape"):
        tried(np.ones(2), 0.5, np.ones(3))


def test_results_that_overflow_only_when_added_stand() -> None:
    quotient, status = outcome(np.full(4, 0.5), 0.5, np.full(4, 8e307))
    assert status == [Status.OK] * 4
    assert quotient == [1.6e308] * 4
    assert tried(0.5, 0.5, 8e307, 1.6e308) == (1.6e308, 1.6e308)


def test_a_column_of_one_element_is_a_column() -> None:
    results = tried(np.array([1.0]), 0.5, 3.0)
    assert results.quotient.tolist() == [4.0]
    results, status = tried.evaluate([np.array([-1.0]), 0.5, 3.0, math.nan, 2.0, "plain"])
    assert (status.tolist(), np.isnan(results.quotient).tolist()) == ([Status.OUT_OF_RANGE], [True])


def test_bounds_must_name_arguments() -> None:
    with pytest.raises(TypeError, match="wrong"):
        routine(wrong=POSITIVE)(tried.body)
