"""The engine's docstrings are complete, and their examples run and print what they say."""

from __future__ import annotations

import doctest
import importlib
import inspect
import pkgutil
import re
from typing import Any

import pytest

import thrustbook.engine
from thrustbook.addin.catalogue.registry import CATALOGUE

ROUTINES = {row.routine.__name__: row.routine for row in CATALOGUE.values() if row.kind == "element"}


def examples() -> list[doctest.DocTest]:
    """Find the examples of every module, those of the guarded routines among them."""
    finder = doctest.DocTestFinder(exclude_empty=True)
    names = [info.name for info in pkgutil.iter_modules(thrustbook.engine.__path__)]
    modules = [importlib.import_module(f"thrustbook.engine.{name}") for name in names]
    return [test for module in modules for test in finder.find(module) if test.examples]


def test_the_routines_are_among_the_examples() -> None:
    assert "thrustbook.engine.fittings.bend" in {test.name for test in examples()}


@pytest.mark.parametrize("test", examples(), ids=lambda test: test.name)
def test_example_prints_what_the_docstring_says(test: doctest.DocTest) -> None:
    results = doctest.DocTestRunner(verbose=False).run(test)
    assert results.attempted > 0
    assert results.failed == 0


@pytest.mark.parametrize("name", ROUTINES)
def test_a_routine_says_all_that_its_user_must_know(name: str) -> None:
    routine: Any = ROUTINES[name]
    text = inspect.getdoc(routine) or ""
    for part in ("Parameters\n---", "Returns\n---", "Raises\n---", ">>> ", "Source"):
        assert part in text, part
    assert re.search("[Aa]ssum", text)
    arguments = text.partition("Parameters\n---")[2].partition("Returns\n---")[0]
    for parameter in inspect.signature(routine).parameters:
        assert re.search(rf"\b{parameter}\b", arguments), parameter
