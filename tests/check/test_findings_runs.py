"""Runs against each other and against the logger: exchanges are proved by putting them back."""

from pathlib import Path
from typing import Any

import pytest
from planting import CONTROL, Book, coal, faults, filled, issue, only, rewritten

RECORD = ("record_time", "record_temperature", "record_file", "record_start", "record_vessel")


@pytest.fixture(scope="module")
def book(tmp_path_factory: pytest.TempPathFactory) -> Book:
    """A control, a coal and a coke, two runs each."""
    rows = [CONTROL, coal("S-1"), {"sample_id": "S-2", "role": "sample", "fuel_class": "coke"}]
    return filled(issue("fuel", tmp_path_factory.mktemp("issue"), rows, spare=0))


def swapped(book: Book, one: str, other: str, names: tuple[str, ...]) -> dict[str, Any]:
    """Readings of two runs in each other's place."""
    pairs = [(one, other), (other, one)]
    return {f"{to}.{name}": book.readings[f"{source}.{name}"] for to, source in pairs for name in names}


def test_records_of_two_runs_exchanged_are_found_in_both(book: Book, tmp_path: Path) -> None:
    """Both pairs fail, exchanged back both agree: named in both runs, and nothing else is said of it."""
    verdict = rewritten(book, tmp_path, swapped(book, "run4", "run6", RECORD))
    assert faults(verdict) == [("records-exchanged", "run4.record_time"), ("records-exchanged", "run6.record_time")]
    for found in verdict.findings:
        assert (found.severity, found.action, found.certain) == ("error", "reject", True)
        assert found.likely_cause is not None
        assert "run4 and run6" in found.likely_cause
        assert found.cell == book.plan.places[found.field or ""].cell.partition(":")[0]
        assert found.effect is not None
        assert abs(float(found.effect["change"])) > 500.0
    assert verdict.verdict == "reject"


def test_an_exchange_is_found_behind_a_decimal_comma(book: Book, tmp_path: Path) -> None:
    """The other slip leaves the result blank: judged with the number meant, the exchange shows all the same."""
    comma = {"sample2.analysis_moisture": str(book.readings["sample2.analysis_moisture"]).replace(".", ",")}
    verdict = rewritten(book, tmp_path, {**swapped(book, "run4", "run6", RECORD), **comma})
    assert {code for code, _ in faults(verdict)} == {"records-exchanged", "reading-decimal-comma"}


def test_sample_and_aid_typed_in_each_others_cell(tmp_path: Path) -> None:
    rows = [CONTROL, {"sample_id": "S-4", "role": "sample", "fuel_class": "sludge"}]
    aided = filled(issue("fuel", tmp_path, rows, spare=0))
    run = next(one.partition(".")[0] for one in aided.readings if one.endswith(".aid1_mass"))
    mass = aided.readings.get(f"{run}.sample_mass")
    if mass is None:
        mass = round(aided.readings[f"{run}.crucible_gross"] - aided.readings[f"{run}.crucible_tare"], 4)
    aid = aided.readings[f"{run}.aid1_mass"]
    typed = {f"{run}.sample_mass": aid, f"{run}.aid1_mass": mass, f"{run}.crucible_gross": None}
    sound = {f"{run}.sample_mass": mass, f"{run}.crucible_gross": None}
    before = {code for code, _ in faults(rewritten(aided, tmp_path, sound))}
    verdict = rewritten(aided, tmp_path, typed)
    found = next(one for one in verdict.findings if one.code == "masses-exchanged")
    assert (found.field, found.found, found.expected) == (f"{run}.sample_mass", aid, mass)
    others = {code for code, _ in faults(verdict)} - before - {"masses-exchanged", "mass-limit", "charge-energy"}
    assert others <= {"oxygen-ratio"}, others


def test_runs_that_disagree_for_another_reason_are_not_called_exchanged(tmp_path: Path) -> None:
    """Neither records nor masses put back bring the pair right."""
    rows = [CONTROL, {"sample_id": "S-4", "role": "sample", "fuel_class": "sludge"}]
    aided = filled(issue("fuel", tmp_path, rows, spare=1))
    run = next(one.partition(".")[0] for one in aided.readings if one.endswith(".aid1_mass"))
    fired = aided.readings[f"{run}.firing_time"]
    pairs = zip(aided.readings[f"{run}.record_time"], aided.readings[f"{run}.record_temperature"], strict=True)
    shifted = [value + (0.05 if time > fired else 0.0) for time, value in pairs]
    codes = {code for code, _ in faults(rewritten(aided, tmp_path, {f"{run}.record_temperature": shifted}))}
    assert "one-more-run" in codes
    assert not {"masses-exchanged", "records-exchanged"} & codes


