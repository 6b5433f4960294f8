"""Limits of record, charge, people, lots and mixing are each broken in a written workbook and found there."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from dataclasses import replace
from pathlib import Path
from typing import Any

import pytest
from planting import CONTROL, Book, check, coal, faults, filled, issue, rewritten, write

from sheetcal.kinds.record import constants_sha256, with_values
from sheetcal.model import IssueRecord, Value

LONG_AGO = "2024-01-01"
Changes = Mapping[str, Any]


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    return tmp_path_factory.mktemp("issue")


@pytest.fixture(scope="module")
def fuel(folder: Path) -> Book:
    """A control and one coal, two runs each and a reserve place, records taken by a logger."""
    return filled(issue("fuel", folder, [CONTROL, coal("S-1")], spare=1))


@pytest.fixture(scope="module")
def calibration(folder: Path) -> Book:
    return filled(issue("calibration", folder))


@pytest.fixture(scope="module")
def mixing(folder: Path) -> Book:
    return filled(issue("specific-heat", folder))


def codes(book: Book, folder: Path, changes: Changes) -> set[str]:
    """Codes found in a workbook with other readings."""
    return {code for code, _ in faults(rewritten(book, folder, changes))}


def with_table(book: Book, table: str, **changed: Value) -> Book:
    """The workbook with one column of a table set to one value."""
    rows = tuple({**row, **changed} for row in book.record.tables[table])
    record: IssueRecord = with_values(book.record, tables={**book.record.tables, table: rows})
    return replace(book, record=record)


def curve(book: Book, change: Callable[[float, float], float], run: str = "run4") -> dict[str, Any]:
    """The temperatures of a run's record, each changed by its time and itself."""
    times, values = book.readings[f"{run}.record_time"], book.readings[f"{run}.record_temperature"]
    return {f"{run}.record_temperature": [round(change(t, y), 4) for t, y in zip(times, values, strict=True)]}


def cut(book: Book, first: int, last: int) -> dict[str, Any]:
    """The record of run 4 with the readings from position `first` to `last` taken out."""
    names = ("run4.record_time", "run4.record_temperature")
    return {name: [*book.readings[name][: first - 1], *book.readings[name][last:]] for name in names}


def test_a_clean_workbook_says_nothing(fuel: Book, calibration: Book, mixing: Book, tmp_path: Path) -> None:
    """What the cases below stand on: no finding before anything is changed."""
    for book in (fuel, calibration, mixing):
        assert faults(rewritten(book, tmp_path, {})) == []


def test_what_a_record_shows_of_itself(fuel: Book, tmp_path: Path) -> None:
    """Firing time, uneven steps, readings that stand still, periods, scatter, bend and resting temperature."""
    fired, ended = fuel.readings["run4.firing_time"], fuel.record.prefilled["run4.end_of_main"]
    times = fuel.readings["run4.record_time"]
    at_fired = times.index(fired)
    stuck = list(fuel.readings["run4.record_temperature"])
    stuck[at_fired + 2 : at_fired + 6] = [stuck[at_fired + 2]] * 4
    cases: dict[str, Changes] = {
        "firing-time-early": {"run4.firing_time": fired - 1.0},
        "firing-time-late": {"run4.firing_time": fired + 0.5},
        "record-step": cut(fuel, 3, 3),
        "record-equal": {"run4.record_temperature": stuck},
        "record-temperature": curve(fuel, lambda t, y: y + 9.0),
        "main-period": {"run4.end_of_main": ended + 1.0},
        "period-short": cut(fuel, 1, at_fired - 3),
        "record-scatter": curve(fuel, lambda t, y: y + (0.002 if t < fired and round(2 * t) % 2 else 0.0)),
        "after-bend": curve(fuel, lambda t, y: y - (0.005 * math.exp(ended - t) if t >= ended else 0.0)),
        "convergence-temperature": curve(fuel, lambda t, y: y + 0.6),
        "end-temperature": curve(fuel, lambda t, y: y + 1.6),
    }
    for code, changes in cases.items():
        found = codes(fuel, tmp_path, changes)
        assert code in found, (code, found)


