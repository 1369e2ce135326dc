"""The XML of a checking sheet."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping
from typing import Any

from ..xlsx.a1 import column_letters
from ..xlsx.cellvalues import encode
from ..xlsx.xmltext import escape
from .grid import Formula, Sheet, as_written, local

_MAIN = "http://schemas.openxmlformats.org/spreadsheetml/2006/main"
Values = Mapping[int, list[Any]]
"""Values of the formulas: row -> values from column 1 on."""


def sheet_xml(
    sheet: Sheet,
    styles: Mapping[str, int],
    dxfs: Mapping[str, int],
    values: Values | None,
    text_of: Callable[[Formula], str] = as_written,
) -> bytes:
    """The part of a sheet; with ``values`` its formulas carry their results.

    ``text_of`` may write the formulas another way.
    """
    return "".join(_pieces(sheet, styles, dxfs, values, text_of)).encode()


def _pieces(
    sheet: Sheet,
    styles: Mapping[str, int],
    dxfs: Mapping[str, int],
    values: Values | None,
    text_of: Callable[[Formula], str],
) -> Iterator[str]:
    yield '<?xml version="1.0" encoding="UTF-8" standalone="yes"?>\n'
    yield f'<worksheet xmlns="{_MAIN}"><sheetPr><pageSetUpPr fitToPage="{int(sheet.fit_width)}"/></sheetPr>'
    last = local(max(sheet.last_row, 1), max(sheet.last_col, 1))
    yield f'<dimension ref="A1:{last}"/>'
    yield '<sheetViews><sheetView showGridLines="0" workbookViewId="0">'
    if sheet.freeze is not None:
        rows, cols = sheet.freeze
        across = f' xSplit="{cols}"' if cols else ""
        down = f' ySplit="{rows}"' if rows else ""
        pane = "bottomRight" if rows and cols else "bottomLeft" if rows else "topRight"
        corner = local(rows + 1, cols + 1)
        yield f'<pane{across}{down} topLeftCell="{corner}" activePane="{pane}" state="frozen"/>'
    yield '</sheetView></sheetViews><sheetFormatPr defaultRowHeight="15"/>'
    if sheet.widths:
        yield "<cols>"
        for col, width in sorted(sheet.widths.items()):
            yield f'<col min="{col}" max="{col}" width="{width}" customWidth="1"/>'
        yield "</cols>"
    yield "<sheetData>"
    letters = [column_letters(i) for i in range(1, sheet.last_col + 1)]
    for row in sorted(sheet.cells):
        found = values.get(row) if values is not None else None
        height = sheet.heights.get(row)
        tall = f' ht="{height}" customHeight="1"' if height else ""
        yield f'<row r="{row}"{tall}>'
        cells = sheet.cells[row]
        for col in sorted(cells):
            content, style = cells[col]
            head = f'<c r="{letters[col - 1]}{row}" s="{styles[style]}"'
            if type(content) is Formula:
                value = found[col - 1] if found is not None else None
                yield head + _formula(content, value, text_of)
            elif type(content) is str:
                keep = ' xml:space="preserve"' if content != content.strip() else ""
                yield (
                    f'{head} t="inlineStr"><is><t{keep}>{escape(content)}</t></is></c>'
                    if content
                    else head + "/>"
                )
            else:
                yield f"{head}><v>{encode(float(content))[1]}</v></c>"  # type: ignore[arg-type]
        yield "</row>"
    yield "</sheetData>"
    yield from _below(sheet, dxfs)
    yield "</worksheet>"


def _text(text: str) -> str:
    keep = ' xml:space="preserve"' if text != text.strip() else ""
    return f' t="inlineStr"><is><t{keep}>{escape(text)}</t></is></c>'


def _formula(formula: Formula, value: Any, text_of: Callable[[Formula], str]) -> str:
    array = f' t="array" ref="{formula.ref}"' if formula.ref else ""
    text = f"<f{array}>{escape(text_of(formula))}</f>" if formula.text else ""
    if value is None:
        return f">{text}</c>" if text else "/>"
    kind, shown = encode(value)
    mark = f' t="{kind}"' if kind else ""
    return f"{mark}>{text}<v>{shown}</v></c>"


def _below(sheet: Sheet, dxfs: Mapping[str, int]) -> Iterator[str]:
    """What follows the cells, in the order that the format asks for."""
    if sheet.merges:
        yield f'<mergeCells count="{len(sheet.merges)}">'
        for row, first, last in sheet.merges:
            yield f'<mergeCell ref="{local(row, first)}:{local(row, last)}"/>'
        yield "</mergeCells>"
    if sheet.verdicts:
        yield f'<conditionalFormatting sqref="{" ".join(sheet.verdicts)}">'
        for priority, (word, name) in enumerate(
            (("agrees", "good"), ("differs", "bad"), ("error", "bad")), 1
        ):
            yield (
                f'<cfRule type="cellIs" dxfId="{dxfs[name]}" priority="{priority}" operator="equal">'
                f'<formula>"{word}"</formula></cfRule>'
            )
        yield "</conditionalFormatting>"
    if sheet.links:
        yield "<hyperlinks>"
        for row, col, target in sheet.links:
            place = _attribute(target)
            yield f'<hyperlink ref="{local(row, col)}" location="{place}" display="{place}"/>'
        yield "</hyperlinks>"
    yield '<pageMargins left="0.45" right="0.45" top="0.6" bottom="0.6" header="0.3" footer="0.3"/>'
    # Paper 0 is the printer's own: A4 or Letter. All widths are laid out for the narrower of the two.
    fit = ' fitToWidth="1" fitToHeight="0"' if sheet.fit_width else f' scale="{SCALE}"'
    yield f'<pageSetup orientation="landscape"{fit}/>'
    yield (
        "<headerFooter><oddHeader>&amp;L&amp;F&amp;R&amp;A</oddHeader>"
        f"<oddFooter>&amp;L{escape(sheet.footer)}&amp;RPage &amp;P of &amp;N</oddFooter></headerFooter>"
    )
    for tag, breaks, end in (
        ("rowBreaks", sheet.row_breaks, 16383),
        ("colBreaks", sheet.column_breaks, 1048575),
    ):
        if breaks:
            yield f'<{tag} count="{len(breaks)}" manualBreakCount="{len(breaks)}">'
            yield "".join(f'<brk id="{at}" max="{end}" man="1"/>' for at in breaks)
            yield f"</{tag}>"


SCALE = 70
"""Per cent at which the wide sheets are printed."""


def _attribute(text: str) -> str:
    return escape(text).replace('"', "&quot;")
