"""Issue prints what is known, leaves open what is not, and refuses what could not be done or must not be fired."""

from __future__ import annotations

import re
from datetime import datetime
from pathlib import Path
from typing import Any

import pytest
from verbs_case import COAL, CONTROL, MONDAY, lab_file, record_of, worklist_file

from sheetcal import verbs
from sheetcal.errors import BadInput, BadInputs, Refused, SheetcalError
from sheetcal.kinds import load, skeleton
from sheetcal.model import IssueRecord
from sheetcal.verbs.entering import check_choice, impossible
from sheetcal.verbs.issuing import new_id
from sheetcal.verbs.order import MOST_RUNS
from sheetcal.verbs.workbook import open_workbook

SECOND = {"sample_id": "IHC-3", "role": "control", "fuel_class": "coal"}
BIOMASS = {"sample_id": "S-9", "fuel_class": "biomass"}
UNKNOWN = {"sample_id": "S-8", "fuel_class": "unknown", "approval": "HT, 2025-03-03"}


def sample(record: IssueRecord, number: int, name: str) -> Any:
    return record.prefilled.get(f"sample{number}.{name}")


# --- what is printed ---------------------------------------------------------------------------------------


def test_an_id_is_unguessable_and_easy_to_read() -> None:
    """Four groups of five signs without look-alikes; a thousand of them all differ."""
    ids = {new_id() for _ in range(1000)}
    assert len(ids) == 1000
    assert all(re.fullmatch(r"(?:[a-hj-km-np-tv-z2-9]{5}-){3}[a-hj-km-np-tv-z2-9]{5}", one) for one in ids)
    assert not any(sign in one for one in ids for sign in "01ilou")


@pytest.mark.parametrize("unit", ["in air", "in vacuum"])
def test_a_control_expects_its_certificate_s_value(tmp_path: Path, unit: str) -> None:
    """Without expected_gross a control's largest mass follows from its certificate as weighed, not from 48 kJ/g."""
    lab = lab_file(tmp_path)
    lab.write_text(lab.read_text("utf-8").replace('mass_convention = "in air"', f'mass_convention = "{unit}"'), "utf-8")
    record = record_of("fuel", tmp_path, [CONTROL, SECOND, COAL], lab=lab)
    assert sample(record, 1, "expected_gross") == (26456 if unit == "in air" else 26436)
    assert sample(record, 2, "expected_gross") == 31748
    assert (sample(record, 1, "control_lot"), sample(record, 3, "control_lot")) == ("BA-31", None)
    assert sample(record, 3, "expected_gross") == 33000  # the class's highest


def test_what_the_worklist_gives_is_locked_and_what_it_leaves_blank_stays_open(tmp_path: Path) -> None:
    """Value, basis, mark and source of a given column are locked together; a blank cell is an open reading."""
    rows = [CONTROL, {**COAL, "S": "0.62", "S_basis": "d", "S_source": "client", "ash": "", "total_moisture": "11.8"}]
    record = record_of("fuel", tmp_path, rows)
    locked = {one.partition(".")[2] for one in record.locked if one.startswith("sample2.")}
    assert {"sulfur", "sulfur_basis", "sulfur_source", "total_moisture", "sample_id", "role"} <= locked
    assert not {"ash", "ash_basis", "expected_gross", "hydrogen"} & locked
    assert (sample(record, 2, "sulfur"), sample(record, 2, "sulfur_basis")) == (0.62, "dry")


def test_everything_printed_is_a_choice_and_within_its_range(tmp_path: Path) -> None:
    """Whatever stands in a new workbook is what the field itself would take."""
    checked = 0
    for kind in ("fuel", "calibration", "specific-heat", "vaporisation", "heat-balance"):
        record = record_of(kind, tmp_path, [CONTROL, SECOND, COAL] if kind == "fuel" else [])
        plan = skeleton(load(kind), record.shape)
        for one, value in record.prefilled.items():
            place = plan.places[one]
            check_choice(place, value, record, one)
            checked += 1
            if isinstance(value, float):
                assert impossible(place, value, record) is None, one
    assert checked > 100


