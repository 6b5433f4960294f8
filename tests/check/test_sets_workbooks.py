"""Workbooks checked together say of each other what none of them shows alone, and honest sets say nothing."""

from __future__ import annotations

import shutil
from collections.abc import Mapping, Sequence
from dataclasses import replace
from datetime import datetime, timedelta
from pathlib import Path
from typing import Any

import pytest
from planting import CONTROL, MONDAY, Book, coal, filled, lab, write
from sets_case import book, codes, laboratory

from sheetcal.inputs.worklist import read_worklist
from sheetcal.kinds.record import sha256
from sheetcal.model import Finding, IssueRecord, Verdict
from sheetcal.verbs.checking import Against, check_set
from sheetcal.verbs.issuing import Order, build
from sheetcal.verbs.second import second

SET_CODES = {
    "issue-twice", "workbook-copied", "readings-twice", "run-copied", "runs-overlap", "control-not-there",
    "control-drift", "control-apart", "unlike-earlier", "digits-preferred", "duplicates-too-close",
}  # fmt: skip


def issued(folder: Path, rows: list[dict[str, str]] | None, days: int = 0, **order: Any) -> IssueRecord:
    """An issue record of the demonstration laboratory, some days after its Monday."""
    if rows is not None:
        columns = list(dict.fromkeys(name for row in rows for name in row))
        lines = [",".join(columns), *(",".join(row.get(name, "") for name in columns) for row in rows)]
        (folder / "worklist.csv").write_text("\n".join(lines) + "\n", "utf-8")
        order["worklist"] = read_worklist(folder / "worklist.csv")
    order.setdefault("calorimeter", "CAL-A")
    return build(Order(order.pop("kind", "fuel"), lab=lab(), moment=MONDAY + timedelta(days=days), **order))


def later(book: Book, hours: int) -> dict[str, Any]:
    """The starts of all runs, some hours later on the same day; the loggers' clocks go with them."""
    moved: dict[str, Any] = {}
    for one, value in book.readings.items():
        if one.endswith(".start"):
            moved[one] = f"{int(value[:2]) + hours:02d}{value[2:]}"
        elif one.endswith(".record_start"):
            moved[one] = (datetime.fromisoformat(value) + timedelta(hours=hours)).isoformat(timespec="minutes")
    return moved


def together(
    folder: Path, past: Sequence[Path] = (), workers: int = 1, only: Sequence[Path] | None = None, **against: Any
) -> dict[str, Verdict]:
    """The verdicts on the workbooks of a folder, by file name, as `check` gives them."""
    files = sorted(str(one) for one in (only if only is not None else folder.glob("*.xlsx")))
    checked = Against(second=second(str(folder) if past else None, None), **against)
    return {Path(one.file).name: one for one in check_set(files, checked, [str(one) for one in past], workers=workers)}


def of_set(verdict: Verdict) -> list[Finding]:
    """What a verdict says because of other files."""
    return [one for one in verdict.findings if one.code in SET_CODES]


def told(verdicts: Mapping[str, Verdict]) -> list[tuple[str, str, str | None]]:
    """(file, code, field) of all that is said because of other files."""
    return [(name, one.code, one.field) for name, verdict in verdicts.items() for one in of_set(verdict)]


@pytest.fixture(scope="module")
def monday(tmp_path_factory: pytest.TempPathFactory) -> Book:
    """A control and two coals on Monday morning, CAL-A."""
    folder = tmp_path_factory.mktemp("monday")
    return filled(issued(folder, [CONTROL, coal("S-1"), coal("S-2")]), 1)


@pytest.fixture(scope="module")
def tuesday(tmp_path_factory: pytest.TempPathFactory) -> Book:
    """A control and a coal on Tuesday."""
    folder = tmp_path_factory.mktemp("tuesday")
    return filled(issued(folder, [CONTROL, coal("S-3")], 1), 2)


# --- one issue id twice ------------------------------------------------------------------------------------


def test_two_copies_both_filled(monday: Book, tmp_path: Path) -> None:
    """`(1)`: the second copy holds another length of wire. Both are rejected, each names reading and other file."""
    write(tmp_path, monday.data(), "batch.xlsx")
    write(tmp_path, monday.data({"run5.wire_left": 2.2}), "batch (1).xlsx")
    found = together(tmp_path)
    for name, other in (("batch.xlsx", "batch (1).xlsx"), ("batch (1).xlsx", "batch.xlsx")):
        (one,) = of_set(found[name])
        assert (one.code, one.field, one.action) == ("issue-twice", "run5.wire_left", "reject")
        assert f"Readings!{one.cell}" == monday.cell("run5.wire_left")
        assert other in one.message and found[name].verdict == "reject"
    (one,) = of_set(found["batch (1).xlsx"])
    assert (one.found, one.expected) == (2.2, monday.readings["run5.wire_left"])
    assert one.likely_cause is not None and "both filled" in one.likely_cause


