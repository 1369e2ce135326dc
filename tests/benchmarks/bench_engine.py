"""Speed of the engine, measured as ratios within one run.

    python -m tests.benchmarks.bench_engine [ROWS]

A million bends through the engine (all results, every argument checked, a status
for each) are compared with the same sums in a loop compiled by numba, which
checks nothing. Both write the same results into fresh arrays on one thread.
"""

from __future__ import annotations

import math
import sys
import time
from collections.abc import Callable
from typing import Any, Final

import numba
import numpy as np

from thrustbook.engine.constants import G
from thrustbook.engine.fittings import BendForces, bend

MOST: Final = 1.5
"""What the engine may take, as a multiple of the compiled loop."""


@numba.njit
def loop(
    rho: Any, D1: Any, p1: Any, Q: Any, theta: Any, D2: Any, K: Any, dz: Any,
    alpha1: float, alpha2: float, beta1: float, beta2: float,
) -> Any:  # fmt: skip
    """Sum each bend in one pass: what one would write by hand for this one purpose."""
    n = len(rho)
    out = np.empty((10, n))
    for i in range(n):
        A1 = math.pi / 4 * D1[i] * D1[i]
        A2 = math.pi / 4 * D2[i] * D2[i]
        V1 = Q[i] / A1
        V2 = Q[i] / A2
        p2 = (
            p1[i]
            + rho[i] / 2 * (alpha1 * V1 * V1 - alpha2 * V2 * V2 - K[i] * V1 * abs(V1))
            - rho[i] * G * dz[i]
        )
        M2 = (p2 + beta2 * rho[i] * V2 * V2) * A2
        Fx = (p1[i] + beta1 * rho[i] * V1 * V1) * A1 - M2 * math.cos(theta[i])
        Fy = -M2 * math.sin(theta[i])
        F = math.sqrt(Fx * Fx + Fy * Fy)
        out[0, i] = Fx
        out[1, i] = Fy
        out[2, i] = F
        out[3, i] = math.atan2(Fy, Fx)
        out[4, i] = -Fx
        out[5, i] = -Fy
        out[6, i] = F
        out[7, i] = V1
        out[8, i] = V2
        out[9, i] = p2
    return out


def best(*actions: Callable[[], Any], repeats: int = 15) -> list[float]:
    """Time the quickest of several runs of each action [s], taking turns.

    Both sides run on one thread, so that the processor's time is what is compared:
    other work on the machine then disturbs less.
    """
    times = [math.inf] * len(actions)
    for _ in range(repeats):
        for i, action in enumerate(actions):
            start = time.process_time()
            action()
            times[i] = min(times[i], time.process_time() - start)
    return times


def main(size: int = 1_000_000) -> None:
    """Print the figures."""
    rng = np.random.default_rng(1)
    columns = (
        rng.uniform(900, 1100, size),
        rng.uniform(0.1, 1.0, size),
        rng.uniform(0.0, 2e6, size),
        rng.uniform(-1.0, 1.0, size),
        rng.uniform(0.0, math.pi, size),
        rng.uniform(0.1, 1.0, size),
        rng.uniform(0.0, 2.0, size),
        rng.uniform(-5.0, 5.0, size),
    )

    def engine() -> BendForces:
        return bend(*columns)

    def compiled() -> Any:
        return loop(*columns, 1.0, 1.0, 1.0, 1.0)

    ours, theirs = np.array(engine()), compiled()
    scale = np.abs(theirs).max(axis=1, keepdims=True)
    agreement = float((np.abs(ours - theirs) / scale).max())
    by_hand, by_engine = best(compiled, engine)
    row = tuple(float(column[0]) for column in columns)
    calls = 20_000

    def single() -> None:
        for _ in range(calls):
            bend(*row)

    cell = best(single, repeats=3)[0] / calls
    print(f"{size} bends, all results, largest relative difference {agreement:.1e}")
    print(f"  compiled loop    {by_hand * 1e3:9.1f} ms")
    print(f"  engine           {by_engine * 1e3:9.1f} ms")
    print(f"  ratio            {by_engine / by_hand:9.2f}    (at most {MOST})")
    print(f"one bend by itself {cell * 1e6:9.2f} us")


if __name__ == "__main__":
    main(*(int(argument) for argument in sys.argv[1:2]))