def test_an_unknown_class_is_kept_small_until_somebody_approves(tmp_path: Path) -> None:
    """At most the class's first mass, approval needed, 48 kJ/g where nothing is known; the approval is printed."""
    record = record_of("fuel", tmp_path, [CONTROL, UNKNOWN])
    assert (sample(record, 2, "needs_approval"), sample(record, 2, "approval")) == ("yes", "HT, 2025-03-03")
    assert (sample(record, 2, "first_limit"), sample(record, 2, "expected_gross")) == (0.5, 48000)
    assert record.profile == "first-principles"
    assert sample(record, 1, "needs_approval") == "no"


def test_a_class_stated_from_zero_accuses_no_carbonate(tmp_path: Path) -> None:
    """Lowest 0 J/g says nothing of what takes up heat: the sheet warns only below what nature allows."""
    record = record_of("fuel", tmp_path, [CONTROL, {"sample_id": "S-7", "fuel_class": "waste"}])
    assert sample(record, 2, "expected_low") == -3000 and sample(record, 2, "expected_high") == 45000
    coal = record_of("fuel", tmp_path, [CONTROL, COAL])
    assert sample(coal, 2, "expected_low") == 15000


def test_runs_come_from_the_worklist_the_option_or_the_class(tmp_path: Path) -> None:
    """The sample's own number first; places are the largest number needed plus the spare ones."""
    rows = [{"sample_id": "A", "fuel_class": "recovered", "runs": "5"}, {"sample_id": "B", "fuel_class": "recovered"}]
    plain = record_of("fuel", tmp_path, rows)
    assert [sample(plain, n, "runs_required") for n in (1, 2)] == [5, 3]
    assert (plain.shape.runs, plain.shape.spare, plain.shape.places) == (5, 2, 7)
    asked = record_of("fuel", tmp_path, rows, runs=4, spare=0)
    assert [sample(asked, n, "runs_required") for n in (1, 2)] == [5, 4] and asked.shape.places == 5


def test_the_second_unit_is_the_option_s_or_the_lab_file_s(tmp_path: Path) -> None:
    """--unit wins over [reporting]; the constant says how many J/g it is."""
    lab = lab_file(tmp_path)
    lab.write_text(lab.read_text("utf-8").replace("[reporting]", '[reporting]\nunit = "Btu_IT/lb"'), "utf-8")
    own = record_of("fuel", tmp_path, [CONTROL, COAL], lab=lab)
    asked = record_of("fuel", tmp_path, [CONTROL, COAL], lab=lab, unit="kcal_IT/kg")
    factors = [next(one.value for one in record.constants if one.name == "other_unit") for record in (own, asked)]
    assert factors == [pytest.approx(2.326), pytest.approx(4.1868)]
    assert (own.settings["unit"], asked.settings["unit"]) == ("Btu_IT/lb", "kcal_IT/kg")


@pytest.mark.parametrize("kind", ["specific-heat", "vaporisation", "heat-balance"])
def test_kinds_that_need_no_lab_file_are_issued_without(tmp_path: Path, kind: str) -> None:
    """First principles, no tables, every constant stated; the workbook reads as ours."""
    verbs.issue(kind, str(tmp_path / "out.xlsx"), paper="Letter")
    parts = open_workbook(tmp_path / "out.xlsx").parts
    assert parts.record.profile == "first-principles" and parts.record.lab_sha256 == ""
    assert parts.record.settings["paper"] == "Letter" and parts.record_whole
    assert not any(parts.record.tables.get(name) for name in ("person", "balance", "cup"))


