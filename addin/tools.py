"""The tools among the worksheet functions: converting, asking why, telling the version."""

from __future__ import annotations

import functools
import hashlib
from collections.abc import Sequence
from importlib import metadata, resources

import numpy as np

from .cells import Cell, CellError, Grid, Refused
from .tables import is_blank
from .units import convert as convert_number


def _required(args: Sequence[Cell], i: int, name: str) -> Cell:
    cell = args[i] if i < len(args) else None
    if isinstance(cell, CellError):
        raise Refused(cell.kind, cell.message or f"{name} is the error {cell}")
    if is_blank(cell):
        raise Refused("VALUE", f"{name} is empty (it is required)")
    return cell


def _word(args: Sequence[Cell], i: int, name: str) -> str:
    cell = _required(args, i, name)
    if isinstance(cell, list) and len(cell) == 1 and len(cell[0]) == 1:
        cell = cell[0][0]
    if not isinstance(cell, str):
        raise Refused("VALUE", f"{name} = {cell!r} (allowed: text)")
    return cell


def convert(args: Sequence[Cell]) -> Cell | Grid:
    """TB_CONVERT: a number, or every number of a range, from one unit to another."""
    value = _required(args, 0, "value")
    source, target = _word(args, 1, "from"), _word(args, 2, "to")
    ambient = args[3] if len(args) > 3 else None
    if ambient is not None and type(ambient) not in (float, int):
        raise Refused("VALUE", f"pamb = {ambient!r} (allowed: an absolute pressure in Pa)")
    if not isinstance(value, list):
        return _convert_cell(value, source, target, ambient)
    out = np.empty((len(value), len(value[0])), dtype=object)
    for i, line in enumerate(value):
        for j, cell in enumerate(line):
            try:
                out[i, j] = _convert_cell(cell, source, target, ambient)
            except Refused as refusal:
                out[i, j] = refusal.error
    return out


def _convert_cell(cell: Cell, source: str, target: str, ambient: Cell) -> float:
    if isinstance(cell, CellError):
        raise Refused(cell.kind, cell.message)
    if type(cell) is not float and type(cell) is not int:
        shown = "empty" if is_blank(cell) else repr(cell)
        raise Refused("VALUE", f"value is {shown} (allowed: a number)")
    if ambient is None:
        return convert_number(cell, source, target)
    return convert_number(cell, source, target, float(ambient))  # type: ignore[arg-type]


def why(args: Sequence[Cell]) -> Cell:
    """TB_WHY: the reason why a call fails, its warnings, or "ok"."""
    # Imported late: the dispatcher is assembled from the catalogue, which holds this function.
    from . import dispatch

    name = _word(args, 0, "name").strip().upper()
    return dispatch.why(name, args[1:])


def working(args: Sequence[Cell]) -> Cell | Grid:
    """TB_WORKING: the long-hand working of a call."""
    from .longhand.working import working as shown  # late, as above

    return shown(args)


@functools.cache
def product_version() -> str:
    """Give the version of the installed distribution."""
    return metadata.version("thrustbook")


@functools.cache
def catalogue_version() -> str:
    """Give a fingerprint of the catalogue: it changes whenever a row does."""
    from .catalogue.registry import CATALOGUE

    digest = hashlib.sha256()
    for row in CATALOGUE.values():
        digest.update(repr((row.name, row.kind, row.args, row.results, row.sign, row.longhand)).encode())
    return digest.hexdigest()[:12]


@functools.cache
def engine_version() -> str:
    """Give a fingerprint of the engine: it changes whenever one of its sources does."""
    digest = hashlib.sha256()
    folder = resources.files("thrustbook.engine")
    for source in sorted((f for f in folder.iterdir() if f.name.endswith(".py")), key=lambda f: f.name):
        # The end of line that a checkout chose is no change of the engine.
        digest.update(source.name.encode() + b"\0" + source.read_bytes().replace(b"\r\n", b"\n") + b"\0")
    return digest.hexdigest()[:12]


def version(args: Sequence[Cell]) -> Cell:
    """TB_VERSION: product, catalogue, engine or numpy version as text; all of them when empty."""
    parts = {
        "product": product_version(),
        "catalogue": catalogue_version(),
        "engine": engine_version(),
        "numpy": np.__version__,
    }
    if not args or is_blank(args[0]):
        return "; ".join(f"{k} {v}" for k, v in {"thrustbook": parts.pop("product"), **parts}.items())
    wanted = _word(args, 0, "what").strip().lower()
    if wanted not in parts:
        raise Refused("VALUE", f'what = "{wanted}" (allowed: {", ".join(parts)})')
    return parts[wanted]
