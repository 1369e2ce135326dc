"""LibreOffice without any extension, for recalculating plain workbooks."""

from __future__ import annotations

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
    subprocess.run(
        [
            str(libreoffice.program()),
            "--headless",
            "--norestore",
            f"-env:UserInstallation={profile.as_uri()}",
            "--convert-to",
            to,
            "--outdir",
            str(out),
            str(book),
        ],
        check=True,
        stdin=subprocess.DEVNULL,
        capture_output=True,
        timeout=300,
    )
    return out / f"{book.stem}.{to}"
