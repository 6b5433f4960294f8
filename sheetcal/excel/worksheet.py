"""The cells of one xlsx worksheet part, by one of two roads that give the same records.

The fast road is a pattern that must account for every character between <sheetData> and </sheetData>; the
rest of the part goes through expat. Whatever the pattern does not know (prefixes, comments, rich text, cells
without an address, far cells) sends the whole part down the slow road, an expat pass. Standard library only.
"""

import re
from collections.abc import Iterable, Iterator
from dataclasses import dataclass

from sheetcal.errors import Refused
from sheetcal.excel import gate
from sheetcal.excel.cellvalues import Book, Cell, OffRoad, Raw, Sheet, place
from sheetcal.excel.formula_text import column_letters
from sheetcal.excel.gate import MAX_COLUMN, MAX_ROW, shown

MAIN = (
    "http://schemas.openxmlformats.org/spreadsheetml/2006/main",
    "http://purl.oclc.org/ooxml/spreadsheetml/main",
)
_CELL = re.compile(
    r'(<c r="([A-Z]{1,2}[1-9][0-9]{0,4})"(?: s="([0-9]{1,6})")?(?: t="([a-zA-Z]{1,9})")?(?: ?/>|>'
    r'(?:<f((?: [a-zA-Z0-9]+="[^"<>]*")*)(?: ?/>|>([^<]*)</f>))?'
    r'(?:<v>(?:([-+0-9.eE]+)|([^<]*))</v>|<v ?/>|<is><t(?: xml:space="preserve")?>([^<]*)</t></is>)?</c>))'
)
_ROW = re.compile(r'<row(?: [A-Za-z0-9:]+="[^"<>]*")* ?/?>')
_ROW_HIDDEN = re.compile(r'<row (?=[^>]*(?:hidden="(?:1|true)"|ht="0(?:\.[0-9]*)?"))[^>]*\br="([0-9]{1,7})"')
_NUMBER_LIKE = re.compile(r"[-+0-9.eE]+")
# not allowed in XML; a carriage return, which is, goes the slow road
_CONTROLS = bytes([*range(9), *range(11, 32)])
_CHUNK = 1 << 20
_TRUE = ("1", "true")


@dataclass
class Outline:
    """What a worksheet part says outside its cells."""

    protected: bool = False
    merges: list[str] | None = None
    links: list[str] | None = None
    arrays: list[str] | None = None
    hidden: list[str] | None = None
    unlocked: list[str] | None = None


def read_cells(data: bytes, part: str, tab: str, book: Book) -> tuple[dict[str, Cell], Outline]:
    """Return the filled cells of a worksheet part by address, and what stands around them.

    Raises Refused, naming the cell, for values that are not what their type says.
    """
    try:
        return _fast(data, part, tab, book)
    except OffRoad:
        return _slow(data, part, tab, book)


def _fast(data: bytes, part: str, tab: str, book: Book) -> tuple[dict[str, Cell], Outline]:
    """Read by pattern. Raises OffRoad unless the pattern accounts for every character."""
    head, rows, tail = _cut_out(data)
    sheet = Sheet(tab, book)
    for chunk in _chunks(rows):
        found: list[Raw] = _CELL.findall(chunk)
        tiled = sum([len(raw[0]) for raw in found]) + sum(map(len, _ROW.findall(chunk)))
        if tiled + 6 * chunk.count("</row>") != len(chunk):
            raise OffRoad
        sheet.add(found)
    outline = _outline(f"{head}<sheetData/>{tail}", part, tab, book)
    outline.arrays, outline.unlocked = sheet.arrays, sheet.unlocked
    if outline.hidden is not None and ("hidden=" in rows or 'ht="0' in rows):
        outline.hidden += _spans(tab, map(int, _ROW_HIDDEN.findall(rows)), book)
    return sheet.done(), outline


def _cut_out(data: bytes) -> tuple[str, str, str]:
    """Return the part before, between and after the sheetData marks. Raises OffRoad."""
    head, opened, rest = data.partition(b"<sheetData>")
    rows, closed, tail = rest.rpartition(b"</sheetData>")
    if not opened or not closed or b"<!" in head or b"<!" in tail or b"<?" in head[2:] or b"<?" in tail:
        raise OffRoad
    if not xml_text(rows):
        raise OffRoad
    try:
        return head.decode("utf-8-sig"), rows.decode(), tail.decode()
    except UnicodeDecodeError:
        raise OffRoad from None