def test_two_copies_of_which_each_was_filled_in_part(monday: Book, tmp_path: Path) -> None:
    """One sample typed into the one, the other sample into the other: neither is a stage of the other."""
    parts = [tuple(f"run{number}." for number in numbers) for numbers in ((5, 6), (9, 10))]
    for name, left_out in zip(("a.xlsx", "b.xlsx"), parts, strict=True):
        write(tmp_path, monday.data({one: None for one in monday.readings if one.startswith(left_out)}), name)
    assert {(name, code) for name, code, _ in told(together(tmp_path))} == {
        ("a.xlsx", "issue-twice"), ("b.xlsx", "issue-twice"),
    }  # fmt: skip


def test_copies_and_stages_of_one_workbook_are_notes(monday: Book, tmp_path: Path) -> None:
    """The same bytes, the blank it began as, and a half-filled state: said once, and no verdict changes."""
    half = {one: None for one in monday.readings if one.startswith(("run9.", "run10."))}
    write(tmp_path, monday.data(), "b.xlsx")
    shutil.copy(tmp_path / "b.xlsx", tmp_path / "b (1).xlsx")
    write(tmp_path, monday.data(half), "half.xlsx")
    write(tmp_path, monday.data(dict.fromkeys(monday.readings)), "blank.xlsx")
    found = together(tmp_path)
    assert {(code, field) for _, code, field in told(found)} == {("workbook-copied", "sheet.issue_id")}
    assert all(one.sort == "note" for verdict in found.values() for one in of_set(verdict))
    assert "byte for byte" in of_set(found["b.xlsx"])[0].message
    assert [found[name].verdict for name in ("b.xlsx", "b (1).xlsx")] == ["sound", "sound"]


def test_an_amendment_noted_under_corrections(monday: Book, tmp_path: Path) -> None:
    """A reading changed with its reason beside the file it was changed in: a note; without the note an error."""
    noted = {
        "run5.wire_left": 4.4, "sheet.correction1_cell": f"run5.wire_left {monday.cell('run5.wire_left')}",
        "sheet.correction1_old": "3.2", "sheet.correction1_new": "4.4", "sheet.correction1_who": "MR",
        "sheet.correction1_when": "2025-03-03", "sheet.correction1_why": "misread",
    }  # fmt: skip
    write(tmp_path, monday.data(), "first.xlsx")
    write(tmp_path, monday.data(noted), "second.xlsx")
    found = together(tmp_path)
    assert told(found) == [("second.xlsx", "workbook-copied", "sheet.issue_id")]
    assert "1 reading amended" in of_set(found["second.xlsx"])[0].message
    write(tmp_path, monday.data({"run5.wire_left": 4.4}), "second.xlsx")
    assert {code for _, code, _ in told(together(tmp_path))} == {"issue-twice"}


# --- copied readings ---------------------------------------------------------------------------------------


def test_the_same_readings_under_another_id(monday: Book, tmp_path: Path) -> None:
    """Typed once more into a fresh workbook of the same worklist: the later issue is named, its verdict stays."""
    write(tmp_path, monday.data(), "a.xlsx")
    again = issued(tmp_path, [CONTROL, coal("S-1"), coal("S-2")])
    assert again.issue_id != monday.record.issue_id
    write(tmp_path, Book(monday.plan, again, monday.readings).data(), "b.xlsx")
    found = together(tmp_path)
    assert told(found) == [("b.xlsx", "readings-twice", "sheet.issue_id")]
    (one,) = of_set(found["b.xlsx"])
    assert one.certain is False and 0.0 < float(one.false_alarm or 0.0) < 1e-3
    assert monday.record.issue_id in one.message and found["b.xlsx"].verdict == "sound"


