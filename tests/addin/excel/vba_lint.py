"""Known limits of VBA and of Excel's wizard, checked on the text of a module.

Limits from Microsoft's documentation of VBA and Excel, from memory: 1023
characters a line, 24 line continuations a statement, 255 characters an
identifier, 60 parameters a procedure, 64 kB of code a procedure, 65 534 lines a
module.
"""

from __future__ import annotations

import re

RESERVED = frozenset(
    """
    and as boolean byref byte byval call case cdbl cint clng const csng cstr currency cvar date debug declare
    dim do double each else elseif empty end enum eqv erase error event exit false for friend function get
    global gosub goto if imp implements in input integer is let lib like line lock long loop lset me mod new
    next not nothing null object on open option optional or paramarray preserve print private property public
    put raiseevent redim rem resume return rset seek select set single spc static step stop string sub tab
    then time to true type typeof until variant wend while with write xor
    """.split()  # noqa: SIM905
)
_PROCEDURE = re.compile(r"^(?:Public |Private )?(Function|Sub) (\w+)\((.*)\)(?: As \w+)?$")
_DECLARED = re.compile(r"\b(?:Dim|Const|ReDim)\s+(\w+)")


def logical_lines(text: str) -> list[str]:
    """Join continued lines."""
    return re.sub(r" _\n\s*", " ", text.replace("\r\n", "\n")).split("\n")


def lint(text: str, ours: bool = True) -> list[str]:
    """List what VBA or Excel would refuse in a module; ``ours`` adds the rules of our own generator."""
    found: list[str] = []
    if not text.isascii():
        found.append("not plain ASCII")
    if ours and text.count("\n") != text.count("\r\n"):
        found.append("lines not ended as Windows ends them")
    lines = text.replace("\r\n", "\n").split("\n")
    if len(lines) > 65534:
        found.append(f"{len(lines)} lines")
    run = 0
    for i, line in enumerate(lines, 1):
        if len(line) > 1023:
            found.append(f"line {i}: {len(line)} characters")
        run = run + 1 if line.endswith(" _") else 0
        if run > 24:
            found.append(f"line {i}: more than 24 continuations")
        if line.rstrip() != line and ours:
            found.append(f"line {i}: blanks at the end")
        if re.sub(r'"(?:[^"]|"")*"', "", line).split("'")[0].count('"'):
            found.append(f"line {i}: a text that does not end")
    return found + _procedures(logical_lines(text), ours)


def _procedures(lines: list[str], ours: bool) -> list[str]:
    found: list[str] = []
    names: dict[str, str] = {}
    open_name, size, parameters = "", 0, []  # type: str, int, list[str]
    for line in lines:
        code = line.split("'")[0] if line.lstrip().startswith("'") else line
        match = _PROCEDURE.match(code.strip())
        if match:
            kind, open_name, listed = match[1], match[2], match[3]
            if open_name.lower() in names:
                found.append(f"{open_name} and {names[open_name.lower()]} have one name")
            names[open_name.lower()] = open_name
            parameters = _parameters(listed)
            found += _check_names([open_name, *parameters], open_name)
            size = 0
            end = f"End {kind}"
        elif open_name:
            size += len(line) + 2
            declared = [name for name in _DECLARED.findall(code) if "tb_args(" not in code or ours]
            clash = {d.lower() for d in declared if not code.strip().startswith("ReDim")}
            clash &= {p.lower() for p in parameters}
            if clash:
                found.append(f"{open_name}: {', '.join(clash)} is both a parameter and a variable")
            if code.strip() == end:
                if size > 64000:
                    found.append(f"{open_name}: {size} characters")
                open_name = ""
    if open_name:
        found.append(f"{open_name} does not end")
    return found


def _parameters(listed: str) -> list[str]:
    out = []
    for part in filter(None, (p.strip() for p in listed.split(","))):
        words = [w for w in part.split() if w not in ("Optional", "ParamArray", "ByVal", "ByRef")]
        out.append(words[0].removesuffix("()"))
    return out


def _check_names(names: list[str], where: str) -> list[str]:
    found = []
    if len(names) - 1 > 60:
        found.append(f"{where}: {len(names) - 1} parameters")
    lowered = [n.lower() for n in names]
    for name in names:
        if not re.fullmatch(r"[A-Za-z]\w{0,254}", name):
            found.append(f"{where}: {name} is no identifier")
        if name.lower() in RESERVED:
            found.append(f"{where}: {name} is a word of VBA")
        if lowered.count(name.lower()) > 1:
            found.append(f"{where}: {name} stands twice; VBA does not tell case apart")
    return found
