"""The invented week's calibrations, drops, boil-off and heat balance come out as stated, with what they must say."""

from __future__ import annotations

import csv
from datetime import datetime
from functools import cache
from pathlib import Path
from typing import Any

import pytest

from sheetcal.formulas.compute import Engine, compute
from sheetcal.inputs import read_data, read_lab, read_logger
from sheetcal.kinds import load, skeleton
from sheetcal.kinds.layout import Skeleton
from sheetcal.model import IssueRecord
from sheetcal.verbs.filling import Filling
from sheetcal.verbs.issuing import Order, build

DEMO = Path(__file__).parents[2] / "workbooks" / "demo"


def rows(path: Path) -> list[dict[str, str]]:
    lines = [line for line in path.read_text("utf-8").splitlines() if not line.startswith("#")]
    return list(csv.DictReader(lines))


BOOKS = {row["workbook"]: row for row in rows(DEMO / "workbooks.csv")}


@cache
def filled(book: str) -> tuple[Skeleton, IssueRecord, dict[str, Any]]:
    row = BOOKS[book]
    order = Order(
        kind=row["kind"],
        lab=read_lab(DEMO / "lab.toml"),
        calorimeter=row["calorimeter"] or None,
        profile=row["profile"],
        runs=int(row["runs"]) if row["runs"] else None,
        spare=int(row["spare"]),
        bodies=4 if row["kind"] == "heat-balance" else None,
        moment=datetime.fromisoformat(row["issued"]),
    )
    record = build(order)
    plan = skeleton(load(row["kind"]), record.shape)
    filling = Filling(plan, record, {})
    filling.data(read_data(DEMO / row["data"]))
    for log in rows(DEMO / "loggers.csv"):
        if log["workbook"] == book:
            filling.log(log["run"], read_logger(DEMO / "loggers" / log["file"]))
    return plan, record, dict(filling.finish())


def results(book: str, **changed: Any) -> dict[str, Any]:
    """Every result of a workbook; `changed`: readings by id, the dot written as two underscores."""
    plan, record, readings = filled(book)
    return dict(compute(plan, record, {**readings, **_by_id(changed)}))


def said(book: str, **changed: Any) -> set[tuple[str, str]]:
    """(code, block) of every rule that holds."""
    plan, record, readings = filled(book)
    engine = Engine(plan, record, {**readings, **_by_id(changed)})
    places = {(one.field.scope, one.id.partition(".")[0]): one for one in plan.places.values()}
    return {
        (rule.code, block)
        for rule in plan.kind.rules
        for (scope, block), place in places.items()
        if scope == rule.scope and engine.holds(place, rule)
    }


def _by_id(changed: dict[str, Any]) -> dict[str, Any]:
    return {key.replace("__", "."): value for key, value in changed.items()}


@pytest.mark.parametrize(
    ("book", "value", "runs", "relative"),
    [("C1", 10138.7, 5, 0.04), ("C2", 10175.4, 5, 0.05), ("C3", 8814.7, 5, 0.05), ("W7", 8803.8, 6, 0.05)],
)
def test_the_four_calibrations_come_out(book: str, value: float, runs: int, relative: float) -> None:
    """Mean, number of runs and relative deviation of a calibration; a right one says nothing."""
    found = results(book)
    assert found["sheet.effective_heat_capacity"] == pytest.approx(value, abs=0.05)
    assert found["sheet.effective_heat_capacity_reported"] == pytest.approx(value, abs=1e-9)
    assert found["sheet.counted_runs"] == runs
    assert found["sheet.relative_deviation"] == pytest.approx(relative, abs=0.005)
    assert found["sheet.stage"] == "complete"
    assert found["sheet.next_step"] == "enough runs: adopt the mean"
    assert said(book) == set()


def test_the_change_against_the_value_in_force() -> None:
    """W7 is 0.12 % below the value in force and keeps the range of the mapping calibration before it."""
    found = results("W7")
    assert found["sheet.change"] == pytest.approx(-0.12, abs=0.005)
    assert (found["sheet.rise_low_covered"], found["sheet.rise_high_covered"]) == (1.83, 3.32)
    mapping = results("W7", sheet__mass_plan="mapping")
    assert mapping["sheet.rise_low_covered"] == pytest.approx(2.8555, abs=1e-4)


