"""A workbook file with everything that a careless save would lose.

Its figures are invented. It is put together by hand, part by part, since the parts that
matter here (macros, printer settings, an unknown extension) come from no library.
"""

from __future__ import annotations

import base64
import io
import zipfile
from pathlib import Path

MAIN = "http://schemas.openxmlformats.org/spreadsheetml/2006/main"
OFFICE = "http://schemas.openxmlformats.org/officeDocument/2006/relationships"
PACKAGE = "http://schemas.openxmlformats.org/package/2006/relationships"
DRAWING = "http://schemas.openxmlformats.org/drawingml/2006"
HEAD = '<?xml version="1.0" encoding="UTF-8" standalone="yes"?>\r\n'
SHEET = "xl/worksheets/data.xml"

PNG = base64.b64decode(
    "iVBORw0KGgoAAAANSUhEUgAAAAEAAAABCAYAAAAfFcSJAAAADUlEQVR42mNkYPhfDwAChwGA60e6kgAAAABJRU5ErkJggg=="
)
SHEET_XML = (
    HEAD + f'<worksheet xmlns="{MAIN}" xmlns:r="{OFFICE}"'
    ' xmlns:mc="http://schemas.openxmlformats.org/markup-compatibility/2006" mc:Ignorable="x14ac xr"'
    ' xmlns:x14ac="http://schemas.microsoft.com/office/spreadsheetml/2009/9/ac"'
    ' xmlns:xr="http://schemas.microsoft.com/office/spreadsheetml/2014/revision"'
    ' xr:uid="{00000000-0001-0000-0000-000000000000}"><!-- <sheetData> of no meaning -->'
    '<dimension ref="A1:C4"/><sheetViews><sheetView tabSelected="1" workbookViewId="0"/></sheetViews>'
    '<sheetFormatPr defaultRowHeight="15" x14ac:dyDescent="0.25"/>'
    '<cols><col min="1" max="2" width="12.5" style="1" customWidth="1"/></cols>'
    "<sheetData>\r\n"
    '<row r="1" spans="1:3" x14ac:dyDescent="0.25"><c r="A1" s="1" t="s"><v>0</v></c>'
    '<c r="B1" t="s"><v>1</v></c><c r="C1" t="inlineStr"><is><t>in line</t></is></c></row>\r\n'
    '<row r="2" spans="1:3"><c r="A2"><v>1</v></c><c r="B2" s="1"><f>A2*2</f><v>0</v></c>'
    '<c r="C2"><f t="shared" ref="C2:C4" si="0">A2+$B2+SUM(A:A)&amp;"A2"</f><v>5</v></c></row>'
    '<row r="3"><c r="A3"><v>2.5</v></c><c r="B3"><f t="array" ref="B3:B4">A2:A3*3</f></c>'
    '<c r="C3"><f t="shared" si="0"/><v>5</v></c></row>\r\n'
    '<row r="4"><c r="C4"><f t="shared" si="0"/></c></row>'
    "</sheetData>"
    '<conditionalFormatting sqref="A2:A4"><cfRule type="cellIs" dxfId="0" priority="1" '
    'operator="greaterThan">'
    "<formula>1</formula></cfRule></conditionalFormatting>"
    '<dataValidations count="1"><dataValidation type="decimal" allowBlank="1" sqref="A2:A4">'
    "<formula1>0</formula1><formula2>9</formula2></dataValidation></dataValidations>"
    '<pageMargins left="0.7" right="0.7" top="0.75" bottom="0.75" header="0.3" footer="0.3"/>'
    '<pageSetup paperSize="9" orientation="landscape" r:id="rId2"/><drawing r:id="rId1"/>'
    '<tableParts count="1"><tablePart r:id="rId3"/></tableParts>'
    '<extLst><ext uri="{00000000-0000-4000-8000-00000000AAAA}" xmlns:made="urn:made-up">'
    '<made:thing sheetData="no"/></ext></extLst></worksheet>'
).encode()


def _relations(*entries: tuple[str, str, str]) -> str:
    links = "".join(
        f'<Relationship Id="{name}" Type="{kind if ":" in kind else f"{OFFICE}/{kind}"}" Target="{target}"/>'
        for name, kind, target in entries
    )
    return f'{HEAD}<Relationships xmlns="{PACKAGE}">{links}</Relationships>'


