"""Read an OpenDocument spreadsheet (.ods) that passed the gate; formulas come in the xlsx spelling.

One expat pass over content.xml, which holds all tabs; repeated cells and rows are written out under the
limits of the gate. Standard library only.
"""

import re
from collections.abc import Callable
from datetime import date
from xml.parsers import expat

from sheetcal.errors import BadInput, Refused
from sheetcal.excel import gate
from sheetcal.excel.cellvalues import NUMBER, Cell, Value, serial
from sheetcal.excel.formula_text import column_letters, from_open, open_reference
from sheetcal.excel.gate import MAX_CELLS, MAX_COLUMN, MAX_DEPTH, MAX_ROW, Package, shown
from sheetcal.excel.odslooks import FRAME, OBJECT, SHAPES, Looks
from sheetcal.excel.sheetfile import SheetFile

_NAMESPACE = "urn:oasis:names:tc:opendocument:xmlns:"
_TABLE, _OFFICE = _NAMESPACE + "table:1.0 ", _NAMESPACE + "office:1.0 "
_TEXT, _STYLE = _NAMESPACE + "text:1.0 ", _NAMESPACE + "style:1.0 "
_CONFIG = _NAMESPACE + "config:1.0 "
_META = _NAMESPACE + "meta:1.0 "
_ERROR = "urn:org:documentfoundation:names:experimental:calc:xmlns:calcext:1.0 value-type"
_HREF = "http://www.w3.org/1999/xlink href"
_FORMULA, _REPEATED = _TABLE + "formula", _TABLE + "number-columns-repeated"
_VISIBLE = _TABLE + "visibility"
_TYPE, _VALUE = _OFFICE + "value-type", _OFFICE + "value"
_DURATION = re.compile(r"(-?)P(?:([0-9]{1,7})D)?T(?:([0-9]{1,7})H)?(?:([0-9]{1,7})M)?(?:([0-9]{1,7}(?:\.[0-9]*)?)S)?")
_CONSTANT = re.compile(r"=(?:(TRUE|FALSE)\(\)|(#(?:N/A|[A-Z0-9/]+[!?])))")
_OUTSIDE = re.compile(r"[a-z][a-z0-9+.-]+:|\.\./|/", re.IGNORECASE)
_MAX_SPACES = 10_000
_NAMES = {  # OpenDocument's names of properties, in the words of xlsx
    "initial-creator": "creator",
    "creator": "lastModifiedBy",
    "generator": "Application",
    "keyword": "keywords",
    "date": "modified",
    "creation-date": "created",
    "OOXMLCorePropertyIdentifier": "identifier",
}


def read_package(package: Package) -> SheetFile:
    """Return what an .ods package holds. Raises BadInput or Refused, one line."""
    kind = gate.unpack(package.raw, package.members["mimetype"], package.where)
    if b"opendocument.spreadsheet" not in kind:
        raise BadInput(
            package.where,
            "is an office document, but not a workbook",
            "a workbook (.xlsx or .ods)",
            "Send the workbook itself.",
        )
    if package.has("META-INF/manifest.xml") and b"encryption-data" in package.xml("META-INF/manifest.xml"):
        raise Refused(package.where, "the workbook is encrypted", "a workbook without password")
    book = SheetFile("ods", package.sha256)
    book.calc = {"mode": _mode(package), "fullPrecision": True, "iterate": False, "fullCalcOnLoad": False}
    _Content(package, book).run()
    book.properties = _properties(package)
    _note_objects(package, book)
    return book


