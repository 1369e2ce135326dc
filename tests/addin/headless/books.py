"""Small workbooks and functions for the tests of the evaluator."""

from __future__ import annotations

import io
import re
import zipfile
from collections.abc import Callable, Mapping, Sequence
from pathlib import Path
from typing import Any

import numpy as np
import openpyxl
from openpyxl.workbook.defined_name import DefinedName
from openpyxl.worksheet.formula import ArrayFormula
from openpyxl.worksheet.table import Table

from thrustbook.addin.cells import CellError
from thrustbook.addin.hosts.headless.evaluate import Evaluation, evaluate_workbook
from thrustbook.addin.hosts.headless.host import Functions
from thrustbook.addin.xlsx.package import Package


def make(
    path: Path,
    sheets: Mapping[str, Mapping[str, Any]],
    *,
    names: Mapping[str, str] = {},
    local_names: Sequence[tuple[str, str, str]] = (),
    tables: Sequence[tuple[str, str, str]] = (),
    edit: Callable[[str], str] | None = None,
    part: str = "xl/worksheets/sheet1.xml",
) -> Path:
    """Write a workbook. A value (ref, text) makes an array formula; ``edit`` changes a sheet's XML."""
    book = openpyxl.Workbook()
    book.remove(book.active)
    for title, cells in sheets.items():
        sheet = book.create_sheet(title)
        for place, value in cells.items():
            sheet[place] = ArrayFormula(*value) if isinstance(value, tuple) else value
    for name, text in names.items():
        book.defined_names[name] = DefinedName(name, attr_text=text)
    for title, name, text in local_names:
        book[title].defined_names[name] = DefinedName(name, attr_text=text)
    for title, name, ref in tables:
        book[title].add_table(Table(displayName=name, ref=ref))
    book.save(path)
    if edit is not None:
        change_part(path, part, edit)
    return path


def change_part(path: Path, part: str, edit: Callable[[str], str]) -> None:
    """Change one part of a workbook as text."""
    out = io.BytesIO()
    with zipfile.ZipFile(path) as old, zipfile.ZipFile(out, "w", zipfile.ZIP_DEFLATED) as new:
        for item in old.infolist():
            data = old.read(item)
            if item.filename == part:
                changed = edit(data.decode()).encode()
                assert changed != data, "the edit must find its place"
                data = changed
            new.writestr(item, data)
    path.write_bytes(out.getvalue())


def with_values(values: Mapping[str, str]) -> Callable[[str], str]:
    """An edit that stores values in formula cells: {"A1": "<v>5</v>"}, or 't="str"|<v>x</v>' for a text."""

    def edit(xml: str) -> str:
        for place, value in values.items():
            kind, _, element = value.rpartition("|")
            pattern = rf'<c r="{place}"([^>]*)>(<f[^>]*?(?:/>|>.*?</f>))<v\s*(?:/>|></v>)</c>'
            xml, count = re.subn(
                pattern,
                lambda m, k=kind, e=element: f'<c r="{m[0].split(chr(34))[1]}" {k}>{m[2]}{e}</c>',
                xml,
            )
            assert count == 1, f"{place} holds no formula without a value"
        return xml

    return edit


def dynamic(*places: str) -> Callable[[str], str]:
    """An edit that makes array formulas dynamic ones."""

    def edit(xml: str) -> str:
        for place in places:
            assert f'<c r="{place}"' in xml
            xml = xml.replace(f'<c r="{place}"', f'<c r="{place}" cm="1"')
        return xml

    return edit


def _number(value: Any) -> float | CellError:
    if isinstance(value, CellError):
        return value
    if type(value) is not float:
        return CellError("VALUE", f"a number is wanted, not {value!r}")
    return value


def _twice(args: Sequence[Any]) -> Any:
    if len(args) != 1:
        return CellError("VALUE", f"one argument is wanted, {len(args)} were given")
    value = _number(args[0])
    if isinstance(value, CellError):
        return value
    if value < 0:
        return CellError("NUM", f"x = {value:g} is out of range; it must not be negative")
    return 2.0 * value


def _default(args: Sequence[Any]) -> Any:
    """100 a + 10 b + c, with 7 for each that is left out."""
    filled = [7.0 if i >= len(args) or args[i] is None else _number(args[i]) for i in range(3)]
    for value in filled:
        if isinstance(value, CellError):
            return value
    return 100 * filled[0] + 10 * filled[1] + filled[2]


def _echo(args: Sequence[Any]) -> Any:
    return repr(list(args))


def _table(args: Sequence[Any]) -> Any:
    """Each number of a range twice; text as it is; a negative number fails in its own cell."""
    rows = args[0] if isinstance(args[0], list) else [[args[0]]]
    grid = np.empty((len(rows), len(rows[0])), dtype=object)
    for i, row in enumerate(rows):
        for j, value in enumerate(row):
            if isinstance(value, str):
                grid[i, j] = value
            else:
                grid[i, j] = _twice([value])
    return grid


def _grid(args: Sequence[Any]) -> Any:
    """A grid of the given size: 1, 2, 3 ... row by row."""
    rows, cols = int(args[0]), int(args[1])
    return np.arange(1.0, rows * cols + 1).reshape(rows, cols).astype(object)


def _scaled(args: Sequence[Any]) -> Any:
    """A range times a number, for large ranges."""
    return (np.array(args[0], dtype=float) * args[1]).astype(object)


_CALLS: dict[str, tuple[Callable[[Sequence[Any]], Any], bool]] = {
    "TB_TWICE": (_twice, False),
    "TB_DEFAULT": (_default, False),
    "TB_ECHO": (_echo, False),
    "TB_ROW": (lambda args: np.array([[1.0, 2.0, "three"]], dtype=object), False),
    "TB_TABLE": (_table, True),
    "TB_GRID": (_grid, True),
    "TB_SCALED": (_scaled, True),
}

FUNCTIONS = Functions(
    lambda name, args: _CALLS[name][0](args), {name: block for name, (_, block) in _CALLS.items()}
)


def evaluate(path: Path, functions: Functions = FUNCTIONS, **options: Any) -> Evaluation:
    """Evaluate a workbook and save the values in it."""
    package = Package.read(path)
    evaluation = evaluate_workbook(package, functions=functions, **options)
    package.save(path, evaluation.replaced)
    return evaluation


def values(path: Path, sheet: str | None = None) -> dict[str, Any]:
    """The stored values by cell."""
    book = openpyxl.load_workbook(path, data_only=True)
    chosen = book[sheet] if sheet else book.worksheets[0]
    return {
        cell.coordinate: cell.value for row in chosen.iter_rows() for cell in row if cell.value is not None
    }
