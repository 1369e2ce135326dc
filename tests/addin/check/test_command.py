"""The command: exit statuses, the lists of accepted findings, JSON, the record, the sheet of findings."""

from __future__ import annotations

import hashlib
import json
import re
import zipfile
from pathlib import Path

import openpyxl
import pytest

from thrustbook.addin import dispatch
from thrustbook.addin.cli import main
from thrustbook.addin.tools import catalogue_version, engine_version, product_version

from .books import clean_book, stored


@pytest.fixture
def clean(tmp_path: Path) -> Path:
    return stored(clean_book(), tmp_path / "clean.xlsx")


@pytest.fixture
def fast(tmp_path: Path) -> Path:
    """A workbook with one warning: a velocity beyond usual practice."""
    return _fast(tmp_path / "fast.xlsx", 700.0)


def _fast(path: Path, flow: float, *, wrong: bool = False) -> Path:
    book = clean_book()
    book["Bends"]["D6"] = flow
    return stored(book, path, after={"Bends": {(9, 7): 1.0}} if wrong else None)


def _json(capsys: pytest.CaptureFixture[str], *arguments: str | Path) -> tuple[int, dict[str, object]]:
    status = main(["check", "--json", *map(str, arguments)])
    data: dict[str, object] = json.loads(capsys.readouterr().out)
    return status, data


def test_exit_statuses(tmp_path: Path, clean: Path, fast: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["check", str(clean)]) == 0
    assert main(["check", str(fast)]) == 1
    assert main(["check", str(_fast(tmp_path / "wrong.xlsx", 700.0, wrong=True))]) == 3
    capsys.readouterr()
    assert main(["check", str(tmp_path / "nothing.xlsx")]) == 2
    assert "nothing.xlsx" in capsys.readouterr().err
    assert main(["check", str(clean), "-o", str(clean)]) == 2
    with pytest.raises(SystemExit):
        main(["check", "--help"])
    assert "exit status: 0 no finding" in capsys.readouterr().out


