"""Values as constants in formulas."""

from __future__ import annotations

from ..cells import Scalar
from ..hosts.headless.formulas import literal

_TEXT = 250
"""The longest text that a formula may hold in one piece."""


def constant(value: Scalar) -> str:
    """A value as a formula; a long text in pieces, as formulas allow them."""
    if value is None:
        return '""'
    if isinstance(value, str) and len(value) > _TEXT:
        pieces = [value[i : i + _TEXT] for i in range(0, len(value), _TEXT)]
        return "&".join(literal(piece) for piece in pieces)
    return literal(value)
