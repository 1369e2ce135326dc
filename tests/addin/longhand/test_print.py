"""The checking sheets on paper, A4 and Letter: headings on every page, no column cut."""

from __future__ import annotations

import re
import subprocess
import zipfile
from collections import Counter
from pathlib import Path

import pytest

from thrustbook.addin.longhand.make import Made
from thrustbook.addin.xlsx.package import Package

from .office import recalculated
from .test_detach import TEMPLATES

SIZES = {"a4": 9, "letter": 1}


def on_paper(book: Path, size: int, target: Path) -> Path:
    """The same file set to a paper size."""
    with zipfile.ZipFile(book) as old, zipfile.ZipFile(target, "w") as new:
        for name in old.namelist():
            content = old.read(name)
            if "longhand" in name:
                content = content.replace(b"<pageSetup ", b'<pageSetup paperSize="%d" ' % size)
            new.writestr(name, content)
    return target


@pytest.fixture(scope="module")
def made(tmp_path_factory: pytest.TempPathFactory) -> tuple[Made, Path]:
    path = tmp_path_factory.mktemp("print") / "run.xlsx"
    made = Made(Package.read(TEMPLATES / "pipe-run.xlsx"))
    made.save(path)
    return made, path


@pytest.mark.parametrize("paper", SIZES)
def test_headings_on_every_page_and_no_column_cut(
    paper: str, made: tuple[Made, Path], tmp_path: Path
) -> None:
    book = on_paper(made[1], SIZES[paper], tmp_path / "book.xlsx")
    pdf = recalculated(book, tmp_path, "pdf")
    text = subprocess.run(["pdftotext", "-layout", pdf, "-"], check=True, capture_output=True, text=True)
    pages: Counter[str] = Counter()
    for page in text.stdout.split("\f"):
        name = re.search(r"LH (cells|TB_RUN|TB_RUNCASES)\s*$", page[:400], re.MULTILINE)
        if name is None:
            continue
        pages[name[0].strip()] += 1
        if name[1] == "cells":
            assert "where from, or formula" in page
        elif "entry" not in page and "closure" not in page:
            assert "symbol" in page
            assert "N01" in page
    # One page of width for the cells; for the table as many as the breaks between columns make.
    sheets = {sheet.name: sheet for sheet in made[0].book.sheets}
    run = sheets["LH TB_RUN"]
    assert pages["LH cells"] >= 2
    upper = pages["LH TB_RUN"] - (len(run.column_breaks) + 1)
    assert upper in (1, 2)
