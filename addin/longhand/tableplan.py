"""Plans for the table functions: which working, which rows, which results."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field
from typing import Final

from ..blocks.balance import PORT_COLUMNS
from ..blocks.runread import CASE_COLUMNS, NODE_COLUMNS, START_COLUMNS
from ..catalogue.types import Arg, Column, Row, RowStep, Step, TableLonghand
from ..catalogue.workings.runs import ENVELOPE, run_working
from ..catalogue.workings.sections import junctions
from ..cells import Scalar
from ..hosts.headless.formulas import literal
from ..tables import is_blank
from .arguments import Argument, in_group, taken
from .calls import NotWorked, Shape
from .convert import Conversion
from .grid import Content, Formula
from .outcomes import Guard, written
from .section import Entry, Section, TableLine
from .symbols import si_unit
from .tableread import OfRole, ReadTable, read_block, read_headed, whole_table

MOST_ROWS: Final = 5_000
"""Rows of a table that get a working."""


@dataclass(slots=True, eq=False)
class TableOutcome:
    """Results of a table call: a row for each row of the range, empty ones included."""

    section: Section
    results: tuple[str, ...]
    size: int
    rows: list[int]
    """The row of the range for each line of the section."""
    whole_row: Callable[[int], str]
    guard: Guard | None = None
    constants: dict[str, list[str]] = field(default_factory=dict)
    """Results that are not worked: their texts as they stand."""

    @property
    def one_row(self) -> bool:
        """Whether the answer is one row by nature."""
        return self.section.is_single(self.results[0])

    @property
    def shape(self) -> Shape:
        return (1 if self.one_row else self.size), len(self.results)

    @property
    def one_range(self) -> bool:
        whole = len(self.rows) == self.size and len(self.results) == 1 and self.guard is None
        return whole and not self.one_row and self.results[0] not in self.constants

    def at(self, i: int, j: int) -> str:
        result = self.results[j]
        if result in self.constants:
            return self.constants[result][i]
        if self.one_row:
            text = self.section.result_ref(result, 0)
        elif i in self.rows:
            text = self.section.result_ref(result, self.rows.index(i))
        else:
            area = self.whole_row(i)
            # A row filled in later has no working: it must not look as if nothing were there.
            return f'IF(COUNTA({area})=0,"",NA())' if area else '""'
        return text if self.guard is None else self.guard.around(text)

    def range_text(self) -> str:
        return self.section.result_range(self.results[0])

    def own(self, i: int, j: int, ref: str) -> bool:
        """Set the cell that shows an element beside it; False where it has no place or is taken."""
        result = self.results[j]
        if self.one_row:
            return self.section.own.setdefault(result, ref) == ref
        if result in self.constants or i not in self.rows:
            return False
        line = self.section.lines[self.rows.index(i)]
        line.target = line.target or ref
        return line.own.setdefault(result, ref) == ref

    def beside(self, i: int, j: int) -> tuple[str, str] | None:
        """The cell that stands beside the working of an element, and the verdict on it."""
        result = self.results[j]
        if self.one_row:
            return self.section.own[result], self.section.verdict_ref(result, 0)
        if result in self.constants or i not in self.rows:
            return None
        line = self.rows.index(i)
        return self.section.lines[line].own[result], self.section.verdict_ref(result, line)

    def text(self, i: int, j: int, stored: Scalar) -> Scalar:
        """The text that the cell of an element shows; None where it is no text known beforehand."""
        if self.results[j] in self.constants:
            return stored
        return None if self.one_row or i in self.rows else ""


def plan_branchflow(
    row: Row, arguments: list[Argument], of_role: OfRole, title: str, target: str
) -> tuple[Section, ReadTable | None]:
    """Junctions: one with its flows one below the other, or several with a row each."""
    (flows,) = arguments
    conversion = of_role("flow")
    text = "known flow, positive into the junction"
    if min(flows.shape) > 1:
        width = flows.shape[1]
        columns = [
            (Column(name=f"Q_{n}", role="flow", text=f"{text} ({n})"), conversion)
            for n in range(1, width + 1)
        ]
        table = whole_table(flows, columns)
        return Section(row.name, title, target, junctions(width), columns, [], _lines(table)), table
    column = Column(name="Q", role="flow", text=text)
    lines = []
    for n in range(max(flows.shape)):
        i, j = (n, 0) if flows.shape[1] == 1 else (0, n)
        if flows.form == "array" and is_blank(flows.value(i, j)):
            continue

        def given(i: int = i, j: int = j) -> dict[str, Content | None]:
            arg = Arg(name="Q", role="flow")
            return {"Q": in_group(*taken(flows, arg, written, i, j), conversion)}

        lines.append(TableLine(str(n + 1), "", given))
    assert isinstance(row.longhand, TableLonghand)
    return Section(row.name, title, target, row.longhand, [(column, conversion)], [], lines), None


def plan_balance(
    row: Row, arguments: list[Argument], of_role: OfRole, title: str, target: str
) -> tuple[Section, ReadTable]:
    """The general balance: one row a port."""
    rho, heads, ports, *rest = arguments
    table = read_headed(PORT_COLUMNS, heads, ports, of_role, "ports")
    entries = [_single(row, "rho", rho, of_role)]
    for arg, argument in zip(row.args[3:], rest, strict=True):
        if argument.form != "empty":
            entries.append(_single(row, arg.name, argument, of_role))
    assert isinstance(row.longhand, TableLonghand)
    section = Section(row.name, title, target, row.longhand, table.columns, entries, _lines(table))
    return section, table


def _single(row: Row, name: str, argument: Argument, of_role: OfRole) -> Entry:
    """An argument that is one value, as an entry."""
    arg = next(a for a in row.args if a.name == name)
    if argument.shape != (1, 1):
        raise NotWorked(f"{name} is a range")
    _, own = taken(argument, arg, written) if argument.form != "call" else (None, None)
    conversion = own or of_role(arg.role)
    return Entry(name, arg.text, arg.role, lambda: taken(argument, arg, written)[0], conversion)


def plan_run(
    row: Row, arguments: list[Argument], of_role: OfRole, title: str, target: str
) -> tuple[Section, ReadTable]:
    """A pipe run: one row a node."""
    start, heads, nodes = arguments[:3]
    entries = read_block(START_COLUMNS, start, of_role, "start")
    table = read_headed(NODE_COLUMNS, heads, nodes, of_role, "table")
    section = Section(row.name, title, target, _run_working(entries), table.columns, entries, _lines(table))
    return section, table


def _run_working(entries: list[Entry], kind: str = "") -> TableLonghand:
    """The working that start block and case ask for: is a jet's flow sought, is there a fluid."""
    given = {entry.name for entry in entries}
    jet = any(e.name == "end" and e.stored.strip().lower() == "jet" for e in entries)
    fluid = "fluid" in given
    if kind in ("shut", "test", "empty"):
        return run_working(False, fluid)
    case_head = bool(given & {"cp", "cH"})
    sought = jet and ("Q" not in given or case_head) and "cQ" not in given
    return run_working(sought, fluid)


