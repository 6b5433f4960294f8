"""The invented week comes out as a second, independent calculation says: every firing and every sample.

Tolerances: 0.5 J/g of the fuel burnt and 0.1 mK. The expected figures are those of tests/demo_expected.
"""

import csv
from datetime import date, datetime
from functools import cache
from pathlib import Path
from typing import Any

import pytest

from sheetcal.formulas.compute import compute
from sheetcal.inputs import Lab, block_text, read_analysis, read_data, read_lab, read_logger, read_worklist
from sheetcal.inputs.lab_reader import parse_lab
from sheetcal.inputs.text import TextFile
from sheetcal.kinds import load, skeleton
from sheetcal.verbs.filling import Filling
from sheetcal.verbs.issuing import Order, build

ROOT = Path(__file__).parents[2]
DEMO = ROOT / "workbooks" / "demo"
EXPECTED = ROOT / "tests" / "demo_expected"


def rows(path: Path) -> list[dict[str, str]]:
    lines = [line for line in path.read_text("utf-8").splitlines() if not line.startswith("#")]
    return list(csv.DictReader(lines))


BOOKS = {row["workbook"]: row for row in rows(DEMO / "workbooks.csv")}
FUEL = [name for name, row in BOOKS.items() if row["kind"] == "fuel"]
RUNS = {row["run"]: row for row in rows(EXPECTED / "expected_runs.csv")}
SAMPLES = {row["sample"]: row for row in rows(EXPECTED / "expected_samples.csv")}
PLACES = [row for row in rows(EXPECTED / "places.csv") if row["workbook"] in FUEL]
CALIBRATION = [row for row in rows(EXPECTED / "places.csv") if row["workbook"] not in FUEL]

# Thursday's calibration of CAL-B, as the laboratory head adopts it.
ADOPTED = {
    "vessel": "B1",
    "issue": "W7",
    "value": "8803.8 J/K",
    "n": 6,
    "certificate": "BA-32",
    "rise": ["2.86 K", "2.90 K"],
    "valid_from": datetime(2025, 3, 6, 11),
    "valid_until": date(2025, 9, 6),
}

HEATS = {
    "Q_fuse_J": ("wire_heat", "thread_heat"),
    "Q_ign_J": ("ignition_heat",),
    "Q_N_J": ("nitric_heat",),
    "Q_S_J": ("sulfuric_heat",),
    "Q_aid_J": ("aid1_heat", "aid2_heat"),
}
VALUES = {
    "gross_V_as_analysed": "gross_analysed",
    "gross_V_dry": "gross_dry",
    "gross_V_daf": "gross_daf",
    "net_p_dry": "net_p_dry",
    "gross_V_as_received": "gross_as_received",
    "net_p_as_received": "net_p_as_received",
    "net_V_as_received": "net_v_as_received",
}


@cache
def lab(book: str) -> Lab:
    """The lab file as it stood when the workbook was issued."""
    monday = read_lab(DEMO / "lab.toml")
    if book != "W11":
        return monday
    text = monday.source.text + block_text("calibration", ADOPTED)
    return parse_lab(TextFile(monday.source.path, monday.sha256, text))


@cache
def results(book: str) -> dict[str, Any]:
    """Every result and reading of a workbook, by id."""
    row = BOOKS[book]
    order = Order(
        kind=row["kind"],
        lab=lab(book),
        worklist=read_worklist(DEMO / row["worklist"]) if row["worklist"] else None,
        calorimeter=row["calorimeter"] or None,
        profile=row["profile"],
        spare=int(row["spare"]),
        moment=datetime.fromisoformat(row["issued"]),
    )
    record = build(order)
    plan = skeleton(load(row["kind"]), record.shape)
    filling = Filling(plan, record, {})
    for one in row["data"].split():
        filling.data(read_data(DEMO / one))
    for log in rows(DEMO / "loggers.csv"):
        if log["workbook"] == book:
            filling.log(log["run"], read_logger(DEMO / "loggers" / log["file"]))
    if row["kind"] == "fuel":
        filling.analysis(read_analysis(DEMO / "analysis.csv"))
    readings = filling.finish()
    return {**record.prefilled, **readings, **compute(plan, record, readings)}


