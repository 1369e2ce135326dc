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
from thrustbook.addin.hosts.headless.a1 import to_a1

_MAIN: Final = "http://schemas.openxmlformats.org/spreadsheetml/2006/main"
_REL: Final = "http://schemas.openxmlformats.org/officeDocument/2006/relationships"
_PACKAGE: Final = "http://schemas.openxmlformats.org/package/2006/relationships"
_TYPES: Final = "http://schemas.openxmlformats.org/package/2006/content-types"
_KIND: Final = "application/vnd.openxmlformats-officedocument.spreadsheetml"

HEADINGS: Final = ("fitting", "rho", "D1", "p1", "Q", "theta", "D2")
NATIVE: Final = (
    ("H", "PI()/4*C{r}^2"),  # area at section 1
    ("I", "PI()/4*G{r}^2"),  # area at section 2
    ("J", "E{r}/H{r}"),  # velocities
    ("K", "E{r}/I{r}"),
    ("L", "D{r}+B{r}/2*(J{r}^2-K{r}^2)"),  # pressure at section 2
    ("M", "D{r}*H{r}+B{r}*E{r}*J{r}"),  # impulse at either section
    ("N", "L{r}*I{r}+B{r}*E{r}*K{r}"),
    ("O", "RADIANS(F{r})"),
    ("P", "M{r}-N{r}*COS(O{r})"),  # thrust along x, along y, magnitude, direction
    ("Q", "-N{r}*SIN(O{r})"),
    ("R", "SQRT(P{r}^2+Q{r}^2)"),
    ("S", "DEGREES(ATAN2(P{r},Q{r}))"),
)
"""The sums of one bend as a sheet of ordinary formulas has them: one step a cell."""


def longhand() -> list[tuple[str, str]]:
    """The long-hand working of TB_BEND as a checking sheet has it: one step a cell, from column H on."""
    row = CATALOGUE["TB_BEND"]
    assert isinstance(row.longhand, Longhand)
    cells = {name: f"{chr(65 + j)}{{r}}" for j, name in enumerate(HEADINGS)}
    cells["theta"] = "RADIANS(F{r})"
    neutral = {"alpha1": "1", "alpha2": "1", "beta1": "1", "beta2": "1", "K": "0", "dz": "0", "p2": '""'}
    cells |= {name: value for name, value in neutral.items() if name not in cells}
    out = []
    for j, step in enumerate(row.longhand.steps, len(HEADINGS) + 1):
        out.append((to_a1(1, j)[:-1], re.sub(r"\{([^{}]+)\}", lambda m: cells[m[1]], step.formula)))
        cells[step.symbol] = to_a1(1, j)[:-1] + "{r}"
    return out


def bends(count: int) -> list[list[float]]:
    """Invented bends: rho, D1, p1, Q, theta, D2, in SI units and degrees."""
    draw = random.Random(7).uniform
    return [
        [draw(990, 1010), draw(0.2, 1.0), draw(1e5, 1e6), draw(0.05, 0.3), draw(5, 120), draw(0.2, 1.0)]
        for _ in range(count)
    ]


def write(path: Path, rows: Sequence[Sequence[float]], formulas: Iterable[tuple[str, str, str]]) -> None:
    """Write a sheet "Data": headings in row 1, a bend a row below, and formulas.

    A formula is (column, text with {r} for the row, extent of an array or ""); one
    with an extent stands in row 2 alone, any other in every row.
    """
    cells, arrays = [], []
    for column, text, extent in formulas:
        (arrays if extent else cells).append((column, text.replace("&", "&amp;"), extent))
    head = "".join(
        f'<c r="{chr(65 + j)}1" t="inlineStr"><is><t>{name}</t></is></c>' for j, name in enumerate(HEADINGS)
    )
    lines = [f'<row r="1">{head}</row>']
    for r, values in enumerate(rows, 2):
        line = f'<row r="{r}"><c r="A{r}" t="inlineStr"><is><t>bend</t></is></c>'
        line += "".join(f'<c r="{chr(66 + j)}{r}"><v>{value!r}</v></c>' for j, value in enumerate(values))
        line += "".join(f'<c r="{c}{r}"><f>{text.format(r=r)}</f></c>' for c, text, _ in cells)
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
