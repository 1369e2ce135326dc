"""Ranges and arrays where a single value is meant: the right values, or none."""

from __future__ import annotations

import datetime
from pathlib import Path
from typing import Any, Final

import pytest
from openpyxl.utils import get_column_letter
from openpyxl.utils.datetime import to_excel

from tests.addin.longhand.office import recalculated
from thrustbook.addin.hosts.headless.contexts import Operand, in_context
from thrustbook.addin.hosts.headless.formulas import Kind, Unreadable, join, take_apart
from thrustbook.addin.hosts.headless.singlevalues import single_values

from .arrays import FORMULAS, ROWS, SAMPLES, as_saved, data, of_row, over_ranges, places
from .books import evaluate, make, values, with_values

CASES: Final = [
    (sample, only)
    for sample in SAMPLES
    for only in ([None, *range(len(places(sample)))] if len(places(sample)) > 1 else [None])
]
# Over ranges these are set aside.
SET_ASIDE: Final = frozenset(("AGGREGATE", "INDIRECT", "N", "OFFSET", "SUBTOTAL", "T", "TEXTJOIN"))
# These are asked about a reference as such, or not computed over ranges: they are left as they are.
LEFT: Final = frozenset(("CELL", "FORMULATEXT", "HYPERLINK", "TYPE"))
# By chance; and Calc has the numbers 1 and 0 for truth in an array.
NOT_COMPARED: Final = SET_ASIDE | {"HYPERLINK", "ISLOGICAL", "RANDBETWEEN"}


def name(sample: str) -> str:
    return sample.partition("(")[0]


def row_of(number: int) -> int:
    """Where the results of a case stand, one below the other."""
    return 20 + number * ROWS


def plain(value: Any) -> Any:
    """A value as it is stored: days and times as numbers, nothing as the empty text."""
    if isinstance(value, datetime.datetime | datetime.time | datetime.timedelta):
        return to_excel(value)
    return "" if value is None else value


def same(one: Any, other: Any) -> bool:
    one, other = plain(one), plain(other)
    if isinstance(one, int | float) and isinstance(other, int | float):  # in arrays Calc stores TRUE as 1
        return abs(one - other) <= 1e-6 * max(1.0, abs(other))
    return bool(one == other)


def is_error(value: Any) -> bool:
    return isinstance(value, str) and value.startswith("#")


def samples_book(path: Path) -> Path:
    """Each case as an array formula in column AA, and row by row in column AB."""
    cells = data()
    for number, (sample, only) in enumerate(CASES):
        row = row_of(number)
        cells[f"AA{row}"] = (f"AA{row}:AA{row + ROWS - 1}", "=" + as_saved(over_ranges(sample, only)))
        for i in range(ROWS):
            cells[f"AB{row + i}"] = "=" + as_saved(of_row(sample, i + 1, only))
    return make(path, {"S": cells})


@pytest.fixture(scope="module")
def ours(tmp_path_factory: pytest.TempPathFactory) -> dict[str, Any]:
    path = samples_book(tmp_path_factory.mktemp("ours") / "book.xlsx")
    evaluate(path, fill_native=True)
    return values(path)


@pytest.fixture(scope="module")
def theirs(tmp_path_factory: pytest.TempPathFactory) -> dict[str, Any]:
    folder = tmp_path_factory.mktemp("theirs")
    return values(recalculated(samples_book(folder / "book.xlsx"), folder))


def columns(found: dict[str, Any], number: int) -> tuple[list[Any], list[Any]]:
    """What an array formula gives, and what the single ones give."""
    rows = range(row_of(number), row_of(number) + ROWS)
    return [found.get(f"AA{row}") for row in rows], [found.get(f"AB{row}") for row in rows]


def test_an_array_formula_gives_what_single_ones_give(ours: dict[str, Any]) -> None:
    wrong = {}
    for number, (sample, only) in enumerate(CASES):
        over, single = columns(ours, number)
        if name(sample) in SET_ASIDE:
            right = over == [None] * ROWS
        else:
            right = name(sample) in LEFT | {"RANDBETWEEN"} or all(map(same, over, single))
        if not right:
            wrong[sample, only] = over, single
    assert not wrong


def test_array_formulas_against_libreoffice(ours: dict[str, Any], theirs: dict[str, Any]) -> None:
    """Wherever the two agree about the single values, and neither fails."""
    wrong = {}
    for number, (sample, only) in enumerate(CASES):
        mine, my_single = columns(ours, number)
        its, its_single = columns(theirs, number)
        if name(sample) in NOT_COMPARED or not all(map(same, my_single, its_single)):
            continue
        if not all(same(a, b) or is_error(a) or is_error(b) for a, b in zip(mine, its, strict=True)):
            wrong[sample, only] = mine, its
    assert not wrong


def test_the_comparison_with_libreoffice_covers_most(ours: dict[str, Any], theirs: dict[str, Any]) -> None:
    agreed = {
        name(CASES[number][0])
        for number in range(len(CASES))
        if all(map(same, *(columns(found, number)[0] for found in (ours, theirs))))
    }
    assert len(agreed) > 240


