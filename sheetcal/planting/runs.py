"""Slips between runs and with what a run is told to be: exchanges, digits, titrants, controls, void runs, materials."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace
from itertools import pairwise
from typing import Any

from sheetcal.planting.record import recorded
from sheetcal.planting.registry import FIRED, Spot, slip
from sheetcal.planting.sheet import Sheet

RECORD = ("record_time", "record_temperature", "record_file", "record_start", "record_vessel")


@slip("records-exchanged", ("fuel",))
def records_exchanged(sheet: Sheet) -> Iterator[Spot]:
    """The logger's files of two runs of two samples loaded in each other's place."""
    runs = [run for run, _, _ in recorded(sheet)]
    for one in runs:
        for other in runs:
            if _owner(sheet, one) < _owner(sheet, other) and _apart(sheet, one, other):
                pairs = ((one, other), (other, one))
                typed = {
                    f"{to}.{name}": sheet.readings.get(f"{source}.{name}") for to, source in pairs for name in RECORD
                }
                yield Spot(f"{one}.record_time", readings=typed, cause=("exchanged",))


def _owner(sheet: Sheet, run: str) -> str:
    return sheet.plan.places[f"{run}.record_time"].sample or ""


def _apart(sheet: Sheet, one: str, other: str) -> bool:
    """Whether an exchange moves both results by far more than duplicates may differ."""
    rises = [float(str(sheet.results[f"{run}.corrected_rise"])) for run in (one, other)]
    return abs(rises[0] / rises[1] - 1.0) > 0.03


@slip("masses-exchanged", ("fuel",))
def sample_and_aid_exchanged(sheet: Sheet) -> Iterator[Spot]:
    """Sample and aid typed in each other's cell."""
    for run in sheet.runs():
        mass, aid = sheet.readings.get(f"{run}.sample_mass"), sheet.readings.get(f"{run}.aid1_mass")
        if mass and aid:
            typed = {f"{run}.sample_mass": aid, f"{run}.aid1_mass": mass, f"{run}.crucible_gross": None}
            yield Spot(f"{run}.sample_mass", readings=typed, cause=("each other's cell",))


@slip("cross-foot", ("fuel",))
def digits_exchanged_in_a_mass(sheet: Sheet) -> Iterator[Spot]:
    """1.0213 for 1.0123: two neighbouring digits the wrong way round, with gross and tare beside it."""
    for run in sheet.runs():
        gross, tare = sheet.readings.get(f"{run}.crucible_gross"), sheet.readings.get(f"{run}.crucible_tare")
        if gross and tare:
            digits = f"{gross - tare:.4f}"
            wrong = next((swapped for swapped in _exchanges(digits) if swapped != digits), None)
            if wrong and abs(float(wrong) - gross + tare) < 0.1:
                typed = {f"{run}.sample_mass": float(wrong)}
                yield Spot(f"{run}.sample_mass", readings=typed, cause=("exchanged",))


def _exchanges(digits: str) -> Iterator[str]:
    """Neighbouring decimals the other way round, the coarsest first that keeps the mass near."""
    for place in range(len(digits) - 3, len(digits) - 1):
        yield f"{digits[:place]}{digits[place + 1]}{digits[place]}{digits[place + 2 :]}"


@slip("run-void", FIRED)
def soot_seen_and_the_run_counted(sheet: Sheet) -> Iterator[Spot]:
    """A bad firing noted at the inspection, its run kept as valid."""
    for run in sheet.runs():
        place = sheet.plan.places.get(f"{run}.inspection")
        bad = [one for one in (place.field.choices if place else ()) if one in ("soot", "sooty", "unburnt or crumbs")]
        if bad:
            yield Spot(f"{run}.inspection", readings={f"{run}.inspection": bad[0]})


@slip("titrant-of-the-day", ("fuel",))
def titrant_of_another_bottle(sheet: Sheet) -> Iterator[Spot]:
    """The other lot chosen for one of two runs; which of the two is wrong only the bottle knows: the older is named."""
    lots = [str(row["lot"]) for row in sheet.record.tables.get("titrant", ())]
    for run in sheet.runs():
        used = str(sheet.readings.get(f"{run}.titrant_lot", ""))
        other = next((one for one in lots if one != used), None)
        beside = next((one for one in sheet.runs() if one != run and _owner(sheet, one) == _owner(sheet, run)), None)
        if used and other and beside:
            named = run if other < used else beside
            yield Spot(f"{named}.titrant_lot", readings={f"{run}.titrant_lot": other})


