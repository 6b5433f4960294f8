"""The old binary format (.xls): what its container says before any program is asked to read it.

The container (a file of sectors with a table of chains) is walked under limits, its directory and the globals
of the workbook are looked at; nothing else is read here. LibreOffice turns the file into an .xlsx, and that goes
through the gate like any other. Standard library only.
"""

import hashlib
import os
import re
import struct
from collections.abc import Iterator
from dataclasses import dataclass, field

from sheetcal.errors import BadInput, Refused
from sheetcal.excel import gate

MAGIC = b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1"
EXPECTED = "a workbook (.xlsx, .ods or .xls)"
_LAST = 0xFFFFFFFA  # sector numbers from here on are signs, not sectors
_MAX_ENTRIES = 4_096
_MAX_RECORDS = 200_000
_FREE, _STORAGE, _STREAM, _ROOT = 0, 1, 2, 5
_BOF, _EOF, _FILEPASS, _SHEET, _BOOK = 0x0809, 0x000A, 0x002F, 0x0085, 0x01AE
_MACROS = re.compile(r"_VBA_PROJECT(_CUR)?|VBA|Macros", re.IGNORECASE)
_EMBEDDED = re.compile(r"MBD[0-9A-F]+|ObjectPool|Ole10Native|\x01Ole10Native", re.IGNORECASE)
_INSIDE = (0x0401, 0x3A01)  # the workbook itself, and functions of add-ins
_MACRO_SHEETS = (1, 6)  # types of a sheet that hold code


@dataclass
class OldFile:
    """A file in the old format that may be handed on: its name for messages, its hash, facts as in SheetFile."""

    where: str
    sha256: str
    extras: dict[str, list[str]] = field(default_factory=dict)

    def note(self, sort: str, fact: str) -> None:
        """Add one fact."""
        self.extras.setdefault(sort, []).append(fact)


def is_old(path: "str | os.PathLike[str]") -> bool:
    """Tell whether a file begins as the old format does; what cannot be read does not."""
    try:
        if not os.path.isfile(path):
            return False
        with open(path, "rb") as stream:
            return stream.read(len(MAGIC)) == MAGIC
    except (OSError, ValueError):
        return False


def look(path: "str | os.PathLike[str]") -> OldFile:
    """Look a file in the old format over. Raises BadInput or Refused, one line each."""
    where = os.path.basename(os.fspath(path))
    raw = gate.bytes_of(path, where)
    container = _Container(raw, where)
    found = OldFile(where, hashlib.sha256(raw).hexdigest())
    entries = list(container.entries())
    names = {name for name, _, _, _ in entries}
    if "EncryptedPackage" in names or "EncryptionInfo" in names:
        raise _encrypted(where)
    for name, kind, _, _ in entries:
        if kind == _STORAGE and _MACROS.fullmatch(name):
            found.note("macros", name)
        elif _EMBEDDED.fullmatch(name):
            found.note("embedded", name)
    _globals(container.stream(entries, ("Workbook", "Book")), found)
    return found


def _encrypted(where: str) -> Refused:
    return Refused(where, "the workbook is encrypted", EXPECTED, "Save it without a password.")


def _cut(where: str) -> BadInput:
    return BadInput(where, "the file is damaged or cut short", "a whole workbook", "Ask for the file again.")


Entry = tuple[str, int, int, int]  # name, type, first sector, size


