from __future__ import annotations

import math
import random
import re
import subprocess
import sys
from collections.abc import Mapping

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from lxml import etree

from thrustbook.addin.cells import ERROR_TEXT, CellError, ErrorKind, Scalar
from thrustbook.addin.hosts.headless.a1 import (
    column_letters,
    column_number,
    from_a1,
    range_from_a1,
    to_a1,
)
from thrustbook.addin.hosts.headless.formulashift import MovableFormula
from thrustbook.addin.hosts.headless.refusals import Refusal
from thrustbook.addin.hosts.headless.sheetxml import (
    FormulaCell,
    formula_cells,
    set_formulas,
    store,
    stored_values,
)

MAIN = "http://schemas.openxmlformats.org/spreadsheetml/2006/main"


def sheet(rows: str, before: str = "") -> bytes:
    return f'<worksheet xmlns="{MAIN}">{before}<sheetData>{rows}</sheetData></worksheet>'.encode()


def rows_of(xml: bytes) -> str:
    return xml.decode().split("<sheetData>")[1].split("</sheetData>")[0]


# --- references ---------------------------------------------------------------------------


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


# --- shared formulas ----------------------------------------------------------------------


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


# --- formulas -----------------------------------------------------------------------------


def test_formula_kinds() -> None:
    xml = sheet(
        '<row r="1"><c r="A1"><f>1+1</f><v>2</v></c>'
        '<c r="B1"><f t="array" ref="B1:C2" aca="1">TB_X(A1)</f><v>1.5</v></c><c r="C1"><v>4</v></c>'
        '<c r="D1" cm="1" t="str"><f t="array" ref="D1">TB_Y("&lt;&#65;&gt;")</f><v>x</v></c></row>'
        '<row r="2"><c r="A2"><f t="dataTable" ref="A2:A3" dt2D="0" dtr="0" r1="B1"/><v>7</v></c>'
        '<c r="B2" t="e"><f ca="1">NA()</f><v>#SPILL!</v></c><c r="C2" t="b"><f/><v>1</v></c>'
        '<c r="D2"><f xml:space="preserve"> A1 +\r\n 2</f></c></row>'
    )
    assert formula_cells(xml, []) == [
        FormulaCell(1, 1, "1+1", "plain", None, 2.0),
        FormulaCell(1, 2, "TB_X(A1)", "array", (1, 2, 2, 3), 1.5),
        FormulaCell(1, 4, 'TB_Y("<A>")', "dynamic", (1, 4, 1, 4), "x"),
        FormulaCell(2, 1, "", "table", None, 7.0),
        FormulaCell(2, 2, "NA()", "plain", None, CellError("VALUE", "#SPILL!")),
        FormulaCell(2, 4, " A1 +\n 2", "plain", None, None),
    ]


def test_shared_formulas_are_expanded() -> None:
    xml = sheet(
        '<row r="1"><c r="A1"><f t="shared" si="3"/><v>1</v></c>'
        '<c r="B1"><f t="shared" ref="A1:B3" si="3">Two!$A$1+C1</f></c></row>'
        '<row r="3"><c r="A3"><f t="shared" si="3"/></c><c r="B3"><f t="shared" si="3">own text</f></c>'
        '<c r="C3"><f t="shared" ref="C3:C4" si="4">B3</f></c></row>'
        '<row r="4"><c r="C4"><f t="shared" si="4"></f></c></row>'
        '<row r="5"><c r="A5"><f t="shared" ref="A5:A6" si="3">9*B5</f></c></row>'
        '<row r="6"><c r="A6"><f si="3" t="shared"/></c></row>'
    )
    found = {to_a1(cell.row, cell.col): cell.text for cell in formula_cells(xml, [])}
    assert found == {
        "A1": "Two!$A$1+B1",
        "B1": "Two!$A$1+C1",
        "A3": "Two!$A$1+B3",
        "B3": "own text",
        "C3": "B3",
        "C4": "B4",
        "A5": "9*B5",
        "A6": "9*B6",
    }
    with pytest.raises(Refusal, match="shared text is missing"):
        formula_cells(sheet('<row r="1"><c r="A1"><f t="shared" si="0"/></c></row>'), [])


