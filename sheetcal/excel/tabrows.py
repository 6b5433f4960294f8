"""The rows of one tab as the XML that stands in the file: value, style, formula and stored value of each cell."""

from __future__ import annotations

import math
import re
from collections.abc import Sequence
from xml.sax.saxutils import escape

from sheetcal.errors import BadInput
from sheetcal.kinds.layout import column_letter
from sheetcal.model import Value

_ILLEGAL = re.compile("[\x00-\x08\x0b\x0c\x0e-\x1f\ud800-\udfff\ufffe\uffff]")
_SPELLED = re.compile(r"_(?=x[0-9A-Fa-f]{4}_)")
LETTERS = [column_letter(number) for number in range(512)]  # more columns than any workbook of ours has


class TabRows:
    """Cells of one tab, row by row; nothing is kept but the text each will be in the file."""

    def __init__(self, tab: str) -> None:
        self.tab = tab
        self.cells: dict[int, dict[int, str]] = {}
        self.heights: dict[int, float] = {}
        self.merges: list[str] = []

    def put(self, row: int, column: int, style: int, value: Value = None, formula: str | None = None) -> None:
        """Set one cell. formula: with its leading `=`; `value` is then the stored result, None a blank one."""
        head = f'<c r="{LETTERS[column]}{row}" s="{style}"'
        try:
            body = _formula(formula, value) if formula else _content(value)
        except ValueError as fault:
            raise BadInput(f"{self.tab}!{LETTERS[column]}{row}", str(fault)) from None
        self.cells.setdefault(row, {})[column] = head + body

    def fill(self, row: int, columns: Sequence[int], style: int) -> None:
        """Give empty cells a look, leaving those already set."""
        line = self.cells.setdefault(row, {})
        for column in columns:
            line.setdefault(column, f'<c r="{LETTERS[column]}{row}" s="{style}"/>')

    def merge(self, row: int, first: int, last: int, style: int, last_row: int | None = None) -> None:
        """Merge a range whose first cell is already set; the others take its look."""
        bottom = last_row or row
        for line in range(row, bottom + 1):
            self.fill(line, range(first, last + 1), style)
        if (row, first) != (bottom, last):
            self.merges.append(f"{LETTERS[first]}{row}:{LETTERS[last]}{bottom}")

    def height(self, row: int, points: float) -> None:
        """Make a row at least so high."""
        self.heights[row] = max(points, self.heights.get(row, 0.0))

    @property
    def last_row(self) -> int:
        """The lowest row that holds a cell."""
        return max(self.cells, default=1)

    def dimension(self) -> str:
        """The used range, as readers that trust it need it."""
        widest = max((max(line) for line in self.cells.values() if line), default=1)
        return f"A1:{LETTERS[widest]}{self.last_row}"

    def xml(self) -> bytes:
        """The `sheetData` element."""
        parts = ["<sheetData>"]
        for row in sorted(self.cells.keys() | self.heights.keys()):
            height = self.heights.get(row)
            tall = f' ht="{height:g}" customHeight="1"' if height else ""
            line = self.cells.get(row, {})
            parts.append(f'<row r="{row}"{tall}>{"".join(line[column] for column in sorted(line))}</row>')
        parts.append("</sheetData>")
        return "".join(parts).encode()


def _content(value: Value) -> str:
    if value is None or value == "":
        return "/>"
    if isinstance(value, bool):
        return f' t="b"><v>{int(value)}</v></c>'
    if isinstance(value, str):
        return f' t="inlineStr"><is><t xml:space="preserve">{_text(value)}</t></is></c>'
    return f"><v>{_number(value)}</v></c>"


def _formula(formula: str, value: Value) -> str:
    text = escape(formula.removeprefix("="))
    if value is None or value == "":
        return f' t="str"><f>{text}</f><v></v></c>'  # a blank result is an empty text, as the formula gives it
    if isinstance(value, bool):
        return f' t="b"><f>{text}</f><v>{int(value)}</v></c>'
    if isinstance(value, str):
        return f' t="str"><f>{text}</f><v>{_text(value)}</v></c>'
    return f"><f>{text}</f><v>{_number(value)}</v></c>"


def _number(value: float | int) -> str:
    """All 17 digits, whole numbers without a point. Raises ValueError for what is no finite number."""
    if not math.isfinite(value):
        raise ValueError(f"{value} is no number a workbook can hold; expected a finite number")
    return repr(int(value)) if value == int(value) and abs(value) < 1e15 else repr(float(value))


def _text(value: str) -> str:
    """Text safe in XML. Raises ValueError for characters no workbook can hold."""
    if _ILLEGAL.search(value):
        raise ValueError("a control character stands in the text; expected printable text. Take it out")
    return escape(_SPELLED.sub("_x005F_", value)).replace("\r", "_x000D_")
