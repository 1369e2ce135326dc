from __future__ import annotations

import re

import pytest
from hypothesis import given
from hypothesis import strategies as st

from thrustbook.addin.xlsx.a1 import (
    column_letters,
    column_number,
    from_a1,
    range_from_a1,
    to_a1,
)
from thrustbook.addin.xlsx.formulashift import MovableFormula


@given(st.integers(1, 1_048_576), st.integers(1, 16_384), st.booleans())
def test_reference_and_back(row: int, col: int, absolute: bool) -> None:
    text = to_a1(row, col, absolute)
    assert from_a1(text) == (row, col)
    assert text.count("$") == 2 * absolute
    assert column_number(column_letters(col)) == col


def test_references_at_the_edges() -> None:
    assert (column_letters(26), column_letters(27), column_letters(702), column_letters(703)) == (
        "Z",
        "AA",
        "ZZ",
        "AAA",
    )
    assert to_a1(1_048_576, 16_384) == "XFD1048576"
    assert range_from_a1("$C$5:a2") == (2, 1, 5, 3)
    assert range_from_a1("B7") == (7, 2, 7, 2)
    assert range_from_a1("B:D") == (1, 2, 1_048_576, 4)
    assert range_from_a1("3:4") == (3, 1, 4, 16_384)
    for text in ("", "A", "1", "A0", "XFE1", "A1048577", "A1:", "A1:B", "1A", "A1B"):
        with pytest.raises(ValueError, match="is not a"):
            range_from_a1(text) if ":" in text else from_a1(text)
    for bad in (0, 16_385):
        with pytest.raises(ValueError, match="outside the sheet"):
            column_letters(bad)


@pytest.mark.parametrize(
    ("text", "moved"),
    [
        ("A1+$A1+A$1+$A$1", "C4+$A4+C$1+$A$1"),
        ("SUM(A1:B2,C:C,$C:D,2:3,$2:3)", "SUM(C4:D5,E:E,$C:F,5:6,$2:6)"),
        ("Sheet1!A1+'It''s A1'!A1+'[2]Other A1'!$A1+[3]Sheet2!A1", None),
        ("Jan:Mar!B2+'Jan:Mar'!B2", "Jan:Mar!D5+'Jan:Mar'!D5"),
        ("Sheet1!Flow+Flow_A1+A1.x+Total1234567+XFE1+A1048577+A0", None),
        ('"A1"&A1&"say ""A1"""', '"A1"&C4&"say ""A1"""'),
        ("T[[#This Row],[A1]]+T[A1]+T[@[B2 '] C3]]+A1", "T[[#This Row],[A1]]+T[A1]+T[@[B2 '] C3]]+C4"),
        ("LOG10(A1)+ATAN2(B2,1E5)+1.5E+3*A1", "LOG10(C4)+ATAN2(D5,1E5)+1.5E+3*C4"),
        ("_xlfn.LET(_xlpm.x1,A1,_xlpm.x1+TRUE)", "_xlfn.LET(_xlpm.x1,C4,_xlpm.x1+TRUE)"),
        ("A1#+#REF!+#N/A+#DIV/0!+Sheet1!#REF!+@A1", "C4#+#REF!+#N/A+#DIV/0!+Sheet1!#REF!+@C4"),
        ("{1,2;3,4}*A1%^-2", "{1,2;3,4}*C4%^-2"),
        ("A1:INDEX(B:B,3)", "C4:INDEX(D:D,3)"),
        ("Größe!A1+Größe1", "Größe!C4+Größe1"),
        ('TB_BEND(A1, "D" ,B$1)\n+A2', 'TB_BEND(C4, "D" ,D$1)\n+C5'),
    ],
)
def test_formula_moves(text: str, moved: str | None) -> None:
    if moved is None:
        moved = re.sub(r"!(\$?)A1\b", lambda m: f"!{m[1] or ''}{'A' if m[1] else 'C'}4", text)
    assert MovableFormula(text, 2, 3).at(5, 5) == moved
    assert MovableFormula(moved, 5, 5).at(2, 3) == text


def test_formula_that_leaves_the_sheet() -> None:
    assert MovableFormula("A1+B2+$A$1", 5, 5).at(4, 5) == "#REF!+B1+$A$1"
    assert MovableFormula("Sheet1!A1+A:B+1:1", 5, 5).at(5, 4) == "Sheet1!#REF!+#REF!+1:1"
    assert MovableFormula("XFD1048576", 1, 1).at(2, 1) == "#REF!"