def test_places_that_are_not_written() -> None:
    xml = sheet(
        '<row><c><v>1</v></c><c t="s"><v>0</v></c><c r="E1"><f>A1</f></c><c><f>B1</f></c></row><row/>'
        '<row><c/><c><f>C1</f></c></row><row r="9"><c><v>3</v></c></row><row><c><v>4</v></c></row>'
    )
    assert stored_values(xml, ["s"]) == {(1, 1): 1.0, (1, 2): "s", (9, 1): 3.0, (10, 1): 4.0}
    assert [(c.row, c.col, c.text) for c in formula_cells(xml, ["s"])] == [
        (1, 5, "A1"),
        (1, 6, "B1"),
        (3, 2, "C1"),
    ]
    new = store(xml, {(1, 3): 7.0, (1, 6): 8.0, (3, 1): 9.0, (5, 2): True})
    assert stored_values(new, ["s"]) == {
        (1, 1): 1.0,
        (1, 2): "s",
        (1, 3): 7.0,
        (1, 6): 8.0,
        (3, 1): 9.0,
        (5, 2): True,
        (9, 1): 3.0,
        (10, 1): 4.0,
    }


# --- values -------------------------------------------------------------------------------

TEXTS = [
    "",
    " lead",
    "trail ",
    "line\nbreak\ttab",
    "\r carriage",
    "a & b < c > d ]]> \"quoted\" 'single'",
    "_x000D_ literal",
    "_x005F_x0041_",
    "__x0041__x0042_",
    "bell \x07 null \x00 end",
    "Größe Ω 漢字 😀",
    "\ufffe\uffff",
    "=SUM(A1)",
    "1.5",
    "TRUE",
]


@pytest.mark.parametrize("text", TEXTS)
@pytest.mark.parametrize("formula", [False, True])
def test_text_is_stored_and_read_back(text: str, formula: bool) -> None:
    xml = sheet('<row r="1"><c r="A1"><f>X()</f></c></row>' if formula else "")
    new = store(xml, {(1, 1): text})
    etree.fromstring(new)
    assert stored_values(new, []) == {(1, 1): text}
    assert b't="str"' in new
    assert (b'xml:space="preserve"' in new) == (text != text.strip(" \n\t"))


@given(st.floats(allow_nan=False, allow_infinity=False) | st.just(-0.0))
def test_numbers_round_trip(value: float) -> None:
    read = stored_values(store(sheet(""), {(1, 1): value}), [])[1, 1]
    assert isinstance(read, float)
    assert (read, math.copysign(1, read)) == (value, math.copysign(1, value))


@given(st.text(max_size=40))
def test_any_text_round_trips(text: str) -> None:
    new = store(sheet(""), {(1, 1): text})
    etree.fromstring(new)
    assert stored_values(new, [])[1, 1] == text


def test_how_each_type_is_written() -> None:
    values: dict[tuple[int, int], Scalar] = {
        (1, 1): 1.0,
        (1, 2): -0.0,
        (1, 3): 0.1 + 0.2,
        (1, 4): 1e22,
        (1, 5): True,
        (1, 6): False,
        (1, 7): None,
        (1, 8): math.nan,
        (1, 9): -math.inf,
        (1, 10): "x" * 32_768,
        (1, 11): np.float64(2.5),
        (1, 12): 7,
        (1, 13): np.True_,  # type: ignore[dict-item]
        (1, 14): np.str_("s"),
    }
    assert rows_of(store(sheet(""), values)) == (
        '<row r="1"><c r="A1"><v>1</v></c><c r="B1"><v>-0</v></c><c r="C1"><v>0.30000000000000004</v></c>'
        '<c r="D1"><v>1e+22</v></c><c r="E1" t="b"><v>1</v></c><c r="F1" t="b"><v>0</v></c>'
        '<c r="H1" t="e"><v>#NUM!</v></c><c r="I1" t="e"><v>#NUM!</v></c><c r="J1" t="e"><v>#VALUE!</v></c>'
        '<c r="K1"><v>2.5</v></c><c r="L1"><v>7</v></c><c r="M1" t="b"><v>1</v></c>'
        '<c r="N1" t="str"><v>s</v></c></row>'
    )
    with pytest.raises(TypeError, match="complex"):
        store(sheet(""), {(1, 1): 1j})  # type: ignore[dict-item]


