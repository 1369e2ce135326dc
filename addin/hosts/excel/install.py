"""``thrustbook install excel`` and ``uninstall excel``.

The add-in file is made by an Excel of our own that nobody sees, copied to the
folder from which Excel loads add-ins when it starts, and tried: its functions
must answer. Whatever fails, Excel is ended and the folder is as it was before.
"""

from __future__ import annotations

import argparse
import contextlib
import os
import shutil
import sys
import tempfile
from collections.abc import Callable, Iterator, Sequence
from pathlib import Path
from typing import Any, Final

from ...tools import version
from .xlam import FILE_NAME, XLWINGS_VERSION, WrongXlwings, make

OK, FAILED, REFUSED = 0, 1, 2

NEEDS: Final = """\
Excel can be fitted with the functions on Windows only: they need Excel for Windows as a desktop
program (2010 or later, 32 or 64 bit) and a Python with thrustbook on the same machine.

Excel on a Mac, in a browser or on a telephone cannot run them. What can be done instead:
  thrustbook evaluate BOOK.xlsx   computes the formulas and stores their values in the file
  thrustbook install calc         puts the functions into LibreOffice Calc, on any platform"""

TRUST: Final = """\
Excel must allow its VBA project to be written while the add-in is made. In Excel: File, Options,
Trust Center, Trust Center Settings, Macro Settings; tick "Trust access to the VBA project object
model", close Excel and run this command again. The tick can be taken away afterwards."""

CLOSE_EXCEL: Final = "Close every window of Excel, so that the file is free, and run this command again."

StartExcel = Callable[[], Any]
"""Gives an ``xlwings.App`` of its own."""


class Fault(Exception):
    """A step that failed, in words for the user."""

    def __init__(self, text: str, undone: bool = True) -> None:
        super().__init__(text)
        self.undone = undone


def install(options: argparse.Namespace) -> int:
    """Make the add-in and register it; 0 done, 1 failed and undone, 2 not possible here."""
    if sys.platform != "win32":
        print(NEEDS, file=sys.stderr)
        return REFUSED
    try:
        check_dll(Path(sys.executable))
        place = register(_start_excel, Path(sys.executable))
    except (Fault, WrongXlwings) as fault:
        undone = fault.undone if isinstance(fault, Fault) else True
        print(f"{fault}\nThe add-in was not installed.", file=sys.stderr)
        print("Nothing was changed." if undone else "See to the folder of Excel.", file=sys.stderr)
        return FAILED
    print(f"Installed: {place}\nStart Excel anew; =TB_VERSION() in a cell then tells the version.")
    return OK


def uninstall(options: argparse.Namespace) -> int:
    """Remove the add-in; 0 done or not there, 1 failed, 2 not possible here."""
    if sys.platform != "win32":
        print(NEEDS, file=sys.stderr)
        return REFUSED
    try:
        removed = remove(start_folders(_start_excel))
    except Fault as fault:
        print(f"{fault}\nNothing was changed.", file=sys.stderr)
        return FAILED
    print("\n".join(f"Removed: {file}" for file in removed) or "The add-in is not installed.")
    return OK


def check_dll(python: Path) -> None:
    """See that the DLL of xlwings is where its VBA looks for it: beside Python, or one folder up.

    Raises
    ------
    Fault
        With the folders looked at.
    """
    folders = (python.parent, python.parent.parent)
    if not any((f / f"xlwings64-{XLWINGS_VERSION}.dll").exists() for f in folders):
        raise Fault(
            f"xlwings64-{XLWINGS_VERSION}.dll is neither in {folders[0]} nor in {folders[1]}.\n"
            "Install thrustbook in a virtual environment (python -m venv) or for all users; an "
            "installation with --user, or the Python of the Microsoft Store, puts it elsewhere."
        )


def register(start: StartExcel, python: Path) -> Path:
    """Make the add-in, copy it where Excel looks and see that it answers; give its place.

    Raises
    ------
    Fault
        Naming the step that failed. The folder of Excel is then as it was.
    """
    workshop = Path(tempfile.mkdtemp(prefix="thrustbook-"))
    former = workshop / "former.xlam"
    undo: list[Callable[[], object]] = []
    try:
        target = _register(start, python, workshop / FILE_NAME, former, undo)
    except BaseException as failure:
        try:
            for step in reversed(undo):
                step()
        except OSError as error:
            kept = f"; it is kept as {former}" if former.exists() else ""
            text = f"{failure}\nThe folder of Excel could not be put back as it was ({error}){kept}."
            raise Fault(text, undone=False) from failure
        shutil.rmtree(workshop, ignore_errors=True)
        raise
    shutil.rmtree(workshop, ignore_errors=True)
    return target