def test_a_calibration_covers_the_energies_it_burnt() -> None:
    """The vessel A1 is covered from 16.0 to 31.9 kJ and from 1.58 to 3.15 K."""
    found = results("C1")
    assert found["sheet.energy_low_covered"] == pytest.approx(16.0, abs=0.05)
    assert found["sheet.energy_high_covered"] == pytest.approx(31.9, abs=0.05)
    assert found["sheet.rise_low_covered"] == pytest.approx(1.58, abs=0.005)
    assert found["sheet.rise_high_covered"] == pytest.approx(3.15, abs=0.005)


def test_the_run_that_makes_the_scatter_is_named() -> None:
    """The crumbs of run 4 counted: 0.75 %, above the limit, and Grubbs names that run and no other."""
    assert results("W7", run4__state="valid")["sheet.relative_deviation"] == pytest.approx(0.75, abs=0.005)
    assert said("W7", run4__state="valid", run4__inspection="clean", run4__void_reason=None) == {
        ("relative-deviation", "sheet"),
        ("heat-capacity-outlier", "run4"),
    }


@pytest.mark.parametrize(
    ("changed", "expected"),
    [
        ({"run3__oxygen_pressure": 3.36}, ("oxygen-pressure", "run3")),
        ({"run1__pellet_mass": 1.30, "run1__crucible_gross": None}, ("charge-energy", "run1")),
        ({"run1__pellet_mass": 0.70, "run1__crucible_gross": None}, ("pellet-mass", "run1")),
        ({"run2__vessel_water": 2.0}, ("vessel-water", "run2")),
        ({"run2__date": "2025-04-01"}, ("vessel-out-of-service", "run2")),
        ({"run2__date": "2027-03-01"}, ("certificate-expired", "run2")),
        ({"run7__state": "void", "run7__void_reason": "leak", "run6__state": "not needed"}, ("one-more-run", "sheet")),
        ({"run1__titrant_lot": "NT-13"}, ("titrant-expired", "run1")),
        ({"run3__burette_start": 0.0, "run3__burette_end": 26.55}, ("titre-unusual", "run3")),
        ({"run3__burette_start": 16.55, "run3__burette_end": 10.0}, ("burette-order", "run3")),
    ],
)
def test_a_calibration_says_what_is_wrong(changed: dict[str, Any], expected: tuple[str, str]) -> None:
    """Safety limits, masses, water, dates and duties of a calibration, each by its code at its place."""
    assert expected in said("W7", **changed)


def test_a_certificate_in_the_wrong_convention_is_betrayed_by_its_band() -> None:
    """26 457 J/g taken as a value in vacuum passes every limit but the band of benzoic acid."""
    plan, record, readings = filled("W7")
    wrong = [{**row, "convention": "in vacuum"} if row["lot"] == "BA-32" else row for row in record.tables["certified"]]
    slipped = Engine(plan, _with_tables(record, tuple(wrong)), readings)
    rule = next(one for one in plan.kind.rules if one.code == "certificate-band")
    assert slipped.value("sheet.effective_heat_capacity") == pytest.approx(8810.5, abs=0.05)
    assert slipped.holds(plan.places["sheet.certificate_value"], rule)


def _with_tables(record: IssueRecord, certified: tuple[Any, ...]) -> IssueRecord:
    from sheetcal.kinds.record import with_values

    return with_values(record, tables={**record.tables, "certified": certified})


@pytest.mark.parametrize(("book", "shift"), [("C1", 0.2), ("C2", 0.2), ("C3", 0.7), ("W7", 0.8)])
def test_the_certificate_conditions_where_they_are_applied(book: str, shift: float) -> None:
    """With the condition factor the calibrations read 0.2, 0.2, 0.7 and 0.8 J/K more."""
    plan, record, readings = filled(book)
    engine = Engine(plan, record, readings)
    engine.known["const.condition_factor"] = 1.0
    plain = results(book)["sheet.effective_heat_capacity"]
    assert engine.value("sheet.effective_heat_capacity") - plain == pytest.approx(shift, abs=0.06)


