"""The workbook holds what record and values say: formulas with their results, all locked but the readings."""

from __future__ import annotations

import hashlib
import io
import subprocess
import sys
import zipfile
from dataclasses import replace
from pathlib import Path
from typing import Any

import example_record
import openpyxl
import pytest
from openpyxl.workbook import Workbook

from sheetcal import kinds
from sheetcal.errors import BadInput, Refused
from sheetcal.excel.reader import read
from sheetcal.excel.writer import workbook_bytes, write_workbook
from sheetcal.kinds.dates import serial
from sheetcal.kinds.glance import glances
from sheetcal.kinds.record import constant_cells, from_rows, sha256
from sheetcal.model import TABS, IssueRecord, Place

Example = tuple[IssueRecord, dict[str, Any], Any]


@pytest.fixture(scope="module")
def filled() -> Example:
    """Record, values and layout of a filled example."""
    return example_record.example()


@pytest.fixture(scope="module")
def data(filled: Example) -> bytes:
    """Its workbook."""
    return workbook_bytes(filled[0], filled[1])


@pytest.fixture(scope="module")
def stored(data: bytes) -> Workbook:
    """The workbook as a reader that never calculates sees it."""
    return openpyxl.load_workbook(io.BytesIO(data), data_only=True)


@pytest.fixture(scope="module")
def formulas(data: bytes) -> Workbook:
    """The workbook with its formulas."""
    return openpyxl.load_workbook(io.BytesIO(data))


def results(layout: Any) -> list[Place]:
    """The places that are computed."""
    return [one for one in layout.places.values() if one.field.step]


def test_every_result_has_its_formula_and_its_value(filled: Example, stored: Workbook, formulas: Workbook) -> None:
    """A reader that never calculates shows the cell function's number; the formula stands in the same cell."""
    _, values, layout = filled
    places = results(layout)
    assert len(places) > 500
    assert sum(values[one.id] is not None for one in places) > 300
    for place in places:
        assert formulas[place.tab][place.cell].value == place.formula
        assert stored[place.tab][place.cell].value == values[place.id], place.id


def test_a_blank_result_is_an_empty_text_in_the_part(filled: Example, data: bytes) -> None:
    """`<v></v>` of type text, as the formula itself would leave it: no reader takes it for a number."""
    _, values, layout = filled
    blank = next(one for one in results(layout) if values[one.id] is None and one.tab == "Results")
    part = zipfile.ZipFile(io.BytesIO(data)).read("xl/worksheets/sheet4.xml").decode()
    cell = part[part.index(f'<c r="{blank.cell}"') :].partition("</c>")[0]
    assert ' t="str"><f>' in cell
    assert cell.endswith("</f><v></v>")


def test_readings_stand_in_their_cells(filled: Example, stored: Workbook) -> None:
    """Numbers, texts, dates as serial numbers, and series from their first row down."""
    record, values, layout = filled
    sheet = stored["Readings"]
    run = {name: layout.places[f"run1.{name}"] for name in ("crucible_gross", "operator", "date", "start")}
    assert sheet[run["crucible_gross"].cell].value == 11.8227
    assert sheet[run["operator"].cell].value == "MR"
    assert sheet[run["start"].cell].value == "09:05"
    assert sheet[run["date"].cell].value.date().isoformat() == "2025-03-03"
    series = layout.places["run1.record_temperature"]
    column = [one[0].value for one in stored["Records"][series.cell]]
    assert [one for one in column if one is not None] == values["run1.record_temperature"]
    assert record.prefilled["sample1.client"] == sheet[layout.places["sample1.client"].cell].value


def test_the_front_page_shows_each_sample_at_a_glance(filled: Example, stored: Workbook) -> None:
    """Runs counted, the reported figures and what is next stand on one row a sample, as on Results."""
    _, values, layout = filled
    shown = {one.cell: one for one in glances(layout)}
    assert len(shown) == 14
    for cell, one in shown.items():
        assert stored["Front"][cell].value == one.value(values), cell
    names = [place.field.name for one in glances(layout)[:7] for place in one.places[:1]]
    assert {"counted_runs", "gross_dry_reported", "net_p_as_received_reported_mj", "what_next"} <= set(names)
    assert values["sample1.gross_dry_reported"] in {stored["Front"][cell].value for cell in shown}


def test_warnings_at_a_glance() -> None:
    """STOP outweighs any other warning; a void run's are passed over; nothing said is blank."""
    one = next(one for one in glances(example_record.example()[2]) if one.warns)
    first, other = one.places[0].id, one.places[1].id
    assert first.startswith("run1.") and other.startswith("run2.")
    assert one.value({}) is None
    assert one.value({first: "aid chosen: its mass is missing"}) == "warning"
    assert one.value({first: "aid chosen: its mass is missing", other: "STOP: take some out"}) == "STOP"
    assert one.value({other: "STOP: take some out", "run2.state": "void"}) is None


def test_seventeen_digits_survive(filled: Example) -> None:
    """A reading keeps every digit of its double."""
    record, values, layout = filled
    place = layout.places["run1.crucible_tare"]
    odd = 10.821400000000001
    book = openpyxl.load_workbook(io.BytesIO(workbook_bytes(record, {**values, place.id: odd})))
    assert book[place.tab][place.cell].value == odd


