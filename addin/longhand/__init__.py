"""Checking sheets: beside every cell of ours its working in ordinary formulas."""
