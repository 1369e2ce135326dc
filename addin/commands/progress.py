"""Progress of long work, on the terminal only: what is piped stays plain."""

from __future__ import annotations

import sys
import time
from types import TracebackType

QUIET = 1.0
"""Seconds before anything is shown: short work needs no progress."""


class ProgressLine:
    """Called as ``progress(stage, done, total)``; rewrites one line on a terminal."""

    def __init__(self) -> None:
        self._started = self._shown = time.monotonic()
        self._written = 0

    def __enter__(self) -> ProgressLine:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        if self._written:
            print("\r" + " " * self._written + "\r", end="", file=sys.stderr, flush=True)

    def __call__(self, stage: str, done: int, total: int) -> None:
        """Show how far the work is."""
        now = time.monotonic()
        if not sys.stderr.isatty() or now - self._started < QUIET or now - self._shown < 0.1:
            return
        self._shown = now
        text = f"{stage} {done} of {total}" if total > 1 else f"{stage} ..."
        print("\r" + text.ljust(self._written), end="", file=sys.stderr, flush=True)
        self._written = max(self._written, len(text))
