"""Physical constants, each with its source."""

from __future__ import annotations

from typing import Final

G: Final = 9.80665
"""Standard acceleration of free fall [m/s2]: ISO 80000-3, exact by convention."""

P_ATM: Final = 101_325.0
"""Standard atmosphere [Pa]: ISO 2533, exact by convention."""
