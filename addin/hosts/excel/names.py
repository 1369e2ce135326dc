"""Names and texts of the worksheet functions, as Python, VBA and the function wizard take them."""

from __future__ import annotations

import keyword
from typing import NamedTuple

from ... import describe
from ...catalogue.glossary import GLOSSARY
from ...catalogue.registry import wording
from ...catalogue.types import Arg, Row

WIZARD_LIMIT = 255
"""Longest text that Excel's function wizard keeps."""

# Words that VBA does not take for a parameter, and those that the generated code itself uses:
# a parameter of that name would hide them.
_VBA_WORDS = """
    addressof alias and any array as attribute base binary boolean byref byte byval call case cbool cbyte
    ccur cdate cdbl cint class clng close compare const csng cstr currency cvar cverr date debug decimal
    declare defbool defdbl defint deflng defobj defstr defvar delete dim do double each else elseif empty
    end endif enum eqv erase error event exit explicit false fix for friend function get global gosub goto
    if imp implements in input instr int integer is lbound left len let lib like line lock long longlong
    longptr loop lset me mid mod module name new next not nothing null object on open option optional or
    output paramarray preserve print private property ptrsafe public put raiseevent random read redim rem
    resume return rset scale seek select set shared single spc static step stop string sub tab text then
    time timer to true type typeof typename ubound unlock until userform variant vartype vb_name wend while
    width with withevents write xor ismissing isarray isempty isnull err application xlpy caller
"""
VBA_WORDS = frozenset(_VBA_WORDS.split())


class Parameter(NamedTuple):
    """A parameter of a worksheet function as a host shows it."""

    name: str
    text: str
    """For the function wizard, at most 255 characters."""


def cut(text: str, limit: int = WIZARD_LIMIT) -> str:
    """Shorten a text at a word where it is longer than the limit."""
    if len(text) <= limit:
        return text
    head = text[: limit - 3]
    return head[: head.rfind(" ") if " " in head else None].rstrip(" ,;:") + "..."


def identifier(name: str, taken: frozenset[str] = frozenset()) -> str:
    """Give a name legal in Python and in VBA, and unlike those taken: VBA does not tell case apart."""
    safe = name
    while keyword.iskeyword(safe) or safe.lower() in VBA_WORDS or safe.lower() in taken:
        safe += "_"
    return safe


def parameters(row: Row) -> tuple[Parameter, ...]:
    """Give the parameters of a function in the order of the worksheet call."""
    named: list[tuple[str, str]] = []
    if row.has_result:
        named.append(("result", GLOSSARY["result"]))
    if row.has_units:
        named.append(("units", GLOSSARY["units"]))
    named += [(a.name, _argument_text(row, a)) for a in row.args]
    out: list[Parameter] = []
    taken = frozenset((row.name.lower(),))
    for name, text in named:
        safe = identifier(name, taken)
        taken |= {safe.lower()}
        out.append(Parameter(safe, cut(text)))
    return tuple(out)


def description(row: Row) -> str:
    """Give the function's text for the wizard."""
    return cut(row.summary)


def category(row: Row) -> str:
    """Give the wizard's category: the family under the product's name."""
    return f"thrustbook: {row.family}"


def _argument_text(row: Row, arg: Arg) -> str:
    """Wording, then what empty means, then the units: in the order of what a user needs first."""
    units = describe.unit_names(arg.role)
    parts = [wording(arg)]
    if arg.choices:
        parts.append("one of " + ", ".join(arg.choices))
    if row.required(arg):
        parts.append("required")
    elif arg.empty:
        parts.append(f"empty: {arg.empty}")
    else:
        parts.append("optional")
    if units and units != "-":
        parts.append(f"SI | metric | US: {units}")
    return "; ".join(parts)
