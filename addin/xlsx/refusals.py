"""The one exception over workbook files that a user is meant to read."""

from __future__ import annotations


class Refusal(Exception):
    """A workbook is left alone; the text says what, why and what the user can do."""
