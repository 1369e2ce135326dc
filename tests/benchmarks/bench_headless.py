"""Speed and memory of the headless host, measured as ratios within one run.

    python -m tests.benchmarks.bench_headless [ROWS]

- TB_SCHEDULE on a table of bends (100 000 rows) against the same sums as ordinary
  formulas (12 cells a row) in the same evaluator. Timed is what the evaluator does once
  the workbook is loaded; reading the file and storing the values are told apart.
- 10 000 cells of TB_BEND against a registered callback that does nothing, both with the
  same arguments.
- Peak memory of evaluating and storing the table, in a process of its own.
- Start of the command line, as a whole process.
"""

from __future__ import annotations

import gc
import statistics
import subprocess
import sys
import tempfile
import time
from collections.abc import Callable, Iterable
from pathlib import Path
from typing import Any, Final

import formualizer
import openpyxl

from thrustbook.addin.hosts.headless.evaluate import evaluate_workbook
from thrustbook.addin.hosts.headless.host import Functions, Host
from thrustbook.addin.xlsx.package import Package

HEADINGS: Final = ("name", "fitting", "rho", "D1", "p1", "Q", "theta", "K")
NATIVE: Final = (  # the bend of TB_BEND in metric units, long-hand, a cell each
    "PI()/4*(D{r}/1000)^2",
    "F{r}/1000/J{r}",
    "K{r}",
    "E{r}*1000",
    "M{r}-H{r}*C{r}*K{r}^2/2",
    "M{r}*J{r}+C{r}*K{r}^2*J{r}",
    "N{r}*J{r}+C{r}*L{r}^2*J{r}",
    "(O{r}-P{r}*COS(RADIANS(G{r})))/1000",
    "-P{r}*SIN(RADIANS(G{r}))/1000",
    "SQRT(Q{r}^2+R{r}^2)",
    "DEGREES(ATAN2(Q{r},R{r}))",
    "-Q{r}",
)
SINGLE_CELLS: Final = 10_000


def rows(count: int) -> Iterable[list[Any]]:
    """Bends of invented sizes."""
    for i in range(count):
        yield [
            f"B{i}",
            "bend",
            1000.0,
            200.0 + i % 40 * 10,
            300.0 + i % 7 * 50,
            20.0 + i % 90,
            5.0 + i % 86,
            0.2,
        ]


def save(path: Path, count: int, formulas: Callable[[int], list[str]]) -> None:
    """Write a workbook of bends with formulas behind the columns of each row."""
    book = openpyxl.Workbook(write_only=True)
    sheet = book.create_sheet("S")
    sheet.append(list(HEADINGS))
    for i, row in enumerate(rows(count), 2):
        sheet.append([*row, None, *formulas(i)])
    book.save(path)


def schedule(count: int) -> Callable[[int], list[Any]]:
    """One array formula in the first row."""

    def formulas(i: int) -> list[Any]:
        text = f'=TB_SCHEDULE("all","metric",A1:H1,A2:H{count + 1})'
        return [openpyxl.worksheet.formula.ArrayFormula(f"J2:U{count + 1}", text)] if i == 2 else []

    return formulas


def timed(action: Callable[[], Any]) -> tuple[float, Any]:
    """Run once."""
    start = time.perf_counter()
    outcome = action()
    return time.perf_counter() - start, outcome


def evaluated(path: Path, prepare: Callable[[Any], None] = lambda book: None) -> float:
    """Load a workbook into the evaluator, then time the evaluation alone."""
    book = formualizer.Workbook.from_path(str(path))
    prepare(book)
    gc.disable()  # as the host does
    try:
        return timed(book.evaluate_all)[0]
    finally:
        gc.enable()


