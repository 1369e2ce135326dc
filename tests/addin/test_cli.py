"""The command line, as a person and as a script use it."""

from __future__ import annotations

import json
import os
import subprocess
import sys
import zipfile
from pathlib import Path

import openpyxl
import pytest

from thrustbook.addin import cli, figures
from thrustbook.addin.catalogue.registry import CATALOGUE
from thrustbook.workbooks.templates import shipped


def book(path: Path, formulas: dict[str, object]) -> Path:
    """Make a small workbook with one sheet, S."""
    made = openpyxl.Workbook()
    sheet = made.active
    assert sheet is not None
    sheet.title = "S"
    for place, value in formulas.items():
        sheet[place] = value
    made.save(path)
    return path


def value(path: Path, place: str) -> object:
    return openpyxl.load_workbook(path, data_only=True)["S"][place].value


def test_evaluate_stores_the_values_and_says_what_it_did(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    path = book(tmp_path / "a.xlsx", {"A1": 300, "B1": '=TB_AREA("metric",A1)', "C1": "=B1*2"})
    assert cli.main(["evaluate", str(path)]) == 0
    text = capsys.readouterr().out
    assert "1 cell with our functions, 2 values" in text
    assert "TB_AREA" in text
    assert value(path, "B1") == pytest.approx(0.0706858347)
    assert value(path, "C1") == pytest.approx(2 * 0.0706858347)


def test_evaluate_writes_beside_and_leaves_the_original(tmp_path: Path) -> None:
    path = book(tmp_path / "a.xlsx", {"B1": '=TB_AREA("metric",300)'})
    before = path.read_bytes()
    assert cli.main(["evaluate", str(path), "-o", str(tmp_path / "b.xlsx")]) == 0
    assert path.read_bytes() == before
    assert value(tmp_path / "b.xlsx", "B1") == pytest.approx(0.0706858347)


def test_a_failed_cell_is_listed_with_its_reason_and_the_status_says_so(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    path = book(tmp_path / "a.xlsx", {"A1": -300, "B1": '=TB_AREA("metric",A1)', "C1": "=SUM(B1:B1)"})
    assert cli.main(["evaluate", str(path)]) == 1
    text = capsys.readouterr().out
    assert "S!B1" in text
    assert "#NUM!" in text
    assert "above 0" in text
    assert value(path, "B1") == value(path, "C1") == "#NUM!"


def test_json_for_machines(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    formula = '=TB_SCHEDULE("F","metric",{"fitting","D1","p1"},{"closed",200,400;"closed",-1,400})'
    path = book(tmp_path / "a.xlsx", {"A1": 1})
    wb = openpyxl.load_workbook(path)
    wb["S"]["B1"] = openpyxl.worksheet.formula.ArrayFormula("B1:B2", formula)
    wb.save(path)
    assert cli.main(["evaluate", str(path), "--json"]) == 1
    data = json.loads(capsys.readouterr().out)
    assert data["ok"] is False
    assert data["counts"] == {"TB_SCHEDULE": 1}
    assert data["tables"][0]["labels"] == ["F"]
    assert data["tables"][0]["units"] == ["kN"]
    assert data["tables"][0]["rows"][0][0] == pytest.approx(12.566370614)
    assert [e["cell"] for e in data["errors"]] == ["B2"]


@pytest.mark.parametrize(
    ("name", "content", "says"),
    [
        ("damaged.xlsx", b"PK\x03\x04 and then nothing", "zip"),
        ("text.xlsx", b"not a workbook at all", ""),
        ("old.xlsx", b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1" + b"\0" * 600, ""),
        ("empty.xlsx", b"", "empty"),
    ],
)
def test_what_cannot_be_done_safely_is_refused_and_left_alone(
    tmp_path: Path, name: str, content: bytes, says: str, capsys: pytest.CaptureFixture[str]
) -> None:
    path = tmp_path / name
    path.write_bytes(content)
    assert cli.main(["evaluate", str(path)]) == 2
    assert path.read_bytes() == content
    message = capsys.readouterr().err
    assert name in message
    assert says in message.lower()
    assert "Traceback" not in message


def test_a_missing_file_and_a_folder_that_is_not_there(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    assert cli.main(["evaluate", str(tmp_path / "none.xlsx")]) == 2
    path = book(tmp_path / "a.xlsx", {"B1": '=TB_AREA("metric",300)'})
    assert cli.main(["evaluate", str(path), "-o", str(tmp_path / "no" / "b.xlsx")]) == 2
    assert "Traceback" not in capsys.readouterr().err


def test_evaluating_the_shipped_workbook_prints_its_schedule_and_changes_nothing(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    path = tmp_path / "pipe-run.xlsx"
    path.write_bytes(shipped("pipe-run").read_bytes())
    assert cli.main(["evaluate", str(path)]) == 0
    text = capsys.readouterr().out
    for word in ("TB_RUN", "TB_RUNCASES", "N01", "N24", "kN", "reducer", "licensed practice"):
        assert word in text
    with zipfile.ZipFile(path) as now, zipfile.ZipFile(shipped("pipe-run")) as then:
        assert now.namelist() == then.namelist()
        for member in now.namelist():
            if not member.startswith("xl/worksheets/sheet"):
                assert now.read(member) == then.read(member), member


def test_new_never_replaces_a_file(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    path = tmp_path / "mine.xlsx"
    assert cli.main(["new", "pipe-run", str(path)]) == 0
    assert path.read_bytes() == shipped("pipe-run").read_bytes()
    path.write_bytes(b"precious")
    assert cli.main(["new", "pipe-run", str(path)]) == 2
    assert path.read_bytes() == b"precious"
    assert cli.main(["new", "pipe-run", str(tmp_path / "mine.txt")]) == 2
    assert "xlsx" in capsys.readouterr().err


def test_functions_lists_and_describes_all(capsys: pytest.CaptureFixture[str]) -> None:
    assert cli.main(["functions"]) == 0
    text = capsys.readouterr().out
    for name in CATALOGUE:
        assert name in text
    assert cli.main(["functions", "tb_bend"]) == 0
    text = capsys.readouterr().out
    for word in ("TB_BEND(result, units, rho, D1", "Sign convention", "Source", "Example", "gives"):
        assert word in text
    assert cli.main(["functions", "bned"]) == 2
    assert "TB_BEND" in capsys.readouterr().err
    assert cli.main(["functions", "--json"]) == 0
    assert {f["name"] for f in json.loads(capsys.readouterr().out)} == set(CATALOGUE)


def test_doctor_tells_what_is_there(capsys: pytest.CaptureFixture[str]) -> None:
    assert cli.main(["doctor"]) == 0
    text = capsys.readouterr().out
    for word in ("numpy", "headless", "ready", "LibreOffice Calc", "Excel"):
        assert word in text
    assert cli.main(["doctor", "--json"]) == 0
    assert json.loads(capsys.readouterr().out)["hosts"][0]["state"] == "ready"


def test_a_reader_that_leaves_early_is_no_error() -> None:
    command = f'"{sys.executable}" -m thrustbook.addin.cli functions --json | head -c 10'
    done = subprocess.run(command, shell=True, capture_output=True, text=True, env=dict(os.environ))
    assert "Traceback" not in done.stderr


def test_version_and_help(capsys: pytest.CaptureFixture[str]) -> None:
    assert cli.main(["--version"]) == 0
    assert "thrustbook" in capsys.readouterr().out
    assert cli.main([]) == 2
    assert "evaluate" in capsys.readouterr().out


@pytest.mark.parametrize("name", ["b.xlsm", "b.xls", "b.ods", "b"])
def test_a_copy_keeps_the_kind_of_the_workbook(
    tmp_path: Path, capsys: pytest.CaptureFixture[str], name: str
) -> None:
    path = book(tmp_path / "a.xlsx", {"B1": '=TB_AREA("metric",300)'})
    assert cli.main(["evaluate", str(path), "-o", str(tmp_path / name)]) == 2
    assert "must end in .xlsx" in capsys.readouterr().err
    assert not (tmp_path / name).exists()


def test_a_failed_row_of_a_block_is_one_line(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    table = '{"fitting","D1","p1"},{"closed",200,400;"closed",-1,400;"cap",200,400}'
    path = book(tmp_path / "a.xlsx", {"A1": 1})
    wb = openpyxl.load_workbook(path)
    formula = f'=TB_SCHEDULE("name,Fx,F,Rx","metric",{table})'
    wb["S"]["B1"] = openpyxl.worksheet.formula.ArrayFormula("B1:E3", formula)
    wb.save(path)
    assert cli.main(["evaluate", str(path)]) == 1
    lines = [line.split()[:2] for line in capsys.readouterr().out.splitlines() if "S!" in line]
    assert lines[-2:] == [["S!C2:E2", "#NUM!"], ["S!C3:E3", "#VALUE!"]]


def test_a_refusal_is_json_too(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    path = tmp_path / "a.xlsx"
    path.write_bytes(b"no zip")
    assert cli.main(["evaluate", str(path), "--json"]) == 2
    seen = capsys.readouterr()
    data = json.loads(seen.out)
    assert data["ok"] is False
    assert "not a workbook" in data["refused"]
    assert data["refused"] in seen.err


def test_a_rounded_number_is_never_minus_zero() -> None:
    assert figures.table([("a",), (-0.0004,), (123.4,)])[2:] == ["    0.00", "  123.40"]
