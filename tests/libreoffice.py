"""The LibreOffice that some tests drive.

On a contributor's machine without one these tests are skipped, and say so; in
continuous integration (CI=true) its absence is a failure, so that a missing
install cannot hide.
"""

from __future__ import annotations

import os
import shutil
import subprocess
from pathlib import Path
from typing import NoReturn

import pytest

from thrustbook.addin.hosts.calc import soffice

NEEDED = (
    "this test drives a real LibreOffice; install it with its Python module (on Debian and Ubuntu: "
    "apt install libreoffice-calc python3-uno), or name the programs in the environment variables "
    "THRUSTBOOK_SOFFICE and THRUSTBOOK_UNO_PYTHON"
)


def missing(what: str = NEEDED) -> NoReturn:
    """Skip the test on a machine without the office; fail it in continuous integration."""
    if os.environ.get("CI", "").lower() in ("true", "1"):
        pytest.fail(what)
    pytest.skip(what)


def program() -> Path:
    """Give the office program."""
    return soffice.find() or missing()


def uno_python() -> str:
    """A Python that has the office's uno module."""
    candidates = [os.environ.get("THRUSTBOOK_UNO_PYTHON"), "/usr/bin/python3", shutil.which("python3")]
    beside = program().resolve().parent
    candidates += [str(beside / "python"), str(beside / "python.exe")]
    for python in candidates:
        if python and Path(python).exists():
            tried = subprocess.run(
                [python, "-c", "import uno"], capture_output=True, env=soffice.environment(), timeout=60
            )
            if tried.returncode == 0:
                return python
    missing()
