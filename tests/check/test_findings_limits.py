"""Every limit of a kind is broken in a written workbook, and said once, at its place, with its action."""

from collections.abc import Mapping
from pathlib import Path
from typing import Any

import pytest
from planting import CONTROL, Book, coal, faults, filled, issue, only, rewritten

from sheetcal.kinds import load, names

SHIFT = 0.05  # K: enough to move a result by 500 J/g
VOID = {"state": "void", "void_reason": "leak"}


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    return tmp_path_factory.mktemp("issue")


@pytest.fixture(scope="module")
def book(folder: Path) -> Book:
    """A control and one coal, two runs each and a reserve place."""
    return filled(issue("fuel", folder, [CONTROL, coal("S-1")], spare=1))


@pytest.fixture(scope="module")
def unknown(folder: Path) -> Book:
    """A control and a residue of unknown nature, not approved."""
    rows = [CONTROL, {"sample_id": "S-9", "role": "sample", "fuel_class": "unknown"}]
    return filled(issue("fuel", folder, rows, spare=1))


def shifted(book: Book, run: str, step: float) -> list[float]:
    """A record whose rise is larger by `step` (K)."""
    times, temperatures = book.readings[f"{run}.record_time"], book.readings[f"{run}.record_temperature"]
    fired = book.readings[f"{run}.firing_time"]
    return [value + (step if time > fired else 0.0) for time, value in zip(times, temperatures, strict=True)]


def net(book: Book, run: str) -> float:
    """Gross less tare of a run."""
    return round(book.readings[f"{run}.crucible_gross"] - book.readings[f"{run}.crucible_tare"], 4)


LATER = {"run4.record_start": None, "sheet.checked_at": None}
FUEL: dict[str, tuple[Mapping[str, Any], str, str]] = {
    "oxygen-pressure": ({"run4.oxygen_pressure": 3.36}, "run4.oxygen_pressure", "stop"),
    "oxygen-low": ({"run4.oxygen_pressure": 2.6}, "run4.oxygen_pressure", "hold"),
    "oxygen-high": ({"run4.oxygen_pressure": 3.25}, "run4.oxygen_pressure", "hold"),
    "calorimeter-water": ({"run4.calorimeter_water": 1997.0}, "run4.calorimeter_water", "note"),
    "run-void": ({"run4.inspection": "soot"}, "run4.inspection", "reject"),
    "wire-left": ({"run4.wire_left": 6.8}, "run4.wire_left", "hold"),
    "vessel-water": ({"run4.vessel_water": 2.0}, "run4.vessel_water", "hold"),
    "titrant-expired": ({**LATER, "run4.date": "2025-03-06"}, "run4.titrant_lot", "reject"),
    "burette-order": ({"run4.burette_start": 20.0}, "run4.burette_end", "reject"),
    "balance-check": ({"sheet.balance_check": 1.02}, "sheet.balance_check", "stop"),
    "balance-check-warning": ({"sheet.balance_check": 1.0005}, "sheet.balance_check", "hold"),
    "vessel-out-of-service": ({**LATER, "run4.date": "2025-12-24"}, "run4.vessel", "stop"),
    "calibration-expired": ({**LATER, "run4.date": "2025-12-24"}, "run4.vessel", "reject"),
    "chlorine-limit": ({"sample2.chlorine": 4.2}, "sample2.chlorine", "stop"),
    "residue": ({"run4.residue_mass": 0.35}, "run4.residue_mass", "hold"),
    "moisture-order": ({"sample2.total_moisture": 0.5}, "sample2.total_moisture", "hold"),
    "moisture-old": ({"sample2.analysis_moisture_determined": "2025-03-01T09:00"}, "run4.analysis_moisture", "hold"),
    "record-vessel": ({"run4.record_vessel": "A2"}, "run4.vessel", "reject"),
    "one-more-run": ({**{f"run5.{key}": value for key, value in VOID.items()}}, "sample2.counted_runs", "hold"),
}  # fmt: skip


def test_most_limits_of_a_fuel_workbook_one_by_one(book: Book, tmp_path: Path) -> None:
    """Each case breaks one limit; the finding carries the rule's severity, sort and action at the rule's place."""
    rules = {rule.code: rule for rule in book.plan.kind.rules}
    tried = 0
    for code, (changes, place, action) in FUEL.items():
        verdict = rewritten(book, tmp_path, changes)
        hits = [one for one in verdict.findings if one.code == code]
        assert len(hits) >= 1, (code, faults(verdict))
        found, rule = hits[0], rules[code]
        assert (found.field, found.action, found.severity, found.sort) == (place, action, rule.severity, rule.sort)
        assert f"{found.sheet}!{found.cell}" == book.cell(place)
        assert rule.text in found.message
        others = {one.code for one in verdict.findings} - {code}
        assert others <= ALSO.get(code, set()), (code, faults(verdict))
        usual = "incomplete" if verdict.missing else "hold"
        assert verdict.verdict == ("reject" if rule.severity == "error" else usual), code
        tried += 1
    assert tried == 19


