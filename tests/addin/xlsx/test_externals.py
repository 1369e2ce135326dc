"""Values that a workbook keeps of other workbooks."""

from __future__ import annotations

import pytest
from lxml import etree

from thrustbook.addin.cells import CellError
from thrustbook.addin.xlsx.externals import Externals

LINK = """<externalLink xmlns="http://schemas.openxmlformats.org/spreadsheetml/2006/main"><externalBook>
<sheetNames><sheetName val="Rates"/><sheetName val="Bob's data"/></sheetNames><sheetDataSet>
<sheetData sheetId="0"><row r="1"><cell r="A1"><v>1.5</v></cell><cell r="B1" t="str"><v>m</v></cell>
<cell r="C1"><v>damaged</v></cell></row></sheetData>
<sheetData sheetId="1"><row r="2"><cell r="B2" t="b"><v>1</v></cell>
<cell r="C2" t="e"><v>#N/A</v></cell></row></sheetData></sheetDataSet></externalBook></externalLink>"""


@pytest.mark.parametrize(
    ("operand", "grid"),
    [
        ("[1]Rates!A1", [[1.5]]),
        ("[1]rates!$A$1:$B$2", [[1.5, "m"], [None, None]]),
        ("'[1]Bob''s data'!B2:C2", [[True, CellError("NA")]]),
        ("[1]Rates!C9", None),
        ("[1]Rates!C1", None),
        ("[1]Nowhere!A1", None),
        ("[2]Rates!A1", None),
        ("[1]!Name", None),
        ("Rates!A1", None),
    ],
)
def test_kept_values(operand: str, grid: list[list[object]] | None) -> None:
    assert Externals([etree.fromstring(LINK)]).grid(operand) == grid
