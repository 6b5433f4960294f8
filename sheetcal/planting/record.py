"""Slips in temperature records: a typed element, the firing time, a lost line, a thermometer that stands still."""

from __future__ import annotations

import math
from collections.abc import Callable, Iterator
from typing import Any

from sheetcal.planting.package import text
from sheetcal.planting.registry import FIRED, Spot, slip
from sheetcal.planting.sheet import Sheet

RECORDED = ("fuel", "calibration", "specific-heat")


def recorded(sheet: Sheet) -> Iterator[tuple[str, list[Any], list[Any]]]:
    """Runs with a record: run, times, temperatures."""
    for run in sheet.runs():
        times = sheet.readings.get(f"{run}.record_time")
        if times and sheet.readings.get(f"{run}.rise_source", "record") == "record":
            yield run, list(times), list(sheet.readings[f"{run}.record_temperature"])


@slip("reading-decimal-comma", RECORDED)
def comma_in_a_record(sheet: Sheet) -> Iterator[Spot]:
    """One temperature of a record typed by hand, with a comma."""
    for run, _, temperatures in recorded(sheet):
        row = len(temperatures) // 2
        one = f"{run}.record_temperature[{row + 1}]"
        typed = text(f"{temperatures[row]:.4f}".replace(".", ","))
        yield Spot(one, cells={"!".join(sheet.where(one)): typed}, blank=(one,), cause=("comma",))


@slip("reading-not-number", RECORDED)
def letter_in_a_record(sheet: Sheet) -> Iterator[Spot]:
    """One temperature of a record with a letter in it."""
    for run, _, temperatures in recorded(sheet):
        row = len(temperatures) // 3
        one = f"{run}.record_temperature[{row + 1}]"
        yield Spot(one, cells={"!".join(sheet.where(one)): text(f"{temperatures[row]:.4f}?")}, blank=(one,))


@slip("firing-time-late", FIRED)
def firing_time_a_reading_late(sheet: Sheet) -> Iterator[Spot]:
    """The firing typed after the first reading that rose."""
    for run, times, _ in recorded(sheet):
        fired = sheet.readings[f"{run}.firing_time"]
        later = [time for time in times if time > fired]
        yield Spot(f"{run}.firing_time", readings={f"{run}.firing_time": later[0]}, cause=("late", "firing", "before"))


@slip("firing-time-early", FIRED)
def firing_time_early(sheet: Sheet) -> Iterator[Spot]:
    """The firing typed two readings before it happened."""
    for run, times, _ in recorded(sheet):
        fired = sheet.readings[f"{run}.firing_time"]
        before = [time for time in times if time < fired][-2]
        yield Spot(f"{run}.firing_time", readings={f"{run}.firing_time": before}, cause=("early", "firing", "after"))


@slip("record-unsound", RECORDED)
def two_times_exchanged(sheet: Sheet) -> Iterator[Spot]:
    """Two lines of a record in each other's place."""
    for run, times, _ in recorded(sheet):
        row = len(times) // 2
        times[row], times[row + 1] = times[row + 1], times[row]
        yield Spot(f"{run}.record_time", readings={f"{run}.record_time": times})


@slip("record-step", FIRED)
def line_of_a_record_lost(sheet: Sheet) -> Iterator[Spot]:
    """A line that was not copied."""
    for run, times, temperatures in recorded(sheet):
        names = (f"{run}.record_time", f"{run}.record_temperature")
        kept = (times[:2] + times[3:], temperatures[:2] + temperatures[3:])
        yield Spot(names[0], readings=dict(zip(names, kept, strict=True)))


@slip("record-equal", FIRED)
def thermometer_that_stood_still(sheet: Sheet) -> Iterator[Spot]:
    """Readings copied down while the temperature rose."""
    for run, times, temperatures in recorded(sheet):
        first = sum(time <= sheet.readings[f"{run}.firing_time"] for time in times) + 1
        temperatures[first : first + 4] = [temperatures[first]] * 4
        yield Spot(f"{run}.equal_running", readings={f"{run}.record_temperature": temperatures})


@slip("record-too-short", FIRED)
def record_stopped_too_early(sheet: Sheet) -> Iterator[Spot]:
    """The logger stopped before the after-period."""
    for run, times, temperatures in recorded(sheet):
        kept = sum(time <= sheet.readings[f"{run}.end_of_main"] for time in times) - 1
        names = (f"{run}.record_time", f"{run}.record_temperature")
        cut = dict(zip(names, (times[:kept], temperatures[:kept]), strict=True))
        yield Spot(f"{run}.firing_time", readings=cut)


@slip("record-of-another-run", FIRED)
def record_of_another_time(sheet: Sheet) -> Iterator[Spot]:
    """The file of another firing of the day loaded: its start says so."""
    for run in sheet.runs():
        started = sheet.readings.get(f"{run}.record_start")
        if started:
            hour = int(started[11:13])
            moved = f"{started[:11]}{(hour + 5) % 24:02d}{started[13:]}"
            yield Spot(f"{run}.record_start", readings={f"{run}.record_start": moved}, cause=("another run",))


def spoiled_records(sheet: Sheet, run: str) -> Iterator[dict[str, Any]]:
    """What can be wrong with a thermometer or its bath: too warm, too cold, unsteady, creeping, stirred too hard."""
    times, held = sheet.readings[f"{run}.record_time"], sheet.readings[f"{run}.record_temperature"]
    fired = sheet.readings.get(f"{run}.firing_time", sheet.readings.get(f"{run}.drop_time"))
    ended = sheet.readings.get(f"{run}.end_of_main", sheet.readings.get(f"{run}.end_of_mixing"))
    if fired is None or ended is None:
        return
    first = float(held[0])
    bends: list[Callable[[float, float], float]] = [
        *(lambda t, y, by=by: y + by for by in (0.6, -0.6, 1.6, -1.6, 9.0, -9.0)),
        *(lambda t, y, by=by: y + (by if t < fired and round(2 * t) % 2 else 0.0) for by in (0.002, 0.02)),
        *(lambda t, y, by=by: y - (by * math.exp(ended - t) if t >= ended else 0.0) for by in (0.005, 0.05)),
        *(lambda t, y, by=by: y + by * t for by in (0.001, -0.001, 0.01, -0.01)),
        *(lambda t, y, by=by: y + (by if t > fired else 0.0) for by in (0.1, 0.5, 2.0, 8.0)),
        *(lambda t, y, by=by: first + by * (y - first) for by in (0.1, 0.3, 3.0, 6.0)),
    ]
    for bend in bends:
        pairs = zip(times, held, strict=True)
        yield {f"{run}.record_temperature": [round(bend(float(t), float(y)), 6) for t, y in pairs]}


@slip("record-vessel", ("fuel",))
def wrong_vessel_ticked(sheet: Sheet) -> Iterator[Spot]:
    """The other vessel named on the sheet; the logger's file names the right one."""
    vessels = [str(row["id"]) for row in sheet.record.tables.get("vessel", ())]
    for run in sheet.runs():
        named = sheet.readings.get(f"{run}.vessel")
        if sheet.readings.get(f"{run}.record_vessel") == named:
            other = next((one for one in vessels if one != named), None)
            if other:
                yield Spot(f"{run}.vessel", readings={f"{run}.vessel": other}, cause=("vessel",))
