"""On paper nothing is cut: every page carries issue id and page number, every number fits its column."""

from __future__ import annotations

import io
import re
from itertools import pairwise
from pathlib import Path
from typing import Any

import example_record
import openpyxl
import pytest
from openpyxl.utils import get_column_letter
from openpyxl.workbook import Workbook

from sheetcal.excel.textfit import lines
from sheetcal.excel.writer import workbook_bytes

PRINTED = ("Front", "Readings", "Records", "Results", "Constants", "How computed")


@pytest.fixture(scope="module")
def example() -> tuple[Any, Any, Any]:
    """Record, values and layout of a filled example."""
    return example_record.example()


@pytest.fixture(scope="module")
def book(example: tuple[Any, Any, Any]) -> Workbook:
    """Its workbook, values stored."""
    return openpyxl.load_workbook(io.BytesIO(workbook_bytes(example[0], example[1])), data_only=True)


def test_every_page_says_what_it_is(book: Workbook) -> None:
    """Header with issue id, kind and profile; footer with the laboratory and page n of m; heads repeat."""
    for tab in PRINTED:
        sheet = book[tab]
        assert sheet.oddHeader.left.text == "b7k2m-9qxfd-h4t8w-n3c6r"
        assert "fuel 1, profile iso-1928 1" in sheet.oddHeader.right.text
        assert sheet.oddFooter.left.text.startswith("Ollerby Wharf")
        assert sheet.oddFooter.right.text == "page &P of &N"
        assert sheet.print_title_rows == ("$1:$4" if tab == "How computed" else "$1:$3")
        assert (sheet.page_setup.fitToWidth, sheet.page_setup.fitToHeight) == (1, 1 if tab == "Front" else 0)
        if not sheet.sheet_properties.pageSetUpPr.fitToPage:  # shrunk to save a page: its columns still fit
            paper = 842 if sheet.page_setup.orientation == "landscape" else 595
            last = 6 if tab == "Records" else sheet.max_column
            columns = sum((7 * column_width(sheet, column) + 5) * 0.75 for column in range(1, last + 1))
            scale = sheet.page_setup.scale / 100
            assert columns * scale <= paper - 72 * (sheet.page_margins.left + sheet.page_margins.right)
            assert scale > 0.5


@pytest.mark.parametrize(("paper", "code"), [("A4", 9), ("Letter", 1)])
def test_paper_is_what_was_asked_for(example: tuple[Any, Any, Any], paper: str, code: int) -> None:
    """A4 and Letter; an ampersand in a laboratory's name is no field."""
    record = example_record.record(settings={"paper": paper}, lab_name="Smith & Sons")
    book = openpyxl.load_workbook(io.BytesIO(workbook_bytes(record, {})))
    assert {sheet.page_setup.paperSize for sheet in book.worksheets if sheet.sheet_state == "visible"} == {code}
    assert {book[tab].oddFooter.left.text for tab in PRINTED} == {"Smith && Sons"}


def test_pages_end_between_samples_and_between_records(example: tuple[Any, Any, Any], book: Workbook) -> None:
    """Sample 2 and each record begin a page."""
    blocks = example[2].blocks
    for tab in ("Readings", "Results", "Records"):
        ends = {one.id for one in book[tab].row_breaks.brk}
        listed = [one for one in blocks if one.tab == tab]
        for before, after in pairwise(listed):
            if tab == "Records" or before.sample != after.sample:
                assert after.title_row - 1 in ends
        assert len(listed) > 1


@pytest.mark.parametrize(("paper", "width", "height"), [("A4", 595, 842), ("Letter", 612, 792)])
def test_a_record_fits_on_one_page(example: tuple[Any, Any, Any], paper: str, width: int, height: int) -> None:
    """At the scale of the tab neither its rows nor its columns run over, and it can still be read."""
    record = example_record.record(settings={"paper": paper})
    sheet = openpyxl.load_workbook(io.BytesIO(workbook_bytes(record, {})))["Records"]
    scale = sheet.page_setup.scale / 100
    assert 0.66 <= scale < 1
    margins = sheet.page_margins
    for block in (one for one in example[2].blocks if one.tab == "Records"):
        listed = [1, 2, 3, *range(block.title_row, block.last_row + 1)]
        need = sum(sheet.row_dimensions[row].height or sheet.sheet_format.defaultRowHeight for row in listed)
        assert need * scale <= height - 72 * (margins.top + margins.bottom)
    columns = sum((7 * column_width(sheet, column) + 5) * 0.75 for column in range(1, 7))
    assert columns * scale <= width - 72 * (margins.left + margins.right)


def printed_runs(values: dict[str, Any]) -> tuple[set[int], Any]:
    """The runs whose records are printed, and the cell of the line that every page repeats."""
    record, _, layout = example_record.example()
    book = openpyxl.load_workbook(io.BytesIO(workbook_bytes(record, values)))["Records"]
    rows = {int(area.rpartition(":")[0].rpartition("!")[2].replace("$", "")[1:]) for area in book.print_area.split(",")}
    blocks = [one for one in layout.blocks if one.tab == "Records"]
    return {one.run for one in blocks if one.title_row in rows}, book["A3"]


