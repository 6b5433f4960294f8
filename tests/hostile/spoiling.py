"""A real workbook to spoil: the filled heat balance, its parts changed as an attacker or an accident would."""

from __future__ import annotations

import io
import json
import re
import zipfile
from collections.abc import Callable, Mapping
from functools import cache, partial
from pathlib import Path
from typing import Any
from xml.sax.saxutils import escape

from sheetcal.excel.reader import read
from sheetcal.excel.sheetfile import SheetFile
from sheetcal.kinds.record import from_rows, to_rows

BASE = Path(__file__).parents[2] / "workbooks" / "heat-balance-filled.xlsx"
TABS = ("Front", "Readings", "Records", "Results", "Constants", "How computed", "Issue record")
BOOK, STYLES, RELATIONS = "xl/workbook.xml", "xl/styles.xml", "xl/_rels/workbook.xml.rels"
RESULT = "E6"  # a formula on Results; spoiled formulas go there, so that they are evaluated
READING = "E17"  # a mass on Readings
Parts = dict[str, bytes]


@cache
def _parts(path: Path) -> Parts:
    with zipfile.ZipFile(path) as package:
        return {one: package.read(one) for one in package.namelist()}


def base(kind: str = "heat-balance") -> Parts:
    """The parts of a good workbook, by name."""
    return dict(_parts(filled(kind)))


def filled(kind: str) -> Path:
    """The filled example of a kind."""
    return BASE.with_name(f"{kind}-filled.xlsx")


def part_of(tab: str) -> str:
    """The part of a tab."""
    return f"xl/worksheets/sheet{TABS.index(tab) + 1}.xml"


def packed(parts: Mapping[str, bytes]) -> bytes:
    """The workbook file; large parts are stored, so that no limit on packing stops an attack by what it holds."""
    buffer = io.BytesIO()
    with zipfile.ZipFile(buffer, "w", zipfile.ZIP_DEFLATED, compresslevel=1) as package:
        for name, data in parts.items():
            method = zipfile.ZIP_STORED if len(data) > 1_000_000 else zipfile.ZIP_DEFLATED
            package.writestr(zipfile.ZipInfo(name), data, method)
    return buffer.getvalue()


def later(parts: Mapping[str, bytes]) -> Callable[[], bytes]:
    """What makes the workbook file when it is wanted."""
    return partial(packed, parts)


def replaced(part: str, old: str, new: str, parts: Parts | None = None) -> Parts:
    """The parts with the first `old` of one of them replaced; it must be there."""
    parts = parts or base()
    assert old.encode() in parts[part], (part, old)
    return {**parts, part: parts[part].replace(old.encode(), new.encode("utf-8", "surrogatepass"), 1)}


def with_rows(tab: str, rows: str, parts: Parts | None = None) -> Parts:
    """The parts with more rows at the end of a tab."""
    return replaced(part_of(tab), "</sheetData>", f"{rows}</sheetData>", parts)


def with_tail(tab: str, tail: str, parts: Parts | None = None) -> Parts:
    """The parts with more elements at the end of a tab."""
    return replaced(part_of(tab), "</worksheet>", f"{tail}</worksheet>", parts)


def with_cell(tab: str, ref: str, inner: str, kind: str = "", parts: Parts | None = None) -> Parts:
    """The parts with another content in one cell."""
    parts = parts or base()
    text = parts[part_of(tab)].decode()
    start = text.index(f'<c r="{ref}"')
    closed, short = text.find("</c>", start), text.find("/>", start)
    end = short + 2 if text.find(">", start) == short + 1 else closed + 4
    style = text[start:end].split(' s="')[1].split('"')[0]
    sort = f' t="{kind}"' if kind else ""
    new = f'<c r="{ref}" s="{style}"{sort}>{inner}</c>'
    return {**parts, part_of(tab): (text[:start] + new + text[end:]).encode("utf-8", "surrogatepass")}


def with_formula(formula: str, rows: str = "", names: str = "") -> Parts:
    """The parts with a result's formula replaced, rows to which it may refer, and more defined names."""
    parts = with_cell("Results", RESULT, f"<f>{escape(formula)}</f><v>1</v>")
    parts = with_rows("Results", rows, parts) if rows else parts
    return replaced(BOOK, "</definedNames>", f"{names}</definedNames>", parts) if names else parts


def with_text(tab: str, ref: str, text: str, parts: Parts | None = None) -> Parts:
    """The parts with a text typed into a cell."""
    return with_cell(tab, ref, f'<is><t xml:space="preserve">{escape(text)}</t></is>', "inlineStr", parts)


