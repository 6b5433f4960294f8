"""Balance of the bodies sheet: portion by portion what each body gained, and the unknown that closes the sum.

Whatever the unknown is, the heat of its body is linear in it: two trial values give it.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace
from math import hypot, sqrt

from sheetcal.check.balance.book import Book, Road
from sheetcal.check.balance.measure import Measure, total

TAKES_UP = {"melts": 1.0, "boils": 1.0, "freezes": -1.0, "condenses": -1.0}
SOLVED = {
    "mass": "mass",
    "specific heat": "specific_heat",
    "start temperature": "start",
    "end temperature": "end",
    "latent heat": "latent_heat",
}


@dataclass(frozen=True, slots=True)
class Body:
    """One body as typed; None is blank. Masses in g, temperatures in degC, heats in J/g and J/(g K).

    A specific heat `after` a change that was not typed is that before it.
    """

    mass: float | None
    specific_heat: float | None
    start: float | None
    end: float | None
    change: str | None
    change_temperature: float | None
    latent_heat: float | None
    amount: float | None
    after: float | None

    @property
    def sign(self) -> float:
        """1 where the change takes up heat, -1 where it gives, 0 without a change."""
        return TAKES_UP.get(self.change or "", 0.0)

    def gained(self) -> float | None:
        """Heat gained, J: the portion that changes and the portion that does not, each from start to end."""
        m, c, first, last = self.mass, self.specific_heat, self.start, self.end
        if m is None or c is None or first is None or last is None:
            return None
        if not self.sign:
            return m * c * (last - first) if self.change == "none" else None
        per_gram, amount = self.per_gram(), self.amount
        if per_gram is None or amount is None:
            return None
        return amount * per_gram + (m - amount) * c * (last - first)

    def per_gram(self) -> float | None:
        """Heat one gram takes up that goes the whole way, J/g."""
        c, first, last, at, latent = (
            self.specific_heat,
            self.start,
            self.end,
            self.change_temperature,
            self.latent_heat,
        )
        if c is None or first is None or last is None:
            return None
        if not self.sign:
            return c * (last - first) if self.change == "none" else None
        if at is None or latent is None:
            return None
        after = c if self.after is None else self.after
        return c * (at - first) + self.sign * latent + after * (last - at)

    def capacity(self) -> float | None:
        """Heat capacity at the end, J/K."""
        if self.mass is None or self.specific_heat is None:
            return None
        if not self.sign:
            return self.mass * self.specific_heat if self.change == "none" else None
        if self.amount is None:
            return None
        after = self.specific_heat if self.after is None else self.after
        return (self.mass - self.amount) * self.specific_heat + self.amount * after

    def with_trial(self, unknown: str, value: float) -> Body:
        """The body with its unknown tried; an unknown mass goes the whole way."""
        tried = replace(self, **{SOLVED[unknown]: value})  # type: ignore[arg-type]  # every unknown is a number
        return replace(tried, amount=value) if unknown == "mass" and self.sign else tried


class Bodies:
    """One workbook on one road."""

    def __init__(self, book: Book, road: Road) -> None:
        self.book, self.road = book, road
        self.unknown = book.text("sheet.unknown")
        begun = book.begun()
        numbers = range(1, book.shape.bodies + 1)
        self.bodies: Mapping[str, Body] = {
            f"body{number}.": _body(book, f"body{number}.") for number in numbers if f"body{number}" in begun
        }

    def walk(self) -> None:
        """Note every balance of the workbook, in the order of the sheet."""
        gains = [one for at, body in self.bodies.items() if (one := self._gain(at, body)) is not None]
        given = self._given()
        largest = max((abs(one.value) for one in gains), default=0.0)
        if gains:
            self.road.put("sheet.heat_gained", total(gains, largest))
        left = self._left(gains, given, largest)
        uncertainty = self._uncertainty()
        self._closure(gains, given, left)
        if self.unknown == "heater" and gains:
            lost = self.road.before("sheet.loss_heat") or Measure(0.0)
            self.road.put("sheet.solved_heater", total([*gains, lost], largest))
            self.road.put("sheet.solved_heater_uncertainty", uncertainty)
        for at, body in self.bodies.items():
            if self.book.text(at + "unknown_here") == "yes" and left is not None:
                self._solve(at, body, left, uncertainty)

    def _gain(self, at: str, body: Body) -> Measure | None:
        """What one body gained, with its parts; J."""
        road = self.road
        if body.sign and body.latent_heat is not None and body.amount is not None:
            road.put(at + "change_heat", Measure(body.sign * body.latent_heat * body.amount))
        elif body.change == "none":
            road.put(at + "change_heat", Measure(0.0))
        if body.mass is not None and body.specific_heat is not None:
            road.put(at + "capacity_before", Measure(body.mass * body.specific_heat))
        for name, value in (("capacity", body.capacity()), ("heat_per_gram", body.per_gram())):
            road.put(at + name, None if value is None else Measure(value))
        own = body.gained()
        gained = road.note(at + "gained", None if own is None else Measure(own, largest=self._term(body, own)))
        if gained is not None and body.mass and body.specific_heat is not None:
            self._gain_uncertainty(at, body.mass, body.specific_heat, gained)
        return gained

    @staticmethod
    def _term(body: Body, gained: float) -> float:
        latent = (body.latent_heat or 0.0) * (body.amount or 0.0) if body.sign else 0.0
        return max(abs(gained), latent)

    def _gain_uncertainty(self, at: str, mass: float, specific_heat: float, gained: Measure) -> None:
        """Two temperatures and one mass, J."""
        of_temperature = self.book.number("sheet.temperature_uncertainty")
        of_mass = self.book.number("sheet.mass_uncertainty")
        if of_temperature is None and of_mass is None:
            return
        both = sqrt(2.0) * mass * specific_heat * (of_temperature or 0.0)
        self.road.put(at + "gained_uncertainty", Measure(hypot(both, gained.value / mass * (of_mass or 0.0))))

    def _given(self) -> Measure | None:
        """What the heater gave less what the room took, J."""
        book, road = self.book, self.road
        volts, amperes, seconds = (book.number(f"sheet.heater_{name}") for name in ("voltage", "current", "time"))
        heat: Measure | None = Measure(0.0)
        if volts is not None or amperes is not None or seconds is not None:
            whole = volts is not None and amperes is not None and seconds is not None
            heat = Measure((volts or 0.0) * ((amperes or 0.0) * (seconds or 0.0))) if whole else None
        power, duration = book.number("sheet.loss_power"), book.number("sheet.loss_time")
        lost: Measure | None = Measure(0.0)
        if power is not None or duration is not None:
            lost = None if power is None or duration is None else Measure(power * duration)
        heater, loss = road.note("sheet.heater_heat", heat), road.note("sheet.loss_heat", lost)
        if heater is None or loss is None:
            return None
        largest = max(abs(heater.value), abs(loss.value))
        return road.note("sheet.heat_given", Measure(heater.value - loss.value, largest=largest))

    def _left(self, gains: list[Measure], given: Measure | None, largest: float) -> Measure | None:
        """What no body is known to have taken, J."""
        if given is None or not gains:
            return None
        own = total([given, *(one.times(-1.0) for one in gains)], max(largest, abs(given.value)))
        return self.road.note("sheet.heat_left", own)

    def _uncertainty(self) -> Measure | None:
        each = [self.road.before(at + "gained_uncertainty") for at in self.bodies]
        known = [one.value for one in each if one is not None]
        return self.road.note("sheet.uncertainty", Measure(hypot(*known)) if known else None)

    def _closure(self, gains: list[Measure], given: Measure | None, left: Measure | None) -> None:
        """Gained less given, of the heat exchanged; and the end temperature at which it would close."""
        capacities = [self.road.before(at + "capacity") for at in self.bodies]
        known = [one for one in capacities if one is not None]
        capacity = self.road.note("sheet.capacity", total(known) if known else None)
        if self.unknown != "none" or given is None or left is None:
            return
        exchanged = (sum(abs(one.value) for one in gains) + abs(given.value)) / 2.0
        if exchanged > 0.0:
            off = sum(one.value for one in gains) - given.value
            self.road.put("sheet.closure", Measure(100.0 * off / exchanged, largest=100.0))
        ends = [body.end for body in self.bodies.values() if body.end is not None]
        if ends and capacity is not None and capacity.value > 0.0:
            closing = sum(ends) / len(ends) + left.value / capacity.value
            self.road.put("sheet.final_temperature", Measure(closing))

    def _solve(self, at: str, body: Body, left: Measure, uncertainty: Measure | None) -> None:
        """The unknown of this body: heat is linear in it, so two trials give it."""
        name = SOLVED.get(self.unknown or "")
        if self.unknown is None or name is None:
            return
        none, one = (body.with_trial(self.unknown, trial).gained() for trial in (0.0, 1.0))
        if none is None or one is None or one == none:
            return
        per_unit = one - none
        own = Measure((left.value - none) / per_unit, largest=max(abs(left.value), abs(none)) / abs(per_unit))
        solved = self.road.note(f"{at}solved_{name}", own)
        if solved is not None and uncertainty is not None:
            width = Measure(uncertainty.value / abs(per_unit))
            self.road.put(f"{at}solved_{name}_uncertainty", width)


def _body(book: Book, at: str) -> Body:
    names = ("mass", "specific_heat", "start", "end")
    m, c, first, last = (book.number(at + name) for name in names)
    changes = ("change_temperature", "latent_heat", "amount_changed", "specific_heat_after")
    temperature, latent, amount, after = (book.number(at + name) for name in changes)
    return Body(m, c, first, last, book.text(at + "change"), temperature, latent, amount, after)


def walk(book: Book, roads: tuple[Road, ...]) -> None:
    """Draw up every balance of a bodies workbook on each road."""
    for road in roads:
        Bodies(book, road).walk()
