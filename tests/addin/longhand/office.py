"""LibreOffice without any extension, for recalculating plain workbooks."""

from __future__ import annotations

import os
import signal
import subprocess
from pathlib import Path

from tests import libreoffice

# Value 0 of the recalculation mode: always, whoever wrote the file.
_SETTINGS = """<?xml version="1.0" encoding="UTF-8"?>
<oor:items xmlns:oor="http://openoffice.org/2001/registry" xmlns:xs="http://www.w3.org/2001/XMLSchema"
 xmlns:xsi="http://www.w3.org/2001/XMLSchema-instance">
<item oor:path="/org.openoffice.Office.Calc/Formula/Load"><prop oor:name="OOXMLRecalcMode" oor:op="fuse">
<value>0</value></prop></item>
</oor:items>
"""


def recalculated(book: Path, folder: Path, to: str = "xlsx") -> Path:
    """Load a workbook, recalculate everything, and give the file converted."""
    profile = folder / "profile"
    (profile / "user").mkdir(parents=True, exist_ok=True)
    (profile / "user" / "registrymodifications.xcu").write_text(_SETTINGS)
    out = folder / "out"
    out.mkdir(exist_ok=True)
    command = [
        str(libreoffice.program()),
        "--headless",
        "--norestore",
        f"-env:UserInstallation={profile.as_uri()}",
    ]
    command += ["--convert-to", to, "--outdir", str(out), str(book)]
    # A session of its own: the program starts another one, which must not outlive a failed test.
    with subprocess.Popen(
        command,
        stdin=subprocess.DEVNULL,
        stdout=subprocess.PIPE,
        stderr=subprocess.STDOUT,
        start_new_session=True,
    ) as process:
        try:
            said, _ = process.communicate(timeout=900)
        except BaseException:
            os.killpg(process.pid, signal.SIGKILL)
            raise
    assert process.returncode == 0, said
    return out / f"{book.stem}.{to}"
