"""Files that a gate must stop: attacks and damage built from scratch, with the words the refusal must hold.

All content is invented. `hostile_files(folder)` writes them and yields (path, words).
"""

import random
import struct
import zlib
from collections.abc import Iterator
from pathlib import Path

MAIN = "http://schemas.openxmlformats.org/spreadsheetml/2006/main"
REL = "http://schemas.openxmlformats.org/officeDocument/2006/relationships"
PACKAGE_REL = "http://schemas.openxmlformats.org/package/2006/relationships"
ODF = "urn:oasis:names:tc:opendocument:xmlns:"
SHEET = "xl/worksheets/sheet1.xml"
SPREADSHEET = b"application/vnd.oasis.opendocument.spreadsheet"
LAUGHS = (
    '<!DOCTYPE l [<!ENTITY a "ha"><!ENTITY b "&a;&a;&a;&a;&a;&a;&a;&a;"><!ENTITY c "&b;&b;&b;&b;&b;&b;&b;&b;">'
    '<!ENTITY d "&c;&c;&c;&c;&c;&c;&c;&c;"><!ENTITY e "&d;&d;&d;&d;&d;&d;&d;&d;">]>'
)
OUTSIDE = '<!DOCTYPE w [<!ENTITY x SYSTEM "file:///etc/hostname">]>'


def relations(*entries: str) -> str:
    """Return a .rels part; an entry is `id type target [mode]`."""
    lines = [f'<Relationships xmlns="{PACKAGE_REL}">']
    for entry in entries:
        key, kind, target, *mode = entry.split()
        extra = f' TargetMode="{mode[0]}"' if mode else ""
        lines.append(f'<Relationship Id="{key}" Type="{REL}/{kind}" Target="{target}"{extra}/>')
    return "".join([*lines, "</Relationships>"])


def worksheet(rows: str, tail: str = "", head: str = "") -> str:
    """Return a worksheet part."""
    return (
        f'<?xml version="1.0" encoding="UTF-8"?>\n{head}<worksheet xmlns="{MAIN}" xmlns:r="{REL}">'
        f"<sheetData>{rows}</sheetData>{tail}</worksheet>"
    )


def xlsx(rows: str = '<row r="1"><c r="A1"><v>1</v></c></row>', tail: str = "", **more: str) -> dict[str, bytes]:
    """Return the parts of a small workbook; `more` replaces parts by role."""
    parts = {
        "[Content_Types].xml": '<Types xmlns="http://schemas.openxmlformats.org/package/2006/content-types"/>',
        "_rels/.rels": relations("r1 officeDocument xl/workbook.xml"),
        "xl/workbook.xml": f'<workbook xmlns="{MAIN}" xmlns:r="{REL}"><sheets>'
        '<sheet name="Front" sheetId="1" r:id="r1"/></sheets></workbook>',
        "xl/_rels/workbook.xml.rels": relations(
            "r1 worksheet worksheets/sheet1.xml", "r2 styles styles.xml", "r3 sharedStrings sharedStrings.xml"
        ),
        "xl/styles.xml": f'<styleSheet xmlns="{MAIN}"><cellXfs><xf numFmtId="0"/><xf numFmtId="14"/></cellXfs>'
        "</styleSheet>",
        "xl/sharedStrings.xml": f'<sst xmlns="{MAIN}"><si><t>one</t></si><si><t>two</t></si></sst>',
        SHEET: worksheet(rows, tail),
    }
    roles = {
        "sheet": SHEET,
        "workbook": "xl/workbook.xml",
        "styles": "xl/styles.xml",
        "strings": "xl/sharedStrings.xml",
        "relations": "xl/_rels/workbook.xml.rels",
    }
    parts.update({roles[role]: text for role, text in more.items()})
    return {name: text.encode() for name, text in parts.items()}


def ods(table: str, head: str = "", kind: bytes = SPREADSHEET) -> dict[str, bytes]:
    """Return the parts of a small OpenDocument spreadsheet with one tab."""
    spaces = " ".join(f'xmlns:{name}="{ODF}{name}:1.0"' for name in ("office", "table", "text", "style"))
    calcext = "urn:org:documentfoundation:names:experimental:calc:xmlns:calcext:1.0"
    content = (
        f'<?xml version="1.0" encoding="UTF-8"?>{head}<office:document-content {spaces} xmlns:calcext="{calcext}">'
        f'<office:body><office:spreadsheet><table:table table:name="Front">{table}</table:table>'
        "</office:spreadsheet></office:body></office:document-content>"
    )
    return {"mimetype": kind, "content.xml": content.encode()}


