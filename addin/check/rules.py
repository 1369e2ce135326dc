"""The table of all rules."""

from __future__ import annotations

from typing import Final

from . import (
    rules_inputs,
    rules_longhand,
    rules_meeting,
    rules_patterns,
    rules_physics,
    rules_structure,
    rules_totals,
    rules_units,
    rules_values,
)
from .types import Rules

RULES: Final[Rules] = (
    *rules_values.RULES,
    *rules_patterns.RULES,
    *rules_totals.RULES,
    *rules_units.RULES,
    *rules_longhand.RULES,
    *rules_inputs.RULES,
    *rules_physics.RULES,
    *rules_meeting.RULES,
    *rules_structure.RULES,
)
