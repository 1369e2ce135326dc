"""A real office for the tests: started with the extension in a profile of its own, driven by a script."""

from __future__ import annotations

import json
import select
import shutil
import subprocess
import tempfile
import uuid
from pathlib import Path
from types import TracebackType
from typing import Any

from tests import libreoffice
from thrustbook.addin.hosts.calc import soffice

DRIVER = Path(__file__).with_name("driver.py")
PATIENCE = 120.0


def office_program() -> Path:
    """The office that the tests drive."""
    return libreoffice.program()


class Trouble(Exception):
    """The driver could not do what was asked."""


class Office:
    """One office and its driver; commands are methods of the driver, called by name."""

    def __init__(self, home: Path | None = None, bundled: bool = True) -> None:
        self.home = home or Path(tempfile.mkdtemp(prefix="thrustbook-test-"))
        self._own = home is None
        pipe = f"thrustbook{uuid.uuid4().hex}"
        if bundled:
            soffice.prepare(self.home)
        command = soffice.command(office_program(), self.home, f"--accept=pipe,name={pipe};urp;")
        self.process = subprocess.Popen(
            command,
            env=soffice.environment(),
            stdin=subprocess.DEVNULL,
            stdout=subprocess.DEVNULL,
            stderr=subprocess.DEVNULL,
            start_new_session=True,
        )
        self._driver = subprocess.Popen(
            [libreoffice.uno_python(), str(DRIVER), pipe],
            env=soffice.environment(),
            stdin=subprocess.PIPE,
            stdout=subprocess.PIPE,
            text=True,
        )
        try:
            self._answer()
        except BaseException:
            self.kill()
            raise

    def __enter__(self) -> Office:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        self.end()

    def __getattr__(self, name: str) -> Any:
        if name.startswith("_"):
            raise AttributeError(name)

        def command(*arguments: Any) -> Any:
            assert self._driver.stdin is not None
            self._driver.stdin.write(json.dumps([name, *arguments]) + "\n")
            self._driver.stdin.flush()
            return self._answer()

        return command

    def _answer(self) -> Any:
        assert self._driver.stdout is not None
        ready, _, _ = select.select([self._driver.stdout], [], [], PATIENCE)
        line = self._driver.stdout.readline() if ready else ""
        if not line:
            raise Trouble(f"the office did not answer within {PATIENCE:.0f} s or has gone")
        answer = json.loads(line)
        if "trouble" in answer:
            raise Trouble(answer["trouble"])
        return answer["ok"]

    def end(self) -> None:
        """Close the office as a person would; it is stopped where it does not."""
        try:
            if self._driver.poll() is None:
                self.quit()
            self.process.wait(30)
        except (Trouble, OSError, subprocess.TimeoutExpired):
            pass
        finally:
            self.kill()

    def kill(self) -> None:
        """Stop the office hard."""
        soffice.stop(self.process)
        self._driver.kill()
        self._driver.wait()
        if self._own:
            shutil.rmtree(self.home, ignore_errors=True)

    def processes(self, word: str) -> list[int]:
        """Processes of this office's session whose command line holds a word."""
        return session_processes(self.process.pid, word)


def session_processes(session: int, word: str) -> list[int]:
    """Processes of a session whose command line holds a word."""
    found = []
    for entry in Path("/proc").iterdir():
        if not entry.name.isdigit():
            continue
        try:
            state = (entry / "stat").read_text().rpartition(")")[2].split()
            words = (entry / "cmdline").read_bytes().decode("utf-8", "replace")
        except OSError:
            continue
        if int(state[3]) == session and state[0] != "Z" and word in words:
            found.append(int(entry.name))
    return found


def memory(pid: int) -> int:
    """Memory of a process that is its own, in bytes."""
    text = Path(f"/proc/{pid}/smaps_rollup").read_text()
    lines = (line.split() for line in text.splitlines())
    return 1024 * sum(int(line[1]) for line in lines if line[0].startswith("Private_"))
