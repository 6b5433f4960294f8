"""A reading that cannot be right is answered with what was probably meant, and the cell that is really wrong."""

from __future__ import annotations

import random
from collections.abc import Mapping
from pathlib import Path
from typing import Any

import pytest
from planting import CONTROL, Book, coal, filled, issue, rewritten, write

from sheetcal.check.case import Case
from sheetcal.check.meant import of_reading
from sheetcal.check.submission import take_apart
from sheetcal.check.witness import witness
from sheetcal.excel.reader import read
from sheetcal.model import Finding


@pytest.fixture(scope="module")
def fuel(tmp_path_factory: pytest.TempPathFactory) -> Book:
    """A control and one coal, weighed empty and full, records taken by a logger."""
    return filled(issue("fuel", tmp_path_factory.mktemp("issue"), [CONTROL, coal("S-1")], spare=1))


@pytest.fixture(scope="module")
def instrument(tmp_path_factory: pytest.TempPathFactory) -> Book:
    """The same on the calorimeter that gives its own rise; pellets weighed net."""
    rows = [CONTROL, coal("S-1")]
    return filled(issue("fuel", tmp_path_factory.mktemp("issue"), rows, spare=1, calorimeter="CAL-B"))


def found(book: Book, folder: Path, changes: Mapping[str, Any], one: str) -> Finding:
    """The first finding on a reading that was typed wrongly."""
    verdict = rewritten(book, folder, changes)
    listed = [finding for finding in verdict.findings if finding.field and finding.field.startswith(one)]
    assert listed, [(finding.code, finding.field) for finding in verdict.findings]
    return listed[0]


def test_the_unit_that_was_typed(fuel: Book, tmp_path: Path) -> None:
    oxygen, net = fuel.readings["run4.oxygen_pressure"], {"run4.crucible_gross": None, "run4.crucible_tare": None}
    mass = round(fuel.readings["run4.crucible_gross"] - fuel.readings["run4.crucible_tare"], 4)
    own = {**net, "run4.weighing": "net only"}
    temperature = fuel.readings["run4.jacket_temperature"]
    cases: list[tuple[str, float, str, Mapping[str, Any]]] = [
        ("run4.sample_mass", round(1000 * mass, 1), f"typed in mg: {mass:g} g", own),
        ("run4.sample_mass", round(10 * mass, 3), "decimal point", own),
        ("run4.sample_mass", round(10000 * mass), "decimal point is probably in the wrong place, or lost", own),
        ("run4.sample_mass", -mass, "sign", own),
        ("run4.oxygen_pressure", round(10 * oxygen, 1), f"typed in bar: {oxygen:g} MPa", {}),
        ("run4.oxygen_pressure", round(145.038 * oxygen), "typed in psi", {}),
        ("run4.oxygen_pressure", round(oxygen / 0.0980665, 1), "typed in kgf/cm2", {}),
        ("run4.oxygen_pressure", 3.15 + 0.1, "absolute pressure", {}),
        ("run4.jacket_temperature", round(temperature + 273.15, 2), f"typed in kelvin: {temperature:g} degC", {}),
        ("run4.jacket_temperature", round(1.8 * temperature + 32, 2), "typed in degF", {}),
        ("run4.wire_start", 100.0, "typed in mm: 10 cm", {}),
        ("run4.calorimeter_water", 2.0, "typed in kg: 2000 g", {}),
        ("sheet.station_pressure", 984.0, "typed in hPa (mbar): 98.4 kPa", {}),
        ("sheet.station_pressure", 738.0, "typed in mmHg", {}),
        ("sample2.ash", round(fuel.readings["sample2.ash"] / 100, 4), "typed in a fraction of 1", {}),
    ]
    for one, value, words, others in cases:
        finding = found(fuel, tmp_path, {**others, one: value}, one)
        assert words in " | ".join(finding.causes), (one, value, finding.code, finding.causes)


def test_a_record_in_seconds_or_kelvin(fuel: Book, tmp_path: Path) -> None:
    times = [60.0 * one for one in fuel.readings["run4.record_time"]]
    assert found(fuel, tmp_path, {"run4.record_time": times}, "run4.record_time").likely_cause == (
        "the times of this record are probably in seconds"
    )
    kelvin = [round(one + 273.15, 4) for one in fuel.readings["run4.record_temperature"]]
    assert found(fuel, tmp_path, {"run4.record_temperature": kelvin}, "run4.record_temperature").likely_cause == (
        "the temperatures of this record are probably in kelvin"
    )


