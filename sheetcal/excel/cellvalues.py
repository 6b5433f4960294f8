"""What one cell of an xlsx worksheet holds: raw records become (type, value, formula).

A record comes from either road of `worksheet`; here its value is held against its type. Standard library.
"""

import re
from collections.abc import Callable
from dataclasses import dataclass, field
from datetime import date, datetime, time

from sheetcal.errors import Refused
from sheetcal.excel.allowance import Allowance
from sheetcal.excel.formula_text import column_number, shift
from sheetcal.excel.gate import MAX_CELLS, MAX_WRITTEN_OUT, shown

Value = float | str | bool | None
Cell = tuple[str, Value, str | None]
# whole match, address, style, type, attributes of f, formula, number-like value, other value, inline text
Raw = tuple[str, str, str, str, str, str, str, str, str]

NUMBER = re.compile(r"[-+]?(?:[0-9]+(?:\.[0-9]*)?|\.[0-9]+)(?:[eE][-+]?[0-9]+)?")
_ATTRIBUTE = re.compile(r' ([A-Za-z0-9:]+)="([^"]*)"')
_ADDRESS = re.compile(r"([A-Z]{1,3})([1-9][0-9]{0,6})")
_ENTITY = re.compile(r"&(?:#([0-9]{1,7})|#x([0-9a-fA-F]{1,6})|(amp|lt|gt|quot|apos));")
_NAMED = {"amp": "&", "lt": "<", "gt": ">", "quot": '"', "apos": "'"}
_ESCAPE = re.compile(r"_x([0-9a-fA-F]{4})_")
_NUMBER_KINDS = ("", "n")
_PLAIN = (' aca="false"', ' aca="0"')


@dataclass
class Book:
    """What the cells of every tab share: texts, styles, the calendar, what may still come."""

    where: str
    allowance: Allowance
    strings: list[str]
    styles: frozenset[str]
    dates: frozenset[str]
    first_day: date
    open_styles: frozenset[str] = frozenset()
    cells_left: int = MAX_CELLS
    letters_left: int = MAX_WRITTEN_OUT
    unseen: frozenset[str] = frozenset()
    styled: dict[str, dict[str, str]] = field(default_factory=dict)
    faint: list[str] = field(default_factory=list)


class OffRoad(Exception):
    """The part is written in a way the fast road does not know."""


def unescape(text: str) -> str:
    """Resolve the five named and the numeric entities. Raises OffRoad on any other ampersand."""
    text = text.replace("&lt;", "<").replace("&gt;", ">").replace("&quot;", '"')
    if "&" not in text:
        return text
    left = text.count("&")
    if left == text.count("&amp;"):
        return text.replace("&amp;", "&")
    if left != len(_ENTITY.findall(text)):
        raise OffRoad
    return _ENTITY.sub(_resolved, text)


def _resolved(match: "re.Match[str]") -> str:
    if match[3]:
        return _NAMED[match[3]]
    code = int(match[1]) if match[1] else int(match[2], 16)
    if code > 0x10FFFF or 0xD800 <= code < 0xE000 or (code < 32 and code not in (9, 10, 13)):
        raise OffRoad
    return chr(code)


def plain_text(text: str) -> str:
    """Resolve the `_x000D_` spelling of characters that xlsx uses beside XML's own."""
    return _ESCAPE.sub(_character, text) if "_x" in text else text


def _character(match: "re.Match[str]") -> str:
    """Return the character of `_x000D_`; halves of a pair stay, for alone they cannot be written out."""
    code = int(match[1], 16)
    return match[0] if 0xD800 <= code < 0xE000 else chr(code)