def ods_cell(attributes: str, inside: str = "") -> str:
    """Return one row with one OpenDocument cell."""
    return f"<table:table-row><table:table-cell {attributes}>{inside}</table:table-cell></table:table-row>"


def entry(name: bytes, data: bytes, at: int, **lies: int | bytes) -> tuple[bytes, bytes]:
    """Return local header with data, and directory entry; `lies` falsify size, crc, method, flags, local, offset."""
    squeeze = zlib.compressobj(1 if len(data) > 1 << 20 else 9, zlib.DEFLATED, -15)
    packed = squeeze.compress(data) + squeeze.flush()
    size, crc = lies.get("size", len(data)), lies.get("crc", zlib.crc32(data))
    method, flags = lies.get("method", 8), lies.get("flags", 0x800)
    common = struct.pack("<4HI2I", flags, method, 0, 0x21, crc, len(packed), size)
    title = lies.get("local", name)
    local = b"PK\3\4" + struct.pack("<H", 20) + common + struct.pack("<2H", len(title), 0) + title + packed
    central = b"PK\1\2" + struct.pack("<2H", 20, 20) + common
    central += struct.pack("<5H2I", len(name), 0, 0, 0, 0, 0, lies.get("offset", at)) + name
    return local, central


def pack(members: list[tuple[bytes, bytes, dict[str, int | bytes]]], count: int | None = None) -> bytes:
    """Return a zip of the members (name, data, lies)."""
    body, directory = b"", b""
    for name, data, lies in members:
        local, central = entry(name, data, len(body), **lies)
        body, directory = body + local, directory + central
    number = len(members) if count is None else count
    return body + directory + b"PK\5\6" + struct.pack("<4H2IH", 0, 0, number, number, len(directory), len(body), 0)


def zipped(parts: dict[str, bytes], extra: "list[tuple[bytes, bytes, dict[str, int | bytes]]] | None" = None) -> bytes:
    """Return an honest zip of the parts, followed by extra members with their lies."""
    return pack([(name.encode(), data, {}) for name, data in parts.items()] + (extra or []))


def _markup() -> Iterator[tuple[str, bytes, str]]:
    """Attacks by XML."""
    cell = '<row r="1"><c r="A1"><v>1</v></c></row>'
    yield "laughs.xlsx", zipped(xlsx(sheet=worksheet(cell, head=LAUGHS))), "DOCTYPE"
    yield "outside.xlsx", zipped(xlsx(workbook=OUTSIDE + xlsx()["xl/workbook.xml"].decode())), "DOCTYPE"
    wide = worksheet(cell, head=f'<!DOCTYPE l [<!ENTITY a "{"x" * 5000}">]>').replace("UTF-8", "UTF-16")
    yield "utf16.xlsx", zipped({**xlsx(), SHEET: wide.encode("utf-16")}), "UTF-8"
    yield "utf16-bare.xlsx", zipped({**xlsx(), SHEET: wide.encode("utf-16-le")}), "UTF-8"
    code = b'<?xml version="1.0" encoding="cp037"?>' + worksheet(cell, head=LAUGHS).encode("cp037")
    yield "cp037.xlsx", zipped({**xlsx(), SHEET: code}), "UTF-8"
    late = b"\xef\xbb\xbf<?xml version='1.0'?><!-- c --><?p?>" + LAUGHS.encode() + b"<l>&e;</l>"
    for part in (
        "xl/charts/chart1.xml",
        "xl/theme/theme1.xml",
        "docProps/core.xml",
        "xl/comments1.vml",
        "xl/worksheets/_rels/sheet1.xml.rels",
        "unknown.part",
    ):
        yield f"doctype-{part.replace('/', '-')}.xlsx", zipped({**xlsx(), part: late}), "DOCTYPE"
    yield "styles.xlsx", zipped(xlsx(styles=LAUGHS + xlsx()["xl/styles.xml"].decode())), "DOCTYPE"
    yield "strings.xlsx", zipped(xlsx(strings=LAUGHS + xlsx()["xl/sharedStrings.xml"].decode())), "DOCTYPE"
    yield "deep.xlsx", zipped(xlsx(tail="<x>" * 500 + "</x>" * 500)), "nested deeper"
    tags = [f"<{chr(letter)}/>" for letter in range(97, 123)]
    opened = "".join(random.Random(1).choices(tags, k=900_000)).replace("/>", ">")
    yield "deep-open.xlsx", zipped(xlsx(sheet=opened)), "not a worksheet"
    yield "deep-tail.xlsx", zipped(xlsx(tail=opened)), "nested deeper"
    marks = "".join(random.Random(2).choices(tags, k=1_050_000)).encode()
    yield "marks.xlsx", zipped({**xlsx(), "xl/charts/1.xml": marks, "xl/charts/2.xml": marks}), "marks"
    for name, text in (
        ("cut", '<row r="1"><c r="A1"><v>1</v>'),
        ("entity", cell.replace("<v>1", "<v>1</v><f>&x;</f><v>")),
        ("control", cell.replace("1</v>", "\x01</v>")),
        ("lone", cell.replace("<c r", "<c t='str' r").replace(">1<", ">&<")),
    ):
        yield f"malformed-{name}.xlsx", zipped(xlsx(text)), "not well-formed"
    yield (
        "not-utf8.xlsx",
        zipped({**xlsx(), SHEET: worksheet(cell.replace(">1<", ">\xe9<")).encode("latin-1")}),
        "XML",
    )
    yield "laughs.ods", zipped(ods("", LAUGHS)), "DOCTYPE"
    yield "deep.ods", zipped(ods(ods_cell("", "<text:p>" * 500 + "</text:p>" * 500))), "nested deeper"


