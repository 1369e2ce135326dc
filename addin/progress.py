"""How far long work is, told to whoever started it."""

from __future__ import annotations

from collections.abc import Callable

Progress = Callable[[str, int, int], None]
"""Called as ``progress(stage, done, total)``."""


def ticker(progress: Progress | None, stage: str, total: int) -> Callable[[], None] | None:
    """A function to be called at every step of a stage; it passes on every 256th.

    A formula in a circle may be computed more often than it is counted, so what is
    done is never told as more than the total.
    """
    if progress is None:
        return None
    done = 0

    def tick() -> None:
        nonlocal done
        done += 1
        if done & 255 == 0:
            progress(stage, min(done, total), total)

    return tick
