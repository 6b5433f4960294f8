"""The gate: what a submitted file must satisfy before anything in it is parsed.

The file is read once into memory, its zip directory is checked by hand (no archive library is asked to
believe it), every part that may hold XML is unpacked under limits and screened, and only then a reader may
see the parts. Refusals are `Refused`; a file that is no workbook at all is `BadInput`. Standard library only.
"""

import hashlib
import os
import re
import stat
import struct
import zlib
from collections.abc import Callable, Iterator
from dataclasses import dataclass, field
from xml.parsers import expat

from sheetcal.errors import BadInput, Refused, printable
from sheetcal.excel.allowance import Allowance

MIB = 1 << 20
MAX_FILE = 32 * MIB
MAX_DIRECTORY = MIB
MAX_MEMBERS = 2_000
MAX_PART = 16 * MIB
MAX_TOTAL = 64 * MIB
MAX_RATIO = 150  # a sheet of empty styled cells packs 10 to 40 fold, a bomb 500 to 1000 fold
RATIO_COUNTS_FROM = MIB
MAX_MARKUP = 2_000_000  # "<" in all parts together; bounds the time of every pass
MAX_DEPTH = 100
MAX_PIECE = MIB  # bytes from one "<" to the next: a text, or a tag with its attributes
MAX_DIFFERENT = 5_000  # names of elements and attributes in one part; a parser keeps each of them
MAX_WRITTEN_OUT = 2 * MIB  # characters of shared formulas, written out cell by cell
MAX_ROW = 99_999  # what a filled or formatted cell may use; five digits and two letters, so that a
MAX_COLUMN = 702  # pattern can hold the limit by itself
MAX_CELLS = 200_000
MAX_AREA = 200_000  # cells under all merges, or under all hyperlinks, of one tab

_BINARY = frozenset(["png", "jpg", "jpeg", "gif", "bmp", "tif", "tiff", "emf", "wmf", "wdp", "bin", "ttf", "odttf"])
_NOT_KEPT = re.compile(r"xl/(charts|drawings|theme|media)/|object[^/]*/|pictures/|thumbnails/|configurations2/")
_ENCODING = re.compile(rb"<\?xml[^>]{0,200}?encoding\s*=\s*[\"']([^\"']{0,40})[\"']")
# Every name is spelled with its namespace when it is read: a long one, used often, would fill memory.
_LONG_NAMESPACE = re.compile(rb"xmlns(?::[^\s=\"'<>]*+)?\s*+=\s*+(?:\"[^\"]{300}|'[^']{300})")
_SLICE = 256 * 1024  # bytes given to a parser at once
_ODD_NAME = re.compile(r"^/|^[A-Za-z]:|\\|(^|/)\.{1,2}(/|$)|//|[\x00-\x1f\x7f]|^$")

Start = Callable[[str, "dict[str, str]"], None]
End = Callable[[str], None]
Text = Callable[[str], None]


@dataclass(frozen=True)
class Member:
    """One entry of the zip directory; `start` is where its packed bytes begin in the file."""

    name: str
    method: int
    crc: int
    packed: int
    size: int
    header: int
    start: int


@dataclass
class Package:
    """A file that passed the gate: its name for messages, its hash, its parts by lower-case name."""

    where: str
    raw: bytes
    sha256: str
    members: dict[str, Member]
    kept: dict[str, bytes] = field(default_factory=dict)
    allowance: Allowance = field(init=False)

    def __post_init__(self) -> None:
        self.allowance = Allowance(self.where)

    def has(self, name: str) -> bool:
        """Tell whether the part is there."""
        return name.lower() in self.members

    def xml(self, name: str) -> bytes:
        """Return a screened XML part. Raises Refused when it is missing."""
        key = name.lower()
        if key in self.kept:
            return self.kept[key]
        if key not in self.members:
            raise Refused(self.where, f"part {shown(name)} is missing", "a whole workbook", "Save it again.")
        data = unpack(self.raw, self.members[key], self.where)
        screen(data, name, self.where)
        if data.count(b"<") > MAX_MARKUP:
            raise _too_much(self.where)
        return data

    def names(self) -> Iterator[str]:
        """Yield the part names as written."""
        return (member.name for member in self.members.values())