def test_only_readings_are_unlocked(filled: Example, formulas: Workbook) -> None:
    """Every reading that nobody printed can be typed, and nothing else; each tab and the structure are protected."""
    record, _, layout = filled
    expected = set()
    for place in layout.places.values():
        if not place.field.locked and place.id not in record.locked:
            cells = formulas[place.tab][place.cell]
            column = [one[0] for one in cells] if isinstance(cells, tuple) else [cells]
            expected |= {(place.tab, one.coordinate) for one in column}
    areas = {(tab, str(area)) for tab in TABS for area in formulas[tab].merged_cells.ranges}
    opened = {
        (sheet.title, cell.coordinate)
        for sheet in formulas.worksheets
        for row in sheet.iter_rows()
        for cell in row
        if not cell.protection.locked and type(cell).__name__ == "Cell"
    }
    assert len(opened) > 500
    assert areas
    assert opened == expected
    assert all(formulas[tab].protection.sheet and not formulas[tab].protection.password for tab in TABS)
    assert formulas.security.lockStructure


def test_tabs_names_and_properties(filled: Example, formulas: Workbook, data: bytes) -> None:
    """Tabs in the contract's order, the last hidden; constants have names; id and hash can be read from outside."""
    record, _, layout = filled
    assert tuple(formulas.sheetnames) == TABS
    assert [formulas[tab].sheet_state for tab in TABS] == ["visible"] * 6 + ["hidden"]
    assert {name: one.attr_text for name, one in formulas.defined_names.items()} == layout.names
    assert formulas.custom_doc_props["sheetcal_issue_id"].value == record.issue_id
    assert formulas.custom_doc_props["sheetcal_record_sha256"].value == sha256(record)
    assert formulas.calculation.fullCalcOnLoad
    archive = zipfile.ZipFile(io.BytesIO(data))
    assert b"<Application>sheetcal</Application>" in archive.read("docProps/app.xml")


def test_constants_and_tables_stand_where_the_record_says(filled: Example, stored: Workbook) -> None:
    """Every constant and table cell holds its value; a date is a date."""
    record, _, layout = filled
    sheet, count = stored["Constants"], 0
    for one, cell, value, kind in constant_cells(layout.kind, record):
        found = sheet[cell].value
        if kind == "date" and hasattr(found, "isoformat"):
            found = serial(found.isoformat())
        assert found == value, one
        count += 1
    assert count > 100
    heads = [sheet.cell(4, column).value for column in range(1, 8)]
    assert heads[1:] == ["what it is", "value", "unit", "standing", "valid until", "source"]
    assert all(sheet.cell(row, 5).value and sheet.cell(row, 7).value for row in range(5, 5 + len(record.constants)))


def test_how_computed_explains_every_function_used(filled: Example, stored: Workbook) -> None:
    """Each cell function of the kind has a line with equation, source and standing."""
    sheet = stored["How computed"]
    lines = {row[0]: row for row in sheet.iter_rows(min_row=5, values_only=True) if row[0]}
    used = {one.field.step.cell for one in results(filled[2]) if one.field.step.cell}
    assert len(used) > 40
    for name in used:
        assert all(lines[name][column] for column in (1, 2, 3, 4, 5, 6, 7)), name


def test_the_issue_record_comes_back(filled: Example, stored: Workbook) -> None:
    """The hidden tab alone rebuilds the record, its hash intact."""
    rows = [(str(key), str(text or "")) for key, text in stored["Issue record"].iter_rows(max_col=2, values_only=True)]
    record, intact = from_rows(rows, "test")
    assert intact
    assert sha256(record) == sha256(filled[0])


def test_our_own_reader_agrees(filled: Example, tmp_path: Path) -> None:
    """The reader that will check the file sees the same formulas and results."""
    record, values, layout = filled
    path = tmp_path / "book.xlsx"
    write_workbook(record, values, path)
    seen = read(path)
    for place in results(layout):
        _, value, formula = seen.cells[place.tab][place.cell]
        assert formula == place.formula
        assert (None if value == "" else value) == values[place.id]
    assert seen.properties["sheetcal_issue_id"] == record.issue_id
    assert [tab for tab, _ in seen.tabs] == list(TABS)


def test_nothing_is_left_over(filled: Example) -> None:
    """A workbook written without values holds no reading of the one written before."""
    record, _, layout = filled
    book = openpyxl.load_workbook(io.BytesIO(workbook_bytes(record, {})), data_only=True)
    for place in layout.places.values():
        cells = book[place.tab][place.cell]
        found = [one[0].value for one in cells] if isinstance(cells, tuple) else [cells.value]
        expected = record.prefilled.get(place.id) if not place.field.step else None
        assert found[0] == expected, place.id
        assert not any(found[1:])


