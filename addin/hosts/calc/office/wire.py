"""The language of the pipe between the office and the worker.

A frame is its length (uint32) and that many bytes; all numbers are little-endian.
A value is a kind byte and its content. A range crosses column by column: a column
of numbers as one block of float64, a column of texts as one block of UTF-8, a mixed
one as a mask, its numbers and its texts. An error value is a float64 NaN whose
payload is the office's own error number.
"""

from __future__ import annotations

import struct
import sys
from array import array
from collections.abc import Callable, Sequence
from itertools import chain
from typing import Any, BinaryIO

PROTOCOL = 1
CALL, PLAIN_NAMES = 1, 2

NONE, NUMBER, TEXT, LOGICAL, GRID = range(5)
NUMBERS, TEXTS, MIXED = range(3)
"""Kinds of column."""
MASK = {float: 0, str: 1, type(None): 2, bool: 3, int: 0}

_U32 = struct.Struct("<I")
_NUMBER = struct.Struct("<Bd")
_TEXT = struct.Struct("<BI")
_GRID = struct.Struct("<BIII")
_HEAD = struct.Struct("<BBB")
_SWAP = sys.byteorder != "little"
_LONGEST = 1 << 31

# Unit tables and the like come again with every call; their bytes are kept.
_SMALL = 400
_known: dict[Any, bytes] = {}


class Closed(Exception):
    """The other end of the pipe has gone."""


def send(stream: BinaryIO, payload: bytes) -> None:
    """Write one frame. Raises :class:`Closed`."""
    try:
        stream.write(_U32.pack(len(payload)) + payload)
        stream.flush()
    except (OSError, ValueError) as error:
        raise Closed(str(error)) from error


def receive(stream: BinaryIO) -> bytes:
    """Read one frame. Raises :class:`Closed` at the end of the stream."""
    (length,) = _U32.unpack(_exactly(stream, 4))
    if length > _LONGEST:
        raise Closed("a frame of an impossible length")
    return _exactly(stream, length)


def _exactly(stream: BinaryIO, length: int) -> bytes:
    try:
        data = stream.read(length)
    except (OSError, ValueError) as error:
        raise Closed(str(error)) from error
    if data is None or len(data) < length:
        raise Closed("the other end has gone")
    return data


def pack_call(name: str, args: Sequence[Any]) -> bytes:
    """Write a call: its function and its arguments."""
    word = name.encode("ascii")
    parts = [_HEAD.pack(CALL, len(word), len(args)), word]
    for value in args:
        if type(value) is float:
            parts.append(_NUMBER.pack(NUMBER, value))
        else:
            parts.append(pack(value))
    return b"".join(parts)


def unpack_call(data: bytes, grid: Callable[[bytes], Any]) -> tuple[str, list[Any]]:
    """Read what :func:`pack_call` wrote."""
    _, length, count = _HEAD.unpack_from(data)
    at = _HEAD.size + length
    name = data[_HEAD.size : at].decode("ascii")
    args = []
    for _ in range(count):
        value, at = unpack(data, at, grid)
        args.append(value)
    return name, args


def pack(value: Any) -> bytes:
    """Write one value; a range is a sequence of equal rows."""
    kind = type(value)
    if kind is float or kind is int:
        return _NUMBER.pack(NUMBER, value)
    if kind is str:
        data = value.encode("utf-8", "surrogatepass")
        return _TEXT.pack(TEXT, len(data)) + data
    if value is None:
        return bytes((NONE,))
    if kind is bool:
        return bytes((LOGICAL, value))
    if kind is tuple or kind is list:
        return _pack_rows(value)
    raise TypeError("a cell cannot hold a " + kind.__name__)


def _pack_rows(rows: Any) -> bytes:
    small = type(rows) is tuple and len(rows) * len(rows[0]) <= _SMALL
    if small:
        found = _known.get(rows)
        if found is not None:
            return found
    data = pack_columns(len(rows), [pack_column(column) for column in zip(*rows)])
    if small and any(type(v) is str and v for v in chain.from_iterable(rows)):
        if len(_known) > 256:
            _known.clear()
        _known[rows] = data
    return data


def pack_columns(height: int, columns: Sequence[bytes]) -> bytes:
    """Write a range from its columns, each written by :func:`pack_column`."""
    content = b"".join(columns)
    return _GRID.pack(GRID, len(content), height, len(columns)) + content