# Of the formulas: what the evaluator does not compute, or not so, and says so.
NOT_COMPUTED: Final = """
SUM(ABS(MMULT(J1:J3,{1}))) | MMULT(ABS(J1:J3),{1}) | SUM(MMULT(ABS(J1:J3),{1})) | MDETERM(ABS({1,2;3,4})) |
SUM(LARGE(Y1:Y6,B1:B3)) | SUM(LARGE(Y1:Y6,ROW(A1:A3))) | SUM(SMALL(Y1:Y6,ROW(INDIRECT("1:3")))) |
SUMPRODUCT(SUBTOTAL(9,OFFSET(X1,ROW(X1:X6)-ROW(X1),0))) | SUMPRODUCT(ROW(A:A)*(A:A=0.7)) |
SUMPRODUCT(LEN(A:A)) | AGGREGATE(14,6,ABS(J1:J3),1) | SUM(N(OFFSET(J1,{0,1,2},0))) |
SUMPRODUCT(N(OFFSET(J1,{0,1,2},0))) | SUMPRODUCT(N(A1:A3)) | SUM(IFERROR(N1:N3,0)) | SUM(IFERROR(J1:J3,0)) |
SUM(IFNA(J1:J3,0)) | T(F1:F3) | N(J1:J3)
"""
# An inline array makes a plain formula go through it wherever it stands, as in Excel (from memory);
# LibreOffice takes its first value inside another function. INDEX goes through an expression
# in Excel (from memory), not in LibreOffice. No spreadsheet takes an expression as the range of
# COUNTIF. The kind of a range is 64 in an array formula, and here everywhere.
OTHERWISE: Final = """
SUM(INDEX(Y1:Y6,N(IF(1,{1,2})))) | SUM(ABS(LARGE(Y1:Y6,{1,2}))) | SUM(ABS(INDEX(J1:J3,{1;2}))) |
SUM(SUMIF(Z1:Z6,IF(TRUE,{"a","b"}),X1:X6)) | SUM(ABS(CHOOSE({1,2},A1,B1))) | SUM(ABS(IF({1,0},J1,J3))) |
INDEX(J1:J3*2,3) | COUNTIF(ABS(J1:J3),1.5) | TYPE(J1:J3)
"""


def listed(texts: str) -> set[str]:
    return {text.strip() for text in texts.split("|")}


def formulas_book(path: Path) -> Path:
    """Each formula beside the data, below them, and as an array formula."""
    cells = data()
    for number, formula in enumerate(FORMULAS):
        col, text = get_column_letter(30 + number), "=" + as_saved(formula)
        cells |= {f"{col}2": text, f"{col}9": text, f"{col}12": (f"{col}12:{col}14", text)}
    return make(path, {"S": cells})


def test_formulas_against_libreoffice(tmp_path: Path) -> None:
    path = formulas_book(tmp_path / "book.xlsx")
    theirs = values(recalculated(path, tmp_path))
    evaluate(path, fill_native=True)
    ours = values(path)
    missing, wrong, equal = set(), {}, 0
    for number, formula in enumerate(FORMULAS):
        for row in (2, 9, 12, 13, 14):
            place = f"{get_column_letter(30 + number)}{row}"
            mine, its = ours.get(place), theirs.get(place)
            if same(mine, its):
                equal += 1
            elif mine is None:
                missing.add(formula)
            elif not is_error(mine):
                wrong[formula] = row, mine, its
    assert wrong.keys() <= listed(OTHERWISE), wrong
    assert missing <= listed(NOT_COMPUTED), missing - listed(NOT_COMPUTED)
    assert equal > 0.85 * 5 * len(FORMULAS)


@pytest.mark.parametrize(
    ("formula", "expected"),
    [
        ("=SUM(ROW(A1:A3))", 6),
        ("=SUM(COLUMN(A1:C1))", 6),
        ("=SUM(ROW(A1:A3),TB_TWICE(0))", 6),
        ("=SUM(TB_TABLE(ROW(A1:A3)/10))", 1.2),
        ("=SUMPRODUCT(LEN(A1:A3))", 6),
        ("=SUM(LEN({\"a\",\"bb\"}))", 3),
        ("=TB_TWICE(SUMPRODUCT(ROUND(B1:B3,0)))", 12),
        ("=SUM(LEN(A1:A3))", 2),
        ("=LEN(A1:A3)", 2),
        ("=SUM(LEN(Words))", 2),
        ("=SUMPRODUCT(LEN(Words))", 6),
        ("=ROUND(One,0)", 1),
        ("=SUMPRODUCT(ROUND(B1:B3,))", 6),
    ],
)  # fmt: skip
def test_in_a_plain_formula(tmp_path: Path, formula: str, expected: float) -> None:
    cells = {"A1": "a", "A2": "bb", "A3": "ccc", "B1": 1.2, "B2": 2.2, "B3": 3.2, "D2": formula}
    path = make(tmp_path / "book.xlsx", {"S": cells}, names={"Words": "S!$A$1:$A$3", "One": "S!$B$1"})
    evaluate(path, fill_native=True)
    assert values(path)["D2"] == pytest.approx(expected)


