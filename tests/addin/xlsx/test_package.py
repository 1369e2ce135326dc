from __future__ import annotations

import os
import random
import signal
import stat
import struct
import subprocess
import sys
import time
import zipfile
from io import BytesIO
from pathlib import Path

import pytest

from tests import libreoffice
from thrustbook.addin.cells import Scalar
from thrustbook.addin.xlsx.package import NameRef, Package, Refusal, SheetRef, TableRef
from thrustbook.addin.xlsx.sheetxml import store, stored_values

from . import richbook

CHANGES: dict[tuple[int, int], Scalar] = {(2, 2): 4321.5, (3, 2): 3.0, (4, 2): 7.5, (6, 5): "put here"}


def raw_members(raw: bytes) -> dict[str, tuple[object, ...]]:
    """Everything that the zip holds about each member, its packed bytes included."""
    found: dict[str, tuple[object, ...]] = {}
    with zipfile.ZipFile(BytesIO(raw)) as archive:
        for info in archive.infolist():
            at = info.header_offset
            names, extra = struct.unpack_from("<HH", raw, at + 26)
            data = at + 30 + names + extra
            found[info.filename] = (
                info.date_time,
                info.compress_type,
                info.comment,
                info.extra,
                info.create_system,
                info.create_version,
                info.extract_version,
                info.flag_bits,
                info.external_attr,
                info.internal_attr,
                info.CRC,
                info.file_size,
                raw[at:data],
                raw[data : data + info.compress_size],
            )
    return found


def test_reads_sheets_names_tables_and_strings(book: Path) -> None:
    package = Package.read(book)
    assert package.sheets == (
        SheetRef("Data & more", richbook.SHEET, "visible"),
        SheetRef("Second", "xl/worksheets/second sheet.xml", "hidden"),
    )
    assert package.defined_names == (
        NameRef("Area", "'Data & more'!$A$2:$A$4", None),
        NameRef("Local", "Second!$A$1", "Second"),
    )
    assert package.tables == (
        TableRef("Readings", "Data & more", "A1:C4", ("Flow", "two runs\nm", "in line"), 1, 0),
    )
    assert list(package.shared_strings) == ["Flow", "two runs\r"]
    assert package.has_macros
    assert not package.signed
    assert not package.external_links
    assert not package.date1904
    assert package.names() == list(richbook.parts())
    assert all(package.part(name) == content for name, content in richbook.parts().items())
    assert package.has("/XL/Styles.xml")
    assert not package.has("xl/none.xml")
    with pytest.raises(KeyError):
        package.part("xl/none.xml")


def test_tells_of_signature_links_and_date_system(tmp_path: Path) -> None:
    parts = richbook.parts()
    parts["_xmlsignatures/origin.sigs"] = b""
    parts["xl/externalLinks/externalLink1.xml"] = b"<a/>"
    parts["xl/book.xml"] = parts["xl/book.xml"].replace(b"<workbookPr", b'<workbookPr date1904="1"')
    parts["xl/_rels/book.xml.rels"] = parts["xl/_rels/book.xml.rels"].replace(
        b"</Relationships>",
        f'<Relationship Id="e" Type="{richbook.OFFICE}/externalLink" '
        'Target="externalLinks/externalLink1.xml"/></Relationships>'.encode(),
    )
    package = Package.read(richbook.write(tmp_path / "signed.xlsx", parts))
    assert package.signed
    assert package.external_links
    assert package.date1904


def test_unchanged_file_is_identical(book: Path) -> None:
    assert Package.read(book).to_bytes({}) == book.read_bytes()


