"""A workbook full of random table calls: runs, load cases, schedules, balances, junctions."""

from __future__ import annotations

import random
from collections.abc import Callable, Sequence
from pathlib import Path
from typing import Any

import openpyxl
from openpyxl.worksheet.formula import ArrayFormula

from thrustbook.addin.blocks.schedule import COLUMN_OF
from thrustbook.addin.catalogue.registry import CATALOGUE
from thrustbook.addin.cells import CellError
from thrustbook.addin.dispatch import call
from thrustbook.addin.xlsx.a1 import column_letters

from .samples import sample

Rows = list[list[Any]]
NODE_HEADS = ["name", "x [m]", "y [m]", "z [m]", "D [mm]", "e [mm]", "K", "Hp [m]", "Qo [L/s]", "ox", "oy"]
NODE_HEADS += ["oz", "Do [mm]", "Ko", "Dj [mm]", "f", "alpha", "beta"]
CASE_HEADS = ["case", "kind", "Q", "p", "H", "zp", "pump", "offtakes", "dp", "dp2", "rho", "valve", "H2"]
RUN_RESULTS = "name,fitting,s,Q1,Q2,V1,V2,p1,p2,HGL1,HGL2,EGL1,EGL2,theta,Fx,Fy,Fz,F,Fh,bearing,Fv,drag,W,L"
RUN_RESULTS += ",Re,fD,hf,hK,po,Vo,note"
CASE_RESULTS = "name,F,case_F,Fh,case_Fh,bearing,Fx,case_Fx,Fy,case_Fy,Fz,case_Fz,p,case_p"


class Book:
    """Cells put one table below the other, each sheet a kind of call."""

    def __init__(self) -> None:
        self.workbook = openpyxl.Workbook()
        self.workbook.remove(self.workbook.active)
        self.areas: list[tuple[str, str]] = []

    def sheet(self, name: str) -> Any:
        found = self.workbook.create_sheet(name)
        found.next_row = 1
        return found

    def put(self, sheet: Any, rows: Rows, gap: int = 1) -> str:
        """Put rows of values; the reference to them comes back."""
        top = sheet.next_row
        for i, line in enumerate(rows):
            for j, value in enumerate(line, 1):
                if value is not None:
                    sheet.cell(top + i, j, value)
        sheet.next_row = top + len(rows) + gap
        return f"$A${top}:${column_letters(max(map(len, rows)))}${top + len(rows) - 1}"

    def formula(self, sheet: Any, text: str, rows: int, cols: int) -> None:
        """Put an array formula."""
        top = sheet.next_row
        area = f"A{top}:{column_letters(cols)}{top + rows - 1}"
        sheet[f"A{top}"] = ArrayFormula(area, text)
        self.areas.append((sheet.title, area))
        sheet.next_row = top + rows + 2


def _maybe(random_: random.Random, share: float, value: Any) -> Any:
    return value if random_.random() < share else None


def nodes(random_: random.Random, end: str, most: int = 5) -> Rows:
    """Rows of nodes with reducers, offtakes, pumps and joints."""
    count = random_.randint(2, most)
    x = y = z = 0.0
    rows: Rows = []
    for n in range(count):
        last = n == count - 1
        D = random_.choice([150, 200, 300, 450])
        tap = random_.random() < 0.25
        rows.append(
            [
                f"N{n + 1}",
                x,
                y,
                z,
                random_.uniform(30, 90) if last and end == "jet" else D,
                random_.choice([0.0, 0.05, 1.0]),
                random_.choice([None, 0.0, 0.3, 2.0]),
                None if n == 0 or last else _maybe(random_, 0.2, random_.uniform(-5, 40)),
                random_.uniform(-15, 30) if tap else None,
                random_.uniform(-1, 1) if tap else None,
                random_.uniform(-1, 1) if tap else None,
                _maybe(random_, 0.5, random_.uniform(-1, 1)) if tap else None,
                random_.uniform(80, 200) if tap else None,
                _maybe(random_, 0.5, 0.6),
                _maybe(random_, 0.4, D * random_.uniform(1, 1.2)) if not (last and end == "jet") else None,
                _maybe(random_, 0.2, 0.02),
                _maybe(random_, 0.3, random_.uniform(1, 1.1)),
                _maybe(random_, 0.3, random_.uniform(1, 1.05)),
            ]
        )
        x += random_.uniform(2, 80)
        y += random_.uniform(-60, 60)
        z += random_.uniform(-12, 12)
    return rows


