"""The one worker process of an office, and the calls handed to it."""

from __future__ import annotations

import os
import subprocess
import tempfile
import threading
import time
from collections.abc import Callable, Sequence
from typing import IO, Any

from . import wire

PATIENCE = 300.0
"""Seconds after which a call is given up and the worker ended, so that the office is never stuck for good."""
RETRY_AFTER = 20.0
"""Seconds before a worker that could not be started is tried again: a sheet of calls must fail quickly."""

# An office carries its own Python's settings; the worker's Python must not see them.
_FOREIGN = ("PYTHONHOME", "PYTHONPATH", "PYTHONSTARTUP", "LD_LIBRARY_PATH", "DYLD_LIBRARY_PATH", "UNO_PATH")


class Unavailable(Exception):
    """The worker cannot be started, or has died twice in one call; the text says why."""


class Link:
    """Starts the worker on first use and keeps it for all later calls."""

    def __init__(self, command: Sequence[str], clock: Callable[[], float] = time.monotonic) -> None:
        self._command = list(command)
        self._clock = clock
        self._lock = threading.RLock()
        self._process: subprocess.Popen[bytes] | None = None
        self._errors: IO[bytes] | None = None
        self._failed_at: float | None = None
        self._failure = ""
        self._busy_since: float | None = None
        self._watch: threading.Thread | None = None
        self.started = 0

    @property
    def pid(self) -> int | None:
        """Process number of the worker, None while there is none."""
        return None if self._process is None else self._process.pid

    def request(self, payload: bytes) -> bytes:
        """Send a request and wait for the answer; a worker found dead is started again once.

        Raises :class:`Unavailable`.
        """
        with self._lock:
            for attempt in (1, 2):
                fresh = self._process is None
                process = self._running()
                self._busy_since = self._clock()
                try:
                    wire.send(process.stdin, payload)  # type: ignore[arg-type]
                    return wire.receive(process.stdout)  # type: ignore[arg-type]
                except wire.Closed:
                    gave_up = self._clock() - (self._busy_since or 0.0) > PATIENCE
                    reason = self._ended()
                    if gave_up:
                        raise Unavailable(f"the call took longer than {PATIENCE:.0f} s") from None
                    if attempt == 2 or (fresh and self.started > 1):
                        self._fail("the calculation process ended" + reason)
                finally:
                    self._busy_since = None
        raise AssertionError("not reached")

    def _running(self) -> subprocess.Popen[bytes]:
        if self._process is not None:
            return self._process
        if self._failed_at is not None and self._clock() - self._failed_at < RETRY_AFTER:
            raise Unavailable(self._failure)
        environment: dict[str, str] = {k: v for k, v in os.environ.items() if k not in _FOREIGN}
        self._errors = tempfile.TemporaryFile()  # noqa: SIM115 - kept as long as the worker
        try:
            self._process = subprocess.Popen(
                self._command,
                stdin=subprocess.PIPE,
                stdout=subprocess.PIPE,
                stderr=self._errors,
                env=environment,
                cwd=tempfile.gettempdir(),
                creationflags=getattr(subprocess, "CREATE_NO_WINDOW", 0),
            )
        except OSError as error:
            self._fail(f"{self._command[0]} cannot be started ({error.strerror or error})")
        self.started += 1
        process = self._process
        assert process is not None
        _widen(process.stdin)
        _widen(process.stdout)
        try:
            hello = wire.receive(process.stdout)  # type: ignore[arg-type]
        except wire.Closed:
            self._fail("the calculation process could not start" + self._ended())
        if hello != b"thrustbook %d" % wire.PROTOCOL:
            self.close()
            self._fail("the extension and the installed thrustbook differ; run: thrustbook install calc")
        self._failed_at = None
        if self._watch is None:
            self._watch = threading.Thread(target=self._guard, name="thrustbook watch", daemon=True)
            self._watch.start()
        return process

    def _fail(self, reason: str) -> None:
        self._failed_at, self._failure = self._clock(), reason
        raise Unavailable(reason)

    def _ended(self) -> str:
        """Put the dead worker away and give the last line that it wrote, if any."""
        self.close()
        line = ""
        if self._errors is not None:
            self._errors.seek(0)
            lines = self._errors.read()[-4000:].decode("utf-8", "replace").split("\n")
            line = next((text.strip() for text in reversed(lines) if text.strip()), "")
            self._errors.close()
            self._errors = None
        return ": " + line if line else ""

    def close(self) -> None:
        """End the worker."""
        process, self._process = self._process, None
        if process is None:
            return
        for stream in (process.stdin, process.stdout):
            try:
                if stream is not None:
                    stream.close()
            except OSError:
                pass
        try:
            process.wait(timeout=2)
        except subprocess.TimeoutExpired:
            process.kill()
            process.wait()

    def _guard(self) -> None:
        """End a worker that has been at one call for too long."""
        while True:
            time.sleep(1.0)
            since, process = self._busy_since, self._process
            if since is not None and process is not None and self._clock() - since > PATIENCE:
                process.kill()


def _widen(pipe: Any) -> None:
    """Let a pipe hold a megabyte, where the system can: a table then needs few turns."""
    try:
        import fcntl

        fcntl.fcntl(pipe.fileno(), getattr(fcntl, "F_SETPIPE_SZ", 1031), 1 << 20)
    except (ImportError, OSError, ValueError):
        pass


class Caller:
    """Calls worksheet functions through a link. Never raises: what fails is an error value."""

    def __init__(self, link: Link) -> None:
        self._link = link

    def value(self, name: str, args: Sequence[Any]) -> Any:
        """Call a function; gives a value, or rows of them."""
        try:
            answer = self._link.request(wire.pack_call(name, args))
            return wire.unpack(answer, 0, wire.read_rows)[0]
        except Unavailable as error:
            # The one call that must answer when nothing works is the one that tells why.
            if name == "TB_WHY":
                return "not calculated: " + str(error)
        except TypeError:
            pass  # a value that no cell can hold
        return wire.error_number(wire.ERROR_CODES["VALUE"])

    def rows(self, name: str, args: Sequence[Any]) -> Any:
        """Call a function; gives rows, the form in which the office takes arrays."""
        value = self.value(name, args)
        return value if type(value) is tuple else ((value,),)

    def plain_names(self, path: str) -> str:
        """Have the names of our functions in a saved .xlsx written plainly; gives "" or what went wrong."""
        try:
            return self._link.request(wire.pack_text_request(wire.PLAIN_NAMES, path)).decode("utf-8")
        except Unavailable as error:
            return str(error)


def worker_command(python: str) -> list[str]:
    """Give the command line of the worker."""
    # -E and -P: neither the office's environment nor a file in the current folder may come between.
    return [python, "-E", "-P", "-m", "thrustbook.addin.hosts.calc.worker"]