def test_runs_that_prove_nothing_are_passed_over(tmp_path: Path) -> None:
    """A run without its mass and a void one stand beside the exchange that is found."""
    rows = [CONTROL, coal("S-1"), {"sample_id": "S-2", "role": "sample", "fuel_class": "coke"}]
    spare = filled(issue("fuel", tmp_path, rows, spare=1))
    more: dict[str, Any] = {}
    for source, copy in (("run5", "run6"), ("run8", "run9")):
        own = {one: value for one, value in spare.readings.items() if one.startswith(f"{source}.")}
        more |= {one.replace(source, copy): value for one, value in own.items()}
    more |= {"run4.crucible_gross": None, "run9.state": "void", "run9.void_reason": "record lost"}
    verdict = rewritten(spare, tmp_path, {**more, **swapped(spare, "run5", "run8", RECORD)})
    assert [field for code, field in faults(verdict) if code == "records-exchanged"] == [
        "run5.record_time",
        "run8.record_time",
    ]
    copied = {"runs-equal", "runs-overlap"}  # the copies of this test are as much alike as that
    assert {code for code, _ in faults(verdict)} - copied == {"records-exchanged", "reading-missing"}


def test_the_vessel_of_an_exchanged_record_is_not_said_again(book: Book, tmp_path: Path) -> None:
    """The logger named its vessel too: it follows from the exchange."""
    vessels = {run: book.readings[f"{run}.vessel"] for run in ("run3", "run4", "run5", "run6")}
    one, other = next((a, b) for a in ("run3", "run4") for b in ("run5", "run6") if vessels[a] != vessels[b])
    verdict = rewritten(book, tmp_path, swapped(book, one, other, RECORD))
    assert {code for code, _ in faults(verdict)} == {"records-exchanged"}


def test_a_record_of_another_day_is_found_by_its_start(book: Book, tmp_path: Path) -> None:
    verdict = rewritten(book, tmp_path, {"run4.record_start": "2025-03-03T13:55"})
    found = only(verdict)
    assert (found.code, found.field, found.severity) == ("record-of-another-run", "run4.record_start", "error")
    assert "min after the run" in found.message


def test_a_logger_whose_clock_is_an_hour_off_is_no_fault(book: Book, tmp_path: Path) -> None:
    """Summer time: every record starts one hour late."""
    late = {
        one: f"{value[:11]}{int(value[11:13]) + 1:02d}{value[13:]}"
        for one, value in book.readings.items()
        if one.endswith(".record_start")
    }
    assert len(late) == 6
    assert rewritten(book, tmp_path, late).findings == ()


def test_two_titrants_in_one_sample_on_one_day_are_a_note(book: Book, tmp_path: Path) -> None:
    lots = [str(row["lot"]) for row in book.record.tables["titrant"]]
    own = book.readings["run4.titrant_lot"]
    other = next(lot for lot in lots if lot != own)
    verdict = rewritten(book, tmp_path, {"run4.titrant_lot": other})
    found = next(one for one in verdict.findings if one.code == "titrant-of-the-day")
    assert (found.severity, found.sort, found.action) == ("note", "note", "note")
    assert found.field in ("run3.titrant_lot", "run4.titrant_lot")


def test_a_vessel_without_control_on_the_day_is_a_warning_unless_one_is_cited(tmp_path: Path) -> None:
    alone = filled(issue("fuel", tmp_path, [coal("S-1")], spare=0))
    nothing = {one: None for one in alone.readings if one.endswith(".control_ref")}
    verdict = rewritten(alone, tmp_path, nothing)
    hits = [one for one in verdict.findings if one.code == "control-missing"]
    assert hits and all(one.severity == "warning" and one.action == "hold" for one in hits)
    assert {one.field.partition(".")[2] for one in hits if one.field} == {"vessel"}
    assert verdict.verdict == "hold"
    cited = rewritten(alone, tmp_path, {**nothing, "sheet.control_ref": "b7k2m-9qxfd-h4t8w-n3c6r run1"})
    assert "control-missing" not in {code for code, _ in faults(cited)}
    own = {**nothing, **{f"run{run}.control_ref": "b7k2m-9qxfd-h4t8w-n3c6r run1" for run in (1, 2)}}
    assert "control-missing" not in {code for code, _ in faults(rewritten(alone, tmp_path, own))}


def test_a_void_control_covers_nothing(book: Book, tmp_path: Path) -> None:
    void = {f"run{run}.{key}": value for run in (1, 2) for key, value in (("state", "void"), ("void_reason", "soot"))}
    verdict = rewritten(book, tmp_path, void)
    assert "control-missing" in {code for code, _ in faults(verdict)}
