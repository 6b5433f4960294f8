"""Odd sets: values beyond all measure, workbooks that are not checked, copies saved again, rows nobody can place."""

from __future__ import annotations

from dataclasses import replace
from datetime import datetime
from pathlib import Path
from typing import Any

import pytest
from planting import CONTROL, Book, coal, filled, issue, write
from sets_case import book, codes, laboratory, said

from sheetcal.check.sets.said import Said
from sheetcal.check.sets.summary import Summary, Tally, summary_of
from sheetcal.check.sets.together import Together, finding, joined
from sheetcal.check.submission import take_apart
from sheetcal.excel.reader import read
from sheetcal.kinds.dates import moment_of, serial
from sheetcal.model import Finding, Verdict
from sheetcal.verbs.checking import Against, check_set
from sheetcal.verbs.second import history_files, read_history, second


@pytest.fixture(scope="module")
def fuel(tmp_path_factory: pytest.TempPathFactory) -> Book:
    """A control and a coal."""
    return filled(issue("fuel", tmp_path_factory.mktemp("fuel"), [CONTROL, coal("S-1")]), 1)


def test_values_beyond_all_measure_are_no_readings(fuel: Book, tmp_path: Path) -> None:
    """1e300 g, the year 9999, times with a zone: the set is looked at and nothing breaks."""
    odd = {
        "run1.sample_mass": 1e300, "run2.sample_mass": -1e300, "run5.date": "9999-12-31", "run5.start": "23:59",
        "run6.start": "08:30+02:00", "run1.crucible_gross": None, "run2.crucible_gross": None,
    }  # fmt: skip
    for name in ("a.xlsx", "b.xlsx"):
        write(tmp_path, fuel.data({**odd, "run6.burette_end": 1.0 if name == "a.xlsx" else 2.0}), name)
    files = [str(tmp_path / name) for name in ("a.xlsx", "b.xlsx")]
    assert len(list(check_set(files, Against()))) == 2
    path = tmp_path / "a.xlsx"
    runs = {one.run: one for one in summary_of(take_apart(read(path), "a"), "a", "").runs}
    assert runs["run1"].fine == () or all(abs(value) < 1e12 for _, value, _ in runs["run1"].fine)
    assert runs["run5"].started is None and runs["run5"].day is None
    assert runs["run6"].started == datetime(2025, 3, 3, 8, 30)


def test_moments_as_people_and_programs_write_them() -> None:
    """Text with or without a leading zero, a part of a day; anything else is none."""
    day = serial("2025-03-03")
    assert moment_of(day, "7:30") == moment_of(day, "07:30") == moment_of(day, 0.3125) == datetime(2025, 3, 3, 7, 30)
    for odd in ("half past", "", None, True, "25:00", float("nan")):
        assert moment_of(day, odd) is None
    for wrong in (None, "2025-03-03", True, 1e300):
        assert moment_of(wrong, "07:30") is None


def _past(books: list[Summary]) -> list[Summary]:
    return [replace(one, checked=False) for one in books]


def test_what_is_only_at_hand_is_never_accused() -> None:
    """Overlaps, copies, twins and firings among earlier workbooks: nobody asked."""
    books = laboratory(1)
    runs = [replace(books[5].runs[0], started=run.started) for run in books[4].runs[:1]]
    tallies = (Tally("A1", datetime(2020, 1, 1), 10.0, 0.0),)
    odd = [book("x.xlsx", runs, tallies=tallies), replace(books[3], file="y.xlsx"), replace(books[3], issue_id="z")]
    assert codes(_past([*books, *odd])) == []


def test_the_checked_one_of_two_is_named() -> None:
    """Whichever was made first: a twin, an overlap and a copy stand at the file that is checked."""
    early, late = laboratory(2)[4:6]
    twin = replace(late, measured=early.measured)
    for checked, other in ((early, twin), (twin, early)):
        (one,) = [one for one in said([checked, *_past([other])]) if one.code == "readings-twice"]
        assert one.file == checked.file and other.file in one.message
    moved = replace(late, runs=(replace(late.runs[0], started=early.runs[0].started),))
    for checked, other in ((early, moved), (moved, early)):
        (one,) = [one for one in said([checked, *_past([other])]) if one.code == "runs-overlap"]
        assert one.file == checked.file and other.file in one.message