@slip("control-missing", ("fuel",))
def control_not_run(sheet: Sheet) -> Iterator[Spot]:
    """The control's runs are void: the vessels went without one that day."""
    typed: dict[str, Any] = {}
    for run in sheet.runs():
        sample = sheet.plan.places[f"{run}.state"].sample
        if sheet.readings.get(f"{sample}.role") == "control":
            typed |= {f"{run}.state": "void", f"{run}.void_reason": "record lost"}
    first = next((run for run in sheet.runs() if f"{run}.state" not in typed), None)
    if first and typed:
        yield Spot(f"{first}.vessel", readings=typed, cause=("cited",))


@slip("candidates", ("specific-heat",))
def another_material_named(sheet: Sheet) -> Iterator[Spot]:
    """The label of the piece beside it."""
    yield Spot("sheet.specific_heat", readings={"sheet.material": "silver coin"})


@slip("value-awaited", ("fuel",))
def sulfur_still_to_come(sheet: Sheet) -> Iterator[Spot]:
    """A value of the analysis bench not there yet."""
    for sample in range(1, sheet.record.shape.samples + 1):
        for name in ("sulfur", "hydrogen"):
            if f"sample{sample}.{name}" in sheet.read:
                yield Spot(f"sample{sample}.{name}", readings={f"sample{sample}.{name}": None})


def _again(sheet: Sheet, number: int) -> Iterator[tuple[str, str, dict[str, Any]]]:
    """The first run of each sample entered again in its reserve place of that number: run, place, what was typed."""
    samples = dict.fromkeys(sheet.plan.places[f"{run}.state"].sample for run in sheet.runs())
    for sample in samples:
        first = next(run for run in sheet.runs() if sheet.plan.places[f"{run}.state"].sample == sample)
        free = sheet.reserve(sample)
        if len(free) > number:
            yield first, free[number], sheet.copied(first, free[number])


@slip("runs-equal", FIRED)
def run_entered_twice(sheet: Sheet) -> Iterator[Spot]:
    """The readings of a run entered again in a reserve place, as if it were one more."""
    for _, to, typed in _again(sheet, 0):
        yield Spot(f"{to}.record_temperature", readings=typed, cause=("second time", "twice"))


@slip("runs-overlap", FIRED)
def start_of_the_run_before(sheet: Sheet) -> Iterator[Spot]:
    """The start typed three minutes after that of the run before, in the same calorimeter."""
    for one, other in pairwise(sheet.runs()):
        start = str(sheet.readings[f"{one}.start"])
        if sheet.readings[f"{one}.date"] == sheet.readings[f"{other}.date"] and int(start[3:]) < 57:
            typed = f"{start[:3]}{int(start[3:]) + 3:02d}"
            yield Spot(f"{other}.start", readings={f"{other}.start": typed}, cause=("start", "clock"))


@slip("run-gap", FIRED)
def reserve_place_passed_over(sheet: Sheet) -> Iterator[Spot]:
    """One more run, in the second reserve place; the first is empty."""
    for _, to, typed in _again(sheet, 1):
        yield Spot(f"{to}.date", readings={**typed, f"{to}.start": "17:00"}, cause=("deleted",))


@slip("run-dropped", ("fuel", "calibration", "specific-heat", "vaporisation"))
def run_left_out(sheet: Sheet) -> Iterator[Spot]:
    """One more run made, and its state never chosen: it counts neither as valid nor as void."""
    for _, to, typed in _again(sheet, 0):
        typed |= {f"{to}.state": "planned", f"{to}.start": "17:00"}
        yield Spot(f"{to}.state", readings=typed, cause=("left out",))


@slip("date-order", ("fuel", "calibration", "specific-heat", "vaporisation"))
def year_mistyped(sheet: Sheet) -> Iterator[Spot]:
    """The year before, as in every January."""
    for run in sheet.runs():
        day = str(sheet.readings[f"{run}.date"])
        typed = f"{int(day[:4]) - 1}{day[4:]}"
        yield Spot(f"{run}.date", readings={f"{run}.date": typed}, cause=("year",))


@slip("reference-as-sample", ("fuel",))
def control_printed_as_a_sample(sheet: Sheet) -> Iterator[Spot]:
    """The worklist called the control a sample."""
    for number in range(1, sheet.record.shape.samples + 1):
        one = f"sample{number}.role"
        if sheet.readings.get(one) == "control":
            yield Spot(one, issued=replace(sheet.record, prefilled={**sheet.record.prefilled, one: "sample"}))
