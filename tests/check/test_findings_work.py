"""What a workbook tells of the work behind it: slips planted as people make them are found, with cell and cause."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace
from pathlib import Path
from typing import Any

import pytest
from planting import CONTROL, Book, check, coal, filled, issue, on_part, rewritten, write

from sheetcal.kinds.record import with_values
from sheetcal.model import Finding, Verdict

Changes = Mapping[str, Any]


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    return tmp_path_factory.mktemp("issue")


@pytest.fixture(scope="module")
def fuel(folder: Path) -> Book:
    """A control and two coals, two runs each and two reserve places, records taken by a logger."""
    return filled(issue("fuel", folder, [CONTROL, coal("S-1"), coal("S-2")], spare=2))


@pytest.fixture(scope="module")
def net(fuel: Book) -> Book:
    """The same, the samples weighed net."""
    changes: dict[str, Any] = {}
    for run in (1, 2, 5, 6, 9, 10):
        gross, tare = fuel.readings[f"run{run}.crucible_gross"], fuel.readings[f"run{run}.crucible_tare"]
        changes[f"run{run}.sample_mass"] = round(gross - tare, 4)
    kept = {one: value for one, value in fuel.readings.items() if ".crucible_" not in one}
    return replace(
        fuel, readings={**kept, **changes, **{f"run{run}.weighing": "net only" for run in (1, 2, 5, 6, 9, 10)}}
    )


def one_of(verdict: Verdict, code: str) -> Finding:
    """The finding of a code; nothing else may be said but of other codes that the test names."""
    found = [one for one in verdict.findings if one.code == code]
    assert found, [(one.code, one.field, one.message) for one in verdict.findings]
    return found[0]


def test_clean_workbooks_say_nothing(fuel: Book, net: Book, tmp_path: Path) -> None:
    for book in (fuel, net):
        assert rewritten(book, tmp_path, {}).findings == ()


# --- dates ------------------------------------------------------------------------------------------------


def test_day_and_month_exchanged(fuel: Book, tmp_path: Path) -> None:
    """Typed 3 April for 4 March: after the day of the check, and right when turned round."""
    assert fuel.readings["sheet.checked_at"] == "2025-03-04"
    found = one_of(rewritten(fuel, tmp_path, {"run6.date": "2025-04-03"}), "date-order")
    assert (found.field, found.certain, found.severity) == ("run6.date", True, "warning")
    assert f"{found.sheet}!{found.cell}" == fuel.cell("run6.date")
    assert found.likely_cause == "day and month were probably exchanged: 2025-03-04"


def test_a_date_before_the_issue_or_of_last_year(fuel: Book, tmp_path: Path) -> None:
    verdict = rewritten(fuel, tmp_path, {"run5.date": "2024-03-03"})
    found = one_of(verdict, "date-order")
    assert found.field == "run5.date"
    assert "before the day of issue" in found.message
    assert found.likely_cause == "the year was probably mistyped: 2025-03-03"
    assert [one.code for one in verdict.findings if one.field == "run5.date"] == ["date-order"]


def test_checked_before_it_was_done(fuel: Book, tmp_path: Path) -> None:
    runs = {f"run{run}.date": "2025-03-05" for run in (1, 2, 5, 6, 9, 10)}
    logged = {f"run{run}.record_start": f"2025-03-05T{fuel.readings[f'run{run}.start']}" for run in (1, 2, 5, 6, 9, 10)}
    found = one_of(rewritten(fuel, tmp_path, {**runs, **logged}), "date-order")
    assert found.field == "sheet.checked_at"
    assert "before the last run (2025-03-05)" in found.message


def test_a_date_in_the_future(fuel: Book, tmp_path: Path) -> None:
    found = one_of(rewritten(fuel, tmp_path, {"sample2.ash_determined": "2095-03-03T14:00"}), "date-order")
    assert (found.field, "in the future" in found.message) == ("sample2.ash_determined", True)


def test_a_date_after_the_last_save(fuel: Book, tmp_path: Path) -> None:
    """A program writes the moment of saving; work of a later day cannot be in the file."""
    saved = on_part(
        fuel.data({"sample2.ash_determined": "2025-06-30T14:00"}), "docProps/core.xml", _saved("2025-03-05")
    )
    found = one_of(check(write(tmp_path, saved)), "date-order")
    assert (found.field, "last saved" in found.message) == ("sample2.ash_determined", True)
    honest = on_part(fuel.data(), "docProps/core.xml", _saved("2025-03-05"))
    assert check(write(tmp_path, honest)).findings == ()


def test_a_file_saved_before_it_was_issued(fuel: Book, tmp_path: Path) -> None:
    early = on_part(fuel.data(), "docProps/core.xml", _saved("2025-02-01"))
    found = one_of(check(write(tmp_path, early)), "file-before-issue")
    assert (found.severity, found.field) == ("note", "sheet.issued_at")


def _saved(day: str) -> Any:
    """Sets the moment of the last save in the core properties."""
    import re

    return lambda xml: re.sub(r"(<dcterms:modified[^>]*>)[^<]*", rf"\g<1>{day}T17:00:00Z", xml)


# --- runs -------------------------------------------------------------------------------------------------


def test_one_record_loaded_into_two_runs(fuel: Book, tmp_path: Path) -> None:
    copied = {f"run6.{name}": fuel.readings[f"run5.{name}"] for name in ("record_time", "record_temperature")}
    found = one_of(rewritten(fuel, tmp_path, copied), "runs-equal")
    assert (found.field, found.certain) == ("run6.record_temperature", True)
    assert "are those of run5" in found.message


def test_a_run_entered_twice(folder: Path, tmp_path: Path) -> None:
    """On the calorimeter that gives its own rise: mass and rise of the duplicate are those of the first run."""
    book = filled(issue("fuel", folder, [CONTROL, coal("S-1")], spare=1, calorimeter="CAL-B"))
    assert rewritten(book, tmp_path, {}).findings == ()
    names = ("sample_mass", "crucible_gross", "crucible_tare", "instrument_rise", "instrument_start", "instrument_end")
    copied = {f"run5.{name}": book.readings.get(f"run4.{name}") for name in names}
    found = one_of(rewritten(book, tmp_path, copied), "runs-equal")
    assert found.field is not None
    assert found.field.startswith("run5.")
    assert "mass and rise are those of run4" in found.message


def test_runs_that_overlap(fuel: Book, tmp_path: Path) -> None:
    """A start typed ten minutes after the one before, though its record takes twenty."""
    assert (fuel.readings["run5.start"], fuel.readings["run6.start"]) == ("08:00", "08:30")
    changes = {"run6.start": "08:10", "run6.record_start": "2025-03-03T08:10"}
    found = one_of(rewritten(fuel, tmp_path, changes), "runs-overlap")
    assert (found.field, found.found, found.severity) == ("run6.start", "08:10", "warning")
    void = {**changes, "run5.state": "void", "run5.void_reason": "misfire", "run5.inspection": None}
    assert "runs-overlap" not in {one.code for one in rewritten(fuel, tmp_path, void).findings}


def test_a_run_left_out_without_a_word(fuel: Book, tmp_path: Path) -> None:
    """A third run is there, its state left open or called not needed."""
    third = {
        one.replace("run6.", "run7."): value for one, value in fuel.readings.items() if one.startswith("run6.")
    }  # fmt: skip
    moved = [round(float(one) + 0.0001 * (at % 3), 4) for at, one in enumerate(third["run7.record_temperature"])]
    third |= {"run7.start": "14:00", "run7.record_start": "2025-03-03T14:00", "run7.record_temperature": moved}
    for state in ("planned", "not needed"):
        found = one_of(rewritten(fuel, tmp_path, {**third, "run7.state": state}), "run-dropped")
        assert (found.field, found.found) == ("run7.state", state)
    assert rewritten(fuel, tmp_path, third).findings == ()


def test_a_place_passed_over(fuel: Book, tmp_path: Path) -> None:
    """The third run deleted, the fourth still there."""
    fourth = {one.replace("run6.", "run8."): value for one, value in fuel.readings.items() if one.startswith("run6.")}
    moved = [round(float(one) + 0.0001 * (at % 3), 4) for at, one in enumerate(fourth["run8.record_temperature"])]
    fourth |= {"run8.start": "14:00", "run8.record_start": "2025-03-03T14:00", "run8.record_temperature": moved}
    found = one_of(rewritten(fuel, tmp_path, fourth), "run-gap")
    assert found.field == "run8.date"
    assert "run7" in found.message


def test_a_moment_in_minutes_and_seconds(fuel: Book, tmp_path: Path) -> None:
    """14.30 for 14 min 30 s; the record has a reading each half minute."""
    assert fuel.record.prefilled["run5.end_of_main"] == 14.0
    verdict = rewritten(fuel, tmp_path, {"run5.end_of_main": 14.3})
    found = one_of(verdict, "moment-off-record")
    assert (found.field, found.expected, found.certain) == ("run5.end_of_main", 14.5, False)
    assert found.false_alarm == pytest.approx(0.01)
    assert "minutes and seconds" in str(found.likely_cause)


# --- statistical ------------------------------------------------------------------------------------------


def statistical(book: Book, folder: Path, changes: Changes, code: str) -> Finding:
    """The finding, which must be statistical, state its chance, and leave the verdict as it was."""
    verdict = rewritten(book, folder, changes)
    found = one_of(verdict, code)
    assert not found.certain
    assert found.false_alarm is not None
    assert 0.0 < found.false_alarm <= 0.2
    return found


def masses(book: Book, values: list[float]) -> dict[str, float]:
    return {f"run{run}.sample_mass": value for run, value in zip((1, 2, 5, 6, 9, 10), values, strict=True)}


def test_a_mass_filled_down_a_series_continued_and_figures_rounded(net: Book, tmp_path: Path) -> None:
    own = [net.readings[f"run{run}.sample_mass"] for run in (1, 2, 5, 6, 9, 10)]
    down = masses(net, [own[0], own[1], own[2], own[2], own[2], own[5]])
    found = statistical(net, tmp_path, down, "readings-filled-down")
    assert found.field == "run6.sample_mass"
    series = masses(net, [own[0], own[1], own[2], *[round(own[2] + step * 0.0137, 4) for step in (1, 2, 3)]])
    found = statistical(net, tmp_path, series, "readings-in-series")
    assert found.field == "run6.sample_mass"
    found = statistical(net, tmp_path, masses(net, [round(one, 2) for one in own]), "readings-coarse")
    assert found.likely_cause == "rounded figures were probably typed"


def test_an_average_pasted_into_a_run(net: Book, tmp_path: Path) -> None:
    """Seven decimals in one run, the mean of two others: nobody reads that from a balance."""
    three = [round(10000 * net.readings[f"run{run}.sample_mass"]) for run in (6, 9, 10)]
    mean = (sum(three) + (sum(three) % 3 == 0)) / 30000
    found = statistical(net, tmp_path, {"run5.sample_mass": mean}, "reading-overlong")
    assert found.field == "run5.sample_mass"
    everywhere = {one: value + 0.0000012 for one, value in masses(net, [0.9] * 6).items()}
    codes = {one.code for one in rewritten(net, tmp_path, everywhere).findings}
    assert "reading-overlong" not in codes


def test_a_titre_unlike_the_duplicate(fuel: Book, tmp_path: Path) -> None:
    """The burette started at 10, and 0 was typed."""
    end = fuel.readings["run5.burette_end"] - fuel.readings["run5.burette_start"]
    other = round(end - 0.35, 2)
    changes = {
        "run5.burette_start": 0.0,
        "run5.burette_end": 10.0 + end,
        "run6.burette_end": other,
        "run6.burette_start": 0.0,
    }
    verdict = rewritten(fuel, tmp_path, changes)
    found = next(one for one in verdict.findings if one.code in ("titre-unlike", "nitric-heat"))
    assert (found.field or "").startswith("run5.")
    assert "start of the burette was probably not 0 but 10 mL" in " ".join(found.causes)


def test_zero_for_not_determined(fuel: Book, tmp_path: Path) -> None:
    found = statistical(fuel, tmp_path, {"sample2.sulfur": 0.0}, "zero-not-determined")
    assert found.field == "sample2.sulfur"
    assert "not determined" in str(found.likely_cause)


def test_a_certified_lot_as_a_sample(folder: Path, tmp_path: Path) -> None:
    book = filled(issue("fuel", folder, [CONTROL, coal("S-1")]))
    named = {**book.record.prefilled, "sample2.sample_id": "BA-31"}
    found = one_of(
        rewritten(replace(book, record=with_values(book.record, prefilled=named)), tmp_path, {}), "reference-as-sample"
    )
    assert found.field == "sample2.role"


def test_duplicates_that_one_slip_explains(net: Book, tmp_path: Path) -> None:
    """Two digits of a mass exchanged, weighed net, so that nothing else shows it: put right, the runs agree."""
    typed = net.readings["run5.sample_mass"]
    text = f"{typed:.4f}"
    wrong = float(text[:2] + text[3] + text[2] + text[4:])
    assert abs(wrong - typed) > 0.005
    found = statistical(net, tmp_path, {"run5.sample_mass": wrong}, "slip-suspected")
    assert (found.field, found.expected) == ("run5.sample_mass", pytest.approx(typed))
    assert f"if {wrong:g} were {typed:g}, two digits exchanged" in found.message


def test_the_masses_of_two_runs_exchanged(net: Book, tmp_path: Path) -> None:
    one, other = net.readings["run5.sample_mass"], net.readings["run6.sample_mass"]
    spread = {"run5.sample_mass": other, "run6.sample_mass": one}
    verdict = rewritten(net, tmp_path, spread)
    if abs(one - other) > 0.02:
        assert "were probably exchanged" in one_of(verdict, "slip-suspected").message
