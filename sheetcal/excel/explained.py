"""The tab How computed: every cell function the workbook uses and every limit it judges live."""

from __future__ import annotations

from collections.abc import Mapping

from sheetcal.cells import registry
from sheetcal.excel import pages
from sheetcal.excel.book import Book
from sheetcal.excel.grid import head_height, heads
from sheetcal.excel.textfit import height
from sheetcal.kinds.layout import FIRST_ROW, column_letter
from sheetcal.kinds.words import shown
from sheetcal.model import Field, Step

TAB = "How computed"
WIDTHS = [32.0, 29.0, 39.0, 30.0, 10.0, 29.0, 11.0, 33.0]
LIMIT_HEADS = ("limit", "says", "judged when", "for each", "weight", "", "", "for line")
# each page repeats the row that fits both tables
REPEATED = (
    "function or limit",
    "gives, or says",
    "equation, or when",
    "from (unit), or for",
    "unit, or weight",
    "source",
    "standing",
    "for line",
)
NOTE = (
    "One line for each cell function used. The cells hold these equations as formulas: no macro, no add-in. "
    "Line numbers are those of the form."
)
SIZE = 9.0


def draw(book: Book) -> None:
    """Draw the functions by name, then the limits."""
    sheet = book.sheet(TAB)
    heads(book, TAB, TAB, NOTE, WIDTHS)
    for number, width in enumerate(WIDTHS, start=1):
        sheet.column_dimensions[column_letter(number)].width = width
    row = _table(book, FIRST_ROW, REPEATED, functions(book))
    last = _table(book, row + 1, LIMIT_HEADS, limits(book))
    pages.set_up(sheet, book.record, f"{book.kind.title}: {TAB}", WIDTHS)
    sheet.print_title_rows = f"1:{FIRST_ROW}"
    stretches = [(one, one - 1, False) for one in range(FIRST_ROW + 1, last)]
    heights = book.tables[TAB].heights
    pages.breaks(sheet, book.record, WIDTHS, stretches, heights, head_height(book, TAB) + heights[FIRST_ROW])


def _table(book: Book, row: int, names: tuple[str, ...], lines: list[tuple[str, ...]]) -> int:
    """Write heads and lines from `row`; the next free row."""
    rows, looks = book.tables[TAB], book.looks
    for column, name in enumerate(names, start=1):
        rows.put(row, column, looks("cell_head"), name)
    rows.height(row, max(height(name, width, SIZE) for name, width in zip(names, WIDTHS, strict=True)))
    for line in lines:
        row += 1
        for column, text in enumerate(line, start=1):
            rows.put(row, column, looks("cell_bold" if column == 1 else "cell_text"), text)
        rows.height(row, max(height(text, width, SIZE) for text, width in zip(line, WIDTHS, strict=True)))
    return row + 1


def functions(book: Book) -> list[tuple[str, ...]]:
    """One line for each cell function the kind uses, by name."""
    used: dict[str, list[Field]] = {}
    for field in book.kind.fields:
        if field.step and field.step.cell:
            used.setdefault(field.step.cell, []).append(field)
    return [_function(name, fields, book.numbers) for name, fields in sorted(used.items())]


def _function(name: str, fields: list[Field], numbers: Mapping[str, int]) -> tuple[str, ...]:
    where = "; ".join(f"{numbers[one.key]} {shown(one.label)}" for one in fields if one.key in numbers)
    step = fields[0].step
    assert step is not None
    try:
        known = registry.get(name)
    except KeyError:  # an older kind may use a function this version no longer has: the frozen kind says enough
        return _frozen(name, step, where)
    arguments = ", ".join(f"{one.name} ({shown(one.unit or 'text')})" for one in known.args)
    return (
        name, known.doc.partition("\n")[0], known.equation, arguments, shown(known.unit or "text"), known.source,
        known.standing, where,
    )  # fmt: skip


def _frozen(name: str, step: Step, where: str) -> tuple[str, ...]:
    return name, "", step.equation, ", ".join(step.args), "", step.source, "", where


def limits(book: Book) -> list[tuple[str, ...]]:
    """One line for each limit that is judged in the workbook itself."""
    where: dict[str, list[str]] = {}
    for field in book.kind.fields:
        if field.step and not field.step.cell:
            for code in field.step.args.values():
                line = f"{book.numbers.get(field.key, 0)} {shown(field.label)}"
                where.setdefault(code, []).append(line)
    return [
        (one.code, shown(one.text), one.when, one.scope, one.severity, "", "", "; ".join(where[one.code]))
        for one in book.kind.rules
        if one.code in where
    ]