def test_notes_alone_give_status_0(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    book = clean_book()
    book["Inputs"]["E1"] = '=CUBEVALUE("c","m")'
    path = stored(book, tmp_path / "note.xlsx", after={"Inputs": {(1, 5): 5.0}})
    status, data = _json(capsys, path)
    assert status == 0
    assert [(f["code"], f["severity"]) for f in data["findings"]] == [("V04", "note")]  # type: ignore[attr-defined]


def test_report_for_reading(fast: Path, capsys: pytest.CaptureFixture[str]) -> None:
    main(["check", str(fast)])
    text = capsys.readouterr().out
    assert text.startswith("fast.xlsx: 1 finding (1 warning)\n")
    assert "WARNING  H01  Bends!G6" in text
    assert max(map(len, text.splitlines())) <= 110
    assert "\r" not in text
    assert "\x1b" not in text


def test_record(fast: Path, capsys: pytest.CaptureFixture[str]) -> None:
    before = fast.read_bytes()
    _, data = _json(capsys, fast)
    record = data["record"]
    assert isinstance(record, dict)
    assert record["sha256"] == hashlib.sha256(before).hexdigest()
    assert record["product"] == product_version()
    assert record["catalogue"] == catalogue_version() == dispatch.call("TB_VERSION", ["catalogue"])
    assert record["engine"] == engine_version() == dispatch.call("TB_VERSION", ["engine"])
    assert record["counts"] == {"error": 0, "warning": 1, "note": 0}
    assert record["accepted"] == 0
    assert re.fullmatch(r"\d{4}-\d\d-\d\d \d\d:\d\d:\d\d[+-]\d\d:\d\d", record["when"])
    assert fast.read_bytes() == before
    main(["check", str(fast)])
    text = capsys.readouterr().out
    for value in (record["sha256"], record["catalogue"], record["engine"], "0 errors, 1 warning, 0 notes"):
        assert value in text


def test_accepting(tmp_path: Path, fast: Path, capsys: pytest.CaptureFixture[str]) -> None:
    listed = tmp_path / "accepted.toml"
    assert main(["check", str(fast), "--write-accept", str(listed)]) == 1
    capsys.readouterr()

    # What nobody signed accepts nothing.
    status, data = _json(capsys, fast, "--accept", listed)
    assert status == 1
    assert data["refused_entries"][0]["lacks"] == "no reason, no initials, no date"  # type: ignore[index]

    text = listed.read_text(encoding="utf-8")
    signed = text.replace('reason = ""', 'reason = "short \\"peak\\" only"').replace(
        'initials = ""', 'initials = "AB"'
    )
    listed.write_text(signed.replace('date = ""', "date = 2026-01-31"), encoding="utf-8")
    status, data = _json(capsys, fast, "--accept", listed)
    assert status == 0
    assert data["findings"] == []
    accepted = data["accepted"][0]["acceptance"]  # type: ignore[index]
    assert accepted == {"reason": 'short "peak" only', "initials": "AB", "date": "2026-01-31"}
    assert data["record"]["counts"] == {"error": 0, "warning": 0, "note": 0}  # type: ignore[index]
    assert data["record"]["accepted"] == 1  # type: ignore[index]

    # The same caution at another flow is another situation.
    status, data = _json(capsys, _fast(tmp_path / "fast.xlsx", 800.0), "--accept", listed)
    assert status == 1
    assert [f["code"] for f in data["findings"]] == ["H01"]  # type: ignore[attr-defined]
    assert [e["cell"] for e in data["no_longer_apply"]] == ["G6"]  # type: ignore[attr-defined]

    # Mended: the entry no longer applies, and the report says so.
    assert main(["check", str(_fast(tmp_path / "fast.xlsx", 100.0)), "--accept", str(listed)]) == 0
    assert "no longer found" in capsys.readouterr().out


def test_a_number_over_a_formula_is_accepted_for_its_inputs_alone(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    listed, path = tmp_path / "accepted.toml", tmp_path / "book.xlsx"
    for flow, expected in ((100.0, 0), (100.0, 0), (120.0, 3)):
        book = clean_book()
        book["Bends"]["D8"], book["Bends"]["G8"] = flow, 25.0
        stored(book, path)
        if not listed.exists():
            main(["check", str(path), "--write-accept", str(listed)])
            text = listed.read_text(encoding="utf-8")
            for key, value in (("reason", "as built"), ("initials", "AB"), ("date", "2026-01-31")):
                text = text.replace(f'{key} = ""', f'{key} = "{value}"')
            listed.write_text(text, encoding="utf-8-sig")  # as some editors save it
        assert main(["check", str(path), "--accept", str(listed)]) == expected
    assert "no longer found" in capsys.readouterr().out


def test_a_new_list_keeps_what_was_signed(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    path = _fast(tmp_path / "fast.xlsx", 700.0)
    one, two = tmp_path / "one.toml", tmp_path / "two.toml"
    main(["check", str(path), "--write-accept", str(one)])
    text = one.read_text(encoding="utf-8")
    for key, value in (("reason", "agreed"), ("initials", "AB"), ("date", "2026-01-31")):
        text = text.replace(f'{key} = ""', f'{key} = "{value}"')
    one.write_text(text, encoding="utf-8")
    book = clean_book()
    book["Bends"]["D6"] = 700.0
    book["Bends"]["D7"].value = 720.0
    book["Bends"]["G8"] = 5.0
    stored(book, path)
    main(["check", str(path), "--accept", str(one), "--write-accept", str(two)])
    capsys.readouterr()
    assert main(["check", str(path), "--accept", str(two), "--write-accept", str(two)]) == 2
    assert "exists" in capsys.readouterr().err
    assert two.read_text(encoding="utf-8").count("[[accepted]]") >= 2


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("[[accepted]\n", "not readable TOML"),
        ("[[accepted]]\ncode = 'V01'\n", "sheet is missing"),
        ("[[accepted]]\ncode = 1\nsheet = ''\ncell = ''\nfingerprint = ''\n", "must be text"),
        ("[[accepted]]\ncolour = 'red'\n", '"colour" is not known'),
        ("other = 1\n", "nothing but"),
        ("[accepted]\ncode = 'V01'\n", "two pairs of brackets"),
    ],
)
def test_a_bad_list_is_refused(
    tmp_path: Path, clean: Path, capsys: pytest.CaptureFixture[str], text: str, words: str
) -> None:
    listed = tmp_path / "bad.toml"
    listed.write_text(text, encoding="utf-8")
    assert main(["check", str(clean), "--accept", str(listed)]) == 2
    assert words in capsys.readouterr().err


def test_sheet_of_findings(tmp_path: Path, fast: Path) -> None:
    out = tmp_path / "out.xlsx"
    assert main(["check", str(fast), "-o", str(out)]) == 1
    book = openpyxl.load_workbook(out)
    assert book.sheetnames == ["Inputs", "Bends", "Balance", "Run", "Findings"]
    cells = [[cell.value for cell in row] for row in book["Findings"].iter_rows()]
    heads = next(i for i, row in enumerate(cells) if row[0] == "severity")
    assert cells[heads + 1][:3] == ["warning", "H01", "Bends!G6"]
    flat = [value for row in cells for value in row if isinstance(value, str)]
    assert hashlib.sha256(fast.read_bytes()).hexdigest() in flat
    assert engine_version() in flat
    link = next(c.hyperlink for row in book["Findings"].iter_rows() for c in row if c.hyperlink)
    assert link.location == "'Bends'!G6"
    # Every part that does not have to name the new sheet is the same, byte for byte.
    with zipfile.ZipFile(fast) as old, zipfile.ZipFile(out) as new:
        changed = {n for n in old.namelist() if new.read(n) != old.read(n)}
        added = set(new.namelist()) - set(old.namelist())
    assert changed <= {
        "[Content_Types].xml",
        "xl/workbook.xml",
        "xl/_rels/workbook.xml.rels",
        "xl/styles.xml",
        "docProps/app.xml",
    }
    assert len(added) == 1

    # A second check of the copy finds the name taken.
    again = tmp_path / "again.xlsx"
    main(["check", str(out), "-o", str(again)])
    assert openpyxl.load_workbook(again).sheetnames[-2:] == ["Findings", "Findings 2"]
