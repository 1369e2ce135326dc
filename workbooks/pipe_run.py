"""Builder of the template ``pipe-run``: a pumped raw-water main, node by node and by load case.

Sheets for reading: Cover, Units, Inputs, Run, Cases and Fittings (some nodes again, cell by
cell, so that both styles can be compared). Sheets that calculate: Run data and Cases data, where
a few block formulas fill whole tables. The sheets for reading refer to those by plain formulas,
because a spreadsheet without the add-in keeps the stored value of a plain formula, but not
always that of an array formula.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Final

from openpyxl import Workbook
from openpyxl.chart import BarChart, Reference, ScatterChart, Series
from openpyxl.styles import Alignment
from openpyxl.utils import get_column_letter
from openpyxl.worksheet.worksheet import Worksheet

from . import layout
from .pipe_run_data import CASE_HEADINGS, CASES, NODE_HEADINGS, NODE_UNITS, NODES, START, TITLE
from .pipe_run_fittings import fittings

THRUST: Final = (
    "name",
    "fitting",
    "s",
    "V2",
    "p1",
    "p2",
    "theta",
    "Fx",
    "Fy",
    "Fz",
    "F",
    "Fh",
    "bearing",
    "note",
)
HYDRAULICS: Final = ("name", "Q1", "Q2", "HGL2", "EGL2", "hf", "hK", "po", "drag", "W")
ENVELOPE: Final = ("name", "F", "case_F", "Fh", "case_Fh", "bearing") + (
    "Fx",
    "case_Fx",
    "Fy",
    "case_Fy",
    "Fz",
    "case_Fz",
    "p",
    "case_p",
)
FORMATS: Final = {
    **dict.fromkeys(("name", "fitting", "note"), "@"),
    **dict.fromkeys(("s", "p1", "p2", "theta", "bearing", "Q1", "Q2", "po", "p"), "0.0"),
    **dict.fromkeys(("V2", "HGL2", "EGL2", "hf", "hK", "W", "Fx", "Fy", "Fz", "F", "Fh"), "0.00"),
    "drag": "0.000",
}
ARGUMENTS: Final = "Units,Start,NodeHeadings,Nodes"
CASE_ARGUMENTS: Final = f"{ARGUMENTS},LoadCases"
FIRST: Final = 7
"""First row of results on every sheet with a row for each node."""
LAST: Final = FIRST + len(NODES) - 1
NODE_ROW: Final = 5 + len(START) + 2 + len(CASES) + 3 + 3
"""Row of the first node on the sheet Inputs."""


def build() -> Workbook:
    """Lay out the workbook; its values are computed afterwards."""
    book = layout.new_book(TITLE, "Calculation template; invented scenario and figures")
    cover = layout.sheet(book, "Cover", (32, 44, 22, 24), landscape=False)
    layout.units_sheet(
        book, "metric", {"pressure": "kPa", "flow": "L/s", "force": "kN", "diameter": "mm", "angle": "deg"}
    )
    _inputs(book)
    _reading_sheet(
        book,
        "Run",
        "The run, operating",
        "x east, y north, z up. Thrust F is the force of the fluid on the node; the reaction is opposite.",
        "Run data",
        [*THRUST[:-1], "Q2", "HGL2", "EGL2", "note"],
        THRUST + HYDRAULICS,
    )
    _reading_sheet(
        book,
        "Cases",
        "Load cases",
        "The governing case at each node, by magnitude and by component; on the right F in each case.",
        "Cases data",
        [*ENVELOPE, *(f"F, {case[0]}" for case in CASES)],
        ENVELOPE + tuple(f"F, {case[0]}" for case in CASES),
    )
    fittings(layout.sheet(book, "Fittings", (34, 12, 8, 30, 12, 8, 12, 10), landscape=False), _node, _input)
    _run_data(book)
    _cases_data(book)
    _cover(cover)
    book["Fittings"].page_setup.fitToHeight = 1
    _grade_lines(book["Run"], book["Inputs"])
    _thrusts(book["Cases"])
    book.active = 0
    return book


def _cover(ws: Worksheet) -> None:
    layout.heading(ws, TITLE, "Invented place, names and figures: a template that shows a layout, no design.")
    row = layout.title_block(
        ws,
        4,
        (
            ("Project", "Larkmere raw-water main (invented)"),
            ("Calculation", "LM-100 Thrust on the rising main, nodes N01 to N24"),
            ("Client", "Larkmere Water (invented)"),
            ("Made by", "A. Engineer"),
            ("Checked by", ""),
            ("Status", "template"),
        ),
    )
    layout.section(ws, row, "Results")
    first = row + 1
    governing = f"MATCH(B{first},Cases!B{FIRST}:B{LAST},0)"
    lines = (
        ("Largest thrust of all cases", f"=MAX(Cases!B{FIRST}:B{LAST})", "kN", "0.0"),
        ("at node", f"=INDEX(Cases!A{FIRST}:A{LAST},{governing})", "", "@"),
        ("in load case", f"=INDEX(Cases!C{FIRST}:C{LAST},{governing})", "", "@"),
        ("Pressure at the pumps, operating", f"=Run!F{FIRST}", "kPa", "0.0"),
        ("Closure of the run", f'=TB_RUN("closure",{ARGUMENTS})', "", "0.0E+00"),
        ("Closure, worst of all cases", f'=TB_RUNCASES("closure",{CASE_ARGUMENTS})', "", "0.0E+00"),
    )
    for i, (label, formula, unit, fmt) in enumerate(lines, first):
        layout.put(ws, f"A{i}", label)
        layout.put(ws, f"B{i}", formula, "Output", fmt)
        layout.put(ws, f"C{i}", unit)
    row = first + len(lines) + 1
    layout.section(ws, row, "Basis")
    basis = (
        "Steady flow, momentum balance at each node, Bernoulli with Darcy-Weisbach friction along it.",
        "x east, y north, z up. Thrust is the force of the fluid on the node, from gauge pressure.",
        "Closure: node thrusts, wall drags and water weight against the run as one control volume.",
        "Joints are taken as restrained; for unrestrained joints give their diameter in column Dj.",
    )
    for i, text in enumerate(basis, row + 1):
        layout.text_row(ws, i, text, 4)
    row = layout.cautions(ws, row + len(basis) + 2, 4)
    layout.revisions(ws, row, (("A", "first issue of the template", "A. Engineer, 2026-01-01", ""),))


def _inputs(book: Workbook) -> None:
    ws = layout.sheet(book, "Inputs", (11, 11, 10, 9, 9, 9, 8, 8, 7, 7, 7, 8, 8, 8, 26))
    layout.heading(ws, "Inputs", "Cells in the style Input are to be filled in; all figures are invented.")
    layout.section(ws, 4, "Start block: fluid, flow, ends")
    layout.head_row(ws, 5, 1, ("name", "value", "unit"))
    for i, (name, value, unit, meaning) in enumerate(START, 6):
        layout.put(ws, f"A{i}", name)
        layout.put(ws, f"B{i}", value, "Input")
        layout.put(ws, f"C{i}", unit or None)
        layout.put(ws, f"D{i}", meaning, "Explanatory Text")
    last = 5 + len(START)
    layout.name_range(book, "Start", ws, f"A6:C{last}")
    row = last + 2
    layout.section(ws, row, "Load cases")
    layout.head_row(ws, row + 1, 1, CASE_HEADINGS)
    _input_rows(ws, row + 2, CASES)
    layout.name_range(book, "LoadCases", ws, f"A{row + 1}:F{row + 1 + len(CASES)}")
    kinds = ("operating", "peak", "shut", "test", "surge", "empty")
    layout.allow_list(ws, f"B{row + 2}:B{row + 1 + len(CASES)}", kinds)
    layout.section(
        ws, NODE_ROW - 3, "Nodes in the order of the flow; D, e and Dj belong to the leg that leaves"
    )
    layout.head_row(ws, NODE_ROW - 2, 1, NODE_HEADINGS)
    layout.head_row(ws, NODE_ROW - 1, 1, NODE_UNITS)
    _input_rows(ws, NODE_ROW, NODES)
    end = NODE_ROW + len(NODES) - 1
    layout.name_range(book, "NodeHeadings", ws, f"A{NODE_ROW - 2}:N{NODE_ROW - 1}")
    layout.name_range(book, "Nodes", ws, f"A{NODE_ROW}:N{end}")
    layout.allow_numbers(ws, f"E{NODE_ROW}:E{end}", 0, "A diameter is above zero.")
    layout.page_break(ws, NODE_ROW - 4)
    layout.repeat_rows(ws, NODE_ROW - 2, NODE_ROW - 1)


def _input_rows(ws: Worksheet, first: int, rows: Sequence[Sequence[object]]) -> None:
    """Write rows of input cells, the last column a remark."""
    for i, row in enumerate(rows, first):
        for j, value in enumerate(row, 1):
            style = "Explanatory Text" if j == len(row) else "Input"
            layout.put(ws, f"{get_column_letter(j)}{i}", value, style)


def _run_data(book: Workbook) -> None:
    ws = layout.sheet(book, "Run data", (10,) * (len(THRUST) + len(HYDRAULICS)))
    layout.heading(ws, "Run data", "Block formulas of the run; the sheet Run shows what is to be read.")
    _block(ws, 1, "TB_RUN", THRUST, ARGUMENTS)
    _block(ws, 1 + len(THRUST), "TB_RUN", HYDRAULICS, ARGUMENTS)


def _cases_data(book: Workbook) -> None:
    ws = layout.sheet(book, "Cases data", (10,) * (len(ENVELOPE) + len(CASES)))
    layout.heading(
        ws, "Cases data", "Block formulas of the load cases; the sheet Cases shows what is to be read."
    )
    _block(ws, 1, "TB_RUNCASES", ENVELOPE, CASE_ARGUMENTS)
    left, right = get_column_letter(len(ENVELOPE) + 1), get_column_letter(len(ENVELOPE) + len(CASES))
    for j in range(len(CASES)):
        letters = get_column_letter(len(ENVELOPE) + 1 + j)
        layout.put(ws, f"{letters}{FIRST - 2}", f'="F, "&Inputs!A{8 + len(START) + 1 + j}')
        layout.put(ws, f"{letters}{FIRST - 1}", f"=B{FIRST - 1}")
    area = f"{left}{FIRST}:{right}{LAST}"
    layout.array(ws, area, f'=TB_RUNCASES("F_by_case",{CASE_ARGUMENTS})', "Calculation", ["0.00"])


def _block(ws: Worksheet, column: int, function: str, names: Sequence[str], arguments: str) -> None:
    """Put labels, units and values of a block function on a sheet, a formula each."""
    left, right = get_column_letter(column), get_column_letter(column + len(names) - 1)
    wanted = ",".join(names)
    for row, word in ((FIRST - 2, "labels"), (FIRST - 1, "units")):
        area = f"{left}{row}:{right}{row}"
        layout.array(ws, area, f'={function}("{word}: {wanted}",{arguments})', "Normal")
    layout.array(
        ws,
        f"{left}{FIRST}:{right}{LAST}",
        f'={function}("{wanted}",{arguments})',
        "Calculation",
        [_format(name) for name in names],
    )


def _format(name: str) -> str:
    return "@" if name.startswith("case_") else FORMATS.get(name, "0.00")


def _reading_sheet(
    book: Workbook,
    name: str,
    title: str,
    note: str,
    source: str,
    columns: Sequence[str],
    available: Sequence[str],
) -> None:
    """Add a sheet that shows columns of a data sheet, to be read and printed on one page."""
    widths = {"fitting": 16, "note": 30, "name": 8}
    ws = layout.sheet(
        book, name, [widths.get(c, 11 if c.startswith(("case", "F,")) else 8.5) for c in columns]
    )
    ws.page_setup.fitToHeight = 1
    layout.heading(ws, title, note)
    sources = [get_column_letter(list(available).index(c) + 1) for c in columns]
    layout.head_row(ws, FIRST - 2, 1, [f"='{source}'!{s}{FIRST - 2}" for s in sources])
    # A text column has no unit, and an empty text is not kept by every spreadsheet.
    units = [
        None if _format(c) == "@" else f"='{source}'!{s}{FIRST - 1}"
        for c, s in zip(columns, sources, strict=True)
    ]
    layout.head_row(ws, FIRST - 1, 1, units)
    ws.row_dimensions[FIRST - 2].height = 30
    for row in range(FIRST, LAST + 1):
        for j, (column, letters) in enumerate(zip(columns, sources, strict=True), 1):
            place = f"{get_column_letter(j)}{row}"
            layout.put(
                ws,
                place,
                f"='{source}'!{letters}{row}",
                "Output" if column == "F" else "Normal",
                _format(column),
            )
            if _format(column) == "@":
                ws[place].alignment = Alignment(horizontal="left", indent=1)
    layout.freeze(ws, f"B{FIRST}")
    layout.repeat_rows(ws, FIRST - 2, FIRST - 1)


def _grade_lines(ws: Worksheet, inputs: Worksheet) -> None:
    chart = ScatterChart()
    chart.title = "Grade lines and pipe, operating"
    chart.style = 2
    chart.x_axis.title, chart.y_axis.title = "chainage, m", "level, m"
    chart.x_axis.number_format = chart.y_axis.number_format = "0"
    chart.y_axis.scaling.min = 40
    chart.x_axis.delete = chart.y_axis.delete = False
    chart.legend.position = "b"
    columns = [*THRUST[:-1], "Q2", "HGL2", "EGL2"]

    def on_run(name: str) -> Reference:
        return Reference(ws, min_col=columns.index(name) + 1, min_row=FIRST, max_row=LAST)

    pipe = Reference(inputs, min_col=4, min_row=NODE_ROW, max_row=NODE_ROW + len(NODES) - 1)
    lines = (
        ("energy grade line", on_run("EGL2"), "C00000", "dash"),
        ("hydraulic grade line", on_run("HGL2"), "1F4E79", "solid"),
        ("pipe", pipe, "7F7F7F", "solid"),
    )
    for title, values, colour, dash in lines:
        series = Series(values, on_run("s"), title=title)
        series.graphicalProperties.line.solidFill = colour
        series.graphicalProperties.line.dashStyle = dash
        series.graphicalProperties.line.width = 19050
        series.smooth = False
        series.marker.symbol = "none"
        chart.series.append(series)
    layout.anchor(ws, chart, f"A{LAST + 2}", 30, 10)


def _thrusts(ws: Worksheet) -> None:
    chart = BarChart()
    chart.type, chart.grouping = "col", "clustered"
    chart.title = "Thrust by node and load case"
    chart.style = 2
    chart.y_axis.title, chart.x_axis.title = "thrust, kN", "node"
    chart.y_axis.number_format = "0"
    chart.x_axis.delete = chart.y_axis.delete = False
    chart.legend.position = "b"
    chart.gapWidth = 60
    first = len(ENVELOPE) + 1
    colours = ("1F4E79", "7F7F7F", "C55A11", "548235")
    for j, (case, colour) in enumerate(zip(CASES, colours, strict=True), first):
        series = Series(Reference(ws, min_col=j, min_row=FIRST, max_row=LAST), title=case[0])
        series.graphicalProperties.solidFill = colour
        chart.series.append(series)
    chart.set_categories(Reference(ws, min_col=1, min_row=FIRST, max_row=LAST))
    layout.anchor(ws, chart, f"A{LAST + 2}", 30, 10)


def _node(node: str, result: str) -> str:
    """Formula that looks a result of the run up by node."""
    letters = get_column_letter((THRUST + HYDRAULICS).index(result) + 1)
    # Looked up among the inputs: Calc does not find text in the array of an add-in function.
    look = f'MATCH("{node}",Inputs!$A${NODE_ROW}:$A${NODE_ROW + len(NODES) - 1},0)'
    return f"=INDEX('Run data'!${letters}${FIRST}:${letters}${LAST},{look})"


def _input(node: str, column: str, offset: int = 0) -> str:
    """Formula that looks an input up by node, or by the node ``offset`` rows on."""
    letters = get_column_letter(NODE_HEADINGS.index(column) + 1)
    last = NODE_ROW + len(NODES) - 1
    look = f'MATCH("{node}",Inputs!$A${NODE_ROW}:$A${last},0){offset:+d}' if offset else ""
    look = look or f'MATCH("{node}",Inputs!$A${NODE_ROW}:$A${last},0)'
    return f"=INDEX(Inputs!${letters}${NODE_ROW}:${letters}${last},{look})"