def test_the_week_is_whole() -> None:
    """56 firings of the week less the 7 of the calibration, 14 samples and controls."""
    assert (len(PLACES), len(SAMPLES), len(FUEL)) == (49, 14, 12)


@pytest.mark.parametrize("place", PLACES, ids=lambda one: one["run"])
def test_every_firing(place: dict[str, str]) -> None:
    """Rise, exchange and cooling constant, every heat and the gross value of one firing."""
    found, expected, run = results(place["workbook"]), RUNS[place["run"]], place["place"]
    mass = found[f"{run}.mass"]
    assert found[f"{run}.corrected_rise"] == pytest.approx(float(expected["theta_K"]), abs=1e-4)
    if expected["d_ex_K"]:
        assert found[f"{run}.exchange_correction"] == pytest.approx(float(expected["d_ex_K"]), abs=1e-4)
        assert found[f"{run}.cooling_constant"] == pytest.approx(float(expected["G_per_min"]), abs=1e-5)
    for column, names in HEATS.items():
        heat = sum(found[f"{run}.{name}"] or 0.0 for name in names)
        assert heat / mass == pytest.approx(float(expected[column]) / mass, abs=0.5), column
    assert found[f"{run}.gross_run"] == pytest.approx(float(expected["gross_as_analysed_J_g"]), abs=0.5)
    assert found[f"{run}.vessel_rated_energy"] == float(expected["rated_kJ"])
    charge = found[f"{run}.heat_capacity_used"] * found[f"{run}.corrected_rise"] / 1000
    # The expected column takes the heat capacity behind the data: 0.12 % off at most, two decimals.
    assert charge == pytest.approx(float(expected["charge_kJ"]), rel=0.0015)


def sample_of(name: str) -> list[tuple[dict[str, Any], str]]:
    """(results, sampleN) of every workbook that holds the sample."""
    found = []
    for book in FUEL:
        values = results(book)
        found += [
            (values, one.partition(".")[0]) for one in values if values[one] == name and one.endswith(".sample_id")
        ]
    return found


@pytest.mark.parametrize("name", [one for one in SAMPLES if one != "S-2514"])
def test_every_sample(name: str) -> None:
    """Gross and net values on every basis, the number of runs and the composition estimate of one sample."""
    expected = SAMPLES[name]
    ((found, sample),) = sample_of(name)
    assert found[f"{sample}.counted_runs"] == int(expected["n"])
    compared = 0
    for column, field in VALUES.items():
        if expected[column]:
            assert found[f"{sample}.{field}"] == pytest.approx(float(expected[column]), abs=0.5), column
            compared += 1
    assert compared == (4 if name == "IHC-3" else 7)
    if expected["reported_net_p_ar_MJ_kg"]:
        reported = found[f"{sample}.net_p_as_received_reported_mj"]
        assert reported == pytest.approx(float(expected["reported_net_p_ar_MJ_kg"]), abs=1e-9)
    # The expected column is the estimate against the value found.
    off = 100 * (found[f"{sample}.composition_estimate"] / found[f"{sample}.gross_dry"] - 1)
    assert off == pytest.approx(float(expected["composition_deviation_pct"]), abs=0.051)


def test_the_charcoal_stands_in_two_workbooks() -> None:
    """S-2514: two runs on the old heat capacity, two on the new, each workbook its own mean."""
    both = sample_of("S-2514")
    assert len(both) == 2
    means = [found[f"{sample}.gross_dry"] for found, sample in both]
    assert means == pytest.approx([31601.2, 31579.1], abs=0.5)
    assert [found[f"{sample}.counted_runs"] for found, sample in both] == [2, 2]