def _areas() -> Iterator[tuple[str, bytes, str]]:
    """Attacks by extent."""
    merge = '<mergeCells><mergeCell ref="A1:ALL2000"/></mergeCells>'
    yield "merge.xlsx", zipped(xlsx(tail=merge)), "merge covers too many"
    merges = "".join(f'<mergeCell ref="A{n}:ZZ{n + 90}"/>' for n in range(1, 1000, 100))
    yield "merges.xlsx", zipped(xlsx(tail=f"<mergeCells>{merges}</mergeCells>")), "merge covers too many"
    link = '<hyperlinks><hyperlink ref="A1:XFD1048576" location="A1"/></hyperlinks>'
    yield "link.xlsx", zipped(xlsx(tail=link)), "link covers too many"
    yield "area.xlsx", zipped(xlsx(tail='<mergeCells><mergeCell ref="A1:?"/></mergeCells>')), "not one"
    for ref in ("XFD1048576", "A1048577", "ZZZ1", "AAA1", "A100000"):
        yield f"far-{ref}.xlsx", zipped(xlsx(f'<row r="1"><c r="{ref}"><v>1</v></c></row>')), f"Front!{ref}"
    yield "row-zero.xlsx", zipped(xlsx('<row r="0"><c r="A0"><v>1</v></c></row>')), "address"
    rows = "".join(
        f'<row r="{r}">{"".join(f"<c r=`A{chr(c)}{r}`/>" for c in range(65, 91))}</row>' for r in range(1, 8000)
    ).replace("`", '"')
    yield "cells.xlsx", zipped(xlsx(rows)), "cells"
    number = 'office:value-type="float" office:value="1"'
    yield "far.ods", zipped(ods(ods_cell(f'table:number-columns-repeated="16384" {number}'))), "too far out"
    rows = ods_cell(number).replace("-row>", '-row table:number-rows-repeated="1048576">', 1)
    yield "tall.ods", zipped(ods(rows)), "too far out"
    rows = ods_cell(f'table:number-columns-repeated="700" {number}')
    yield (
        "wide.ods",
        zipped(ods(rows.replace("-row>", '-row table:number-rows-repeated="900">', 1))),
        "more than",
    )
    span = 'table:number-columns-spanned="9999" table:number-rows-spanned="9999"'
    yield "merge.ods", zipped(ods(ods_cell(f"{span} {number}"))), "merges cover"
    yield (
        "spaces.ods",
        zipped(ods(ods_cell('office:value-type="string"', '<text:p><text:s text:c="9999999"/></text:p>'))),
        "spaces",
    )
    yield (
        "endless.ods",
        zipped(ods(ods_cell(f'table:number-columns-repeated="{"9" * 5000}" {number}'))),
        "not a count",
    )