def _lines(table: ReadTable) -> list[TableLine]:
    if len(table.rows) > MOST_ROWS:
        raise NotWorked(f"it has more than {MOST_ROWS} rows")
    if not table.rows:
        raise NotWorked("the table is empty")
    lines = []
    for n, row in enumerate(table.rows):
        name = table.value(row, "name")
        label = str(n + 1) if is_blank(name) else str(name)

        def given(row: int = row) -> dict[str, Content | None]:
            return table.given(row)

        lines.append(TableLine(label, "", given))
    return lines


def plan_cases(
    row: Row, arguments: list[Argument], of_role: OfRole, title: str, target: str
) -> tuple[list[tuple[str, Section]], ReadTable]:
    """A run under load cases: a working for every case."""
    start, heads, nodes, cases = arguments
    case_table = read_headed(CASE_COLUMNS, cases, cases, of_role, "cases", top=1)
    found = []
    table = read_headed(NODE_COLUMNS, heads, nodes, of_role, "table")
    for n, case_row in enumerate(case_table.rows):
        entries = read_block(START_COLUMNS, start, of_role, "start")
        name = str(case_table.value(case_row, "case") or "").strip() or f"case {n + 1}"
        kind = str(case_table.value(case_row, "kind") or "").strip().lower()
        for column, conversion in case_table.columns:
            if column.name == "case" or is_blank(case_table.value(case_row, column.name)):
                continue
            entries.append(_case_entry(case_table, case_row, column, conversion))
        section = Section(
            row.name,
            f"{title}   case: {name}",
            target,
            _run_working(entries, kind),
            table.columns,
            entries,
            _lines(table),
        )
        found.append((name, section))
    return found, table


def _case_entry(table: ReadTable, row: int, column: Column, conversion: Conversion) -> Entry:
    name = column.name if column.name == "kind" else f"c{column.name}"
    return Entry(
        name,
        column.text,
        column.role,
        lambda: table.content(row, column.name),
        conversion,
        str(table.value(row, column.name)),
    )


