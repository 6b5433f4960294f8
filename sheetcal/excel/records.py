"""The Records tab: one block per run, the series on the left, the quantities beside it, its chart below them."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace

from sheetcal.errors import BadInput
from sheetcal.excel import pages, validations
from sheetcal.excel.applies import Condition, conditions
from sheetcal.excel.book import Book
from sheetcal.excel.charts import RESIDUAL_COLUMN, ChartPrinter, RecordArea
from sheetcal.excel.driftlines import NEEDED, Drawn, drift_lines, named, residuals, titles
from sheetcal.excel.grid import REQUIRED, head_height, heads, value_height
from sheetcal.excel.marks import Marks, not_chosen
from sheetcal.excel.ranges import Area, areas
from sheetcal.excel.textfit import LEAST, height
from sheetcal.kinds.layout import RECORD_VALUE_COLUMN, BlockPlace, column_letter
from sheetcal.kinds.words import printed_label, printed_unit, shown_unit
from sheetcal.model import Place, Value

TAB = "Records"
WIDTHS = [11.0, 13.0, 6.0, 44.0, 9.0, 41.0]
SIZE, ROW = 9.0, 11.25  # letters and rows are small here, so that one record fits on one page
HELPER = 8  # H: what a helper row is, I: x, J: y
NOTE = "Typed, or filled from the logger: white framed cells. Times rise; each has its temperature; no gaps."
UNPRINTED = "NOT EVERYTHING IS PRINTED: a record outside the print range was begun. Select it and print the selection."
MOST_AREAS = 200  # in one COUNT: programs hold 255 arguments
NONE = "This kind of sheet takes no temperature records."
NUMBER, LABEL, UNIT = 3, 4, 5
Listed = dict[str, list[Place]]  # the places of each run
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
    if not blocks:
        sheet.sheet_state = "hidden"  # an empty page is paper wasted
    sheet.sheet_format.defaultRowHeight = ROW
    if blocks:
        _blocks(book, blocks)


def _blocks(book: Book, blocks: list[BlockPlace]) -> None:
    sheet = book.sheet(TAB)
    places: Listed = {}
    for place in book.places(TAB):
        places.setdefault(place.id.partition(".")[0], []).append(place)
    series = {one.field.name: one for one in places[f"run{blocks[0].run}"] if one.field.series}
    units = [shown_unit(series[name].field.unit) or "" if name in series else "" for name in NEEDED[:2]]
    charts = ChartPrinter(sheet, *units)
    for block in blocks:
        _block(book, block, places[f"run{block.run}"], charts)
    _print_ranges(book, blocks, places)
    heights = book.tables[TAB].heights
    tallest = max(sum(heights.get(row, ROW) for row in range(one.title_row, one.last_row + 1)) for one in blocks)
    pages.one_block_a_page(sheet, book.record, WIDTHS, tallest + head_height(book, TAB))
    pages.break_each(sheet, [(one.title_row, one.last_row, True) for one in blocks])
    validations.add(sheet, book.record, book.open_places(TAB))
    _marks(book, blocks, places)


def _print_ranges(book: Book, blocks: list[BlockPlace], places: Listed) -> None:
    """Print what was begun and what is still to be done; spare places wait unprinted, but never in silence.

    One spare page is printed with a blank form. Should somebody begin a record that is not printed, the line
    that every page repeats says so.
    """
    begun = {one.run for one in blocks if any(_is_typed(book, place) for place in places[f"run{one.run}"])}
    started = {one.partition(".")[0] for one, value in book.values.items() if _is_new(book, one, value)}
    spares = {one.run for one in blocks if book.is_spare(one.run or 0)}
    first_spare = [one.run for one in blocks if one.run in spares][:1] if not started else []
    printed = [
        one
        for one in blocks
        if one.run in begun or one.run in first_spare or (one.run not in spares and f"run{one.run}" not in started)
    ] or blocks[:1]
    left_out = [one for one in blocks if one not in printed]
    last = column_letter(RECORD_VALUE_COLUMN)
    book.sheet(TAB).print_area = ",".join(f"A{one.title_row}:{last}{one.last_row}" for one in printed)
    if left_out:
        areas = [one.cell for block in left_out for one in places[f"run{block.run}"] if one.field.series]
        groups = [areas[start : start + MOST_AREAS] for start in range(0, len(areas), MOST_AREAS)]
        count = "+".join(f"COUNT({','.join(group)})" for group in groups)
        look = book.looks("note")
        book.tables[TAB].put(3, 1, look, NOTE, f'=IF({count}>0,"{UNPRINTED}","{NOTE}")')


def _is_typed(book: Book, place: Place) -> bool:
    return place.field.step is None and _is_new(book, place.id, book.values.get(place.id))


def _is_new(book: Book, one: str, value: Value | list[Value]) -> bool:
    """Whether a reading holds something the issue did not print."""
    place = book.skeleton.places.get(one)
    if place is None or place.field.step or value in (None, "", []):
        return False
    return value != book.record.prefilled.get(one)


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
            unit = shown_unit(place.field.unit)
            text = place.field.label + (f", {unit}" if unit else "")
            rows.put(row + 1, place.column, looks("head"), text)
            rows.height(row + 1, height(text, WIDTHS[place.column - 1], SIZE))
    rows.height(row, 18)


def record_title(book: Book, block: BlockPlace) -> str:
    """Whose record it is: run, sample, spare or not."""
    name = book.record.prefilled.get(f"sample{block.sample}.sample_id") if block.sample else None
    parts = [f"{block.block.title} · run {block.run}" + (" spare" if book.is_spare(block.run or 0) else "")]
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
    balanced = bool(field.step and field.step.balance == "speaks")  # the line all others lead to
    rows.put(place.row, LABEL, looks("label_bold" if balanced else "label", largest=SIZE), printed_label(field))
    rows.put(place.row, UNIT, looks("unit"), printed_unit(book.record, field))
    book.put(place)
    need = max(height(field.label, WIDTHS[LABEL - 1], SIZE), value_height(book, place, WIDTHS[-1]))
    if need > LEAST:
        rows.height(place.row, need)


def _chart(book: Book, block: BlockPlace, places: dict[str, Place], charts: ChartPrinter) -> None:
    """The charts under the quantities; what they draw stands as formulas in the columns right of the printed page."""
    needed = named(places)
    if needed is None:
        return
    below = max(one.row for one in places.values() if not one.field.series) + 2
    area = RecordArea(block.first_row, book.skeleton.shape.record_rows, block.first_row + 1, below, block.last_row)
    known = {name: book.series(one) if one.field.series else book.value(one) for name, one in needed.items()}
    gate = f"{column_letter(HELPER + 1)}{area.helper - 1}"
    cells = {name: one.cell for name, one in needed.items()}
    drawn = drift_lines(cells, known, gate)
    _helpers(book, area, drawn, titles(needed))
    left_over = residuals(cells, known, gate, drawn, area.helper, area.rows)
    rows, look = book.tables[TAB], book.looks("helper")
    for offset, (x, y) in enumerate(left_over):
        rows.put(area.first + offset, RESIDUAL_COLUMN, look, x[1], x[0])
        rows.put(area.first + offset, RESIDUAL_COLUMN + 1, look, y[1], y[0])
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


def _marks(book: Book, blocks: list[BlockPlace], places: Listed) -> None:
    marks = Marks(book.sheet(TAB), book.skeleton, book.record, book.places(TAB))
    marks.looks()
    marks.usual()
    marks.words_for_numbers()
    marks.loud([Area(3, 1, 3, RECORD_VALUE_COLUMN)], f'LEFT($A$3,3)="{UNPRINTED[:3]}"')
    marks.missing(_begun(book, blocks))
    last = column_letter(RECORD_VALUE_COLUMN)
    hanging = conditions(book.kind)
    for block in blocks:
        _idle(marks, places[f"run{block.run}"], hanging)
        found = [Area(block.first_row, left, block.last_row, right) for left, right in _STRUCK]
        marks.struck(found, f'${last}${block.title_row}="void"')


def _idle(marks: Marks, places: list[Place], hanging: Mapping[str, Condition]) -> None:
    """Grey the lines of one record, labels too, that do not apply under the choice made in it."""
    by_key = {one.field.key: one for one in places}
    groups: dict[Condition, list[Place]] = {}
    for place in places:
        condition = hanging.get(place.field.key)
        if condition and condition[0] in by_key:
            groups.setdefault(condition, []).append(place)
    for (chooser, options), members in groups.items():
        other = by_key[chooser]
        cell = f"${column_letter(other.column)}${other.row}"
        lines = [replace(one, column=min(one.column, NUMBER)) for one in areas(members)]
        marks.idle(lines, not_chosen(cell, options))


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
