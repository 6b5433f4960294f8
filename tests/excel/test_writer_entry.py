"""What may be typed is shown and enforced in every open cell, and limits show live where they are broken."""

from __future__ import annotations

import csv
import io
from collections.abc import Callable
from pathlib import Path
from typing import Any

import example_record
import openpyxl
import pytest
from openpyxl.workbook import Workbook
from openpyxl.worksheet.datavalidation import DataValidation

from sheetcal.excel.limits import limits_of
from sheetcal.excel.marks import is_locked
from sheetcal.excel.validations import check_of
from sheetcal.excel.writer import workbook_bytes
from sheetcal.kinds.words import shown_unit
from sheetcal.model import IssueRecord, Place

Example = tuple[IssueRecord, dict[str, Any], Any]


@pytest.fixture(scope="module")
def filled() -> Example:
    """Record, values and layout of a filled example."""
    return example_record.example()


@pytest.fixture(scope="module")
def book(filled: Example) -> Workbook:
    """Its workbook."""
    return openpyxl.load_workbook(io.BytesIO(workbook_bytes(filled[0], filled[1])))


def rules(book: Workbook, tab: str) -> dict[str, DataValidation]:
    """The validation of every cell of a tab, by address."""
    found: dict[str, DataValidation] = {}
    for rule in book[tab].data_validations.dataValidation:
        for area in rule.sqref.ranges:
            for row, column in area.cells:
                address = book[tab].cell(row, column).coordinate
                assert address not in found, "two rules over one cell"
                found[address] = rule
    return found


def open_places(filled: Example) -> list[Place]:
    """Every reading that can be typed."""
    return [one for one in filled[2].places.values() if not is_locked(filled[0], one)]


def test_every_open_reading_has_one_rule_that_shows_and_enforces(filled: Example, book: Workbook) -> None:
    """Shown on entry, refused with what was expected; locked cells have none."""
    by_tab = {tab: rules(book, tab) for tab in ("Front", "Readings", "Records")}
    covered = 0
    for place in open_places(filled):
        for cell in (
            [place.cell] if ":" not in place.cell else [one[0].coordinate for one in book[place.tab][place.cell]]
        ):
            rule = by_tab[place.tab].get(cell)
            assert rule is not None, place.id
            assert rule.showInputMessage and rule.showErrorMessage and rule.errorStyle in (None, "stop")
            assert rule.prompt and rule.error.startswith(place.field.label)
            unit = shown_unit(place.field.unit)
            if unit and place.field.type in ("number", "integer"):
                assert f"in {unit}" in rule.prompt
            covered += 1
    assert covered > 700
    assert covered == sum(len(one) for one in by_tab.values())


def test_rules_keep_to_what_programs_hold(book: Workbook) -> None:
    """Titles, messages, lists and formulas stay within a spreadsheet's limits, and rules are few."""
    for tab in ("Front", "Readings", "Records"):
        listed = book[tab].data_validations.dataValidation
        assert 0 < len(listed) < 150
        for rule in listed:
            assert len(rule.promptTitle) <= 32 and len(rule.errorTitle) <= 32
            assert len(rule.prompt) <= 255 and len(rule.error) <= 255
            assert len(rule.formula1) <= 255 and len(str(rule.sqref)) < 4000


def test_lists_come_from_the_field_or_the_table(filled: Example, book: Workbook) -> None:
    """A choice is a literal list or the named column of a table."""
    found, layout = rules(book, "Readings"), filled[2]
    assert found[layout.places["run1.state"].cell].formula1 == '"planned,valid,void,not needed"'
    assert found[layout.places["run1.vessel"].cell].formula1 == "vessel_id"
    assert "vessel_id" in book.defined_names


def test_the_record_sets_other_limits_by_id_and_by_field(filled: Example, book: Workbook) -> None:
    """One sample's hydrogen may be held tighter; a field's usual range may be the laboratory's."""
    record, _, layout = filled
    found = rules(book, "Readings")
    first, second = (layout.places[f"sample{number}.hydrogen"] for number in (1, 2))
    assert f"{first.cell}<=26" in found[first.cell].formula1
    assert f"{second.cell}<=14" in found[second.cell].formula1
    assert book["Readings"].cell(second.row, 4).value == "0 to 14"
    water = layout.places["run1.vessel_water"]
    assert limits_of(record, water).warn_high == 1.1
    assert book["Readings"].cell(water.row, 4).value == "0 to 20; usual 0.9 to 1.1"