def test_the_largest_worklist_is_still_read_again(tmp_path: Path) -> None:
    """As many run places as a workbook may have: our own gate lets it through."""
    rows = [{**COAL, "sample_id": f"S-{n}"} for n in range(MOST_RUNS // 4)]
    lab = lab_file(tmp_path)
    worklist = worklist_file(tmp_path, rows)
    out = tmp_path / "out.xlsx"
    verbs.issue("fuel", str(out), lab=str(lab), worklist=str(worklist), calorimeter="CAL-A", moment=MONDAY)
    assert open_workbook(out).parts.skeleton.shape.samples == MOST_RUNS // 4


# --- identities stated several times -----------------------------------------------------------------------

AGAIN = """
[[lot]]
id = "FW-9"
what = "firing wire"
heat = "9.9 J/cm"
length = "10.0 cm"
valid_from = {wire}
[[titrant]]
lot = "NT-14"
strength = "0.2 mol/L"
standardised = {titrant}
valid = "30 d"
"""


@pytest.mark.parametrize(("wire", "titrant", "expected"), [
    ("2025-03-01T00:00:00", "2025-03-02", (9.9, 0.2)),
    ("2025-03-05T00:00:00", "2025-03-05", (9.6, 0.1003)),
])  # fmt: skip
def test_a_lot_stands_once_as_in_force_on_the_day(
    tmp_path: Path, wire: str, titrant: str, expected: tuple[float, float]
) -> None:
    """Stated twice, a lot or titrant is printed once: as stated last before the moment of issue."""
    record = record_of(
        "fuel", tmp_path, [CONTROL, COAL], lab=lab_file(tmp_path, AGAIN.format(wire=wire, titrant=titrant))
    )
    wires = [row["heat"] for row in record.tables["wire"] if row["lot"] == "FW-9"]
    titrants = [row["strength"] for row in record.tables["titrant"] if row["lot"] == "NT-14"]
    assert (wires, titrants) == ([expected[0]], [expected[1]])
    assert len({row["lot"] for row in record.tables["titrant"]}) == len(record.tables["titrant"])


def test_a_vessel_past_its_test_or_its_firings_is_not_printed(tmp_path: Path) -> None:
    """Out of service it cannot be chosen; when no vessel is left, issue refuses with a STOP."""
    lab = lab_file(tmp_path)
    text = lab.read_text("utf-8")
    lab.write_text(text.replace("firings_at_start = 487", "firings_at_start = 500", 1), "utf-8")
    record = record_of("fuel", tmp_path, [CONTROL, COAL], lab=lab)
    assert [row["id"] for row in record.tables["vessel"]] == ["A1"]
    with pytest.raises(Refused, match="no vessel in service") as caught:
        record_of("fuel", tmp_path, [CONTROL, COAL], moment=datetime(2025, 12, 24, 8))
    assert "STOP" in str(caught.value)


# --- refusals ----------------------------------------------------------------------------------------------


def test_a_worklist_of_several_profiles_is_refused_saying_how_to_split(tmp_path: Path) -> None:
    """The line names each profile with its samples; --profile does not force one profile on another's class."""
    with pytest.raises(Refused) as caught:
        record_of("fuel", tmp_path, [CONTROL, COAL, BIOMASS])
    text = str(caught.value)
    assert "iso-18125: S-9; iso-1928: S-1" in text and "Split the worklist" in text and "worklist.csv" in text
    with pytest.raises(Refused, match="another profile than iso-18125"):
        record_of("fuel", tmp_path, [CONTROL, COAL], profile="iso-18125")


def test_several_calorimeters_need_one_to_be_named(tmp_path: Path) -> None:
    """Without --calorimeter, and with one that is not there: the line names those there are."""
    for name in (None, "CAL-Z"):
        with pytest.raises(BadInput, match="CAL-"):
            record_of("fuel", tmp_path, [CONTROL, COAL], calorimeter=name)


def test_no_heat_capacity_in_force_is_refused(tmp_path: Path) -> None:
    """Run out, never adopted, or no lab file at all."""
    with pytest.raises(Refused, match="no effective heat capacity in force on 2025-08-01 for vessel A1, A2"):
        record_of("fuel", tmp_path, [CONTROL, COAL], moment=datetime(2025, 8, 1, 8))
    with pytest.raises(Refused, match="no vessel with an effective heat capacity"):
        verbs.issue("fuel", str(tmp_path / "out.xlsx"))
    with pytest.raises(Refused, match="no vessel"):
        verbs.issue("calibration", str(tmp_path / "out.xlsx"))


def test_a_limit_nobody_gives_is_refused(tmp_path: Path) -> None:
    """A class without r, under a profile that states none: the line says what to write where."""
    lab = lab_file(tmp_path)
    text = lab.read_text("utf-8")
    head, mark, rest = text.partition("[class.recovered]")
    lab.write_text(head + mark + re.sub(r"^r = .*\n", "", rest, count=1, flags=re.M), "utf-8")
    with pytest.raises(Refused) as caught:
        record_of("fuel", tmp_path, [CONTROL, {"sample_id": "S-5", "fuel_class": "recovered"}], lab=lab)
    assert "no repeatability limit for S-5 (class recovered)" in str(caught.value) and 'r = "... J/g"' in str(
        caught.value
    )


def test_chlorine_above_the_limit_stops_before_issue(tmp_path: Path) -> None:
    """Every such sample is named, and nothing is written."""
    rows = [
        CONTROL,
        *({"sample_id": f"S-{n}", "fuel_class": "waste", "Cl": str(n), "Cl_basis": "d"} for n in (1, 12, 21)),
    ]
    lab, worklist = lab_file(tmp_path), worklist_file(tmp_path, rows)
    out = tmp_path / "out.xlsx"
    with pytest.raises(BadInputs) as caught:
        verbs.issue("fuel", str(out), lab=str(lab), worklist=str(worklist), calorimeter="CAL-A", moment=MONDAY)
    text = str(caught.value)
    assert [name in text for name in ("S-1,", "S-12,", "S-21,")] == [False, True, True] and text.count("STOP") == 2
    assert not out.exists()


def test_several_faults_of_a_worklist_are_all_told_with_their_lines(tmp_path: Path) -> None:
    """Two unknown classes are two lines; values no field would take name line and range."""
    rows = [CONTROL, {"sample_id": "A", "fuel_class": "cole"}, {"sample_id": "B", "fuel_class": "peat"}]
    with pytest.raises(BadInputs) as caught:
        record_of("fuel", tmp_path, rows)
    assert "worklist.csv, line 3: A" in str(caught.value) and "worklist.csv, line 4: B" in str(caught.value)
    strange = [CONTROL, {**COAL, "analysis_moisture": "80", "ash": "9", "ash_basis": "daf"}]
    with pytest.raises(BadInputs) as caught:
        record_of("fuel", tmp_path, strange)
    text = str(caught.value)
    assert "line 3: sample2.analysis_moisture: 80 %; expected 0 to 70 %" in text
    assert "sample2.ash_basis: 'dry ash-free'" in text


def test_a_control_that_is_no_certified_lot_is_refused(tmp_path: Path) -> None:
    """Without its value no deviation could be shown: the line names the lots there are."""
    with pytest.raises(BadInputs, match="control BA-13 is no certified lot; expected BA-31"):
        record_of("fuel", tmp_path, [{"sample_id": "BA-13", "role": "control"}, COAL])


@pytest.mark.parametrize(
    ("kind", "options", "words"),
    [
        ("heat-balance", {"bodies": 1}, "2 to 8"),
        ("heat-balance", {"bodies": 9}, "2 to 8"),
        ("heat-balance", {"runs": 2}, "takes no --runs; expected --bodies"),
        ("heat-balance", {"spare": 1}, "takes no --spare"),
        ("specific-heat", {"runs": 0}, "1 to 20"),
        ("specific-heat", {"runs": 21}, "1 to 20"),
        ("specific-heat", {"runs": -3}, "1 to 20"),
        ("specific-heat", {"spare": -1}, "0 to 20"),
        ("specific-heat", {"bodies": 3}, "takes no --bodies"),
        ("specific-heat", {"samples": 2}, "takes no --samples"),
        ("specific-heat", {"paper": "A5"}, "A4 or Letter"),
        ("specific-heat", {"unit": "K"}, "J/g"),
        ("specific-heat", {"profile": "iso-1928"}, "does not serve specific-heat"),
        ("calibration", {"runs": 4, "lab": True, "calorimeter": "CAL-A"}, "at least 5"),
        ("fuel", {"samples": 61, "lab": True, "calorimeter": "CAL-A"}, "1 to 60"),
        ("fuel", {"runs": 99, "lab": True, "calorimeter": "CAL-A"}, "1 to 20"),
        ("fuel", {"samples": 60, "runs": 10, "lab": True, "calorimeter": "CAL-A"}, "at most 150"),
    ],
)
def test_options_beyond_their_bounds_are_refused(
    tmp_path: Path, kind: str, options: dict[str, Any], words: str
) -> None:
    """The line names the option and what it may be; nothing is written."""
    if options.get("lab"):
        options = {**options, "lab": str(lab_file(tmp_path))}
    with pytest.raises(SheetcalError) as caught:
        verbs.issue(kind, str(tmp_path / "out.xlsx"), moment=MONDAY, **options)
    assert words in str(caught.value)
    assert not (tmp_path / "out.xlsx").exists()