def test_revisions_share_their_readings() -> None:
    """A workbook that cites the one it revises is neither its twin nor a second set of firings."""
    first = laboratory(3)[6]
    revised = replace(first, file="revised.xlsx", issue_id="new", cites=(first.issue_id,), sha256="new")
    assert codes([first, revised]) == []


def test_the_same_readings_saved_again() -> None:
    """Other bytes, equal readings: a note at the second; at the first where that alone is checked."""
    first = laboratory(3)[6]
    again = replace(first, file="again.xlsx", sha256="other")
    (one,) = said([first, again])
    assert (one.code, one.file, one.severity) == ("workbook-copied", "again.xlsx", "note")
    (one,) = said([first, *_past([again])])
    assert one.file == first.file and "saved again" in one.message


def test_firings_are_counted_anew_from_each_count() -> None:
    """Counted again in between: only what came after the last count stands against what was left then."""
    books = laboratory(4)
    start = datetime(2025, 1, 6)
    first = Tally("A1", start, 400.0, 12.0)
    assert codes([replace(books[2], tallies=(first,)), *books[3:]]).count("vessel-out-of-service") == 88
    again = Tally("A1", datetime(2025, 1, 8), 410.0, 500.0)
    assert codes([replace(books[2], tallies=(first, again)), *books[3:]]).count("vessel-out-of-service") == 0
    assert codes([replace(books[2], tallies=(replace(first, counted=None),)), *books[3:]]) == []


def test_a_finding_without_a_place_and_one_that_is_known() -> None:
    """A place that the workbook has not is left out; what the verdict says already is not said twice."""
    one = laboratory(5)[4]
    placeless = finding(Said("control-drift", one.file, "run99.control_deviation", "m"), one)
    assert (placeless.sheet, placeless.cell, placeless.action) == (None, None, "hold")
    known = Finding("runs-overlap", "fault", "warning", "known", "Readings", "E9", "run1.start")
    told = [
        Said("runs-overlap", one.file, "run1.start", "again"),
        Said("run-copied", one.file, "run1.start", "by chance", facts={"certain": False, "false_alarm": 1e-9}),
    ]
    verdict = Verdict(one.file, "hold", findings=(known,), complete=True)
    assert joined(verdict, one, Together({one.file: told})) == verdict
    assert joined(verdict, None, Together()) is verdict


def test_history_is_read_alike_by_two_processes(fuel: Book, tmp_path: Path) -> None:
    """Files checked themselves are no history; without a folder there is none."""
    for name in ("a.xlsx", "b.xlsx", "c.xlsx"):
        write(tmp_path, fuel.data(), name)
    files = history_files(str(tmp_path), [str(tmp_path / "a.xlsx")])
    assert [Path(one).name for one in files] == ["b.xlsx", "c.xlsx"]
    assert read_history(files, None, 2) == read_history(files, None, 1)
    assert history_files(None, files) == []


def test_rows_that_cannot_be_compared_are_passed_over(fuel: Book, tmp_path: Path, capsys: Any) -> None:
    """Another unit, a quantity no sheet has, a reading the sheet has not: no finding."""
    (tmp_path / "log.csv").write_text(
        "time,instrument,run,quantity,value,unit\n"
        "2025-03-03T08:00,BAL-1,S-1 x,sample_mass,1.0,K\n"
        "2025-03-03T08:00,BAL-1,S-1 x,humidity,40,%\n"
        "2025-03-03T08:00,BAL-1,S-1 x,aid1_mass,0.1,g\n"
        "2025-03-03T08:00,CAL-A,S-1 x,rise,9.0,K\n",
        "utf-8",
    )
    path = write(tmp_path, fuel.data())
    (found,) = check_set([str(path)], Against(second=second(None, str(tmp_path / "log.csv"))))
    assert [(one.code, one.field, one.expected) for one in found.findings] == [
        ("instrument-log", "run5.corrected_rise", 9.0)
    ]
