"""The VBA module of wrappers, generated from the catalogue.

A wrapper takes its arguments as optional Variants, hands plain values to
``XLPy.CallUDF`` of xlwings and turns the markers in the answer into true
errors. Every way out of it is a cell value: a fault of the link to Python shows
as #VALUE!, and its text waits for the macro ``TbLastFault``.
"""

from __future__ import annotations

import textwrap
from collections.abc import Iterable, Mapping
from typing import Final

from ...catalogue.registry import CATALOGUE
from ...catalogue.types import Row
from ...cells import ERROR_TEXT, ErrorKind
from .markers import MARKER_TAIL
from .names import parameters
from .vba_support import MACROS, SUPPORT

MODULE_NAME: Final = "thrustbook_functions"
PYTHON_MODULE: Final = "thrustbook.addin.hosts.excel.udfs"

# [MS-OE376] / Excel object model, enumeration XlCVError.
CVERR: Final[Mapping[ErrorKind, int]] = {
    "NULL": 2000,
    "DIV0": 2007,
    "VALUE": 2015,
    "REF": 2023,
    "NAME": 2029,
    "NUM": 2036,
    "NA": 2042,
}

LINE_WIDTH: Final = 100
NEWLINE: Final = "\r\n"


def ascii_text(text: str) -> str:
    """Give a text for a comment in a module that is read in the machine's own code page."""
    return text.encode("ascii", "replace").decode("ascii")


def statement(head: str, items: Iterable[str], tail: str) -> list[str]:
    """Write a statement with a list in it, over several lines where it is long."""
    pieces = textwrap.wrap(
        head + ", ".join(item.replace(" ", "\0") for item in items) + tail.replace(" ", "\0"),
        LINE_WIDTH,
        subsequent_indent="        ",
        break_long_words=False,
        break_on_hyphens=False,
    )
    lines = [piece.replace("\0", " ") for piece in pieces]
    return [line + " _" for line in lines[:-1]] + lines[-1:]


def wrapper(row: Row) -> str:
    """Write the VBA function of one row."""
    names = [p.name for p in parameters(row)]
    repeats = row.max_args is None
    listed = [f"Optional {n} As Variant" for n in names]
    if repeats:  # VBA takes no optional parameters beside a ParamArray
        listed = [f"{n} As Variant" for n in names[:-1]] + [f"ParamArray {names[-1]}() As Variant"]
    fixed = names[:-1] if repeats else names
    out = [f"' {line}" for line in textwrap.wrap(ascii_text(f"{row.signature()}: {row.summary}"), LINE_WIDTH)]
    out += statement(f"Public Function {row.name}(", listed, ") As Variant")
    out += ["    Dim tb_args() As Variant"]
    if repeats:
        out += ["    Dim tb_k As Long"]
    out += ["    On Error GoTo tb_failed"]
    if repeats:
        out += [f"    ReDim tb_args(0 To {len(fixed)} + UBound({names[-1]}))"]
    elif names:
        out += [f"    ReDim tb_args(0 To {len(names) - 1})"]
    out += [f"    tb_args({i}) = TbArg({name})" for i, name in enumerate(fixed)]
    if repeats:
        out += [
            f"    For tb_k = 0 To UBound({names[-1]})",
            f"        tb_args({len(fixed)} + tb_k) = TbArg({names[-1]}(tb_k))",
            "    Next tb_k",
        ]
    out += [
        f'    {row.name} = TbCall("{row.name}", {"tb_args" if names else "Array()"})',
        "    Exit Function",
        "tb_failed:",
        f"    {row.name} = TbFailed(Err.Description)",
        "End Function",
    ]
    return "\n".join(out)


def support() -> str:
    """Write the part that all wrappers share."""
    cases = "\n".join(
        f'            Case "{ERROR_TEXT[kind]}"\n                TbCell = CVErr({code})'
        for kind, code in CVERR.items()
    )
    text = SUPPORT.format(module=PYTHON_MODULE, tail=MARKER_TAIL, cases=cases, VALUE=CVERR["VALUE"])
    return text.strip("\n")


def functions_module(rows: Iterable[Row] = CATALOGUE.values()) -> str:
    """Write the whole module, lines ended as Windows ends them."""
    head = f"""Attribute VB_Name = "{MODULE_NAME}"
' Worksheet functions of thrustbook. Generated from its catalogue: do not edit.
Option Explicit
"""
    text = "\n\n".join([head, support(), MACROS.strip("\n"), *map(wrapper, rows)]) + "\n"
    return text.replace("\n", NEWLINE)
