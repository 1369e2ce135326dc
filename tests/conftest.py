"""Settings of the whole test suite."""

from __future__ import annotations

from hypothesis import settings

# The same examples on every machine and in every run: a failure can be looked into.
settings.register_profile("thrustbook", derandomize=True, deadline=None, database=None)
settings.load_profile("thrustbook")
