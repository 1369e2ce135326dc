"""Questions about single formulas of an evaluated workbook."""

from __future__ import annotations

from pathlib import Path

import openpyxl
import pytest
from openpyxl.worksheet.formula import ArrayFormula

from thrustbook.addin.hosts.headless.probe import Probe
from thrustbook.addin.xlsx.package import Package


@pytest.fixture
def probe(tmp_path: Path) -> Probe:
    """Diameters in A1:A4; volatile formulas that must not get in each other's way."""
    book = openpyxl.Workbook()
    sheet = book.worksheets[0]
    sheet.title = "S"
    for row in range(1, 5):
        sheet.cell(row, 1, row / 10)
        sheet.cell(row, 2, f'=TB_AREA("SI",OFFSET(A{row},0,0))')
    sheet["C1"] = ArrayFormula("C1:C2", '=TB_AREA("SI",OFFSET(A2,0,0,2,1))')
    sheet["E1"] = '=TB_AREA("SI",SUM(C1:C2)+0*NOW())'
    sheet["F1"] = '=TB_AREA("SI",TB_AREA("SI",A1)+A2)*2'
    sheet["G1"] = ArrayFormula("G1:I1", '=TRANSPOSE(TB_AREA("SI",A1:A3))')
    path = tmp_path / "book.xlsx"
    book.save(path)
    return Probe.of(Package.read(path))


def arguments(probe: Probe, row: int, col: int, number: int = 0) -> object:
    node = probe.node("S", row, col)
    assert node is not None
    return probe.arguments(node, number)


def test_each_call_has_its_own_arguments(probe: Probe) -> None:
    for row in (2, 1, 4, 3):
        assert arguments(probe, row, 2) == ["SI", row / 10]
    assert arguments(probe, 1, 3) == ["SI", [[0.2], [0.3]]]
    area = 0.7853981633974483  # of a circle of diameter 1
    assert arguments(probe, 1, 5) == ["SI", pytest.approx(area * (0.04 + 0.09))]
    assert arguments(probe, 1, 6, 0) == ["SI", 0.1]
    assert arguments(probe, 1, 6, 1) == ["SI", pytest.approx(area * 0.01 + 0.2)]
    assert arguments(probe, 1, 6, 2) is None


def test_how_many_values_a_formula_gives(probe: Probe) -> None:
    shapes = []
    for col in (2, 3, 6, 7):
        node = probe.node("S", 1, col)
        assert node is not None
        shapes.append(probe.shape(node))
    assert shapes == [(1, 1), (2, 1), (1, 1), (1, 3)]
    assert probe.node("S", 1, 1) is None