class _Content:
    """The pass over content.xml: where the parser stands, and the row being read."""

    def __init__(self, package: Package, book: SheetFile) -> None:
        self._package, self._where, self._book = package, package.where, book
        self._take = package.allowance.take
        self._parser = expat.ParserCreate(namespace_separator=" ")
        self._depth = self._row = self._column = self._count = self._area = self._columns_seen = 0
        self._rows_repeated = 1
        self._cells: dict[str, Cell] | None = None
        self._tab = ""
        self._filled: list[tuple[int, int, Cell]] = []
        self._cell: dict[str, str] | None = None
        self._cell_depth = -1
        self._texts: list[str] = []
        self._hidden: set[str] = set()
        self._style = ""
        self._origin = date(1899, 12, 30)
        cell = _TABLE + "table-cell", _TABLE + "covered-table-cell"
        self._starts: dict[str, Callable[[dict[str, str]], None]] = {
            cell[0]: self._open_cell,
            cell[1]: self._open_cell,
            _TABLE + "table-row": self._open_row,
            _TABLE + "table-column": self._open_column,
            _TEXT + "p": self._open_paragraph,
            _TEXT + "s": self._spaces,
            _TEXT + "tab": self._tabulator,
            _TEXT + "line-break": self._line_break,
            _TABLE + "table": self._open_table,
            _STYLE + "style": self._open_style,
            _STYLE + "table-properties": self._table_style,
            _TABLE + "calculation-settings": self._settings,
            _TABLE + "iteration": self._iteration,
            _TABLE + "null-date": self._null_date,
            _TABLE + "named-range": self._named_range,
            _TABLE + "named-expression": self._named_expression,
            _TABLE + "dde-link": self._dde,
            _OFFICE + "dde-source": self._dde,
            _OFFICE + "event-listeners": self._macro,
        }
        self._ends: dict[str, Callable[[], None]] = {
            cell[0]: self._close_cell,
            cell[1]: self._close_cell,
            _TABLE + "table-row": self._close_row,
            _TABLE + "table": self._close_table,
            _TEXT + "p": self._close_paragraph,
        }
        self._looks = Looks(self._parser, package, book)
        overlays = {FRAME: self._open_frame, OBJECT: self._open_object, **dict.fromkeys(SHAPES, self._open_shape)}
        self._starts |= {**self._looks.starts, **overlays}
        self._ends |= self._looks.ends

    def run(self) -> None:
        """Read the part into the book. Raises Refused, naming the cell where there is one."""
        self._parser.buffer_text = True
        self._parser.StartElementHandler = self._start
        self._parser.EndElementHandler = self._end
        self._looks.read_styles()
        gate.parse(self._parser, self._package.xml("content.xml"), "content.xml", self._where)
        titles = [name.lower() for name, _ in self._book.tabs]
        if not titles or "" in titles or len(set(titles)) != len(titles):
            raise Refused(self._where, "its tabs have no names or one name twice", "tabs with different names")

    def _start(self, name: str, attributes: dict[str, str]) -> None:
        self._depth += 1
        if self._depth > MAX_DEPTH:
            raise Refused(self._where, f"content.xml is nested deeper than {MAX_DEPTH} levels", "a plain workbook")
        handler = self._starts.get(name)
        if handler is not None:
            handler(attributes)
        elif _HREF in attributes:
            self._link(name, attributes[_HREF])

    def _end(self, name: str) -> None:
        self._depth -= 1
        handler = self._ends.get(name)
        if handler is not None:
            handler()

    def _refuse(self, what: str, expected: str, row: int = 0, column: int = 0) -> Refused:
        """Return the refusal of a cell; without a place, of the one being read."""
        ref = f"{column_letters(column or self._column + 1)}{row or self._row + 1}"
        return Refused(f"{self._where}, {shown(self._tab)}!{ref}", what, expected, "Save the workbook again.")

    def _repeat(self, text: str) -> int:
        if not (text.isascii() and text.isdigit() and 0 < len(text) < 9 and int(text)):
            raise self._refuse(f"the repetition {shown(text)} is not a count", "a whole number")
        return int(text)

    def _times(self, attributes: dict[str, str]) -> int:
        """Return how often a cell stands side by side."""
        text = attributes.get(_REPEATED)
        return self._repeat(text) if text else 1

    # tabs and rows

    def _open_table(self, attributes: dict[str, str]) -> None:
        if self._cells is not None:
            raise self._refuse("holds a table within a table", "plain cells")
        self._tab = attributes.get(_TABLE + "name", "")
        self._take("tabs")
        state = "hidden" if attributes.get(_TABLE + "style-name") in self._hidden else "visible"
        self._book.tabs.append((self._tab, state))
        self._cells = self._book.cells.setdefault(self._tab, {})
        self._row = self._area = self._columns_seen = 0
        self._looks.open_table()
        if attributes.get(_TABLE + "protected") != "true":
            self._book.note("unprotected_tabs", self._tab)

    def _close_table(self) -> None:
        self._cells = None

    def _open_row(self, attributes: dict[str, str]) -> None:
        times = attributes.get(_TABLE + "number-rows-repeated")
        self._rows_repeated = self._repeat(times) if times else 1
        self._column = 0
        if attributes.get(_VISIBLE, "visible") != "visible":
            self._hide_rows(self._row + 1, self._row + self._rows_repeated)

    def _hide_rows(self, first: int, last: int) -> None:
        """Note hidden rows; a stretch of them is one."""
        before = self._book.extras.get("hidden", [""])
        if before[-1].startswith(f"{self._tab}!") and before[-1].endswith(f":{first - 1}"):
            before[-1] = f"{before[-1].rpartition(':')[0]}:{last}"
            return
        self._take("hidden rows or columns")
        self._book.note("hidden", f"{self._tab}!{first}:{last}")

    def _open_column(self, attributes: dict[str, str]) -> None:
        first, times = self._columns_seen + 1, self._times(attributes)
        self._columns_seen += times
        self._looks.open_column(times, attributes)
        if attributes.get(_VISIBLE, "visible") != "visible":
            self._take("hidden rows or columns")
            self._book.note("hidden", f"{self._tab}!{column_letters(first)}:{column_letters(first + times - 1)}")

    def _close_row(self) -> None:
        if self._filled and self._cells is not None:
            self._write_out(self._cells)
        self._row += self._rows_repeated

    def _write_out(self, cells: dict[str, Cell]) -> None:
        """Put the filled cells of a row where they belong, as often as they are repeated."""
        self._count += sum(times for _, times, _ in self._filled) * self._rows_repeated
        letters = sum(len(cell[2] or "") * times for _, times, cell in self._filled)
        self._take("letters of formulas", letters * self._rows_repeated)
        column, times, _ = self._filled[-1]
        if self._row + self._rows_repeated > MAX_ROW or column + times > MAX_COLUMN:
            raise self._refuse(
                "the cell lies too far out",
                f"at most {column_letters(MAX_COLUMN)}{MAX_ROW}",
                self._row + self._rows_repeated,
                column + times,
            )
        if self._count > MAX_CELLS:
            raise Refused(self._where, f"holds more than {MAX_CELLS} cells", "a worksheet")
        for row in range(self._row + 1, self._row + self._rows_repeated + 1):
            for column, times, cell in self._filled:
                for number in range(column + 1, column + times + 1):
                    cells[f"{column_letters(number)}{row}"] = cell
        self._filled = []

    # cells

    def _open_cell(self, attributes: dict[str, str]) -> None:
        if self._cells is None:  # a change that is tracked keeps old cells outside the tabs
            return
        if _TABLE + "number-columns-spanned" in attributes:
            self._merge(attributes)
        if _TYPE in attributes or _FORMULA in attributes:
            self._cell = attributes
            self._cell_depth = self._depth
            self._texts = []
        else:
            self._column += self._times(attributes)

    def _merge(self, attributes: dict[str, str]) -> None:
        columns = self._repeat(attributes[_TABLE + "number-columns-spanned"])
        rows = self._repeat(attributes.get(_TABLE + "number-rows-spanned", "1"))
        if columns * rows == 1:
            return
        self._take("merges")
        self._area += columns * rows
        if self._area > gate.MAX_AREA:
            raise self._refuse("merges cover too many cells", f"at most {gate.MAX_AREA} on one tab")
        self._book.note("merges", f"{self._tab}!{self._area_of(columns, rows)}")

    def _area_of(self, columns: int, rows: int) -> str:
        first = f"{column_letters(self._column + 1)}{self._row + 1}"
        return f"{first}:{column_letters(self._column + columns)}{self._row + rows}"

    def _close_cell(self) -> None:
        attributes = self._cell
        if attributes is None or self._depth != self._cell_depth - 1:
            return
        self._cell = None
        cell = self._value(attributes)
        times = self._times(attributes)
        if cell[2] is not None or (cell[1] is not None and cell[1] != ""):
            self._filled.append((self._column, times, cell))
            self._looks.cell(self._tab, self._row, self._column, cell[0], cell[2] is not None, attributes)
        self._column += times

    def _value(self, attributes: dict[str, str]) -> Cell:
        """Return one cell; constants that a program saves as formulas (TRUE, #N/A) become constants again."""
        formula = from_open(attributes[_FORMULA]) if _FORMULA in attributes else None
        if _TABLE + "number-matrix-columns-spanned" in attributes:
            self._array(attributes)
        constant = _CONSTANT.fullmatch(formula) if formula else None
        if constant:
            return ("b", constant[1] == "TRUE", None) if constant[1] else ("e", constant[2], None)
        return (*self._stored(attributes, formula is not None), formula)

    def _array(self, attributes: dict[str, str]) -> None:
        columns = self._repeat(attributes[_TABLE + "number-matrix-columns-spanned"])
        rows = self._repeat(attributes.get(_TABLE + "number-matrix-rows-spanned", "1"))
        self._take("array formulas")
        self._book.note("arrays", f"{self._tab}!{self._area_of(columns, rows)}")

    def _stored(self, attributes: dict[str, str], computed: bool) -> tuple[str, Value]:
        """Return type and stored value."""
        kind = attributes.get(_TYPE)
        if attributes.get(_ERROR) == "error":
            return "e", "".join(self._texts)
        if kind in ("float", "percentage", "currency"):
            return "n", self._number(attributes.get(_VALUE, ""))
        if kind == "string":
            return "s", attributes.get(_OFFICE + "string-value", "".join(self._texts))
        if kind is None:  # LibreOffice writes an empty text result without a type
            return ("s", "") if computed and self._texts else ("", None)
        return self._other(kind, attributes)

    def _other(self, kind: str, attributes: dict[str, str]) -> tuple[str, Value]:
        try:
            if kind == "boolean":
                return "b", {"true": True, "false": False}[attributes[_OFFICE + "boolean-value"]]
            if kind == "date":
                return "d", serial(attributes[_OFFICE + "date-value"], self._origin)
            if kind == "time":
                return "d", _duration(attributes[_OFFICE + "time-value"])
        except (KeyError, ValueError):
            raise self._refuse(f"the stored value is not a {kind}", "a value of its type") from None
        raise self._refuse(f"the cell type {shown(kind)} is unknown", "a type of the format")

    def _number(self, text: str) -> float:
        value = float(text) if NUMBER.fullmatch(text) else float("nan")
        if value - value != 0.0:
            raise self._refuse(f"the stored value {shown(text)} is not a number", "a finite number")
        return value

    # text in cells

    def _open_paragraph(self, _: dict[str, str]) -> None:
        if self._cell is None or self._depth != self._cell_depth + 1:
            return  # a note or a drawing within the cell
        self._texts.append("\n" if self._texts else "")
        if self._cell.get(_TYPE, "string") == "string":
            self._parser.CharacterDataHandler = self._texts.append

    def _close_paragraph(self) -> None:
        if self._depth == self._cell_depth:
            self._parser.CharacterDataHandler = None

    def _spaces(self, attributes: dict[str, str]) -> None:
        if self._parser.CharacterDataHandler is not None:
            count = self._repeat(attributes.get(_TEXT + "c", "1"))
            if count > _MAX_SPACES:
                raise self._refuse(f"a text holds {count} spaces", f"at most {_MAX_SPACES}")
            self._take("letters of text", count)
            self._texts.append(" " * count)

    def _tabulator(self, _: dict[str, str]) -> None:
        if self._parser.CharacterDataHandler is not None:
            self._texts.append("\t")

    def _line_break(self, _: dict[str, str]) -> None:
        if self._parser.CharacterDataHandler is not None:
            self._texts.append("\n")

    # what stands around the cells

    def _open_frame(self, attributes: dict[str, str]) -> None:
        self._looks.open_frame(self._here(), attributes)

    def _open_shape(self, attributes: dict[str, str]) -> None:
        self._looks.open_shape(self._here(), attributes)

    def _open_object(self, attributes: dict[str, str]) -> None:
        self._looks.no_picture()
        if _HREF in attributes:
            self._link(OBJECT, attributes[_HREF])

    def _here(self) -> str:
        return f"{self._tab}!{column_letters(self._column + 1)}{self._row + 1}"

    def _open_style(self, attributes: dict[str, str]) -> None:
        self._looks.open_style(attributes)
        of_table = attributes.get(_STYLE + "family") == "table"
        self._style = attributes.get(_STYLE + "name", "") if of_table else ""

    def _table_style(self, attributes: dict[str, str]) -> None:
        if self._style and attributes.get(_TABLE + "display") == "false":
            self._hidden.add(self._style)

    def _settings(self, attributes: dict[str, str]) -> None:
        self._book.calc["fullPrecision"] = attributes.get(_TABLE + "precision-as-shown") != "true"

    def _iteration(self, attributes: dict[str, str]) -> None:
        self._book.calc["iterate"] = attributes.get(_TABLE + "status") == "enable"

    def _null_date(self, attributes: dict[str, str]) -> None:
        try:
            self._origin = date.fromisoformat(attributes.get(_TABLE + "date-value", "1899-12-30"))
        except ValueError:
            raise Refused(self._where, "its first day is not a date", "1899-12-30 or 1904-01-01") from None
        self._book.date1904 = self._origin == date(1904, 1, 1)

    def _named_range(self, attributes: dict[str, str]) -> None:
        self._name(attributes, open_reference(attributes.get(_TABLE + "cell-range-address", "")))

    def _named_expression(self, attributes: dict[str, str]) -> None:
        self._name(attributes, from_open(attributes.get(_TABLE + "expression", "")).removeprefix("="))

    def _name(self, attributes: dict[str, str], text: str) -> None:
        name = attributes.get(_TABLE + "name", "")
        self._take("names")
        self._book.names[name if self._cells is None else f"{self._tab}!{name}"] = text

    def _dde(self, _: dict[str, str]) -> None:
        self._book.note("dde", "content.xml")

    def _macro(self, _: dict[str, str]) -> None:
        self._book.note("macros", "content.xml binds an event")

    def _link(self, name: str, target: str) -> None:
        if name == _TEXT + "a":
            self._take("links")
            self._book.note("hyperlinks", target)
        elif _OUTSIDE.match(target):
            self._take("links")
            self._book.note("external_links", target)