@pytest.mark.parametrize("kind", ERROR_TEXT)
def test_errors(kind: ErrorKind) -> None:
    new = store(sheet('<row r="1"><c r="A1"><f>X()</f><v>1</v></c></row>'), {(1, 1): CellError(kind, "why")})
    assert rows_of(new) == f'<row r="1"><c r="A1" t="e"><f>X()</f><v>{ERROR_TEXT[kind]}</v></c></row>'
    assert stored_values(new, []) == {(1, 1): CellError(kind)}


OLD_CELLS: dict[str, tuple[str, Scalar]] = {
    "number": ('<c r="B2" s="4"><f>X()</f><v>1</v></c>', 1.0),
    "text": ('<c r="B2" s="4" t="str"><f>X()</f><v xml:space="preserve"> a</v></c>', " a"),
    "error": ('<c r="B2" t="e" s="4"><f>X()</f><v>#N/A</v></c>', CellError("NA")),
    "boolean": ('<c t="b" r="B2" s="4"><f>X()</f><v>1</v></c>', True),
    "shared": ("<c r='B2' s='4' t='s'><v>1</v></c>", "two"),
    "in line": (
        '<c r="B2" s="4" t="inlineStr"><is><r><t>in </t></r><rPh><t>no</t></rPh><r><t>line</t></r></is></c>',
        "in line",
    ),
    "none": ('<c r="B2" s="4"><f>X()</f></c>', None),
    "empty": ('<c r="B2" s="4"/>', None),
    "explicit": ('<c r="B2" s="4" t="n"><v>1.50</v></c>', 1.5),
    "spaced": ('<c  r="B2"\n s="4" >\n <f>X()</f >\n <v>1</v>\n</c >', 1.0),
    "date": ('<c r="B2" s="4" t="d"><v>2020-01-01T12:00:00Z</v></c>', 43831.5),
    "extended": ('<c r="B2" s="4"><f>X()</f><v>1</v><extLst><ext uri="u"/></extLst></c>', 1.0),
    "detailed": ('<c r="B2" s="4" t="e" vm="2"><f>X()</f><v>#VALUE!</v></c>', CellError("VALUE")),
}


@pytest.mark.parametrize("name", OLD_CELLS)
@pytest.mark.parametrize("value", [2.5, "new", True, CellError("NUM"), None])
def test_every_old_cell_takes_every_value(name: str, value: Scalar) -> None:
    text, old = OLD_CELLS[name]
    rows = f'<row r="2"><c r="A2"><v>9</v></c>{text}<c r="C2"><v>8</v></c></row>'
    xml = sheet(rows)
    assert stored_values(xml, ["one", "two"]).get((2, 2)) == old
    new = store(xml, {(2, 2): value})
    cell = etree.fromstring(new).findall(f".//{{{MAIN}}}c")[1]
    assert stored_values(new, []).get((2, 2)) == value
    assert cell.get("s") == "4"
    assert cell.get("vm") is None
    assert [node.tag.partition("}")[2] for node in cell] == (
        ["f"] * ("<f>" in text) + ["v"] * (value is not None) + ["extLst"] * (name == "extended")
    )
    before, after = rows_of(new).split("<c ")[1], rows_of(new).split("<c ")[3]
    assert (before, after) == ('r="A2"><v>9</v></c>', 'r="C2"><v>8</v></c></row>')