def test_a_table_function_in_an_array_formula(tmp_path: Path) -> None:
    path = make(tmp_path / "book.xlsx", {"S": {"D1": ("D1:D3", "=TB_TABLE(ROW(A1:A3)/10)"),
                                               "E4": ("E4:E6", "=TB_TABLE(ROW())")}})  # fmt: skip
    assert evaluate(path).ok
    stored = values(path)
    assert [stored[f"D{row}"] for row in (1, 2, 3)] == pytest.approx([0.2, 0.4, 0.6])
    assert [stored[f"E{row}"] for row in (4, 5, 6)] == [8, 10, 12]


def test_what_cannot_be_computed_is_kept_or_fails(tmp_path: Path) -> None:
    kept, lost = "=SUM(N(OFFSET(A1,{0,1},0)))+TB_TWICE(A1)", "=TB_TWICE(SUM(OFFSET(A1,{0,1},0)))"
    path = make(
        tmp_path / "book.xlsx",
        {"S": {"A1": 1, "A2": 2, "B1": kept, "B2": lost}},
        edit=with_values({"B1": "<v>77</v>"}),
    )
    evaluation = evaluate(path)
    assert values(path)["B1"] == 77
    assert values(path)["B2"] == "#NAME?"
    reasons = [evaluation.native_kept[0].reason, evaluation.errors[0].reason]
    assert reasons == ["the evaluator does not compute OFFSET for several values at a time"] * 2


@pytest.mark.parametrize(
    ("formula", "array", "given"),
    [
        ("ROUND(A1,2)+LEN(B2)", False, "ROUND(A1,2)+LEN(B2)"),
        ("SUM(A1:A3)", False, "SUM(A1:A3)"),
        ("SUM(A1:A3*2)", False, "SUM(@A1:A3*2)"),
        ("SUM(A1:A3*2)", True, "SUM(A1:A3*2)"),
        ("LEN( A1:A3 )", False, "LEN( @A1:A3 )"),
        ("VLOOKUP(B1,A1:C9,2,FALSE)", False, "VLOOKUP(B1,A1:C9,2,FALSE)"),
        ("LEN(@A1:A3)", True, "LEN(@A1:A3)"),
        ("_xlfn.SINGLE(A1:A3)", True, "_xlfn.SINGLE(A1:A3)"),
        ("LEN(A1:A3)", True, 'THRUSTBOOK.EACH("LEN",A1:A3)'),
        ("ROUND(A1:A3,)", True, 'THRUSTBOOK.EACH("ROUND",A1:A3,"\ue0f0\ue0f1")'),
        ("SUMPRODUCT(ABS(A1:A3))", False, 'SUMPRODUCT(THRUSTBOOK.EACH("ABS",A1:A3))'),
        ("TB_X(LEN(A1:A3))", False, 'TB_X(THRUSTBOOK.EACH("LEN",A1:A3))'),
        ("SUM(ROW(A2:A4))", False, "SUM(SEQUENCE(3,1,2))"),
        ("LEN(ROW(A2:A4))", False, "LEN(ROW(A2:A4))"),
        ("ROW(A2)+ROW()", True, "ROW(A2)+ROW()"),
        ("ROUND(INDEX(A1:A9,B1),2)", False, "ROUND(@INDEX(A1:A9,B1),2)"),
        ("SUM(INDEX(A1:A9,B1):A9)", False, "SUM(INDEX(A1:A9,B1):A9)"),
    ],
)
def test_what_the_evaluator_is_given(formula: str, array: bool, given: str) -> None:
    assert join(in_context(take_apart(formula), array, lambda name: Operand.UNKNOWN)) == given


@pytest.mark.parametrize(
    ("formula", "reason"),
    [
        ("SUM(OFFSET(A1,{0,1},0))", "OFFSET for several values"),
        ("ROW(A:A)", "ROW for 1048576"),
        ("LEN(A:A)", "LEN for whole rows or columns"),
        ("N(A1:A3)", "disagree about N"),
    ],
)
def test_what_is_set_aside(formula: str, reason: str) -> None:
    with pytest.raises(Unreadable, match=reason):
        in_context(take_apart(formula), True, lambda name: Operand.UNKNOWN)


def test_every_function_of_single_values_has_a_sample() -> None:
    from thrustbook.addin.hosts.headless import singlevalues

    some = singlevalues._SOME.keys() | singlevalues._PAIRS.keys() | {"IFS", "SWITCH"}
    named = singlevalues.ALL_SINGLE | some
    assert named | singlevalues.BY_ITSELF <= {name(sample) for sample in SAMPLES}
    for sample in SAMPLES:
        parts = take_apart(sample.replace("{", "").replace("}", "1"))
        count = 1 + sum(part.kind is Kind.COMMA for part in parts)
        if name(sample) not in LEFT | {"ROW", "COLUMN", "SHEET", "ISREF", "ISFORMULA"}:
            assert single_values(name(sample), count), sample