def shown(text: str) -> str:
    """Return foreign text fit for a one-line message: printable, at most 60 characters."""
    cut = text if len(text) <= 60 else text[:57] + "..."
    return printable(cut)


def admit(path: "str | os.PathLike[str]") -> Package:
    """Read a file and let it through the gate. Raises BadInput or Refused, one line each."""
    where = os.path.basename(os.fspath(path)) or os.fspath(path)
    raw = bytes_of(path, where)
    _refuse_other_kinds(raw, where)
    members = _directory(raw, where)
    _refuse_sizes(members, where)
    package = Package(where, raw, hashlib.sha256(raw).hexdigest(), _by_name(members, where))
    _screen_all(package)
    return package


def bytes_of(path: "str | os.PathLike[str]", where: str) -> bytes:
    """Return the bytes of a regular file below the limit; devices and pipes are never opened."""
    try:
        mode = os.stat(path).st_mode
        if stat.S_ISDIR(mode):
            raise BadInput(where, "is a folder", "a workbook file")
        if not stat.S_ISREG(mode):
            raise BadInput(where, "is not an ordinary file", "a workbook file")
        with open(path, "rb") as stream:
            raw = stream.read(MAX_FILE + 1)
    except FileNotFoundError:
        raise BadInput(where, "no such file", "a workbook file", "Correct the path.") from None
    except (OSError, ValueError) as error:
        raise BadInput(where, f"cannot be read ({getattr(error, 'strerror', None) or error})") from None
    if len(raw) > MAX_FILE:
        raise Refused(where, "the file is too large", f"at most {MAX_FILE // MIB} MiB")
    return raw


