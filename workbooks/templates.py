"""Which templates there are, and where they stand."""

from __future__ import annotations

from pathlib import Path
from typing import Final

TEMPLATES: Final = {"pipe-run": "thrust down a pumped main, node by node and by load case"}


def shipped(name: str) -> Path:
    """Give the path of a shipped template."""
    return Path(__file__).parent / f"{name}.xlsx"
