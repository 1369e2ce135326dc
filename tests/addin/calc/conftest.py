"""One office for all tests of this folder."""

from __future__ import annotations

from collections.abc import Iterator

import pytest

from tests import libreoffice

from .office import Office


@pytest.fixture(scope="session")
def office() -> Iterator[Office]:
    with Office() as running:
        yield running


@pytest.fixture
def book(office: Office) -> Iterator[int]:
    """An empty workbook, open in the office."""
    number = office.new()
    yield number
    office.close(number)


@pytest.fixture(scope="session")
def real_office() -> None:
    """For tests in which the product itself finds and starts the office."""
    libreoffice.program()
