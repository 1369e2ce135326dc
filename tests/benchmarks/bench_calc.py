"""Speed of the functions in LibreOffice Calc, measured as ratios within one run of one office.

    python -m tests.benchmarks.bench_calc [ROWS]
    python -m tests.benchmarks.bench_calc --soak [CYCLES]

- one TB_BEND a row against the same sums as a sheet of ordinary formulas, 10 000 rows;
- TB_SCHEDULE on a table of 100 000 rows against the same in ordinary formulas: the bare sums,
  and the long-hand working in full with its conversions of units, as a checking sheet has it;
- a call of ours against a call of an add-in function that does nothing, in the same office.

The soak opens, recalculates and closes a workbook again and again and measures what
the office and the worker keep.
"""

from __future__ import annotations

import argparse
import shutil
import sys
import tempfile
from pathlib import Path
from typing import Final

from tests.addin.calc.office import Office, memory
from tests.benchmarks import calcbooks
from tests.benchmarks.emptyaddin import add_empty_function
from thrustbook.workbooks.templates import shipped

LEAST: Final = 5.0
"""How many times faster TB_SCHEDULE must be than the ordinary formulas."""
FORCES: Final = ("Fx", "Fy", "F", "dir")
SINGLE: Final = 10_000
REPEATS: Final = 5


def _seconds(office: Office, path: Path, again: str = "", repeats: int = REPEATS) -> float:
    """Least time of a whole recalculation; the first one, which starts the worker, is left out.

    ``again`` is an area whose formulas are entered anew before.
    """
    book = office.load(str(path))
    if again:
        office.enter_again(book, 0, again)
    office.recalculate(book)
    taken = [float(office.recalculate(book)) for _ in range(repeats)]
    office.close(book)
    return min(taken)


def _schedule(results: str, columns: int, rows: int) -> list[tuple[str, str, str]]:
    last = chr(ord("I") + columns - 1)
    text = f'TB_SCHEDULE("{results}","metric",A1:G1,A2:G{rows + 1})'
    return [("I", text, f"I2:{last}{rows + 1}")]


def measure(rows: int, folder: Path) -> int:
    """Run the benchmark; 1 where TB_SCHEDULE is not fast enough."""
    native = [(column, text, "") for column, text in calcbooks.NATIVE]
    bend = [("H", 'TB_BEND("F","metric",B{r},C{r},D{r},E{r},F{r},G{r})', "")]
    empty = [("H", "BENCH_EMPTY(B{r},C{r},D{r},E{r},F{r},G{r})", "")]
    few, many = calcbooks.bends(SINGLE), calcbooks.bends(rows)
    books = {
        "native_single": (few, native),
        "bend": (few, bend),
        "empty": (few, empty),
        "native": (many, native),
        "longhand F": (many, [(column, text, "") for column, text in calcbooks.longhand("F")]),
        "longhand": (many, [(column, text, "") for column, text in calcbooks.longhand(*FORCES)]),
        "numbers": (many, _schedule("Fx,Fy,F,dir,Rx,Ry,V1,V2,p2", 9, rows)),
        "forces": (many, _schedule(",".join(FORCES), len(FORCES), rows)),
        "F": (many, _schedule("F", 1, rows)),
    }
    for name, (values, formulas) in books.items():
        calcbooks.write(folder / f"{name}.xlsx", values, formulas)
    home = folder / "office"
    home.mkdir()
    add_empty_function(home)
    taken: dict[str, float] = {}
    with Office(home) as office:
        _agree(office, folder)
        for name in books:
            again = f"H2:H{SINGLE + 1}" if name == "empty" else ""
            taken[name] = _seconds(office, folder / f"{name}.xlsx", again)
    each = 1e6 / SINGLE
    print(f"{SINGLE} single cells, seconds for a whole recalculation")
    print(f"  native, 12 cells a bend    {taken['native_single']:8.3f}")
    print(f"  TB_BEND, 1 cell a bend     {taken['bend']:8.3f}  {taken['bend'] * each:6.1f} us a call")
    print(f"  an add-in that does nothing{taken['empty']:8.3f}  {taken['empty'] * each:6.1f} us a call")
    print(f"  TB_BEND / native           {taken['bend'] / taken['native_single']:8.1f}")
    print(f"  TB_BEND / empty            {taken['bend'] / taken['empty']:8.1f}")
    print(f"A table of {rows} bends in metric units, seconds")
    for name, text, cells in (
        ("native", "bare sums", len(calcbooks.NATIVE)),
        ("longhand F", "long-hand of F", len(calcbooks.longhand("F"))),
        ("longhand", "long-hand of Fx, Fy, F, dir", len(calcbooks.longhand(*FORCES))),
    ):
        print(f"  {f'{text}, {cells} cells a bend':46}{taken[name]:8.3f}")
    for name, text, hand in (
        ("F", "F", "longhand F"),
        ("forces", "Fx,Fy,F,dir", "longhand"),
        ("numbers", "all 9 numbers", "longhand"),
    ):
        bare, full = taken["native"] / taken[name], taken[hand] / taken[name]
        against = f"{bare:5.1f} x bare sums, {full:5.1f} x long-hand"
        print(f"  {f'TB_SCHEDULE, {text}':46}{taken[name]:8.3f}  {against}")
    ratio = taken["longhand F"] / taken["F"]
    verdict = "ok" if ratio >= LEAST else "TOO SLOW"
    print(f"The thrust on every bend: {ratio:.1f} times faster than by hand, wanted {LEAST:.0f}: {verdict}")
    return 0 if ratio >= LEAST else 1


