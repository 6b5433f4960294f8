"""The invented week's files read without a fault and fit together."""

import csv
import re
from datetime import datetime
from pathlib import Path

import pytest

from sheetcal import kinds
from sheetcal.errors import BadInput
from sheetcal.inputs import (
    read_analysis,
    read_data,
    read_instrument_log,
    read_lab,
    read_logger,
    read_worklist,
)

ROOT = Path(__file__).parents[2]
DEMO = ROOT / "workbooks" / "demo"
EXPECTED = ROOT / "tests" / "demo_expected"


def rows(path: Path) -> list[dict[str, str]]:
    lines = [line for line in path.read_text("utf-8").splitlines() if not line.startswith("#")]
    return list(csv.DictReader(lines))


BOOKS = {row["workbook"]: row for row in rows(DEMO / "workbooks.csv")}
FUEL = [name for name, row in BOOKS.items() if row["kind"] == "fuel"]


def data_files(book: str) -> list[Path]:
    return [DEMO / one for one in BOOKS[book]["data"].split()]


def test_every_demo_file_says_that_it_is_invented() -> None:
    """Nothing here can be taken for a real laboratory's record; the measured fuels name their source."""
    files = [one for one in DEMO.rglob("*") if one.suffix in (".csv", ".toml")]
    assert len(files) > 80
    for one in files:
        first = one.read_text("utf-8").splitlines()[0].lower()
        assert "invented" in first or (one.name == "fuels.csv" and "measured" in first), one


def test_worklists_name_known_classes_and_one_profile_each() -> None:
    """One workbook is one calorimeter and one profile."""
    lab = read_lab(DEMO / "lab.toml")
    assert len(FUEL) == 12
    for book in FUEL:
        samples = read_worklist(DEMO / BOOKS[book]["worklist"]).samples
        found = {lab.fuel_class(one.fuel_class).profile for one in samples if one.role == "sample"}
        assert found <= {BOOKS[book]["profile"]}, book
        assert lab.calorimeter(BOOKS[book]["calorimeter"])


def test_the_week_has_fourteen_samples() -> None:
    """The worklists of the week hold every sample of the order book, S-2512 only in the list of slip F4."""
    held = {one.sample_id for book in FUEL for one in read_worklist(DEMO / BOOKS[book]["worklist"]).samples}
    refused = {one.sample_id for one in read_worklist(DEMO / "worklists" / "W10-waste-F4.csv").samples}
    names = {f"S-25{n:02}" for n in range(1, 15)}
    assert names - held == {"S-2512"}
    assert "S-2512" in refused


@pytest.mark.parametrize("book", [name for name, row in BOOKS.items() if row["kind"] in kinds.names()])
def test_bench_data_fit_the_kind(book: str) -> None:
    """Every id is a reading of the kind, numbers carry a unit that fits, choices are ones the kind offers."""
    fields = kinds.load(BOOKS[book]["kind"]).by_key()
    seen = 0
    for path in data_files(book):
        for name, one in read_data(path).values.items():
            key = re.sub(r"\d+\.", ".", name, count=1)
            assert key in fields, f"{path.name}: {name}"
            field = fields[key]
            assert field.step is None, name
            if field.unit is not None:
                value = one.number(field.unit)
                assert field.low is None or field.low <= value <= (field.high or value), name
            elif field.choices and not isinstance(field.choices, str):
                assert one.value in field.choices, f"{path.name}: {name} {one.value}"
            seen += 1
    assert seen > 5


def test_net_is_gross_less_tare() -> None:
    """The right data carry no slip: the three weighings agree wherever all are given."""
    checked = 0
    for book in FUEL:
        values = {name: one for path in data_files(book) for name, one in read_data(path).values.items()}
        for name in [one for one in values if one.endswith(".crucible_gross")]:
            run = name.partition(".")[0]
            gross, tare, net = (
                values[f"{run}.{end}"].number("g") for end in ("crucible_gross", "crucible_tare", "sample_mass")
            )
            assert gross - tare == pytest.approx(net, abs=1e-9), f"{book} {run}"
            checked += 1
    assert checked == 38