def pack_column(column: Sequence[Any]) -> bytes:
    """Write a column of cells; a logical value among numbers alone crosses as 1 or 0."""
    try:
        return bytes((NUMBERS,)) + _doubles(array("d", column))
    except TypeError:
        pass
    try:
        return bytes((TEXTS,)) + _texts(column)
    except TypeError:
        pass
    mask = bytes(map(MASK.__getitem__, map(type, column)))
    numbers = array("d", [v if m == 0 or m == 3 else 0.0 for v, m in zip(column, mask)])
    texts = [v for v in column if type(v) is str]
    return bytes((MIXED,)) + mask + _doubles(numbers) + _U32.pack(len(texts)) + _texts(texts)


def _texts(texts: Sequence[str]) -> bytes:
    # No cell can hold the character NUL, so it separates.
    data = "\0".join(texts).encode("utf-8", "surrogatepass")
    return _U32.pack(len(data)) + data


def _doubles(numbers: array[float]) -> bytes:
    if _SWAP:
        numbers.byteswap()
    return numbers.tobytes()


def unpack(data: bytes, at: int, grid: Callable[[bytes], Any]) -> tuple[Any, int]:
    """Read a value at a position; gives it and the position behind it.

    ``grid`` reads the bytes of a range, in the form that :func:`read_grid` takes.
    """
    kind = data[at]
    if kind == NUMBER:
        return _NUMBER.unpack_from(data, at)[1], at + _NUMBER.size
    if kind == TEXT:
        (_, length) = _TEXT.unpack_from(data, at)
        at += _TEXT.size
        return data[at : at + length].decode("utf-8", "surrogatepass"), at + length
    if kind == NONE:
        return None, at + 1
    if kind == LOGICAL:
        return bool(data[at + 1]), at + 2
    length = _U32.unpack_from(data, at + 1)[0]
    end = at + _GRID.size + length
    return grid(data[at:end]), end


def read_columns(data: bytes, blank: Any = "") -> list[Sequence[Any]]:
    """Read the columns of a range; numbers alone come as an array.

    ``blank`` is what an empty text among numbers is read as: the office hands an empty
    cell of a range over as one.
    """
    _, _, height, width = _GRID.unpack_from(data)
    at = _GRID.size
    columns: list[Sequence[Any]] = []
    for _ in range(width):
        kind = data[at]
        at += 1
        if kind == NUMBERS:
            columns.append(_read_doubles(data, at, height))
            at += 8 * height
            continue
        if kind == TEXTS:
            texts, at = _read_texts(data, at, height)
            columns.append(texts)
            continue
        mask = data[at : at + height]
        at += height
        numbers = _read_doubles(data, at, height)
        at += 8 * height
        (count,) = _U32.unpack_from(data, at)
        texts, at = _read_texts(data, at + 4, count)
        follow = iter(texts)
        columns.append(
            [
                n if m == 0 else (next(follow) or blank) if m == 1 else None if m == 2 else bool(n)
                for n, m in zip(numbers, mask)
            ]
        )
    return columns


def read_rows(data: bytes) -> tuple[tuple[Any, ...], ...]:
    """Read a range as rows, the form that the office takes."""
    return tuple(zip(*read_columns(data)))


def _read_doubles(data: bytes, at: int, count: int) -> array[float]:
    numbers = array("d")
    numbers.frombytes(data[at : at + 8 * count])
    if _SWAP:
        numbers.byteswap()
    return numbers


def _read_texts(data: bytes, at: int, count: int) -> tuple[list[str], int]:
    (length,) = _U32.unpack_from(data, at)
    at += 4
    texts = data[at : at + length].decode("utf-8", "surrogatepass").split("\0")
    return (texts if count else []), at + length


def pack_text_request(kind: int, text: str) -> bytes:
    """Write a request that is a kind and a text."""
    return bytes((kind,)) + text.encode("utf-8", "surrogatepass")


# Error numbers of the office.
ERROR_CODES = {"NA": 32767, "DIV0": 532, "VALUE": 519, "NUM": 503, "REF": 524, "NAME": 525, "NULL": 521}
_BITS = struct.Struct("<Q")
_DOUBLE = struct.Struct("<d")
_QUIET = 0x7FF8000000000000


def error_number(code: int) -> float:
    """Give the NaN that stands for an error of the office."""
    return _DOUBLE.unpack(_BITS.pack(_QUIET | code))[0]


def error_code(number: float) -> int:
    """Give the error that a NaN stands for; 0 for a NaN without one."""
    return _BITS.unpack(_DOUBLE.pack(number))[0] & 0xFFFF
