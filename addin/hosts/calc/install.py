"""``thrustbook install calc`` and ``uninstall calc``.

The extension is built with this interpreter's path in it, tried in an office of its
own, and only then registered for the user by the office's own ``unopkg``. Every step
is bounded in time, and each may be repeated.
"""

from __future__ import annotations

import argparse
import os
import subprocess
import sys
import tempfile
from pathlib import Path
from typing import Final, NamedTuple

import openpyxl

from ...tools import product_version
from ...xlsx.refusals import Refusal
from . import soffice
from .extension import IDENTIFIER, archive, parts

OK, FAILED, REFUSED = 0, 1, 2
PATIENCE: Final = 120.0
"""Seconds that one call of the office's own program may take."""

_TRY: Final = '=TB_AREA("metric",300)'
_PROFILES: Final = (
    ".config/libreoffice",
    "Library/Application Support/LibreOffice",
    "AppData/Roaming/LibreOffice",
)


class Answer(NamedTuple):
    """What ``unopkg`` answered."""

    status: int
    text: str


class NotAnswered(Exception):
    """``unopkg`` did not end in time, and was stopped."""


def install(options: argparse.Namespace) -> int:
    """Build the extension, try it and register it for the user; 0: done, 1: it failed, 2: no office."""
    program = soffice.find("unopkg")
    if program is None or soffice.find() is None:
        print(soffice.ABSENT, file=sys.stderr)
        return REFUSED
    try:
        _try_functions()
        with tempfile.TemporaryDirectory(prefix="thrustbook-", ignore_cleanup_errors=True) as folder:
            file = Path(folder) / "thrustbook.oxt"
            file.write_bytes(archive(parts()))
            added = _unopkg(program, "add", "--force", "--suppress-license", str(file))
        if added.status == 0 and _registered(program):
            print(f"Installed: thrustbook {product_version()} for LibreOffice Calc{_for_whom()}.")
            print(_next_step("=TB_VERSION() in a cell then tells the version"))
            return OK
        fault = added.text or "the office does not list the extension afterwards"
    except (Refusal, NotAnswered) as error:
        fault = str(error)
    print(f"The extension was not installed: {fault}", file=sys.stderr)
    return FAILED


def uninstall(options: argparse.Namespace) -> int:
    """Remove the extension; 0 also where there is none, 1: it failed, 2: no office."""
    program = soffice.find("unopkg")
    if program is None:
        print(soffice.ABSENT, file=sys.stderr)
        return REFUSED
    try:
        if not _registered(program):
            print("The extension is not installed.")
            return OK
        removed = _unopkg(program, "remove", IDENTIFIER)
        if removed.status == 0 or not _registered(program):
            print(f"Removed: thrustbook from LibreOffice Calc{_for_whom()}.")
            print(_next_step("the functions are then gone"))
            return OK
        fault = removed.text
    except NotAnswered as error:
        fault = str(error)
    print(f"The extension was not removed: {fault}", file=sys.stderr)
    return FAILED


def _try_functions() -> None:
    """Have an office of its own evaluate one cell with the functions.

    Raises
    ------
    Refusal
        With what is missing.
    """
    with tempfile.TemporaryDirectory(prefix="thrustbook-", ignore_cleanup_errors=True) as folder:
        book = openpyxl.Workbook()
        book.worksheets[0].title = "Try"
        book.worksheets[0]["A1"] = _TRY
        path = Path(folder) / "try.xlsx"
        book.save(path)
        wanted = [{"sheet": "Try", "area": (1, 1, 1, 1)}]
        answer = soffice.batch({"book": str(path), "formulas": wanted}, PATIENCE)
    value = answer["formulas"][0][0][0]
    if not isinstance(value, float) or abs(value - 0.070685834705770) > 1e-12:
        raise Refusal(f"the functions do not answer in the office: {_TRY} gave {value}")


def _registered(program: Path) -> bool:
    listed = _unopkg(program, "list", IDENTIFIER)
    return listed.status == 0 and "is registered: yes" in listed.text


def _as_root() -> bool:
    return hasattr(os, "geteuid") and os.geteuid() == 0


def _for_whom() -> str:
    return ", for every user of this computer" if _as_root() else ""


def _unopkg(program: Path, *arguments: str) -> Answer:
    """Run ``unopkg``; it gets no input to wait for, and no more time than is reasonable."""
    # The system's administrator has no office of their own: unopkg installs for all users then.
    shared = ["--shared"] if _as_root() else []
    command = [str(program), arguments[0], *shared, *arguments[1:]]
    with tempfile.TemporaryFile() as said:
        group = {} if os.name == "nt" else {"start_new_session": True}
        process = subprocess.Popen(
            command,
            stdin=subprocess.DEVNULL,
            stdout=said,
            stderr=said,
            env=soffice.environment(),
            **group,  # type: ignore[call-overload]
        )
        try:
            status = process.wait(PATIENCE)
        except subprocess.TimeoutExpired:
            soffice.stop(process)
            raise NotAnswered(
                f"{program.name} did not end within {PATIENCE:.0f} s and was stopped. "
                "Close every window of LibreOffice and run this command again."
            ) from None
        said.seek(0)
        return Answer(status, said.read().decode("utf-8", "replace").strip())


def _next_step(then: str) -> str:
    if any(lock.exists() for folder in _PROFILES for lock in Path.home().glob(f"{folder}/*/.lock")):
        return f"LibreOffice seems to be open: close all its windows and start it again; {then}."
    return f"Start LibreOffice; {then}."