def _refuse_other_kinds(raw: bytes, where: str) -> None:
    """Say what a file is that does not begin as a zip."""
    if raw.startswith(b"PK\3\4"):
        return
    expected = "a workbook (.xlsx or .ods)"
    if not raw:
        raise BadInput(where, "the file is empty", expected, "Ask for the file again.")
    if raw.startswith(b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1"):
        if "EncryptedPackage".encode("utf-16-le") in raw:
            raise Refused(where, "the workbook is encrypted", expected, "Save it without a password.")
        raise Refused(where, "is in the old binary format (.xls)", expected, "Save it as .xlsx.")
    if b"%PDF-" in raw[:1024]:
        raise BadInput(where, "is a PDF document, not a workbook", expected, "Send the workbook itself.")
    if raw.lstrip()[:1] == b"<":
        raise BadInput(where, "is a markup text (HTML or XML), not a workbook", expected, "Save it as .xlsx.")
    raise BadInput(where, "is not a workbook", expected, "Send the workbook itself.")


def _cut(where: str) -> BadInput:
    return BadInput(where, "the file is damaged or cut short", "a whole workbook", "Ask for the file again.")


def _end_record(raw: bytes, where: str) -> tuple[int, int, int]:
    """Return count, size and offset of the zip directory; it must end exactly at its end record."""
    at = raw.rfind(b"PK\5\6", max(0, len(raw) - 65_557))
    if at < 0 or at + 22 > len(raw):
        raise _cut(where)
    disk, disk_cd, here, count, size, offset, comment = struct.unpack_from("<4H2IH", raw, at + 4)
    if 0xFFFF in (here, count) or 0xFFFFFFFF in (size, offset):
        raise Refused(where, "uses the zip format for very large files", "an ordinary workbook", "Save it again.")
    if disk or disk_cd or here != count or offset + size != at or at + 22 + comment != len(raw):
        raise _cut(where)
    if count > MAX_MEMBERS or size > MAX_DIRECTORY:
        raise Refused(where, f"holds {count} parts", f"at most {MAX_MEMBERS}")
    return count, size, offset


def _directory(raw: bytes, where: str) -> list[Member]:
    """Read the zip directory and hold every entry against its local header."""
    count, size, at = _end_record(raw, where)
    end = at + size
    first = at
    members = []
    for _ in range(count):
        if at + 46 > end or raw[at : at + 4] != b"PK\1\2":
            raise _cut(where)
        flags, method, _, _, crc, packed, full, name, extra, comment = struct.unpack_from("<4H3I3H", raw, at + 8)
        header = struct.unpack_from("<I", raw, at + 42)[0]
        title = raw[at + 46 : at + 46 + name]
        if flags & 0x41:
            raise Refused(where, "the workbook is encrypted", "a workbook without password")
        if method not in (0, 8):
            raise Refused(where, f"is packed by method {method}", "an ordinary zip (stored or deflated)")
        start = _data_start(raw, header, title, first, where)
        members.append(Member(_decoded(title, flags), method, crc, packed, full, header, start))
        at += 46 + name + extra + comment
    if at != end:
        raise _cut(where)
    _refuse_overlap(members, first, where)
    return members


def _decoded(title: bytes, flags: int) -> str:
    """Return a member name; the zip says by a flag whether it is UTF-8."""
    return title.decode("utf-8" if flags & 0x800 else "cp437", "replace")


def _data_start(raw: bytes, header: int, title: bytes, first: int, where: str) -> int:
    """Return where the packed bytes begin; the local header must carry the directory's name."""
    if header + 30 > first or raw[header : header + 4] != b"PK\3\4":
        raise _cut(where)
    name, extra = struct.unpack_from("<2H", raw, header + 26)
    if raw[header + 30 : header + 30 + name] != title:
        raise Refused(where, "two names are given for one part of the file", "a workbook as saved by a program")
    return int(header + 30 + name + extra)


def _refuse_overlap(members: list[Member], first: int, where: str) -> None:
    """Refuse parts that share bytes: one packed block counted many times is a bomb."""
    ordered = sorted(members, key=lambda member: member.header)
    limits = [member.header for member in ordered[1:]] + [first]
    for member, limit in zip(ordered, limits, strict=True):
        if member.start + member.packed > limit:
            raise Refused(where, f"part {shown(member.name)} overlaps another", "a workbook as saved by a program")


def _refuse_sizes(members: list[Member], where: str) -> None:
    """Refuse by the sizes the directory states; unpacking never goes beyond them."""
    for member in members:
        if member.size > MAX_PART:
            raise Refused(
                where,
                f"part {shown(member.name)} unpacks to {member.size // MIB} MiB",
                f"at most {MAX_PART // MIB} MiB",
            )
        if member.size > RATIO_COUNTS_FROM and member.size > MAX_RATIO * max(member.packed, 1):
            raise Refused(
                where,
                f"part {shown(member.name)} is packed {member.size // max(member.packed, 1)} fold",
                f"at most {MAX_RATIO} fold",
            )
    total = sum(member.size for member in members)
    if total > MAX_TOTAL:
        raise Refused(where, f"unpacks to {total // MIB} MiB", f"at most {MAX_TOTAL // MIB} MiB")


def _by_name(members: list[Member], where: str) -> dict[str, Member]:
    """Return the members by lower-case name; odd and doubled names are refused."""
    found: dict[str, Member] = {}
    for member in members:
        if _ODD_NAME.search(member.name.removesuffix("/")) or "\ufffd" in member.name:
            raise Refused(where, f"holds a part with the odd name {shown(member.name)}", "plain relative names")
        key = member.name.lower()
        if key in found:
            raise Refused(where, f"holds the part {shown(member.name)} twice", "each part once")
        found[key] = member
    return found


def unpack(raw: bytes, member: Member, where: str) -> bytes:
    """Unpack one member, never beyond its stated size. Raises BadInput when size or checksum differ."""
    packed = raw[member.start : member.start + member.packed]
    data = packed
    if member.method == 8:
        try:
            data = zlib.decompressobj(-15).decompress(packed, member.size + 1)
        except zlib.error:
            raise _cut(where) from None
    if len(data) != member.size or zlib.crc32(data) != member.crc:
        raise _cut(where)
    return data


def screen(data: bytes, name: str, where: str) -> None:
    """Refuse XML that is not UTF-8 or that declares a document type.

    The byte search for DOCTYPE is exact because every other encoding is refused first.
    """
    if data[:2] in (b"\xff\xfe", b"\xfe\xff") or b"\0" in data:
        raise Refused(where, f"part {shown(name)} is not written in UTF-8", "UTF-8", "Save it again.")
    stated = _ENCODING.match(data.removeprefix(b"\xef\xbb\xbf"))
    if stated and stated.group(1).lower() not in (b"utf-8", b"us-ascii", b"ascii"):
        raise Refused(where, f"part {shown(name)} is not written in UTF-8", "UTF-8", "Save it again.")
    for at in range(0, len(data) - MAX_PIECE, MAX_PIECE // 2):
        if data.find(b"<", at, at + MAX_PIECE // 2) < 0:
            limit = f"less than {MAX_PIECE} bytes"
            raise Refused(where, f"part {shown(name)} holds one text or tag that is too long", limit)
    if b"<!DOCTYPE" in data:
        raise Refused(where, f"part {shown(name)} declares a document type (DOCTYPE)", "a plain workbook")
    if _LONG_NAMESPACE.search(data):
        raise Refused(where, f"part {shown(name)} names a namespace that is too long", "a plain workbook")


def _screen_all(package: Package) -> None:
    """Unpack and screen every part that may hold XML; keep those a reader wants."""
    markup = 0
    for key, member in package.members.items():
        if key.rpartition(".")[2] in _BINARY or not member.size:
            continue
        data = unpack(package.raw, member, package.where)
        if not _may_be_xml(data):
            continue
        screen(data, member.name, package.where)
        markup += data.count(b"<")
        if markup > MAX_MARKUP:
            raise _too_much(package.where)
        if not _NOT_KEPT.match(key):
            package.kept[key] = data


def _may_be_xml(data: bytes) -> bool:
    """Tell whether a part begins like XML in any encoding a parser knows without being told."""
    return data[:64].lstrip(b"\xef\xbb\xbf\xff\xfe\0 \t\r\n")[:1] == b"<"


def _too_much(where: str) -> Refused:
    return Refused(where, f"holds more than {MAX_MARKUP} marks of XML", "a worksheet", "Send the sheet alone.")


def walk(
    data: "bytes | str",
    part: str,
    where: str,
    start: Start,
    end: "End | None" = None,
    text: "Text | None" = None,
) -> None:
    """Pass once over an XML part. Element names come as "namespace local"; nesting is bounded.

    Raises Refused for XML that is not well formed, or nested deeper than MAX_DEPTH.
    """
    parser = expat.ParserCreate(namespace_separator=" ")
    parser.buffer_text = True
    depth = 0

    def opened(name: str, attributes: dict[str, str]) -> None:
        nonlocal depth
        depth += 1
        if depth > MAX_DEPTH:
            raise Refused(where, f"part {shown(part)} is nested deeper than {MAX_DEPTH} levels", "a plain workbook")
        start(name, attributes)

    def closed(name: str) -> None:
        nonlocal depth
        depth -= 1
        if end is not None:
            end(name)

    parser.StartElementHandler = opened
    parser.EndElementHandler = closed
    parser.CharacterDataHandler = text
    parse(parser, data, part, where)


def parse(parser: expat.XMLParserType, data: "bytes | str", part: str, where: str) -> None:
    """Run a prepared parser over a part; DOCTYPE, malformed XML and names without end are refused.

    The part is given in slices: a parser stops at the end of what it was given, not where a handler refused.
    """

    def doctype(*_: object) -> None:
        raise Refused(where, f"part {shown(part)} declares a document type (DOCTYPE)", "a plain workbook")

    parser.StartDoctypeDeclHandler = doctype
    try:
        for at in range(0, len(data), _SLICE):
            parser.Parse(data[at : at + _SLICE], False)
            if len(parser.intern) > MAX_DIFFERENT:
                raise Refused(where, f"part {shown(part)} uses more than {MAX_DIFFERENT} names of XML", "a worksheet")
        parser.Parse(b"", True)
    except expat.ExpatError as error:
        raise Refused(
            where,
            f"part {shown(part)} is not well-formed XML ({error})",
            "a whole workbook",
            "Save it again.",
        ) from None