@pytest.mark.parametrize("name", [one for one in SAMPLES if one != "S-2514"])
def test_the_range_of_the_runs(name: str) -> None:
    """The range as analysed of the runs that count is the one expected."""
    ((found, _),) = sample_of(name)
    mine = {row["place"] for row in PLACES if row["run"] in SAMPLES[name]["runs"].split()}
    counted = [found[f"{place}.gross_counted"] for place in mine]
    assert len(counted) == int(SAMPLES[name]["n"])
    assert max(counted) - min(counted) == pytest.approx(float(SAMPLES[name]["range_J_g"]), abs=1.0)


@pytest.mark.parametrize("place", CALIBRATION, ids=lambda one: one["run"])
def test_every_calibration_firing(place: dict[str, str]) -> None:
    """Rise and every heat of one calibration firing; the heat capacity reads the pellet's certified heat back."""
    found, expected, run = results(place["workbook"]), RUNS[place["run"]], place["place"]
    assert found[f"{run}.corrected_rise"] == pytest.approx(float(expected["theta_K"]), abs=1e-4)
    for column in ("Q_fuse_J", "Q_ign_J", "Q_N_J"):
        heat = sum(found[f"{run}.{name}"] or 0.0 for name in HEATS[column])
        assert heat == pytest.approx(float(expected[column]), abs=0.051), column
    assert (found[f"{run}.heat_capacity_counted"] is None) == (expected["state"] == "void")


@pytest.mark.parametrize(
    ("book", "n", "mean", "scatter"),
    [("C1", 5, 10138.7, 0.04), ("C2", 5, 10175.4, 0.05), ("C3", 5, 8814.7, 0.05), ("W7", 6, 8803.8, 0.05)],
)
def test_the_four_calibrations(book: str, n: int, mean: float, scatter: float) -> None:
    """Mean and relative standard deviation as the week's account prints them, half a last digit either way."""
    found = results(book)
    assert len(CALIBRATION) == 22
    assert found["sheet.counted_runs"] == n
    assert found["sheet.effective_heat_capacity"] == pytest.approx(mean, abs=0.05)
    assert found["sheet.relative_deviation"] == pytest.approx(scatter, abs=0.005)


def test_the_change_of_the_last_calibration() -> None:
    """CAL-B has drifted by -0.12 % against the value in force."""
    assert results("W7")["sheet.change"] == pytest.approx(-0.12, abs=0.005)


def test_the_specific_heat() -> None:
    """Four drops, the third void because hot water was carried over."""
    found = results("SH1")
    runs = [found[f"run{n}.specific_heat"] for n in range(1, 5)]
    assert runs == pytest.approx([0.3883, 0.3886, 0.3962, 0.3873], abs=5e-5)
    assert found["sheet.counted_runs"] == 3
    assert found["run3.mass_sum_error"] == pytest.approx(0.19, abs=1e-6)


def test_the_vaporisation() -> None:
    """Single powers read high, two powers cancel the loss; volume work by measured volumes and ideal gas."""
    found = results("VP1")
    singles = [found[f"run{n}.enthalpy_single"] for n in (1, 2)]
    assert singles == pytest.approx([2370.4, 2328.6], abs=0.05)
    assert found["sheet.enthalpy"] == pytest.approx(2256.9, abs=0.05)
    assert found["sheet.loss"] == pytest.approx(5.7, abs=0.05)
    assert (found["sheet.work_measured"], found["sheet.work_ideal"]) == pytest.approx((169.1, 171.8), abs=0.05)
    assert found["sheet.ideal_deviation"] == pytest.approx(-0.13, abs=0.005)


def test_the_heat_balance() -> None:
    """Water, cup, iron, ice and heater close to -1.4 %."""
    found = results("HB1")
    gains = [found[f"body{n}.gained"] for n in range(1, 5)]
    assert gains == pytest.approx([6505.7, 218.2, -29181.0, 27384.0], abs=0.06)
    assert found["sheet.heat_given"] == pytest.approx(5400.0)
    assert found["sheet.closure"] == pytest.approx(-1.4, abs=0.05)
    assert found["sheet.final_temperature"] == pytest.approx(26.55, abs=0.005)
