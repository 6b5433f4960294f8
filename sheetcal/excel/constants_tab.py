"""The Constants tab: named constants with what an assessor asks of each, then the look-up tables."""

from __future__ import annotations

from sheetcal.excel import pages
from sheetcal.excel.book import Book
from sheetcal.excel.grid import head_height, heads
from sheetcal.excel.textfit import INSET, LEAST, height, width
from sheetcal.kinds.dates import FAR, NEVER, serial
from sheetcal.kinds.display import number_format
from sheetcal.kinds.layout import FIRST_ROW, column_letter
from sheetcal.kinds.record import constant_cells
from sheetcal.kinds.words import shown_unit
from sheetcal.model import Value

TAB = "Constants"
HEADS = ("name in formulas", "what it is", "value", "unit", "standing", "valid until", "source")
FIRST_WIDTHS = [25.0, 36.0, 14.0, 11.0, 11.0, 11.0]  # the source takes all columns that follow
SOURCE_WIDTH = 44.0
TEXT_WIDTH, DATE_WIDTH, NUMBER_WIDTH = 13.0, 11.0, 8.0  # of columns as the tables need them
WORDS = {serial(FAR): '"no end"', serial(NEVER): '"never"'}  # dates that stand for a word
NOTE = "Printed at issue from the method profile and the laboratory's file. Formulas use the names."
SIZE = 9.0
LONG = 12  # characters of a number nobody typed


def draw(book: Book) -> None:
    """Draw constants and tables."""
    sheet, rows = book.sheet(TAB), book.tables[TAB]
    widths = _widths(book)
    heads(book, TAB, TAB, NOTE, widths)
    for number, each in enumerate(widths, start=1):
        sheet.column_dimensions[column_letter(number)].width = each
    for column, text in enumerate(HEADS, start=1):
        rows.put(FIRST_ROW, column, book.looks("cell_head"), text)
    rows.merge(FIRST_ROW, len(HEADS), len(widths), book.looks("cell_head"))
    stretches = _constants(book, widths)
    stretches += _tables(book, widths)
    pages.set_up(sheet, book.record, f"{book.kind.title}: {TAB}", widths)
    pages.breaks(sheet, book.record, widths, stretches, rows.heights, head_height(book, TAB))


def _widths(book: Book) -> list[float]:
    """Widths of the columns: what constants and tables need, and no more."""
    widths = [*FIRST_WIDTHS, NUMBER_WIDTH]
    for columns in book.kind.tables.values():
        for number, column in enumerate(columns):
            name, _, unit = column.partition(":")
            least = {"text": TEXT_WIDTH, "date": DATE_WIDTH}.get(unit, NUMBER_WIDTH)
            longest = max(width(word) for word in name.split("_")) + 2 * INSET
            widths += [0.0] * (number + 1 - len(widths))
            widths[number] = max(widths[number], least, longest)
    widths[-1] += max(0.0, SOURCE_WIDTH - sum(widths[len(FIRST_WIDTHS) :]))
    return widths


def _constants(book: Book, widths: list[float]) -> list[tuple[int, int, bool]]:
    rows, looks = book.tables[TAB], book.looks
    last = FIRST_ROW
    for last, one in enumerate(book.record.constants, start=FIRST_ROW + 1):
        texts: list[Value] = [
            one.name,
            one.label,
            one.value,
            shown_unit(one.unit),
            one.standing,
            one.valid_until,
            one.source,
        ]
        for column, text in enumerate(texts, start=1):
            rows.put(last, column, looks("cell_value" if column == 3 else "cell_text"), text)
        rows.merge(last, len(texts), len(widths), looks("cell_text"))
        room = [*FIRST_WIDTHS, sum(widths[len(FIRST_WIDTHS) :])]
        rows.height(last, max(height(str(text), each, SIZE) for text, each in zip(texts, room, strict=True)))
    return [(row, row - 1, False) for row in range(FIRST_ROW, last + 1)]


def _tables(book: Book, widths: list[float]) -> list[tuple[int, int, bool]]:
    """Titles and heads by the layout's rule, then every cell the record names."""
    rows, looks = book.tables[TAB], book.looks
    for one, cell, value, kind in constant_cells(book.kind, book.record):
        if one.startswith("table."):
            row, column = _at(cell)
            look = "cell_given" if kind == "text" else "cell_value"
            word = WORDS.get(value) if kind == "date" and isinstance(value, float | int) else None
            shown = word or {"date": number_format(None, "date"), "text": "@"}.get(kind) or _digits(value)
            rows.put(row, column, looks(look, shown), value)
            rows.height(row, height(str(value), widths[column - 1], SIZE) if kind == "text" and value else LEAST)
    found = []
    sizes = dict(book.skeleton.shape.table_rows)
    for table, columns in book.kind.tables.items():
        first = _at(book.skeleton.names[f"{table}_{columns[0].partition(':')[0]}"].partition("!")[2])[0]
        last = first + max(1, sizes.get(table, 0)) - 1
        _table_heads(book, table, first, last, widths)
        found.append((first - 2, last, False))
    return found


def _table_heads(book: Book, table: str, first: int, last: int, widths: list[float]) -> None:
    rows, looks = book.tables[TAB], book.looks
    title = table.replace("_", " ")
    rows.put(first - 2, 1, looks("block"), f"{title[:1].upper()}{title[1:]}: looked up by its first column")
    rows.fill(first - 2, range(2, len(book.kind.tables[table]) + 1), looks("block"))
    rows.height(first - 2, 18)
    for column, head in enumerate(book.kind.tables[table], start=1):
        name, _, unit = head.partition(":")
        text = name.replace("_", " ") + (f", {shown_unit(unit)}" if unit not in ("text", "date", "1", "") else "")
        rows.put(first - 1, column, looks("cell_head"), text)
        rows.height(first - 1, height(text, widths[column - 1], SIZE))
        for row in range(first, last + 1):
            rows.fill(row, [column], looks("cell_text"))


def _digits(value: Value) -> str:
    """A number as it is, but one computed from others with four decimals: its cell still holds them all."""
    long = isinstance(value, float) and len(repr(value)) > LONG
    return "0.0000" if long and abs(float(str(value))) >= 1 else "General"


def _at(cell: str) -> tuple[int, int]:
    """Row and column of `C7` or of the upper left of `$C$7:$C$9`."""
    first = cell.partition(":")[0].replace("$", "")
    letters = first.rstrip("0123456789")
    column = 0
    for letter in letters:
        column = column * 26 + ord(letter) - 64
    return int(first[len(letters) :]), column
