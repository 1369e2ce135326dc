"""Every row of the catalogue keeps the rules that hosts and readers rely on."""

from __future__ import annotations

import re

import numpy as np
import pytest

from thrustbook.addin import dispatch, reference
from thrustbook.addin.catalogue.registry import CATALOGUE, FAMILIES, wording
from thrustbook.addin.catalogue.types import Row
from thrustbook.addin.cells import CellError
from thrustbook.addin.formula_text import read_call
from thrustbook.addin.units import ROLES
from thrustbook.engine.guard import Routine

ROWS = pytest.mark.parametrize("row", CATALOGUE.values(), ids=lambda r: r.name)
ELEMENTS = pytest.mark.parametrize(
    "row", [r for r in CATALOGUE.values() if r.kind == "element"], ids=lambda r: r.name
)
WIZARD_LIMIT = 255  # characters of a text, the smallest limit of the hosts


def test_names_are_unique() -> None:
    rows = [row for family in FAMILIES for row in family]
    assert len({row.name.upper() for row in rows}) == len(rows)


@ROWS
def test_the_name_is_legal_in_every_host_and_no_cell_address(row: Row) -> None:
    assert re.fullmatch(r"TB_[A-Z][A-Z0-9]*", row.name)
    assert len(row.name) <= 31
    assert not re.fullmatch(r"[A-Z]{1,3}[0-9]+", row.name)


@ROWS
def test_texts_fit_the_function_wizards(row: Row) -> None:
    for text in (row.summary, *(wording(a) for a in row.args), *(r.text for r in row.results)):
        assert 0 < len(text) <= WIZARD_LIMIT, text
    assert row.summary.endswith(".")
    assert row.sign
    assert row.reference


@ROWS
def test_arguments_are_ordered_and_described(row: Row) -> None:
    required = [row.required(a) for a in row.args]
    assert required == sorted(required, reverse=True), "required arguments stand before optional ones"
    names = [a.name for a in row.args]
    assert len(set(names)) == len(names)
    assert (row.max_args or 0) <= 30, "the oldest host takes 30 arguments"
    for arg in row.args:
        assert arg.role in {*ROLES, "choice", "text", "table", "headings", "any"}, arg
        assert (arg.role == "choice") == bool(arg.choices)
        assert row.required(arg) != bool(arg.empty), f"{arg.name}: say what leaving it empty means"


@ROWS
def test_results_are_described(row: Row) -> None:
    names = [r.name for r in row.results]
    assert len(set(names)) == len(names)
    assert not {"all", "labels", "units"} & {n.lower() for n in names}
    for result in row.results:
        assert result.role in {*ROLES, "text"}


@ELEMENTS
def test_an_element_row_follows_its_routine(row: Row) -> None:
    routine = row.routine
    assert isinstance(routine, Routine)
    assert [a.name for a in row.args] == [p.name for p in routine.parameters]
    assert tuple(r.name for r in row.results) == routine.fields
    assert routine.__doc__


@ROWS
def test_the_example_runs(row: Row) -> None:
    name, args = read_call(row.example)
    assert name == row.name
    outcome = dispatch.call(name, args)
    values = outcome.reshape(-1).tolist() if isinstance(outcome, np.ndarray) else [outcome]
    for value in values:
        assert not isinstance(value, CellError), value.message
        assert value is not None


@ROWS
def test_the_long_hand_is_there_or_its_absence_has_a_reason(row: Row) -> None:
    assert row.longhand is not None


@ROWS
def test_labels_and_units_head_the_results(row: Row) -> None:
    if not row.has_result:
        return
    _, args = read_call(row.example)
    labels = dispatch.call(row.name, ["labels", *args[1:]])
    units = dispatch.call(row.name, ["units", *args[1:]])
    everything = dispatch.call(row.name, ["all", *args[1:]])
    assert isinstance(labels, np.ndarray)
    assert isinstance(units, np.ndarray)
    assert isinstance(everything, np.ndarray)
    names = [r.name for r in row.results if not r.alone]
    assert labels.shape == units.shape == (1, len(names))
    assert everything.shape[1] == len(names)
    assert labels[0].tolist() == names


def test_the_reference_page_is_current() -> None:
    assert reference.PAGE.read_text(encoding="utf-8") == reference.page(), (
        "run python -m thrustbook.addin.reference and commit the page"
    )


def test_a_column_of_the_schedule_says_what_it_means_for_each_kind() -> None:
    columns = {c.name: c for c in CATALOGUE["TB_SCHEDULE"].args[1].columns}
    assert all(c.text for c in columns.values())
    assert "bend: loss coefficient on the velocity V1 of section 1" in columns["K"].text
    assert "reducer: loss coefficient on the velocity of the smaller pipe" in columns["K"].text
    assert columns["theta"].empty == "bend: needed; tee: 90 degrees"
