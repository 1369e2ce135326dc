"""The template workbooks: reproducible, complete, stored with right values."""

from __future__ import annotations

from pathlib import Path

import openpyxl
import pytest

from thrustbook.addin.hosts.headless.evaluate import evaluate_workbook
from thrustbook.addin.xlsx.package import Package
from thrustbook.workbooks import build
from thrustbook.workbooks.templates import TEMPLATES as NAMES
from thrustbook.workbooks.templates import shipped

TEMPLATES = pytest.mark.parametrize("name", NAMES)


def cells(path: Path) -> dict[tuple[str, str], object]:
    """All stored values by sheet and address."""
    book = openpyxl.load_workbook(path, data_only=True)
    return {
        (ws.title, c.coordinate): c.value for ws in book for line in ws for c in line if c.value is not None
    }


@TEMPLATES
def test_the_shipped_file_is_what_its_builder_makes(name: str) -> None:
    assert shipped(name).read_bytes() == build.build(name), (
        "run python -m thrustbook.workbooks.build and commit the workbook"
    )


@TEMPLATES
def test_every_formula_has_its_value_and_none_is_an_error(name: str) -> None:
    formulas = openpyxl.load_workbook(shipped(name))
    values = openpyxl.load_workbook(shipped(name), data_only=True)
    for ws in formulas:
        for line in ws:
            for cell in line:
                if cell.data_type == "f":
                    value = values[ws.title][cell.coordinate].value
                    where = f"{ws.title}!{cell.coordinate}"
                    # A heading of units is an empty text over a text column.
                    assert value is not None or ws.title.endswith("data"), where
                    assert not (isinstance(value, str) and value.startswith("#")), where


@TEMPLATES
def test_evaluating_it_again_changes_nothing(name: str) -> None:
    evaluation = evaluate_workbook(Package.read(shipped(name)))
    assert evaluation.ok
    assert not evaluation.native_kept
    package = Package.read(shipped(name))
    for part, data in evaluation.replaced.items():
        assert data == package.part(part), part


@TEMPLATES
def test_the_layout_has_what_a_calculation_sheet_has(name: str) -> None:
    book = openpyxl.load_workbook(shipped(name))
    assert "Units" in book.defined_names
    texts = [str(c.value) for c in book["Cover"]["A"] if c.value]
    for heading in ("Results", "Cautions", "Revisions and sign-off", "Checked by"):
        assert heading in texts
    assert any("Invented" in t for t in texts)
    styles = {c.style for ws in book for line in ws for c in line}
    assert {"Input", "Calculation", "Output", "Warning Text"} <= styles
    for ws in book:
        assert ws.sheet_properties.pageSetUpPr.fitToPage
        assert ws.page_setup.fitToWidth == 1


def test_the_pipe_run_shows_both_styles_agree_and_closes() -> None:
    values = cells(shipped("pipe-run"))
    verdicts = [v for (sheet, at), v in values.items() if sheet == "Fittings" and at.startswith("H")]
    assert len(verdicts) >= 10
    assert set(verdicts) == {"agrees"}
    nodes = [
        v for (sheet, at), v in values.items() if sheet == "Run" and at[0] == "A" and str(v).startswith("N")
    ]
    assert len(nodes) >= 20
    cover = {at: v for (sheet, at), v in values.items() if sheet == "Cover"}
    labels = {at: str(v) for at, v in cover.items() if at.startswith("A")}
    closures = [
        cover[at.replace("A", "B")]
        for at, text in labels.items()
        if text.startswith("Closure") and at.replace("A", "B") in cover
    ]
    assert len(closures) == 2
    assert all(0 <= c < 1e-9 for c in closures if isinstance(c, float))


def test_the_pipe_run_has_its_fittings_cases_and_charts() -> None:
    values = cells(shipped("pipe-run"))
    kinds = {v for (sheet, at), v in values.items() if sheet == "Run" and at.startswith("B")}
    for kind in ("bend", "reducer", "tee", "jet"):
        assert any(kind in str(k) for k in kinds), kind
    book = openpyxl.load_workbook(shipped("pipe-run"))
    assert len(book["Run"]._charts) == len(book["Cases"]._charts) == 1
    cases = {v for (sheet, at), v in values.items() if sheet == "Inputs" and at.startswith("B")}
    assert {"operating", "shut", "test", "surge"} <= cases