CASES = [
    ("run1.crucible_tare", "10.8214", True),
    ("run1.crucible_tare", "1", True),
    ("run1.crucible_tare", "60", True),
    ("run1.crucible_tare", "60.0001", False),
    ("run1.crucible_tare", "0.9999", False),
    ("run1.crucible_tare", "10.82145", False),
    ("run1.crucible_tare", '"10.8214"', False),
    ("run1.burette_end", "11.35", True),
    ("run1.burette_end", "11.33", False),
    ("run1.firing_time", "7.5", True),
    ("run1.firing_time", "7.5/24", False),
    ("sample1.expected_gross", "26500", True),
    ("sample1.expected_gross", "26500.5", False),
    ("run1.start", '"08:05"', True),
    ("run1.start", '"24:05"', False),
    ("run1.start", '"8:05"', False),
    ("run1.start", '"08:60"', False),
    ("run1.start", '"noon!"', False),
]


@pytest.mark.office
def test_rules_accept_and_refuse(
    filled: Example, tmp_path: Path, convert: Callable[[list[Path], str, Path], None]
) -> None:
    """The rule of the cell itself, computed by LibreOffice for good and bad entries (a clock time is one of them)."""
    trial = openpyxl.Workbook()
    sheet = trial.active
    for row, (one, entry, _) in enumerate(CASES, start=1):
        place = filled[2].places[one]
        check = check_of(place.field, limits_of(filled[0], place))
        assert check.type == "custom"
        sheet.cell(row, 1, f"={entry}")
        sheet.cell(row, 2, f"=IF({check.formula.replace('{cell}', f'A{row}')},1,0)")
    path = tmp_path / "trial.xlsx"
    trial.save(path)
    convert([path], "csv", tmp_path)
    answers = [row[1] for row in csv.reader((tmp_path / "trial.csv").read_text("utf-8").splitlines())]
    assert len(answers) == len(CASES)
    assert [one == "1" for one in answers] == [good for _, _, good in CASES]


def marks(book: Workbook, tab: str) -> list[tuple[str, str]]:
    """(ranges, formula) of every conditional format of a tab."""
    return [(str(area.sqref), rule.formula[0]) for area in book[tab].conditional_formatting for rule in area.rules]


def test_marks_are_few_and_reach_over_all_blocks(filled: Example, book: Workbook) -> None:
    """STOP lines, usual ranges, missing readings and void runs are marked by rules over many cells."""
    layout = filled[2]
    readings = marks(book, "Readings")
    assert len(readings) < 80
    stop = next(area for area, formula in readings if "STOP" in formula)
    looks = [
        one for one in layout.places.values() if one.tab == "Readings" and one.field.step and not one.field.step.cell
    ]
    assert len(looks) >= 24
    assert sum(
        area.size["columns"] * area.size["rows"] for area in openpyxl.worksheet.cell_range.MultiCellRange(stop)
    ) == len(looks)
    wire = layout.places["run1.wire_start"]
    assert any(wire.cell in area and f"{wire.cell}<5" in formula for area, formula in readings)
    date = layout.places["run1.date"]
    assert any(
        area.startswith(date.cell) and formula.startswith(f"AND(ISBLANK({date.cell}),COUNT(")
        for area, formula in readings
    )
    assert sum('=", void"' in formula for _, formula in readings) >= 2


def test_missing_is_asked_only_where_it_is_needed(filled: Example, book: Workbook) -> None:
    """A condition printed at issue is settled at issue; one that is typed is part of the mark."""
    layout = filled[2]
    readings = {area.split(":")[0].split(" ")[0]: formula for area, formula in marks(book, "Readings")}
    titrant, burette = layout.places["run1.titrant_lot"], layout.places["run1.burette_end"]
    assert f'{burette.cell}<>""' in readings[titrant.cell]
    ash = layout.places["sample1.ash"]
    assert '"sample"' not in readings[ash.cell]
    control = example_record.record(example_record.shape(), prefilled={
        **example_record.prefilled(example_record.shape()), "sample1.role": "control", "sample2.role": "control",
    })  # fmt: skip
    other = openpyxl.load_workbook(io.BytesIO(workbook_bytes(control, {})))
    assert not any(area.startswith(ash.cell) and "ISBLANK" in formula for area, formula in marks(other, "Readings"))


def test_words_in_place_of_a_number_are_marked(filled: Example, book: Workbook) -> None:
    """A decimal comma pasted past the rule of entry shows: every open number cell, those of the records too."""
    layout = filled[2]
    for one, tab in (
        ("sheet.room_temperature", "Front"),
        ("run1.burette_end", "Readings"),
        ("run1.record_time", "Records"),
    ):
        first = layout.places[one].cell.partition(":")[0]
        listed = [area for area, formula in marks(book, tab) if formula.startswith("ISTEXT(")]
        assert any(first in openpyxl.worksheet.cell_range.MultiCellRange(area) for area in listed), one
