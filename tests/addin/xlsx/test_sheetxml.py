from __future__ import annotations

import random
from collections.abc import Mapping

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from lxml import etree

from thrustbook.addin.cells import CellError, Scalar
from thrustbook.addin.xlsx.a1 import (
    from_a1,
    to_a1,
)
from thrustbook.addin.xlsx.refusals import Refusal
from thrustbook.addin.xlsx.sheetxml import (
    FormulaCell,
    formula_cells,
    set_formulas,
    store,
    stored_values,
)

from .plainsheet import MAIN, rows_of, sheet


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
        FormulaCell(2, 1, "", "table", (2, 1, 3, 1), 7.0),
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


def test_an_empty_text_is_a_value_and_can_be_cleared() -> None:
    xml = sheet('<row r="1"><c r="A1" t="str"><f>X()</f><v></v></c><c r="B1" t="str"><v></v></c></row>')
    cleared = store(xml, {(1, 2): None})
    assert b'<c r="B1" t="str">' not in cleared
    assert b'<c r="A1" t="str"><f>X()</f><v></v></c>' in cleared