def _duration(text: str) -> float:
    """Return days of an ISO 8601 duration such as PT09H30M00S. Raises ValueError."""
    match = _DURATION.fullmatch(text)
    if not match:
        raise ValueError(text)
    days, hours, minutes, seconds = (float(part or 0) for part in match.groups()[1:])
    value = (days * 86_400 + hours * 3_600 + minutes * 60 + seconds) / 86_400
    return -value if match[1] else value


def _mode(package: Package) -> str:
    """Return whether the file asks for automatic or manual calculation."""
    found: list[str] = []
    name = ""

    def start(_: str, attributes: dict[str, str]) -> None:
        nonlocal name
        name = attributes.get(_CONFIG + "name", "")

    def text(piece: str) -> None:
        if name == "AutoCalculate" and piece.strip():
            found.append(piece.strip())

    if package.has("settings.xml"):
        gate.walk(package.xml("settings.xml"), "settings.xml", package.where, start, None, text)
    return "manual" if found[:1] == ["false"] else "auto"


def _properties(package: Package) -> dict[str, str]:
    """Return the properties of meta.xml in the words of xlsx; a custom one never hides another."""
    own: dict[str, str] = {}
    custom: dict[str, str] = {}
    place: list[tuple[dict[str, str], str]] = []

    def start(name: str, attributes: dict[str, str]) -> None:
        local = name.rpartition(" ")[2]
        named = attributes.get(_META + "name")
        into, key = (own, local) if named is None else (custom, named)
        if key == "OOXMLCorePropertyIdentifier":
            into = own
        place.append((into, _NAMES.get(key, key) if into is own else key))

    def end(_: str) -> None:
        place.pop()

    def text(piece: str) -> None:
        if len(place) == 3 and piece.strip():
            into, key = place[-1]
            into[key] = into.get(key, "") + piece

    if package.has("meta.xml"):
        gate.walk(package.xml("meta.xml"), "meta.xml", package.where, start, end, text)
    return {**custom, **own}


def _note_objects(package: Package, book: SheetFile) -> None:
    """Note embedded objects that are no charts, and parts that hold macros."""

    def start(_: str, attributes: dict[str, str]) -> None:
        facts = {key.rpartition(" ")[2]: value for key, value in attributes.items()}
        kind, path = facts.get("media-type", ""), facts.get("full-path", "")
        foreign = kind.startswith("application/vnd.") and "opendocument.chart" not in kind
        if foreign and path.lower().startswith("object") and "replacement" not in path.lower():
            book.note("embedded", path)

    if package.has("META-INF/manifest.xml"):
        gate.walk(package.xml("META-INF/manifest.xml"), "META-INF/manifest.xml", package.where, start)
    for name in package.names():
        if name.startswith(("Basic/", "Scripts/")) and not name.endswith("/"):
            book.note("macros", name)
