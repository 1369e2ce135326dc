from __future__ import annotations

import os
import random
import struct
import zlib
from pathlib import Path

import pytest

from thrustbook.addin.xlsx import package as package_module
from thrustbook.addin.xlsx.package import Package, Refusal

from . import richbook


def refusal(path: Path) -> str:
    with pytest.raises(Refusal) as caught:
        Package.read(path)
    text = str(caught.value)
    assert path.name in text
    assert text.endswith(".")
    return text


def ole(*streams: str) -> bytes:
    directory = b"".join(
        (name.encode("utf-16-le") + b"\0\0").ljust(64, b"\0")
        + struct.pack("<H", 2 * len(name) + 2)
        + bytes(62)
        for name in ("Root Entry", *streams)
    )
    return bytes.fromhex("d0cf11e0a1b11ae1").ljust(1024, b"\0") + directory.ljust(512, b"\0")


@pytest.mark.parametrize(
    ("content", "words"),
    [
        (b"", "is empty"),
        (ole("EncryptionInfo", "EncryptedPackage"), "encrypted"),
        (ole("Workbook"), "old binary format .xls, although its name ends in .xlsx"),
        (ole("Book"), "old binary format .xls"),
        (ole("WordDocument"), "old binary document"),
        (b"\x09\x08\x10\x00\x00\x06", "old binary format .xls"),
        (b"<html><table>", "web page"),
        (b"\xef\xbb\xbf<?xml version='1.0'?><Workbook/>", "XML document"),
        (b"a;b;c\n1;2;3\n", "not a workbook"),
        (b"PK\x03\x04 and then nothing", "damaged"),
    ],
)
def test_refuses_other_content(tmp_path: Path, content: bytes, words: str) -> None:
    path = tmp_path / "book.xlsx"
    path.write_bytes(content)
    assert words in refusal(path)


def test_refuses_missing_file_and_folder(tmp_path: Path) -> None:
    assert "There is no file" in refusal(tmp_path / "none.xlsx")
    assert "folder" in refusal(tmp_path)
    os.mkfifo(tmp_path / "pipe.xlsx")
    assert "ordinary file" in refusal(tmp_path / "pipe.xlsx")