@pytest.mark.parametrize("streamed", [False, True])
def test_every_other_part_stays_byte_for_byte(tmp_path: Path, streamed: bool) -> None:
    path = tmp_path / "rich.xlsm"
    old = richbook.zipped(richbook.parts(), streamed)
    path.write_bytes(old)
    package = Package.read(path)
    sheet = store(package.part(richbook.SHEET), CHANGES)
    package.save(path, {richbook.SHEET: sheet}, {"xl/added ü.xml": b"<added/>"})
    new = path.read_bytes()
    before, after = raw_members(old), raw_members(new)
    assert list(after) == [*before, "xl/added ü.xml"]
    for name in before:
        if name != richbook.SHEET:
            assert after[name] == before[name], name
    with zipfile.ZipFile(BytesIO(new)) as archive:
        assert archive.testzip() is None
        assert archive.comment == b"kept too"
        assert archive.read(richbook.SHEET) == sheet
        assert archive.read("xl/added ü.xml") == b"<added/>"
        changed, was = archive.getinfo(richbook.SHEET), before[richbook.SHEET]
        assert (changed.date_time, changed.compress_type, changed.comment) == was[:3]
        assert (changed.external_attr, changed.internal_attr) == was[8:10]
    assert Package.read(path).to_bytes({}) == new


def test_sheet_is_identical_outside_the_changed_cells(book: Path) -> None:
    old = Package.read(book).part(richbook.SHEET)
    expected = old
    for was, now in (
        (b'<dimension ref="A1:C4"/>', b'<dimension ref="A1:E6"/>'),
        (b"<f>A2*2</f><v>0</v>", b"<f>A2*2</f><v>4321.5</v>"),
        (b"A2:A3*3</f></c>", b"A2:A3*3</f><v>3</v></c>"),
        (b'<row r="4"><c r="C4">', b'<row r="4"><c r="B4" s="1"><v>7.5</v></c><c r="C4">'),
        (
            b"</row></sheetData>",
            b'</row><row r="6"><c r="E6" t="str"><v>put here</v></c></row></sheetData>',
        ),
    ):
        assert expected.count(was) == 1
        expected = expected.replace(was, now)
    assert store(old, CHANGES) == expected


def test_opens_in_libreoffice(book: Path, tmp_path: Path) -> None:
    office = libreoffice.program()
    package = Package.read(book)
    package.save(book, {richbook.SHEET: store(package.part(richbook.SHEET), CHANGES)})
    profile = (tmp_path / "profile").as_uri()
    command = [str(office), f"-env:UserInstallation={profile}", "--headless", "--convert-to", "pdf"]
    subprocess.run(
        [*command, "--outdir", str(tmp_path / "out"), str(book)], check=True, timeout=180, capture_output=True
    )
    pdf = (tmp_path / "out" / "rich.pdf").read_bytes()
    assert pdf.startswith(b"%PDF")
    assert len(pdf) > 5000


def test_replacing_and_adding_are_kept_apart(book: Path) -> None:
    package = Package.read(book)
    with pytest.raises(KeyError):
        package.to_bytes({"xl/none.xml": b""})
    with pytest.raises(ValueError, match="already"):
        package.to_bytes({}, {"XL/styles.xml": b""})


def test_zip64_directory_records(tmp_path: Path) -> None:
    """Some writers use the 64-bit fields for small members too, in both headers."""
    raw = richbook.zipped(richbook.parts())
    with zipfile.ZipFile(BytesIO(raw)) as archive:
        first = archive.infolist()[0]
        directory = archive.start_dir
    names, extra, comment = struct.unpack_from("<HHH", raw, directory + 28)
    record = bytearray(raw[directory : directory + 46 + names + extra + comment])
    packed, size = struct.unpack_from("<II", record, 20)
    struct.pack_into("<II", record, 20, 0xFFFFFFFF, 0xFFFFFFFF)
    struct.pack_into("<I", record, 42, 0xFFFFFFFF)
    wide = struct.pack("<HHQQQ", 1, 24, size, packed, first.header_offset)
    struct.pack_into("<H", record, 30, extra + len(wide))
    record[46 + names : 46 + names] = wide
    end = raw.rindex(b"PK\x05\x06")
    tail = bytearray(raw[end:])
    struct.pack_into("<I", tail, 12, end - directory + len(wide))
    rest = raw[directory + 46 + names + extra + comment : end]
    path = tmp_path / "wide.xlsx"
    path.write_bytes(raw[:directory] + bytes(record) + rest + bytes(tail))
    package = Package.read(path)
    assert package.to_bytes({}) == path.read_bytes()
    package.save(path, {"[Content_Types].xml": package.part("[Content_Types].xml") + b" " * 99})
    again = Package.read(path)
    assert again.part("[Content_Types].xml").endswith(b" " * 99)
    with zipfile.ZipFile(path) as archive:
        assert archive.testzip() is None