TWO_YEARS = ("titrant-expired", "moisture-old", "control-missing", "balance-expired", "operator-not-authorised")
# What the same change makes true besides, each for a reason of its own.
ALSO: dict[str, set[str]] = {
    "one-more-run": {"reading-missing"},  # the reserve place is now a required one, and not begun
    "titrant-expired": {"control-missing", "moisture-old", "moisture-of-another-day"},
    "vessel-out-of-service": {"calibration-expired", *TWO_YEARS},
    "calibration-expired": {"vessel-out-of-service", *TWO_YEARS},
    "chlorine-limit": {"one-more-run", "composition-unlikely", "nitric-heat", "nitric-heat-negative"},
    "moisture-old": {"titrant-of-the-day"},
}


def test_net_that_is_not_gross_less_tare_names_the_digits(book: Book, tmp_path: Path) -> None:
    """The contract's slip: two digits exchanged; the duplicate range it causes is an effect, no second finding."""
    right = net(book, "run4")
    digits = f"{right:.4f}"
    wrong = float(digits[:3] + digits[4] + digits[3] + digits[5])
    assert wrong != right
    found = only(rewritten(book, tmp_path, {"run4.sample_mass": wrong}))
    assert (found.code, found.field, found.found, found.expected) == ("cross-foot", "run4.sample_mass", wrong, right)
    assert found.likely_cause is not None
    assert found.likely_cause.startswith("two digits were probably exchanged")
    assert found.effect is not None
    assert found.effect["result"] == "sample2.gross_dry"
    assert (float(found.effect["change"]) < 0.0) == (wrong > right)


def test_a_charge_beyond_the_vessel_and_the_largest_mass_are_stops(book: Book, tmp_path: Path) -> None:
    """STOP limits are said beside each other: nothing silences one."""
    tare = book.readings["run4.crucible_tare"]
    verdict = rewritten(book, tmp_path, {"run4.crucible_gross": tare + 1.6})
    stops = {one.code for one in verdict.findings if one.action == "stop"}
    assert {"mass-limit", "charge-energy"} <= stops
    assert verdict.verdict == "reject"


def test_no_approval_for_a_class_that_needs_one(unknown: Book, tmp_path: Path) -> None:
    approved = rewritten(unknown, tmp_path, {"sample2.approval": "HT 2025-03-01"})
    assert "approval-missing" not in {code for code, _ in faults(approved)}
    verdict = rewritten(unknown, tmp_path, {"sample2.approval": None})
    hits = [one for one in verdict.findings if one.code == "approval-missing"]
    assert {one.field for one in hits} == {"run4.vessel", "run5.vessel"}
    assert all(one.action == "stop" for one in hits)


def test_a_void_run_without_reason_is_a_missing_reading(book: Book, tmp_path: Path) -> None:
    verdict = rewritten(book, tmp_path, {"run6.state": "void", "run6.date": "2025-03-03"})
    assert faults(verdict) == [("reading-missing", "run6.void_reason")]
    assert (verdict.verdict, verdict.missing) == ("incomplete", ("run6.void_reason",))


def test_a_firing_time_typed_late_explains_everything_that_stands_on_the_rise(book: Book, tmp_path: Path) -> None:
    later = book.readings["run4.firing_time"] + 0.5
    found = only(rewritten(book, tmp_path, {"run4.firing_time": later}))
    assert (found.code, found.field, found.found) == ("firing-time-late", "run4.firing_time", later)