def test_refuses_file_without_read_permission(book: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    if os.geteuid() == 0:  # root may read everything, so the system is made to say no

        def forbidden(*_args: object, **_kwargs: object) -> None:
            raise PermissionError(13, "Permission denied")

        monkeypatch.setattr(Path, "open", forbidden)
    else:
        book.chmod(0)
    assert "may not be read" in refusal(book)


@pytest.mark.parametrize("keep", [0.1, 0.5, 0.9, 0.99])
def test_refuses_truncated_zip(book: Path, keep: float) -> None:
    whole = book.read_bytes()
    book.write_bytes(whole[: int(len(whole) * keep)])
    assert "damaged" in refusal(book)


def test_refuses_damaged_part_when_it_is_read(book: Path) -> None:
    raw = bytearray(book.read_bytes())
    at = raw.index(richbook.SHEET.encode()) + len(richbook.SHEET) + 200
    raw[at] ^= 0xFF
    book.write_bytes(bytes(raw))
    with pytest.raises(Refusal, match="damaged"):
        Package.read(book).part(richbook.SHEET)


def test_random_damage_is_refused_or_harmless(book: Path) -> None:
    """Whatever happens to the bytes, only a refusal comes out, never another exception."""
    whole = book.read_bytes()
    noise = random.Random(11)
    refused = 0
    for _ in range(400):
        raw = bytearray(whole)
        for _ in range(noise.randint(1, 6)):
            # The directory and the headers hold the structure, so damage them more often.
            at = (
                noise.randrange(len(raw))
                if noise.random() < 0.4
                else noise.randrange(len(raw) - 2500, len(raw))
            )
            raw[at] = noise.randrange(256)
        try:
            package = Package(book, bytes(raw))
            for sheet in package.sheets:
                package.part(sheet.part)
            list(package.shared_strings)
            package.to_bytes({package.sheets[0].part: b"x"})
        except Refusal:
            refused += 1
    assert refused > 100


def with_entry(name: str, old: bytes, new: bytes) -> dict[str, bytes]:
    parts = richbook.parts()
    assert old in parts[name]
    parts[name] = parts[name].replace(old, new)
    return parts


STRICT = b"http://purl.oclc.org/ooxml/spreadsheetml/main"


@pytest.mark.parametrize(
    ("parts", "words"),
    [
        ({"mimetype": b"application/vnd.oasis.opendocument.spreadsheet", "content.xml": b"<a/>"}, ".ods"),
        ({"mimetype": b"application/vnd.oasis.opendocument.text"}, "no spreadsheet"),
        ({"readme.txt": b"hello"}, "there is no workbook"),
        (with_entry("xl/book.xml", richbook.MAIN.encode(), STRICT), "Strict"),
        (
            with_entry("_rels/.rels", b"http://schemas.openxmlformats.org/officeDocument/2006", STRICT[:27]),
            "Strict",
        ),
        (
            with_entry(
                "[Content_Types].xml", b"sheet.macroEnabled.main+xml", b"sheet.binary.macroEnabled.main"
            ),
            ".xlsb",
        ),
        (
            with_entry(
                "[Content_Types].xml", b"vnd.ms-excel.sheet.macroEnabled", b"x.wordprocessingml.document"
            ),
            "text document",
        ),
        (with_entry("_rels/.rels", b"/xl/book.xml", b"/xl/gone.xml"), "missing"),
        (with_entry("xl/_rels/book.xml.rels", b"data.xml", b"gone.xml"), "missing"),
        (with_entry("xl/book.xml", b"</workbook>", b""), "damaged"),
        (with_entry("xl/book.xml", b"workbook", b"notebook"), "no workbook"),
        ({**richbook.parts(), "XL/Styles.xml": b"<again/>"}, "two parts"),
    ],
)
def test_refuses_other_packages(tmp_path: Path, parts: dict[str, bytes], words: str) -> None:
    assert words in refusal(richbook.write(tmp_path / "book.xlsx", parts))


def test_entities_are_not_expanded(tmp_path: Path) -> None:
    bomb = b'<!DOCTYPE b [<!ENTITY a "aaaaaaaaaa"><!ENTITY c "&a;&a;&a;&a;">]>'
    parts = richbook.parts()
    head = richbook.HEAD.encode()
    parts["xl/strings.xml"] = parts["xl/strings.xml"].replace(head, head + bomb).replace(b"Flow", b"&c;")
    strings = list(Package.read(richbook.write(tmp_path / "book.xlsx", parts)).shared_strings)
    assert "aaaa" not in strings[0]


def lying(raw: bytes, name: str, size: int) -> bytes:
    """The zip with another unpacked size in the directory record of one member."""
    out = bytearray(raw)
    at = raw.rindex(name.encode()) - 46
    assert out[at : at + 4] == b"PK\x01\x02"
    struct.pack_into("<I", out, at + 24, size)
    return bytes(out)


def test_refuses_zip_bomb_without_unpacking_it(book: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def unpacking(*_args: object) -> None:
        raise AssertionError("unpacked")

    raw = book.read_bytes()
    monkeypatch.setattr(zlib, "decompressobj", unpacking)
    book.write_bytes(lying(raw, richbook.SHEET, 3 * 1024**3))
    assert "would unpack to 3.2 GB" in refusal(book)
    book.write_bytes(lying(raw, richbook.SHEET, 250 * 1024**2))
    assert "250 times" in refusal(book)


def test_directory_that_lies_about_a_size_is_found_early(tmp_path: Path) -> None:
    parts = richbook.parts()
    parts["xl/unknown/thing.dat"] = bytes(50_000_000)
    path = tmp_path / "book.xlsx"
    path.write_bytes(lying(richbook.zipped(parts), "xl/unknown/thing.dat", 1000))
    package = Package.read(path)
    with pytest.raises(Refusal, match="checksum"):
        package.part("xl/unknown/thing.dat")


def test_refuses_members_with_a_zip_password(book: Path) -> None:
    raw = bytearray(book.read_bytes())
    at = bytes(raw).rindex(b"xl/book.xml") - 46
    raw[at + 8] |= 1
    book.write_bytes(bytes(raw))
    assert "zip password" in refusal(book)


def test_refuses_file_beyond_the_limit(book: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(package_module, "MAX_FILE", 100)
    assert "limit" in refusal(book)


def test_names_outside_the_folder_do_no_harm(tmp_path: Path) -> None:
    parts = {**richbook.parts(), "../../outside.txt": b"x", "/absolute.txt": b"y"}
    path = richbook.write(tmp_path / "book.xlsx", parts)
    package = Package.read(path)
    package.save(tmp_path / "copy.xlsx", {})
    assert (tmp_path / "copy.xlsx").read_bytes() == path.read_bytes()
    assert sorted(p.name for p in tmp_path.iterdir()) == ["book.xlsx", "copy.xlsx"]
