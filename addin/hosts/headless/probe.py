"""Questions about single formulas of a workbook: what a call was given, how many cells a formula gives."""

from __future__ import annotations

import re
from collections.abc import Sequence
from functools import cached_property
from typing import Any, Final

from ...cells import Cell
from ...progress import Progress
from ...xlsx.package import Package
from .host import Functions, Host
from .model import Model, Node
from .run import Run
from .settle import Settlement

_VOLATILE: Final = re.compile(r"\b(?:NOW|TODAY|RAND|RANDBETWEEN|RANDARRAY)\(", re.IGNORECASE)
_GIVEN: Final = "THRUSTBOOK.GIVEN"
"""Stands for a TB_ function whose arguments are asked for: the evaluator may compute others in passing."""


class Recorder:
    """Keeps the arguments of the call that is asked for."""

    def __init__(self, functions: Functions) -> None:
        self.last: Sequence[Cell] | None = None
        self._call = functions.call
        self.functions = Functions(self._record, {**functions.block, _GIVEN: False})

    def _record(self, name: str, args: Sequence[Cell]) -> Any:
        if name != _GIVEN:
            return self._call(name, args)
        self.last = args
        return 0.0


class Probe:
    """An evaluated workbook whose formulas can be tried once more, whole or in part."""

    def __init__(self, settlement: Settlement, recorder: Recorder) -> None:
        self._settlement, self._recorder = settlement, recorder
        model = settlement.model
        self._sheets = {name.casefold(): number for number, name in enumerate(model.sheet_names)}

    @classmethod
    def of(cls, package: Package, progress: Progress | None = None) -> Probe:
        """Evaluate a workbook in order to ask. Raises Refusal when the evaluator gives up on it."""
        recorder = Recorder(Functions.of_catalogue())
        settlement = Settlement(Model(package, recorder.functions, progress), Host(recorder.functions))
        settlement.settle()
        return cls(settlement, recorder)

    def node(self, sheet: str, row: int, col: int) -> Node | None:
        """The formula in a cell, None where there is none that can be computed."""
        node = self._settlement.model.at.get((self._sheets[sheet.casefold()], row, col))
        return None if node is None or node.index in self._settlement.kept else node

    @cached_property
    def _run(self) -> Run:
        """The evaluated copy, in which what would be computed anew with every question stands still."""
        settlement = self._settlement
        for node in settlement.model.nodes:
            volatile = node.anywhere or _VOLATILE.search(node.cell.text) is not None
            if volatile and node.index not in settlement.kept and node.index not in settlement.failed:
                settlement.run.hold(node)
        return settlement.run

    def arguments(self, node: Node, number: int) -> list[Cell] | None:
        """The arguments of one TB_ call of a formula, as the dispatcher gets them; None where it gets none.

        The calls are counted from 0, those inside a call before it.
        """
        if node.rewritten is None or number >= len(node.rewritten.spans):
            return None
        _, first, last = node.rewritten.spans[number]
        self._recorder.last = None
        given = "".join(node.rewritten.pieces[first + 1 : last + 1])
        self._run.try_formula(node, f"{_GIVEN}({given}")
        return None if self._recorder.last is None else list(self._recorder.last)

    def shape(self, node: Node) -> tuple[int, int] | None:
        """Rows and columns of all that a formula gives, shown or not; None where that cannot be told."""
        if node.rewritten is None:
            return None
        text = node.rewritten.text
        rows, _ = self._run.try_formula(node, f"ROWS({text})")
        columns, _ = self._run.try_formula(node, f"COLUMNS({text})")
        if not isinstance(rows, float) or not isinstance(columns, float):
            return None
        return int(rows), int(columns)
