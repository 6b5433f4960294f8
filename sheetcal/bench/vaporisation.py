"""A vaporisation workbook at the bench: water boiled off at two heater powers, a steady part of each lost."""

from __future__ import annotations

from datetime import date

from sheetcal.bench import steam
from sheetcal.bench.draw import Dice, stepped
from sheetcal.bench.facts import Facts, Readings
from sheetcal.bench.firing import placed
from sheetcal.bench.front import front_readings
from sheetcal.bench.honest import Habits

POWERS = ((47.95, 2.503), (59.80, 3.121), (53.10, 2.772), (64.20, 3.351))  # V, A


def readings(facts: Facts, habits: Habits, dice: Dice) -> Readings:
    """Every reading of a vaporisation workbook by id."""
    day = facts.first_day(habits.weekend)
    usual = facts.record.ranges.get("sheet.station_pressure", {}).get("warn_low", 97.0) + 3.0
    pressure = dice.child("pressure").normal(0.6, usual)
    boiling = steam.boiling_point(pressure)
    loss = dice.child("loss").uniform(4.0, 7.5)
    found = front_readings(facts, day, habits, dice.child("front"))
    found.update(_front(pressure, boiling, dice.child("liquid")))
    for run in range(1, int(facts.number("sheet.runs_required", facts.record.shape.runs)) + 1):
        found.update(placed(run, _run(facts, habits, dice.child("run", run), run, day, boiling, loss)))
    return found


def _front(pressure: float, boiling: float, dice: Dice) -> Readings:
    return {
        "sheet.substance": "water",
        "sheet.formula": "H2O",
        "sheet.molar_mass": 18.015,
        "sheet.enthalpy_source": "measured here",
        "sheet.station_pressure": stepped(pressure, 0.01),
        "sheet.boiling_temperature": stepped(boiling + dice.normal(0.02), 0.01),
        "sheet.mass_boiled": stepped(dice.uniform(40.0, 90.0), 0.01),
    }


def _run(
    facts: Facts, habits: Habits, dice: Dice, run: int, day: date, boiling: float, loss: float
) -> Readings:
    """One power: volts, amperes, seconds and the condensate."""
    volts, amperes = POWERS[(run - 1) % len(POWERS)]
    volts, amperes = volts * dice.uniform(0.99, 1.01), amperes * dice.uniform(0.99, 1.01)
    seconds = 600.0
    mass = (volts * amperes - loss) * seconds / steam.vaporisation(boiling)
    people = facts.people(day)
    minutes = 9 * 60 + 40 * run
    return {
        "state": "valid",
        "date": day.isoformat(),
        "start": f"{minutes // 60:02d}:{minutes % 60:02d}",
        "operator": people[0] if people else "analyst",
        "voltage": stepped(volts, 0.001),
        "current": stepped(amperes, 0.0001),
        "duration": stepped(seconds + dice.normal(0.05), 0.1),
        "condensate_mass": stepped(mass + dice.normal(0.01), 0.01),
        "remarks": habits.note,
    }