class _Container:
    """Sectors, chains and directory of one file; every chain is walked once around at most."""

    def __init__(self, raw: bytes, where: str) -> None:
        if len(raw) < 1536 or raw[28:30] != b"\xfe\xff":
            raise _cut(where)
        self._raw, self._where = raw, where
        shift, mini_shift = struct.unpack_from("<2H", raw, 30)
        if (shift, mini_shift) not in ((9, 6), (12, 6)):
            raise _cut(where)
        self._size = 1 << shift
        self._count = max(0, len(raw) // self._size - 1) + 1
        tables, self._directory, _, self._cutoff, self._mini, _, more = struct.unpack_from("<7I", raw, 44)
        self._next = self._table(tables, more)

    def _sector(self, number: int) -> bytes:
        start = (number + 1) * self._size
        if number >= self._count or start >= len(self._raw):
            raise _cut(self._where)
        return self._raw[start : start + self._size]

    def _table(self, tables: int, more: int) -> list[int]:
        """For each sector the next of its chain."""
        homes = [one for one in struct.unpack_from("<109I", self._raw, 76) if one < _LAST]
        seen = 0
        while more < _LAST:
            listed = struct.unpack(f"<{self._size // 4}I", self._sector(more).ljust(self._size, b"\xff"))
            homes += [one for one in listed[:-1] if one < _LAST]
            more, seen = listed[-1], seen + 1
            if seen > self._count:
                raise _cut(self._where)
        if len(homes) > self._count or len(homes) < tables:
            raise _cut(self._where)
        data = b"".join(self._sector(one).ljust(self._size, b"\xff") for one in homes)
        return list(struct.unpack(f"<{len(data) // 4}I", data))

    def _chain(self, first: int, following: list[int]) -> Iterator[int]:
        """The numbers of a chain. Raises BadInput for one that leads in a circle or out of the file."""
        for _ in range(len(following) + 1):
            if first >= _LAST:
                return
            if first >= len(following):
                break
            yield first
            first = following[first]
        raise _cut(self._where)

    def _data(self, first: int) -> bytes:
        return b"".join(self._sector(one) for one in self._chain(first, self._next))

    def entries(self) -> Iterator[Entry]:
        """The directory's entries."""
        data = self._data(self._directory)
        if len(data) > 128 * _MAX_ENTRIES:
            raise Refused(self._where, f"holds more than {_MAX_ENTRIES} parts", "a worksheet")
        for at in range(0, len(data) - 127, 128):
            length, kind = struct.unpack_from("<HB", data, at + 64)
            if kind != _FREE and 2 <= length <= 64:
                name = data[at : at + length - 2].decode("utf-16-le", "replace")
                first, size = struct.unpack_from("<2I", data, at + 116)
                yield name, kind, first, size

    def stream(self, entries: list[Entry], names: tuple[str, ...]) -> bytes:
        """The content of the first stream of these names. Raises BadInput where there is none."""
        found = [one for name in names for one in entries if one[0].lower() == name.lower() and one[1] == _STREAM]
        if not found:
            raise BadInput(self._where, "is an office document, but not a workbook", EXPECTED, "Send the workbook.")
        _, _, first, size = found[0]
        data = self._data(first) if size >= self._cutoff else self._small(entries, first)
        if len(data) < size:
            raise _cut(self._where)
        return data[:size]

    def _small(self, entries: list[Entry], first: int) -> bytes:
        """A stream below the cut-off lies in pieces of 64 bytes within the root's stream."""
        root = next((one for one in entries if one[1] == _ROOT), None)
        if root is None:
            raise _cut(self._where)
        body, listed = self._data(root[2]), self._data(self._mini)
        following = list(struct.unpack(f"<{len(listed) // 4}I", listed[: len(listed) // 4 * 4]))
        return b"".join(body[64 * one : 64 * one + 64] for one in self._chain(first, following))


def _records(data: bytes, where: str) -> Iterator[tuple[int, bytes]]:
    """(type, content) of the records of the workbook's globals: from its beginning to the first end mark."""
    at = 0
    for _ in range(_MAX_RECORDS):
        if at + 4 > len(data):
            break
        kind, length = struct.unpack_from("<2H", data, at)
        if at + 4 + length > len(data) or (at == 0 and kind != _BOF):
            break
        if kind == _EOF:
            return
        yield kind, data[at + 4 : at + 4 + length]
        at += 4 + length
    raise _cut(where)


def _globals(data: bytes, found: OldFile) -> None:
    """Refuse what is encrypted; note sheets of macros and other workbooks that formulas name."""
    for kind, content in _records(data, found.where):
        if kind == _FILEPASS:
            raise _encrypted(found.where)
        if kind == _SHEET and len(content) > 6 and content[5] in _MACRO_SHEETS:
            found.note("macros", "a sheet of macros")
        elif kind == _BOOK and struct.unpack_from("<H", content.ljust(4, b"\0"), 2)[0] not in _INSIDE:
            found.note("external_links", gate.shown(content[4:].decode("latin-1")))