def test_much_heat_exchanged(fuel: Book, tmp_path: Path) -> None:
    """Above the warning a hold, above the other limit a reject; here the limits come down to what is exchanged."""
    for name, code in (("exchange_warning", "heat-exchange-warning"), ("exchange_error", "heat-exchange")):
        stated = tuple(replace(one, value=0.0001) if one.name == name else one for one in fuel.record.constants)
        record = with_values(fuel.record, constants=stated)
        printed = {**record.prefilled, "sheet.constants_id": constants_sha256(record)[:16]}
        close = replace(fuel, record=with_values(record, prefilled=printed))
        assert codes(close, tmp_path, {}) == {code}


def test_the_firing_time_is_found_in_the_record(fuel: Book) -> None:
    """Each record shows when it was fired, whatever was typed."""
    from sheetcal.formulas.compute import compute

    for late in (-1.0, 0.0, 0.5, 1.0):
        typed = {f"run{run}.firing_time": fuel.readings[f"run{run}.firing_time"] + late for run in (1, 2, 4, 5)}
        found = compute(fuel.plan, fuel.record, {**fuel.readings, **typed})
        for run in (1, 2, 4, 5):
            assert found[f"run{run}.firing_found"] == fuel.readings[f"run{run}.firing_time"]
            assert 0.0001 < float(found[f"run{run}.rise_uncertainty"] or 0.0) < 0.001 or late > 0.0


def test_charge_wire_and_composition(fuel: Book, tmp_path: Path) -> None:
    """Masses, wire, jacket and composition beyond what can be, each by its code."""
    mass = fuel.readings["run4.crucible_gross"] - fuel.readings["run4.crucible_tare"]
    lighter = {"run4.crucible_gross": round(fuel.readings["run4.crucible_tare"] + 0.6 * mass, 4)}
    if fuel.readings.get("run4.sample_mass") is not None:
        lighter["run4.sample_mass"] = round(0.6 * mass, 4)
    cases: dict[str, Changes] = {
        "sample-mass": lighter,
        "gross-below-tare": {"run4.crucible_tare": fuel.readings["run4.crucible_gross"] + 0.1},
        "wire-order": {"run4.wire_left": fuel.readings["run4.wire_start"] + 0.5},
        "jacket-temperature": {"run4.jacket_temperature": 25.4},
        "fluorine-limit": {"sample2.fluorine": 3.5, "sample2.fluorine_basis": "dry"},
        "composition-sum-impossible": {"sample2.oxygen_source": "measured", "sample2.oxygen": 40.0},
        "void-other": {"run5.state": "void", "run5.void_reason": "other"},
        "three-times-order": {
            "run4.rise_source": "three readings", "run4.three_time_a": 5.0, "run4.three_time_b": 4.0,
            "run4.three_time_c": 14.0, "run4.three_temperature_a": 22.0, "run4.three_temperature_c": 25.0,
            "run4.three_drift_before": 0.005, "run4.three_drift_after": -0.001,
        },
    }  # fmt: skip
    for code, changes in cases.items():
        assert code in codes(fuel, tmp_path, changes), code
    stop = rewritten(fuel, tmp_path, cases["fluorine-limit"])
    assert [one.action for one in stop.findings if one.code == "fluorine-limit"] == ["stop"]