@pytest.mark.parametrize(
    "name", [name for name in OLD_CELLS if name not in ("shared", "in line", "detailed", "date")]
)
def test_cell_stays_when_the_value_is_there_already(name: str) -> None:
    text, old = OLD_CELLS[name]
    xml = sheet(f'<row r="2">{text}</row>')
    assert store(xml, {(2, 2): old}) == xml


def test_numbers_written_another_way_stay() -> None:
    xml = sheet('<row r="1"><c r="A1"><v>1.50</v></c><c r="B1"><v>15E-1</v></c><c r="C1"><v>0</v></c></row>')
    same: dict[tuple[int, int], Scalar] = {(1, 1): 1.5, (1, 2): 1.5, (1, 3): 0.0}
    assert store(xml, same) == xml
    assert b"<v>-0</v>" in store(xml, {**same, (1, 3): -0.0})


# --- places -------------------------------------------------------------------------------


def test_rows_and_cells_are_inserted_in_order_with_style_dimension_and_spans() -> None:
    xml = sheet(
        '<row r="3" spans="2:3"><c r="B3"><v>1</v></c><c r="C3"><v>2</v></c></row>\n'
        '<row r="5" s="7" customFormat="1"/><row r="6" s="7"><c r="D6"/></row>\n',
        '<dimension ref="B3:C6"/><cols><col min="1" max="1" style="2" width="9"/>'
        '<col min="4" max="9" width="8"/>'
        '<col min="10" max="16384" style="0"/></cols>',
    )
    values: dict[tuple[int, int], Scalar] = {(r, c): r * 10.0 + c for r in (1, 3, 4, 5, 6, 8) for c in (1, 5)}
    new = store(xml, {**values, (7, 7): None, (3, 9): None})
    assert new.decode().count('<dimension ref="A1:E8"/>') == 1
    assert rows_of(new) == (
        '<row r="1"><c r="A1" s="2"><v>11</v></c><c r="E1"><v>15</v></c></row>'
        '<row r="3" spans="1:5"><c r="A3" s="2"><v>31</v></c><c r="B3"><v>1</v></c><c r="C3"><v>2</v></c>'
        '<c r="E3"><v>35</v></c></row>\n'
        '<row r="4"><c r="A4" s="2"><v>41</v></c><c r="E4"><v>45</v></c></row>'
        '<row r="5" s="7" customFormat="1"><c r="A5" s="7"><v>51</v></c><c r="E5" s="7"><v>55</v></c></row>'
        '<row r="6" s="7"><c r="A6" s="2"><v>61</v></c><c r="D6"/><c r="E6"><v>65</v></c></row>'
        '<row r="8"><c r="A8" s="2"><v>81</v></c><c r="E8"><v>85</v></c></row>\n'
    )


def test_array_spills_over_cells_that_are_there_and_that_are_not() -> None:
    xml = sheet(
        '<row r="2"><c r="B2" cm="1"><f t="array" ref="B2:B3">TB_RUN(A1)</f><v>0</v></c>'
        '<c r="D2"><v>1</v></c></row><row r="3"><c r="B3" s="1"><v>5</v></c></row>'
    )
    grid = np.array([["Node", 1.5], [CellError("NA"), None], [True, "x"]], dtype=object)
    new = store(xml, {}, [(2, 2, grid)], {(2, 2): (2, 2, 4, 3)})
    assert rows_of(new) == (
        '<row r="2"><c r="B2" cm="1" t="str"><f t="array" ref="B2:C4">TB_RUN(A1)</f><v>Node</v></c>'
        '<c r="C2"><v>1.5</v></c><c r="D2"><v>1</v></c></row>'
        '<row r="3"><c r="B3" s="1" t="e"><v>#N/A</v></c></row>'
        '<row r="4"><c r="B4" t="b"><v>1</v></c><c r="C4" t="str"><v>x</v></c></row>'
    )
    assert formula_cells(new, [])[0].ref == (2, 2, 4, 3)
    only = store(xml, {}, array_refs={(2, 2): (2, 2, 2, 2)})
    assert only == xml.replace(b'ref="B2:B3"', b'ref="B2"')
    with pytest.raises(ValueError, match="no array formula"):
        store(xml, {(3, 2): 1.0}, array_refs={(3, 2): (3, 2, 4, 2)})
    with pytest.raises(ValueError, match="no array formula"):
        store(xml, {}, array_refs={(9, 9): (9, 9, 9, 9)})
    with pytest.raises(ValueError, match="two dimensions"):
        store(xml, {}, [(1, 1, np.array([1.0], dtype=object))])