def envelope(
    row: Row, cases: list[tuple[str, Section]], table: ReadTable, title: str, target: str
) -> Section:
    """The governing case at each node, from the workings of the cases."""
    columns: list[tuple[Column, Conversion]] = []
    names = ",".join(literal(name) for name, _ in cases)
    rows: list[RowStep] = []
    for quantity in ENVELOPE:
        role = "pressure" if quantity == "p" else "force"
        for n, (name, _) in enumerate(cases, 1):
            text = f"{quantity} in case {name}"
            columns.append((Column(name=f"{quantity}_{n}", role=role, text=text), _si(role)))
        sized = [
            f"{{{quantity}_{n}}}" if quantity == "p" else f"ABS({{{quantity}_{n}}})"
            for n in range(1, len(cases) + 1)
        ]
        listed = ",".join(f"{{{quantity}_{n}}}" for n in range(1, len(cases) + 1))
        rows.append(RowStep(f"{quantity}m", f"largest of {quantity}", role, f"MAX({','.join(sized)})"))
        at = str(len(cases))
        for n in range(len(cases) - 1, 0, -1):
            # Cases that differ by rounding alone are equal: the first of them governs.
            at = f"IF({sized[n - 1]}>={{{quantity}m}}-0.000000001*ABS({{{quantity}m}}),{n},{at})"
        rows.append(RowStep(f"{quantity}k", "number of the first case that has it", "ratio", at))
        rows.append(RowStep(quantity, f"{quantity} in that case", role, f"CHOOSE({{{quantity}k}},{listed})"))
        rows.append(
            RowStep(f"case_{quantity}", "name of that case", "text", f"CHOOSE({{{quantity}k}},{names})")
        )
        if quantity == "Fh":
            bearings = ",".join(f"{{bearing_{n}}}" for n in range(1, len(cases) + 1))
            for n, (name, _) in enumerate(cases, 1):
                text = f"bearing in case {name}"
                columns.append((Column(name=f"bearing_{n}", role="angle", text=text), _si("angle")))
            rows.append(RowStep("bearing", "bearing in that case", "angle", f"CHOOSE({{Fhk}},{bearings})"))
    columns.append((Column(name="name", role="text", text="name of the node"), Conversion("", 1.0)))
    for name, role, text in _SIZES:
        columns.append((Column(name=name, role=role, text=f"{text}, for the tolerance"), _si(role)))
    lines = []
    for i, line in enumerate(_lines(table)):
        lines.append(TableLine(line.label, "", _envelope_given(cases, line, i)))
    worst = ",".join(f"{{closure_{n}}}" for n in range(1, len(cases) + 1))
    entries = [
        Entry(f"closure_{n}", f"closure in case {name}", "ratio", _closure_of(section), Conversion("-", 1.0))
        for n, (name, section) in enumerate(cases, 1)
    ]
    working = TableLonghand(
        rows=tuple(rows),
        single=(Step("closure", "the worst closure of all cases", "ratio", f"MAX({worst})"),),
        results={
            f"{quantity}_by_case_{n}": f"{quantity}_{n}"
            for quantity in ENVELOPE
            for n in range(1, len(cases) + 1)
        },
    )
    return Section(row.name, title, target, working, columns, entries, lines)


_SIZES: Final = (
    ("EGL1", "level", "largest energy level of all cases"),
    ("A1", "area", "area before the node"),
    ("A2", "area", "area behind the node"),
)


def _si(role: str) -> Conversion:
    return Conversion(si_unit(role), 1.0)


def _closure_of(section: Section) -> Callable[[], Content]:
    return lambda: Formula(section.single_ref("closure"))


def _envelope_given(
    cases: list[tuple[str, Section]], line: TableLine, i: int
) -> Callable[[], dict[str, Content | None]]:
    def given() -> dict[str, Content | None]:
        out: dict[str, Content | None] = {"name": line.given().get("name")}
        for n, (_, section) in enumerate(cases, 1):
            for quantity in (*ENVELOPE, "bearing"):
                if quantity == "p":
                    text = f"MAX({section.si_ref('p1', i)},{section.si_ref('p2', i)})"
                else:
                    text = section.si_ref(quantity, i)
                out[f"{quantity}_{n}"] = Formula(text)
        for name, _, _ in _SIZES:
            sizes = ",".join(f"ABS({section.si_ref(name, i)})" for _, section in cases)
            out[name] = Formula(f"MAX({sizes})")
        return out

    return given