def test_specific_heat_of_the_plug() -> None:
    """Four drops: 0.3883, 0.3886, 0.3962 and 0.3873; the third carried 0.19 g of hot water and is void."""
    found = results("SH1")
    values = [found[f"run{run}.specific_heat"] for run in range(1, 5)]
    assert values == pytest.approx([0.3883, 0.3886, 0.3962, 0.3873], abs=0.00005)
    assert found["sheet.counted_runs"] == 3
    assert found["sheet.specific_heat"] == pytest.approx(0.3881, abs=0.0001)
    assert found["sheet.sample_temperature"] == pytest.approx(62.0, abs=0.1)
    assert 0.8 < 100 * found["sheet.expanded_uncertainty"] / found["sheet.specific_heat"] < 1.2
    assert found["run3.mass_sum_error"] == pytest.approx(0.19, abs=0.001)
    assert said("SH1") == {("mass-balance", "run3")}


@pytest.mark.parametrize(
    ("changed", "expected"),
    [
        ({"run1__sample_start_temperature": 210.0}, ("sample-too-hot", "run1")),
        ({"run1__transfer_time": 8.0}, ("transfer-slow", "run1")),
        ({"run1__time_in_heater": 5.0}, ("time-in-heater", "run1")),
        ({"run1__sample_start_temperature": 40.0}, ("temperature-span", "run1")),
        ({"run1__final_temperature_typed": 21.0}, ("rise-small", "run1")),
        ({"sheet__direction": "cold sample"}, ("direction-unlike", "run1")),
        ({"run1__role": "check body", "sheet__check_specific_heat": 0.377}, ("check-body-warning", "run1")),
        ({"run1__role": "check body", "sheet__check_specific_heat": 0.370}, ("check-body", "run1")),
        ({"run4__state": "void", "run4__void_reason": "spatter"}, ("one-more-run", "sheet")),
    ],
)
def test_a_drop_says_what_is_wrong(changed: dict[str, Any], expected: tuple[str, str]) -> None:
    """Hot samples, slow transfers, small rises and the check body, each by its code at its place."""
    assert expected in said("SH1", **changed)


def test_the_cup_from_a_blank_run() -> None:
    """Hot water into cold gives the cup back: 61.5 J/K from a blank run computed with it."""
    cold, hot = 20.0, 60.0
    water, poured, cup = 150.0, 50.0, 61.5
    plan, record, readings = filled("SH1")
    final = 20.0
    for _ in range(80):  # the end temperature at which the cup's share closes, by substitution
        trial = Engine(plan, record, {**readings, **_blank(cold, hot, water, poured, final)})
        c_cold, c_hot = trial.value("run1.water_specific_heat"), trial.value("run1.hot_water_specific_heat")
        final = (poured * c_hot * hot + (water * c_cold + cup) * cold) / (poured * c_hot + water * c_cold + cup)
    engine = Engine(plan, record, {**readings, **_blank(cold, hot, water, poured, final)})
    assert engine.value("run1.cup_run") == pytest.approx(61.5, abs=1e-6)
    assert engine.value("sheet.cup_heat_capacity") == pytest.approx(61.5, abs=1e-6)
    assert engine.value("sheet.counted_runs") == 2


def _blank(cold: float, hot: float, water: float, poured: float, final: float) -> dict[str, Any]:
    return {
        "sheet.cup_source": "blank runs",
        "run1.role": "blank",
        "run1.cup_empty": 180.0,
        "run1.cup_with_water": 180.0 + water,
        "run1.sample_mass": poured,
        "run1.sample_start_temperature": hot,
        "run1.start_temperature_typed": cold,
        "run1.final_temperature_typed": final,
    }


@pytest.mark.parametrize("step", [5.0, -5.0])
def test_the_temperatures_from_a_record(step: float) -> None:
    """A step of 5 K up or down on steady drifts is read back to 2 mK, at the moment of 63 % of it."""
    from math import exp

    times = [0.25 * one for one in range(61)]
    drift, tau = 0.01, 0.4
    record_temperature = [20.0 + drift * t + (step * (1 - exp(-(t - 5.0) / tau)) if t > 5.0 else 0.0) for t in times]
    changed = {
        "run1__temperature_source": "record",
        "run1__record_time": times,
        "run1__record_temperature": record_temperature,
        "run1__drop_time": 5.0,
        "run1__end_of_mixing": 9.0,
    }
    found = results("SH1", **changed)
    moment = 5.0 + tau
    assert found["run1.step_time"] == pytest.approx(moment, abs=0.05)
    assert found["run1.start_temperature"] == pytest.approx(20.0 + drift * moment, abs=0.002)
    assert found["run1.final_temperature"] == pytest.approx(20.0 + drift * moment + step, abs=0.002)
    assert found["run1.rise"] == pytest.approx(step, abs=0.0005)


