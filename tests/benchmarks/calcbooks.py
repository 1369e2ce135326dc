"""Large workbooks for the benchmark in Calc, written directly as .xlsx."""

from __future__ import annotations

import random
import re
import zipfile
from collections.abc import Iterable, Sequence
from pathlib import Path
from typing import Final

from thrustbook.addin.catalogue.registry import CATALOGUE
from thrustbook.addin.catalogue.types import Longhand
from thrustbook.addin.xlsx.a1 import to_a1

_MAIN: Final = "http://schemas.openxmlformats.org/spreadsheetml/2006/main"
_REL: Final = "http://schemas.openxmlformats.org/officeDocument/2006/relationships"
_PACKAGE: Final = "http://schemas.openxmlformats.org/package/2006/relationships"
_TYPES: Final = "http://schemas.openxmlformats.org/package/2006/content-types"
_KIND: Final = "application/vnd.openxmlformats-officedocument.spreadsheetml"

HEADINGS: Final = ("fitting", "rho", "D1", "p1", "Q", "theta", "D2")
NATIVE: Final = (
    ("H", "PI()/4*(C{r}/1000)^2"),  # area at section 1
    ("I", "PI()/4*(G{r}/1000)^2"),  # area at section 2
    ("J", "E{r}/1000/H{r}"),  # velocities
    ("K", "E{r}/1000/I{r}"),
    ("L", "D{r}*1000+B{r}/2*(J{r}^2-K{r}^2)"),  # pressure at section 2
    ("M", "D{r}*1000*H{r}+B{r}*E{r}/1000*J{r}"),  # impulse at either section
    ("N", "L{r}*I{r}+B{r}*E{r}/1000*K{r}"),
    ("O", "RADIANS(F{r})"),
    ("P", "(M{r}-N{r}*COS(O{r}))/1000"),  # thrust along x, along y, magnitude, direction
    ("Q", "-N{r}*SIN(O{r})/1000"),
    ("R", "SQRT(P{r}^2+Q{r}^2)"),
    ("S", "DEGREES(ATAN2(P{r},Q{r}))"),
)
"""The bare sums of one bend, in as few cells as one would care to read."""

_TO_SI: Final = {
    "D1": "C{r}/1000",
    "p1": "D{r}*1000",
    "Q": "E{r}/1000",
    "theta": "RADIANS(F{r})",
    "D2": 'IF(G{r}="","",G{r}/1000)',
}
_NEUTRAL: Final = {"alpha1": 1, "alpha2": 1, "beta1": 1, "beta2": 1, "K": 0, "dz": 0, "p2": '""'}
_FROM_SI: Final = {"Fx": "{}/1000", "Fy": "{}/1000", "F": "{}/1000", "dir": "DEGREES({})"}


def longhand(*results: str) -> list[tuple[str, str]]:
    """The long-hand working of TB_BEND for some results, as a checking sheet has it, from column H on.

    One argument converted, one step or one result converted a cell; the results come last.
    """
    row = CATALOGUE["TB_BEND"]
    assert isinstance(row.longhand, Longhand)
    steps = {step.symbol: step.formula for step in row.longhand.steps}
    needed = list(results)
    for symbol in needed:
        needed += [n for n in re.findall(r"\{([^{}]+)\}", steps.get(symbol, "")) if n not in needed]
    cells = {"rho": "B{r}"} | {name: str(value) for name, value in _NEUTRAL.items()}
    out: list[tuple[str, str]] = []

    def put(symbol: str, formula: str) -> None:
        column = to_a1(1, len(HEADINGS) + 1 + len(out))[:-1]
        out.append((column, formula))
        cells[symbol] = column + "{r}"

    for name, formula in _TO_SI.items():
        if name in needed:
            put(name, formula)
    for symbol, formula in steps.items():
        if symbol in needed:
            put(symbol, re.sub(r"\{([^{}]+)\}", lambda m: cells[m[1]], formula))
    for name in results:
        put(name, _FROM_SI[name].replace("{}", cells[name]))
    return out


def bends(count: int) -> list[list[float]]:
    """Invented bends: rho, D1, p1, Q, theta, D2, in metric units (mm, kPa, L/s) and degrees."""
    draw = random.Random(7).uniform
    return [
        [draw(990, 1010), draw(200, 1000), draw(100, 1000), draw(50, 300), draw(5, 120), draw(200, 1000)]
        for _ in range(count)
    ]


def write(path: Path, rows: Sequence[Sequence[float]], formulas: Iterable[tuple[str, str, str]]) -> None:
    """Write a sheet "Data": headings in row 1, a bend a row below, and formulas.

    A formula is (column, text with {r} for the row, extent of an array or ""); one
    with an extent stands in row 2 alone, any other in every row.
    """
    cells, arrays = [], []
    for column, text, extent in formulas:
        (arrays if extent else cells).append(
            (column, text.replace("&", "&amp;").replace("<", "&lt;"), extent)
        )
    head = "".join(
        f'<c r="{chr(65 + j)}1" t="inlineStr"><is><t>{name}</t></is></c>' for j, name in enumerate(HEADINGS)
    )
    lines = [f'<row r="1">{head}</row>']
    for r, values in enumerate(rows, 2):
        line = f'<row r="{r}"><c r="A{r}" t="inlineStr"><is><t>bend</t></is></c>'
        line += "".join(f'<c r="{chr(66 + j)}{r}"><v>{value!r}</v></c>' for j, value in enumerate(values))
        line += "".join(f'<c r="{c}{r}"><f>{text.replace("{r}", str(r))}</f></c>' for c, text, _ in cells)
        if r == 2:
            line += "".join(
                f'<c r="{c}{r}"><f t="array" ref="{extent}">{text}</f></c>' for c, text, extent in arrays
            )
        lines.append(line + "</row>")
    sheet = f'<worksheet xmlns="{_MAIN}"><sheetData>{"".join(lines)}</sheetData></worksheet>'
    book = (
        f'<workbook xmlns="{_MAIN}" xmlns:r="{_REL}"><sheets>'
        '<sheet name="Data" sheetId="1" r:id="rId1"/></sheets></workbook>'
    )
    parts = {
        "[Content_Types].xml": f'<Types xmlns="{_TYPES}">'
        '<Default Extension="rels" ContentType="application/vnd.openxmlformats-package.relationships+xml"/>'
        f'<Override PartName="/xl/workbook.xml" ContentType="{_KIND}.sheet.main+xml"/>'
        f'<Override PartName="/xl/worksheets/sheet1.xml" ContentType="{_KIND}.worksheet+xml"/></Types>',
        "_rels/.rels": _relations(f"{_REL}/officeDocument", "xl/workbook.xml"),
        "xl/workbook.xml": book,
        "xl/_rels/workbook.xml.rels": _relations(f"{_REL}/worksheet", "worksheets/sheet1.xml"),
        "xl/worksheets/sheet1.xml": sheet,
    }
    with zipfile.ZipFile(path, "w", zipfile.ZIP_DEFLATED, compresslevel=1) as archive:
        for name, text in parts.items():
            archive.writestr(name, '<?xml version="1.0" encoding="UTF-8"?>' + text)


def _relations(kind: str, target: str) -> str:
    link = f'<Relationship Id="rId1" Type="{kind}" Target="{target}"/>'
    return f'<Relationships xmlns="{_PACKAGE}">{link}</Relationships>'