def test_a_record_that_cannot_be_used(book: Book, tmp_path: Path) -> None:
    """Unsorted times; too few readings before firing; a cooling constant that is not the calorimeter's; 7 K."""
    times = list(book.readings["run4.record_time"])
    times[3], times[4] = times[4], times[3]
    found = only(rewritten(book, tmp_path, {"run4.record_time": times}))
    assert (found.code, found.field, found.cell) == (
        "record-unsound", "run4.record_time", book.plan.places["run4.record_time"].cell.partition(":")[0],
    )  # fmt: skip
    early = {"run4.firing_time": 0.5, "run4.end_of_main": 14.0}
    assert "record-too-short" in {code for code, _ in faults(rewritten(book, tmp_path, early))}
    instrument = {"run4.rise_source": "instrument", "run4.instrument_rise": 7.0}
    large = rewritten(book, tmp_path, instrument)
    assert faults(large)[0] == ("rise-large", "run4.corrected_rise")
    assert not {"result-disagrees", "gross-impossible", "composition-unlikely"} & {code for code, _ in faults(large)}
    times, end = book.readings["run4.record_time"], book.record.prefilled["run4.end_of_main"]
    drifting = [
        value + 0.004 * max(0.0, time - end)
        for time, value in zip(times, book.readings["run4.record_temperature"], strict=True)
    ]
    found = only(rewritten(book, tmp_path, {"run4.record_temperature": drifting}))
    assert (found.code, found.field) == ("cooling-constant", "run4.cooling_constant")


def test_a_control_beyond_its_limits(book: Book, tmp_path: Path) -> None:
    warning = rewritten(book, tmp_path, {"run1.record_temperature": shifted(book, "run1", 0.005)})
    assert ("control-warning", "run1.control_deviation") in faults(warning)
    action = rewritten(book, tmp_path, {"run1.record_temperature": shifted(book, "run1", 0.012)})
    assert ("control-beyond-action", "run1.control_deviation") in faults(action)
    assert action.verdict == "reject"


def test_duplicates_too_far_apart_ask_for_one_more_run_and_four_for_the_median(book: Book, tmp_path: Path) -> None:
    two = rewritten(book, tmp_path, {"run4.record_temperature": shifted(book, "run4", 0.03)})
    found = only(two)
    assert (found.code, found.sort, found.severity, two.verdict) == ("one-more-run", "duty", "warning", "hold")
    assert two.complete


def test_four_runs_too_far_apart_are_held(folder: Path, tmp_path: Path) -> None:
    """More runs than that are not asked for: the median is reported, and the head is told."""
    four = filled(issue("fuel", folder, [CONTROL, coal("S-1")], spare=2))
    more: dict[str, Any] = {}
    for source, copy in (("run5", "run7"), ("run6", "run8")):
        own = {one: value for one, value in four.readings.items() if one.startswith(f"{source}.")}
        more |= {one.replace(source, copy): value for one, value in own.items()}
        more[f"{copy}.record_temperature"] = shifted(four, source, 0.0002)
    verdict = rewritten(four, tmp_path, {**more, "run5.record_temperature": shifted(four, "run5", 0.03)})
    found = next(one for one in verdict.findings if one.code == "limit-exceeded")
    assert (found.field, found.severity, found.action) == ("sample2.range", "warning", "hold")
    assert "one-more-run" not in {code for code, _ in faults(verdict)}
    assert verdict.verdict == "hold"


def test_composition_and_gross_value_far_from_what_is_expected(book: Book, tmp_path: Path) -> None:
    verdict = rewritten(book, tmp_path, {"sample2.carbon": 60.0})
    assert ("composition-unlikely", "sample2.composition_deviation") in faults(verdict)
    summed = rewritten(book, tmp_path, {"sample2.oxygen_source": "measured", "sample2.oxygen": 15.0})
    assert ("composition-sum", "sample2.oxygen") in faults(summed)


def test_moisture_and_ash_beyond_a_hundred(book: Book, tmp_path: Path) -> None:
    wrong = {"sample2.ash": 99.0, "sample2.ash_basis": "as analysed"}
    assert ("moisture-and-ash", "sample2.ash") in faults(rewritten(book, tmp_path, wrong))


def test_a_rise_of_nothing_in_a_run_that_counts(book: Book, tmp_path: Path) -> None:
    """A misfire set valid: the pair does not agree, and no witness contradicts another."""
    flat = [22.0 + 0.0002 * i for i in range(len(book.readings["run4.record_time"]))]
    dry = {"run4.burette_start": None, "run4.burette_end": None, "run4.titrant_lot": None}
    verdict = rewritten(book, tmp_path, {"run4.record_temperature": flat, **dry})
    codes = {code for code, _ in faults(verdict)}
    assert "one-more-run" in codes
    assert not {"result-disagrees", "result-stale"} & codes
    void = {"run4.state": "void", "run4.void_reason": "misfire"}
    kept = rewritten(book, tmp_path, {"run4.record_temperature": flat, **void})
    assert {code for code, _ in faults(kept)} <= {"one-more-run", "reading-missing"}


