"""Runs every call of ``cases.py`` through xlwings' own code; started in a process of its own."""

from __future__ import annotations

import pickle
import sys
from pathlib import Path
from typing import Any

from .standins import ComError, load_xlwings


class Workbook:
    """A workbook that keeps what "Import Functions" does to it."""

    Name = "Book1.xlsm"

    def __init__(self) -> None:
        self.imported: list[str] = []
        self.options: list[tuple[str, dict[str, Any]]] = []
        self.VBProject = self
        self.VBComponents = self
        self.Application = self
        self.Version = "16.0"

    def __call__(self, name: str) -> Any:
        raise ComError(f"there is no component {name}")

    def Remove(self, component: Any) -> None:
        raise ComError("there is nothing to remove")

    def Import(self, path: str) -> None:
        self.imported.append(Path(path).read_text())

    def MacroOptions(self, macro: str, **options: Any) -> None:
        self.options.append((macro, options))


def main(target: Path) -> None:
    """Write the answers, the VBA that xlwings makes and the texts it registers, as a pickle."""
    xlwings = load_xlwings()
    from xlwings.com_server import XLPython

    from thrustbook.addin.hosts.excel.udfs import MODULE

    from .cases import all_cases

    server: Any = XLPython()
    answers = [server.CallUDF(MODULE, case.name, case.com_arguments()) for case in all_cases()]
    book = Workbook()
    xlwings.import_udfs(MODULE, book)
    target.write_bytes(pickle.dumps({"answers": answers, "imported": book.imported, "options": book.options}))


if __name__ == "__main__":
    main(Path(sys.argv[1]))
