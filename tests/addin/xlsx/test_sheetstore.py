from __future__ import annotations

import math
import random
import subprocess
import sys

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from lxml import etree

from thrustbook.addin.cells import ERROR_TEXT, CellError, ErrorKind, Scalar
from thrustbook.addin.xlsx.sheetxml import (
    formula_cells,
    set_formulas,
    store,
    stored_values,
)

from .plainsheet import MAIN, rows_of, sheet

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


BIG = """
import re, resource, sys
from pathlib import Path
import numpy as np
from thrustbook.addin.xlsx.sheetxml import formula_cells, store
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
status = Path("/proc/self/status")
if status.exists():  # the figure of getrusage starts with that of the process that started this one
    print(re.search(r"VmHWM:\\s*(\\d+)", status.read_text())[1])
else:
    print(resource.getrusage(resource.RUSAGE_SELF).ru_maxrss)
"""


@pytest.mark.skipif(sys.platform == "win32", reason="Windows has no resource module")
def test_memory_of_a_large_block() -> None:
    run = subprocess.run([sys.executable, "-c", BIG], check=True, capture_output=True, text=True, timeout=300)
    unit = 1 if sys.platform == "darwin" else 1024
    peak = int(run.stdout) * unit
    assert peak < 500e6, f"{peak / 1e6:.0f} MB"