def test_spare_records_wait_unprinted_but_never_in_silence() -> None:
    """A blank form prints the runs to do and one spare; later what was begun; the repeated line watches the rest."""
    runs, line = printed_runs({})
    assert runs == {1, 2, 3, 5, 6}
    assert line.value.startswith("=IF(COUNT(") and "NOT EVERYTHING IS PRINTED" in line.value
    assert printed_runs({"run1.record_time": [0.0], "run1.crucible_tare": 10.9})[0] == {1, 2, 5, 6}
    begun = {"run2.crucible_tare": 10.9, "run4.record_time": [0.0], "run4.state": "valid"}
    assert printed_runs(begun)[0] == {1, 4, 5, 6}


@pytest.mark.office
def test_a_record_begun_outside_the_print_range_is_announced(tmp_path: Path, convert: Any) -> None:
    """LibreOffice computes the line: silent while nothing waits unprinted, loud once a spare record is begun."""
    record, values, layout = example_record.example()
    spare = layout.places["run3.record_time"].cell.partition(":")[0]
    book = openpyxl.load_workbook(io.BytesIO(workbook_bytes(record, values)))
    book.save(tmp_path / "quiet.xlsx")
    book["Records"][spare] = 0.5
    book.save(tmp_path / "begun.xlsx")
    convert([tmp_path / "quiet.xlsx", tmp_path / "begun.xlsx"], "xlsx", tmp_path / "again")
    said = [
        openpyxl.load_workbook(tmp_path / "again" / f"{name}.xlsx", data_only=True)["Records"]["A3"].value
        for name in ("quiet", "begun")
    ]
    assert said[0].startswith("Typed, or filled from the logger")
    assert said[1].startswith("NOT EVERYTHING IS PRINTED")


def test_lines_that_do_not_apply_are_greyed(example: tuple[Any, Any, Any], book: Workbook) -> None:
    """On a record whose rise comes from readings, the hand form, the instrument and the rest are grey, labels too."""
    places = example[2].places
    rules = [
        (str(area.sqref), rule.formula[0])
        for area in book["Records"].conditional_formatting
        for rule in area.rules
        if rule.formula[0].startswith("AND($F") and "<>" in rule.formula[0]
    ]
    source = places["run1.rise_source"].row
    for name, choice in (
        ("three_time_a", "three readings"),
        ("instrument_rise", "instrument"),
        ("firing_time", "record"),
    ):
        row = places[f"run1.{name}"].row
        formula = next(formula for area, formula in rules if f"C{row}:F{row}" in area.split())
        assert formula == f'AND($F${source}<>"",$F${source}<>"{choice}")'
    assert not any(f"C{places['run1.corrected_rise'].row}:" in area for area, _ in rules)


def shown(value: object, form: str) -> str:
    """A number or date as the format shows it."""
    if hasattr(value, "isoformat"):
        return "2025-03-03 09:20" if "hh" in form else "2025-03-03"
    decimals = re.search(r"0\.(0+)", form)
    return f"{value:.{len(decimals[1]) if decimals else 0}f}" if form != "General" else f"{value:.10g}"


def test_no_number_is_wider_than_its_column(book: Workbook) -> None:
    """Numbers and dates that do not fit would show as ###."""
    count = 0
    for tab in PRINTED:
        sheet = book[tab]
        for row in sheet.iter_rows(max_col=26):
            for cell in row:
                if type(cell).__name__ != "Cell" or cell.data_type not in ("n", "d") or cell.value is None:
                    continue
                if sheet.title == "Records" and cell.column > 6:
                    continue  # the chart's own numbers stand beside the printed page
                width = sheet.column_dimensions[get_column_letter(cell.column)].width
                text = shown(cell.value, cell.number_format)
                assert len(text) * cell.font.size / 10.0 <= width - 0.7, (tab, cell.coordinate, text, width)
                count += 1
    assert count > 1000


def test_no_wrapped_text_is_taller_than_its_row(book: Workbook) -> None:
    """Every text that wraps has the height it needs over the columns it may use."""
    count = 0
    for tab in PRINTED:
        sheet = book[tab]
        merged = {area.coord.split(":")[0]: area for area in sheet.merged_cells.ranges}
        for row in sheet.iter_rows():
            for cell in row:
                if not isinstance(cell.value, str) or not cell.alignment.wrap_text:
                    continue
                area = merged.get(cell.coordinate)
                columns = range(area.min_col, area.max_col + 1) if area else [cell.column]
                rows = range(area.min_row, area.max_row + 1) if area else [cell.row]
                room = sum(column_width(sheet, column) for column in columns)
                tall = sum(sheet.row_dimensions[one].height or sheet.sheet_format.defaultRowHeight for one in rows)
                need = lines(cell.value, room, cell.font.size) * cell.font.size * 1.16
                assert need <= tall + 0.5, (tab, cell.coordinate, cell.value, need, tall)
                count += 1
    assert count > 1000


def column_width(sheet: Any, column: int) -> float:
    """The width of a column; openpyxl keeps equal neighbours under the first of them."""
    for one in sheet.column_dimensions.values():
        if one.min and one.min <= column <= one.max:
            return float(one.width)
    return float(sheet.column_dimensions[get_column_letter(column)].width)


def test_numbers_of_fields_are_the_same_on_every_tab_and_sample(example: tuple[Any, Any, Any], book: Workbook) -> None:
    """Each line has one number, unlike any other's, in every sample and run."""
    seen: dict[str, int] = {}
    for place in example[2].places.values():
        if place.field.beside or place.field.series:
            continue
        number = book[place.tab].cell(place.row, 3 if place.tab == "Records" else 1).value
        assert seen.setdefault(place.field.key, number) == number
    assert len(set(seen.values())) == len(seen) > 150
