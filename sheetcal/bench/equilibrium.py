"""A heat-balance workbook at the bench: bodies brought together until they share one temperature.

The end temperature follows from the first law over all bodies, their melting and the heater, less what leaks.
"""

from __future__ import annotations

from dataclasses import dataclass

from sheetcal.bench.draw import Dice, stepped
from sheetcal.bench.facts import Facts, Readings
from sheetcal.bench.front import front_readings, turn_at
from sheetcal.bench.honest import Habits

FUSION, MELTS_AT = 333.5, 0.0  # J/g, degC
UNKNOWN = 2  # the body whose specific heat is sought where one is


@dataclass(frozen=True, slots=True)
class Part:
    """A body: mass g, specific heat J/(g K), start degC; ice has another specific heat after melting."""

    name: str
    mass: float
    specific_heat: float
    start: float
    after: float | None = None

    def gained(self, end: float) -> float:
        """J it takes up on its way to end degC, melting on the way where it is ice."""
        if self.after is None:
            return self.mass * self.specific_heat * (end - self.start)
        warmed = self.specific_heat * (MELTS_AT - self.start) + FUSION
        return self.mass * (warmed + self.after * (end - MELTS_AT))


def parts_of(count: int, dice: Dice) -> list[Part]:
    """So many bodies (2 to 8) in a cup: water first, then a hot plate, cup and ice, then discs."""
    water = Part("water", dice.uniform(820.0, 880.0), 4.182, dice.uniform(24.0, 25.0))
    discs = [
        Part(f"aluminium disc {number}", dice.uniform(60.0, 90.0), 0.900, dice.uniform(60.0, 95.0))
        for number in range(1, 5)
    ]
    others = [
        Part("iron plate", dice.uniform(400.0, 425.0), 0.450, dice.uniform(150.0, 185.0)),
        Part("copper cup", dice.uniform(300.0, 320.0), 0.385, water.start),
        Part("ice", dice.uniform(25.0, 45.0), 2.06, dice.uniform(-7.0, -4.0), after=4.190),
    ]
    return [water, *others, *discs][:count]


def end_temperature(parts: list[Part], heater: float) -> float:
    """degC at which all heats gained sum to what the heater gave (J); by halving."""
    low, high = 0.0, 100.0
    for _ in range(60):
        middle = (low + high) / 2.0
        low, high = (middle, high) if sum(part.gained(middle) for part in parts) < heater else (low, middle)
    return (low + high) / 2.0


def readings(facts: Facts, habits: Habits, dice: Dice) -> Readings:
    """Every reading of a heat-balance workbook by id."""
    day = facts.first_day(habits.weekend)
    chance = dice.child("bodies")
    parts = parts_of(facts.record.shape.bodies, chance)
    volts, amperes, seconds = 12.0, stepped(chance.uniform(3.6, 3.9), 0.0001), 120.0
    lost = chance.uniform(0.2, 0.5)
    end = end_temperature(parts, volts * amperes * seconds - lost * 300.0)
    unknown = UNKNOWN if chance.chance(0.25) else 0
    found = front_readings(facts, day, habits, dice.child("front"))
    turn = turn_at(facts, day, 10 * 60, 1)
    found.update({f"sheet.{name}": turn[name] for name in ("date", "start", "operator")})
    found.update({"sheet.heater_voltage": volts, "sheet.heater_current": amperes, "sheet.heater_time": seconds})
    found["sheet.unknown"] = "specific heat" if unknown else "none"
    found.update(_loss(lost, chance))
    for number, part in enumerate(parts, start=1):
        found.update(_body(number, part, end, number == unknown, dice.child("body", number)))
    return found


def _loss(lost: float, dice: Dice) -> Readings:
    """The loss where it is known, with what the readings are worth; half of the benches leave it out."""
    if dice.chance(0.5):
        return {}
    return {
        "sheet.loss_power": stepped(lost * dice.normal(0.03, 1.0), 0.01),
        "sheet.loss_time": 300.0,
        "sheet.temperature_uncertainty": 0.02,
        "sheet.mass_uncertainty": 0.02,
    }


def _body(number: int, part: Part, end: float, unknown: bool, dice: Dice) -> Readings:
    """One body as weighed and read; its specific heat stays blank where it is what is sought."""
    mass = stepped(part.mass, 0.01)
    values: Readings = {
        "name": part.name,
        "substance": part.name if part.name in ("water", "ice") else "other",
        "unknown_here": "yes" if unknown else None,
        "mass": mass,
        "specific_heat": None if unknown else part.specific_heat,
        "start": stepped(part.start + dice.normal(0.005), 0.01),
        "end": stepped(end + dice.normal(0.005), 0.01),
        "change": "none" if part.after is None else "melts",
    }
    if part.after is not None:
        values.update(
            change_temperature=MELTS_AT,
            latent_heat=FUSION,
            amount_changed=mass,
            specific_heat_after=part.after,
        )
    return {f"body{number}.{name}": value for name, value in values.items()}
