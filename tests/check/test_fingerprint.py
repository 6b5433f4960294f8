"""The hash of the readings changes with every reading and with nothing else; what an .xls lost is told."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace
from pathlib import Path
from typing import Any

import planting
import pytest

from sheetcal.check.findings.oldformat import given_up, without_typed
from sheetcal.check.fingerprint import readings_sha256, short
from sheetcal.check.submission import Submission, take_apart
from sheetcal.excel.reader import read
from sheetcal.model import Verdict


@pytest.fixture(scope="module")
def parts(tmp_path_factory: pytest.TempPathFactory) -> Submission:
    """A filled calibration."""
    folder = tmp_path_factory.mktemp("parts")
    path = planting.write(folder, planting.filled(planting.issue("calibration", folder)).data())
    return take_apart(read(path), "book.xlsx")


def changed(parts: Submission, changes: Mapping[str, Any]) -> str:
    """The hash with some readings changed, None taking one out."""
    readings = {**parts.readings, **changes}
    return readings_sha256(
        replace(parts, readings={one: value for one, value in readings.items() if value is not None})
    )


def test_every_reading_counts(parts: Submission) -> None:
    """Each reading taken out gives another hash, and so does each changed in its last shown digit."""
    whole = readings_sha256(parts)
    found = {changed(parts, {one: None}) for one in parts.readings}
    assert whole not in found and len(found) == len(parts.readings) > 100
    numbers = {one: value for one, value in parts.readings.items() if isinstance(value, float)}
    for one, value in numbers.items():
        step = parts.skeleton.places[one].field.resolution or 1.0
        assert changed(parts, {one: value + step}) != whole, one
    series = parts.readings["run1.record_temperature"]
    assert isinstance(series, list)
    assert changed(parts, {"run1.record_temperature": [*series[:-1], None]}) != whole
    assert changed(parts, {"run1.record_temperature": [*series[1::-1], *series[2:]]}) != whole


def test_what_saving_changes_does_not_count(parts: Submission) -> None:
    """Order, digits beyond the twelfth, white space, blanks at the end, seconds that rounding adds: the same hash."""
    whole = readings_sha256(parts)
    backwards = dict(reversed(list(parts.readings.items())))
    assert readings_sha256(replace(parts, readings=backwards)) == whole
    mass, day = parts.readings["run1.crucible_gross"], parts.readings["run1.date"]
    assert isinstance(mass, float) and isinstance(day, float)
    assert changed(parts, {"run1.crucible_gross": mass * (1 + 1e-15), "run1.date": day + 1e-9}) == whole
    assert changed(parts, {"run1.remarks": "two  words "}) == changed(parts, {"run1.remarks": "two\nwords"}) != whole
    series = parts.readings["run1.record_temperature"]
    assert isinstance(series, list)
    assert changed(parts, {"run1.record_temperature": [*series, None], "run1.remarks": ""}) == whole


def test_no_value_passes_for_another(parts: Submission) -> None:
    """A number is not its text, TRUE not the word, a day out of all calendars counts, and no text forges a line."""
    values: list[Any] = [1.0, "1", True, "true", -1.0, 5e6, 'x"\nrun1.remarks="y']
    found = {changed(parts, {"run1.date": value}) for value in values}
    assert len(found) == len(values)
    assert changed(parts, {"run1.remarks": 'a"\nrun1.start="b'}) != changed(
        parts, {"run1.remarks": "a", "run1.start": "b"}
    )


def test_on_paper_it_is_short() -> None:
    assert short("0123456789abcdef" * 4) == "0123 4567 89ab cdef"


def test_formulas_given_up_by_the_old_format_are_one_note() -> None:
    """None, one, several: the first place is named."""
    assert given_up({}) == ()
    (one,), (many,) = (given_up({"lost_formulas": ["Records!F8", "Records!F9"][:count]}) for count in (1, 2))
    assert "one of its formulas" in one.message and "2 of its formulas" in many.message
    assert (one.sheet, one.cell, one.sort, one.severity) == ("Records", "F8", "note", "note")


def test_the_typed_witness_of_an_xls_says_why_it_is_silent() -> None:
    """Only where it is silent."""
    silent = Verdict("a.xls", "sound", witness_notes={"typed": "silent: no stored values"})
    assert "LibreOffice" in without_typed(silent).witness_notes["typed"]
    unread = Verdict("a.xls", "unreadable")
    assert without_typed(unread) is unread


def test_paths_do_not_count(parts: Submission, tmp_path: Path) -> None:
    """The same workbook under another name has the same hash."""
    path = planting.write(tmp_path, planting.Book(parts.skeleton, parts.record, {}).data(), "other.xlsx")
    blank = take_apart(read(path), "other.xlsx")
    assert readings_sha256(blank) == readings_sha256(take_apart(read(path), "again.xlsx")) != readings_sha256(parts)
