"""Random runs for the tests of the pipe run: any geometry, any mix of fittings."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
from hypothesis import strategies as st

from thrustbook.engine.runflow import RunStart
from thrustbook.engine.runshape import RunTable

DIAMETERS = (0.15, 0.2, 0.3, 0.45, 0.6)


def number(low: float, high: float) -> st.SearchStrategy[float]:
    return st.floats(low, high, allow_nan=False, allow_infinity=False)


@st.composite
def tables(draw: st.DrawFn, end: str = "continues") -> RunTable:
    """Draw a table of 2 to 9 nodes with reducers, offtakes, pumps and joints."""
    n = draw(st.integers(2, 9))
    rng = np.random.default_rng(draw(st.integers(0, 2**32 - 1)))
    steps = rng.uniform(-80, 80, (n, 3)) * [1, 1, 0.2]
    steps[:, 0] += np.where(np.abs(steps[:, 0]) < 1, 2, 0)
    x, y, z = np.cumsum(steps, axis=0).T
    D = rng.choice(DIAMETERS, n)
    Dj = np.where(rng.random(n) < 0.5, D * rng.uniform(1, 1.2, n), np.nan)
    taps = rng.random(n) < 0.3
    if end == "jet":
        D[-1] = rng.uniform(0.02, 0.1)
        Dj[-1] = np.nan
    direction = rng.normal(size=(3, n))
    columns: dict[str, Any] = {
        "x": x,
        "y": y,
        "z": z,
        "D": D,
        "e": rng.choice([0, 5e-5, 1e-3], n),
        "K": rng.choice([0, 0.3, 2.0], n),
        "Hp": np.where(rng.random(n) < 0.2, rng.uniform(-5, 60, n), np.nan),
        "Qo": np.where(taps, rng.uniform(-0.02, 0.04, n), np.nan),
        "ox": direction[0],
        "oy": direction[1],
        "oz": direction[2],
        "Do": np.where(taps, rng.uniform(0.08, 0.2, n), np.nan),
        "Ko": rng.choice([0, 0.6], n),
        "Dj": Dj,
        "f": np.where(rng.random(n) < 0.2, 0.02, np.nan),
        "alpha": rng.uniform(1, 1.1, n),
        "beta": rng.uniform(1, 1.05, n),
    }
    columns["Hp"][[0, -1]] = math.nan
    return RunTable(**columns)


starts = st.builds(
    RunStart,
    rho=st.just(998.2),
    mu=st.just(1.0e-3),
    Q=number(-0.3, 0.3),
    p=number(-5e4, 3e6),
    at=st.sampled_from(["start", "end"]),
)


def reversed_table(table: RunTable) -> RunTable:
    """The same pipe with its nodes listed from the other end, for runs whose legs share one K.

    Legs keep their properties: leg j becomes leg N-2-j, so leg columns move up by one.
    """
    columns = {name: np.asarray(getattr(table, name), dtype=float) for name in vars(table)}
    n = max(a.size for a in columns.values())
    legs = ("D", "e", "Dj", "f", "alpha", "beta")
    turned = {}
    for name, a in columns.items():
        a = np.broadcast_to(a, (n,))
        turned[name] = np.append(a[:-1][::-1], a[0]) if name in legs else a[::-1]
    turned["Hp"] = -turned["Hp"]
    return RunTable(**turned)
