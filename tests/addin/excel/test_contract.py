"""xlwings' own argument conversion, call and import, for every function of the catalogue.

The released code of xlwings runs; only the modules of Windows below it are
stand-ins. What must hold is the table of ``markers.py``: the dispatcher sees the
same cells as from any other host, and Excel gets the same values or a marker.
"""

from __future__ import annotations

import pickle
import subprocess
import sys
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from thrustbook.addin.catalogue.registry import CATALOGUE
from thrustbook.addin.cells import CellError
from thrustbook.addin.dispatch import call
from thrustbook.addin.hosts.excel import vba
from thrustbook.addin.hosts.excel.names import parameters

from .cases import Case, all_cases
from .vba_lint import lint

ROOT = Path(__file__).parents[3]
MARKER = {
    "VALUE": "#VALUE! (see TB_WHY)",
    "NUM": "#NUM! (see TB_WHY)",
    "NA": "#N/A (see TB_WHY)",
    "DIV0": "#DIV/0! (see TB_WHY)",
    "REF": "#REF! (see TB_WHY)",
    "NAME": "#NAME? (see TB_WHY)",
    "NULL": "#NULL! (see TB_WHY)",
}


@pytest.fixture(scope="module")
def contract(tmp_path_factory: pytest.TempPathFactory) -> dict[str, Any]:
    target = tmp_path_factory.mktemp("excel") / "answers"
    subprocess.run(
        [sys.executable, "-m", "tests.addin.excel.contract_run", str(target)],
        cwd=ROOT,
        check=True,
        timeout=300,
        stdout=subprocess.DEVNULL,
    )
    found: dict[str, Any] = pickle.loads(target.read_bytes())
    return found


@pytest.fixture(scope="module")
def answers(contract: dict[str, Any]) -> dict[str, list[tuple[Case, Any]]]:
    out: dict[str, list[tuple[Case, Any]]] = {name: [] for name in CATALOGUE}
    for case, answer in zip(all_cases(), contract["answers"], strict=True):
        out[case.name].append((case, answer))
    return out


def shown(outcome: Any) -> Any:
    """Give what xlwings' server returns for an outcome of the dispatcher."""
    if isinstance(outcome, np.ndarray):
        rows = [[shown(c) for c in line] for line in outcome.tolist()]
        if len(rows) == 1:
            return rows[0][0] if len(rows[0]) == 1 else rows[0]
        return rows
    return MARKER[outcome.kind] if isinstance(outcome, CellError) else outcome


def cells(answer: Any) -> list[Any]:
    return [c for part in answer for c in cells(part)] if isinstance(answer, list) else [answer]


@pytest.mark.parametrize("name", CATALOGUE)
def test_answers_are_those_of_the_dispatcher(name: str, answers: dict[str, list[tuple[Case, Any]]]) -> None:
    assert len(answers[name]) > 20
    for case, answer in answers[name]:
        assert answer == shown(call(name, case.expected_arguments())), case.label


@pytest.mark.parametrize("name", CATALOGUE)
def test_excel_can_show_every_cell_and_none_as_a_blank(
    name: str, answers: dict[str, list[tuple[Case, Any]]]
) -> None:
    for case, answer in answers[name]:
        for cell in cells(answer):
            assert type(cell) in (float, str, bool), f"{case.label}: {cell!r}"
            assert not (isinstance(cell, float) and not np.isfinite(cell)), case.label
        failed = call(name, case.expected_arguments())
        if isinstance(failed, CellError):
            assert answer == MARKER[failed.kind], case.label


@pytest.mark.parametrize("name", [n for n, row in CATALOGUE.items() if row.kind == "element"])
def test_an_error_cell_gives_that_same_error(name: str, answers: dict[str, list[tuple[Case, Any]]]) -> None:
    seen = 0
    for case, answer in answers[name]:
        number = case.label.removeprefix("argument ").split()[0]
        if " error " in case.label and not case.by_reference and int(number) > CATALOGUE[name].leading:
            assert answer == MARKER[case.label.split()[-1]], case.label
            seen += 1
    assert seen


def test_xlwings_imports_every_function(contract: dict[str, Any]) -> None:
    (text,) = contract["imported"]
    for name, row in CATALOGUE.items():
        assert f"Function {name}(" in text
        assert f'XLPy.CallUDF("{vba.PYTHON_MODULE}", "{name}", ' in text
        for parameter in parameters(row):
            assert parameter.name in text
    assert lint(text.replace('Attribute VB_Name = "xlwings_udfs"', "Option Explicit"), ours=False) == []


def test_wizard_texts_are_registered_whole(contract: dict[str, Any]) -> None:
    options = {macro.rpartition("!")[2]: given for macro, given in contract["options"]}
    assert set(options) == set(CATALOGUE)
    for name, row in CATALOGUE.items():
        given = options[name]
        assert given["Description"] == row.summary
        assert given["Category"] == f"thrustbook: {row.family}"
        assert len(given["ArgumentDescriptions"]) == len(parameters(row))
        for text in (given["Description"], given["Category"], *given["ArgumentDescriptions"]):
            assert 0 < len(text) <= 255
            assert "Positional argument" not in text


def test_module_name_in_the_vba_is_the_module() -> None:
    from thrustbook.addin.hosts.excel import udfs

    assert udfs.MODULE == vba.PYTHON_MODULE
    for name in CATALOGUE:
        assert callable(getattr(udfs, name))
