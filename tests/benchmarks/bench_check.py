"""Time and memory of the check of a workbook of 10 000 TB_ cells.

    python -m tests.benchmarks.bench_check [CELLS]

The workbook has single cells of five functions with their headings; in one column an argument is
an expression, which the evaluator must work again. The check runs as a command of its own, as
a user runs it. Exit status 1 when it takes longer, or more memory, than it may, or finds anything.
"""

from __future__ import annotations

import os
import resource
import subprocess
import sys
import tempfile
import time
from pathlib import Path
from typing import Final

import openpyxl

from thrustbook.addin.hosts.headless.evaluate import evaluate_workbook
from thrustbook.addin.xlsx.package import Package

MOST_SECONDS: Final = 60.0
MOST_MEMORY: Final = 2e9
HEADS: Final = (
    "name",
    "D [mm]",
    "p [kPa]",
    "Q [L/s]",
    "theta [deg]",
    "V [m/s]",
    "Re",
    "f",
    "Fx [kN]",
    "Fy [kN]",
)
FORMULAS: Final = (
    "TB_VELOCITY($B$1,D{r},B{r})",
    "TB_REYNOLDS($B$1,$B$2,$B$3,F{r},B{r})",
    'TB_FRICTION("f",$B$1,G{r},,,0.1,B{r})',
    'TB_BEND("Fx",$B$1,$B$2,B{r},C{r},D{r},E{r})',
    'TB_BEND("Fy",$B$1,$B$2,B{r},C{r}+0,D{r},E{r})',
)


def build(path: Path, cells: int) -> None:
    """Write the workbook, and its values into it."""
    book = openpyxl.Workbook()
    ws = book.active
    assert ws is not None
    for line in (("units", "metric"), ("density", 998.0), ("viscosity", 1.0), (None,), HEADS):
        ws.append(line)
    for i in range(cells // len(FORMULAS)):
        row = 6 + i
        given = (f"B{i + 1}", 300.0 + i % 700, 400.0 + i % 300, 100.0 + i % 90, 10.0 + i % 80)
        ws.append([*given, *(f"={text.format(r=row)}" for text in FORMULAS)])
    book.save(path)
    package = Package.read(path)
    package.save(path, evaluate_workbook(package).replaced)


def main(cells: int) -> int:
    """Build, check, tell."""
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / "book.xlsx"
        build(path, cells)
        started = time.perf_counter()
        done = subprocess.run(
            [sys.executable, "-m", "thrustbook.addin.cli", "check", str(path)], capture_output=True, text=True
        )
        seconds = time.perf_counter() - started
        used = resource.getrusage(resource.RUSAGE_CHILDREN)
    memory = used.ru_maxrss * (1 if sys.platform == "darwin" else 1024)
    print(done.stdout.splitlines()[0] if done.stdout else done.stderr)
    print(f"{cells} cells on {os.cpu_count()} cores")
    processor = used.ru_utime + used.ru_stime
    print(f"time    {seconds:8.1f} s   (at most {MOST_SECONDS:.0f}; {processor:.1f} s of processor)")
    print(f"memory  {memory / 1e6:8.0f} MB  (at most {MOST_MEMORY / 1e6:.0f})")
    return int(done.returncode != 0 or seconds > MOST_SECONDS or memory > MOST_MEMORY)


if __name__ == "__main__":
    sys.exit(main(int(sys.argv[1]) if len(sys.argv) > 1 else 10_000))
