"""The Records tab: one block per run, the series on the left, the quantities beside it, its chart below them."""

from __future__ import annotations

from sheetcal.errors import BadInput
from sheetcal.excel import pages, validations
from sheetcal.excel.book import Book
from sheetcal.excel.charts import ChartPrinter, RecordArea
from sheetcal.excel.driftlines import NEEDED, Drawn, drift_lines, named, titles
from sheetcal.excel.grid import REQUIRED, head_height, heads, value_height
from sheetcal.excel.marks import Marks
from sheetcal.excel.ranges import Area
from sheetcal.excel.textfit import LEAST, height
from sheetcal.kinds.layout import RECORD_VALUE_COLUMN, BlockPlace, column_letter, owners
from sheetcal.model import Place, Value

TAB = "Records"
WIDTHS = [11.0, 13.0, 6.0, 44.0, 9.0, 41.0]
SIZE, ROW = 9.0, 11.25  # letters and rows are small here, so that one record fits on one page
HELPER = 8  # H: what a helper row is, I: x, J: y
NOTE = "Typed, or filled from the logger: white framed cells. Times rise; each has its temperature; no gaps."
NONE = "This kind of sheet takes no temperature records."
NUMBER, LABEL, UNIT = 3, 4, 5
_STRUCK = ((1, 2), (RECORD_VALUE_COLUMN, RECORD_VALUE_COLUMN))  # series and values, not the labels


def draw(book: Book) -> None:
    """Draw all record blocks, their charts, marks and pages."""
    sheet = book.sheet(TAB)
    blocks = [one for one in book.skeleton.blocks if one.tab == TAB]
    heads(book, TAB, TAB, NOTE if blocks else NONE, WIDTHS)
    pages.set_up(sheet, book.record, f"{book.kind.title}: {TAB}", WIDTHS)
    for number, width in enumerate(WIDTHS, start=1):
        sheet.column_dimensions[column_letter(number)].width = width
    sheet.column_dimensions[column_letter(HELPER)].width = 18
    sheet.sheet_format.defaultRowHeight = ROW
    if blocks:
        _blocks(book, blocks)


def _blocks(book: Book, blocks: list[BlockPlace]) -> None:
    sheet = book.sheet(TAB)
    places: dict[str, list[Place]] = {}
    for place in book.places(TAB):
        places.setdefault(place.id.partition(".")[0], []).append(place)
    series = {one.field.name: one for one in places[f"run{blocks[0].run}"] if one.field.series}
    units = [series[name].field.unit or "" if name in series else "" for name in NEEDED[:2]]
    charts = ChartPrinter(sheet, *units)
    for block in blocks:
        _block(book, block, places[f"run{block.run}"], charts)
    sheet.print_area = f"A1:{column_letter(RECORD_VALUE_COLUMN)}{blocks[-1].last_row}"
    heights = book.tables[TAB].heights
    tallest = max(sum(heights.get(row, ROW) for row in range(one.title_row, one.last_row + 1)) for one in blocks)
    pages.one_block_a_page(sheet, book.record, WIDTHS, tallest + head_height(book, TAB))
    room = pages.room(book.record, WIDTHS, head_height(book, TAB))
    pages.breaks(sheet, [(one.title_row, one.last_row, True) for one in blocks], heights, room, ROW)
    validations.add(sheet, book.record, book.open_places(TAB))
    _marks(book, blocks)


def _block(book: Book, block: BlockPlace, places: list[Place], charts: ChartPrinter) -> None:
    _title(book, block, places)
    for place in places:
        if place.field.series:
            _series(book, place)
        else:
            _line(book, place)
    _chart(book, block, {one.field.name: one for one in places}, charts)


def _title(book: Book, block: BlockPlace, places: list[Place]) -> None:
    rows, looks, row = book.tables[TAB], book.looks, block.title_row
    rows.put(row, 1, looks("block"), record_title(book, block))
    rows.fill(row, range(2, RECORD_VALUE_COLUMN + 1), looks("block"))
    state = book.skeleton.places.get(f"run{block.run}.state")
    if state is not None:
        where = f"{state.tab}!{state.cell}"
        rows.put(row, RECORD_VALUE_COLUMN, looks("block_right"), book.value(state), f'=IF({where}="","",{where})')
    for place in places:
        if place.field.series:
            unit = f", {place.field.unit}" if place.field.unit else ""
            text = f"{place.field.label}{unit}"
            rows.put(row + 1, place.column, looks("head"), text)
            rows.height(row + 1, height(text, WIDTHS[place.column - 1], SIZE))
    rows.height(row, 18)