def _content_types() -> str:
    sheet = "application/vnd.openxmlformats-officedocument.spreadsheetml"
    overrides = {
        "xl/book.xml": "application/vnd.ms-excel.sheet.macroEnabled.main+xml",
        SHEET: f"{sheet}.worksheet+xml",
        "xl/worksheets/second sheet.xml": f"{sheet}.worksheet+xml",
        "xl/styles.xml": f"{sheet}.styles+xml",
        "xl/strings.xml": f"{sheet}.sharedStrings+xml",
        "xl/tables/table1.xml": f"{sheet}.table+xml",
        "xl/vbaProject.bin": "application/vnd.ms-office.vbaProject",
        "xl/drawings/drawing1.xml": "application/vnd.openxmlformats-officedocument.drawing+xml",
        "xl/charts/chart1.xml": "application/vnd.openxmlformats-officedocument.drawingml.chart+xml",
        "xl/unknown/thing.dat": "application/x-made-up",
    }
    return (
        f'{HEAD}<Types xmlns="http://schemas.openxmlformats.org/package/2006/content-types">'
        '<Default Extension="rels" ContentType="application/vnd.openxmlformats-package.relationships+xml"/>'
        '<Default Extension="xml" ContentType="application/xml"/>'
        '<Default Extension="png" ContentType="image/png"/><Default Extension="bin" '
        'ContentType="application/vnd.openxmlformats-officedocument.spreadsheetml.printerSettings"/>'
        + "".join(f'<Override PartName="/{p}" ContentType="{t}"/>' for p, t in overrides.items())
        + "</Types>"
    )


_ANCHOR = (
    "<xdr:twoCellAnchor><xdr:from><xdr:col>{0}</xdr:col><xdr:colOff>0</xdr:colOff><xdr:row>6</xdr:row>"
    "<xdr:rowOff>0</xdr:rowOff></xdr:from><xdr:to><xdr:col>{1}</xdr:col><xdr:colOff>0</xdr:colOff>"
    "<xdr:row>20</xdr:row><xdr:rowOff>0</xdr:rowOff></xdr:to>{2}<xdr:clientData/></xdr:twoCellAnchor>"
)
_FRAME = (
    '<xdr:graphicFrame macro=""><xdr:nvGraphicFramePr><xdr:cNvPr id="2" name="Chart 1"/>'
    '<xdr:cNvGraphicFramePr/></xdr:nvGraphicFramePr><xdr:xfrm><a:off x="0" y="0"/><a:ext cx="0" cy="0"/>'
    f'</xdr:xfrm><a:graphic><a:graphicData uri="{DRAWING}/chart"><c:chart xmlns:c="{DRAWING}/chart" '
    'r:id="rId1"/></a:graphicData></a:graphic></xdr:graphicFrame>'
)
_PICTURE = (
    '<xdr:pic><xdr:nvPicPr><xdr:cNvPr id="3" name="Picture 1"/><xdr:cNvPicPr/></xdr:nvPicPr><xdr:blipFill>'
    '<a:blip r:embed="rId2"/><a:stretch><a:fillRect/></a:stretch></xdr:blipFill><xdr:spPr><a:xfrm>'
    '<a:off x="0" y="0"/><a:ext cx="9525" cy="9525"/></a:xfrm><a:prstGeom prst="rect"><a:avLst/>'
    "</a:prstGeom></xdr:spPr></xdr:pic>"
)


