"""Builds the template workbooks: ``python -m thrustbook.workbooks.build [NAME ...]``.

A template is laid out by its builder, evaluated by the headless host and stored with
its values. Building it again gives the same bytes, so the shipped file can be checked.
"""

from __future__ import annotations

import io
import re
import sys
import tempfile
import zipfile
from collections.abc import Sequence
from pathlib import Path
from typing import Final

from thrustbook.addin.hosts.headless.evaluate import evaluate_workbook
from thrustbook.addin.xlsx.package import Package

from . import pipe_run
from .templates import TEMPLATES, shipped

_BUILDERS: Final = {"pipe-run": pipe_run.build}
_DATE: Final = (2026, 1, 1, 0, 0, 0)
_MODIFIED: Final = re.compile(rb"(<dcterms:modified[^>]*>)[^<]*(</dcterms:modified>)")


def build(name: str) -> bytes:
    """Build one template and give the file's bytes.

    Raises
    ------
    RuntimeError
        Where a cell of the new workbook fails: a template must be right.
    """
    buffer = io.BytesIO()
    _BUILDERS[name]().save(buffer)
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / "book.xlsx"
        path.write_bytes(_without_clock(buffer.getvalue()))
        package = Package.read(path)
        evaluation = evaluate_workbook(package, fill_native=True)
        if not evaluation.ok or evaluation.native_kept:
            raise RuntimeError(f"{name}: {evaluation.errors[:5]} {evaluation.native_kept[:5]}")
        package.save(path, evaluation.replaced)
        return path.read_bytes()


def _without_clock(data: bytes) -> bytes:
    """Take the time of writing out of a package."""
    out = io.BytesIO()
    with zipfile.ZipFile(io.BytesIO(data)) as old, zipfile.ZipFile(out, "w", zipfile.ZIP_DEFLATED) as new:
        for member in old.infolist():
            entry = zipfile.ZipInfo(member.filename, _DATE)
            entry.compress_type = zipfile.ZIP_DEFLATED
            entry.external_attr = 0o644 << 16
            new.writestr(entry, _MODIFIED.sub(rb"\g<1>2026-01-01T00:00:00Z\g<2>", old.read(member)))
    return out.getvalue()


def main(arguments: Sequence[str]) -> int:
    """Build the named templates, or all."""
    for name in arguments or TEMPLATES:
        shipped(name).write_bytes(build(name))
        print(f"wrote {shipped(name)}")
    return 0


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
