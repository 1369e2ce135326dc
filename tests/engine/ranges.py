"""Ranges from which random fittings are drawn, in SI units, and the directions of their ports."""

from __future__ import annotations

import math

from hypothesis import settings
from hypothesis import strategies as st

bounded = settings(max_examples=60, deadline=None, derandomize=True)
densities = st.floats(0.5, 2000.0)
diameters = st.floats(0.02, 3.0)
pressures = st.floats(-9e4, 5e6)
flows = st.floats(-3.0, 3.0)
losses = st.floats(0.0, 5.0)
powers = st.sampled_from([math.inf, 7.0, 10.0])
"""Of the velocity profile; infinity is uniform flow."""

WEST = (-1.0, 0.0, 0.0)
EAST = (1.0, 0.0, 0.0)
