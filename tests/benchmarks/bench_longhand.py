"""Time and memory of ``thrustbook longhand`` and ``detach`` on a workbook of many cells.

Run as ``python -m tests.benchmarks.bench_longhand [CELLS]``; 10 000 cells without an argument.
"""

from __future__ import annotations

import resource
import sys
import tempfile
import time
from pathlib import Path

import openpyxl
from openpyxl.workbook.defined_name import DefinedName

from thrustbook.addin.hosts.headless.evaluate import evaluate_workbook
from thrustbook.addin.longhand.detach import Detached
from thrustbook.addin.longhand.make import Made
from thrustbook.addin.xlsx.package import Package


def make(path: Path, cells: int) -> None:
    """Write a sheet of bends, four cells of ours a row."""
    book = openpyxl.Workbook()
    sheet = book.active
    sheet.title = "Bends"
    units = book.create_sheet("Units")
    for pair in (("set", "metric"), ("pressure", "bar"), ("force", "kN")):
        units.append(pair)
    book.defined_names["Units"] = DefinedName("Units", attr_text="Units!$A$1:$B$3")
    for i in range(1, cells // 4 + 1):
        values = [1000.0, 300.0 + i % 7, 5.0 + i % 3, 100.0 + i % 11, 15.0 * (1 + i % 6)]
        call = f"Units,A{i},B{i},C{i},D{i},E{i}"
        formulas = [f'=TB_BEND("{name}",{call})' for name in ("Fx", "Fy", "R")]
        sheet.append([*values, *formulas, f"=TB_VELOCITY(Units,D{i},B{i})"])
    book.save(path)


def main() -> None:
    cells = int(sys.argv[1]) if len(sys.argv) > 1 else 10_000
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / "bends.xlsx"
        make(path, cells)
        package = Package.read(path)
        package.save(path, evaluate_workbook(package).replaced)
        for name, kind in (("longhand", Made), ("detach", Detached)):
            started = time.perf_counter()
            kind(Package.read(path)).save(Path(folder) / f"{name}.xlsx")
            seconds = time.perf_counter() - started
            size = (Path(folder) / f"{name}.xlsx").stat().st_size / 1e6
            memory = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1e6
            print(
                f"{name}: {cells} cells in {seconds:.1f} s, file {size:.1f} MB, peak memory {memory:.2f} GB"
            )


if __name__ == "__main__":
    main()
