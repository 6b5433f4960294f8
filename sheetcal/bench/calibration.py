"""A calibration workbook at the bench: pellets of a certified acid burnt in one vessel."""

from __future__ import annotations

from sheetcal.bench import combustion, firing
from sheetcal.bench.combustion import Charge
from sheetcal.bench.draw import Dice
from sheetcal.bench.facts import Facts, Readings, Row, amount
from sheetcal.bench.firing import Rig, Turn
from sheetcal.bench.front import front_readings, station_readings
from sheetcal.bench.honest import Habits
from sheetcal.errors import BadInput

DRIFT = 0.0004  # relative: how far the true heat capacity may lie from the value in force
FRESH = 10_000.0  # J/K, a vessel that was never calibrated
STEPS = (-0.8, -0.3, 0.1, 0.45, 0.8)  # where in its range each pellet lies, so that the rise is mapped


def readings(facts: Facts, habits: Habits, dice: Dice) -> Readings:
    """Every reading of a calibration workbook by id."""
    day = facts.first_day(habits.weekend)
    rig = Rig(facts, habits, dice, _vessel(facts, habits, dice))
    void = {1: habits.void} if habits.void else {}
    wanted = int(facts.number("sheet.runs_required", facts.record.shape.runs)) + len(void)
    if wanted > facts.record.shape.places:
        raise BadInput(
            f"{facts.record.shape.places} places", f"{wanted} runs", "a reserve place", "Issue with --spare."
        )
    runs = list(range(1, wanted + 1))
    days = int(facts.constants.get("calibration_days", 1))
    spread = max(days, 2 if habits.two_days else 1)
    turns = rig.turns(runs, dice.child("turns"), {run: (run - 1) * spread // len(runs) for run in runs})
    lot = _lot(facts, turns[1])
    capacity = _capacity(rig, rig.vessel)
    style = dice.choice(("all", "all", "gross", "net"))
    found = front_readings(facts, day, habits, dice.child("front"))
    found.update(station_readings(facts, dice.child("station")))
    found.update(_front(lot, rig.vessel))
    for run in runs:
        found.update(firing.placed(run, _run(rig, turns[run], lot, capacity, style, void.get(run, ""))))
    return found


def _vessel(facts: Facts, habits: Habits, dice: Dice) -> str:
    """The vessel to calibrate: as printed, else one of those fit to fire."""
    fit = Rig(facts, habits, dice).fit(facts.first_day(habits.weekend))
    if not fit:
        raise BadInput("table vessel", "none fit to fire", "a vessel inside its test and firings", "Give one.")
    return facts.word("sheet.vessel", dice.child("vessel").choice(fit))


def _front(lot: Row, vessel: str) -> Readings:
    """What is settled before the first pellet."""
    return {
        "sheet.vessel": vessel,
        "sheet.certified_lot": lot["lot"],
        "sheet.reason": "due",
        "sheet.mass_plan": "usual",
    }


def _lot(facts: Facts, turn: Turn) -> Row:
    """The certified acid to burn: as printed, else the first one in force."""
    rows = [row for row in facts.usable("certified", turn.day) if row.get("basis", "") != "dry"]
    chosen = facts.word("sheet.certified_lot")
    named = [row for row in rows if row["lot"] == chosen] or rows
    if not named:
        raise BadInput("table certified", f"no lot in force on {turn.day.isoformat()}", "a certified lot", "Give one.")
    return named[0]


def _capacity(rig: Rig, vessel: str) -> float:
    """True heat capacity: the value in force, moved a little by half a year of use."""
    stated = amount(rig.vessels[vessel], "heat_capacity", FRESH) if vessel in rig.vessels else FRESH
    return stated * (1.0 + rig.dice.child("drift").uniform(-DRIFT, DRIFT))


def _pellet(rig: Rig, turn: Turn, vessel: Row, dice: Dice) -> float:
    """A pellet inside the method's range and well below the vessel's rating, each larger than the last."""
    constants = rig.facts.constants
    low, high = constants.get("pellet_low", 0.8), constants.get("pellet_high", 1.2)
    high = min(high, 0.92 * amount(vessel, "rated_energy", 30.0) * 1000.0 / combustion.BENZOIC_IN_VACUUM)
    place = STEPS[(turn.run - 1) % len(STEPS)]
    return (low + high) / 2.0 + place * (high - low) / 2.0 + dice.normal(0.004)


def _run(rig: Rig, turn: Turn, lot: Row, capacity: float, style: str, void: str) -> Readings:
    """One pellet, from its weighing to its wash."""
    dice = rig.dice.child("run", turn.run)
    vessel = rig.vessels[turn.vessel]
    weighed = rig.weigh(_pellet(rig, turn, vessel, dice), style, "pellet_mass", dice)
    fuse_readings, fuse_heat = rig.fuse(turn.run, turn.day, dice)
    water_readings, water_off = rig.water(dice)
    filling = rig.fill(dice)
    heat = weighed.mass * _per_gram(lot, weighed.mass, filling, amount(vessel, "volume", 310.0))
    acid = combustion.acids(weighed.mass, 0.0, 0.0, dice.uniform(36.0, 52.0))
    charge = Charge(heat, 0.0, fuse_heat, 0.0, acid)
    theta = charge.rise(capacity, water_off) * firing.BURNT.get(void, 1.0)
    found: Readings = {**firing.head(turn, "void" if void else "valid", void), **weighed.readings}
    for block in (fuse_readings, water_readings, filling):
        found.update(block)
    found.update(rig.rise(turn, theta, dice, "misfire" if void == "misfire" else ""))
    if void != "misfire":
        found.update(rig.titration(acid, turn.day, dice))
    found["remarks"] = rig.habits.note
    return found


def _per_gram(lot: Row, mass: float, filling: Readings, volume: float) -> float:
    """J per gram weighed in air, at the conditions in the vessel: certificate, buoyancy, real-gas terms.

    A real-gas calculation gives 31 where the usual certificate formula has 42 for the acid's own amount.
    """
    density = amount(lot, "density", combustion.BENZOIC_DENSITY)
    in_vacuum = "vacuum" in str(lot.get("convention") or "in air")
    pressure, water = filling["oxygen_pressure"], filling["vessel_water"]
    assert isinstance(pressure, float) and isinstance(water, float)
    litres = volume / 1000.0
    ppm = 197.0 * (pressure + 0.1 - 3.04) + 31.0 * (mass / litres - 3.0) + 30.0 * (water / litres - 3.0)
    value = amount(lot, "value") * (combustion.buoyancy(density) if in_vacuum else 1.0)
    return value * (1.0 + ppm * 1e-6)
