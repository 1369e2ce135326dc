"""Formulas and values of one worksheet part, read and changed byte by byte."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import NamedTuple

from ...cells import Grid, Scalar


class FormulaCell(NamedTuple):
    """One cell that holds a formula."""

    row: int
    col: int
    text: str
    kind: str
    ref: tuple[int, int, int, int] | None
    value: Scalar


def formula_cells(xml: bytes, shared_strings: Sequence[str]) -> list[FormulaCell]:
    """All formulas of a sheet."""
    raise NotImplementedError


def stored_values(xml: bytes, shared_strings: Sequence[str]) -> dict[tuple[int, int], Scalar]:
    """All values of a sheet."""
    raise NotImplementedError


def store(
    xml: bytes,
    values: Mapping[tuple[int, int], Scalar],
    blocks: Sequence[tuple[int, int, Grid]] = (),
    array_refs: Mapping[tuple[int, int], tuple[int, int, int, int]] = {},
) -> bytes:
    """The sheet with new values."""
    raise NotImplementedError


def set_formulas(xml: bytes, formulas: Mapping[tuple[int, int], str]) -> bytes:
    """The sheet with new formula texts."""
    raise NotImplementedError
