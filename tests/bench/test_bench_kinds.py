"""Calibration, specific heat, vaporisation, heat balance filled by the bench: the truth comes back, no rule holds."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path
from typing import Any

import pytest
from bench_case import Filled, filled, issue

from sheetcal.bench import cases_of, fill, mixing, steam
from sheetcal.model import IssueRecord

KINDS = ("calibration", "specific-heat", "vaporisation", "heat-balance")
NOTES = {"condition-extrapolated", "heat-capacity-slope", "heat-capacity-outlier", "specific-heat-outlier"}


def workbook(kind: str, folder: Path, calorimeter: str = "CAL-A", **order: Any) -> IssueRecord:
    """A workbook of a kind as the laboratory issues it."""
    return issue(kind, folder, calorimeter=calorimeter, **order)


def faults(sheet: Filled) -> list[str]:
    """Rules that hold, without the notes a right sheet may show by chance."""
    return [one for one in sheet.broken() if one.split()[0] not in NOTES]


@pytest.mark.parametrize("calorimeter", ["CAL-A", "CAL-B"])
def test_a_calibration_gives_the_true_heat_capacity(calorimeter: str, tmp_path: Path) -> None:
    """Ten calibrations a calorimeter: mean within 0.07 % of the value in force, scatter below 0.08 %, no rule holds."""
    record = workbook("calibration", tmp_path, calorimeter)
    for seed in range(10):
        sheet = filled(record, fill(record, seed))
        assert (sheet["sheet.stage"], sheet["sheet.counted_runs"]) == ("complete", 5)
        assert abs(sheet["sheet.change"]) < 0.07 and sheet["sheet.relative_deviation"] < 0.08
        assert faults(sheet) == [] and sheet.outside() == []


def test_a_calibration_keeps_to_one_vessel_and_maps_the_rise(tmp_path: Path) -> None:
    """The log names one vessel in every run, and the pellets spread the rise by a fifth."""
    record = workbook("calibration", tmp_path)
    sheet = filled(record, fill(record, 1))
    vessels = {sheet.readings[f"run{run}.record_vessel"] for run in range(1, 6)}
    assert vessels == {sheet["sheet.vessel"]}
    assert sheet["sheet.rise_high"] > 1.2 * sheet["sheet.rise_low"]


def test_a_method_that_wants_more_days_gets_them(tmp_path: Path) -> None:
    """Three days, as ASTM D240 asks: six runs, two a day."""
    issued = workbook("calibration", tmp_path, runs=6)
    three = [replace(one, value=3.0) if one.name == "calibration_days" else one for one in issued.constants]
    record = replace(issued, constants=tuple(three))
    sheet = filled(record, fill(record, 1))
    days = {sheet.readings[f"run{run}.date"] for run in range(1, 7)}
    assert len(days) == 3 and faults(sheet) == []


def test_specific_heats_come_back(tmp_path: Path) -> None:
    """Twenty workbooks: within 0.6 % of the invented metal's mean from 24 to 99 degC (the transfer loses 0.1 %)."""
    record = workbook("specific-heat", tmp_path)
    seen = set()
    for seed in range(20):
        sheet = filled(record, fill(record, seed))
        metal = next(one for one in mixing.METALS if one.name == sheet["sheet.material"])
        low = sheet["run1.final_temperature"]
        expected = metal.heat(low, 98.9) / (98.9 - low)
        assert sheet["sheet.specific_heat"] == pytest.approx(expected, rel=0.006)
        assert faults(sheet) == [] and sheet.outside() == []
        seen.add((metal.name, sheet["run1.temperature_source"]))
    assert len(seen) >= 6


def test_two_powers_give_the_enthalpy_of_water(tmp_path: Path) -> None:
    """Twenty workbooks: loss taken out, within 0.4 % of 2258 J/g; single powers read 3 to 6 % high; on the line."""
    record = workbook("vaporisation", tmp_path)
    forms = set()
    for seed in range(20):
        sheet = filled(record, fill(record, seed))
        true = steam.vaporisation(sheet["sheet.boiling_temperature"])
        assert sheet["sheet.enthalpy"] == pytest.approx(true, rel=0.004)
        assert 1.03 < sheet["sheet.enthalpy_single"] / true < 1.06
        assert abs(sheet["sheet.off_the_line"]) < 0.15
        assert faults(sheet) == [] and sheet.outside() == []
        forms.add(sheet["sheet.work_form"])
    assert len(forms) == 3


@pytest.mark.parametrize("bodies", [2, 4, 8])
def test_a_heat_balance_closes(bodies: int, tmp_path: Path) -> None:
    """Ten workbooks of a size: closes within 1 %, or the iron's specific heat comes out at 0.450 within 2 %."""
    record = workbook("heat-balance", tmp_path, bodies=bodies)
    for seed in range(10):
        sheet = filled(record, fill(record, seed))
        assert sheet["sheet.stage"] == "complete"
        if sheet["sheet.unknown"] == "none":
            assert abs(sheet["sheet.closure"]) < 1.0
        else:
            assert sheet["body2.solved_specific_heat"] == pytest.approx(0.450, rel=0.02)
        assert faults(sheet) == [] and sheet.outside() == []


@pytest.mark.parametrize("kind", KINDS)
def test_honest_cases_of_the_other_kinds_break_no_rule(kind: str, tmp_path: Path) -> None:
    """Every case a kind can show: no rule holds, and every reading has its place."""
    record = workbook(kind, tmp_path)
    cases = cases_of(kind)
    assert len(cases) == (12 if kind == "calibration" else 4)
    for case in cases:
        sheet = filled(record, fill(record, 4, case))
        assert (faults(sheet), sheet.outside()) == ([], []), case


def test_void_calibration_runs_are_kept_and_do_not_count(tmp_path: Path) -> None:
    """Soot and misfire: six runs, the first void with its reason, five counted; a misfire rises by nothing."""
    record = workbook("calibration", tmp_path)
    for case, reason in (("void run kept", "soot"), ("misfire kept", "misfire")):
        sheet = filled(record, fill(record, 2, case))
        assert (sheet["run1.state"], sheet["run1.void_reason"]) == ("void", reason)
        assert sheet["sheet.counted_runs"] == 5 and sheet["run6.state"] == "valid"
    assert abs(sheet["run1.corrected_rise"]) < 0.002
