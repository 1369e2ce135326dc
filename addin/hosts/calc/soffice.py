"""The office program: where it is, and how it is started for us alone."""

from __future__ import annotations

import contextlib
import json
import os
import shutil
import subprocess
import sys
import tempfile
import time
from collections.abc import Iterator, Mapping
from pathlib import Path
from typing import Any
from urllib.parse import quote

from ...xlsx.refusals import Refusal
from .extension import parts, unpack_to
from .office.settings import BATCH

ABSENT = (
    "LibreOffice was not found. Install it (on Debian and Ubuntu: apt install libreoffice-calc python3-uno), "
    "or name its program in the environment variable THRUSTBOOK_SOFFICE."
)


def find(name: str = "soffice") -> Path | None:
    """Find a program of the office (soffice or unopkg), None when there is none."""
    given = os.environ.get("THRUSTBOOK_SOFFICE")
    if given:
        beside = Path(given) if name == "soffice" else Path(given).resolve().with_name(name)
        return next(
            (p for p in (beside, beside.with_suffix(".com"), beside.with_suffix(".exe")) if p.is_file()), None
        )
    found = shutil.which(name) or (shutil.which("libreoffice") if name == "soffice" else None)
    if found:
        return Path(found)
    for folder in _usual_folders():
        for file in (folder / name, folder / f"{name}.com", folder / f"{name}.exe"):
            if file.is_file():
                return file
    return None


def _usual_folders() -> Iterator[Path]:
    for variable in ("ProgramFiles", "ProgramW6432", "ProgramFiles(x86)"):
        if variable in os.environ:
            yield Path(os.environ[variable]) / "LibreOffice" / "program"
    yield Path("/Applications/LibreOffice.app/Contents/MacOS")
    yield Path.home() / "Applications/LibreOffice.app/Contents/MacOS"
    yield Path("/usr/lib/libreoffice/program")
    yield from sorted(Path("/opt").glob("libreoffice*/program"), reverse=True)


def environment() -> dict[str, str]:
    """The environment for an office started from here.

    With a virtual environment in front of the path, the Python inside the office
    looks for its own modules there and fails.
    """
    kept = {k: v for k, v in os.environ.items() if k not in ("VIRTUAL_ENV", "PYTHONHOME", "PYTHONPATH")}
    if sys.prefix != sys.base_prefix:
        own = {Path(sys.executable).parent, Path(sys.prefix) / "bin", Path(sys.prefix) / "Scripts"}
        folders = [f for f in kept.get("PATH", "").split(os.pathsep) if f and Path(f) not in own]
        kept["PATH"] = os.pathsep.join(folders)
    return kept


def command(program: Path, home: Path, *arguments: str) -> list[str]:
    """The command line of an office with its own profile, and with the extension unpacked in ``home``."""
    return [
        str(program),
        f"-env:BUNDLED_EXTENSIONS={(home / 'extensions').as_uri()}",
        f"-env:UserInstallation={(home / 'profile').as_uri()}",
        "--headless",
        "--norestore",
        "--nologo",
        "--nodefault",
        *arguments,
    ]


def prepare(home: Path, python: str | None = None) -> None:
    """Unpack the extension for an office of its own in an empty folder."""
    unpack_to(home / "extensions" / "thrustbook", parts(python))


def batch(request: Mapping[str, Any], timeout: float) -> dict[str, Any]:
    """Have a request answered by an office started for it alone.

    Raises
    ------
    Refusal
        No office, an office that does not answer in time, or one that cannot load the workbook.
    """
    program = find()
    if program is None:
        raise Refusal(ABSENT)
    with tempfile.TemporaryDirectory(prefix="thrustbook-", ignore_cleanup_errors=True) as folder:
        home = Path(folder)
        prepare(home)
        answer = home / "answer.json"
        paper = home / "request.json"
        paper.write_text(json.dumps({**request, "answer": str(answer)}), encoding="utf-8")
        arguments = command(program, home, f"service:{BATCH}?{quote(str(paper))}")
        _run(arguments, answer, timeout)
        if not answer.exists():
            raise Refusal(
                f"LibreOffice ended without an answer. Look whether {program} starts, and whether its "
                "Python support is installed (on Debian and Ubuntu: apt install python3-uno)."
            )
        found: dict[str, Any] = json.loads(answer.read_text(encoding="utf-8"))
    if "trouble" in found:
        last = str(found["trouble"]).strip().splitlines()[-1]
        raise Refusal(f"LibreOffice could not evaluate the workbook: {last}")
    return found


def _run(arguments: list[str], answer: Path, timeout: float) -> None:
    """Run an office until it ends; one that does not end is stopped with all that it started."""
    group: dict[str, Any] = {} if os.name == "nt" else {"start_new_session": True}
    process = subprocess.Popen(
        arguments,
        env=environment(),
        stdin=subprocess.DEVNULL,
        stdout=subprocess.DEVNULL,
        stderr=subprocess.DEVNULL,
        **group,
    )
    limit = time.monotonic() + timeout
    try:
        while process.poll() is None:
            if time.monotonic() > limit:
                raise Refusal(
                    f"LibreOffice did not answer within {timeout:.0f} s and was stopped; nothing was changed."
                )
            time.sleep(0.05)
            if answer.exists():
                limit = min(limit, time.monotonic() + 30.0)
    except Refusal:
        if not answer.exists():
            raise
    finally:
        if process.poll() is None:
            stop(process)


def stop(process: subprocess.Popen[Any]) -> None:
    """End an office started by :func:`command` in a session of its own."""
    if os.name == "nt":
        subprocess.run(["taskkill", "/F", "/T", "/PID", str(process.pid)], capture_output=True, check=False)
    else:
        import signal

        with contextlib.suppress(ProcessLookupError):
            os.killpg(process.pid, signal.SIGKILL)
    with contextlib.suppress(subprocess.TimeoutExpired):
        process.wait(timeout=10)
