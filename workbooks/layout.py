"""Layout shared by the template workbooks: the parts that a calculation sheet has in practice.

Everything is drawn with the spreadsheet's own built-in cell styles, so that a
reader sees at once what is input, what is calculated and what is a result.
"""

from __future__ import annotations

import datetime
from collections.abc import Mapping, Sequence
from typing import Any, Final

from openpyxl import Workbook
from openpyxl.cell import Cell
from openpyxl.styles import Alignment, Border, Font, Side
from openpyxl.utils import get_column_letter
from openpyxl.workbook.defined_name import DefinedName
from openpyxl.worksheet.datavalidation import DataValidation
from openpyxl.worksheet.formula import ArrayFormula
from openpyxl.worksheet.pagebreak import Break
from openpyxl.worksheet.worksheet import Worksheet

MADE: Final = datetime.datetime(2026, 1, 1, tzinfo=datetime.UTC).replace(tzinfo=None)
"""Date written into the file, fixed so that a template is built alike every time."""

CAUTIONS: Final = (
    "Results are hydraulic forces from a stated idealisation. Local codes and licensed practice govern.",
    "Soil values come from site investigation. Bearing, uplift and settlement are not covered here.",
    "Test and surge pressure must be considered as load cases; which surge to expect is a study of its own.",
    "Two-phase flow, pipe-wall strength, thermal movement and seismic load are not covered.",
    "Thrust is the force of the fluid on the pipework; the restraint must supply the opposite.",
)

FONT: Final = "Calibri"
_LINE = Side(style="thin", color="00999999")


def new_book(title: str, subject: str) -> Workbook:
    """Start a workbook with no sheets."""
    book = Workbook()
    book.remove(book.worksheets[0])
    book.properties.title = title
    book.properties.subject = subject
    book.properties.creator = "thrustbook template"
    book.properties.created = book.properties.modified = MADE
    return book


def sheet(book: Workbook, name: str, widths: Sequence[float], *, landscape: bool = True) -> Worksheet:
    """Add a sheet set up for print: one page wide, with its name and page number at the foot."""
    ws = book.create_sheet(name)
    for j, width in enumerate(widths, 1):
        ws.column_dimensions[get_column_letter(j)].width = width
    ws.sheet_view.showGridLines = False
    ws.page_setup.orientation = "landscape" if landscape else "portrait"
    ws.page_setup.paperSize = ws.PAPERSIZE_A4
    ws.page_setup.fitToWidth = 1
    ws.page_setup.fitToHeight = 0
    ws.sheet_properties.pageSetUpPr.fitToPage = True
    ws.page_margins.left = ws.page_margins.right = 0.5
    ws.page_margins.top = ws.page_margins.bottom = 0.6
    ws.oddFooter.left.text = "&A"
    ws.oddFooter.center.text = "Invented scenario and figures"
    ws.oddFooter.right.text = "Page &P of &N"
    return ws


def put(
    ws: Worksheet, place: str, value: object, style: str = "Normal", number_format: str | None = None
) -> Cell:
    """Write a cell in one of the built-in styles."""
    cell: Cell = ws[place]
    cell.value = value
    cell.style = style
    if number_format:
        cell.number_format = number_format
    return cell


def heading(ws: Worksheet, title: str, note: str = "") -> None:
    """Write the sheet's title in row 1 and what it holds in row 2."""
    put(ws, "A1", title, "Title")
    if note:
        put(ws, "A2", note, "Explanatory Text")
        ws["A2"].alignment = Alignment(wrap_text=False)


def section(ws: Worksheet, row: int, text: str) -> None:
    """Write a section heading."""
    put(ws, f"A{row}", text, "Headline 3")


def text_row(
    ws: Worksheet, row: int, text: str, last_column: int, style: str = "Normal", lines: int = 1
) -> None:
    """Write running text across the columns of a sheet."""
    ws.merge_cells(start_row=row, start_column=1, end_row=row, end_column=last_column)
    put(ws, f"A{row}", text, style)
    ws[f"A{row}"].alignment = Alignment(wrap_text=True, vertical="top")
    ws.row_dimensions[row].height = 15 * lines


def head_row(ws: Worksheet, row: int, first: int, texts: Sequence[object], *, wrap: bool = True) -> None:
    """Write a row of column headings."""
    for j, text in enumerate(texts, first):
        cell = ws.cell(row, j, text)
        cell.font = Font(name=FONT, size=11, bold=True)
        cell.alignment = Alignment(wrap_text=wrap, horizontal="center", vertical="center")
        cell.border = Border(bottom=_LINE, top=_LINE)