def record_title(book: Book, block: BlockPlace) -> str:
    """Whose record it is: run, sample, spare or not."""
    shape = book.skeleton.shape
    turn = [run for owner, run in owners(book.kind, shape) if owner == block.sample].index(block.run or 0)
    name = book.record.prefilled.get(f"sample{block.sample}.sample_id") if block.sample else None
    parts = [f"{block.block.title} · run {block.run}" + (" spare" if turn >= shape.runs else "")]
    parts += [f"sample {block.sample}" + (f" · {name}" if name else "")] if block.sample else []
    return " · ".join(parts)


def _series(book: Book, place: Place) -> None:
    rows, style, values = book.tables[TAB], book.style(place), book.series(place)
    room = book.skeleton.shape.record_rows
    if len(values) > room:
        raise BadInput(place.id, f"{len(values)} readings", f"at most {room}", "Issue it with longer records.")
    for offset in range(room):
        value: Value = values[offset] if offset < len(values) else None
        rows.put(place.row + offset, place.column, style, value)


def _line(book: Book, place: Place) -> None:
    rows, looks, field = book.tables[TAB], book.looks, place.field
    number = book.numbers.get(field.key, 0)
    rows.put(place.row, NUMBER, looks("number", REQUIRED if field.needed == {} else "0"), number)
    rows.put(place.row, LABEL, looks("label", largest=SIZE), field.label)
    rows.put(place.row, UNIT, looks("unit"), field.unit)
    book.put(place)
    need = max(height(field.label, WIDTHS[LABEL - 1], SIZE), value_height(book, place, WIDTHS[-1]))
    if need > LEAST:
        rows.height(place.row, need)


def _chart(book: Book, block: BlockPlace, places: dict[str, Place], charts: ChartPrinter) -> None:
    """The chart under the quantities; its lines stand as formulas in the columns right of the printed page."""
    needed = named(places)
    if needed is None:
        return
    below = max(one.row for one in places.values() if not one.field.series) + 2
    area = RecordArea(block.first_row, book.skeleton.shape.record_rows, block.first_row + 1, below, block.last_row)
    known = {name: book.series(one) if one.field.series else book.value(one) for name, one in needed.items()}
    gate = f"{column_letter(HELPER + 1)}{area.helper - 1}"
    drawn = drift_lines({name: one.cell for name, one in needed.items()}, known, gate)
    _helpers(book, area, drawn, titles(needed))
    charts.add(area, titles(needed))


def _helpers(book: Book, area: RecordArea, drawn: Drawn, lines: list[str]) -> None:
    rows, look = book.tables[TAB], book.looks("helper")
    rows.put(area.helper - 1, HELPER, look, "For the chart: x, y")
    rows.put(area.helper - 1, HELPER + 1, look, drawn.ready, drawn.test)
    for number, title in enumerate(lines):
        rows.put(area.helper + 2 * number, HELPER, look, title)
    for offset, (x, y) in enumerate(drawn.points):
        rows.put(area.helper + offset, HELPER + 1, look, x[1], x[0])
        rows.put(area.helper + offset, HELPER + 2, look, y[1], y[0])


def _marks(book: Book, blocks: list[BlockPlace]) -> None:
    marks = Marks(book.sheet(TAB), book.skeleton, book.record, book.places(TAB))
    marks.looks()
    marks.usual()
    marks.missing(_begun(book, blocks))
    last = column_letter(RECORD_VALUE_COLUMN)
    for block in blocks:
        found = [Area(block.first_row, left, block.last_row, right) for left, right in _STRUCK]
        marks.struck(found, f'${last}${block.title_row}="void"')


def _begun(book: Book, blocks: list[BlockPlace]) -> dict[str, str]:
    """A record is begun once a number of its series is there, or its run is set valid."""
    found: dict[str, str] = {}
    rows = book.skeleton.shape.record_rows
    last = column_letter(RECORD_VALUE_COLUMN)
    at = {one.run: one for one in blocks}
    for place in book.places(TAB):
        block = at[int(place.id.partition(".")[0].removeprefix("run"))]
        series = f"$A{block.first_row}:$B{block.first_row + rows - 1}"
        found[place.id] = f'OR(COUNT({series})>0,${last}{block.title_row}="valid")'
    return found
