"""The installer against a stand-in for Excel: what it does, and that every failure is undone."""

from __future__ import annotations

import argparse
import shutil
import sys
import tempfile
from pathlib import Path

import pytest
import xlwings

from thrustbook.addin.catalogue.registry import CATALOGUE
from thrustbook.addin.hosts.excel import install as installer
from thrustbook.addin.hosts.excel import xlam
from thrustbook.addin.hosts.excel.vba import MODULE_NAME, PYTHON_MODULE, functions_module
from thrustbook.addin.hosts.excel.vba_relink import relink_module

from .excel_double import App, Record, kinds
from .vba_lint import lint

PYTHON = Path("C:/env/Scripts/python.exe")


@pytest.fixture(autouse=True)
def _own_temporary_folder(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    (tmp_path / "temp").mkdir()
    monkeypatch.setattr(tempfile, "tempdir", str(tmp_path / "temp"))


def run(tmp_path: Path, fail_at: int | None = None) -> Record:
    record = Record(tmp_path / "XLSTART", fail_at)
    installer.register(lambda: App(record), PYTHON)
    return record


def test_the_add_in_is_made_placed_and_tried(tmp_path: Path) -> None:
    record = run(tmp_path)
    assert (tmp_path / "XLSTART" / "thrustbook.xlam").read_bytes() == b"made by Excel"
    assert kinds(record) == [
        "start",
        "api",
        "set",
        "Workbooks.Add",
        "VBProject",
        "Close",
        "Import",
        "MacroOptions",
        "SaveAs",
        "StartupPath",
        "Workbooks.Open",
    ]
    assert record.modules == {
        "xlwings.bas": xlam.xlwings_module().encode(),
        f"{MODULE_NAME}.bas": functions_module().encode(),
        "thrustbook_relink.bas": relink_module().encode(),
    }
    assert record.conf == {
        "INTERPRETER_WIN": str(PYTHON),
        "UDF MODULES": PYTHON_MODULE,
        "ADD_WORKBOOK_TO_PYTHONPATH": "False",
    }
    assert ("set", "Sheet", "Name", "thrustbook.conf") in record.uses
    assert ("set", "Workbook", "IsAddin", True) in record.uses
    assert ("SaveAs", 55) in record.uses
    assert set(record.options) == {f"'Book1'!{name}" for name in CATALOGUE}
    assert record.ended
    assert record.open_books == 0
    assert list((tmp_path / "temp").iterdir()) == []


@pytest.mark.parametrize("former", [None, b"the former version"])
def test_every_failure_is_undone(tmp_path: Path, former: bytes | None) -> None:
    number = len(run(tmp_path).uses)
    place = tmp_path / "XLSTART" / "thrustbook.xlam"
    seen = set()
    for fail_at in range(number):
        if former is None:
            place.unlink(missing_ok=True)
        else:
            place.write_bytes(former)
        record = Record(tmp_path / "XLSTART", fail_at)
        with pytest.raises(installer.Fault) as caught:
            installer.register(lambda record=record: App(record), PYTHON)  # type: ignore[misc]
        assert caught.value.undone
        assert f"use {fail_at}" in str(caught.value)
        seen.add(str(caught.value).split(":")[0])
        assert (place.read_bytes() if place.exists() else None) == former
        assert list((tmp_path / "temp").iterdir()) == []
        assert record.ended == (fail_at > 0)
    assert seen == {
        "Could not start Excel",
        "Could not prepare Excel",
        "Could not let Excel write VBA",
        "Could not make the add-in",
        "Could not find the folder from which Excel loads add-ins",
        "Could not see the functions answer",
    }


def test_no_leave_to_write_vba_tells_where_the_tick_is(tmp_path: Path) -> None:
    first = next(i for i, use in enumerate(run(tmp_path).uses) if use[0] == "VBProject")
    with pytest.raises(installer.Fault, match="Trust access to the VBA project object"):
        run(tmp_path, fail_at=first)


@pytest.mark.parametrize(
    ("formula", "answer"),
    [
        ("=TB_VERSION()", "another version"),
        ("=TB_VERSION()", None),
        ('=IF(ISERROR(TB_CONVERT("x","m","mm")),"a true error","no error")', "no error"),
        ('=IF(TB_CONVERT(2,"m","mm")=2000,"2000","wrong")', "wrong"),
    ],
)
def test_functions_that_do_not_answer_undo_the_installation(
    tmp_path: Path, formula: str, answer: str | None
) -> None:
    record = Record(tmp_path / "XLSTART")
    record.answers[formula] = answer  # type: ignore[assignment]
    with pytest.raises(installer.Fault, match="does not answer"):
        installer.register(lambda: App(record), PYTHON)
    assert not (tmp_path / "XLSTART" / "thrustbook.xlam").exists()
    assert record.ended
    assert record.open_books == 0


def test_a_file_in_use_is_told(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def refuse(*args: object) -> None:
        raise PermissionError(13, "the file is used by another program")

    monkeypatch.setattr(shutil, "copyfile", refuse)
    with pytest.raises(installer.Fault, match="Close every window of Excel") as caught:
        run(tmp_path)
    assert caught.value.undone
    assert not (tmp_path / "XLSTART" / "thrustbook.xlam").exists()


def test_a_former_version_that_cannot_be_put_back_is_kept(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    place = tmp_path / "XLSTART" / "thrustbook.xlam"
    place.parent.mkdir()
    place.write_bytes(b"the former version")
    real = shutil.copy2

    def refuse_back(source: Path, target: Path) -> None:
        if target == place:
            raise PermissionError(13, "the file is used by another program")
        real(source, target)

    monkeypatch.setattr(shutil, "copy2", refuse_back)
    record = Record(tmp_path / "XLSTART")
    record.answers["=TB_VERSION()"] = "wrong"
    with pytest.raises(installer.Fault, match="it is kept as") as caught:
        installer.register(lambda: App(record), PYTHON)
    assert not caught.value.undone
    (kept,) = (tmp_path / "temp").glob("*/former.xlam")
    assert str(kept) in str(caught.value)
    assert kept.read_bytes() == b"the former version"


def test_an_excel_that_does_not_quit_is_ended(tmp_path: Path) -> None:
    record = Record(tmp_path / "XLSTART")

    class Stubborn(App):
        def quit(self) -> None:
            raise OSError("does not listen")

    installer.register(lambda: Stubborn(record), PYTHON)
    assert record.ended


def test_uninstall_takes_the_file_away(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("APPDATA", str(tmp_path / "roaming"))
    record = run(tmp_path)
    folders = installer.start_folders(lambda: App(record))
    assert folders == [tmp_path / "XLSTART", tmp_path / "roaming/Microsoft/Excel/XLSTART"]
    assert installer.remove(folders) == [tmp_path / "XLSTART" / "thrustbook.xlam"]
    assert installer.remove(folders) == []
    assert list((tmp_path / "XLSTART").iterdir()) == []


def test_uninstall_finds_the_folder_without_excel(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("APPDATA", str(tmp_path / "roaming"))

    def no_excel() -> None:
        raise OSError("class not registered")

    assert installer.start_folders(no_excel) == [tmp_path / "roaming/Microsoft/Excel/XLSTART"]


def test_uninstall_tells_of_a_file_in_use(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    (tmp_path / "thrustbook.xlam").write_bytes(b"x")

    def refuse(self: Path, missing_ok: bool = False) -> None:
        raise PermissionError(13, "the file is used by another program")

    monkeypatch.setattr(Path, "unlink", refuse)
    with pytest.raises(installer.Fault, match="Close every window of Excel"):
        installer.remove([tmp_path])


@pytest.mark.parametrize("command", [installer.install, installer.uninstall])
def test_other_platforms_are_told_what_is_needed(
    command: object, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    monkeypatch.setattr(sys, "platform", "linux")
    assert command(argparse.Namespace()) == 2  # type: ignore[operator]
    told = capsys.readouterr().err
    assert "Excel for Windows" in told
    assert "thrustbook evaluate" in told


def test_commands_on_windows(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    record = Record(tmp_path / "XLSTART")
    monkeypatch.setattr(sys, "platform", "win32")
    monkeypatch.setattr(sys, "executable", str(tmp_path / "env/Scripts/python.exe"))
    monkeypatch.setattr(installer, "_start_excel", lambda: App(record))
    monkeypatch.setenv("APPDATA", str(tmp_path / "roaming"))
    assert installer.install(argparse.Namespace()) == 1
    assert "xlwings64-0.37.8.dll" in capsys.readouterr().err
    assert record.uses == []
    (tmp_path / "env").mkdir()
    (tmp_path / "env/xlwings64-0.37.8.dll").write_bytes(b"")
    assert installer.install(argparse.Namespace()) == 0
    assert str(tmp_path / "XLSTART") in capsys.readouterr().out
    assert installer.uninstall(argparse.Namespace()) == 0
    assert "Removed" in capsys.readouterr().out
    assert installer.uninstall(argparse.Namespace()) == 0
    assert "not installed" in capsys.readouterr().out
    record.answers["=TB_VERSION()"] = "wrong"
    assert installer.install(argparse.Namespace()) == 1
    assert "Nothing was changed." in capsys.readouterr().err


def test_the_module_of_xlwings_never_reads_from_the_active_workbook() -> None:
    text = xlam.xlwings_module()
    released = Path(xlwings.__file__).with_name("xlwings_custom_addin.bas").read_text()
    assert "ActiveWorkbook" in released
    assert "ActiveWorkbook" not in text
    assert 'PROJECT_NAME As String = "thrustbook"' in text
    assert "Copyright (C) 2014-present, Zoomer Analytics LLC." in text
    assert text.startswith('Attribute VB_Name = "xlwings"\r\nOption Private Module\r\n')
    # Procedures of one name stand in branches of conditional compilation.
    assert [f for f in lint(text) if "blanks at the end" not in f and "have one name" not in f] == []


def test_another_xlwings_is_refused(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    other = tmp_path / "module.bas"
    other.write_text(xlam.xlwings_module().replace("0.37.8", "0.38.0"))
    with pytest.raises(xlam.WrongXlwings, match="is not the module"):
        xlam.xlwings_module(other)
    monkeypatch.setattr(xlwings, "__version__", "0.38.0")
    with pytest.raises(xlam.WrongXlwings, match=r"0\.38\.0 is installed"):
        xlam.xlwings_module()


def test_the_pin_is_that_of_the_distribution() -> None:
    project = (Path(__file__).parents[3] / "pyproject.toml").read_text()
    assert f'"xlwings=={xlam.XLWINGS_VERSION}"' in project