@pytest.mark.parametrize("rows", ["<x:sheetData/>", "<x:sheetData ></x:sheetData>", "<x:sheetData />"])
def test_prefixed_and_empty_sheet(rows: str) -> None:
    xml = f'<x:worksheet xmlns:x="{MAIN}"><x:dimension ref="A1"/>{rows}</x:worksheet>'.encode()
    new = store(xml, {(2, 2): " a"}, [(3, 1, np.array([[1.0]], dtype=object))])
    etree.fromstring(new)
    assert stored_values(new, []) == {(2, 2): " a", (3, 1): 1.0}
    assert b'<x:dimension ref="A1:B3"/>' in new
    assert store(new, {(2, 2): "b"}).count(b'<x:c r="B2" t="str"><x:v>b</x:v></x:c>') == 1
    with_formula = set_formulas(new, {(2, 2): "A1&B1"})
    assert b'<x:c r="B2"><x:f>A1&amp;B1</x:f></x:c>' in with_formula
    assert [(c.row, c.col, c.text) for c in formula_cells(with_formula, [])] == [(2, 2, "A1&B1")]


def test_nothing_to_store_changes_nothing() -> None:
    xml = sheet('<row r="1"><c r="A1"><v>1</v></c></row>', '<dimension ref="A1"/>')
    assert store(xml, {}) == xml
    assert store(xml, {(4, 4): None}) == xml
    assert store(xml, {}, [(1, 1, np.empty((0, 3), dtype=object))]) == xml
    assert set_formulas(xml, {}) == xml


def test_large_block_and_single_cells_together() -> None:
    """A large block takes other paths than single cells; both must write the same."""
    noise = random.Random(3)
    pool: list[Scalar] = [1.0, -2.5, "t", " s ", True, False, None, CellError("NA"), 3.25, 1e300]
    grid = np.empty((500, 12), dtype=object)
    for place in np.ndindex(grid.shape):
        grid[place] = noise.choice(pool)
    old = store(
        sheet('<row r="40" spans="1:1"><c r="C40"><f>A1</f></c></row><row r="2000"/>'),
        {(r, c): noise.choice(pool) for r in range(1, 600, 2) for c in range(1, 20)},
    )
    single: dict[tuple[int, int], Scalar] = {(r + 11, c + 3): value for (r, c), value in np.ndenumerate(grid)}
    extra: dict[tuple[int, int], Scalar] = {(20, 4): "over", (20, 30): 1.0, (1500, 1): 2.0}
    by_block = store(old, extra, [(11, 3, grid)])
    assert by_block == store(old, {**single, **extra})
    assert store(by_block, extra, [(11, 3, grid)]) == by_block


# --- new formulas -------------------------------------------------------------------------