def xml_text(data: bytes) -> bool:
    """Tell whether the bytes hold no character and no mark that XML forbids in text."""
    if b"]]>" in data or (not data.isascii() and (b"\xef\xbf\xbe" in data or b"\xef\xbf\xbf" in data)):
        return False
    return len(data.translate(None, _CONTROLS)) == len(data)


def _chunks(rows: str) -> Iterator[str]:
    """Yield the rows in pieces that end at a row's end, so that memory stays bounded."""
    at = 0
    while len(rows) - at > _CHUNK:
        end = rows.rfind("</row>", at, at + _CHUNK) + 6
        if end < 6:
            raise OffRoad
        yield rows[at:end]
        at = end
    yield rows[at:]


def _main(name: str) -> str:
    """Return the local name of an element of the main namespace, else an empty text."""
    space, _, local = name.rpartition(" ")
    return local if space in MAIN else ""


def _outline(text: "str | bytes", part: str, tab: str, book: Book) -> Outline:
    """Read what stands around the cells."""
    pass_ = _OutlinePass(tab, book)
    gate.walk(text, part, book.where, pass_.start)
    return pass_.finish()


def _spans(tab: str, rows: Iterable[int], book: Book) -> list[str]:
    """`Tab!7:9` for each stretch of hidden rows that follow one another."""
    spans: list[tuple[int, int]] = []
    for row in rows:
        if spans and row == spans[-1][1] + 1:
            spans[-1] = (spans[-1][0], row)
        else:
            book.allowance.take("hidden rows or columns")
            spans.append((row, row))
    return [f"{tab}!{first}:{last}" for first, last in spans]


class _OutlinePass:
    """Collects protection, merges and links; bounds the areas they cover."""

    def __init__(self, tab: str, book: Book) -> None:
        self.outline = Outline(merges=[], links=[], hidden=[])
        self._tab, self._where, self._book = tab, book.where, book
        self._rows: list[int] = []
        self._area = {"merge": 0, "link": 0}
        self._root = True

    def start(self, name: str, attributes: dict[str, str]) -> None:
        """Take one element in."""
        local = _main(name)
        if self._root and local != "worksheet":
            raise Refused(self._where, f"tab {shown(self._tab)} is not a worksheet part", "a worksheet")
        self._root = False
        if local == "sheetProtection":
            self.outline.protected = attributes.get("sheet") in _TRUE
        elif local in ("row", "col") and _out_of_sight(attributes):
            self._hide(local, attributes)
        elif local == "mergeCell":
            self._add("merge", attributes.get("ref", ""), self.outline.merges)
        elif local == "hyperlink":
            self._add("link", attributes.get("ref", ""), self.outline.links)

    def _hide(self, local: str, attributes: dict[str, str]) -> None:
        """Note a hidden row, or hidden columns; what is not a number here is refused where cells are read."""
        first, last = attributes.get("min" if local == "col" else "r", ""), attributes.get("max", "")
        numbers = [int(text) for text in (first, last or first) if text.isascii() and text.isdigit() and len(text) < 8]
        if len(numbers) < 2 or not all(numbers):
            return
        if local == "row":
            self._rows.append(numbers[0])
        elif self.outline.hidden is not None:
            self._book.allowance.take("hidden rows or columns")
            self.outline.hidden.append(f"{self._tab}!{':'.join(map(column_letters, numbers))}")

    def finish(self) -> Outline:
        """What was collected."""
        if self.outline.hidden is not None:
            self.outline.hidden += _spans(self._tab, self._rows, self._book)
        return self.outline

    def _add(self, sort: str, ref: str, into: "list[str] | None") -> None:
        self._book.allowance.take(f"{sort}s")
        self._area[sort] += area(ref, f"{self._where}, {shown(self._tab)}")
        if self._area[sort] > gate.MAX_AREA:
            raise Refused(
                f"{self._where}, {shown(self._tab)}!{shown(ref)}",
                f"a {sort} covers too many cells",
                f"at most {gate.MAX_AREA} on one tab",
            )
        if into is not None:
            into.append(f"{self._tab}!{ref}")


def _out_of_sight(attributes: dict[str, str]) -> bool:
    """Tell whether a row or column is hidden or too low (under a point) or too narrow to be seen."""
    flat = attributes.get("ht", "1").startswith("0") or attributes.get("width", "1").startswith("0.0")
    return attributes.get("hidden") in _TRUE or flat or attributes.get("width") == "0"


