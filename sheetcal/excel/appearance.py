"""How the cells of an xlsx workbook look, as far as it can hide what they hold: number formats and colours.

Also what lies on the cells: filters, pictures, text boxes. Standard library only.
"""

import posixpath
import re
from collections.abc import Iterable, Sequence
from functools import lru_cache
from typing import TypeVar

from sheetcal.excel import gate
from sheetcal.excel.cellvalues import Book
from sheetcal.excel.formula_text import column_letters
from sheetcal.excel.gate import Package
from sheetcal.excel.sheetfile import SheetFile

LEAST_CONTRAST = 1.25  # of luminances, 1 to 21; white on our palest ground has 1.15
MOST_OBJECTS = 2_000  # are noted; one is enough for a finding
TINY = ("0", "1", "1.5", "2")  # points; such letters cannot be read
BUILT_IN = {
    "0": "General", "1": "0", "2": "0.00", "3": "#,##0", "4": "#,##0.00", "9": "0%", "10": "0.00%", "11": "0.00E+00",
    "12": "# ?/?", "13": "# ??/??", "14": "mm-dd-yy", "15": "d-mmm-yy", "16": "d-mmm", "17": "mmm-yy",
    "18": "h:mm AM/PM", "19": "h:mm:ss AM/PM", "20": "h:mm", "21": "h:mm:ss", "22": "m/d/yy h:mm",
    "37": "#,##0 ;(#,##0)", "38": "#,##0 ;[Red](#,##0)", "39": "#,##0.00;(#,##0.00)",
    "40": "#,##0.00;[Red](#,##0.00)", "45": "mm:ss", "46": "[h]:mm:ss", "47": "mmss.0", "48": "##0.0E+0", "49": "@",
}  # fmt: skip
_PALETTE = ("000000", "FFFFFF", "FF0000", "00FF00", "0000FF", "FFFF00", "FF00FF", "00FFFF")  # 0 to 7, again 8 to 15
_RGB = re.compile(r"[0-9A-Fa-f]{6}")
T = TypeVar("T")
_OBJECT = re.compile(rb"<(?:[a-z]+[0-9]*:)?(?:pic|sp)[ >/]")


@lru_cache(maxsize=1024)
def unseen(ink: str | None, ground: str | None) -> bool:
    """Whether text cannot be told from its cell. Colours: RRGGBB, or a name that is compared; None unknown."""
    if ink is None:
        return False
    ground = ground or "FFFFFF"
    if _RGB.fullmatch(ink) and _RGB.fullmatch(ground):
        one, other = sorted((_luminance(ink), _luminance(ground)))
        return (other + 0.05) / (one + 0.05) < LEAST_CONTRAST
    return ink == ground


def _luminance(colour: str) -> float:
    """Relative luminance of an sRGB colour, 0 to 1 (WCAG 2)."""
    parts = [int(colour[at : at + 2], 16) / 255.0 for at in (0, 2, 4)]
    red, green, blue = (part / 12.92 if part <= 0.03928 else ((part + 0.055) / 1.055) ** 2.4 for part in parts)
    return 0.2126 * red + 0.7152 * green + 0.0722 * blue


def _colour(attributes: dict[str, str]) -> str | None:
    """The colour an element names; one of a theme as a name where its value is not certain."""
    if "rgb" in attributes:
        found = attributes["rgb"][-6:].upper()
        return found if _RGB.fullmatch(found) else None
    if "indexed" in attributes:
        index = attributes["indexed"]
        known = {"64": "000000", "65": "FFFFFF", **{str(at): _PALETTE[at % 8] for at in range(16)}}
        return known.get(index, f"indexed {index}")
    if "theme" in attributes:
        return _of_theme(attributes["theme"], attributes.get("tint", "0"))
    return None


def _of_theme(theme: str, tint: str) -> str:
    """White and black of the theme with their tints; any other by its name."""
    try:
        share = float(tint)
    except ValueError:
        share = 0.0
    if theme in ("0", "1") and -1.0 <= share <= 1.0:
        light = 1.0 + min(share, 0.0) if theme == "0" else max(share, 0.0)
        return f"{round(255 * light):02X}" * 3
    return f"theme {theme} {share:g}"


