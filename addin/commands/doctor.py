"""``thrustbook doctor``: what is installed, and which hosts can be used here."""

from __future__ import annotations

import argparse
import json
import platform
import sys
from collections.abc import Callable
from importlib import metadata
from typing import NamedTuple

from .. import describe
from ..tools import version

PACKAGES = ("thrustbook", "numpy", "pint", "openpyxl", "lxml", "formualizer", "xlwings")


class Finding(NamedTuple):
    """One thing looked at."""

    what: str
    state: str
    remark: str


def configure(parser: argparse.ArgumentParser) -> None:
    """Add the command's arguments."""
    parser.add_argument("--json", action="store_true", help="write the findings for a machine")


def run(options: argparse.Namespace) -> int:
    """Report; the exit status is 1 where the headless host itself cannot run."""
    packages = [_package(name) for name in PACKAGES]
    hosts = [_try("headless", _headless), _try("LibreOffice Calc", _calc), _try("Excel", _excel)]
    if options.json:
        print(
            json.dumps({"packages": [f._asdict() for f in packages], "hosts": [f._asdict() for f in hosts]})
        )
    else:
        print(version([]))
        print(f"Python {platform.python_version()} at {sys.executable}, {platform.platform(terse=True)}\n")
        print(
            "\n".join(["Packages", *describe.in_columns(packages), "", "Hosts", *describe.in_columns(hosts)])
        )
    return 0 if hosts[0].state == "ready" and all(p.state != "missing" for p in packages) else 1


def _package(name: str) -> Finding:
    try:
        return Finding(name, metadata.version(name), "")
    except metadata.PackageNotFoundError:
        return Finding(name, "missing", f"install it with: python -m pip install {name}")


def _try(name: str, look: Callable[[], tuple[str, str]]) -> Finding:
    try:
        return Finding(name, *look())
    except Exception as error:  # a broken installation must be reported, whatever it raises
        return Finding(name, "broken", f"{type(error).__name__}: {error}")


def _headless() -> tuple[str, str]:
    import formualizer

    book = formualizer.Workbook()
    book.add_sheet("S")
    book.set_formula("S", 1, 1, "=1+1")
    book.evaluate_all()
    answer = book.get_value("S", 1, 1)
    return ("ready", "thrustbook evaluate BOOK") if answer == 2 else ("broken", f"1 + 1 gave {answer}")


def _calc() -> tuple[str, str]:
    from ..hosts.calc import soffice

    found = soffice.find()
    if found is None:
        return "absent", "LibreOffice was not found; it is needed only for use inside Calc"
    return "found", f"{found}; thrustbook install calc puts the functions in"


def _excel() -> tuple[str, str]:
    if sys.platform != "win32":
        return "absent", "needs Excel for Windows; here, use evaluate or LibreOffice Calc"
    import winreg

    with winreg.OpenKey(winreg.HKEY_CLASSES_ROOT, r"Excel.Application\CurVer") as key:
        return "found", f"{winreg.QueryValue(key, None)}; thrustbook install excel puts the functions in"