def test_vaporisation_of_water_by_two_powers() -> None:
    """Single powers 2370.4 and 2328.6, both together 2256.9 J/g, 5.7 W lost, 169.1 J/g of work, 171.8 ideal."""
    found = results("VP1")
    assert found["run1.enthalpy_single"] == pytest.approx(2370.4, abs=0.05)
    assert found["run2.enthalpy_single"] == pytest.approx(2328.6, abs=0.05)
    assert found["sheet.enthalpy"] == pytest.approx(2256.9, abs=0.05)
    assert found["sheet.loss"] == pytest.approx(5.7, abs=0.05)
    assert found["sheet.work"] == pytest.approx(169.1, abs=0.05)
    assert found["sheet.work_ideal"] == pytest.approx(171.8, abs=0.05)
    assert said("VP1") == set()


def test_vaporisation_with_the_table_value() -> None:
    """2258.6 J/g of the table less 169.1 is 2089.5 J/g; the ideal gas is off by -0.13 %."""
    found = results("VP1", sheet__enthalpy_source="table", sheet__enthalpy_table=2258.6)
    assert found["sheet.energy"] == pytest.approx(2089.5, abs=0.05)
    assert found["sheet.ideal_deviation"] == pytest.approx(-0.13, abs=0.005)


def test_the_forms_of_the_work_agree_for_water() -> None:
    """Second virial coefficient and measured volume give the work of water alike to 0.2 J/g."""
    virial = results("VP1", sheet__work_form="second virial", sheet__virial=-452.0)
    assert virial["sheet.work"] == pytest.approx(results("VP1")["sheet.work"], abs=0.2)


@pytest.mark.parametrize(
    ("changed", "expected"),
    [
        ({"sheet__station_pressure": 101.3, "sheet__boiling_temperature": 99.2}, ("pressure-line", "sheet")),
        ({"run2__state": "void", "run2__void_reason": "leak"}, ("single-power", "sheet")),
        ({"run2__voltage": 50.0}, ("power-ratio", "sheet")),
        ({"sheet__virial": 20.0}, ("virial-sign", "sheet")),
        ({"sheet__flammable": "yes", "sheet__heater": "open"}, ("flammable-open-heater", "sheet")),
        ({"sheet__vented": "no"}, ("vessel-not-vented", "sheet")),
        ({"run1__condensate_mass": 8.0}, ("condensate-small", "run1")),
    ],
)
def test_a_boil_off_says_what_is_wrong(changed: dict[str, Any], expected: tuple[str, str]) -> None:
    """Pressure at sea level, one power, powers alike, signs and stops, each by its code at its place."""
    assert expected in said("VP1", **changed)


def test_the_enthalpy_from_a_vapour_pressure_line() -> None:
    """Two saturation points of water (IAPWS-95): its enthalpy, 1.5 % high for the ideal gas, and its boiling point."""
    line = {
        "sheet__enthalpy_source": "vapour-pressure line",
        "sheet__line_temperature1": 95.0,
        "sheet__line_pressure1": 84.61,
        "sheet__line_temperature2": 100.0,
        "sheet__line_pressure2": 101.42,
    }
    found = results("VP1", **line)
    assert found["sheet.enthalpy"] == pytest.approx(2263.0 / 0.985, rel=0.002)
    assert found["sheet.saturation_from_line"] == pytest.approx(99.16, abs=0.03)


