"""One evaluation of the copy by the embedded evaluator."""

from __future__ import annotations

from typing import Any

import formualizer
from formualizer import ExcelEvaluationError, Workbook, WorkbookConfig

from ...cells import CellError, Scalar
from .areas import register_areas
from .each import register_each
from .host import Host, engine_rows, engine_value, scalar
from .model import Model, Node

_SCRATCH_COLUMN = 16_380  # beside everything that people write


class Stopped(Exception):
    """The evaluator gave up on the whole workbook; the text is its own message."""


def reader(model: Model) -> str:
    """Which of the evaluator's two file readers suits the workbook.

    The fast one lays cells out so that a formula with a range costs time in proportion to the
    rows of its sheet whenever the sheet's own formulas are evaluated; the other one reads many
    times slower. The two constants were measured.
    """
    ranges = [0] * len(model.sheet_names)
    rows = [0] * len(model.sheet_names)
    for node in model.nodes:
        rows[node.sheet] = max(rows[node.sheet], node.cell.row)
        if any(ref.sheet == node.sheet and ref[1:3] != ref[3:5] for ref in node.references):
            ranges[node.sheet] += 1
    slow_evaluation = sum(4e-8 * count * height for count, height in zip(ranges, rows, strict=True))
    size = sum(len(model.package.part(sheet.part)) for sheet in model.package.sheets)
    slow_reading = 2e-7 * size
    return "umya" if slow_evaluation > 1.0 + slow_reading else "native"


class Run:
    """The evaluated copy, to be asked for values.

    Raises :class:`Stopped`.
    """

    def __init__(self, model: Model, host: Host, data: bytes) -> None:
        self._model, self._host = model, host
        config = formualizer.EvaluationConfig()
        config.cycle_detection = "runtime"  # only a circle that is really walked is an error
        try:
            self._workbook = Workbook.from_bytes(
                data, backend=reader(model), config=WorkbookConfig(eval_config=config)
            )
            self._workbook.set_temporal_egress("serial")
            host.register(self._workbook)
            register_areas(self._workbook, host, model.areas)
            register_each(self._workbook)
            for area in model.areas:
                area.grid = None
            self._workbook.evaluate_all()
        except (ExcelEvaluationError, OSError, ValueError) as error:
            raise Stopped(str(error)) from error

    def raw(self, node: Node) -> Any:
        """The evaluator's own value of a formula cell."""
        return self._workbook.get_value(self._model.sheet_names[node.sheet], node.cell.row, node.cell.col)

    def value(self, node: Node) -> Scalar:
        """The value of a formula cell; a formula never gives an empty cell."""
        value = scalar(self.raw(node))
        return 0.0 if value is None else value

    def hold(self, node: Node) -> None:
        """Put what a formula has given in its place, so that it is not computed again."""
        sheet, row, col = self._model.sheet_names[node.sheet], node.cell.row, node.cell.col
        if node.area is None or node.area.kind == "plain":
            self._workbook.set_value(sheet, row, col, engine_value(self.value(node)))
        else:
            self._workbook.set_values_batch(sheet, row, col, engine_rows(node.area.result()))

    def try_formula(self, node: Node, text: str) -> tuple[Any, tuple[str, CellError] | None]:
        """What a formula gives in the row of a cell, and which TB_ call failed in it, if any did."""
        sheet, row = self._model.sheet_names[node.sheet], node.cell.row
        self._host.last_error, self._host.looking = None, True
        try:
            self._workbook.set_formula(sheet, row, _SCRATCH_COLUMN, "=" + text)
            return self._workbook.evaluate_cell(sheet, row, _SCRATCH_COLUMN), self._host.last_error
        except ExcelEvaluationError as error:
            return {"type": "Error", "kind": "Error", "message": str(error)}, self._host.last_error
        finally:
            self._host.looking = False
            # A volatile formula left there would be computed again with the next one.
            self._workbook.set_value(sheet, row, _SCRATCH_COLUMN, None)