class _Styles:
    """Collects fonts, grounds and formats of the cell styles."""

    def __init__(self) -> None:
        self.codes: dict[str, str] = {}
        self.inks: list[str | None] = []
        self.grounds: list[str | None] = []
        self.small: list[bool] = []
        self.cells: list[dict[str, str]] = []
        self._path: list[str] = []

    def start(self, name: str, attributes: dict[str, str]) -> None:
        """Take one element in."""
        self._path.append(name.rpartition(" ")[2])
        match self._path[1:]:
            case ["numFmts", "numFmt"]:
                self.codes.setdefault(attributes.get("numFmtId", ""), attributes.get("formatCode", ""))
            case ["fonts", "font"]:
                self.inks.append(None)
                self.small.append(False)
            case ["fonts", "font", "color"]:
                self.inks[-1] = _colour(attributes)
            case ["fonts", "font", "sz"]:
                self.small[-1] = attributes.get("val", "10")[:8] in TINY
            case ["fills", "fill"]:
                self.grounds.append(None)
            case ["fills", "fill", "patternFill"]:
                self._solid = attributes.get("patternType") == "solid"
                self.grounds[-1] = "unknown" if self._solid else None
            case ["fills", "fill", "patternFill", "fgColor"] if self._solid:
                self.grounds[-1] = _colour(attributes)
            case ["cellXfs", "xf"]:
                self.cells.append(attributes)

    _solid = False

    def end(self, _: str) -> None:
        """Close an element."""
        self._path.pop()

    def is_unseen(self, cell: dict[str, str]) -> bool:
        """Whether a cell style hides its text."""
        font, fill = _at(self.inks, cell.get("fontId")), _at(self.grounds, cell.get("fillId"))
        return unseen(font, fill) or bool(_at(self.small, cell.get("fontId")))


def _at(listed: Sequence[T], index: str | None) -> T | None:
    """The member of an index written as text; None where there is none."""
    if index is None or not (index.isascii() and index.isdigit()) or len(index) > 6 or int(index) >= len(listed):
        return None
    return listed[int(index)]


def take_styles(package: Package, parts: list[str], shared: Book, book: SheetFile) -> None:
    """Read the styles part: the formats by style, and the styles whose text cannot be seen."""
    styles = _Styles()
    for part in parts[-1:]:
        gate.walk(package.xml(part), part, package.where, styles.start, styles.end)
    ids = [cell.get("numFmtId", "0") for cell in styles.cells]
    book.codes = {str(at): styles.codes.get(one) or BUILT_IN.get(one, "General") for at, one in enumerate(ids)}
    shared.unseen = frozenset(str(at) for at, cell in enumerate(styles.cells) if styles.is_unseen(cell))


def take_cells(shared: Book, book: SheetFile) -> None:
    """The styles of the cells that hold numbers, and the cells whose text cannot be seen."""
    book.styled = shared.styled
    for cell in shared.faint:
        book.note("unseen", cell)


def note_overlays(package: Package, tabs: Iterable[tuple[str, str]], book: SheetFile) -> None:
    """Note filters, and pictures or text boxes with the cells under them. tabs: (name, part)."""
    for tab, part in tabs:
        if b"<autoFilter" in package.xml(part):
            book.note("filters", tab)
        folder, base = posixpath.split(part)
        rels = posixpath.join(folder, "_rels", base + ".rels")
        if package.has(rels) and b"/drawing" in package.xml(rels):
            for drawing in _drawings(package, rels, folder):
                _note_objects(package, drawing, tab, book)


def _drawings(package: Package, rels: str, folder: str) -> list[str]:
    found: list[str] = []

    def start(_: str, attributes: dict[str, str]) -> None:
        if attributes.get("Type", "").endswith("/drawing") and attributes.get("TargetMode") != "External":
            found.append(posixpath.normpath(posixpath.join("/", folder, attributes.get("Target", ""))).lstrip("/"))

    gate.walk(package.xml(rels), rels, package.where, start)
    return [one for one in found if package.has(one)]


def _note_objects(package: Package, part: str, tab: str, book: SheetFile) -> None:
    """Pictures and boxes of one drawing; charts are not among them, and a drawing without is not parsed."""
    data = package.xml(part)
    if not _OBJECT.search(data):
        return
    anchors = _Anchors(tab, book)
    gate.walk(data, part, package.where, anchors.start, anchors.end, anchors.text)


class _Anchors:
    """Where the pictures and boxes of a drawing begin and end, in columns and rows."""

    def __init__(self, tab: str, book: SheetFile) -> None:
        self._tab, self._book = tab, book
        self._path: list[str] = []
        self._at: dict[str, str] = {}
        self._object = False

    def start(self, name: str, _: dict[str, str]) -> None:
        """Open an element."""
        self._path.append(name.rpartition(" ")[2])
        if len(self._path) == 2:
            self._at, self._object = {}, False
        self._object = self._object or (len(self._path) == 3 and self._path[-1] in ("pic", "sp"))

    def text(self, text: str) -> None:
        """Take a column or row number in."""
        if len(self._path) == 4 and self._path[2] in ("from", "to") and self._path[3] in ("col", "row"):
            self._at[f"{self._path[2]} {self._path[3]}"] = text.strip()[:7]

    def end(self, _: str) -> None:
        """Close an element; an anchor with an object is noted."""
        self._path.pop()
        if len(self._path) == 1 and self._object and len(self._book.extras.get("objects", ())) < MOST_OBJECTS:
            numbers = [self._at.get(key, self._at.get(key.replace("to", "from"), "0")) for key in _KEYS]
            if all(one.isascii() and one.isdigit() for one in numbers):
                left, top, right, bottom = (int(one) for one in numbers)
                last = f"{column_letters(max(left, right) + 1)}{max(top, bottom) + 1}"
                self._book.note("objects", f"{self._tab}!{column_letters(left + 1)}{top + 1}:{last}")


_KEYS = ("from col", "from row", "to col", "to row")
