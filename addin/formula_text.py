"""Constants of an example formula: from the text of a call to cell values.

Only what an example may hold is read: numbers, texts, TRUE and FALSE, inline
arrays and omitted arguments. Formulas of a workbook are the hosts' business.
"""

from __future__ import annotations

import re

from .cells import Cell, Scalar

_TOKEN = re.compile(r'\s*("(?:[^"]|"")*"|[-+]?(?:\d+\.?\d*|\.\d+)(?:[eE][-+]?\d+)?|TRUE|FALSE|[{},;()])')


def read_call(text: str) -> tuple[str, list[Cell]]:
    """Take a call such as ``TB_AREA("metric", 300)`` apart: name and argument cells.

    Raises
    ------
    ValueError
        Text that is not a call with constant arguments.
    """
    name, bracket, rest = text.strip().removeprefix("=").partition("(")
    tokens: list[str] = []
    position = 0
    while rest[position:].strip():
        match = _TOKEN.match(rest, position)
        if not match:
            raise ValueError(f"not a call with constant arguments: {text}")
        tokens.append(match[1])
        position = match.end()
    if not bracket or not tokens or tokens.pop() != ")":
        raise ValueError(f"not a call with constant arguments: {text}")
    return name.strip(), _arguments(tokens)


def _arguments(tokens: list[str]) -> list[Cell]:
    out: list[Cell] = []
    current: Cell = None
    grid: list[list[Scalar]] | None = None
    for token in [*tokens, ","] if tokens else []:
        if token == "{":
            grid = [[]]
        elif token == "}":
            current, grid = grid, None
        elif grid is not None:
            if token == ";":
                grid.append([])
            elif token != ",":
                grid[-1].append(_constant(token))
        elif token == ",":
            out.append(current)
            current = None
        else:
            current = _constant(token)
    return out


def _constant(token: str) -> Scalar:
    if token.startswith('"'):
        return token[1:-1].replace('""', '"')
    return {"TRUE": True, "FALSE": False}[token] if token in ("TRUE", "FALSE") else float(token)
