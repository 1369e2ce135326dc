"""A recording stand-in for the object model of Excel, as far as the installer uses it.

Every use is numbered and recorded; the use with a given number can be made to
fail, as COM fails.
"""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path
from typing import Any

from thrustbook.addin.tools import version

ANSWERS = {"=TB_VERSION()": str(version([]))}


class ComFault(Exception):
    """Stands for pywintypes.com_error."""


class Record:
    """What was asked of Excel, in order."""

    def __init__(self, startup: Path, fail_at: int | None = None) -> None:
        self.startup = startup
        self.fail_at = fail_at
        self.uses: list[tuple[Any, ...]] = []
        self.modules: dict[str, bytes] = {}
        self.conf: dict[str, str] = {}
        self.options: dict[str, dict[str, Any]] = {}
        self.open_books = 0
        self.ended = False
        self.answers = ANSWERS | {
            '=IF(ISERROR(TB_CONVERT("x","m","mm")),"a true error","no error")': "a true error",
            '=IF(TB_CONVERT(2,"m","mm")=2000,"2000","wrong")': "2000",
        }

    def use(self, *what: Any) -> None:
        self.uses.append(what)
        if len(self.uses) - 1 == self.fail_at:
            raise ComFault(f"use {self.fail_at}: {what[0]}")


class App:
    """Stands for xlwings.App."""

    def __init__(self, record: Record) -> None:
        record.use("start")
        self._record = record

    @property
    def api(self) -> Any:
        self._record.use("api")
        return Excel(self._record)

    def quit(self) -> None:
        self._record.ended = True

    def kill(self) -> None:
        self._record.ended = True


class Part:
    """A part of Excel that records what is set in it."""

    record: Record

    def __init__(self, record: Record) -> None:
        self.__dict__["record"] = record

    def __setattr__(self, name: str, value: Any) -> None:
        self.record.use("set", type(self).__name__, name, value)
        self.__dict__[name] = value


class Excel(Part):
    @property
    def Workbooks(self) -> Workbooks:
        return Workbooks(self.record)

    @property
    def StartupPath(self) -> str:
        self.record.use("StartupPath")
        return str(self.record.startup)

    def MacroOptions(self, macro: str, **options: Any) -> None:
        self.record.use("MacroOptions", macro)
        self.record.options[macro] = options


class Workbooks(Part):
    def Add(self, template: int | None = None) -> Workbook:
        self.record.use("Workbooks.Add", template)
        self.record.open_books += 1
        return Workbook(self.record)

    def Open(self, path: str) -> Workbook:
        self.record.use("Workbooks.Open", path)
        assert Path(path).read_bytes() == b"made by Excel"
        self.record.open_books += 1
        return Workbook(self.record)


class Workbook(Part):
    Name = "Book1"

    @property
    def VBProject(self) -> Any:
        self.record.use("VBProject")
        return self

    @property
    def VBComponents(self) -> Any:
        return self

    @property
    def Count(self) -> int:
        return 2

    def Import(self, path: str) -> None:
        self.record.use("Import", Path(path).name)
        self.record.modules[Path(path).name] = Path(path).read_bytes()

    def Worksheets(self, number: int) -> Sheet:
        assert number == 1
        return Sheet(self.record)

    def SaveAs(self, path: str, FileFormat: int) -> None:
        self.record.use("SaveAs", FileFormat)
        Path(path).write_bytes(b"made by Excel")

    def Close(self, save: bool) -> None:
        assert save is False
        self.record.use("Close")
        self.record.open_books -= 1


class Sheet(Part):
    def Range(self, address: str) -> Area:
        return Area(self.record, address)


class Area(Part):
    def __init__(self, record: Record, address: str) -> None:
        super().__init__(record)
        self.__dict__["address"] = address

    def __setattr__(self, name: str, value: Any) -> None:
        super().__setattr__(name, value)
        if name == "Value":
            assert self.__dict__.get("NumberFormat") == "@", "a conf value must be written as text"
            self.record.conf.update(value)
        if name == "Formula":
            self.__dict__["Value"] = self.__dict__["Text"] = self.record.answers[value]


def kinds(record: Record) -> Sequence[str]:
    """Give the uses by name alone, repeated ones once."""
    return list(dict.fromkeys(str(use[0]) for use in record.uses))