def _register(
    start: StartExcel, python: Path, made: Path, former: Path, undo: list[Callable[[], object]]
) -> Path:
    # Excel has ended, and lets go of the file, before the caller undoes anything.
    with _excel(start) as excel:
        with _step("let Excel write VBA", TRUST):
            _try_vba(excel)
        with _step("make the add-in"):
            make(excel, python, made)
        with _step("find the folder from which Excel loads add-ins"):
            target = Path(excel.StartupPath) / FILE_NAME
        with _step(f"write {target}", CLOSE_EXCEL):
            _place(made, target, former, undo)
        with _step("see the functions answer"):
            _try_functions(excel, target)
    return target


def remove(folders: Sequence[Path]) -> list[Path]:
    """Remove the add-in from the folders; give the files removed.

    Raises
    ------
    Fault
        Where Excel holds the file.
    """
    removed = []
    for file in (folder / FILE_NAME for folder in folders):
        if file.exists():
            with _step(f"remove {file}", CLOSE_EXCEL):
                file.unlink()
            removed.append(file)
    return removed


def start_folders(start: StartExcel) -> list[Path]:
    """Give the folder from which Excel loads add-ins, also where Excel itself can no longer tell."""
    usual = Path(os.environ.get("APPDATA", "")) / "Microsoft" / "Excel" / "XLSTART"
    try:
        with _excel(start) as excel:
            told = Path(excel.StartupPath)
    except Fault:
        return [usual]
    return [told] if told == usual else [told, usual]


def _start_excel() -> Any:
    import xlwings

    return xlwings.App(visible=False, add_book=False)


@contextlib.contextmanager
def _step(what: str, advice: str = "") -> Iterator[None]:
    """Tell in words which step failed; COM raises many kinds of exception."""
    try:
        yield
    except (Fault, WrongXlwings):
        raise
    except Exception as error:
        raise Fault(f"Could not {what}: {error}" + (f"\n{advice}" if advice else "")) from error


@contextlib.contextmanager
def _excel(start: StartExcel) -> Iterator[Any]:
    with _step("start Excel", "Is Excel for Windows installed, and does it start by itself?"):
        app = start()
    try:
        with _step("prepare Excel"):
            excel = app.api
            excel.DisplayAlerts = False
        yield excel
    finally:
        try:
            app.quit()
        except Exception:  # an Excel that does not listen any more must not stay behind
            with contextlib.suppress(Exception):
                app.kill()


def _try_vba(excel: Any) -> None:
    book = excel.Workbooks.Add()
    try:
        int(book.VBProject.VBComponents.Count)
    finally:
        book.Close(False)


def _place(made: Path, target: Path, former: Path, undo: list[Callable[[], object]]) -> None:
    """Copy the file; an older one is kept aside, and comes back if a later step fails."""
    target.parent.mkdir(parents=True, exist_ok=True)
    if target.exists():
        shutil.copy2(target, former)
        undo.append(lambda: shutil.copy2(former, target))
    else:
        undo.append(lambda: target.unlink(missing_ok=True))
    shutil.copyfile(made, target)


def _try_functions(excel: Any, target: Path) -> None:
    """Enter formulas in a workbook of their own: the version, and a failure that must be a true error."""
    addin = excel.Workbooks.Open(str(target))
    try:
        book = excel.Workbooks.Add()
        try:
            cells = book.Worksheets(1)
            for address, formula, expected in (
                ("A1", "=TB_VERSION()", str(version([]))),
                ("A2", '=IF(ISERROR(TB_CONVERT("x","m","mm")),"a true error","no error")', "a true error"),
                ("A3", '=IF(TB_CONVERT(2,"m","mm")=2000,"2000","wrong")', "2000"),
            ):
                cell = cells.Range(address)
                cell.Formula = formula
                if cell.Value != expected:
                    raise Fault(f"The add-in does not answer: {formula} gives {cell.Text}, not {expected}.")
        finally:
            book.Close(False)
    finally:
        addin.Close(False)
