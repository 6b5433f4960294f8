"""How the cells of an .ods workbook look, as far as it can hide what they hold: formats, colours, locks, overlays.

Formats come in the spelling of xlsx. Handlers for the pass over content.xml; styles.xml is read before it.
"""

from collections.abc import Callable
from dataclasses import dataclass, field
from xml.parsers import expat

from sheetcal.excel import gate
from sheetcal.excel.appearance import MOST_OBJECTS, unseen
from sheetcal.excel.formula_text import column_letters
from sheetcal.excel.gate import MAX_COLUMN, Package
from sheetcal.excel.sheetfile import SheetFile

_NAMESPACE = "urn:oasis:names:tc:opendocument:xmlns:"
_STYLE, _TABLE = _NAMESPACE + "style:1.0 ", _NAMESPACE + "table:1.0 "
_NUMBER, _DRAW = _NAMESPACE + "datastyle:1.0 ", _NAMESPACE + "drawing:1.0 "
_FO = _NAMESPACE + "xsl-fo-compatible:1.0 "
_OPEN = ("none", "formula-hidden")
_PARTS = {"year": "yy", "month": "mm", "day": "dd", "hours": "hh", "minutes": "mm", "seconds": "ss", "am-pm": "AM/PM"}
_SORTS = (
    "number-style",
    "percentage-style",
    "currency-style",
    "date-style",
    "time-style",
    "text-style",
    "boolean-style",
)
_SHAPES = ("custom-shape", "rect", "ellipse", "caption", "polygon")

Handlers = dict[str, Callable[[dict[str, str]], None]]


@dataclass
class _Style:
    """What one cell style says itself."""

    parent: str = ""
    format: str = ""
    ink: str | None = None
    ground: str | None = None
    protect: str | None = None


@dataclass
class _Format:
    """One data style: its own spelling, and the conditions under which another is used."""

    code: str = ""
    percent: bool = False
    maps: list[tuple[str, str]] = field(default_factory=list)


