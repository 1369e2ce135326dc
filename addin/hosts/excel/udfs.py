"""The worksheet functions as a module of xlwings, one for each row of the catalogue.

The add-in ``thrustbook.xlam`` calls this module through our own VBA wrappers.
It can also be used as it stands: name ``thrustbook.addin.hosts.excel.udfs``
under "UDF Modules" of xlwings and press "Import Functions". A failed result is
then a text such as "#NUM! (see TB_WHY)", because xlwings cannot return a true
error; SUM takes no notice of a text, so that the add-in is the safer way.

On platforms other than Windows the decorators of xlwings do nothing, and the
module can be imported all the same.
"""

from __future__ import annotations

import inspect
from collections.abc import Callable
from typing import Any

import xlwings

from ...catalogue.registry import CATALOGUE
from ...catalogue.types import Row
from ...dispatch import call
from .markers import read_argument, write_answer
from .names import category, description, parameters

MODULE = __name__
"""Name of this module: what the conf sheet and the VBA wrappers name."""


def _signature(row: Row) -> inspect.Signature:
    """Give the signature that xlwings reads: all optional, or a last argument that repeats.

    A required argument is optional here so that leaving it out gives #VALUE! as in
    every host. xlwings takes no defaults beside an argument that repeats.
    """
    shown = parameters(row)
    usual = inspect.Parameter.POSITIONAL_OR_KEYWORD
    if row.max_args is None:
        every = [inspect.Parameter(p.name, usual) for p in shown[:-1]]
        every.append(inspect.Parameter(shown[-1].name, inspect.Parameter.VAR_POSITIONAL))
    else:
        every = [inspect.Parameter(p.name, usual, default=None) for p in shown]
    return inspect.Signature(every)


def _function(row: Row) -> Callable[..., Any]:
    name = row.name

    def function(*cells: Any) -> Any:
        return write_answer(call(name, [read_argument(cell) for cell in cells]))

    # xlwings takes type hints for conversions to be made; ours are for the reader of this file only.
    function.__annotations__ = {}
    function.__name__ = function.__qualname__ = name
    function.__doc__ = description(row)
    function.__signature__ = _signature(row)  # type: ignore[attr-defined]
    for parameter in parameters(row):
        function = xlwings.arg(parameter.name, ndim=2, err_to_str=True, doc=parameter.text)(function)
    # Last, because every xlwings.arg puts the category back to its default.
    return xlwings.func(category=category(row))(function)


globals().update({row.name: _function(row) for row in CATALOGUE.values()})

__all__ = list(CATALOGUE)
