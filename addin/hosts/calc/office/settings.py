"""What the builder of the extension wrote down for the office's side."""

from __future__ import annotations

import json
import os
from typing import Any

PREFIX = "org.thrustbook.calc"
FUNCTIONS = PREFIX + ".Functions"
"""Service of the worksheet functions; the office puts it, in capitals, before their names."""
RELINK = PREFIX + ".Relink"
BATCH = PREFIX + ".Batch"


def read() -> dict[str, Any]:
    """Read settings.json: the interpreter, the release, the names of the functions."""
    path = os.path.join(os.path.dirname(os.path.abspath(__file__)), "settings.json")
    with open(path, encoding="utf-8") as file:
        return json.load(file)
