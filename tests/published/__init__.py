"""Check values from outside the project, kept as data.

Each ``[[check]]`` of a file gives topic, source, status ("seen" in the source or
in a reference library, "from memory", "derived" from a stated formula), inputs,
expected and tolerance (relative).
"""

from __future__ import annotations

import tomllib
from pathlib import Path
from typing import Any


def load(name: str) -> list[dict[str, Any]]:
    """Read the checks of ``tests/published/<name>.toml``."""
    with (Path(__file__).parent / f"{name}.toml").open("rb") as file:
        checks: list[dict[str, Any]] = tomllib.load(file)["check"]
    for check in checks:
        missing = {"topic", "source", "status", "inputs", "expected", "tolerance"} - check.keys()
        if missing:
            raise ValueError(f"{name}: {check.get('topic')!r} lacks {sorted(missing)}")
        if check["status"] not in ("seen", "from memory", "derived"):
            raise ValueError(f"{name}: {check['topic']!r} has the status {check['status']!r}")
    return checks
