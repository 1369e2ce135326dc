"""The examples in the engine's docstrings run and print what they say."""

from __future__ import annotations

import doctest
import importlib
import pkgutil

import pytest

import thrustbook.engine


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
