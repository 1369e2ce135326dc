"""Names of our functions in formulas: bound after loading, plain after saving."""

from __future__ import annotations

import os
import zipfile
from pathlib import Path

import openpyxl
import pytest

from thrustbook.addin.hosts.calc.office import books
from thrustbook.addin.hosts.calc.plainnames import write_plain_names

FULL = "ORG.THRUSTBOOK.CALC.FUNCTIONS."


@pytest.mark.parametrize(
    ("formula", "plain"),
    [
        ('=tb_area("SI";1)', '=TB_AREA("SI";1)'),
        ('=[1]!tb_area("SI";1)', '=TB_AREA("SI";1)'),
        (f'=[1]!{FULL}TB_AREA("SI";1)', '=TB_AREA("SI";1)'),
        ("=IF(A1>0;[2]!TB_AREA(;1);_xll.tb_area(;2))", "=IF(A1>0;TB_AREA(;1);TB_AREA(;2))"),
        ("='C:\\my files\\thrustbook.xlam'!TB_AREA(;1)", "=TB_AREA(;1)"),
        ("=thrustbook.xlam!TB_AREA(;1)", "=TB_AREA(;1)"),
        ('{=tb_area("SI";C1:C3)}', '{=TB_AREA("SI";C1:C3)}'),
        (f'=tb_area(;1)+{FULL}TB_AREA(;2)&"tb_x("', f'=TB_AREA(;1)+{FULL}TB_AREA(;2)&"tb_x("'),
    ],
)
def test_calls_that_need_binding(formula: str, plain: str) -> None:
    assert books.plain(formula) == plain


@pytest.mark.parametrize(
    "formula",
    [
        f'={FULL}TB_AREA("SI";1)',
        '="TB_AREA("&A1',
        '=IF(A1;"say ""TB_AREA(1)""";2)',
        "=SUM(A1:A3)",
        "=MY_TB_AREA(1)",
        "=Sheet1.TB_1",
        "text",
    ],
)
def test_formulas_left_alone(formula: str) -> None:
    assert books.plain(formula) == ""


def _book(path: Path, formula: str) -> Path:
    workbook = openpyxl.Workbook()
    workbook.worksheets[0]["A1"] = formula
    workbook.worksheets[0]["A2"] = f"{FULL}TB_AREA is a text"
    workbook.save(path)
    return path


def test_plain_names_are_written_and_nothing_else_changes(tmp_path: Path) -> None:
    path = _book(tmp_path / "book.xlsx", f'={FULL}TB_AREA("SI",{FULL.lower()}tb_area("SI",1))')
    os.utime(path, ns=(1_700_000_000_123_456_789, 1_700_000_000_123_456_789))
    with zipfile.ZipFile(path) as archive:
        before = {name: archive.read(name) for name in archive.namelist()}
    assert books.holds_full_names(str(path))
    assert write_plain_names(path) == ""
    assert path.stat().st_mtime_ns == 1_700_000_000_123_456_789
    with zipfile.ZipFile(path) as archive:
        after = {name: archive.read(name) for name in archive.namelist()}
    changed = [name for name in before if before[name] != after[name]]
    assert changed == ["xl/worksheets/sheet1.xml"]
    assert b'TB_AREA("SI",TB_AREA("SI",1))' in after[changed[0]].replace(b"&quot;", b'"')
    assert any(f"{FULL}TB_AREA is a text".encode() in data for data in after.values())


def test_file_without_full_names_is_not_touched(tmp_path: Path) -> None:
    path = tmp_path / "book.xlsx"
    workbook = openpyxl.Workbook()
    workbook.worksheets[0]["A1"] = '=TB_AREA("SI",1)'
    workbook.save(path)
    before = path.read_bytes(), path.stat().st_ino
    assert not books.holds_full_names(str(path))
    assert write_plain_names(path) == ""
    assert (path.read_bytes(), path.stat().st_ino) == before


def test_damaged_file_is_told_and_left(tmp_path: Path) -> None:
    path = tmp_path / "book.xlsx"
    path.write_bytes(b"PK\x03\x04 no zip at all")
    assert not books.holds_full_names(str(path))
    assert write_plain_names(path) != ""
    assert path.read_bytes() == b"PK\x03\x04 no zip at all"
