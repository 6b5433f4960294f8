"""A heat-balance workbook at the bench: bodies brought together until they share one temperature.

The end temperature follows from the first law over all bodies, their melting and the heater, less what leaks.
"""

from __future__ import annotations

from dataclasses import dataclass

from sheetcal.bench.draw import Dice, stepped
from sheetcal.bench.facts import Facts, Readings
from sheetcal.bench.front import front_readings
from sheetcal.bench.honest import Habits

FUSION, MELTS_AT = 333.5, 0.0  # J/g, degC


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
    """So many bodies (2 to 8) in a cup: water and cup first, then hot plates, ice, more plates."""
    water = Part("water", dice.uniform(820.0, 880.0), 4.1824, dice.uniform(24.0, 25.0))
    others = [
        Part("iron plate", dice.uniform(400.0, 425.0), 0.4495, dice.uniform(150.0, 185.0)),
        Part("copper cup", dice.uniform(300.0, 320.0), 0.3846, water.start),
        Part("ice", dice.uniform(25.0, 45.0), 2.06, dice.uniform(-7.0, -4.0), after=4.19),
        *(
            Part(f"aluminium disc {n}", dice.uniform(60.0, 90.0), 0.900, dice.uniform(60.0, 95.0))
            for n in range(1, 5)
        ),
    ]
    return [water, *others][:count]


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
    leak = chance.uniform(0.0, 250.0)
    end = end_temperature(parts, volts * amperes * seconds - leak)
    found = front_readings(facts, day, habits, dice.child("front"))
    found.update(
        {"sheet.heater_voltage": volts, "sheet.heater_current": amperes, "sheet.heater_time": seconds}
    )
    for number, part in enumerate(parts, start=1):
        found.update(_body(number, part, end, dice.child("body", number)))
    return found


def _body(number: int, part: Part, end: float, dice: Dice) -> Readings:
    """One body as weighed and read."""
    mass = stepped(part.mass, 0.01)
    values: Readings = {
        "name": part.name,
        "mass": mass,
        "specific_heat": stepped(part.specific_heat, 0.0001),
        "start_temperature": stepped(part.start + dice.normal(0.01), 0.01),
        "end_temperature": stepped(end + dice.normal(0.01), 0.01),
        "change": "none" if part.after is None else "melts",
    }
    if part.after is not None:
        values.update(
            latent_heat=FUSION,
            amount_changed=mass,
            specific_heat_after=part.after,
            change_temperature=MELTS_AT,
        )
    return {f"body{number}.{name}": value for name, value in values.items()}
