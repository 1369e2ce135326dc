"""The workbook that the tests of this folder start from."""

from __future__ import annotations

from pathlib import Path

import pytest

from . import richbook


@pytest.fixture
def book(tmp_path: Path) -> Path:
    return richbook.write(tmp_path / "rich.xlsm", richbook.parts())
