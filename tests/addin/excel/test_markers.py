"""Cells of Excel to cells of the dispatcher and back, one by one."""

from __future__ import annotations

import datetime
import decimal
import math
from typing import Any

import numpy as np
import pytest

from thrustbook.addin.cells import ERROR_TEXT, CellError, ErrorKind
from thrustbook.addin.hosts.excel.markers import LONGEST_TEXT, MARKER, read_argument, write_answer
from thrustbook.addin.hosts.excel.names import cut


@pytest.mark.parametrize(
    ("given", "cell"),
    [
        (None, None),
        ([[None]], None),
        ([[""]], None),
        ([[1.5]], 1.5),
        ([[True]], True),
        ([["300 mm"]], "300 mm"),
        ([["#DIV/0!"]], CellError("DIV0")),
        ([["#NUM! (see TB_WHY)"]], CellError("NUM")),
        ([[3]], 3.0),
        ([[decimal.Decimal("12.3456")]], 12.3456),
        # The serial number of the first day of 2024 in Excel's 1900 system is 45292.
        ([[datetime.datetime(2024, 1, 1, 12)]], 45292.5),
        ([[1.0, 2.0]], [[1.0, 2.0]]),
        ([[1.0], [None]], [[1.0], [None]]),
        ([["x"], [""], ["#N/A"]], [["x"], [None], [CellError("NA")]]),
    ],
)
def test_what_excel_hands_over(given: Any, cell: Any) -> None:
    read = read_argument(given)
    assert read == cell
    assert type(read) is type(cell)


@pytest.mark.parametrize(
    ("code", "told"),
    # 0x800A0000 + 2045 and 2050, errors that came with dynamic arrays.
    [(-2146826243, "#SPILL!"), (-2146826238, "#CALC!"), (-2146826200, "2088")],
)
def test_newer_errors_never_become_numbers(code: int, told: str) -> None:
    read = read_argument([[code]])
    assert isinstance(read, CellError)
    assert read.kind == "VALUE"
    assert told in read.message


def test_something_strange_is_an_error() -> None:
    assert isinstance(read_argument([[object()]]), CellError)


@pytest.mark.parametrize(
    ("outcome", "value"),
    [
        (1.5, 1.5),
        (math.nan, MARKER["NUM"]),
        (-math.inf, MARKER["NUM"]),
        (np.float64(2.5), 2.5),
        (np.int64(2), 2.0),
        (np.bool_(True), True),
        (False, False),
        (None, MARKER["VALUE"]),
        ("", ""),
        ("x" * 40000, "x" * LONGEST_TEXT),
        (np.array([[1.0, math.nan]]), [[1.0, MARKER["NUM"]]]),
        (np.array([[CellError("NA")], ["x"]], dtype=object), [[MARKER["NA"]], ["x"]]),
    ],
)
def test_what_excel_gets(outcome: Any, value: Any) -> None:
    written = write_answer(outcome)
    assert written == value
    assert type(written) is type(value)


@pytest.mark.parametrize("kind", ERROR_TEXT)
def test_a_marker_read_again_is_the_error(kind: ErrorKind) -> None:
    assert read_argument([[write_answer(CellError(kind, "reason"))]]) == CellError(kind)


def test_wizard_texts_are_cut_at_a_word() -> None:
    text = "word " * 80
    assert len(cut(text)) <= 255
    assert cut(text).endswith("word...")
    assert cut("short") == "short"