def _fluid(random_: random.Random) -> Rows:
    """Entries of the fluid, in every way that the start block takes."""
    rho: list[Any] = ["rho", random_.uniform(950, 1050)]
    if random_.random() < 0.5:
        thick = [["mu [mPa s]", random_.uniform(0.5, 200)], ["nu", random_.uniform(0.5, 200), "mm2/s"]]
        return [rho, random_.choice(thick)]
    T = [["T", random_.uniform(1, 95)], ["T [degF]", random_.uniform(40, 200)], ["T", "300.5 K"]]
    rows: Rows = [["fluid", random_.choice(["water", "Water"])], random_.choice(T)]
    extra = [[rho], [["mu", 1.3]], [["nu [cSt]", 2.5]], [["pv", 30.0]]]
    return rows + random_.choice([[], [], *extra])


def start(random_: random.Random, end: str) -> Rows:
    """A start block that suits the end."""
    rows: Rows = [*_fluid(random_), ["end", end]]
    rows.append(["method", random_.choice(["colebrook", "swamee-jain", "haaland"])])
    head = random_.choice([["p", random_.uniform(100, 900), "kPa"], ["H", random_.uniform(80, 150)]])
    if end == "jet":
        rows.append(random_.choice([["Q", random_.uniform(5, 60), "L/s"], head]))
        return rows
    rows.append(head)
    if random_.random() < 0.3:
        rows.append(["at", "end"])
    if end == "continues":
        rows.append(["Q", random_.uniform(-80, 120), "L/s"])
        if random_.random() < 0.3:
            rows.append(["flow_at", random_.choice(["start", "end"])])
    return rows


def cases(random_: random.Random, end: str, table: Rows, count: int) -> Rows:
    """So many cases, each of another kind."""
    rows: Rows = []

    def add(**given: Any) -> None:
        rows.append([given.get(head) for head in CASE_HEADS])

    add(case="normal", kind="operating")
    add(case="peak", kind="Peak", pump=0.9, offtakes=random_.uniform(0, 1.5) if end != "closed" else None)
    add(case="surge", kind="surge", dp=random_.uniform(50, 300), dp2=_maybe(random_, 0.5, 20.0))
    add(case="test", kind="test", p=random_.uniform(900, 1500), zp=_maybe(random_, 0.5, 3.0))
    add(case="shut", kind="shut", H=random_.uniform(90, 160), rho=_maybe(random_, 0.5, 1020.0))
    valve = random_.choice(table)[0]
    add(case="valve", kind="shut", H=120.0, valve=valve, H2=_maybe(random_, 0.5, 60.0))
    add(case="empty", kind="empty")
    return [CASE_HEADS, *random_.sample(rows, count)]


def make(path: Path, counts: dict[str, int]) -> list[tuple[str, str]]:
    """Write the workbook; the areas of its calls come back."""
    book = Book()
    random_ = random.Random(20)
    for name, maker in (
        ("runs", _run),
        ("cases", _run_cases),
        ("schedules", _schedule),
        ("balances", _balance),
        ("junctions", _junction),
    ):
        sheet = book.sheet(name)
        for _ in range(counts[name]):
            maker(book, sheet, random_)
    book.workbook.save(path)
    return book.areas


def _valid(make_: Callable[[], tuple[str, Sequence[Any]]]) -> Any:
    """Draw until the engine takes the call."""
    for _ in range(300):
        name, args = make_()
        outcome = call(name, args)
        first = outcome if isinstance(outcome, CellError) else None
        if first is None and not any(isinstance(v, CellError) for v in outcome.reshape(-1)):
            return args
    raise AssertionError("no valid call was found")


def _floats(rows: Rows) -> Rows:
    width = max(map(len, rows))
    padded = [[*line, *[None] * (width - len(line))] for line in rows]
    return [[float(v) if isinstance(v, int) else v for v in line] for line in padded]