def test_set_formulas_writes_out_the_groups_it_touches() -> None:
    xml = sheet(
        '<row r="1"><c r="A1" s="1" t="str">'
        '<f t="shared" ref="A1:A3" si="0" ca="1">B1&amp;"x"</f><v>k</v></c>'
        '<c r="C1"><f t="shared" ref="C1:C2" si="1">B1</f><v>1</v></c></row>'
        '<row r="2"><c r="A2"><f t="shared" si="0"/><v>5</v></c><c r="C2"><f t="shared" si="1"/></c></row>'
        '<row r="3"><c r="A3"><f t="shared" si="0"/></c>'
        '<c r="B3" cm="1"><f t="array" ref="B3:B9">TB_Y()</f><v>1</v></c><c r="C3" t="s"><v>0</v></c></row>'
    )
    new = set_formulas(xml, {(2, 1): "1<2", (3, 2): "TB_Z()", (3, 3): "A1", (5, 2): "B1"})
    assert rows_of(new) == (
        '<row r="1"><c r="A1" s="1" t="str"><f ca="1">B1&amp;"x"</f><v>k</v></c>'
        '<c r="C1"><f t="shared" ref="C1:C2" si="1">B1</f><v>1</v></c></row>'
        '<row r="2"><c r="A2"><f>1&lt;2</f></c><c r="C2"><f t="shared" si="1"/></c></row>'
        '<row r="3"><c r="A3"><f>B3&amp;"x"</f></c>'
        '<c r="B3" cm="1"><f t="array" ref="B3:B9">TB_Z()</f></c><c r="C3"><f>A1</f></c></row>'
        '<row r="5"><c r="B5"><f>B1</f></c></row>'
    )
    for bad in ("", "=A1"):
        with pytest.raises(ValueError, match="equals sign"):
            set_formulas(xml, {(1, 1): bad})


# --- any sheet ----------------------------------------------------------------------------


def rows_by_tree(xml: bytes) -> list[etree._Element]:
    data = etree.fromstring(xml).find(f"{{{MAIN}}}sheetData")
    assert data is not None
    return list(data)


def by_tree(xml: bytes) -> dict[tuple[int, int], tuple[str | None, str | None, str | None, str | None]]:
    """Style, type, formula and value text of every cell, read by an XML library."""
    found = {}
    row_number = 0
    for row in rows_by_tree(xml):
        row_number = int(row.get("r", row_number + 1))
        col = 0
        for cell in row:
            place = cell.get("r")
            col = from_a1(place)[1] if place else col + 1
            texts = [cell.findtext(f"{{{MAIN}}}{name}") for name in ("f", "v")]
            found[row_number, col] = (cell.get("s"), cell.get("t"), texts[0], texts[1])
    return found


@st.composite
def sheets(draw: st.DrawFn) -> bytes:
    """Sheets as different writers would put them down."""
    p = draw(st.sampled_from(["", "x:"]))
    gap = draw(st.sampled_from(["", "\n", " \r\n\t"]))
    out = []
    before = 0
    for number in sorted(draw(st.sets(st.integers(1, 9), max_size=6))):
        cells = []
        col_before = 0
        for col in sorted(draw(st.sets(st.integers(1, 9), max_size=6))):
            implied = col == col_before + 1 and draw(st.booleans())
            place = "" if implied else f' r="{to_a1(number, col)}"'
            style = draw(st.sampled_from(["", ' s="3"']))
            kind, value = draw(
                st.sampled_from(
                    [
                        ("", "1.5"),
                        ("", None),
                        ("str", "a &lt; b"),
                        ("b", "1"),
                        ("e", "#N/A"),
                        ("n", "2"),
                        ("s", "0"),
                    ]
                )
            )
            formula = draw(st.sampled_from(["", "", f"<{p}f>A1&gt;2</{p}f>", f'<{p}f ca="1">B2</{p}f>']))
            typed = f' t="{kind}"' if kind else ""
            inner = formula + gap * bool(formula) + ("" if value is None else f"<{p}v>{value}</{p}v>")
            attrs = draw(st.permutations([place, style, typed]))
            tail = "/>" if not inner else f">{inner}</{p}c>"
            cells.append(f"<{p}c{''.join(attrs)}{tail}")
            col_before = col
        place = "" if number == before + 1 and draw(st.booleans()) else f' r="{number}"'
        body = gap.join(cells)
        out.append(f"<{p}row{place}/>" if not body else f"<{p}row{place}>{gap}{body}{gap}</{p}row>")
        before = number
    space = f"xmlns:{p[:-1]}" if p else "xmlns"
    body = gap.join(out)
    return (
        f'<?xml version="1.0"?><{p}worksheet {space}="{MAIN}"><{p}dimension ref="A1"/>'
        f"<{p}sheetData>{gap}{body}{gap}</{p}sheetData><!-- end --></{p}worksheet>"
    ).encode()


