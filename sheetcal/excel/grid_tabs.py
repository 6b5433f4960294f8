"""The three tabs in the common grid: what a person reads first, types, and gets back."""

from __future__ import annotations

from sheetcal.excel import glance_table, pages, validations
from sheetcal.excel.applies import conditions
from sheetcal.excel.book import Book
from sheetcal.excel.front import panel
from sheetcal.excel.grid import Grid, head_height
from sheetcal.excel.marks import NUMBERS, Marks
from sheetcal.excel.ranges import Area
from sheetcal.excel.textfit import LEAST
from sheetcal.kinds.layout import VALUE_COLUMN, BlockPlace, column_letter
from sheetcal.model import Place

NOTES = {
    "Front": (
        "White cells in a dark frame are typed; everything else is printed or computed. "
        "A dot beside the number: always needed."
    ),
    "Readings": (
        "Type in the white framed cells only. A dot: always needed. Shaded: begun, but still missing. "
        "Spare columns may stay empty."
    ),
    "Results": (
        "Computed live from the readings; nothing is typed here. "
        "The name beside each line is explained on the tab How computed."
    ),
}


def draw(book: Book, tab: str) -> None:
    """Draw one of the three tabs, its marks and its pages."""
    sheet = book.sheet(tab)
    widths = column_widths(book, tab)
    span = VALUE_COLUMN + 1 if tab == "Front" else min(len(widths), VALUE_COLUMN + 3)
    grid = Grid(book, tab, widths, span, "computed by" if tab == "Results" else "allowed")
    title = book.kind.title if tab == "Front" else tab
    grid.draw(title, NOTES[tab])
    if tab == "Front":
        panel(book, grid)
    for number, width in enumerate(widths, start=1):
        sheet.column_dimensions[column_letter(number)].width = width
    pages.set_up(sheet, book.record, f"{book.kind.title}: {tab}", widths)
    rows = book.tables[tab]
    tall = sum(rows.heights.get(row, LEAST) for row in range(1, rows.last_row + 1))
    if tab != "Front" or not pages.on_one_page(sheet, book.record, widths, tall):
        pages.breaks(sheet, book.record, widths, grid.stretches, rows.heights, head_height(book, tab))
    validations.add(sheet, book.record, book.open_places(tab))
    _marks(book, tab)


def column_widths(book: Book, tab: str) -> list[float]:
    """Widths from column A: number, label, unit, allowed range, values."""
    if tab == "Front":
        return [5, 32, 9, 15, 13, 13, 12, 10, 12, 18]
    last = max((place.column for place in book.places(tab)), default=VALUE_COLUMN)
    values = max(last, VALUE_COLUMN + 2) - VALUE_COLUMN + 1
    first = [5.0, 30.0, 7.0, 20.0] if tab == "Readings" else [5.0, 38.0, 8.0, 25.0]
    return first + [14.0 if tab == "Readings" else 13.5] * values


def _marks(book: Book, tab: str) -> None:
    marks = Marks(book.sheet(tab), book.skeleton, book.record, book.places(tab))
    marks.looks()
    if tab == "Front":
        marks.warnings(glance_table.areas(book))
    marks.not_applying(conditions(book.kind))
    if tab != "Results":
        marks.usual()
        marks.words_for_numbers()
        marks.missing(_begun(book, tab))
    for found, head in _run_areas(book, tab):
        marks.struck(found, f'RIGHT({head},6)=", void"')
        if tab == "Results":
            marks.idle(found, f'OR(RIGHT({head},9)=", planned",RIGHT({head},12)=", not needed")')


def _run_areas(book: Book, tab: str) -> list[tuple[list[Area], str]]:
    """The run columns of each sample with the head over its first column, which says the state of the run."""
    found: dict[int | None, tuple[list[Area], str]] = {}
    for block in book.skeleton.blocks:
        if block.tab == tab and block.block.scope == "run" and block.block.columns == "places" and block.columns:
            area = Area(block.first_row - 1, block.columns[0], block.last_row, block.columns[-1])
            head = f"{column_letter(VALUE_COLUMN)}${block.title_row + 1}"  # the first block's: it states the state
            found.setdefault(block.sample, ([], head))[0].append(area)
    return list(found.values())


def _begun(book: Book, tab: str) -> dict[str, str]:
    """For each place the formula that says whether its run, sample or sheet was begun."""
    if tab == "Front":
        return _front_begun(book)
    found: dict[str, str] = {}
    stretch: list[BlockPlace] = []
    printed = {one.partition(".")[2] for one in book.record.prefilled if one.startswith("run")}
    telling = [one for one in book.places(tab) if _tells(one) and one.field.name not in printed]
    for block in [*book.skeleton.blocks, None]:
        if stretch and (block is None or block.sample != stretch[-1].sample or block.tab != tab):
            found |= _stretch_begun(book, stretch, telling)
            stretch = []
        if block is not None and block.tab == tab:
            stretch.append(block)
    return found


def _front_begun(book: Book) -> dict[str, str]:
    stage = book.skeleton.places.get("sheet.stage")
    if stage is None or stage.tab != "Front":
        return {}
    cell = f"$E${stage.row}"
    return {one.id: f'{cell}<>"",{cell}<>"issued"' for one in book.places("Front")}


def _stretch_begun(book: Book, stretch: list[BlockPlace], telling: list[Place]) -> dict[str, str]:
    """One sample's blocks: a run is begun once a number of its column is typed, the sample once any is."""
    rows = range(stretch[0].title_row, stretch[-1].last_row + 1)
    inside = [one for one in book.places(stretch[0].tab) if one.row in rows]
    spans = _spans(sorted({one.row for one in telling if one.row in rows}))
    columns = [column for block in stretch for column in block.columns if block.block.scope == "run"]
    if not spans or not columns:
        return {}
    last = column_letter(max(columns))
    own = {one: ",".join(f"{one}{top}:{one}{bottom}" for top, bottom in spans) for one in map(column_letter, columns)}
    every = ",".join(f"$E{top}:${last}{bottom}" for top, bottom in spans)
    return {
        one.id: f"COUNT({own[column_letter(one.column)] if one.field.scope == 'run' else every})>0" for one in inside
    }


def _tells(place: Place) -> bool:
    """Whether a number typed here shows that a run was begun."""
    return place.field.scope == "run" and not place.field.step and place.field.type in NUMBERS


def _spans(rows: list[int]) -> list[tuple[int, int]]:
    spans: list[tuple[int, int]] = []
    for row in rows:
        if spans and spans[-1][1] == row - 1:
            spans[-1] = (spans[-1][0], row)
        else:
            spans.append((row, row))
    return spans
