"""The worker process: evaluates the calls of one office through the dispatcher.

It reads requests from standard input and writes answers to standard output, in the
language of ``office/wire.py``, until the office closes the pipe.
"""

from __future__ import annotations

import contextlib
import gc
import os
import sys
from array import array
from collections.abc import Sequence
from functools import cache, lru_cache
from pathlib import Path
from typing import Any, BinaryIO

import numpy as np

from ... import dispatch
from ...catalogue.registry import CATALOGUE
from ...catalogue.types import Row
from ...cells import Cell, CellError, ErrorKind, Grid, Range
from ...tables import LongTable
from .office import wire
from .slots import Slot, slots, zero_for_empty

_KINDS: dict[int, ErrorKind] = {code: kind for kind, code in wire.ERROR_CODES.items()}  # type: ignore[misc]
_ERROR = {kind: wire.error_number(code) for kind, code in wire.ERROR_CODES.items()}


_LONG = 4000
"""Bytes of a range from which on it is no unit table or the like, which comes with every call."""


@lru_cache(maxsize=64)
def _short_range(data: bytes) -> Range:
    return list(map(list, zip(*wire.read_columns(data, None), strict=True)))


def _read_range(data: bytes) -> Range:
    if len(data) < _LONG:
        return _short_range(data)
    columns = wire.read_columns(data, None)
    # Rows are tuples: nobody changes them, and a hundred thousand lists would cost more than the sums.
    table = LongTable(zip(*columns, strict=True))  # type: ignore[arg-type]
    table.columns = [np.frombuffer(c) if isinstance(c, array) else c for c in columns]
    return table


def arguments(name: str, cells: Sequence[Any]) -> list[Cell]:
    """Read the arguments of a call as the office hands them over.

    The office passes an empty cell as 0. Where no number can be meant, or where 0 is
    out of the range allowed for an argument that may be empty, it counts as empty.
    """
    out = list(cells)
    row, first = CATALOGUE.get(name), 0
    if row is not None and row.max_args is None and out and isinstance(out[0], str):
        # TB_WHY and TB_WORKING: the name of a function and that function's own arguments.
        row, first = CATALOGUE.get(out[0].strip().upper()), 1
    for i, cell in enumerate(out):
        if type(cell) is float and cell != cell:
            out[i] = CellError(_KINDS.get(wire.error_code(cell), "VALUE"))
    if row is None or row.kind != "table":
        out = [list(cell) if type(cell) is LongTable else cell for cell in out]
    if row is not None:
        for i, slot in enumerate(_slots(row)[: len(out) - first], first):
            if out[i] == 0.0 and type(out[i]) is float and slot is Slot.ZERO_IS_EMPTY:
                out[i] = None
    return out


@cache
def _slots_of(name: str) -> tuple[Slot, ...]:
    return slots(CATALOGUE[name])


def _slots(row: Row) -> tuple[Slot, ...]:
    return _slots_of(row.name)


def answer(request: bytes) -> bytes:
    """Answer one request."""
    if request[0] == wire.PLAIN_NAMES:
        from .plainnames import write_plain_names

        return write_plain_names(Path(request[1:].decode("utf-8", "surrogatepass"))).encode()
    name, cells = wire.unpack_call(request, _read_range)
    value = dispatch.call(name, arguments(name, cells))
    if name == "TB_WHY" and isinstance(value, str):
        value = _with_doubt(value, cells)
    return pack(value)


def _with_doubt(reason: str, cells: Sequence[Any]) -> str:
    """Add to the reason what only this host has to say: which 0 may be an empty cell."""
    row = CATALOGUE.get(cells[0].strip().upper()) if cells and isinstance(cells[0], str) else None
    if row is None:
        return reason
    doubtful = zero_for_empty(row)
    zeros = [
        arg.name
        for arg, cell in zip(row.args, cells[1 + row.leading :], strict=False)
        if arg.name in doubtful and type(cell) is float and cell == 0.0
    ]
    if not zeros:
        return reason
    doubt = f"{', '.join(zeros)} = 0: if that is an empty cell, leave the argument out (Calc passes 0)"
    return doubt if reason == "ok" else f"{reason}; {doubt}"


def pack(value: Cell | Grid) -> bytes:
    """Write the dispatcher's answer as the office takes it."""
    if isinstance(value, np.ndarray):
        return wire.pack_columns(value.shape[0], [_column(column) for column in value.T])
    if isinstance(value, CellError):
        return wire.pack(_ERROR[value.kind])
    return wire.pack(_plain(value))


def _column(column: Grid) -> bytes:
    cells = column.tolist()
    kinds = set(map(type, cells))
    if not kinds <= {float, str, bool}:
        cells = [_plain(cell) for cell in cells]
    return wire.pack_column(cells)


def _plain(cell: Any) -> Any:
    if isinstance(cell, CellError):
        return _ERROR[cell.kind]
    if isinstance(cell, np.generic):
        return cell.item()
    return float(cell) if type(cell) is int else cell


def serve(requests: BinaryIO, answers: BinaryIO) -> None:
    """Answer requests until the other end closes the pipe."""
    wire.send(answers, b"thrustbook %d" % wire.PROTOCOL)
    with contextlib.suppress(wire.Closed):
        while True:
            wire.send(answers, answer(wire.receive(requests)))


def main() -> None:
    """Serve the office that started this process."""
    requests = os.fdopen(os.dup(0), "rb", buffering=1 << 16)
    answers = os.fdopen(os.dup(1), "wb", buffering=1 << 16)
    # A table makes a hundred thousand lists at once; searching them for cycles again and again
    # takes longer than the calculation.
    gc.freeze()
    gc.set_threshold(500_000, 20, 100)
    # Whatever a library prints must not get into the answers.
    os.dup2(2, 1)
    sys.stdout = sys.stderr
    serve(requests, answers)


if __name__ == "__main__":
    main()
