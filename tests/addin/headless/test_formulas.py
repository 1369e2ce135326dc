"""Formulas taken apart, rewritten, and the cells they refer to."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from thrustbook.addin.hosts.headless.dependency import Graph, Reference
from thrustbook.addin.hosts.headless.formulas import (
    OMITTED,
    calls,
    functions,
    join,
    one_cell,
    rewrite,
    take_apart,
)
from thrustbook.addin.hosts.headless.tablerefs import Tables
from thrustbook.addin.xlsx.package import TableRef

GAP = f'"{OMITTED}"'


@pytest.mark.parametrize(
    ("text", "rewritten"),
    [
        ("[1]!TB_X(A1)", "TB_X(A1)"),
        ("'C:\\a b\\thrust book.xlam'!TB_X(A1)", "TB_X(A1)"),
        ("'C:\\it''s\\x.xlam'!TB_X(A1)", "TB_X(A1)"),
        ("thrustbook.xlam!tb_x(A1)", "TB_X(A1)"),
        ("_xll.TB_X(A1)", "TB_X(A1)"),
        ("_xlfn.TB_X(A1)", "TB_X(A1)"),
        ("org.thrustbook.addin.TB_X(A1)", "TB_X(A1)"),
        ("TB_X(A1,,3)", f"TB_X(A1,{GAP},3)"),
        ("TB_X(,1)", f"TB_X({GAP},1)"),
        ("TB_X(1,)", f"TB_X(1,{GAP})"),
        ("TB_X(,)", f"TB_X({GAP},{GAP})"),
        ("TB_X( , 2 , )", f"TB_X( {GAP}, 2 , {GAP})"),
        ("TB_X()", "TB_X()"),
        ("TB_X( )", "TB_X( )"),
        ("IF(A1,,2)", "IF(A1,,2)"),
        ("TB_X(IF(A1,,2),,1)", f"TB_X(IF(A1,,2),{GAP},1)"),
        ("TB_X({1,2;3,4},,(A1))", f"TB_X({{1,2;3,4}},{GAP},(A1))"),
        ('TB_X(",,","a""b,",)', f'TB_X(",,","a""b,",{GAP})'),
        ("TB_X('a,b'!A1,,1)", f"TB_X('a,b'!A1,{GAP},1)"),
        ("SUM(TB_X(TB_Y(,1),))", f"SUM(TB_X(TB_Y({GAP},1),{GAP}))"),
        ("_xlfn.SINGLE(A1:A3)", "@(A1:A3)"),
    ],
)
def test_rewriting(text: str, rewritten: str) -> None:
    assert rewrite(take_apart(text)).text == rewritten


def test_a_text_that_looks_like_a_call_is_no_call() -> None:
    parts = take_apart('"TB_X(1)"&TB_Y(2)&Sheet_TB_Z')
    assert calls(parts) == ["TB_Y"]
    assert functions(take_apart("_xlfn._xlws.SORT(A1:A3)+SUM(1)")) == {"SORT", "SUM"}


@pytest.mark.parametrize(
    ("text", "whole"),
    [
        ("TB_X(A1,TB_Y(2))", ("TB_X", "A1,TB_Y(2)")),
        ("(TB_X(A1))", ("TB_X", "A1")),
        ("TB_X(1)*2", None),
        ("-TB_X(1)", None),
        ("TB_X(1)+TB_Y(2)", None),
        ("SUM(TB_X(1))", None),
    ],
)
def test_a_formula_that_is_one_call(text: str, whole: tuple[str, str] | None) -> None:
    assert rewrite(take_apart(text)).whole == whole


def test_a_plain_formula_takes_its_own_row_of_a_range_outside_functions() -> None:
    assert join(one_cell(take_apart("A1:A9*2+SUM(B1:B9)"))) == "@A1:A9*2+SUM(B1:B9)"
    assert join(one_cell(take_apart("A1+B2"))) == "A1+B2"


@given(st.lists(st.sampled_from(["1", '"a,b"', "A1", "", " ", "SUM(1,2)", "{1,2}"]), min_size=2, max_size=6))
def test_every_gap_and_nothing_else_is_marked(arguments: list[str]) -> None:
    text = rewrite(take_apart(f"TB_X({','.join(arguments)})")).text
    assert text.count(OMITTED) == sum(not argument.strip() for argument in arguments)


TABLES = Tables(
    [
        TableRef("Pipes", "My Sheet", "B2:D6", ("D [mm]", "Flow", "It's"), 1, 1),
        TableRef("Bare", "S", "A1:B3", ("x", "y"), 0, 0),
    ]
)
HERE = "'My Sheet'!"


@pytest.mark.parametrize(
    ("text", "plain"),
    [
        ("Pipes[Flow]", f"{HERE}$C$3:$C$5"),
        ("SUM(pipes[FLOW])", f"SUM({HERE}$C$3:$C$5)"),
        ("Pipes[]", f"{HERE}$B$3:$D$5"),
        ("Pipes[#All]", f"{HERE}$B$2:$D$6"),
        ("Pipes[#Headers]", f"{HERE}$B$2:$D$2"),
        ("Pipes[#Totals]", f"{HERE}$B$6:$D$6"),
        ("Pipes[[#Headers],[#Data],[Flow]]", f"{HERE}$C$2:$C$5"),
        ("Pipes[[#This Row],[Flow]]*2", f"{HERE}$C$4*2"),
        ("Pipes[@Flow]", f"{HERE}$C$4"),
        ("[@Flow]", f"{HERE}$C$4"),
        ("Pipes[@]", f"{HERE}$B$4:$D$4"),
        ("Pipes[[D '[mm']]:[Flow]]", f"{HERE}$B$3:$C$5"),
        ("Pipes[D '[mm']]", f"{HERE}$B$3:$B$5"),
        ("Pipes[It''s]", f"{HERE}$D$3:$D$5"),
        ("Pipes[Nope]", "#REF!"),
        ("Nope[x]", "#REF!"),
        ("Bare[#Headers]", "#REF!"),
        ("Bare[y]", "'S'!$B$1:$B$3"),
        ('"Pipes[Flow]"', '"Pipes[Flow]"'),
        ("[1]Sheet1!A1", "[1]Sheet1!A1"),
        ("'[1]Pipes[x]'!A1", "'[1]Pipes[x]'!A1"),
        ("[1]!TB_X(Pipes[Flow])", f"[1]!TB_X({HERE}$C$3:$C$5)"),
    ],
)
def test_table_references_as_ranges(text: str, plain: str) -> None:
    assert TABLES.written_out(text, "My Sheet", 4, 3) == plain


def test_this_row_outside_the_rows_of_the_table_is_an_error() -> None:
    assert TABLES.written_out("Pipes[@Flow]", "S", 9, 1) == "#VALUE!"
    assert TABLES.written_out("Pipes[@Flow]", "Another sheet", 3, 9) == f"{HERE}$C$3"


cells = st.tuples(st.integers(1, 12), st.integers(1, 5))


@given(
    st.lists(st.tuples(cells, st.lists(st.tuples(cells, st.integers(0, 4), st.integers(0, 3)), max_size=3)),
             min_size=1, max_size=14, unique_by=lambda node: node[0]),
    st.sets(st.integers(0, 13), max_size=3),
)  # fmt: skip
def test_dependents_are_those_of_a_plain_search(nodes: list, seeds: set[int]) -> None:
    """Against the obvious way: compare every formula with every range until nothing changes."""
    seeds = {seed for seed in seeds if seed < len(nodes)}
    places = [Reference(0, r, c, r, c) for (r, c), _ in nodes]
    references = [[Reference(0, r, c, r + h, c + w) for (r, c), h, w in refs] for _, refs in nodes]
    expected = set(seeds)
    while True:
        more = {
            i
            for i, refs in enumerate(references)
            for ref in refs
            for j in expected
            if ref.r1 <= places[j].r1 <= ref.r2 and ref.c1 <= places[j].c1 <= ref.c2
        }
        if more <= expected:
            break
        expected |= more
    assert Graph(places, references).dependents(seeds) == expected


def test_dependents_of_an_area_and_of_whole_columns() -> None:
    places = [
        Reference(0, 1, 1, 50, 4),
        Reference(0, 1, 9, 1, 9),
        Reference(1, 1, 1, 1, 1),
        Reference(0, 7, 7, 7, 7),
    ]
    references = [
        [],
        [Reference(0, 40, 3, 40, 3)],
        [Reference(0, 1, 9, 1_048_576, 9)],
        [Reference(1, 5, 1, 9, 1)],
    ]
    graph = Graph(places, references)
    assert graph.dependents([0]) == {0, 1, 2}
    assert graph.readers(places[0]) == {1}