def _agree(office: Office, folder: Path) -> None:
    """All ways of computing must give the same force before their speeds are compared."""
    by_hand = calcbooks.longhand("F")[-1][0]
    forces = []
    for name, column in (("native_single", "R"), ("bend", "H"), ("longhand F", by_hand), ("F", "I")):
        book = office.load(str(folder / f"{name}.xlsx"))
        office.recalculate(book)
        forces.append([line[0] for line in office.values(book, 0, f"{column}2:{column}{SINGLE + 1}")])
        office.close(book)
    for other in forces[1:]:
        worst = max(abs(a - b) / abs(a) for a, b in zip(forces[0], other, strict=True))
        if not worst < 1e-9:
            raise SystemExit(f"two ways of computing differ by {worst:.2g}")


def soak(cycles: int) -> int:
    """Open and close a workbook again and again; 1 where the memory kept is noticeable."""
    with tempfile.TemporaryDirectory(prefix="thrustbook-soak-") as folder, Office() as office:
        # A copy: the office leaves a lock beside the file that it has open.
        path = str(shutil.copy(shipped("pipe-run"), folder))

        def once() -> None:
            book = office.load(path)
            office.recalculate(book)
            office.close(book)

        for _ in range(min(50, cycles)):  # caches and fonts fill up first
            once()
        (office_pid,) = office.processes("soffice.bin")
        (worker_pid,) = office.processes("hosts.calc.worker")
        before = memory(office_pid), memory(worker_pid)
        for i in range(cycles):
            once()
            if (i + 1) % max(1, cycles // 10) == 0:
                now = memory(office_pid), memory(worker_pid)
                print(
                    f"{i + 1:6} cycles: office {now[0] / 1e6:7.1f} MB, worker {now[1] / 1e6:6.1f} MB",
                    flush=True,
                )
        kept = [(memory(p) - b) / cycles for p, b in zip((office_pid, worker_pid), before, strict=True)]
        workers = len(office.processes("hosts.calc.worker"))
    print(f"kept a cycle: office {kept[0] / 1e3:.1f} kB, worker {kept[1] / 1e3:.2f} kB; workers: {workers}")
    return 0 if kept[0] < 200e3 and kept[1] < 5e3 and workers == 1 else 1


def main() -> int:
    """Measure and print."""
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawTextHelpFormatter)
    parser.add_argument("rows", nargs="?", type=int, default=100_000)
    parser.add_argument("--soak", nargs="?", type=int, const=1000, metavar="CYCLES")
    options = parser.parse_args()
    if options.soak:
        return soak(options.soak)
    with tempfile.TemporaryDirectory(prefix="thrustbook-bench-") as folder:
        return measure(options.rows, Path(folder))


if __name__ == "__main__":
    sys.exit(main())
