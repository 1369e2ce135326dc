"""What the add-in file ``thrustbook.xlam`` holds, and its making with Excel's own object model.

The file is a workbook marked as an add-in, with a sheet ``thrustbook.conf`` that
tells xlwings which Python to start, and three VBA modules: xlwings' own for
custom add-ins, our wrappers, and the relink macro.
"""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path
from typing import Any, Final

import xlwings

from ...catalogue.registry import CATALOGUE
from .names import category, description, parameters
from .vba import MODULE_NAME, PYTHON_MODULE, functions_module
from .vba_relink import MODULE_NAME as RELINK_NAME
from .vba_relink import relink_module

FILE_NAME: Final = "thrustbook.xlam"
PROJECT: Final = "thrustbook"

XLWINGS_VERSION: Final = "0.37.8"
"""The only release that will do: the VBA module of xlwings names the DLL of its own release, the DLL
starts Python, and Python must answer with the same release. An upgrade of one alone breaks the link."""

# Excel object model: XlWBATemplate.xlWBATWorksheet, XlFileFormat.xlOpenXMLAddIn.
_ONE_SHEET, _ADD_IN = -4167, 55


class WrongXlwings(Exception):
    """The xlwings that is installed is not the release that the add-in is made for."""


def xlwings_module(source: Path | None = None) -> str:
    """Give xlwings' VBA module for custom add-ins, fitted to this add-in.

    Three things differ from the released text. The configuration is read from the
    add-in itself and never from the workbook that happens to be active: a
    workbook from elsewhere could name a program to be started there; and one
    Python serves all workbooks, not one for each. The conf sheet is read whichever
    sheet is active. And the module is private, so that its functions do not show
    among the worksheet functions.

    Raises
    ------
    WrongXlwings
        Another release of xlwings, or a text that is not the expected one.
    """
    if xlwings.__version__ != XLWINGS_VERSION:
        raise WrongXlwings(f"xlwings {xlwings.__version__} is installed; {XLWINGS_VERSION} is needed")
    file = source or Path(xlwings.__file__).with_name("xlwings_custom_addin.bas")
    lines = file.read_text(encoding="cp1252").splitlines()
    text = "\n".join(lines) + "\n"
    expected = (
        'Attribute VB_Name = "xlwings"\n',
        f'XLWINGS_VERSION As String = "{XLWINGS_VERSION}"\n',
        'PROJECT_NAME As String = "myaddin"\n',
        "Function XLPy()\n",
        "Sub KillPy()\n",
        "For Each cell In Range(sht",
    )
    missing = [part.strip() for part in expected if text.count(part) != 1]
    if missing:
        raise WrongXlwings(f"{file} is not the module of xlwings {XLWINGS_VERSION}: {missing[0]}")
    text = text.replace(
        expected[0],
        expected[0]
        + "Option Private Module\n"
        + "' Changed for thrustbook: reads its configuration from the add-in only.\n",
    )
    text = text.replace("ActiveWorkbook", "ThisWorkbook").replace('"myaddin"', f'"{PROJECT}"')
    # Without the sheet in front, Range fails while a chart sheet is active.
    text = text.replace("For Each cell In Range(sht", "For Each cell In sht.Range(sht")
    return text.replace("\n", "\r\n")


def modules() -> dict[str, str]:
    """Give the VBA modules of the add-in, name -> text."""
    return {"xlwings": xlwings_module(), MODULE_NAME: functions_module(), RELINK_NAME: relink_module()}


def configuration(python: Path) -> Mapping[str, str]:
    """Give the conf sheet of the add-in, key -> value, as xlwings reads it."""
    return {
        "INTERPRETER_WIN": str(python),
        "UDF MODULES": PYTHON_MODULE,
        # The folder of a workbook must not become a place from which Python loads modules.
        "ADD_WORKBOOK_TO_PYTHONPATH": "False",
    }


def make(excel: Any, python: Path, target: Path) -> None:
    """Make the add-in file with a running Excel (its Application object); the workbook is closed after.

    ``target`` must not exist; its folder is used for the texts of the modules.
    """
    book = excel.Workbooks.Add(_ONE_SHEET)
    try:
        components = book.VBProject.VBComponents
        for name, text in modules().items():
            file = target.with_name(f"{name}.bas")
            file.write_bytes(text.encode("ascii"))
            components.Import(str(file))
        _write_configuration(book.Worksheets(1), python)
        # Excel takes no texts for the functions of a hidden workbook.
        excel.Visible = True
        _register_texts(excel, book.Name)
        excel.Visible = False
        book.IsAddin = True
        book.SaveAs(str(target), FileFormat=_ADD_IN)
    finally:
        book.Close(False)


def _write_configuration(sheet: Any, python: Path) -> None:
    rows = tuple(configuration(python).items())
    sheet.Name = f"{PROJECT}.conf"
    area = sheet.Range(f"A1:B{len(rows)}")
    # As text: a written False would become a logical value, spelt in the language of the machine.
    area.NumberFormat = "@"
    area.Value = rows


def _register_texts(excel: Any, book: str) -> None:
    """Give the function wizard its texts."""
    for name, row in CATALOGUE.items():
        excel.MacroOptions(
            f"'{book}'!{name}",
            Description=description(row),
            HasMenu=False,
            MenuText=None,
            HasShortcutKey=False,
            ShortcutKey=None,
            Category=category(row),
            StatusBar=None,
            HelpContextID=None,
            HelpFile=None,
            ArgumentDescriptions=[p.text for p in parameters(row)] or None,
        )