def bench_schedule(folder: Path, count: int) -> None:
    """Compare the block function with ordinary formulas."""
    save(folder / "native.xlsx", count, lambda i: ["=" + f.format(r=i) for f in NATIVE])
    save(folder / "block.xlsx", count, schedule(count))
    functions = Functions.of_catalogue()
    kept: list[Any] = []

    def whole(*args: Any) -> float:
        # As the host does with a large block: the grid is kept, the evaluator gets a value.
        kept.append(functions.call("TB_SCHEDULE", args))
        return 0.0

    def prepare(book: Any) -> None:
        book.register_function("TB_SCHEDULE", whole)
        book.set_formula("S", 2, 10, f'=TB_SCHEDULE("all","metric",A1:H1,A2:H{count + 1})')

    pairs = [(evaluated(folder / "block.xlsx", prepare), evaluated(folder / "native.xlsx")) for _ in range(3)]
    ours = min(a for a, _ in pairs)
    ratio = statistics.median(b / a for a, b in pairs)
    print(f"TB_SCHEDULE, {count} rows by 12 results, in the evaluator")
    print(f"  {ours / count * 1e6:.2f} us a row; ordinary formulas take {ratio:.1f} times as long")
    read, package = timed(lambda: Package.read(folder / "block.xlsx"))
    work, evaluation = timed(lambda: evaluate_workbook(package))
    store, _ = timed(lambda: package.save(folder / "out.xlsx", evaluation.replaced))
    print(f"  the whole command: read {read:.2f} s, evaluate and lay out {work:.2f} s, save {store:.2f} s")


def bench_single_cells() -> None:
    """Compare 10 000 single cells with an empty callback."""
    host = Host(Functions.of_catalogue())

    def book(name: str, register: Callable[[Any], None]) -> Any:
        made = formualizer.Workbook()
        made.add_sheet("S")
        register(made)
        cells = [[200.0 + i % 50, 0.0, 20.0 + i % 80] for i in range(SINGLE_CELLS)]
        for start in range(0, SINGLE_CELLS, 1000):
            made.set_values_batch("S", start + 1, 1, cells[start : start + 1000])
        texts = [[f'={name}("F","metric",1000,A{i},400,C{i},90)'] for i in range(1, SINGLE_CELLS + 1)]
        made.set_formulas_batch("S", 1, 5, texts)
        return made

    ratios = []
    for _ in range(5):
        empty = book("TB_EMPTY", lambda b: b.register_function("TB_EMPTY", lambda *a: 1.0))
        ours = book("TB_BEND", host.register)
        nothing, bend = timed(empty.evaluate_all)[0], timed(ours.evaluate_all)[0]
        ratios.append(bend / nothing)
    print(f"{SINGLE_CELLS} cells of TB_BEND")
    print(f"  {statistics.median(ratios):.2f} times an empty callback (median of 5; asked: at most 2.5)")


def peak(path: Path) -> float:
    """Peak memory [MB] of the command that evaluates and stores a workbook."""
    code = (
        "import resource, subprocess, sys; "
        "subprocess.run(sys.argv[1:], check=True, stdout=subprocess.DEVNULL); "
        "print(resource.getrusage(resource.RUSAGE_CHILDREN).ru_maxrss / 1000)"
    )
    command = [sys.executable, "-m", "thrustbook.addin.cli", "evaluate", str(path), "-o", f"{path}.out.xlsx"]
    done = subprocess.run([sys.executable, "-c", code, *command], check=True, capture_output=True, text=True)
    return float(done.stdout)


def main() -> None:
    """Print all figures."""
    count = int(sys.argv[1]) if len(sys.argv) > 1 else 100_000
    with tempfile.TemporaryDirectory() as folder:
        bench_schedule(Path(folder), count)
        memory = peak(Path(folder) / "block.xlsx")
    print(f"  peak memory of the whole command {memory:.0f} MB (asked: below 500)")
    bench_single_cells()
    start = [
        timed(lambda: subprocess.run([sys.executable, "-m", "thrustbook.addin.cli", "functions"], check=True,
                                     capture_output=True))[0]
        for _ in range(5)
    ]  # fmt: skip
    print(
        f"Start of `thrustbook functions`: {statistics.median(start):.2f} s (median of 5; asked: below 0.4)"
    )


if __name__ == "__main__":
    main()