def test_what_the_other_readings_of_the_run_tell(fuel: Book, tmp_path: Path) -> None:
    """Burette, wire, firing time and crucible: the slip as people make it, and the words for it."""
    end, start = fuel.readings["run4.burette_end"], fuel.readings["run4.burette_start"]
    fired = fuel.readings["run4.firing_time"]
    assert (start, fired) == (5.0, 5.0)
    gross, tare = fuel.readings["run4.crucible_gross"], fuel.readings["run4.crucible_tare"]
    cases: list[tuple[Mapping[str, Any], str, str]] = [
        ({"run4.burette_end": end + 20, "run4.burette_start": 0.0}, "run4.nitric", "start of the burette"),
        ({"run4.burette_end": start, "run4.burette_start": end}, "run4.burette_end", "burette were probably exchanged"),
        ({"run4.wire_left": 7.1}, "run4.wire_left", "10 - 7.1 = 2.9 cm"),
        ({"run4.wire_left": 10.0, "run4.wire_start": 2.9}, "run4.wire_left", "length before and length left"),
        ({"run4.firing_time": fired + 0.5}, "run4.firing_time", "typed 1 readings too late"),
        ({"run4.crucible_gross": tare, "run4.crucible_tare": gross}, "run4.crucible_gross", "full and empty crucible"),
        (
            {"sample2.total_moisture": 1.73, "sample2.analysis_moisture": 8.4},
            "sample2.total",
            "were probably exchanged",
        ),
    ]
    for changes, one, words in cases:
        finding = found(fuel, tmp_path, changes, one)
        assert words in " | ".join(finding.causes), (changes, finding.code, finding.causes)


def test_an_element_on_another_basis_than_stated(fuel: Book, tmp_path: Path) -> None:
    """Carbon as received written as dry: the sum of elements and ash says so where oxygen was measured."""
    dry = fuel.readings["sample2.carbon"]
    received = round(dry * (100 - fuel.readings["sample2.total_moisture"]) / 100, 2)
    changes = {"sample2.oxygen_source": "measured", "sample2.carbon": received}
    finding = found(fuel, tmp_path, changes, "sample2.")
    assert finding.code.startswith("composition-sum")
    assert str(finding.likely_cause).startswith("carbon was probably given as received, not dry")


def test_a_gross_value_of_another_unit(fuel: Book, tmp_path: Path) -> None:
    """An instrument's value in MJ/kg, cal/g or Btu/lb, against what the elements give."""
    one = {"rise_source": "value only", "instrument_includes": "nothing", "instrument_heat_capacity": 10138.7}
    run = {f"run{number}.{name}": value for number in (4, 5) for name, value in one.items()}
    for factor, unit in ((1000.0, "MJ/kg"), (4.184, "cal/g"), (2.326, "Btu/lb")):
        typed = {f"run{number}.instrument_gross": round(31980.0 / factor, 3) for number in (4, 5)}
        verdict = rewritten(fuel, tmp_path, {**run, **typed})
        said = " ".join(words for one in verdict.findings for words in one.causes)
        assert f"the instrument's value was probably typed in {unit}" in said, [one.code for one in verdict.findings]


def test_which_of_three_weighings_is_wrong(fuel: Book, tmp_path: Path) -> None:
    """Net, full or empty: the duplicate tells whether the net mass is right, the digits which of the others is not."""
    gross, tare = fuel.readings["run4.crucible_gross"], fuel.readings["run4.crucible_tare"]
    net = round(gross - tare, 4)
    assert (gross, tare, net) == (12.0216, 11.1227, 0.8989)
    whole = {"run4.sample_mass": net}
    cases = {
        "run4.sample_mass": ({"run4.sample_mass": 0.9889}, net),
        "run4.crucible_gross": ({**whole, "run4.crucible_gross": 12.2016}, gross),
        "run4.crucible_tare": ({**whole, "run4.crucible_tare": 11.2127}, tare),
    }
    for one, (changes, right) in cases.items():
        verdict = rewritten(fuel, tmp_path, changes)
        finding = next(item for item in verdict.findings if item.code == "cross-foot")
        assert (finding.field, finding.expected) == (one, pytest.approx(right)), (one, finding.causes)
        assert str(finding.likely_cause).startswith("two digits were probably exchanged")


def test_random_readings_have_no_cause(fuel: Book, tmp_path: Path) -> None:
    """Of readings far outside their range, typed at random, at most one in twenty-five is explained."""

    path = write(tmp_path, fuel.data())
    file = read(str(path))
    parts = take_apart(file, str(path))
    case = Case(parts, witness(parts, file.cells, file.names), {}, file.cells, file.names)
    source = random.Random(11)
    named: list[tuple[str, float, str]] = []
    tried = 0
    for one, low, high, digits in (
        ("run4.sample_mass", 5.0, 5000.0, 4), ("run4.oxygen_pressure", 4.0, 4000.0, 2),
        ("run4.jacket_temperature", 45.0, 400.0, 2), ("run4.calorimeter_water", 1.0, 1900.0, 1),
    ):  # fmt: skip
        fld = parts.skeleton.places[one].field
        for _ in range(500):
            value = round(low * (high / low) ** source.random(), digits)
            tried += 1
            named += [(one, value, words) for words in of_reading(case, one, fld, value)[:1]]
    assert tried == 2000
    assert len(named) <= 80, named