SCALARS = st.sampled_from(
    [None, 0.0, 1.5, -7.25, "word", "a < b", True, False, CellError("NA"), CellError("REF")]
)


@settings(max_examples=300, deadline=None)
@given(sheets(), st.dictionaries(st.tuples(st.integers(1, 11), st.integers(1, 11)), SCALARS, max_size=12))
def test_store_agrees_with_an_xml_library(xml: bytes, values: Mapping[tuple[int, int], Scalar]) -> None:
    old, new = by_tree(xml), store(xml, values)
    after = by_tree(new)
    read = stored_values(new, ["shared"])
    for place, value in values.items():
        assert read.get(place) == value
        assert type(read.get(place)) is type(value)
        if place in old:
            assert after[place][0] == old[place][0]
            assert after[place][2] == old[place][2]
    for place in set(old) | set(after):
        if place not in values:
            assert after[place] == old[place]
    assert list(after) == sorted(after)
    assert store(new, values) == new
    again = store(new, {place: read.get(place) for place in values})
    assert again == new


@settings(max_examples=200, deadline=None)
@given(
    sheets(), st.dictionaries(st.tuples(st.integers(1, 11), st.integers(1, 11)), st.just("A1&B1"), max_size=8)
)
def test_set_formulas_agrees_with_an_xml_library(xml: bytes, formulas: Mapping[tuple[int, int], str]) -> None:
    old, after = by_tree(xml), by_tree(set_formulas(xml, formulas))
    for place in set(old) | set(after):
        if place in formulas:
            assert after[place][1:] == (None, "A1&B1", None)
        else:
            assert after[place] == old[place]


# --- refusals -----------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("xml", "words"),
    [
        (sheet('<row r="1"><!-- c --><c r="A1"/></row>'), "comments"),
        (sheet('<row r="1"><c r="A1" t="str"><v><![CDATA[x]]></v></c></row>'), "CDATA"),
        (sheet('<row r="2"/><row r="1"><c r="A1"/></row>'), "row 1 after row 2"),
        (sheet('<row r="1"/><row r="1"/>'), "row 1 after row 1"),
        (sheet('<row r="1"><c r="B1"/><c r="A1"/></row>'), "out of order"),
        (sheet('<row r="1"><c r="A2"/></row>'), "cell A2 in row 1"),
        (sheet('<row r="1"><c r="A1"><v>1</v><f>X()</f></c></row>'), "order"),
        (sheet('<row r="1"><c r="XFE1"/></row>'), "column"),
        (sheet('<row r="1"><d/></row>'), "something other than a cell"),
        (sheet("<thing/>"), "something other than a row"),
        (sheet('<row r="0"/>'), "row number 0"),
        (sheet("").replace(b"</sheetData></worksheet>", b'<row r="1">'), "breaks off"),
        (sheet("").replace(MAIN.encode(), b"http://purl.oclc.org/ooxml/spreadsheetml/main"), "Strict"),
        (sheet("").replace(MAIN.encode(), b"urn:other"), "not a worksheet"),
        (f'<chartsheet xmlns="{MAIN}"/>'.encode(), "not a worksheet"),
        (f'<worksheet xmlns="{MAIN}"/>'.encode(), "no cell data"),
        (b'<!DOCTYPE a [<!ENTITY b "c">]>' + sheet(""), "document type"),
        (sheet("").decode().encode("utf-16"), "UTF-8"),
        (b'<?xml version="1.0" encoding="ISO-8859-1"?>' + sheet(""), "UTF-8"),
        (b"", "no cell data"),
    ],
)
def test_refuses_sheets_that_could_be_damaged(xml: bytes, words: str) -> None:
    with pytest.raises(Refusal, match=words):
        store(xml, {(1, 1): 2.0, (5, 5): 1.0})