def _values() -> Iterator[tuple[str, bytes, str]]:
    """Values that are not what their type says."""
    for name, value in (
        ("long", "9" * 5000),
        ("nan", "nan"),
        ("inf", "inf"),
        ("huge", "1e999"),
        ("word", "abc"),
        ("underscore", "1_000"),
        ("digit", "\uff11"),
        ("signs", "--1"),
        ("two", "1 2"),
        ("hex", "0x1"),
    ):
        yield (
            f"number-{name}.xlsx",
            zipped(xlsx(f'<row r="9"><c r="D9"><v>{value}</v></c></row>')),
            "Front!D9",
        )
        row = ods_cell(f'office:value-type="float" office:value="{value}"')
        yield f"number-{name}.ods", zipped(ods(row)), "Front!A1"
    for name, cell in (
        ("index", '<c r="D9" t="s"><v>2</v></c>'),
        ("negative", '<c r="D9" t="s"><v>-1</v></c>'),
        ("fraction", '<c r="D9" t="s"><v>1.0</v></c>'),
        ("bool", '<c r="D9" t="b"><v>2</v></c>'),
        ("error", '<c r="D9" t="e"><v>oops</v></c>'),
        ("type", '<c r="D9" t="zz"><v>1</v></c>'),
        ("date", '<c r="D9" t="d"><v>2026-13-01</v></c>'),
        ("shared", '<c r="D9"><f t="shared" si="7"/><v>1</v></c>'),
        ("twice", '<c r="D9"><v>1</v></c><c r="D9"/>'),
        ("twice-far", '<c r="D9"/>' + '<c r="E9"/><c r="D9" s="1"/>'),
    ):
        yield f"value-{name}.xlsx", zipped(xlsx(f'<row r="9">{cell}</row>')), "Front!D9"
    for style in ("2", "99999999", "x", "-1", "00"):
        yield f"style-{style}.xlsx", zipped(xlsx(f'<row r="9"><c r="D9" s="{style}"/></row>')), "style"
    for kind in (
        '"date" office:date-value="soon"',
        '"time" office:time-value="1h"',
        '"boolean"',
        '"strange"',
    ):
        yield f"value-{kind[1:5]}.ods", zipped(ods(ods_cell(f"office:value-type={kind}"))), "Front!A1"