def area(ref: str, where: str) -> int:
    """Return how many cells an area such as A1:C3 covers. Raises Refused when it is none."""
    first, _, last = ref.replace("$", "").partition(":")
    try:
        (row, column), (last_row, last_column) = place(first), place(last or first)
    except ValueError:
        raise Refused(where, f"the area {shown(ref)} is not one", "such as A1:C3", "Save it again.") from None
    return (abs(last_row - row) + 1) * (abs(last_column - column) + 1)


class _SlowPass:
    """Collects raw records by expat events, for parts the pattern does not know."""

    def __init__(self, sheet: Sheet) -> None:
        self.sheet = sheet
        self.found: list[Raw] = []
        self._row = self._column = 0
        self._path: list[str] = []
        self._fact = {"r": "", "s": "", "t": ""}
        self._texts = {"f": "", "v": "", "t": ""}
        self._attributes: str | None = None

    def start(self, name: str, attributes: dict[str, str]) -> None:
        """Open an element."""
        local = _main(name)
        self._path.append(local)
        if self._path[1:2] != ["sheetData"]:
            return
        if local == "row" and len(self._path) == 3:
            self._open_row(attributes.get("r", ""))
        elif local == "c" and len(self._path) == 4:
            self._open_cell(attributes)
        elif local == "f" and len(self._path) == 5:
            kept = {key: value for key, value in attributes.items() if " " not in key and key in ("t", "si", "ref")}
            self._attributes = "".join(f' {key}="{value}"' for key, value in kept.items() if '"' not in value)

    def _open_row(self, number: str) -> None:
        if number and not (number.isascii() and number.isdigit() and len(number) < 8):
            raise self.sheet.refuse("row " + shown(number), "the row number is not one", "a whole number")
        self._row = int(number) if number else self._row + 1
        self._column = 0

    def _open_cell(self, attributes: dict[str, str]) -> None:
        ref = attributes.get("r") or f"{column_letters(self._column + 1)}{self._row}"
        try:
            row, self._column = place(ref)
        except ValueError:
            raise self.sheet.refuse(shown(ref), "the cell address is not one", "such as D9") from None
        if row > MAX_ROW or self._column > MAX_COLUMN:
            raise self.sheet.refuse(ref, "the cell lies too far out", f"at most {column_letters(MAX_COLUMN)}{MAX_ROW}")
        self._fact = {"r": ref, "s": attributes.get("s", ""), "t": attributes.get("t", "")}
        self._texts = {"f": "", "v": "", "t": ""}
        self._attributes = None

    def text(self, text: str) -> None:
        """Take text in, where it is a value, a formula or an inline text."""
        path = self._path
        if path[1:2] != ["sheetData"] or len(path) < 5 or path[3] != "c":
            return
        if path[4:] in (["f"], ["v"]):
            self._texts[path[4]] += text
        elif path[4] == "is" and path[5:] in (["t"], ["r", "t"]):
            self._texts["t"] += text

    def end(self, name: str) -> None:
        """Close an element; a cell becomes a record."""
        local = self._path.pop()
        if local == "c" and len(self._path) == 3 and self._path[1] == "sheetData":
            value = self._texts["v"]
            number = value if _NUMBER_LIKE.fullmatch(value) else ""
            formula = _escaped(self._texts["f"])
            other = "" if number else _escaped(value)
            self.found.append(
                (
                    "",
                    self._fact["r"],
                    self._fact["s"],
                    self._fact["t"],
                    self._attributes or "",
                    formula,
                    number,
                    other,
                    _escaped(self._texts["t"]),
                )
            )
            self._flush(10_000)

    def _flush(self, least: int) -> None:
        if len(self.found) > least:
            self.sheet.add(self.found)
            self.found = []

    def finish(self) -> dict[str, Cell]:
        """Hand over what is left."""
        self._flush(0)
        return self.sheet.done()


def _escaped(text: str) -> str:
    """Return text as a part would spell it, so that both roads end in the same records."""
    return text.replace("&", "&amp;") if "&" in text else text


def _slow(data: bytes, part: str, tab: str, book: Book) -> tuple[dict[str, Cell], Outline]:
    """Read by expat, cells and outline in one pass."""
    cells = _SlowPass(Sheet(tab, book))
    around = _OutlinePass(tab, book)

    def start(name: str, attributes: dict[str, str]) -> None:
        around.start(name, attributes)
        cells.start(name, attributes)

    gate.walk(data, part, book.where, start, cells.end, cells.text)
    around.outline.arrays, around.outline.unlocked = cells.sheet.arrays, cells.sheet.unlocked
    return cells.finish(), around.finish()