def name_range(book: Workbook, name: str, ws: Worksheet, area: str) -> None:
    """Give a range a name of the workbook."""
    corners = area.replace("$", "").split(":")
    absolute = ":".join(
        "$" + "".join(c for c in p if c.isalpha()) + "$" + "".join(filter(str.isdigit, p)) for p in corners
    )
    book.defined_names[name] = DefinedName(name, attr_text=f"'{ws.title}'!{absolute}")


def array(ws: Worksheet, area: str, formula: str, style: str, formats: Sequence[str] = ()) -> None:
    """Write an array formula over an area and style its cells, a number format for each column."""
    ws[area.split(":", maxsplit=1)[0]] = ArrayFormula(area, formula)
    for line in ws[area]:
        for j, cell in enumerate(line):
            cell.style = style
            if formats:
                cell.number_format = formats[j % len(formats)]


def allow_list(ws: Worksheet, area: str, words: Sequence[str]) -> None:
    """Let the cells of an area hold only these words."""
    rule = DataValidation(type="list", formula1='"' + ",".join(words) + '"', allow_blank=True)
    rule.showErrorMessage = True
    rule.error = "Allowed: " + ", ".join(words)
    ws.add_data_validation(rule)
    rule.add(area)


def allow_numbers(ws: Worksheet, area: str, low: float, message: str, *, open_low: bool = True) -> None:
    """Let the cells of an area hold only numbers above (or from) a bound."""
    operator = "greaterThan" if open_low else "greaterThanOrEqual"
    rule = DataValidation(type="decimal", operator=operator, formula1=str(low), allow_blank=True)
    rule.showErrorMessage = True
    rule.error = message
    ws.add_data_validation(rule)
    rule.add(area)


def units_sheet(book: Workbook, base: str, changes: Mapping[str, str]) -> Worksheet:
    """Add the sheet Units with the workbook name Units on its range role | unit."""
    ws = sheet(book, "Units", (22, 14, 60), landscape=False)
    heading(ws, "Units", "Every function reads its units from this range; change a unit here and all follow.")
    head_row(ws, 4, 1, ("quantity", "unit", "remark"))
    rows: list[tuple[str, str, str]] = [("set", base, "base set: SI, metric or US")]
    rows += [(role, unit, "") for role, unit in changes.items()]
    for i, (role, unit, remark) in enumerate(rows, 5):
        put(ws, f"A{i}", role)
        put(ws, f"B{i}", unit, "Input")
        put(ws, f"C{i}", remark, "Explanatory Text")
    name_range(book, "Units", ws, f"A4:B{4 + len(rows)}")
    return ws


def title_block(ws: Worksheet, row: int, entries: Sequence[tuple[str, str]]) -> int:
    """Write the title block of a calculation; gives the next free row."""
    for label, value in entries:
        put(ws, f"A{row}", label)
        ws[f"A{row}"].font = Font(name=FONT, size=11, bold=True)
        put(ws, f"B{row}", value, "Input")
        ws.merge_cells(start_row=row, start_column=2, end_row=row, end_column=4)
        row += 1
    return row + 1


def revisions(ws: Worksheet, row: int, entries: Sequence[Sequence[str]]) -> int:
    """Write the revision table and the checker's sign-off; gives the next free row."""
    section(ws, row, "Revisions and sign-off")
    head_row(ws, row + 1, 1, ("revision", "what changed", "made by, date", "checked by, date"))
    row += 2
    for entry in [*entries, ("", "", "", "")]:
        for j, text in enumerate(entry, 1):
            cell = ws.cell(row, j, text)
            cell.style = "Input"
            cell.alignment = Alignment(wrap_text=True, vertical="top")
        row += 1
    return row + 1


def cautions(ws: Worksheet, row: int, last_column: int) -> int:
    """Write the usual cautions; gives the next free row."""
    section(ws, row, "Cautions")
    for i, text in enumerate(CAUTIONS, row + 1):
        text_row(ws, i, f"{i - row}. {text}", last_column, "Warning Text")
    return row + len(CAUTIONS) + 2


def repeat_rows(ws: Worksheet, first: int, last: int) -> None:
    """Repeat rows at the top of every printed page."""
    ws.print_title_rows = f"{first}:{last}"


def page_break(ws: Worksheet, row: int) -> None:
    """Start a new printed page below a row."""
    ws.row_breaks.append(Break(id=row))


def freeze(ws: Worksheet, place: str) -> None:
    """Keep the rows above and the columns left of a cell in view."""
    ws.freeze_panes = place


def anchor(ws: Worksheet, chart: Any, place: str, width: float, height: float) -> None:
    """Put a chart on a sheet, its size in centimetres."""
    chart.width, chart.height = width, height
    ws.add_chart(chart, place)
