"""Filling adds to what is there: it overwrites nothing in silence, reports every fault, writes whole files or none."""

from __future__ import annotations

import json
import re
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest
from verbs_case import COAL, CONTROL, MONDAY, filled, lab_file, record_of, worklist_file, written

from sheetcal import verbs
from sheetcal.errors import BadInput, BadInputs, Refused, SheetcalError
from sheetcal.verbs.workbook import open_workbook

ANALYSED = {**COAL, "analysis_moisture": "2.60"}
Fill = Callable[..., verbs.Output]


@pytest.fixture(scope="module")
def issued(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A fuel workbook as issued: control, one sample open, one with its moisture printed by the worklist."""
    folder = tmp_path_factory.mktemp("fill")
    lab_file(folder)
    worklist = worklist_file(folder, [CONTROL, COAL, {**ANALYSED, "sample_id": "S-2"}])
    verbs.issue(
        "fuel", str(folder / "issued.xlsx"), lab=str(folder / "lab.toml"), worklist=str(worklist), calorimeter="CAL-A",
        moment=MONDAY,
    )  # fmt: skip
    return folder / "issued.xlsx"


@pytest.fixture
def fill(issued: Path, tmp_path: Path) -> Fill:
    """`fill(values, **options)`: fills the issued workbook (or `start`) from JSON values into out.xlsx."""

    def run(values: dict[str, Any] | str, start: Path = issued, out: str = "out.xlsx", **options: Any) -> verbs.Output:
        data = tmp_path / ("data.csv" if isinstance(values, str) else "data.json")
        data.write_text(values if isinstance(values, str) else json.dumps(values), "utf-8")
        return verbs.fill(str(start), str(data), out=str(tmp_path / out), **options)

    return run


def readings(path: Path) -> dict[str, Any]:
    return dict(open_workbook(path).parts.readings)


# --- what is taken -----------------------------------------------------------------------------------------


def test_values_come_in_the_field_s_unit(fill: Fill, tmp_path: Path) -> None:
    """JSON numbers are in the field's unit; texts may carry their own; null leaves the reading as it is."""
    output = fill({"run1.crucible_gross": 11.8231, "run1.crucible_tare": "10823.1 mg", "run1.vessel_water": None})
    found = readings(tmp_path / "out.xlsx")
    assert (found["run1.crucible_gross"], found["run1.crucible_tare"]) == (11.8231, pytest.approx(10.8231))
    assert "run1.vessel_water" not in found
    assert re.fullmatch(r"filled \S+  \d+ readings, \d+ missing", output.lines[0])


def test_a_csv_names_field_value_and_unit(fill: Fill, tmp_path: Path) -> None:
    """An empty unit is the field's; an empty value leaves the reading open."""
    fill(
        "field,value,unit\nrun1.oxygen_pressure,3020,kPa\nrun1.date,2025-03-03,\nrun1.start,08:05,\nrun1.vessel_water,,\n"
    )
    found = readings(tmp_path / "out.xlsx")
    assert found["run1.oxygen_pressure"] == pytest.approx(3.02)
    assert (found["run1.date"], found["run1.start"]) == (45719.0, "08:05")
    assert "run1.vessel_water" not in found


def test_the_issue_id_stays_and_results_come_with_their_values(fill: Fill, issued: Path, tmp_path: Path) -> None:
    """OUT is the same workbook with more in it: same record, results computed, sound to the checker."""
    fill({"run1.crucible_gross": 11.8231, "run1.crucible_tare": 10.8231})
    before, after = open_workbook(issued).parts, open_workbook(tmp_path / "out.xlsx").parts
    assert after.record == before.record
    assert after.typed["run1.mass"] == pytest.approx(1.0)


def test_a_series_and_its_single_elements(fill: Fill, tmp_path: Path) -> None:
    """A list fills the series; one element is counted from 1; a gap may be filled later without amending."""
    fill({"run1.record_time": [0, 0.5, 1.0], "run1.record_temperature": [22.1, None, 22.3, None]})
    fill({"run1.record_temperature[2]": 22.2, "run1.record_temperature[5]": 22.5}, tmp_path / "out.xlsx", "two.xlsx")
    found = readings(tmp_path / "two.xlsx")
    assert found["run1.record_temperature"] == [22.1, 22.2, 22.3, None, 22.5]
    with pytest.raises(Refused, match=r"run1.record_temperature\[1\] already holds 22.1, not 23"):
        fill({"run1.record_temperature[1]": 23.0}, tmp_path / "two.xlsx", "three.xlsx")


def test_a_series_may_go_on_but_not_change(fill: Fill, tmp_path: Path) -> None:
    """A longer record that begins with the old one only adds; another one is refused."""
    fill({"run1.record_time": [0, 0.5]})
    fill({"run1.record_time": [0, 0.5, 1.0]}, tmp_path / "out.xlsx", "two.xlsx")
    assert readings(tmp_path / "two.xlsx")["run1.record_time"] == [0.0, 0.5, 1.0]
    with pytest.raises(Refused, match="already holds"):
        fill({"run1.record_time": [0, 0.6, 1.0]}, tmp_path / "two.xlsx", "three.xlsx")


def test_a_logger_file_brings_record_and_notes(issued: Path, tmp_path: Path) -> None:
    """--log fills time, temperature, firing time, end of the main period, vessel, start and the file's name."""
    log = tmp_path / "A.csv"
    rows = "".join(f"{n / 2},{22 + (n > 10) * 2.5 + n / 1000:.4f}\n" for n in range(39))
    notes = "# vessel A1; start 2025-03-03T08:05; fired at 5.00 min"
    log.write_text(f"{notes}\ntime_min,temperature_degC\n{rows}", "utf-8")
    verbs.fill(str(issued), None, [f"run1={log}"], out=str(tmp_path / "out.xlsx"))
    found = readings(tmp_path / "out.xlsx")
    assert (found["run1.firing_time"], found["run1.end_of_main"]) == (5.0, 14.0)
    assert (found["run1.record_vessel"], found["run1.record_file"]) == ("A1", "A.csv")
    assert len(found["run1.record_time"]) == len(found["run1.record_temperature"]) == 39


def test_a_logger_file_without_header_needs_its_unit(issued: Path, tmp_path: Path) -> None:
    """--log-time says it; without it the file is refused, as is a record longer than its place."""
    log = tmp_path / "A.csv"
    log.write_text("".join(f"{30 * n},{22 + n / 1000}\n" for n in range(20)), "utf-8")
    with pytest.raises(BadInput, match="has no header"):
        verbs.fill(str(issued), None, [f"run1={log}"], out=str(tmp_path / "out.xlsx"))
    verbs.fill(str(issued), None, [f"run1={log}"], "s", out=str(tmp_path / "out.xlsx"))
    assert readings(tmp_path / "out.xlsx")["run1.record_time"][1] == pytest.approx(0.5)
    log.write_text("time_s,temperature_degC\n" + "".join(f"{n},{22 + n / 1000}\n" for n in range(500)), "utf-8")
    with pytest.raises(SheetcalError, match="500 readings"):
        verbs.fill(str(issued), None, [f"run1={log}"], out=str(tmp_path / "long.xlsx"))


def test_analysis_of_other_samples_is_passed_over_and_counted(
    fill: Fill, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    """Late values find their sample; the others are counted on standard error."""
    fill(
        "sample,quantity,value,unit,basis,determined,by,source,mark\n"
        "S-1,S,0.62,%,d,2025-03-04T09:40,SK,measured,\nS-1,Cl,0.02,%,d,2025-03-04T09:40,SK,measured,<\n"
        "X-7,S,0.9,%,d,2025-03-04T09:40,SK,measured,\nX-8,S,0.9,%,d,2025-03-04T09:40,SK,measured,\n"
    )
    found = readings(tmp_path / "out.xlsx")
    assert (found["sample2.sulfur"], found["sample2.sulfur_basis"]) == (0.62, "dry")
    assert (found["sample2.chlorine"], found["sample2.chlorine_mark"]) == (0.02, "<")
    assert "passed over 2 samples" in capsys.readouterr().err


MOISTURES = (
    "sample,quantity,value,unit,basis,determined,by,source,mark\n"
    "S-1,analysis_moisture,8.40,%,ad,2025-03-03T15:00,SK,measured,\n"
    "S-1,analysis_moisture,8.90,%,ad,2025-03-04T09:00,SK,measured,\n"
)


def test_each_run_takes_the_moisture_nearest_its_weighing(fill: Fill, tmp_path: Path) -> None:
    """Of several moistures each run takes its own; a third run later changes nothing that stands."""
    places = open_workbook_places(tmp_path, fill)
    first, second, third, *_ = places
    fill({f"{first}.date": "2025-03-03", f"{first}.start": "14:30"}, out="one.xlsx")
    fill({f"{second}.date": "2025-03-04", f"{second}.start": "09:30"}, tmp_path / "one.xlsx")
    fill(MOISTURES, tmp_path / "out.xlsx", "two.xlsx")
    found = readings(tmp_path / "two.xlsx")
    assert (found[f"{first}.analysis_moisture"], found[f"{second}.analysis_moisture"]) == (8.40, 8.90)
    held = found["sample2.analysis_moisture"]
    fill({f"{third}.date": "2025-03-04", f"{third}.start": "10:00"}, tmp_path / "two.xlsx", "three.xlsx")
    fill(MOISTURES, tmp_path / "three.xlsx", "four.xlsx")
    found = readings(tmp_path / "four.xlsx")
    assert found[f"{third}.analysis_moisture"] == 8.90 and found["sample2.analysis_moisture"] == held


def open_workbook_places(tmp_path: Path, fill: Fill) -> list[str]:
    """The run places of the first sample after the control."""
    fill({"run1.vessel_water": 1.0}, out="probe.xlsx")
    places = open_workbook(tmp_path / "probe.xlsx").parts.skeleton.places.values()
    return [one.id.partition(".")[0] for one in places if one.field.key == "run.date" and one.sample == "sample2"]


def test_the_same_data_twice_changes_nothing(fill: Fill, tmp_path: Path) -> None:
    """Filling again what stands is no amendment."""
    values = {"run1.date": "2025-03-03", "run1.oxygen_pressure": 3.02, "run1.record_time": [0, 0.5]}
    fill(values)
    fill(values, tmp_path / "out.xlsx", "two.xlsx")
    fill(MOISTURES, tmp_path / "two.xlsx", "three.xlsx")
    fill(MOISTURES, tmp_path / "three.xlsx", "four.xlsx")
    assert readings(tmp_path / "four.xlsx") == readings(tmp_path / "three.xlsx")


# --- what is refused ---------------------------------------------------------------------------------------


def test_another_value_is_refused_unless_amended_with_a_reason(fill: Fill, tmp_path: Path) -> None:
    """Old, new, who, when and why go to the correction block."""
    fill({"run1.vessel_water": 1.0})
    with pytest.raises(Refused, match=r"run1.vessel_water already holds 1.0, not 5.0"):
        fill({"run1.vessel_water": 5.0}, tmp_path / "out.xlsx", "two.xlsx")
    with pytest.raises(BadInput, match="no reason"):
        fill({"run1.vessel_water": 5.0}, tmp_path / "out.xlsx", "two.xlsx", amend=True, reason="  ")
    assert not (tmp_path / "two.xlsx").exists()
    fill({"run1.vessel_water": 5.0}, tmp_path / "out.xlsx", "two.xlsx", amend=True, reason="pipette read twice")
    found = readings(tmp_path / "two.xlsx")
    assert found["run1.vessel_water"] == 5.0
    line = {name: found[f"sheet.correction1_{name}"] for name in ("cell", "old", "new", "who", "when", "why")}
    assert line["cell"].startswith("run1.vessel_water Readings!") and (line["old"], line["new"]) == ("1.0", "5.0")
    assert line["why"] == "pipette read twice" and line["when"].endswith("Z") and "sheetcal fill" in line["who"]
    fill({"run1.vessel_water": 6.0}, tmp_path / "two.xlsx", "three.xlsx", amend=True, reason="again")
    assert readings(tmp_path / "three.xlsx")["sheet.correction2_old"] == "5.0"


def test_what_was_only_printed_as_usual_may_be_chosen_otherwise(fill: Fill, tmp_path: Path) -> None:
    """State, source of the rise and lots printed at issue are suggestions, not readings."""
    fill({"run1.state": "valid", "run1.rise_source": "three readings"})
    found = readings(tmp_path / "out.xlsx")
    assert (found["run1.state"], found["run1.rise_source"]) == ("valid", "three readings")


LOCKED = ("sample3.analysis_moisture", "sample2.sample_id", "run1.gross_run", "sheet.issue_id", "sample2.runs_required")


@pytest.mark.parametrize("one", LOCKED)
def test_locked_ids_are_refused(fill: Fill, tmp_path: Path, one: str) -> None:
    """Worklist readings, labels, results and limits cannot be filled."""
    with pytest.raises(Refused, match="is locked"):
        fill({one: 3})
    assert not (tmp_path / "out.xlsx").exists()


@pytest.mark.parametrize(
    ("one", "value", "words"),
    [
        ("run1.crucible_gros", 11.0, "no field run1.crucible_gros; expected run1.crucible_gross"),
        ("run99.vessel_water", 1.0, "no field"),
        ("run1.vessel_water", "1.0 g", "mL"),
        ("run1.vessel_water", "wet", "wet"),
        ("run1.vessel_water", True, "true"),
        ("run1.vessel_water", [1.0], "a list"),
        ("run1.vessel_water[1]", 1.0, "is no series"),
        ("run1.vessel_water", "n.d.", "n.d."),
        ("run1.vessel", "A9", "A1, A2"),
        ("run1.state", "good", "planned, valid, void"),
        ("run1.start", "8 o'clock", "a time as 08:05"),
        ("run1.start", "8:05", "a time as 08:05"),
        ("run1.date", "03/04/2025", "a date as 2025-03-04"),
        ("run1.date", "2025-03-04T09:00", "time of day"),
        ("sample2.sulfur_determined", "2025-03-04T09:00+01:00", "names a time zone"),
        ("run1.remarks", "bell \u0007", r"\\x07"),
        ("run1.remarks", "x" * 3000, "2000 signs"),
        ("run1.record_time", ["a", "b"], "a"),
        ("run1.record_time[9999]", 1.0, "at most"),
    ],
)
def test_values_that_do_not_fit_are_named(fill: Fill, tmp_path: Path, one: str, value: object, words: str) -> None:
    """Field, value and what was expected stand in the line; nothing is written."""
    with pytest.raises(SheetcalError) as caught:
        fill({one: value})
    assert words.replace("\\\\", "\\") in str(caught.value)
    assert not (tmp_path / "out.xlsx").exists()


def test_all_faults_are_reported_at_once(fill: Fill, tmp_path: Path) -> None:
    """Four faults of one file are four lines, and nothing is half-written."""
    with pytest.raises(BadInputs) as caught:
        fill({"run1.vessel": "A9", "run1.start": "noon", "run1.gross_run": 3, "run98.mass": 1, "run1.vessel_water": 1})
    assert len(caught.value.faults) == 4
    assert sorted(one.name for one in tmp_path.iterdir()) == ["data.json"]


def test_out_of_range_is_refused_and_can_be_confirmed(fill: Fill, tmp_path: Path) -> None:
    """The line names the range; confirmed, the value stands and the remarks of the run say so, after what they held."""
    with pytest.raises(Refused, match=r"run1.vessel_water: 25 mL; expected 0 to 20 mL"):
        fill({"run1.vessel_water": 25.0})
    fill({"run1.vessel_water": 25.0, "run1.remarks": "large vessel"}, allow_out_of_range=True)
    found = readings(tmp_path / "out.xlsx")
    assert found["run1.vessel_water"] == 25.0
    assert found["run1.remarks"] == "large vessel; confirmed at entry: run1.vessel_water 25 (0 to 20 mL)"


def test_an_unusual_value_is_taken_and_said(fill: Fill, tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """Outside the usual range but possible: filled, with a line on standard error."""
    fill({"run1.wire_start": 20.0})
    assert "outside the usual range: run1.wire_start 20 (5 to 15 cm)" in capsys.readouterr().err
    assert readings(tmp_path / "out.xlsx")["run1.wire_start"] == 20.0


STOPS = [
    ({"run1.oxygen_pressure": 3.6, "run1.vessel": "A1"}, "oxygen above the limit"),
    ({"run1.oxygen_pressure": 12.0, "run1.vessel": "A1"}, "oxygen above the limit"),
    ({"run5.sample_mass": 1.9, "run5.vessel": "A1"}, "largest mass"),
    ({"run5.sample_mass": 1.9, "run5.vessel": "A1"}, "rated energy"),
    ({"sample2.chlorine": 21.0, "sample2.chlorine_basis": "dry"}, "chlorine above the method's limit"),
    ({"run1.vessel": "A1", "run1.date": "2025-12-01"}, "past its firings or its pressure test"),
]


@pytest.mark.parametrize(("values", "words"), STOPS)
@pytest.mark.parametrize("allowed", [False, True])
def test_no_option_covers_a_stop_limit(
    fill: Fill, tmp_path: Path, values: dict[str, Any], words: str, allowed: bool
) -> None:
    """Oxygen, mass, rated energy, chlorine and the vessel's test: refused with and without --allow-out-of-range."""
    with pytest.raises(SheetcalError) as caught:
        fill(values, allow_out_of_range=allowed)
    refused_as_impossible = "--allow-out-of-range" in str(caught.value) and not allowed
    assert words in str(caught.value) or refused_as_impossible
    assert not (tmp_path / "out.xlsx").exists()


def test_a_void_run_keeps_what_stopped_it(fill: Fill, tmp_path: Path) -> None:
    """A vented filling is evidence: recorded with its run void, it is taken."""
    fill({"run1.oxygen_pressure": 3.6, "run1.vessel": "A1", "run1.state": "void", "run1.void_reason": "other"})
    assert readings(tmp_path / "out.xlsx")["run1.oxygen_pressure"] == 3.6


@pytest.mark.parametrize("what", ["formula", "label", "constant", "record", "reading"])
def test_an_altered_workbook_is_refused(issued: Path, fill: Fill, tmp_path: Path, what: str) -> None:
    """Anything changed outside the readings, or a reading that is a formula: run `sheetcal check` first."""
    from openpyxl import load_workbook

    parts = open_workbook(issued).parts
    book = load_workbook(issued)
    if what == "formula":
        place = parts.skeleton.places["run1.total_heat"]
        book[place.tab][place.cell] = 26000.0
    elif what == "label":
        place = parts.skeleton.places["sample2.sample_id"]
        book[place.tab][place.cell] = "S-9"
    elif what == "constant":
        book["Constants"]["C5"] = 0.5
    elif what == "record":
        book["Issue record"]["B3"] = "calibration" if book["Issue record"]["B3"].value == "fuel" else "fuel"
    else:
        place = parts.skeleton.places["run1.crucible_gross"]
        book[place.tab][place.cell] = "=11+0.8231"
    book.save(tmp_path / "altered.xlsx")
    with pytest.raises(SheetcalError) as caught:
        fill({"run1.vessel_water": 1.0}, tmp_path / "altered.xlsx")
    assert "sheetcal check" in str(caught.value) or what == "record"
    assert not (tmp_path / "out.xlsx").exists()


def test_misuse_writes_nothing(issued: Path, tmp_path: Path) -> None:
    """No data, a log that names no file, an output that exists or cannot be: one line, no file."""
    (tmp_path / "taken.xlsx").write_bytes(b"mine")
    for data, log, out in (
        (None, [], "out.xlsx"),
        (None, ["run1"], "out.xlsx"),
        (None, ["run77=none.csv"], "out.xlsx"),
        (str(tmp_path / "none.json"), [], "out.xlsx"),
        (str(tmp_path / "none.json"), [], "taken.xlsx"),
        (str(tmp_path / "none.json"), [], "out.pdf"),
        (str(tmp_path / "none.json"), [], "no/out.xlsx"),
    ):
        with pytest.raises(SheetcalError):
            verbs.fill(str(issued), data, log, out=str(tmp_path / out))
    assert [one.name for one in tmp_path.iterdir()] == ["taken.xlsx"]
    assert (tmp_path / "taken.xlsx").read_bytes() == b"mine"


def test_a_workbook_saved_by_libreoffice_can_be_filled_on(
    tmp_path: Path, fill: Fill, convert: Callable[[list[Path], str, Path], None]
) -> None:
    """Re-saved as .xlsx or .ods it is still ours: late values go in, readings stay."""
    record = record_of("fuel", tmp_path, [CONTROL, COAL])
    ours = filled(record, tmp_path / "ours.xlsx", case="values awaited")
    held = readings(ours)
    for form in ("xlsx", "ods"):
        folder = tmp_path / form
        folder.mkdir()
        convert([ours], form, folder)
        fill({"sample2.sulfur": 0.62, "sample2.sulfur_basis": "dry"}, folder / f"ours.{form}", f"{form}.xlsx")
        found = readings(tmp_path / f"{form}.xlsx")
        assert found["sample2.sulfur"] == 0.62
        assert {one: value for one, value in found.items() if not one.startswith("sample2.sulfur")} == held


def test_written_by_the_bench_and_filled_from_its_readings_is_the_same(tmp_path: Path, fill: Fill) -> None:
    """A whole workbook filled from one JSON file equals the one written at once."""
    from sheetcal import bench

    record = record_of("fuel", tmp_path, [CONTROL, COAL])
    values = bench.fill(record, 3)
    whole = written(record, values, tmp_path / "whole.xlsx")
    empty = written(record, {}, tmp_path / "empty.xlsx")
    fill({one: value for one, value in values.items() if value is not None}, empty)
    assert readings(tmp_path / "out.xlsx") == readings(whole)
    assert open_workbook(tmp_path / "out.xlsx").parts.typed == open_workbook(whole).parts.typed