def _run(book: Book, sheet: Any, random_: random.Random) -> None:
    def draw() -> tuple[str, Sequence[Any]]:
        end = random_.choice(["continues", "jet", "closed"])
        table = nodes(random_, end)
        return "TB_RUN", ["F", "metric", _floats(start(random_, end)), [NODE_HEADS], _floats(table)]

    args = _valid(draw)
    begin, heads, table = book.put(sheet, args[2]), book.put(sheet, args[3], 0), book.put(sheet, args[4])
    units = random_.choice(["metric", "SI", "US"])
    # The numbers are metric; the other sets serve the results, so every input names its unit.
    arguments = f'"{units}",{begin},{heads},{table}'
    if units == "metric":
        wide = RUN_RESULTS.count(",") + 1
        book.formula(sheet, f'=TB_RUN("{RUN_RESULTS}",{arguments})', len(args[4]), wide)
        book.formula(sheet, f'=TB_RUN("closure",{arguments})', 1, 1)
    else:
        book.formula(sheet, f'=TB_RUN("Fx","metric",{begin},{heads},{table})', len(args[4]), 1)


def _run_cases(book: Book, sheet: Any, random_: random.Random) -> None:
    def draw() -> tuple[str, Sequence[Any]]:
        end = random_.choice(["continues", "jet", "closed"])
        # Every tenth call has all kinds of cases; the others keep the workbook small.
        large = random_.random() < 0.1
        table, begin = nodes(random_, end, 5 if large else 3), start(random_, end)
        args = ["F", "metric", _floats(begin), [NODE_HEADS], _floats(table)]
        return "TB_RUNCASES", [*args, _floats(cases(random_, end, table, 7 if large else 2))]

    args = _valid(draw)
    begin, heads, table = book.put(sheet, args[2]), book.put(sheet, args[3], 0), book.put(sheet, args[4])
    arguments = f'"metric",{begin},{heads},{table},{book.put(sheet, args[5])}'
    wide = CASE_RESULTS.count(",") + 1
    book.formula(sheet, f'=TB_RUNCASES("{CASE_RESULTS}",{arguments})', len(args[4]), wide)
    book.formula(sheet, f'=TB_RUNCASES("Fh_by_case",{arguments})', len(args[4]), len(args[5]) - 1)


def _schedule(book: Book, sheet: Any, random_: random.Random) -> None:
    row = CATALOGUE["TB_SCHEDULE"]
    kinds = row.routine.kinds
    heads = [column.name for column in row.routine.columns]
    rows: Rows = []
    for _ in range(random_.choice([2, 3, 4])):
        kind = random_.choice(list(kinds))
        given = sample(kinds[kind], random_)
        entry: dict[str, Any] = {"name": "x", "fitting": kind.upper()}
        entry |= {COLUMN_OF.get(a.name, a.name): v for a, v in zip(kinds[kind].args, given, strict=True)}
        rows.append([entry.get(head) for head in heads])
    if random_.random() < 0.2:
        rows.insert(random_.randrange(len(rows)), [None] * len(heads))
    headings, table = book.put(sheet, [heads], 0), book.put(sheet, rows)
    names = [r.name for r in row.results]
    book.formula(sheet, f'=TB_SCHEDULE("all","SI",{headings},{table})', len(rows), len(names))


def _balance(book: Book, sheet: Any, random_: random.Random) -> None:
    count = random_.randint(2, 5)
    rows: Rows = []
    for i in range(count):
        round_ = random_.random() < 0.7
        rows.append(
            [
                *(random_.uniform(-2, 2) for _ in range(3)),
                random_.uniform(100, 900) if round_ else None,
                random_.uniform(-50, 800),
                random_.uniform(-200, 200),
                _maybe(random_, 0.4, random_.uniform(1, 1.1)),
                None if round_ else random_.uniform(0.01, 0.5),
            ]
        )
        if i == count - 1:
            rows[-1][5] = -sum(line[5] for line in rows[:-1])
    heads = book.put(sheet, [["nx", "ny", "nz", "D", "p", "Q [L/s]", "beta", "A"]], 0)
    ports = book.put(sheet, rows)
    rest = random_.choice(["", f",{random_.uniform(0, 40)}", f",,{random_.uniform(-5, 5)},,-1.5"])
    text = f'=TB_BALANCE("all","metric",{random_.uniform(700, 1200)},{heads},{ports}{rest})'
    book.formula(sheet, text, 1, 9)


def _junction(book: Book, sheet: Any, random_: random.Random) -> None:
    flows = [random_.uniform(-500, 500) for _ in range(random_.randint(1, 6))]
    rows: Rows = [flows] if random_.random() < 0.5 else [[flow] for flow in flows]
    book.formula(sheet, f'=TB_BRANCHFLOW("metric",{book.put(sheet, rows)})', 1, 1)