def test_the_heat_balance_closes_to_its_own_figure() -> None:
    """Gains 6505.7, 218.2, -29 181.0, 27 384.0 J, heater 5400.0 J: closes to -1.4 %, exact end 26.55 degC."""
    found = results("HB1")
    gains = [found[f"body{body}.gained"] for body in range(1, 5)]
    assert gains == pytest.approx([6505.7, 218.2, -29181.0, 27384.0], abs=0.06)
    assert found["sheet.heater_heat"] == pytest.approx(5400.0, abs=1e-9)
    assert found["sheet.closure"] == pytest.approx(-1.4, abs=0.05)
    assert found["sheet.final_temperature"] == pytest.approx(26.55, abs=0.006)
    assert said("HB1") == set()


@pytest.mark.parametrize(
    ("unknown", "body", "reading", "result", "value"),
    [
        ("mass", 4, "mass", "solved_mass", 60.0),
        ("specific heat", 3, "specific_heat", "solved_specific_heat", 0.4495),
        ("start temperature", 3, "start", "solved_start", 184.0),
        ("start temperature", 4, "start", "solved_start", -6.0),
        ("end temperature", 1, "end", "solved_end", 26.5451),
        ("end temperature", 4, "end", "solved_end", 26.5451),
        ("latent heat", 4, "latent_heat", "solved_latent_heat", 333.5),
    ],
)
def test_an_unknown_is_found_from_the_balance(unknown: str, body: int, reading: str, result: str, value: float) -> None:
    """A reading taken out of a balance that closes exactly is found again."""
    end = 26.43 + 473.06188 / 4110.404  # where the demo's balance closes
    changed: dict[str, Any] = {f"body{one}__end": end for one in range(1, 5)}
    changed |= {"sheet__unknown": unknown, f"body{body}__unknown_here": "yes", f"body{body}__{reading}": None}
    changed["sheet__temperature_uncertainty"] = 0.01
    found = results("HB1", **changed)
    assert found[f"body{body}.{result}"] == pytest.approx(value, rel=1e-5)
    assert found["sheet.closure"] is None
    assert found[f"body{body}.{result}_uncertainty"] > 0
    assert found["sheet.stage"] == "complete"


def test_the_heater_is_found_from_the_balance() -> None:
    """The heater left out: the bodies' gains are what it must have given."""
    changed = {"sheet__unknown": "heater", "sheet__heater_voltage": None}
    found = results("HB1", **changed, sheet__heater_current=None, sheet__heater_time=None)
    assert found["sheet.solved_heater"] == pytest.approx(4926.94, abs=0.01)
    assert found["sheet.closure"] is None


@pytest.mark.parametrize(
    ("changed", "expected"),
    [
        ({"body4__change": "none"}, ("phase-change", "body4")),
        ({"body4__amount_changed": 70.0}, ("amount-changed", "body4")),
        ({"body3__start": 100.0}, ("closure", "sheet")),
        ({"sheet__unknown": "mass"}, ("unknown-body", "sheet")),
        ({"body1__unknown_here": "yes"}, ("unknown-body", "sheet")),
        ({"body1__end": 60.0}, ("ends-differ", "sheet")),
        (
            {"body3__start": 1400.0, "body4__mass": 0.5, "body4__amount_changed": 0.5, "body1__mass": 100.0},
            ("boiling", "sheet"),
        ),
        ({"body3__end": 190.0, "sheet__heater_voltage": 0.0}, ("one-sided", "sheet")),
    ],
)
def test_a_heat_balance_says_what_is_wrong(changed: dict[str, Any], expected: tuple[str, str]) -> None:
    """Changes of phase not declared, open balances, steam and one-sided bodies, each by its code at its place."""
    assert expected in said("HB1", **changed)


def test_the_closure_allowed_follows_the_readings_uncertainty() -> None:
    """With 0.5 K on every temperature the closure allowed is twice the sum's uncertainty, not the usual 5 %."""
    found = results("HB1", sheet__temperature_uncertainty=0.5)
    exchanged = (6505.7 + 218.2 + 29181.0 + 27384.0 + 5400.0) / 2
    assert found["sheet.closure_limit"] == pytest.approx(200 * found["sheet.uncertainty"] / exchanged, rel=1e-4)
    assert found["sheet.uncertainty"] == pytest.approx(
        0.5 * 2**0.5 * (3555.04**2 + 119.2**2 + 185.2**2 + 123.6**2) ** 0.5, rel=1e-3
    )
