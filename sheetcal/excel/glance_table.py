"""The front page's table at a glance: one row a sample, what may be trusted and what is next."""

from __future__ import annotations

from sheetcal.excel.book import Book
from sheetcal.excel.ranges import Area
from sheetcal.excel.textfit import LINE, PAD, height
from sheetcal.kinds.display import number_format
from sheetcal.kinds.glance import FIRST_COLUMN, Glance, glances, heads, state_of
from sheetcal.kinds.layout import BlockPlace
from sheetcal.kinds.words import shown
from sheetcal.model import Value

NUMBER, NAME, LAST = 1, 2, 10  # A, B and J: the columns of the front page


def draw(book: Book, block: BlockPlace, widths: list[float]) -> None:
    """Heads, then the row of each sample (or the one row of a kind without samples)."""
    rows, looks = book.tables[block.tab], book.looks
    names = heads(block.block.shows)
    top = block.first_row - 1
    rows.put(top, NUMBER, looks("head"))
    rows.put(top, NAME, looks("head"), "sample" if block.block.scope == "sample" else "job")
    for column, name in enumerate(names, start=FIRST_COLUMN):
        rows.put(top, column, looks("head"), shown(name))
        rows.height(top, height(shown(name), widths[column - 1] if column < LAST - 1 else 99.0, 9.5))
    last = FIRST_COLUMN + len(names) - 1
    rows.merge(top, last, LAST, looks("head"))
    for row in range(block.first_row, block.last_row + 1):
        number = row - block.first_row + 1
        rows.put(row, NUMBER, looks("number", "0"), number if block.block.scope == "sample" else None)
        rows.put(row, NAME, looks("label"), _name(book, block, number))
        rows.height(row, 2 * LINE + PAD)
    for one in glances(book.skeleton):
        _cell(book, one, last)


def areas(book: Book) -> list[Area]:
    """The cells that say whether there is a warning."""
    return [Area(one.row, one.column, one.row, one.column) for one in glances(book.skeleton) if one.warns]


def _cell(book: Book, one: Glance, last: int) -> None:
    field = one.places[0].field if one.places else None
    if one.warns or field is None:
        style = book.looks("glance_warning")
    elif field.type == "text":
        style = book.looks("result_text")
    else:
        look = "reported" if field.step and field.step.reported else "result"
        style = book.looks(look, number_format(field.resolution, field.type))
    states = [book.skeleton.places.get(state_of(place)) for place in one.places]
    known: dict[str, Value] = {place.id: book.value(place) for place in (*one.places, *states) if place}
    book.tables[one.tab].put(one.row, one.column, style, one.value(known), one.formula)
    if one.column == last:
        book.tables[one.tab].merge(one.row, one.column, LAST, style)


def _name(book: Book, block: BlockPlace, number: int) -> str:
    """What a row is called: sample and its class or role, or the job."""
    printed = book.record.prefilled
    if block.block.scope != "sample":
        return str(printed.get("sheet.job") or "this workbook")
    role, kind = printed.get(f"sample{number}.role"), printed.get(f"sample{number}.fuel_class")
    parts = [printed.get(f"sample{number}.sample_id"), kind if role in (None, "sample") else role]
    return " · ".join(str(part) for part in parts if part) or f"sample {number}"
