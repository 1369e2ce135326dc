"""The functions in a real Calc: every example, errors, the cell contract, the wizard, files."""

from __future__ import annotations

import math
import os
import signal
import time
from pathlib import Path
from typing import Any

import numpy as np
import openpyxl
import pytest
from openpyxl.worksheet.formula import ArrayFormula

from thrustbook.addin import dispatch
from thrustbook.addin.catalogue.registry import CATALOGUE, wording
from thrustbook.addin.cells import CellError
from thrustbook.addin.formula_text import read_call
from thrustbook.addin.hosts.calc.describe import described
from thrustbook.addin.hosts.calc.office import wire
from thrustbook.addin.xlsx.a1 import to_a1

from .office import Office

TOLERANCE = 1e-12
TOO_MANY = 504  # Calc's own error for more arguments than a function has
VALUE, NUM, DIV0, NA = (wire.ERROR_CODES[kind] for kind in ("VALUE", "NUM", "DIV0", "NA"))


def as_rows(answer: Any) -> list[list[Any]]:
    return answer.tolist() if isinstance(answer, np.ndarray) else [[answer]]


def same(calc: Any, engine: Any) -> bool:
    """Whether a cell of Calc holds what the engine gave."""
    if isinstance(engine, CellError):
        return bool(calc == {"error": wire.ERROR_CODES[engine.kind]})
    if isinstance(engine, float) and isinstance(calc, float):
        return math.isclose(calc, engine, rel_tol=TOLERANCE, abs_tol=0.0)
    return type(calc) is type(engine) and bool(calc == engine)


@pytest.fixture(scope="module")
def examples(office: Office, tmp_path_factory: pytest.TempPathFactory) -> dict[str, list[list[Any]]]:
    """What Calc gives for the example of every function, read from an .xlsx with plain names."""
    path = tmp_path_factory.mktemp("calc") / "examples.xlsx"
    workbook = openpyxl.Workbook()
    places = {}
    for name, row in CATALOGUE.items():
        rows = as_rows(dispatch.call(*read_call(row.example)))
        sheet = workbook.create_sheet(name)
        last = to_a1(len(rows), len(rows[0]))
        places[name] = f"A1:{last}"
        sheet["A1"] = ArrayFormula(f"A1:{last}", "=" + row.example) if last != "A1" else "=" + row.example
    workbook.save(path)
    book = office.load(str(path))
    found = {name: office.values(book, name, place) for name, place in places.items()}
    office.close(book)
    return found


@pytest.mark.parametrize("name", CATALOGUE)
def test_every_example_gives_what_the_engine_gives(name: str, examples: dict[str, Any]) -> None:
    expected = as_rows(dispatch.call(*read_call(CATALOGUE[name].example)))
    assert not any(isinstance(v, CellError) for line in expected for v in line)
    found = examples[name]
    assert [len(line) for line in found] == [len(line) for line in expected]
    different = [
        (i, j, found[i][j], value)
        for i, line in enumerate(expected)
        for j, value in enumerate(line)
        if not same(found[i][j], value)
    ]
    assert not different


@pytest.mark.parametrize(
    ("formula", "code"),
    [
        ('=TB_AREA("metric";-300)', NUM),
        ('=TB_AREA("metric";"abc")', VALUE),
        ('=TB_AREA("metric")', VALUE),
        ('=TB_AREA("furlongs";300)', VALUE),
        ('=TB_AREA("metric";1/0)', DIV0),
        ('=TB_AREA("metric";NA())', NA),
        ('=TB_AREA("metric";300;1;2;3)', TOO_MANY),
    ],
)
def test_a_failure_is_an_error_to_calc_too(office: Office, book: int, formula: str, code: int) -> None:
    office.put(book, 0, "A1", formula)
    for place, test in (
        ("B1", "=ISERROR(A1)"),
        ("C1", '=IFERROR(A1;"caught")'),
        ("D1", "=SUM(A1;1)"),
        ("E1", "=ISNA(A1)"),
        ("F1", "=ISNUMBER(A1)"),
    ):
        office.put(book, 0, place, test)
    (line,) = office.values(book, 0, "A1:F1")
    is_na = float(code == NA)
    assert line == [{"error": code}, 1.0, "caught", {"error": code}, is_na, 0.0]


def test_one_bad_row_of_a_block_spoils_one_row(office: Office, book: int) -> None:
    office.fill(book, 0, "A1:A3", [[100.0], [-100.0], [200.0]])
    office.put(book, 0, "B1:B3", '=TB_AREA("metric";A1:A3)')
    office.put(book, 0, "C1", "=SUM(B1:B3)")
    assert [
        same(v[0], e)
        for v, e in zip(
            office.values(book, 0, "B1:B3"),
            (math.pi * 0.01 / 4, CellError("NUM"), math.pi * 0.04 / 4),
            strict=True,
        )
    ] == [True, True, True]
    assert office.values(book, 0, "C1") == [[{"error": NUM}]]