def test_a_control_copied_from_yesterday(monday: Book, tuesday: Book, tmp_path: Path) -> None:
    """All of Monday's second control typed into Tuesday's, with Tuesday's date and time: found in Tuesday's."""
    kept = ("date", "start", "record_start", "operator")
    copied = {
        one: value for one, value in monday.readings.items() if one.startswith("run2.") and not one.endswith(kept)
    }
    write(tmp_path, monday.data(), "monday.xlsx")
    write(tmp_path, tuesday.data(copied), "tuesday.xlsx")
    found = together(tmp_path)
    assert told(found) == [("tuesday.xlsx", "run-copied", "run2.record_temperature")]
    (one,) = of_set(found["tuesday.xlsx"])
    assert one.sheet == "Records" and one.false_alarm is not None and one.false_alarm < 1e-9
    assert "monday.xlsx" in one.message and "the whole temperature record" in one.message
    alone = together(tmp_path, only=[tmp_path / "tuesday.xlsx"])
    assert told(alone) == []
    assert any("--history" in one for one in alone["tuesday.xlsx"].not_checked)
    given = together(tmp_path, only=[tmp_path / "tuesday.xlsx"], past=[tmp_path / "monday.xlsx"])
    assert told(given) == [("tuesday.xlsx", "run-copied", "run2.record_temperature")]
    assert not any("--history" in one for one in given["tuesday.xlsx"].not_checked)


# --- times, firings, controls ------------------------------------------------------------------------------


def test_runs_that_overlap(monday: Book, tmp_path: Path) -> None:
    """Two workbooks of one morning in one calorimeter; moved to the afternoon, or to the other calorimeter, nothing."""
    write(tmp_path, monday.data(), "a.xlsx")
    other = filled(issued(tmp_path, [coal("S-9")]), 5)
    write(tmp_path, other.data(), "b.xlsx")
    found = together(tmp_path)
    across = [one for verdict in found.values() for one in of_set(verdict)]
    assert {(one.code, one.certain, one.severity) for one in across} == {("runs-overlap", True, "warning")}
    assert all(one.field is not None and one.field.endswith(".start") and "CAL-A" in one.message for one in across)
    assert all(("a.xlsx" in one.message) != ("b.xlsx" in one.message) for one in across)
    assert "hold" in {one.verdict for one in found.values()}
    write(tmp_path, other.data(later(other, 5)), "b.xlsx")
    assert told(together(tmp_path)) == []
    elsewhere = filled(issued(tmp_path, [CONTROL, coal("S-9")], calorimeter="CAL-B"), 5)
    write(tmp_path, elsewhere.data(), "b.xlsx")
    assert told(together(tmp_path)) == []


def test_a_night_in_which_clocks_are_put_back() -> None:
    """02:30 comes twice in the last night of October: no overlap is claimed of it; a week before, it is."""
    for day, expected in ((26, []), (19, ["runs-overlap"])):
        first, second = (
            replace(laboratory(1).pop().runs[0], started=datetime(2025, 10, day, 2, minute)) for minute in (30, 33)
        )
        books = [book("a.xlsx", [first]), book("b.xlsx", [replace(second, fine=(), weak=())])]
        assert codes(books) == expected


def test_firings_are_counted_through_all_workbooks(tmp_path: Path) -> None:
    """A2 had 13 firings left on Monday: the fourteenth since then, in whichever workbook, is a stop."""
    books = [filled(issued(tmp_path, [CONTROL, coal(f"S-{day}"), coal(f"T-{day}")], day), day) for day in range(5)]
    for day, sheet in enumerate(books):
        write(tmp_path, sheet.data(), f"day{day}.xlsx")
    runs = [
        (day, one.partition(".")[0])
        for day, sheet in enumerate(books)
        for one, value in sorted(sheet.readings.items(), key=lambda read: str(read[0]))
        if one.endswith(".vessel") and value == "A2"
    ]
    assert len(runs) == 15
    found = together(tmp_path)
    stops = [(name, one) for name, verdict in found.items() for one in verdict.findings if one.action == "stop"]
    assert [(name, one.code, one.found) for name, one in stops] == [
        ("day4.xlsx", "vessel-out-of-service", 14.0),
        ("day4.xlsx", "vessel-out-of-service", 15.0),
    ]
    assert found["day4.xlsx"].verdict == "reject" and found["day3.xlsx"].sound
    alone = together(tmp_path, only=[tmp_path / "day4.xlsx"])
    assert alone["day4.xlsx"].sound