class Looks:
    """Collects styles, and notes cells, frames and filters as the pass meets them."""

    def __init__(self, parser: expat.XMLParserType, package: Package, book: SheetFile) -> None:
        self._parser, self._package, self._book = parser, package, book
        self._styles: dict[str, _Style] = {}
        self._formats: dict[str, _Format] = {}
        self._style: _Style | None = None
        self._format: _Format | None = None
        self._columns: list[str] = []
        self._frame: tuple[str, str] | None = None
        self._known: dict[str, tuple[bool, bool]] = {}
        self.starts: Handlers = {
            _STYLE + "table-cell-properties": self._cell_properties,
            _STYLE + "text-properties": self._text_properties,
            _STYLE + "map": self._map,
            _NUMBER + "number": self._number,
            _NUMBER + "scientific-number": self._scientific,
            _NUMBER + "fraction": lambda _: self._put("# ?/?"),
            _NUMBER + "text": self._literal,
            _NUMBER + "currency-symbol": self._literal,
            _NUMBER + "text-content": lambda _: self._put("@"),
            _TABLE + "database-range": self._database,
            **{_NUMBER + name: self._putter(text) for name, text in _PARTS.items()},
            **{_NUMBER + name: self._opener(name) for name in _SORTS},
        }
        self.ends: dict[str, Callable[[], None]] = {
            _NUMBER + "text": self._end_literal,
            _NUMBER + "currency-symbol": self._end_literal,
            _DRAW + "frame": self._close_frame,
            **{_NUMBER + name: self._close_format for name in _SORTS},
        }

    def read_styles(self) -> None:
        """Take in the named styles of styles.xml."""
        package = self._package
        if not package.has("styles.xml"):
            return
        outer, self._parser = self._parser, expat.ParserCreate(namespace_separator=" ")
        starts = {**self.starts, _STYLE + "style": self.open_style}
        self._parser.StartElementHandler = lambda name, at: starts[name](at) if name in starts else None
        self._parser.EndElementHandler = lambda name: self.ends[name]() if name in self.ends else None
        gate.parse(self._parser, package.xml("styles.xml"), "styles.xml", package.where)
        self._parser = outer

    # styles

    def open_style(self, attributes: dict[str, str]) -> None:
        """Open a style; others than those of cells are passed over."""
        self._style = None
        if attributes.get(_STYLE + "family") == "table-cell":
            self._package.allowance.take("cell styles")
            self._style = _Style(
                attributes.get(_STYLE + "parent-style-name", ""), attributes.get(_STYLE + "data-style-name", "")
            )
            self._styles[attributes.get(_STYLE + "name", "")] = self._style

    def _cell_properties(self, attributes: dict[str, str]) -> None:
        if self._style is not None:
            self._style.ground = _colour(attributes.get(_FO + "background-color"))
            self._style.protect = attributes.get(_STYLE + "cell-protect")

    def _text_properties(self, attributes: dict[str, str]) -> None:
        if self._style is not None and self._format is None:
            self._style.ink = _colour(attributes.get(_FO + "color"))

    def _inherited(self, name: str, key: str) -> str | None:
        """What a style or the nearest of those it stands on says."""
        for _ in range(10):
            style = self._styles.get(name)
            if style is None:
                return None
            if getattr(style, key):
                return str(getattr(style, key))
            name = style.parent
        return None

    # formats

    def _open_format(self, sort: str, attributes: dict[str, str]) -> None:
        self._package.allowance.take("number formats")
        self._style = None
        self._format = _Format(percent=sort == "percentage-style")
        self._formats[attributes.get(_STYLE + "name", "")] = self._format

    def _close_format(self) -> None:
        self._format = None

    def _opener(self, sort: str) -> Callable[[dict[str, str]], None]:
        return lambda attributes: self._open_format(sort, attributes)

    def _putter(self, text: str) -> Callable[[dict[str, str]], None]:
        return lambda _: self._put(text)

    def _put(self, text: str) -> None:
        if self._format is not None and len(self._format.code) < 200:
            self._format.code += text

    def _number(self, attributes: dict[str, str]) -> None:
        decimals = attributes.get(_NUMBER + "decimal-places")
        if decimals is None:
            self._put("General")
            return
        grouped = attributes.get(_NUMBER + "grouping") == "true"
        thousands = _count(attributes.get(_NUMBER + "display-factor", "1"), 10**9)
        scale = "," * (len(str(thousands)) // 3) if thousands > 1 else ""
        self._put(("#,##0" if grouped else "0") + _places(decimals) + scale)

    def _scientific(self, attributes: dict[str, str]) -> None:
        self._put("0" + _places(attributes.get(_NUMBER + "decimal-places", "0")) + "E+00")

    def _literal(self, _: dict[str, str]) -> None:
        if self._format is not None:
            self._text: list[str] = []
            self._parser.CharacterDataHandler = self._text.append

    def _end_literal(self) -> None:
        if self._format is None:
            return
        self._parser.CharacterDataHandler = None
        text = "".join(self._text)
        if self._format.percent and "%" in text:
            self._put("%")
            text = text.replace("%", "")
        if text:
            self._put('"' + text.replace('"', "")[:60] + '"')

    def _map(self, attributes: dict[str, str]) -> None:
        if self._format is not None and len(self._format.maps) < 3:
            condition = attributes.get(_STYLE + "condition", "").replace(" ", "")
            self._format.maps.append((condition, attributes.get(_STYLE + "apply-style-name", "")))

    def _code(self, name: str) -> str | None:
        """A data style in the spelling of xlsx; None where its conditions have none."""
        found = self._formats.get(name)
        if found is None:
            return None
        by_condition = {condition: self._formats.get(other, _Format()).code for condition, other in found.maps}
        if not by_condition:
            return found.code
        if set(by_condition) == {"value()>=0"}:
            return f"{by_condition['value()>=0']};{found.code}"
        if set(by_condition) == {"value()>0", "value()<0", "value()=0"}:
            return ";".join(by_condition[one] for one in ("value()>0", "value()<0", "value()=0"))
        if set(by_condition) == {"value()>0", "value()<0"}:
            return f"{by_condition['value()>0']};{by_condition['value()<0']};{found.code}"
        return None

    # cells

    def open_table(self) -> None:
        """A new tab: no column has a style yet."""
        self._columns = []

    def open_column(self, times: int, attributes: dict[str, str]) -> None:
        """Columns side by side with the style of cells that name none."""
        times = min(times, MAX_COLUMN - len(self._columns))
        self._columns += [attributes.get(_TABLE + "default-cell-style-name", "")] * times

    def cell(self, tab: str, row: int, column: int, kind: str, computed: bool, attributes: dict[str, str]) -> None:
        """A filled cell, row and column counted from 0."""
        name = attributes.get(_TABLE + "style-name")
        if name is None:
            name = self._columns[column] if column < len(self._columns) else ""
        if name not in self._known:
            self._known[name] = self._judged(name)
        ref = f"{column_letters(column + 1)}{row + 1}"
        if kind in ("n", "d"):
            self._book.styled.setdefault(tab, {})[ref] = name
        hides, opens = self._known[name]
        if hides:
            self._book.note("unseen", f"{tab}!{ref}")
        if opens and computed:
            self._book.note("unlocked", f"{tab}!{ref}")

    def _judged(self, name: str) -> tuple[bool, bool]:
        """Whether a style hides its text, and whether it unlocks its cell; its format is kept."""
        code = self._code(self._inherited(name, "format") or "")
        if code is not None:
            self._book.codes[name] = code
        hides = unseen(self._inherited(name, "ink"), self._inherited(name, "ground"))
        return hides, self._inherited(name, "protect") in _OPEN

    # what lies over the cells

    def open_frame(self, where: str, attributes: dict[str, str]) -> None:
        """A frame anchored to a cell; a chart within it makes it none of our business."""
        self._frame = where, attributes.get(_TABLE + "end-cell-address", "")

    def open_shape(self, where: str, attributes: dict[str, str]) -> None:
        """A shape or text box anchored to a cell."""
        self.open_frame(where, attributes)
        self._close_frame()

    def no_picture(self) -> None:
        """The frame holds a chart."""
        self._frame = None

    def _close_frame(self) -> None:
        if self._frame is not None:
            where, last = self._frame
            end = last.rpartition(".")[2].replace("$", "")
            if end and len(self._book.extras.get("objects", ())) < MOST_OBJECTS:  # without end: anchored to the page
                self._book.note("objects", f"{where}:{end}")
        self._frame = None

    def _database(self, attributes: dict[str, str]) -> None:
        if attributes.get(_TABLE + "display-filter-buttons") == "true":
            tab = attributes.get(_TABLE + "target-range-address", "").partition(".")[0].strip("'$")
            self._book.note("filters", tab)


FRAME, OBJECT = _DRAW + "frame", _DRAW + "object"
SHAPES = tuple(_DRAW + name for name in _SHAPES)


def _colour(text: str | None) -> str | None:
    """`#1c2b33` as RRGGBB; None where no colour of its own is said."""
    return text[1:7].upper() if text and text.startswith("#") and len(text) == 7 else None


def _count(text: str, most: int) -> int:
    """A count written in a style; 0 where it is none."""
    return min(int(text), most) if text.isascii() and text.isdigit() and len(text) < 11 else 0


def _places(decimals: str) -> str:
    number = _count(decimals, 30)
    return "." + "0" * number if number else ""
