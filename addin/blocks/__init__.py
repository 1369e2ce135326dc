"""Readers of the functions that take whole tables: from ranges to the engine and back to columns."""