def test_people_and_lots_on_the_day_of_the_run(fuel: Book, calibration: Book, tmp_path: Path) -> None:
    """Authorisation, the checker's own run, and whatever had run out on that day."""
    operator = fuel.readings["run4.operator"]
    assert "operator-not-authorised" in codes(fuel, tmp_path, {"run4.operator": "SK"})
    assert "checker-operator" in codes(fuel, tmp_path, {"sheet.checker": operator})
    release = {"sheet.released_by": "JO", "sheet.checked_at": "2025-03-04"}
    assert "release-not-authorised" in codes(fuel, tmp_path, release)
    tables = {
        "balance-expired": ("balance", {"calibrated_until": LONG_AGO}),
        "wire-expired": ("wire", {"valid_until": LONG_AGO}),
        "control-expired": ("certified", {"valid_until": LONG_AGO}),
        "aid1-expired": ("aid", {"valid_until": LONG_AGO}),
    }
    aid = {"run4.aid1_lot": "SO-1", "run4.aid1_mass": 0.05}
    for code, (table, changed) in tables.items():
        old = with_table(fuel, table, **changed)
        assert code in codes(old, tmp_path, aid if code.startswith("aid") else {}), code
    assert "certificate-expired" in codes(with_table(calibration, "certified", valid_until=LONG_AGO), tmp_path, {})
    thread = {"run1.thread_lot": "TH-4"}
    assert "thread-expired" in codes(with_table(calibration, "thread", valid_until=LONG_AGO), tmp_path, thread)


def test_a_calibration_names_its_vessel_and_needs_a_rise(calibration: Book, tmp_path: Path) -> None:
    """The logger's vessel against the front page's; an instrument's value alone is no calibration."""
    assert "record-vessel" in codes(calibration, tmp_path, {"run2.record_vessel": "other"})
    assert "rise-value-only" in codes(calibration, tmp_path, {"run2.rise_source": "value only"})


def test_an_unchecked_rise_is_said_in_the_verdict(fuel: Book, tmp_path: Path) -> None:
    """A rise that an instrument gave is listed among what was not checked."""
    rise = {"run4.rise_source": "instrument", "run4.instrument_rise": 2.5}
    listed = rewritten(fuel, tmp_path, rise).not_checked
    assert listed[0].startswith("the corrected rise of 1 runs")
    assert not any("corrected rise" in one for one in rewritten(fuel, tmp_path, {}).not_checked)


def test_mixing_cautions_duties_and_masses(mixing: Book, tmp_path: Path) -> None:
    """Sealed bodies, other liquids, the cup's date, blank runs, the check body, the mass of liquid."""
    given = {"sheet.cup_source": "given", "sheet.cup": "MC-1", "sheet.cup_heat_capacity_typed": None}
    few = {"sheet.cup_source": "blank runs"}
    empty, end = mixing.readings["run1.cup_empty"], mixing.readings["run1.end_mass"]
    cases: dict[str, Changes] = {
        "body-sealed": {"sheet.sealed": "yes"},
        "liquid-hot": {"sheet.liquid": "other", "sheet.liquid_name": "oil", "sheet.liquid_specific_heat": 2.0},
        "check-body-due": {"sheet.check_body": "copper"},
        "water-mass": {"run1.cup_with_water": empty + 20.0, "run1.end_mass": end},
        "water-mass-impossible": {"run1.cup_with_water": empty + 2.0},
    }
    for code, changes in cases.items():
        assert code in codes(mixing, tmp_path, changes), code
    assert "cup-expired" in codes(with_table(mixing, "cup", valid_until=LONG_AGO), tmp_path, given)
    if mixing.readings["sheet.cup_source"] == "given":
        blank = {"run1.role": "blank", "run1.sample_mass": 50.0}
        assert {"cup-source", "reading-missing"} & codes(mixing, tmp_path, {**few, **blank})


def test_materials_are_named_where_the_sheet_names_another(mixing: Book, tmp_path: Path) -> None:
    """A specific heat of other materials is a note with names, grades and sources; a right name is none."""
    path = write(tmp_path, mixing.data({"sheet.material": "silver coin"}))
    found = [one for one in check(path).findings if one.code == "candidates"]
    named = [one for one in rewritten(mixing, tmp_path, {}).findings if one.code == "candidates"]
    assert not named
    assert len(found) == 1
    assert (found[0].severity, found[0].sort, found[0].field) == ("note", "note", "sheet.specific_heat")
    listed = str(found[0].expected).split(", ")
    assert 1 <= len(listed) <= 6
    assert "table" in found[0].message or "Handbook" in found[0].message or "too many" in found[0].message
    right = write(tmp_path, mixing.data({"sheet.material": f"a piece of {listed[0]}"}))
    assert not [one for one in check(right).findings if one.code == "candidates"]
