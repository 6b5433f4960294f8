"""A specific-heat workbook at the bench: a hot body dropped into water in a cup.

The end temperature follows from the first law with heat capacities that depend on temperature; the record
from the same exact curve as a firing: the cup exchanges with the room while the body gives off its heat.
"""

from __future__ import annotations

from dataclasses import dataclass
from datetime import date

from sheetcal.bench import curve, steam
from sheetcal.bench.curve import Bath, Thermometer, Timing
from sheetcal.bench.draw import Dice, stepped
from sheetcal.bench.facts import Facts, Readings, Row, amount
from sheetcal.bench.firing import placed
from sheetcal.bench.front import front_readings, turn_at
from sheetcal.bench.honest import Habits

ROOM = 22.0  # degC
COOLING = 0.02  # K/s, a body carried through the air of the room from 100 degC


@dataclass(frozen=True, slots=True)
class Metal:
    """An invented piece: g, g/cm3, specific heat J/(g K) at 25 degC and its relative slope 1/K."""

    name: str
    mass: float
    density: float
    at_25: float
    slope: float

    def heat(self, low: float, high: float) -> float:
        """J/g that warm it from low to high degC."""
        middle = (low + high) / 2.0 - 25.0
        return self.at_25 * (1.0 + self.slope * middle) * (high - low)


# Invented pieces; specific heats lie where such metals lie, none is a measurement.
METALS = (
    Metal("copper-like plug", 120.34, 8.93, 0.3845, 2.6e-4),
    Metal("aluminium-like block", 64.18, 2.70, 0.8980, 5.0e-4),
    Metal("brass-like plug", 131.52, 8.45, 0.3800, 3.0e-4),
    Metal("iron-like cylinder", 110.27, 7.86, 0.4490, 8.5e-4),
)


def end_temperature(water: float, cup: float, cold: float, metal: Metal, hot: float) -> float:
    """degC at which water (g), cup (J/K) and metal meet, no heat lost; by halving between cold and hot."""
    low, high = min(cold, hot), max(cold, hot)
    for _ in range(60):
        middle = (low + high) / 2.0
        gained = water * steam.heat_content(cold, middle) + cup * (middle - cold)
        given = metal.mass * metal.heat(middle, hot)
        low, high = (middle, high) if gained < given else (low, middle)
    return (low + high) / 2.0


def readings(facts: Facts, habits: Habits, dice: Dice) -> Readings:
    """Every reading of a specific-heat workbook by id."""
    day = facts.first_day(habits.weekend)
    metal = dice.child("metal").choice(METALS)
    row = _cup_row(facts, day)
    cup = amount(row, "heat_capacity") + dice.child("cup").normal(0.25)
    source = dice.child("source").choice(("record", "record", "typed"))
    found = front_readings(facts, day, habits, dice.child("front"))
    found.update(_front(metal, row))
    for run in range(1, int(facts.number("sheet.runs_required", facts.record.shape.runs)) + 1):
        turn = turn_at(facts, day, 8 * 60, run)
        found.update(placed(run, _run(habits, dice.child("run", run), turn, metal, cup, source)))
    return found


def _front(metal: Metal, cup: Row) -> Readings:
    """What is settled before the first drop; a cup that is not on file has its value typed."""
    on_file = cup["id"] != ""
    return {
        "sheet.cup_source": "given",
        "sheet.cup": cup["id"],
        "sheet.cup_heat_capacity_typed": None if on_file else cup["heat_capacity"],
        "sheet.cup_uncertainty_typed": None if on_file else cup["uncertainty"],
        "sheet.material": metal.name,
        "sheet.density": metal.density,
        "sheet.liquid": "water",
        "sheet.direction": "hot sample",
    }


def _cup_row(facts: Facts, day: date) -> Row:
    """The mixing cup: from the lab file, or an invented one whose value is typed."""
    rows = [row for row in facts.usable("cup", day) if row.get("what") == "mixing cup"]
    return rows[0] if rows else {"id": "", "heat_capacity": 61.5, "uncertainty": 0.6}


def _run(habits: Habits, dice: Dice, turn: Readings, metal: Metal, cup: float, source: str) -> Readings:
    """One drop: weighing, the hot piece, the temperatures of the water, the weighing afterwards."""
    empty = stepped(dice.normal(0.015, 182.40), 0.01)
    water = dice.uniform(148.0, 152.0)
    hot, cold = dice.uniform(98.6, 99.1), dice.uniform(19.8, 20.3)
    transfer = dice.integer(2, 4)
    met = end_temperature(water, cup, cold, metal, hot - transfer * COOLING)
    temperatures = _record(met - cold, cold, dice) if source == "record" else _typed(cold, met, dice)
    return {
        **turn,
        "role": "sample",
        "cup_empty": empty,
        "cup_with_water": stepped(empty + water, 0.01),
        "sample_mass": stepped(metal.mass + dice.normal(0.004), 0.01),
        "sample_start_temperature": stepped(hot + dice.normal(0.03), 0.1),
        "time_in_heater": float(dice.integer(20, 35)),
        "transfer_time": float(transfer),
        "temperature_source": source,
        "end_mass": stepped(empty + water + metal.mass - abs(dice.normal(0.012)), 0.01),
        "remarks": habits.note,
        **temperatures,
    }


def _typed(cold: float, met: float, dice: Dice) -> Readings:
    """Start and end as somebody reads them off his own drawing of the record."""
    return {
        "start_temperature_typed": stepped(cold + dice.normal(0.005), 0.01),
        "final_temperature_typed": stepped(met + dice.normal(0.01), 0.01),
    }


def _record(rise: float, cold: float, dice: Dice) -> Readings:
    """The record of the water; its thermometer shows hundredths."""
    bath = Bath(k=dice.uniform(0.0030, 0.0045), t_inf=ROOM, a=2.6, b=9.0)
    timing = Timing(step=30.0, fore=4.0, main=4.0, after=6.0)
    kept = curve.record(rise, dice, bath, timing, Thermometer(0.002, 0.01), start=cold)
    return {
        "record_time": list(kept.times),
        "record_temperature": list(kept.temperatures),
        "drop_time": kept.firing_time,
        "end_of_mixing": kept.end_of_main,
    }
