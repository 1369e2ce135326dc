"""A zip file whose members are replaced without touching the others.

The standard library can read a zip and write a new one, but it cannot carry a
member over as it lies in the file. Here every member that is not replaced is
copied with its local header, its compressed bytes and its directory record, so
order, names, dates, attributes and compression stay as they were.
"""

from __future__ import annotations

import io
import struct
import zipfile
import zlib
from collections.abc import Iterator, Mapping
from dataclasses import dataclass

from .refusals import Refusal

MAX_FILE = 2 * 1024**3
MAX_UNPACKED = 2 * 1024**3
# Deflate reaches about 1000 to 1. Sheets of real work stay below 50; the ratio is
# looked at only when there is enough to unpack to matter.
MAX_RATIO = 250
RATIO_MATTERS = 200 * 1024**2
# Spreadsheet programs write with a fast setting too; a sheet part is large and regular.
LEVEL = 3

STORED, DEFLATED = 0, 8
ENCRYPTED_FLAG, DESCRIPTOR_FLAG = 0x1, 0x8
_LOCAL = struct.Struct("<4s5H3I2H")
_CENTRAL = struct.Struct("<4s6H3I5H2I")
_END = struct.Struct("<4s4H2IH")
_DATE_1980 = 0x21
_ZIP64 = 1


@dataclass(frozen=True, slots=True)
class Member:
    """One member: its directory record, and where its bytes lie in the file."""

    name: str
    record: bytes
    start: int
    data: int
    stop: int
    packed: int
    size: int
    crc: int
    method: int
    encrypted: bool


def part_key(name: str) -> str:
    """Part names are equal when they differ in case only; some writers use a backslash."""
    return name.replace("\\", "/").lstrip("/").casefold()


class ZipArchive:
    """The members of a zip file held in memory, in the order of its directory."""

    def __init__(self, raw: bytes, label: str) -> None:
        self._raw = raw
        self._label = label
        try:
            with zipfile.ZipFile(io.BytesIO(raw)) as archive:
                infos = archive.infolist()
                directory = archive.start_dir
                self._comment = archive.comment
            self.members = self._members(infos, directory)
        except (zipfile.BadZipFile, struct.error, ValueError, EOFError, NotImplementedError) as error:
            raise self._damaged(str(error)) from error
        self._by_key: dict[str, Member] = {}
        for member in self.members:
            if part_key(member.name) in self._by_key:
                raise self._damaged(f"two parts are named {member.name}")
            self._by_key[part_key(member.name)] = member
        self._bound()

    def _damaged(self, detail: str) -> Refusal:
        return Refusal(
            f"{self._label} is damaged ({detail}). Nothing was changed. "
            "Open it in the spreadsheet program, let it repair the file and save it, or use a backup."
        )

    def _members(self, infos: list[zipfile.ZipInfo], directory: int) -> list[Member]:
        raw = self._raw
        starts = sorted({info.header_offset for info in infos})
        if len(starts) != len(infos):
            raise ValueError("members of the zip lie over each other")
        stops = dict(zip(starts, [*starts[1:], directory], strict=True))
        members = []
        at = directory
        for info in infos:
            fields = _CENTRAL.unpack_from(raw, at)
            end = at + _CENTRAL.size + fields[10] + fields[11] + fields[12]
            record = raw[at:end]
            name = record[_CENTRAL.size : _CENTRAL.size + fields[10]]
            at = end
            start = info.header_offset
            local = _LOCAL.unpack_from(raw, start)
            data = start + _LOCAL.size + local[9] + local[10]
            if fields[0] != b"PK\x01\x02" or local[0] != b"PK\x03\x04":
                raise ValueError(f"the header of {info.filename} is not where the directory says")
            if raw[start + _LOCAL.size : start + _LOCAL.size + local[9]] != name:
                raise ValueError(f"the header of {info.filename} bears another name")
            if data + info.compress_size > stops[start]:
                raise ValueError(f"{info.filename} is cut short or runs into the next member")
            members.append(
                Member(
                    info.filename,
                    record,
                    start,
                    data,
                    stops[start],
                    info.compress_size,
                    info.file_size,
                    info.CRC,
                    info.compress_type,
                    bool(info.flag_bits & ENCRYPTED_FLAG),
                )
            )
        return members

    def _bound(self) -> None:
        """Refuse what would unpack to an unreasonable size, from the directory alone."""
        unpacked = sum(member.size for member in self.members)
        too_big = unpacked > MAX_UNPACKED
        if too_big or (unpacked > RATIO_MATTERS and unpacked > MAX_RATIO * len(self._raw)):
            limit = f"{MAX_UNPACKED / 1e9:.1f} GB" if too_big else f"{MAX_RATIO} times"
            raise Refusal(
                f"{self._label} would unpack to {unpacked / 1e9:.1f} GB from {len(self._raw) / 1e6:.1f} MB; "
                f"the limit is {limit}, and such a file is most likely made to exhaust the memory. "
                "If it is yours, save it again in the spreadsheet program."
            )

    def names(self) -> list[str]:
        """Member names in the order of the directory."""
        return [member.name for member in self.members]

    def has(self, name: str) -> bool:
        """Whether there is a member of that name; case does not count."""
        return part_key(name) in self._by_key

    def read(self, name: str) -> bytes:
        """The unpacked bytes of one member. KeyError when there is none."""
        member = self._by_key[part_key(name)]
        if member.encrypted:
            raise Refusal(
                f"{self._label} holds parts locked with a zip password. Unpack it and save it without one."
            )
        packed = self._raw[member.data : member.data + member.packed]
        if member.method == STORED:
            content = packed
        elif member.method == DEFLATED:
            unpacker = zlib.decompressobj(-zlib.MAX_WBITS)
            try:
                # One byte more than promised shows a directory that lies about the size.
                content = unpacker.decompress(packed, member.size + 1)
                if not unpacker.eof:
                    content += unpacker.decompress(unpacker.unconsumed_tail, 1)
            except zlib.error as error:
                raise self._damaged(f"{member.name}: {error}") from error
        else:
            raise self._damaged(f"{member.name} is packed by method {member.method}, not by deflate")
        if len(content) != member.size or zlib.crc32(content) != member.crc:
            raise self._damaged(f"the content of {member.name} does not agree with its checksum")
        return content

    def written(self, replaced: Mapping[str, bytes], added: Mapping[str, bytes]) -> Iterator[bytes]:
        """The pieces of a new file with some members replaced and some added at the end.

        Raises KeyError for a replaced member that is not there, ValueError for an
        added one that is.
        """
        new = {}
        for name, content in replaced.items():
            if not self.has(name):
                raise KeyError(f"{name} is not in the package, so it cannot be replaced")
            new[part_key(name)] = content
        for name in added:
            if self.has(name):
                raise ValueError(f"{name} is already in the package")
        in_file = sorted(self.members, key=lambda member: member.start)
        records: dict[int, bytes] = {}
        prefix = self._raw[: in_file[0].start]
        yield prefix
        at = len(prefix)
        view = memoryview(self._raw)
        for member in in_file:
            changed = new.get(part_key(member.name))
            if changed is None:
                yield bytes(view[member.start : member.stop])
                records[member.start] = _moved(member.record, at)
                at += member.stop - member.start
            else:
                head, packed, records[member.start] = _repacked(self._raw, member, changed, at)
                yield head
                yield packed
                at += len(head) + len(packed)
        directory = [records[member.start] for member in self.members]
        for name, content in added.items():
            head, packed, record = _fresh(name, content, at)
            yield head
            yield packed
            directory.append(record)
            at += len(head) + len(packed)
        size = sum(len(record) for record in directory)
        if at + size > 0xFFFFFFFE or len(directory) > 0xFFFE:
            raise Refusal(f"{self._label} would grow beyond 4 GB or 65534 parts. Nothing was changed.")
        yield from directory
        count = len(directory)
        yield _END.pack(b"PK\x05\x06", 0, 0, count, count, size, at, len(self._comment)) + self._comment


