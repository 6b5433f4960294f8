"""A vaporisation workbook at the bench: water boiled off at two heater powers, a steady part of each lost."""

from __future__ import annotations

from sheetcal.bench import steam
from sheetcal.bench.draw import Dice, stepped
from sheetcal.bench.facts import Facts, Readings
from sheetcal.bench.firing import placed
from sheetcal.bench.front import front_readings, turn_at
from sheetcal.bench.honest import Habits

GAS_CONSTANT = 8.31446  # J/(mol K)
MOLAR_MASS = 18.015  # g/mol
VIRIAL = -452.0  # cm3/mol, water vapour at its boiling point (from memory)
DENSITY = 0.9588  # g/mL, water at its boiling point (from memory)
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
        found.update(
            placed(run, _run(habits, dice.child("run", run), turn_at(facts, day, 9 * 60, run), run, boiling, loss))
        )
    return found


def _front(pressure: float, boiling: float, dice: Dice) -> Readings:
    """Substance, apparatus, boiling point and the form in which the volume work is counted."""
    kelvin = boiling + 273.15
    litres_per_mole = GAS_CONSTANT * kelvin / pressure + VIRIAL / 1000.0
    readings: Readings = {
        "sheet.substance": "water",
        "sheet.formula": "H2O",
        "sheet.molar_mass": MOLAR_MASS,
        "sheet.enthalpy_source": "measured here",
        "sheet.flammable": "no",
        "sheet.heater": "enclosed",
        "sheet.vented": "yes",
        "sheet.station_pressure": stepped(pressure, 0.01),
        "sheet.boiling_temperature": stepped(boiling + dice.normal(0.02), 0.01),
        "sheet.work_form": dice.choice(("measured volumes", "ideal gas", "second virial")),
        "sheet.amount_mass": stepped(dice.uniform(40.0, 90.0), 0.01),
    }
    if readings["sheet.work_form"] != "ideal gas":
        readings["sheet.liquid_density"] = stepped(dice.normal(0.0002, DENSITY), 0.0001)
    if readings["sheet.work_form"] == "second virial":
        readings["sheet.virial"] = VIRIAL
    if readings["sheet.work_form"] == "measured volumes":
        readings["sheet.vapour_volume"] = stepped(1000.0 * litres_per_mole / MOLAR_MASS, 0.1)
    return readings


def _run(habits: Habits, dice: Dice, turn: Readings, run: int, boiling: float, loss: float) -> Readings:
    """One power: volts, amperes, seconds and the condensate."""
    volts, amperes = POWERS[(run - 1) % len(POWERS)]
    volts, amperes = volts * dice.uniform(0.99, 1.01), amperes * dice.uniform(0.99, 1.01)
    seconds = 600.0
    mass = (volts * amperes - loss) * seconds / steam.vaporisation(boiling)
    return {
        **turn,
        "voltage": stepped(volts, 0.001),
        "current": stepped(amperes, 0.0001),
        "duration": stepped(seconds + dice.normal(0.05), 0.1),
        "condensate_mass": stepped(mass + dice.normal(0.01), 0.01),
        "remarks": habits.note,
    }