def test_a_stop_is_said_of_a_void_run_other_limits_are_not(book: Book, tmp_path: Path) -> None:
    void = {"run6.state": "void", "run6.void_reason": "leak", "run6.date": "2025-03-03", "run6.vessel": "A1"}
    verdict = rewritten(
        book, tmp_path, {**void, "run6.oxygen_pressure": 3.5, "run6.wire_left": 9.0, "run6.wire_start": 10.0}
    )
    assert faults(verdict) == [("oxygen-pressure", "run6.oxygen_pressure")]


def test_an_unusual_reading_is_not_said_twice(book: Book, tmp_path: Path) -> None:
    """The limit of the wire says more than that its length is outside the usual range."""
    assert faults(rewritten(book, tmp_path, {"run4.wire_left": 6.8})) == [("wire-left", "run4.wire_left")]


def test_a_titre_out_of_the_usual_is_a_warning_and_a_negative_one_an_error(book: Book, tmp_path: Path) -> None:
    high = rewritten(book, tmp_path, {"run4.burette_end": 40.0})
    assert "nitric-heat" in {code for code, _ in faults(high)}
    negative = rewritten(book, tmp_path, {"run4.burette_end": 5.5})
    assert ("nitric-heat-negative", "run4.nitric_heat") in faults(negative)


# --- calibration and the kinds without combustion --------------------------------------------------------------


def test_limits_of_a_calibration(folder: Path, tmp_path: Path) -> None:
    book = filled(issue("calibration", folder))
    assert rewritten(book, tmp_path, {}).findings == ()
    cases = {
        "pellet-mass": ({"run1.crucible_gross": book.readings["run1.crucible_tare"] + 0.7}, "run1.pellet_mass"),
        "relative-deviation": (_one_off(book), "sheet.relative_deviation"),
        "heat-capacity-outlier": (_one_off(book), "run1.effective_heat_capacity"),
        "certificate-expired": ({"run1.date": "2044-01-01", "run1.record_start": None}, "run1.date"),
        "titre-unusual": ({"run1.burette_end": book.readings["run1.burette_start"] + 25.0}, "run1.burette_end"),
        "one-more-run": ({"run1.state": "void", "run1.void_reason": "soot"}, "sheet.counted_runs"),
    }
    for code, (changes, place) in cases.items():
        assert (code, place) in faults(rewritten(book, tmp_path, changes)), code


def _one_off(book: Book) -> dict[str, Any]:
    return {"run1.record_temperature": shifted(book, "run1", SHIFT)}


OTHERS: dict[str, list[tuple[str, Mapping[str, Any], str]]] = {
    "specific-heat": [
        ("sample-too-hot", {"run1.sample_start_temperature": 240.0}, "run1.sample_start_temperature"),
        ("time-in-heater", {"run1.time_in_heater": 4.0}, "run1.time_in_heater"),
        ("transfer-slow", {"run1.transfer_time": 9.0}, "run1.transfer_time"),
    ],
    "vaporisation": [
        ("vessel-not-vented", {"sheet.vented": "no"}, "sheet.vented"),
        ("pressure-line", {"sheet.station_pressure": 101.3}, "sheet.boiling_temperature"),
        ("condensate-small", {"run1.condensate_mass": 4.0}, "run1.condensate_mass"),
    ],
    "heat-balance": [
        ("amount-changed", {"body1.mass": 1.0, "body1.amount_changed": 5.0}, "body1.amount_changed"),
    ],
}


def test_limits_of_the_kinds_without_combustion(folder: Path, tmp_path: Path) -> None:
    tried = 0
    for kind, cases in OTHERS.items():
        book = filled(issue(kind, folder))
        for code, changes, place in cases:
            assert (code, place) in faults(rewritten(book, tmp_path, changes)), code
            tried += 1
    assert tried == 7


def test_rules_carry_what_a_finding_needs() -> None:
    """Severity, sort and action of every rule of every kind are words of the contract; stops are errors."""
    rules = [(kind, rule) for kind in names() for rule in load(kind).rules]
    assert len(rules) > 80
    for kind, rule in rules:
        assert rule.severity in ("error", "warning", "note"), (kind, rule.code)
        assert rule.sort in ("fault", "duty", "note"), (kind, rule.code)
        assert rule.action in ("reject", "hold", "correct", "note", "stop"), (kind, rule.code)
        assert rule.action != "stop" or rule.severity == "error", (kind, rule.code)
        assert f"{rule.scope}.{rule.place}" in load(kind).by_key(), (kind, rule.code)