@pytest.mark.parametrize(
    "cell",
    [
        '<c r="A1" t="s"><v>3</v></c>',
        '<c r="A1" t="s"><v>-1</v></c>',
        '<c r="A1"><v>one</v></c>',
        '<c r="A1" t="q"><v>1</v></c>',
        '<c r="A1" t="str"><v>&unknown;</v></c>',
        '<c r="A1" t="d"><v>yesterday</v></c>',
    ],
)
def test_refuses_unreadable_values(cell: str) -> None:
    with pytest.raises(Refusal):
        stored_values(sheet(f'<row r="1">{cell}</row>'), ["only"])


def test_random_damage_is_refused_or_harmless() -> None:
    noise = random.Random(17)
    whole = store(
        sheet(
            '<row r="2"><c r="B2"><f t="shared" ref="B2:B3" si="0">A2</f></c></row><row r="3"><c r="B3">'
            '<f t="shared" si="0"/></c></row>',
            '<cols><col min="1" max="2" style="1"/></cols>',
        ),
        {(r, c): v for r, v in ((1, 1.0), (2, "a&b"), (4, True)) for c in (1, 3, 4)},
    )
    refused = 0
    for _ in range(4000):
        raw = bytearray(whole)
        for _ in range(noise.randint(1, 3)):
            at = noise.randrange(len(raw))
            raw[at : at + noise.randint(0, 3)] = noise.choice(
                [b"", b"<", b">", b'"', b"/", b"\xff", b"&", b"9", b"c"]
            )
        for action in (
            lambda xml: formula_cells(xml, []),
            lambda xml: stored_values(xml, []),
            lambda xml: store(xml, {(2, 2): 1.0, (3, 3): "x", (9, 1): 4.0}),
            lambda xml: set_formulas(xml, {(3, 2): "A1"}),
        ):
            try:
                action(bytes(raw))
            except Refusal:
                refused += 1
    assert refused > 1000


# --- size ---------------------------------------------------------------------------------

BIG = """
import resource, sys
import numpy as np
from thrustbook.addin.hosts.headless.sheetxml import formula_cells, store
rows, cols = 100_000, 12
head = '<worksheet xmlns="http://schemas.openxmlformats.org/spreadsheetml/2006/main"><sheetData>'
cell = '<row r="2"><c r="A2" cm="1"><f t="array" ref="A2">TB_X()</f></c></row>'
xml = (head + cell + "</sheetData></worksheet>").encode()
grid = np.random.default_rng(1).normal(size=(rows, cols)).astype(object)
for factor in (1.0, 2.0):
    xml = store(xml, {}, [(2, 1, grid * factor)], {(2, 1): (2, 1, rows + 1, cols)})
assert xml.count(b"<v>") == rows * cols and xml.count(b"<row ") == rows
assert formula_cells(xml, [])[0].ref == (2, 1, rows + 1, cols)
last = f'<c r="L{rows + 1}"><v>{grid[-1, -1] * 2.0!r}</v></c></row></sheetData>'
assert last.encode() in xml
print(resource.getrusage(resource.RUSAGE_SELF).ru_maxrss)
"""


@pytest.mark.skipif(sys.platform == "win32", reason="Windows has no resource module")
def test_memory_of_a_large_block() -> None:
    run = subprocess.run([sys.executable, "-c", BIG], check=True, capture_output=True, text=True, timeout=300)
    unit = 1 if sys.platform == "darwin" else 1024
    peak = int(run.stdout) * unit
    assert peak < 500e6, f"{peak / 1e6:.0f} MB"