def test_every_firing_has_its_place() -> None:
    """All 71 firings stand in one place of one workbook, and no place twice."""
    places = rows(EXPECTED / "places.csv")
    assert len(places) == 71
    assert len({(one["workbook"], one["place"]) for one in places}) == 71
    assert {one["workbook"] for one in places} <= set(BOOKS)
    assert {one["run"] for one in places} == {one["run"] for one in rows(EXPECTED / "expected_runs.csv")}


def test_every_record_is_read_and_belongs_to_its_run() -> None:
    """The 44 records name the vessel and the start that the bench data give their run."""
    logs = rows(DEMO / "loggers.csv")
    assert len(logs) == 44
    for row in logs:
        record = read_logger(DEMO / "loggers" / row["file"])
        assert len(record.time) == 39 and record.firing_time == 5.0
        book = BOOKS[row["workbook"]]
        values = {k: v for path in data_files(row["workbook"]) for k, v in read_data(path).values.items()}
        day, start = (values[f"{row['run']}.{name}"].value for name in ("date", "start"))
        assert record.start == datetime.fromisoformat(f"{day}T{start}"), row
        vessel = values.get(f"{row['run']}.vessel")
        assert record.vessel == (vessel.value if vessel else book["vessel"]), row
        assert record.calorimeter == book["calorimeter"]


def test_analysis_and_balance_files() -> None:
    """Late values and the balance's own record read whole."""
    values = read_analysis(DEMO / "analysis.csv")
    assert len(values) == 127
    assert {one.quantity for one in values if one.mark == "<"} == {"sulfur", "chlorine"}
    weighings = read_instrument_log(DEMO / "balance.csv")
    assert len(weighings) == 34
    runs = {one["run"] for one in rows(EXPECTED / "places.csv")}
    assert {one.run for one in weighings} <= runs


def test_the_corrected_lab_file_changes_one_certificate() -> None:
    """Friday's correction restates BA-31 and touches nothing else."""
    before, after = read_lab(DEMO / "lab.toml"), read_lab(DEMO / "lab-corrected.toml")
    assert [(a.lot, a.value, b.value) for a, b in zip(before.certified, after.certified, strict=True)] == [
        ("BA-31", 26436.0, 26429.0),
        ("BA-32", 26457.0, 26457.0),
    ]
    assert before.calibrations == after.calibrations
    assert before.all_lots == after.all_lots
    assert before.faults() == after.faults() == ()


def test_slips_name_fields_of_the_week() -> None:
    """Each of the 25 slips is a field of a workbook or a key of a file, with right and typed value."""
    slips = rows(DEMO / "slips.csv")
    assert len({one["slip"] for one in slips}) == 25
    for one in slips:
        assert one["workbook"] in BOOKS or (DEMO / one["workbook"]).exists(), one
        assert one["right"] != one["typed"], one


def test_the_right_value_of_a_slip_is_what_the_data_hold() -> None:
    """Where a slip changes a bench reading, the data file holds the right value."""
    compared = 0
    for one in rows(DEMO / "slips.csv"):
        if one["workbook"] not in BOOKS:
            continue
        values = {k: v for path in data_files(one["workbook"]) for k, v in read_data(path).values.items()}
        if one["field"] in values and one["slip"] not in ("F8",):
            assert values[one["field"]].value == one["right"], one
            compared += 1
    assert compared >= 15


def test_measured_fuels_for_the_archive() -> None:
    """At least 200 real fuels with composition, gross value and source."""
    fuels = rows(DEMO / "fuels.csv")
    assert len(fuels) >= 200
    for one in fuels:
        assert one["source"] and 12000 < float(one["gross_dry"]) < 36000
        total = sum(float(one[name]) for name in ("C", "H", "O", "N", "S", "ash"))
        assert total == pytest.approx(100, abs=1.5)


def test_the_demo_week_refuses_an_unknown_class() -> None:
    """The lab file has eight classes and no others."""
    with pytest.raises(BadInput, match="no fuel class 'peat'"):
        read_lab(DEMO / "lab.toml").fuel_class("peat")