def _deflate(content: bytes, method: int) -> bytes:
    if method == STORED:
        return content
    packer = zlib.compressobj(LEVEL, zlib.DEFLATED, -zlib.MAX_WBITS)
    return packer.compress(content) + packer.flush()


def _extras(extra: bytes) -> Iterator[tuple[int, int, int]]:
    """(tag, start of data, length) of each extra field."""
    at = 0
    while at + 4 <= len(extra):
        tag, length = struct.unpack_from("<HH", extra, at)
        yield tag, at + 4, length
        at += 4 + length


def _without_zip64(extra: bytes) -> bytes:
    for tag, start, length in _extras(extra):
        if tag == _ZIP64:
            return extra[: start - 4] + extra[start + length :]
    return extra


def _moved(record: bytes, offset: int) -> bytes:
    """A directory record for the same member at another place in the file."""
    fields = list(_CENTRAL.unpack_from(record))
    if fields[16] != 0xFFFFFFFF:
        fields[16] = offset
        return _CENTRAL.pack(*fields) + record[_CENTRAL.size :]
    at = _CENTRAL.size + fields[10]
    for tag, start, _ in _extras(record[at : at + fields[11]]):
        if tag == _ZIP64:
            # Sizes come first, each only when its own field is full.
            place = at + start + 8 * sum(size == 0xFFFFFFFF for size in (fields[8], fields[9]))
            return record[:place] + struct.pack("<Q", offset) + record[place + 8 :]
    raise ValueError("a directory record has no offset")


def _repacked(raw: bytes, member: Member, content: bytes, offset: int) -> tuple[bytes, bytes, bytes]:
    """Local header, data and directory record of a member with new content."""
    method = STORED if member.method == STORED else DEFLATED
    packed = _deflate(content, method)
    crc = zlib.crc32(content)
    local = list(_LOCAL.unpack_from(raw, member.start))
    names_at = member.start + _LOCAL.size
    name = raw[names_at : names_at + local[9]]
    extra = _without_zip64(raw[names_at + local[9] : member.data])
    local[2] &= ~DESCRIPTOR_FLAG
    local[3] = method
    local[6:] = [crc, len(packed), len(content), len(name), len(extra)]
    fields = list(_CENTRAL.unpack_from(member.record))
    tail = member.record[_CENTRAL.size + fields[10] :]
    central_extra = _without_zip64(tail[: fields[11]])
    tail = central_extra + tail[fields[11] :]
    fields[3] &= ~DESCRIPTOR_FLAG
    fields[4] = method
    fields[7:10] = [crc, len(packed), len(content)]
    fields[11] = len(central_extra)
    fields[16] = offset
    return _LOCAL.pack(*local) + name + extra, packed, _CENTRAL.pack(*fields) + name + tail


def _fresh(name: str, content: bytes, offset: int) -> tuple[bytes, bytes, bytes]:
    """Local header, data and directory record of a new member."""
    packed = _deflate(content, DEFLATED)
    raw_name = name.encode()
    flags = 0 if name.isascii() else 0x800
    shared = (20, flags, DEFLATED, 0, _DATE_1980, zlib.crc32(content), len(packed), len(content))
    head = _LOCAL.pack(b"PK\x03\x04", *shared, len(raw_name), 0) + raw_name
    record = _CENTRAL.pack(b"PK\x01\x02", 20, *shared, len(raw_name), 0, 0, 0, 0, 0, offset) + raw_name
    return head, packed, record