def _packages() -> Iterator[tuple[str, bytes, str]]:
    """Attacks by the zip itself, and other files under a workbook's name."""
    good, sheet = xlsx(), xlsx()[SHEET]
    bomb = b"0" * 17_000_000
    yield "bomb-part.xlsx", zipped(good, [(b"xl/big.xml", bomb, {})]), "MiB"
    yield "bomb-ratio.xlsx", zipped(good, [(b"xl/big.xml", bomb[:9_000_000], {})]), "fold"
    yield "bomb-stated.xlsx", zipped(good, [(b"xl/big.xml", b"0", {"size": 465_000_000})]), "MiB"
    yield "bomb-lie.xlsx", zipped(good, [(b"xl/big.xml", bomb, {"size": 1000})]), "damaged"
    noise = bytes(zlib.crc32(bytes([n % 256, n // 256 % 256])) % 7 + 65 for n in range(1 << 20)) * 9
    many = [(b"xl/big%d.xml" % n, noise, {}) for n in range(8)]
    yield "bomb-total.xlsx", zipped(good, many), "MiB"
    yield "members.xlsx", zipped(good, [(b"xl/%d.xml" % n, b"", {}) for n in range(2100)]), "parts"
    for name in (
        "../x.xml",
        "/x.xml",
        "C:/x.xml",
        "a\\x.xml",
        "a/../../x.xml",
        "a//x.xml",
        "./x.xml",
        "a\0x.xml",
        "",
    ):
        yield f"name-{name.encode().hex()}.xlsx", zipped(good, [(name.encode(), b"<x/>", {})]), "odd name"
    yield "twice.xlsx", zipped(good, [(SHEET.encode(), sheet, {})]), "twice"
    yield "twice-case.xlsx", zipped(good, [(SHEET.upper().encode(), sheet, {})]), "twice"
    yield "two-names.xlsx", zipped(good, [(b"a.xml", b"<a/>", {"local": b"b.xml"})]), "two names"
    yield "crc.xlsx", zipped(good, [(b"a.xml", b"<a/>", {"crc": 1})]), "damaged"
    yield "method.xlsx", zipped(good, [(b"a.xml", b"<a/>", {"method": 14})]), "method 14"
    yield "locked.xlsx", zipped(good, [(b"a.xml", b"<a/>", {"flags": 1})]), "encrypted"
    shared = [(b"a.xml", b"<a/>", {}), (b"a.xml", b"<a/>", {"offset": 0})]
    yield "overlap.xlsx", pack([shared[0], shared[1]]), "overlaps"
    whole = zipped(good)
    yield "cut.xlsx", whole[: len(whole) // 2], "cut short"
    yield "cut-end.xlsx", whole[:-3], "cut short"
    yield "tail.xlsx", whole + b"more", "cut short"
    yield "count.xlsx", pack([(b"a", b"a", {})], 3), "cut short"
    yield "zip64.xlsx", pack([(b"a", b"a", {})], 0xFFFF), "very large"
    yield "empty.xlsx", b"", "empty"
    yield "report.xlsx", b"%PDF-1.7\n...", "PDF"
    yield "page.xlsx", b"<html><table></table></html>", "markup"
    yield "text.xlsx", b"mass;1.0\n", "not a workbook"
    ole = b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1" + b"\0" * 504
    yield "old.xls", ole + "Workbook".encode("utf-16-le"), ".xls"
    yield "password.xlsx", ole + "EncryptedPackage".encode("utf-16-le"), "encrypted"
    yield "photos.xlsx", zipped({"a.txt": b"a"}), "not a workbook"
    letter = {**good, "_rels/.rels": relations("r1 officeDocument word/document.xml").encode()}
    yield "letter.xlsx", zipped({**letter, "word/document.xml": b"<w/>"}), "not a workbook"
    yield "binary.xlsb", zipped({**good, "xl/workbook.bin": b"x"}), ".xlsb"
    yield "letter.ods", zipped(ods("", kind=b"application/vnd.oasis.opendocument.text")), "not a workbook"
    secret = b"<manifest><encryption-data/></manifest>"
    yield "password.ods", zipped({**ods(""), "META-INF/manifest.xml": secret}), "encrypted"
    yield "nested.ods", zipped(ods(ods_cell("", '<table:table table:name="in"/>'))), "within a table"
    yield "nothing.ods", zipped({"mimetype": SPREADSHEET, "content.xml": b""}), "content.xml"


def _books() -> Iterator[tuple[str, bytes, str]]:
    """Workbooks whose parts do not fit together."""
    lost = {name: data for name, data in xlsx().items() if name != SHEET}
    yield "lost-sheet.xlsx", zipped(lost), "missing"
    yield (
        "lost-relation.xlsx",
        zipped(xlsx(relations=relations("r9 worksheet worksheets/sheet1.xml"))),
        "no part",
    )
    out = relations("r1 worksheet http://127.0.0.1/sheet1.xml External")
    yield "outside-sheet.xlsx", zipped(xlsx(relations=out)), "no part"
    yield "climb.xlsx", zipped(xlsx(relations=relations("r1 worksheet ../../../etc/passwd"))), "missing"
    book = xlsx()["xl/workbook.xml"].decode()
    one = '<sheet name="Front" sheetId="1" r:id="r1"/>'
    yield "no-tabs.xlsx", zipped(xlsx(workbook=book.replace(one, ""))), "tab"
    yield (
        "same-tabs.xlsx",
        zipped(xlsx(workbook=book.replace(one, one + one.replace("Front", "FRONT")))),
        "tab",
    )
    named = book.replace(
        "</sheets>",
        '</sheets><definedNames><definedName name="a" localSheetId="9">A1</definedName></definedNames>',
    )
    yield "name.xlsx", zipped(xlsx(workbook=named)), "belongs to no tab"
    yield "chart-as-sheet.xlsx", zipped(xlsx(sheet='<c:chartSpace xmlns:c="urn:x"/>')), "not a worksheet"


def hostile_files(folder: Path) -> Iterator[tuple[Path, str]]:
    """Write every hostile file into the folder and yield its path and the words its refusal must hold."""
    for group in (_markup, _areas, _values, _packages, _books):
        for name, data, words in group():
            path = folder / name
            path.write_bytes(data)
            yield path, words
