"""TB_WORKING: the steps end in what the function itself gives."""

from __future__ import annotations

import random

import numpy as np
import pytest

from thrustbook.addin.catalogue.registry import CATALOGUE
from thrustbook.addin.catalogue.types import Longhand, Row
from thrustbook.addin.cells import Cell, CellError
from thrustbook.addin.dispatch import call
from thrustbook.addin.longhand.working import HEADINGS

from .samples import in_units, sample

ROWS = [row for row in CATALOGUE.values() if isinstance(row.longhand, Longhand)]


@pytest.mark.parametrize("row", ROWS, ids=lambda row: row.name)
def test_ends_in_the_results(row: Row) -> None:
    random_ = random.Random(5)
    for units in ("SI", "metric", "US"):
        leading: list[Cell] = ["all", units] if row.has_result else [units]
        args = [*leading, *in_units(row, sample(row, random_), units)]
        outcome = call(row.name, args)
        expected = list(outcome[0]) if isinstance(outcome, np.ndarray) else [outcome]
        table = call("TB_WORKING", [row.name, *args])
        assert isinstance(table, np.ndarray)
        assert table[0].tolist() == list(HEADINGS)
        for line, result, value in zip(table[-len(expected) :], row.results, expected, strict=True):
            assert line[0] == result.name
            if isinstance(value, CellError):
                assert isinstance(line[4], CellError)
            else:
                assert line[4] == pytest.approx(value, rel=1e-9, abs=1e-9)


@pytest.mark.parametrize(
    ("args", "kind"),
    [
        (["TB_NOTHING"], "NAME"),
        (["TB_AREA", "metric", -300.0], "NUM"),
        (["TB_AREA", "metric", [[300.0], [200.0]]], "VALUE"),
        (["TB_WHY", "TB_AREA"], "NA"),
        (["TB_RUN", "F"], "NA"),
        ([3.0], "VALUE"),
        ([], "VALUE"),
        (["TB_BEND", "labels", "SI"], "VALUE"),
    ],
)
def test_what_it_refuses(args: list[Cell], kind: str) -> None:
    outcome = call("TB_WORKING", args)
    assert isinstance(outcome, CellError)
    assert outcome.kind == kind
    assert outcome.message
