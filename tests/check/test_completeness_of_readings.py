"""Missing is every required reading of a required place and of a spare place begun, and nothing else."""

from pathlib import Path
from typing import Any

import pytest
from planting import CONTROL, Book, check, coal, faults, filled, issue, rewritten, write

from sheetcal.check.completeness import begun, missing, required_blocks


@pytest.fixture(scope="module")
def book(tmp_path_factory: pytest.TempPathFactory) -> Book:
    """A control and one coal, two runs each and a reserve place."""
    return filled(issue("fuel", tmp_path_factory.mktemp("issue"), [CONTROL, coal("S-1")], spare=1))


def lacking(book: Book, changes: dict[str, Any]) -> list[str]:
    """What is missing of the filled workbook with changes."""
    whole = {**book.record.prefilled, **book.readings, **changes}
    filled_in = {one: value for one, value in whole.items() if value is not None}
    return missing(book.plan.kind, book.plan, book.record, filled_in)


def test_a_filled_workbook_lacks_nothing_and_its_reserve_place_may_stay_empty(book: Book) -> None:
    assert lacking(book, {}) == []


def test_conditions_of_need(book: Book) -> None:
    """What one reading asks of another, in both directions."""
    assert lacking(book, {"run4.burette_end": 7.0, "run4.titrant_lot": None}) == ["run4.titrant_lot"]
    assert lacking(book, {"run4.wire_left": None}) == ["run4.wire_left"]
    assert lacking(book, {"run4.wire_left": None, "run4.wire_start": None, "run4.fuse_lot": None}) == []
    assert lacking(book, {"run4.aid1_lot": "SO-1"}) == ["run4.aid1_mass"]
    assert lacking(book, {"run4.crucible_gross": None}) == ["run4.sample_mass"]
    instrument = {"run4.rise_source": "instrument", "run4.record_time": None, "run4.record_temperature": None}
    assert lacking(book, {**instrument, "run4.firing_time": None, "run4.end_of_main": None}) == ["run4.instrument_rise"]


def test_a_reserve_place_begun_is_a_required_one(book: Book) -> None:
    found = lacking(book, {"run6.date": "2025-03-04"})
    assert {one.partition(".")[0] for one in found} == {"run6"}
    assert "run6.vessel" in found
    assert lacking(book, {"run6.state": "not needed"}) == []


def test_a_void_run_needs_its_reason_and_its_repeat(book: Book) -> None:
    """The reserve place takes its turn; readings of the void run are needed no more."""
    void = {"run5.state": "void", "run5.oxygen_pressure": None}
    found = lacking(book, void)
    assert "run5.void_reason" in found
    assert {one.partition(".")[0] for one in found} == {"run5", "run6"}
    assert all(one.startswith("run6") for one in lacking(book, {**void, "run5.void_reason": "soot"}))


def test_gaps_in_a_series(book: Book) -> None:
    temperatures = list(book.readings["run4.record_temperature"])
    temperatures[2] = None
    temperatures[7] = ""
    assert lacking(book, {"run4.record_temperature": temperatures}) == [
        "run4.record_temperature[3]",
        "run4.record_temperature[8]",
    ]
    assert lacking(book, {"run4.record_temperature": []}) == ["run4.record_temperature"]
    assert lacking(book, {"run4.record_time": book.readings["run4.record_time"][:-1]}) == [
        f"run4.record_time[{len(temperatures)}]"
    ]


def test_what_was_printed_does_not_begin_a_block(book: Book) -> None:
    assert begun(book.record.prefilled, book.record) == set()
    assert begun({"run6.start_temperature": 22.1}, book.record) == {"run6"}
    dated = {"sample1.sample_id": "BA-31", "sample1.received": 45718.0}
    assert "sample1" in begun(dated, book.record)  # another day than the one printed, if one was
    readings = {**book.record.prefilled, **book.readings}
    assert required_blocks(book.plan.kind, book.plan, book.record, readings) == [
        "sheet", "sample1", "sample2", "run1", "run2", "run4", "run5",
    ]  # fmt: skip


def test_late_values_of_finished_work_are_awaited_others_are_missing(book: Book, tmp_path: Path) -> None:
    """Sulfur and hydrogen may come days later; the same blanks before the bench work is done are missing readings."""
    late = {"sample2.hydrogen": None, "sample2.analysis_moisture": None}
    waiting = rewritten(book, tmp_path, late)
    assert faults(waiting) == [("value-awaited", waiting.missing[0])]
    assert (waiting.verdict, waiting.stage) == ("incomplete", "waiting")
    assert set(waiting.missing) == set(late)
    found = waiting.findings[0]
    assert (found.sort, found.severity, found.action) == ("duty", "warning", "hold")
    assert found.message.startswith("S-1: waiting for ")
    bench = rewritten(book, tmp_path, {**late, "run5.oxygen_pressure": None})
    assert [code for code, _ in faults(bench)] == ["reading-missing", "reading-missing"]
    assert {one.severity for one in bench.findings} == {"error"}
    assert (bench.verdict, bench.stage) == ("incomplete", "bench")


def test_one_finding_for_each_begun_block_and_one_for_all_others(book: Book, tmp_path: Path) -> None:
    """Sheet, one run and one sample begun, and a control whose runs were not."""
    kept = {one: value for one, value in book.readings.items() if one.startswith(("run4", "sample2", "sheet"))}
    some = Book(book.plan, book.record, kept)
    gone = {
        "sheet.room_temperature": None,
        "run4.vessel_water": None,
        "run4.oxygen_pressure": None,
        "sample2.ash": None,
    }
    verdict = rewritten(some, tmp_path, gone)
    hits = [one for one in verdict.findings if one.code == "reading-missing"]
    assert sorted(one.message.partition(":")[0] for one in hits if ":" in one.message) == ["run4", "sample2", "sheet"]
    assert sum("blocks not begun" in one.message for one in hits) == 1
    assert len(hits) == 4
    run = next(one for one in hits if one.message.startswith("run4"))
    assert "missing water in the vessel, oxygen pressure, gauge; what stands on it is withheld" in run.message
    assert set(gone) <= set(verdict.missing)
    assert all(one.action == "hold" for one in hits)


def test_the_stage_is_the_one_the_sheet_shows(book: Book, tmp_path: Path) -> None:
    """issued, bench, waiting, complete: the checker and the front page agree."""
    cases: list[tuple[str, Book, dict[str, Any]]] = [
        ("issued", Book(book.plan, book.record, {}), {}),
        ("bench", book, {"run5.record_time": None, "run5.record_temperature": None, "run5.firing_time": None}),
        ("waiting", book, {"sample2.hydrogen": None}),
        ("complete", book, {}),
    ]
    for stage, one, changes in cases:
        verdict = check(write(tmp_path, one.data(changes)))
        shown = next(line.typed for line in verdict.results if line.id == "sheet.stage")
        assert (verdict.stage, str(shown).partition(":")[0]) == (stage, stage)