def test_the_control_of_the_day_in_another_workbook(monday: Book, tmp_path: Path) -> None:
    """Without it: hold, a control is missing. With the workbook that holds it, checked or as history: sound."""
    other = filled(issued(tmp_path, [coal("S-9")]), 5)
    bare = {one: None for one in other.readings if one.endswith("control_ref")}
    path = write(tmp_path, other.data({**bare, **later(other, 5)}), "b.xlsx")
    alone = together(tmp_path, only=[path])["b.xlsx"]
    assert {one.code for one in alone.findings} == {"control-missing"} and alone.verdict == "hold"
    control = write(tmp_path, monday.data(), "a.xlsx")
    assert together(tmp_path)["b.xlsx"].sound
    assert together(tmp_path, only=[path], past=[control])["b.xlsx"].sound
    void = {"run1.state": "void", "run1.void_reason": "soot", "run2.state": "void", "run2.void_reason": "soot"}
    write(tmp_path, monday.data(void), "a.xlsx")
    assert together(tmp_path)["b.xlsx"].verdict == "hold"


def test_a_control_cited_where_there_is_none(monday: Book, tuesday: Book, tmp_path: Path) -> None:
    """Tuesday's workbook is cited for a run of Monday: it holds no control of that day; Monday's does."""
    other = filled(issued(tmp_path, [coal("S-9")]), 5)
    write(tmp_path, tuesday.data(), "tuesday.xlsx")
    for cited, expected in ((tuesday, 2), (monday, 0)):
        name = f"{cited.record.issue_id} run1"
        refs = {one: name for one in other.readings if one.endswith("control_ref")}
        write(tmp_path, other.data({**refs, **later(other, 5)}), "b.xlsx")
        if cited is monday:
            write(tmp_path, monday.data(), "monday.xlsx")
        found = of_set(together(tmp_path)["b.xlsx"])
        assert [one.code for one in found] == ["control-not-there"] * expected
        assert all("tuesday.xlsx" in one.message and one.field and one.field.endswith("control_ref") for one in found)


# --- honest sets -------------------------------------------------------------------------------------------


def test_an_honest_set_says_nothing(tmp_path: Path, sizes: dict[str, Any]) -> None:
    """Controls on every sheet, one sample on two calorimeters, reserve places, a calibration, a day of shifts."""
    number = sizes["set_workbooks"]
    for day in range(number):
        calorimeter, when = ("CAL-A", "CAL-B")[day % 2], day // 2  # a day on both: the second bench
        sheet = filled(issued(tmp_path, [CONTROL, coal(f"S-{when}")], when % 6, calorimeter=calorimeter), 100 + day)
        away = later(sheet, 4) if when >= 6 else {}
        write(tmp_path, sheet.data(away), f"w{day:02d}.xlsx")
    calibration = filled(issued(tmp_path, None, -3, kind="calibration"), 7)
    write(tmp_path, calibration.data(), "cal.xlsx")
    found = together(tmp_path)
    assert len(found) == number + 1
    assert [one for one in told(found) if not one[1].startswith("control-")] == []
    assert all(one.verdict == "sound" for one in found.values() if not of_set(one))


def test_workers_and_order_change_nothing(monday: Book, tuesday: Book, tmp_path: Path) -> None:
    """Two processes, and the files named the other way round, give the same verdicts."""
    write(tmp_path, monday.data(), "a.xlsx")
    write(tmp_path, monday.data({"run5.sample_mass": 1.1111}), "b.xlsx")
    write(tmp_path, tuesday.data(), "c.xlsx")
    assert together(tmp_path) == together(tmp_path, workers=2)


def test_what_is_no_workbook_stays_unreadable_in_a_set(monday: Book, tmp_path: Path, capsys: Any) -> None:
    """A damaged file beside others gets its own verdict; as history it is counted and passed over."""
    write(tmp_path, monday.data(), "a.xlsx")
    write(tmp_path, b"no workbook", "b.xlsx")
    found = together(tmp_path)
    assert [found[name].verdict for name in ("a.xlsx", "b.xlsx")] == ["sound", "unreadable"]
    given = together(tmp_path, only=[tmp_path / "a.xlsx"], past=[tmp_path / "b.xlsx"])
    assert given["a.xlsx"].sound
    assert "1 of 1 workbooks could not be read" in capsys.readouterr().err


def test_the_register_beside_the_set(monday: Book, tmp_path: Path) -> None:
    """A record that the register knows is compared with it in a set as alone."""
    write(tmp_path, monday.data(), "a.xlsx")
    known = {monday.record.issue_id: sha256(monday.record)}
    assert together(tmp_path, register=known)["a.xlsx"].sound
    assert together(tmp_path, register={monday.record.issue_id: "other"})["a.xlsx"].verdict == "reject"