def test_mode_link_and_folder_are_kept(book: Path, tmp_path: Path) -> None:
    book.chmod(0o640)
    link = tmp_path / "link.xlsm"
    link.symlink_to(book)
    package = Package.read(link)
    package.save(link, {richbook.SHEET: store(package.part(richbook.SHEET), CHANGES)})
    package.save(link, {})
    assert link.is_symlink()
    assert stat.S_IMODE(book.stat().st_mode) == 0o640
    fresh = tmp_path / "fresh.xlsm"
    package.save(fresh, {})
    assert stat.S_IMODE(fresh.stat().st_mode) & 0o077 in (0o040, 0)
    assert sorted(p.name for p in tmp_path.iterdir()) == ["fresh.xlsm", "link.xlsm", "rich.xlsm"]


def test_places_that_cannot_be_written(book: Path, tmp_path: Path) -> None:
    package = Package.read(book)
    for target in (tmp_path, tmp_path / "none" / "x.xlsx", book / "x.xlsx", Path("/dev/null")):
        with pytest.raises(Refusal):
            package.save(target, {})
    book.chmod(0o440)
    old = book.read_bytes()
    with pytest.raises(Refusal, match="write-protected"):
        package.save(book, {richbook.SHEET: b"x"})
    assert book.read_bytes() == old


def test_failure_while_writing_leaves_the_file(book: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    old = book.read_bytes()
    package = Package.read(book)

    def full(handle: int) -> None:
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(os, "fsync", full)
    with pytest.raises(Refusal, match="No space left"):
        package.save(book, {richbook.SHEET: b"x"})
    assert book.read_bytes() == old
    assert [p.name for p in book.parent.iterdir()] == [book.name]


def test_file_saved_by_somebody_else_meanwhile(book: Path) -> None:
    package = Package.read(book)
    book.write_bytes(book.read_bytes() + b"")
    os.utime(book, ns=(1, 1))
    old = book.read_bytes()
    with pytest.raises(Refusal, match="another program"):
        package.save(book, {richbook.SHEET: b"x"})
    assert book.read_bytes() == old


@pytest.mark.skipif(sys.platform == "win32", reason="there is no fork and no kill -9")
def test_kill_in_the_middle_of_saving_leaves_a_whole_file(book: Path) -> None:
    parts = richbook.parts()
    noise = random.Random(5)
    # A second or so of saving in all, spread over many kills, needs a file of some size.
    parts["xl/media/image1.png"] += noise.randbytes(3_000_000)
    richbook.write(book, parts)
    package = Package.read(book)
    states = []
    for value in (1.0, 2.0):
        sheet = store(package.part(richbook.SHEET), {(2, 2): value})
        states.append(({richbook.SHEET: sheet}, package.to_bytes({richbook.SHEET: sheet})))
    book.write_bytes(states[0][1])
    interrupted = 0
    for _ in range(60):
        child = os.fork()
        if child == 0:
            try:
                own = Package.read(book)
                while True:
                    for replaced, _ in states:
                        own.save(book, replaced)
            finally:
                os._exit(1)
        time.sleep(noise.uniform(0.005, 0.06))
        os.kill(child, signal.SIGKILL)
        assert os.waitstatus_to_exitcode(os.waitpid(child, 0)[1]) == -signal.SIGKILL
        assert book.read_bytes() in [whole for _, whole in states]
        assert stored_values(Package.read(book).part(richbook.SHEET), ["", ""])[2, 2] in (1.0, 2.0)
        for left in book.parent.glob(".*.tmp"):
            interrupted += 1
            left.unlink()
    assert interrupted > 5, "the kills did not meet the writing"