@cache
def record_texts() -> dict[str, str]:
    """The rows of the issue record, pieces joined."""
    cells = read(BASE).cells["Issue record"]
    rows = [(str(cells[f"A{n}"][1]), str(cells[f"B{n}"][1])) for n in range(1, len(cells) // 2 + 1)]
    record, whole = from_rows(rows, "base")
    assert whole
    texts: dict[str, str] = {}
    for key, text in to_rows(record):
        texts[key.partition("/")[0]] = texts.get(key.partition("/")[0], "") + text
    return texts


def with_record(changes: Mapping[str, Any], parts: Parts | None = None) -> Parts:
    """The parts with rows of the issue record changed: a text stays as it is, anything else becomes JSON."""
    texts = {**record_texts()}
    for key, value in changes.items():
        texts[key] = value if isinstance(value, str) else json.dumps(value)
    rows = [
        (key if not at else f"{key}/{at}", text[start : start + 30_000])
        for key, text in texts.items()
        for at, start in enumerate(range(0, max(1, len(text)), 30_000))
    ]
    return with_record_rows(rows, parts)


def with_record_rows(rows: list[tuple[str, str]], parts: Parts | None = None) -> Parts:
    """The parts with the issue record's rows as given."""
    parts = parts or base()
    written = "".join(
        f'<row r="{n}">{_inline(f"A{n}", key)}{_inline(f"B{n}", text)}</row>'
        for n, (key, text) in enumerate(rows, start=1)
    )
    text = parts[part_of("Issue record")].decode()
    head, _, rest = text.partition("<sheetData>")
    tail = rest.partition("</sheetData>")[2]
    return {**parts, part_of("Issue record"): f"{head}<sheetData>{written}</sheetData>{tail}".encode()}


def _inline(ref: str, text: str) -> str:
    return f'<c r="{ref}" t="inlineStr"><is><t xml:space="preserve">{escape(text)}</t></is></c>'


# --- the same as OpenDocument ---------------------------------------------------------------------------------

_SPACES = " ".join(
    f'xmlns:{name}="urn:oasis:names:tc:opendocument:xmlns:{name}:1.0"'
    for name in ("office", "table", "text", "style", "config", "meta")
)


def ods_parts(content: str | None = None, head: str = "") -> Parts:
    """The same workbook as the parts of an .ods; `content` stands in place of its tables."""
    tables = content if content is not None else ods_tables()
    body = f"<office:body><office:spreadsheet>{tables}</office:spreadsheet></office:body>"
    whole = f'<?xml version="1.0" encoding="UTF-8"?>{head}<office:document-content {_SPACES}>{body}'
    return {
        "mimetype": b"application/vnd.oasis.opendocument.spreadsheet",
        "content.xml": f"{whole}</office:document-content>".encode("utf-8", "surrogatepass"),
    }


@cache
def ods_tables() -> str:
    """The tables of the good workbook, and its names."""
    book = read(BASE)
    tables = "".join(_table(book, tab, state) for tab, state in book.tabs)
    styles = ""
    names = "".join(
        f'<table:named-range table:name="{name}" table:cell-range-address="{_open(text)}"/>'
        for name, text in book.names.items()
        if "!" not in name
    )
    return f"{styles}{tables}<table:named-expressions>{names}</table:named-expressions>"


def _open(text: str) -> str:
    tab, _, cells = text.partition("!")
    return f"${tab}." + cells.replace(":", ":.")


def _table(book: SheetFile, tab: str, state: str) -> str:
    by_row: dict[int, dict[int, str]] = {}
    for ref, (kind, value, formula) in book.cells[tab].items():
        letters = ref.rstrip("0123456789")
        column = 0
        for letter in letters:
            column = 26 * column + ord(letter) - 64
        by_row.setdefault(int(ref[len(letters) :]), {})[column] = _cell(kind, value, formula)
    rows, last = [], 0
    for number in sorted(by_row):
        gap = number - last - 1
        rows.append(f'<table:table-row table:number-rows-repeated="{gap}"/>' if gap else "")
        cells, at = [], 0
        for column in sorted(by_row[number]):
            skip = column - at - 1
            cells.append(f'<table:table-cell table:number-columns-repeated="{skip}"/>' if skip else "")
            cells.append(by_row[number][column])
            at = column
        rows.append(f"<table:table-row>{''.join(cells)}</table:table-row>")
        last = number
    return f'<table:table table:name="{tab}" table:protected="true">{"".join(rows)}</table:table>'


def _cell(kind: str, value: object, formula: str | None) -> str:
    quote = {'"': "&quot;"}
    written = f' table:formula="{escape(_of(formula), quote)}"' if formula else ""
    if isinstance(value, float):
        return f'<table:table-cell{written} office:value-type="float" office:value="{value!r}"/>'
    text = "" if value is None else escape(str(value))
    return f'<table:table-cell{written} office:value-type="string"><text:p>{text}</text:p></table:table-cell>'


def _of(formula: str) -> str:
    """A formula of ours in OpenDocument's spelling; the base holds plain references only."""
    pieces = formula.split('"')
    for at in range(0, len(pieces), 2):
        pieces[at] = re.sub(
            r"(?:(Front|Readings|Records|Results|Constants)!)?(\$?[A-Z]{1,2}\$?[0-9]+)(?::(\$?[A-Z]{1,2}\$?[0-9]+))?(?![\w(])",
            lambda m: f"[{'$' + m[1] if m[1] else ''}.{m[2]}{':.' + m[3] if m[3] else ''}]",
            pieces[at],
        ).replace(",", ";")
    return "of:" + '"'.join(pieces)