def parts() -> dict[str, bytes]:
    """All parts of the workbook by name, in the order of the file."""
    text = {
        "[Content_Types].xml": _content_types(),
        "_rels/.rels": _relations(("rId1", "officeDocument", "/xl/book.xml")),
        "xl/book.xml": f'{HEAD}<workbook xmlns="{MAIN}" xmlns:r="{OFFICE}"><workbookPr '
        'codeName="Book"/><sheets>'
        '<sheet name="Data &amp; more" sheetId="7" r:id="rId5"/>'
        '<sheet name="Second" sheetId="9" state="hidden" r:id="rId2"/></sheets><definedNames>'
        "<definedName name=\"Area\">'Data &amp; more'!$A$2:$A$4</definedName>"
        '<definedName name="Local" localSheetId="1">Second!$A$1</definedName></definedNames></workbook>',
        "xl/_rels/book.xml.rels": _relations(
            ("rId5", "worksheet", "/" + SHEET),
            ("rId2", "worksheet", "worksheets/second%20sheet.xml"),
            ("rId3", "styles", "styles.xml"),
            ("rId4", "sharedStrings", "strings.xml"),
            ("rId6", "http://schemas.microsoft.com/office/2006/relationships/vbaProject", "vbaProject.bin"),
        ),
        "xl/strings.xml": f'{HEAD}<sst xmlns="{MAIN}"><si><t>Flow</t></si><si><r><t>two '
        "</t></r><r><t xml:space="
        '"preserve">runs_x000D_</t></r><rPh sb="0" eb="1"><t>not this</t></rPh></si></sst>',
        "xl/styles.xml": f'{HEAD}<styleSheet xmlns="{MAIN}"><fonts count="1"><font><sz val="11"/><name val='
        '"Calibri"/></font></fonts><fills count="2"><fill><patternFill patternType="none"/></fill><fill>'
        '<patternFill patternType="gray125"/></fill></fills><borders count="1"><border/></borders>'
        '<cellStyleXfs count="1"><xf/></cellStyleXfs><cellXfs count="2"><xf xfId="0"/><xf '
        'numFmtId="2" xfId="0" '
        'applyNumberFormat="1"/></cellXfs><dxfs count="1"><dxf><font><b/></font></dxf></dxfs></styleSheet>',
        "xl/worksheets/_rels/data.xml.rels": _relations(
            ("rId1", "drawing", "../drawings/drawing1.xml"),
            ("rId2", "printerSettings", "../printerSettings/printerSettings1.bin"),
            ("rId3", "table", "../tables/table1.xml"),
            ("rId4", "urn:made-up:relation", "../unknown/thing.dat"),
        ),
        "xl/worksheets/second sheet.xml": f'{HEAD}<worksheet xmlns="{MAIN}"><sheetData/></worksheet>',
        "xl/tables/table1.xml": f'{HEAD}<table xmlns="{MAIN}" id="1" name="T" '
        'displayName="Readings" ref="A1:C4" '
        'totalsRowShown="0"><tableColumns count="3"><tableColumn id="1" name="Flow"/><tableColumn id="2" '
        'name="two runs_x000a_m"/><tableColumn id="3" name="in line"/></tableColumns></table>',
        "xl/drawings/drawing1.xml": f'{HEAD}<xdr:wsDr xmlns:xdr="{DRAWING}/spreadsheetDrawing" '
        f'xmlns:a="{DRAWING}/main" xmlns:r="{OFFICE}">{_ANCHOR.format(0, 5, _FRAME)}'
        f"{_ANCHOR.format(6, 8, _PICTURE)}</xdr:wsDr>",
        "xl/drawings/_rels/drawing1.xml.rels": _relations(
            ("rId1", "chart", "../charts/chart1.xml"), ("rId2", "image", "../media/image1.png")
        ),
        "xl/charts/chart1.xml": f'{HEAD}<c:chartSpace xmlns:c="{DRAWING}/chart" xmlns:a="{DRAWING}/main">'
        '<c:chart><c:plotArea><c:layout/><c:barChart><c:barDir val="col"/><c:ser><c:idx val="0"/><c:order '
        'val="0"/><c:val><c:numRef><c:f>\'Data &amp; '
        "more'!$A$2:$A$4</c:f></c:numRef></c:val></c:ser><c:axId "
        'val="1"/><c:axId val="2"/></c:barChart><c:catAx><c:axId val="1"/><c:scaling/><c:axPos val="b"/>'
        '<c:crossAx val="2"/></c:catAx><c:valAx><c:axId val="2"/><c:scaling/><c:axPos val="l"/><c:crossAx '
        'val="1"/></c:valAx></c:plotArea></c:chart></c:chartSpace>',
    }
    found = {name: content.encode() for name, content in text.items()}
    found[SHEET] = SHEET_XML
    found["xl/media/image1.png"] = PNG
    found["xl/vbaProject.bin"] = bytes.fromhex("d0cf11e0a1b11ae1") + bytes(range(256)) * 20
    found["xl/printerSettings/printerSettings1.bin"] = b"\0\x01printer" * 50
    found["xl/unknown/thing.dat"] = bytes(range(255, -1, -1)) * 9
    return found


class _Stream(io.RawIOBase):
    """A sink that cannot be rewound, so that the zip is written with data descriptors."""

    def __init__(self) -> None:
        self.data = bytearray()

    def writable(self) -> bool:
        return True

    def write(self, data) -> int:  # type: ignore[no-untyped-def]
        self.data += data
        return len(data)


def zipped(content: dict[str, bytes], streamed: bool = False) -> bytes:
    """A zip of the parts with mixed packing, dates, attributes, extra fields and a comment."""
    sink = _Stream() if streamed else io.BytesIO()
    with zipfile.ZipFile(sink, "w") as archive:
        archive.comment = b"kept too"
        for index, (name, data) in enumerate(content.items()):
            info = zipfile.ZipInfo(name, (1999 + index, 2, 3, 4, 5, 6))
            info.compress_type = zipfile.ZIP_STORED if name.endswith(".png") else zipfile.ZIP_DEFLATED
            info.external_attr = 0o600 << 16 | index
            info.extra = b"\xfe\xca\x04\x00abcd" if index % 3 == 0 else b""
            info.comment = b"note" if index % 4 == 0 else b""
            archive.writestr(info, data)
    return bytes(sink.data) if isinstance(sink, _Stream) else sink.getvalue()


def write(path: Path, content: dict[str, bytes]) -> Path:
    """Write the parts to a file, zipped."""
    path.write_bytes(zipped(content))
    return path
