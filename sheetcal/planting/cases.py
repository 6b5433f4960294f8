"""Ways to break those limits that no single reading breaks: several readings as one slip, by the code of the limit."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import replace
from typing import Any

from sheetcal.kinds.record import constants_sha256
from sheetcal.model import IssueRecord, Value
from sheetcal.planting.sheet import Sheet

Change = tuple[dict[str, Any], IssueRecord | None]
Way = Callable[[Sheet, str], Iterator[Change]]
WAYS: dict[str, Way] = {}
WATER = 4.18  # J/(g K), to invent a blank run


def way(*codes: str) -> Callable[[Way], Way]:
    """Register ways of breaking limits; they are tried before all others."""

    def add(function: Way) -> Way:
        WAYS.update(dict.fromkeys(codes, function))
        return function

    return add


def with_table(sheet: Sheet, table: str, **columns: Value) -> IssueRecord:
    """The record as it would have been issued with other entries in every row of a table."""
    rows = tuple({**row, **columns} for row in sheet.record.tables.get(table, ()))
    record = replace(sheet.record, tables={**sheet.record.tables, table: rows})
    printed = {**record.prefilled, "sheet.constants_id": constants_sha256(record)[:16]}
    return replace(record, prefilled=printed)


@way("three-times-order")
def _three_readings(sheet: Sheet, run: str) -> Iterator[Change]:
    """The second reading noted before the first."""
    times = {"three_time_a": 5.0, "three_time_b": 4.0, "three_time_c": 14.0}
    heights = {"three_temperature_a": 22.0, "three_temperature_c": 25.0}
    drifts = {"three_drift_before": 0.005, "three_drift_after": -0.001}
    typed = {f"{run}.{name}": value for name, value in {**times, **heights, **drifts}.items()}
    yield {f"{run}.rise_source": "three readings", **typed}, None


@way("run-not-clean")
def _spatter(sheet: Sheet, run: str) -> Iterator[Change]:
    yield {f"{run}.inspection": "spatter", f"{run}.remarks": "one drop on the wall of the vessel"}, None


@way("thread-expired", "aid1-expired", "aid2-expired")
def _lot_run_out(sheet: Sheet, run: str) -> Iterator[Change]:
    """A lot from the shelf that was past its day."""
    for table, lot, mass in (
        ("thread", "thread_lot", "thread_mass"), ("aid", "aid1_lot", "aid1_mass"), ("aid", "aid2_lot", "aid2_mass"),
    ):  # fmt: skip
        rows = sheet.record.tables.get(table, ())
        if rows:
            used = {f"{run}.{lot}": rows[0]["lot"], f"{run}.{mass}": 0.05}
            typed = {one: value for one, value in used.items() if one in sheet.plan.places}
            yield typed, with_table(sheet, table, valid_until="2020-01-01")


@way("approval-missing")
def _no_approval(sheet: Sheet, run: str) -> Iterator[Change]:
    """A sample of a nature that needs an approval, printed without one, and fired."""
    sample = sheet.plan.places[f"{run}.vessel"].sample
    yield {}, replace(sheet.record, prefilled={**sheet.record.prefilled, f"{sample}.needs_approval": "yes"})


@way("limit-exceeded")
def _four_runs_apart(sheet: Sheet, sample: str) -> Iterator[Change]:
    """Two more runs made, and all four still further apart than four may be."""
    runs = [run for run in sheet.runs() if sheet.plan.places[f"{run}.vessel"].sample == sample]
    free = sheet.reserve(sample)
    typed: dict[str, Any] = {}
    for number, (source, to) in enumerate(zip(runs, free, strict=False)):
        typed |= sheet.copied(source, to)
        gross = sheet.readings[f"{source}.crucible_gross"]
        typed |= {f"{to}.crucible_gross": round(gross - 0.012 * number, 4), f"{to}.sample_mass": None}
        typed |= {f"{to}.start": f"{15 + number}:00", f"{to}.record_start": f"2025-03-03T{15 + number}:00"}
    yield typed, None


@way("gross-impossible")
def _all_masses_too_small(sheet: Sheet, sample: str) -> Iterator[Change]:
    """A balance that shows too little: every run of the sample alike."""
    runs = [run for run in sheet.runs() if sheet.plan.places[f"{run}.vessel"].sample == sample]
    for share in (0.4, 0.3, 0.2):
        typed: dict[str, Any] = {}
        for run in runs:
            tare, gross = (sheet.readings[f"{run}.crucible_{name}"] for name in ("tare", "gross"))
            typed |= {f"{run}.crucible_gross": round(tare + share * (gross - tare), 4), f"{run}.sample_mass": None}
        yield typed, None


@way("moisture-and-ash")
def _moisture_and_ash(sheet: Sheet, sample: str) -> Iterator[Change]:
    yield {f"{sample}.ash_basis": "as analysed", f"{sample}.ash": 99.5}, None


@way("moisture-of-another-day")
def _yesterdays_moisture(sheet: Sheet, run: str) -> Iterator[Change]:
    """The moisture of the day before the weighing."""
    sample = sheet.plan.places[f"{run}.vessel"].sample
    for day in ("2025-03-02T15:00", "2025-03-01T15:00", "2025-02-27T15:00"):
        yield {f"{run}.analysis_moisture": sheet.readings.get(f"{sample}.analysis_moisture"),
               f"{run}.analysis_moisture_determined": day}, None  # fmt: skip


@way("oxygen-high")
def _oxygen_high(sheet: Sheet, run: str) -> Iterator[Change]:
    for pressure in (3.06, 3.11, 3.16, 3.21, 3.26, 3.29):
        yield {f"{run}.oxygen_pressure": pressure}, None


@way("heat-capacity-change")
def _all_pellets_alike_too_heavy(sheet: Sheet, _: str) -> Iterator[Change]:
    """A balance that shows too much: every pellet alike, so that the runs still agree."""
    for share in (1.004, 1.006, 1.01):
        typed = {}
        for run in sheet.runs():
            tare, gross = (sheet.readings[f"{run}.crucible_{name}"] for name in ("tare", "gross"))
            typed[f"{run}.crucible_gross"] = round(tare + share * (gross - tare), 4)
        yield typed, None


@way("certificate-band")
def _other_convention(sheet: Sheet, _: str) -> Iterator[Change]:
    """The certificate's value entered in the laboratory's file under the other mass convention."""
    for convention in ("in air", "in vacuum"):
        yield {}, with_table(sheet, "certified", convention=convention)


@way("check-body", "check-body-warning")
def _check_body_off(sheet: Sheet, run: str) -> Iterator[Change]:
    """A run on the check body that gives another value than the body has."""
    mass = sheet.readings[f"{run}.sample_mass"]
    body = {"sheet.check_body": "copper", "sheet.check_specific_heat": 0.385, f"{run}.role": "check body"}
    for factor in (0.99, 0.98, 0.97, 0.96, 0.95, 0.93, 0.9, 0.8):
        yield {**body, f"{run}.sample_mass": round(mass * factor, 2)}, None


@way("check-body-due")
def _check_body_not_run(sheet: Sheet, _: str) -> Iterator[Change]:
    yield {"sheet.check_body": "copper"}, None


@way("specific-heat-outlier")
def _one_of_four_apart(sheet: Sheet, _: str) -> Iterator[Change]:
    """A fourth run like the first; the second apart from all."""
    for off in (0.6, 1.2):
        apart = {"run2.final_temperature_typed": sheet.readings["run2.final_temperature_typed"] + off}
        yield {**sheet.copied("run1", "run4"), **apart}, None


@way("cup-source")
def _one_blank_run(sheet: Sheet, _: str) -> Iterator[Change]:
    """The cup to be measured by blank runs, of which there is one: warm water in place of the body."""
    cold = sheet.readings["run1.cup_with_water"] - sheet.readings["run1.cup_empty"]
    first, warm, start = sheet.readings["run1.start_temperature_typed"], 50.0, 60.0
    held = WATER * cold + float(str(sheet.results["sheet.cup_heat_capacity"]))
    last = round((WATER * warm * start + held * first) / (WATER * warm + held), 2)
    yield {
        "sheet.cup_source": "blank runs", "run1.role": "blank", "run1.sample_mass": warm,
        "run1.sample_start_temperature": start, "run1.final_temperature_typed": last,
        "run1.end_mass": sheet.readings["run1.cup_with_water"] + warm,
    }, None  # fmt: skip


@way("boiling")
def _heated_for_hours(sheet: Sheet, _: str) -> Iterator[Change]:
    """A heater left on: the end that the balance predicts lies above boiling."""
    known = {"body2.unknown_here": None, "body2.specific_heat": 0.45}
    for seconds in (8000.0, 20000.0, 60000.0):
        yield {"sheet.unknown": "none", **known, "sheet.heater_time": seconds}, None


@way("one-sided")
def _nobody_gave(sheet: Sheet, _: str) -> Iterator[Change]:
    """Every body gained, and nothing gave: the losses eat up the heater."""
    known = {"body2.unknown_here": None, "body2.specific_heat": 0.45, "body2.start": 20.0}
    yield {"sheet.unknown": "none", **known, "sheet.loss_power": 20.0}, None
