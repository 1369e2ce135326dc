"""Tests, a mirror of the packages they test."""