def test_same_record_and_values_same_bytes(filled: Example, data: bytes) -> None:
    """Also in another process, whose hashes of texts differ."""
    script = (
        "import sys, hashlib; sys.path.insert(0, sys.argv[1]); import example_record;"
        "from sheetcal.excel.writer import workbook_bytes; record, values, _ = example_record.example();"
        "sys.stdout.write(hashlib.sha256(workbook_bytes(record, values)).hexdigest())"
    )
    here = str(Path(__file__).parent)
    other = subprocess.run([sys.executable, "-c", script, here], capture_output=True, text=True, check=True)
    assert other.stdout == hashlib.sha256(data).hexdigest()


def test_a_locked_value_of_the_record_rules(filled: Example) -> None:
    """What the issue locked cannot be changed by the values; what it only proposed can."""
    record, _, layout = filled
    values = {"sample1.total_moisture": 50.0, "run1.end_of_main": 15.0}
    book = openpyxl.load_workbook(io.BytesIO(workbook_bytes(record, values)))
    assert book["Readings"][layout.places["sample1.total_moisture"].cell].value == 11.2
    assert book["Records"][layout.places["run1.end_of_main"].cell].value == 15.0


def test_text_stays_text(filled: Example, tmp_path: Path) -> None:
    """A text that looks like a formula, and a number typed as text, come back as the text they are."""
    record, _, layout = filled
    values = {"run1.remarks": '=HYPERLINK("x")', "run1.crucible_tare": "10,8214", "run2.remarks": "_x0041_ & <b>"}
    path = tmp_path / "book.xlsx"
    write_workbook(record, values, path)
    seen = read(path)
    for one, text in values.items():
        place = layout.places[one]
        assert seen.cells[place.tab][place.cell] == ("s", text, None)


@pytest.mark.parametrize("bad", [float("nan"), float("inf"), "bell \x07"])
def test_what_no_workbook_can_hold_is_refused(filled: Example, bad: object) -> None:
    """One line that names the cell."""
    with pytest.raises(BadInput, match=r"Readings!E\d+: .*expected"):
        workbook_bytes(filled[0], {"run1.crucible_tare": bad})  # type: ignore[dict-item]


def test_an_existing_output_is_refused_unless_forced(filled: Example, tmp_path: Path) -> None:
    """And stays as it was."""
    path = tmp_path / "book.xlsx"
    path.write_bytes(b"mine")
    with pytest.raises(Refused, match="exists already"):
        write_workbook(filled[0], {}, path)
    assert path.read_bytes() == b"mine"
    write_workbook(filled[0], {}, path, force=True)
    assert zipfile.is_zipfile(path)
    assert [one.name for one in tmp_path.iterdir()] == ["book.xlsx"]


def test_an_unwritable_output_leaves_nothing(filled: Example, tmp_path: Path) -> None:
    """A missing folder, a folder in place of a file: one line, nothing half-written."""
    with pytest.raises(BadInput, match=r"cannot be written .*expected a folder"):
        write_workbook(filled[0], {}, tmp_path / "absent" / "book.xlsx")
    (tmp_path / "book.xlsx").mkdir()
    with pytest.raises(BadInput, match="cannot be written"):
        write_workbook(filled[0], {}, tmp_path / "book.xlsx", force=True)
    assert [one.name for one in tmp_path.iterdir()] == ["book.xlsx"]
    assert not list((tmp_path / "book.xlsx").iterdir())


def test_a_failed_write_keeps_the_old_file(filled: Example, tmp_path: Path) -> None:
    """A value that cannot be written is found before the output is touched."""
    path = tmp_path / "book.xlsx"
    path.write_bytes(b"old")
    with pytest.raises(BadInput):
        write_workbook(filled[0], {"run1.crucible_tare": float("nan")}, path, force=True)
    assert path.read_bytes() == b"old"


def test_a_record_longer_than_its_room_is_refused(filled: Example) -> None:
    """No reading is dropped in silence."""
    with pytest.raises(BadInput, match=r"run1.record_time: 61 readings; expected at most 60"):
        workbook_bytes(filled[0], {"run1.record_time": [float(number) for number in range(61)]})


@pytest.mark.parametrize("name", kinds.names())
def test_every_kind_is_written(name: str) -> None:
    """Thirty run places and seven bodies: heads, columns, charts and formulas follow."""
    kind = kinds.load(name)
    size = replace(
        example_record.shape(), samples=2 if "sample" in kind.scopes else 0, runs=15 if "sample" in kind.scopes else 30,
        spare=0, bodies=7, constants=tuple(kind.constants),
        table_rows=tuple((table, len(example_record.TABLES.get(table, ()))) for table in kind.tables),
    )  # fmt: skip
    record = example_record.record(
        size, kind=name, constants=example_record.constants(size.constants), prefilled={}, locked=()
    )
    book = openpyxl.load_workbook(io.BytesIO(workbook_bytes(record, {})))
    layout = kinds.skeleton(kind, size)
    records = [one for one in layout.blocks if one.tab == "Records"]
    assert len(book["Records"]._charts) == 2 * len(records)
    assert book["Records"].sheet_state == ("visible" if records else "hidden")
    for one in glances(layout):
        assert book[one.tab][one.cell].value == one.formula
        assert len(one.formula) < 8000
    for place in results(layout):
        assert book[place.tab][place.cell].value == place.formula
