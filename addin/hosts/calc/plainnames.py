"""Names of our functions in a saved .xlsx, written as every host reads them."""

from __future__ import annotations

import os
import re
from pathlib import Path

from ...xlsx.package import Package
from ...xlsx.refusals import Refusal
from .office.settings import FUNCTIONS

_FULL = re.compile(
    rb"\b" + re.escape(FUNCTIONS).encode() + rb"\.(TB_[A-Z][A-Z0-9_]*)(?=\s*\()", re.IGNORECASE
)


def write_plain_names(path: Path) -> str:
    """Replace the office's full names in a workbook that it has just saved; gives "" or what went wrong.

    Every other byte of its parts stays, and the time of the file, so that the office
    does not take it for changed by somebody else.
    """
    try:
        package = Package.read(path)
        replaced = {}
        for name in package.names():
            if name.lower().startswith("xl/") and name.lower().endswith(".xml"):
                old = package.part(name)
                new = _FULL.sub(lambda match: match[1].upper(), old)
                if new != old:
                    replaced[name] = new
        if replaced:
            saved = path.stat()
            package.save(path, replaced)
            os.utime(path, ns=(saved.st_atime_ns, saved.st_mtime_ns))
    except Refusal as refusal:
        return str(refusal)
    except OSError as error:
        return f"{path}: {error.strerror or error}"
    return ""