class Sheet:
    """Turns raw records into cells, for one tab."""

    def __init__(self, tab: str, book: Book) -> None:
        self.tab = tab
        self.book = book
        self.cells: dict[str, Cell] = {}
        self.arrays: list[str] = []
        self.unlocked: list[str] = []
        self._shared: dict[str, tuple[str, str]] = {}
        self._seen: set[str] = set()
        self._count = 0
        self._styles: set[str] = {""}
        self._readers: dict[str, Callable[[Raw], tuple[str, Value]]] = {
            "": self._spaced_number,
            "n": self._spaced_number,
            "s": self._string,
            "str": self._text,
            "inlineStr": self._text,
            "b": self._bool,
            "e": self._error,
            "d": self._date,
        }

    def refuse(self, ref: str, what: str, expected: str) -> Refused:
        """Return the refusal of one cell."""
        return Refused(f"{self.book.where}, {shown(self.tab)}!{ref}", what, expected, "Save the workbook again.")

    def add(self, found: list[Raw]) -> None:
        """Take records in; empty ones only count."""
        self._take_note(found)
        filled = [raw for raw in found if raw[6] or raw[5] or raw[7] or raw[8] or raw[4]]
        self._note_looks(found, filled)
        self.book.allowance.take("letters of formulas", sum([len(raw[5]) for raw in filled]))
        cells, readers, dates = self.cells, self._readers, self.book.dates
        letters = 0  # of texts that many cells share, too: whoever shows them writes each out
        for raw in filled:
            _, ref, style, kind, attributes, formula, number, _, _ = raw
            if attributes and attributes not in _PLAIN:
                written = self._formula(ref, attributes, formula)
            else:
                written = "=" + (unescape(formula) if "&" in formula else formula) if formula else None
            if number and kind in _NUMBER_KINDS:
                cells[ref] = ("d" if style in dates else "n", self._finite(ref, number), written)
                continue
            reader = readers.get(kind)
            if reader is None:
                raise self.refuse(ref, f"the cell type {shown(kind)} is unknown", "a type of the format")
            sort, value = reader(raw)
            if isinstance(value, str):
                letters += len(value)
            if sort in ("b", "e") and written in (f"={value}", "=TRUE()", "=FALSE()"):
                written = None  # LibreOffice saves a typed TRUE or #N/A as a formula
            if written is not None or (value is not None and value != ""):
                cells[ref] = (sort, value, written)
        self.book.allowance.take("letters of text", letters)

    def _take_note(self, found: list[Raw]) -> None:
        """Count the records, hold each address to be new, keep the styles for later."""
        refs = {raw[1] for raw in found}
        self._count += len(found)
        if self._count > self.book.cells_left:
            raise Refused(self.book.where, f"holds more than {MAX_CELLS} cells", "a worksheet")
        if len(refs) != len(found) or not refs.isdisjoint(self._seen):
            raise self._doubled([raw[1] for raw in found])
        self._seen |= refs
        self._styles.update([raw[2] for raw in found])

    def _note_looks(self, found: list[Raw], filled: list[Raw]) -> None:
        """Keep what is unlocked, what shows a number or a result in which style, and what cannot be seen."""
        open_styles = self.book.open_styles
        self.unlocked += [f"{self.tab}!{raw[1]}" for raw in filled if raw[5] and raw[2] in open_styles]
        looks = {raw[1]: raw[2] for raw in filled if raw[5] or (raw[6] and raw[3] != "s")}
        if looks:
            self.book.styled.setdefault(self.tab, {}).update(looks)
        unseen = self.book.unseen
        if unseen:
            self.book.faint += [f"{self.tab}!{raw[1]}" for raw in found if raw[2] in unseen]

    def _doubled(self, refs: list[str]) -> Refused:
        """Return the refusal of a part that gives one cell twice."""
        for ref in refs:
            if ref in self._seen:
                return self.refuse(ref, "the cell is given twice", "each cell once")
            self._seen.add(ref)
        raise AssertionError("called without a doubled address")

    def done(self) -> dict[str, Cell]:
        """Return the cells after the checks that need all of them."""
        self.book.cells_left -= self._count
        wrong = self._styles - self.book.styles - {""}
        if wrong:
            raise Refused(
                f"{self.book.where}, {shown(self.tab)}",
                f"a cell has the style {shown(min(wrong))}",
                "a style the workbook defines",
                "Save the workbook again.",
            )
        return self.cells

    def _finite(self, ref: str, number: str) -> float:
        """Return the stored number; the text holds nothing but digits, signs, points and e."""
        try:
            value = float(number)
        except ValueError:
            raise self._not_number(ref, number) from None
        if value - value != 0.0:  # too large for a double
            raise self._not_number(ref, number)
        return value

    def _spaced_number(self, raw: Raw) -> tuple[str, Value]:
        """Read a number with blanks around it, or no number at all."""
        stripped = raw[7].strip(" \t\n\r")
        if not stripped:
            return "", None
        if not NUMBER.fullmatch(stripped):
            raise self._not_number(raw[1], raw[7])
        return ("d" if raw[2] in self.book.dates else "n"), self._finite(raw[1], stripped)

    def _not_number(self, ref: str, text: str) -> Refused:
        return self.refuse(ref, f"the stored value {shown(text)} is not a number", "a finite number")

    def _string(self, raw: Raw) -> tuple[str, Value]:
        if not (raw[6] or raw[7].strip()):
            return "", None
        index = raw[6] or raw[7].strip()
        if not (index.isascii() and index.isdigit() and len(index) < 8 and int(index) < len(self.book.strings)):
            raise self.refuse(
                raw[1],
                f"text number {shown(index)} is not in the workbook's list of texts",
                f"0 to {len(self.book.strings) - 1}",
            )
        return "s", self.book.strings[int(index)]

    def _text(self, raw: Raw) -> tuple[str, Value]:
        text = raw[6] or raw[7] or raw[8]
        return "s", plain_text(unescape(text) if "&" in text else text)

    def _bool(self, raw: Raw) -> tuple[str, Value]:
        text = (raw[6] or raw[7]).strip()
        if text not in ("0", "1", "true", "false", ""):
            raise self.refuse(raw[1], f"the stored value {shown(text)} is not a truth value", "0 or 1")
        return ("b", text in ("1", "true")) if text else ("", None)

    def _error(self, raw: Raw) -> tuple[str, Value]:
        text = (raw[6] or raw[7]).strip()
        if text and not text.startswith(("#", "Err:")):
            raise self.refuse(raw[1], f"the stored value {shown(text)} is not an error value", "such as #N/A")
        return ("e", text) if text else ("", None)

    def _date(self, raw: Raw) -> tuple[str, Value]:
        text = (raw[6] or raw[7]).strip()
        if not text:
            return "", None
        try:
            return "d", serial(text, self.book.first_day)
        except ValueError:
            raise self.refuse(raw[1], f"the stored value {shown(text)} is not a date", "an ISO 8601 date") from None

    def _formula(self, ref: str, attributes: str, formula: str) -> str | None:
        """Return an array's or a shared formula with its equals sign; a shared one is written out."""
        text = unescape(formula) if "&" in formula else formula
        facts = dict(_ATTRIBUTE.findall(attributes))
        kind, index = facts.get("t", "normal"), facts.get("si", "")
        if kind == "array":
            self.book.allowance.take("array formulas")
            self.arrays.append(f"{self.tab}!{facts.get('ref', ref)}")
        if kind == "shared" and text:
            self._shared[index] = (ref, text)
        elif kind == "shared":
            text = self._written_out(ref, index)
        return "=" + text if text else None

    def _written_out(self, ref: str, index: str) -> str:
        if index not in self._shared:
            raise self.refuse(ref, "the shared formula has no first cell", "a formula")
        first, text = self._shared[index]
        row, column = place(ref)
        first_row, first_column = place(first)
        self.book.letters_left -= len(text)
        if self.book.letters_left < 0:
            limit = f"at most {MAX_WRITTEN_OUT} letters"
            raise self.refuse(ref, "the shared formulas are too long together", limit)
        return shift(text, row - first_row, column - first_column)


def place(ref: str) -> tuple[int, int]:
    """Return row and column of an address, counted from 1. Raises ValueError."""
    match = _ADDRESS.fullmatch(ref)
    if not match:
        raise ValueError(ref)
    return int(match[2]), column_number(match[1])


def serial(text: str, first_day: date) -> float:
    """Return the day number, counted from `first_day`, of an ISO 8601 date or time. Raises ValueError."""
    gone = datetime.fromisoformat(text).replace(tzinfo=None) - datetime.combine(first_day, time())
    return gone.days + (gone.seconds + gone.microseconds / 1e6) / 86_400
