"""Compiled types of the add-in's interface, in the office's own binary form.

Follows "The UNOIDL file format" in the documentation of LibreOffice's unoidl
module. A test compiles the same IDL with the office's unoidl-write and compares
byte for byte.
"""

from __future__ import annotations

import struct
from collections.abc import Sequence
from typing import NamedTuple

_ANY, _GRID, _MORE = "any", "[][]any", "[]any"
_MODULE, _INTERFACE = 0, 5
_EMPTY_MAP_PLACE = b"UNOIDL\xff\0" + bytes(8)
BANNER = b"\0** Created by thrustbook **\0"


class Method(NamedTuple):
    """A method that takes any values and gives a two-dimensional array of them, or one value."""

    name: str
    parameters: tuple[str, ...]
    repeats: bool
    """The last parameter takes any number of values."""
    single: bool = False
    """It gives one value, never an array."""

    @property
    def gives(self) -> str:
        """Type of the result, as the binary form spells it."""
        return _ANY if self.single else _GRID

    def types(self) -> list[str]:
        """Type of each parameter, as the binary form spells it."""
        plain = [_ANY] * len(self.parameters)
        return [*plain[:-1], _MORE] if self.repeats else plain


def idl(name: str, methods: Sequence[Method]) -> str:
    """Write the interface as IDL text."""
    *modules, interface = name.split(".")
    spelled = {_ANY: "any", _MORE: "sequence< any >", _GRID: "sequence< sequence< any > >"}
    lines = [*(f"module {m} {{" for m in modules)]
    lines += ["", f"interface {interface} : com::sun::star::uno::XInterface", "{"]
    for method in methods:
        given = ", ".join(
            f"[in] {spelled[t]} {p}" for t, p in zip(method.types(), method.parameters, strict=True)
        )
        lines.append(f"    {spelled[method.gives]} {method.name}({f' {given} ' if given else ''});")
    return "\n".join([*lines, "};", "", *("};" for _ in modules), ""])


def compiled(name: str, methods: Sequence[Method], banner: bytes = BANNER) -> bytes:
    """Write the interface in binary form."""
    *modules, inner = name.split(".")
    out = _Writer(_EMPTY_MAP_PLACE + banner)
    at = out.interface(methods)
    for module in reversed(modules):
        label = out.label(inner)
        place = len(out.data)
        out.data += bytes([_MODULE])
        for number in (1, label, at):
            out.number(number)
        inner, at = module, place
    label = out.label(inner)
    out.data[8:16] = struct.pack("<II", len(out.data), 1)
    out.number(label)
    out.number(at)
    return bytes(out.data)


class _Writer:
    def __init__(self, start: bytes) -> None:
        self.data = bytearray(start)
        self._seen: dict[str, int] = {}

    def number(self, value: int) -> None:
        self.data += struct.pack("<I", value)

    def text(self, text: str) -> None:
        """Write a text once; later ones refer to the first."""
        at = self._seen.get(text)
        if at is not None:
            self.number(at | 0x80000000)
            return
        self._seen[text] = len(self.data)
        self.number(len(text))
        self.data += text.encode("ascii")

    def label(self, name: str) -> int:
        """Write the name of a map's entry and give its place."""
        at = len(self.data)
        self.data += name.encode("ascii") + b"\0"
        return at

    def interface(self, methods: Sequence[Method]) -> int:
        at = len(self.data)
        self.data += bytes([_INTERFACE])
        self.number(1)
        self.text("com.sun.star.uno.XInterface")
        self.number(0)  # optional bases
        self.number(0)  # attributes
        self.number(len(methods))
        for method in methods:
            self.text(method.name)
            self.text(method.gives)
            self.number(len(method.parameters))
            for parameter, kind in zip(method.parameters, method.types(), strict=True):
                self.data += b"\0"  # direction: in
                self.text(parameter)
                self.text(kind)
            self.number(0)  # exceptions
        return at