def test_empty_cells(office: Office, book: int) -> None:
    """Empty: the default where optional, an error where required; Calc hands it over as 0."""
    formulas = {
        "A1": "=TB_AREA(;0.3)",  # omitted between commas: SI
        "A2": "=TB_AREA(Z1;0.3)",  # an empty cell for the units: SI too
        "A3": '=TB_AREA("SI";Z1)',  # required: an error
        "A4": '=TB_BEND("F";"SI";1000;0.3;200000;0.1;90)',
        "A5": '=TB_BEND("F";"SI";1000;0.3;200000;0.1;90;;;)',
        "A6": '=TB_WHY("TB_AREA";"SI";Z1)',
        "A7": "=TB_AREA(Z1:Z2;0.3)",  # an empty range for the units
    }
    for place, formula in formulas.items():
        office.put(book, 0, place, formula)
    values = [line[0] for line in office.values(book, 0, "A1:A7")]
    area = math.pi * 0.3**2 / 4
    assert same(values[0], area)
    assert same(values[1], area)
    assert values[2] == {"error": NUM}
    assert isinstance(values[3], float)
    assert values[4] == values[3]
    assert values[5] == "D = 0 m (allowed: above 0)"
    assert same(values[6], area)


def test_an_empty_cell_that_counts_as_0_is_told_by_why(office: Office, book: int) -> None:
    call = '"TB_BEND";"F";"SI";1000;0.3;200000;0.1;90;0.3;;;'
    office.put(book, 0, "A1", f"=TB_WHY({call}Z1)")
    office.put(book, 0, "A2", f"=TB_WHY({call})")
    (told,), (clear,) = office.values(book, 0, "A1:A2")
    assert "p2 = 0: if that is an empty cell, leave the argument out" in told
    assert "p2" not in clear


def test_units_come_from_a_range(office: Office, book: int) -> None:
    office.fill(book, 0, "A1:B2", [["diameter", "in"], ["area", "ft2"]])
    office.put(book, 0, "D1", "=TB_AREA(A1:B2;12)")
    assert same(office.values(book, 0, "D1")[0][0], math.pi / 4)
    office.put(book, 0, "B1", "mm")
    assert same(office.values(book, 0, "D1")[0][0], math.pi * (0.012 / 0.3048) ** 2 / 4)


def test_text_answers_are_found_by_comparisons(office: Office, book: int) -> None:
    office.put(book, 0, "A1", '=TB_WHY("TB_AREA";"SI";0.3)')
    office.put(book, 0, "B1", '=IF(A1="ok";1;2)')
    office.put(book, 0, "C1", '=MATCH("ok";A1:A1;0)')
    office.put(book, 0, "D1", '=COUNTIF(A1:A1;"ok")')
    assert office.values(book, 0, "A1:D1") == [["ok", 1.0, 1.0, 1.0]]


def test_wizard_texts_of_every_function(office: Office) -> None:
    found = office.descriptions()
    assert set(found) == set(CATALOGUE)
    for name, row in CATALOGUE.items():
        wanted = described(row)
        assert found[name]["text"] == row.summary
        # 11 is the office's number of the category Add-In.
        assert found[name]["category"] == 11
        arguments = found[name]["arguments"]
        assert [a[:2] for a in arguments] == [list(place) for place in wanted.places]
        for argument, arg in zip(arguments[row.leading :], row.args, strict=True):
            text = wording(arg)
            assert argument[1].startswith(text[:1].upper() + text[1:])


def test_menu_entry(office: Office) -> None:
    menus = [entry for entry in office.menu() if entry[0] == "thrustbook"]
    command = "service:org.thrustbook.calc.Relink?"
    assert menus == [["thrustbook", "Link formulas and recalculate", command]]


def test_recalculation_after_the_worker_was_killed(office: Office, book: int) -> None:
    office.put(book, 0, "A1", '=TB_AREA("metric";300)')
    (worker,) = office.processes("hosts.calc.worker")
    os.kill(worker, signal.SIGKILL)
    office.put(book, 0, "A1", '=TB_AREA("metric";400)')
    assert same(office.values(book, 0, "A1")[0][0], math.pi * 0.16 / 4)
    (again,) = office.processes("hosts.calc.worker")
    assert again != worker
    os.kill(again, signal.SIGKILL)
    office.recalculate(book)
    assert same(office.values(book, 0, "A1")[0][0], math.pi * 0.16 / 4)


def test_one_worker_serves_every_workbook(office: Office) -> None:
    books = [office.new() for _ in range(3)]
    for number in books:
        office.put(number, 0, "A1", '=TB_AREA("metric";300)')
    assert len(office.processes("hosts.calc.worker")) == 1
    for number in books:
        office.close(number)


def _await(gone: Any, patience: float = 15.0) -> None:
    limit = time.monotonic() + patience
    while not gone() and time.monotonic() < limit:
        time.sleep(0.1)
    assert gone()


def _exists(pid: int) -> bool:
    try:
        return Path(f"/proc/{pid}/stat").read_text().rpartition(")")[2].split()[0] != "Z"
    except OSError:
        return False


@pytest.mark.parametrize("hard", [False, True], ids=["closed", "killed"])
def test_an_office_that_ends_leaves_no_process(hard: bool) -> None:
    with Office() as own:
        book = own.new()
        own.put(book, 0, "A1", '=TB_AREA("metric";300)')
        assert isinstance(own.values(book, 0, "A1")[0][0], float)
        workers = own.processes("hosts.calc.worker")
        assert len(workers) == 1
        office_processes = own.processes("soffice.bin")
        if hard:
            for pid in office_processes:
                os.kill(pid, signal.SIGKILL)
        else:
            own.quit()
        _await(lambda: not any(map(_exists, workers + office_processes)))
