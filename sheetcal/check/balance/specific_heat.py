"""Balance of the mixing sheet: what liquid and cup took up is what the body gave."""

from __future__ import annotations

from math import sqrt
from typing import NamedTuple

from sheetcal.check.balance import water
from sheetcal.check.balance.book import Book, Road
from sheetcal.check.balance.measure import Measure, mean, scatter
from sheetcal.check.balance.mixing_record import temperatures
from sheetcal.check.balance.reporting import report
from sheetcal.check.balance.rise import read_record

STEP = 0.001  # J/(g K)
STATED_AT = 20.0  # degC, where another liquid's specific heat is stated
FRACTION = 0.63
SUCH_AS_SAMPLE = "sample"


class Warmed(NamedTuple):
    """A liquid that was warmed: heat taken up, J; rise, K; heat capacity, J/K."""

    heat: Measure
    rise: Measure
    capacity: Measure


class Mixing:
    """One workbook; what both roads need is gathered once."""

    def __init__(self, book: Book) -> None:
        self.book = book
        begun = book.begun()
        self.runs = [run for run in range(1, book.shape.places + 1) if f"run{run}" in begun]
        self.roles = {run: book.text(f"run{run}.role") for run in self.runs}
        self.valid = [run for run in self.runs if book.text(f"run{run}.state") == "valid"]

    def walk(self, road: Road) -> None:
        """Note every balance of the workbook: liquids, then the cup, then the bodies."""
        for run in self.runs:
            self._liquid(road, f"run{run}.")
            self._blank(road, f"run{run}.")
        cup = self._cup(road)
        for run in self.runs:
            self._body(road, run, cup)
        self._sheet(road)

    def _liquid(self, road: Road, at: str) -> None:
        """Mass, temperatures and specific heat of the liquid; the mass of the whole against its parts."""
        book = self.book
        empty, filled = book.number(at + "cup_empty"), book.number(at + "cup_with_water")
        if empty is not None and filled is not None:
            road.put(at + "water_mass", Measure(filled - empty, largest=filled))
        end, sample = book.number(at + "end_mass"), book.number(at + "sample_mass")
        if filled is not None and end is not None and sample is not None:
            road.put(at + "mass_sum_error", Measure(end - (filled + sample), largest=end))
        fore, after = self._temperatures(at)
        start, final = road.note(at + "start_temperature", fore), road.note(at + "final_temperature", after)
        if start is None or final is None:
            return
        tolerance = start.tolerance + final.tolerance
        road.put(at + "rise", Measure(final.value - start.value, tolerance, max(start.value, final.value)))
        of_water = road.note(at + "water_specific_heat", water.between(start.value, final.value))
        road.put(at + "liquid_specific_heat", self._specific_heat(of_water, (start.value + final.value) / 2.0))

    def _temperatures(self, at: str) -> tuple[Measure | None, Measure | None]:
        """Liquid before and after, degC: as typed, or from the record."""
        book = self.book
        if book.text(at + "temperature_source") == "typed":
            typed = (book.number(f"{at}{name}_temperature_typed") for name in ("start", "final"))
            first, last = (None if value is None else Measure(value) for value in typed)
            return first, last
        dropped, mixed = book.number(at + "drop_time"), book.number(at + "end_of_mixing")
        if dropped is None or mixed is None:
            return None, None
        record = read_record(book.series(at + "record_time"), book.series(at + "record_temperature"), dropped, mixed)
        found = None if record is None else temperatures(record, book.constant("step_fraction", FRACTION))
        return (None, None) if found is None else found

    def _specific_heat(self, of_water: Measure | None, temperature: float) -> Measure | None:
        """Of the liquid in the cup, J/(g K)."""
        if self.book.text("sheet.liquid") != "other":
            return of_water
        stated = self.book.number("sheet.liquid_specific_heat")
        slope = self.book.number("sheet.liquid_slope") or 0.0
        return None if stated is None else Measure(stated + slope * temperature - slope * STATED_AT)

    def _warmed(self, road: Road, at: str) -> Warmed | None:
        """What the liquid took up; None where its mass, specific heat or rise is not known."""
        names = ("water_mass", "liquid_specific_heat", "rise")
        mass, heat, rise = (road.before(at + name) for name in names)
        if mass is None or heat is None or rise is None:
            return None
        capacity = heat.times(mass.value)
        doubt = capacity.tolerance * abs(rise.value) + capacity.value * rise.tolerance
        return Warmed(Measure(capacity.value * rise.value, doubt), rise, capacity)

    def _blank(self, road: Road, at: str) -> None:
        """Hot water into cold: what the liquid did not take up of its heat, the cup did."""
        hot, final = self.book.number(at + "sample_start_temperature"), road.before(at + "final_temperature")
        if hot is None or final is None:
            return
        road.put(at + "sample_temperature", Measure((hot + final.value) / 2.0, final.tolerance / 2.0))
        of_hot = road.note(at + "hot_water_specific_heat", water.at_mean(final.value, hot))
        mass, warmed = self.book.number(at + "sample_mass"), self._warmed(road, at)
        if of_hot is None or mass is None or warmed is None or warmed.rise.value == 0.0:
            return
        taken, rise, _ = warmed
        given = mass * of_hot.value * (hot - final.value)
        doubt = mass * (of_hot.tolerance * abs(hot - final.value) + of_hot.value * final.tolerance)
        own = (given - taken.value) / rise.value
        width = (doubt + taken.tolerance + abs(own) * rise.tolerance) / abs(rise.value)
        road.put(at + "cup_run", Measure(own, width, abs(given / rise.value)))

    def _cup(self, road: Road) -> Measure | None:
        """Heat capacity of the cup, J/K: given, or the mean of the blank runs that count."""
        book = self.book
        blanks = self._counted(road, "cup_run", "blank")
        measured = road.note("sheet.cup_from_blanks", mean(blanks) if blanks else None)
        typed = book.number("sheet.cup_heat_capacity_typed")
        listed = book.looked_up("cup", "id", book.text("sheet.cup"), "heat_capacity")
        given = listed if typed is None else typed
        source = book.text("sheet.cup_source")
        if source == "blank runs":
            return road.note("sheet.cup_heat_capacity", measured)
        own = None if given is None or source != "given" else Measure(given)
        return road.note("sheet.cup_heat_capacity", own)

    def _body(self, road: Road, run: int, cup: Measure | None) -> None:
        """Heat given by the body per gram and kelvin."""
        at = f"run{run}."
        warmed = self._warmed(road, at)
        hot, mass = self.book.number(at + "sample_start_temperature"), self.book.number(at + "sample_mass")
        final = road.before(at + "final_temperature")
        if cup is None or warmed is None or final is None:
            return
        taken, rise, capacity = warmed
        side = cup.value + capacity.value
        road.put(at + "liquid_side", Measure(side, cup.tolerance + capacity.tolerance))
        if hot is None or not mass or hot == final.value:
            return
        heat = taken.value + cup.value * rise.value
        doubt = taken.tolerance + abs(cup.value) * rise.tolerance + cup.tolerance * abs(rise.value)
        span = hot - final.value
        own = heat / mass / span
        width = doubt / abs(mass * span) + abs(own) * final.tolerance / abs(span)
        found = road.note(at + "specific_heat", Measure(own, width))
        book_value = self.book.number("sheet.check_specific_heat")
        if self.roles[run] == "check body" and found is not None and book_value:
            off = 100.0 * (found.value - book_value) / book_value
            road.put(at + "check_deviation", Measure(off, 100.0 * found.tolerance / book_value, 100.0))

    def _counted(self, road: Road, name: str, role: str) -> list[Measure]:
        """A result of the valid runs of a role."""
        found = (road.before(f"run{run}.{name}") for run in self.valid if self.roles[run] == role)
        return [one for one in found if one is not None]

    def _sheet(self, road: Road) -> None:
        """Mean, scatter and uncertainty of the material's specific heat."""
        values = self._counted(road, "specific_heat", SUCH_AS_SAMPLE)
        heights = self._counted(road, "sample_temperature", SUCH_AS_SAMPLE)
        if heights:
            road.put("sheet.sample_temperature", mean(heights))
        if not values:
            return
        found = road.note("sheet.specific_heat", mean(values))
        if found is None:
            return
        report(road, "sheet.specific_heat_reported", found, self.book.constant("specific_heat_step", STEP))
        if len(values) > 1 and found.value != 0.0:
            self._scatter(road, found, values)

    def _scatter(self, road: Road, found: Measure, values: list[Measure]) -> None:
        own = scatter(values)
        deviation = road.note("sheet.deviation", own)
        share = 100.0 / found.value
        road.put("sheet.relative_deviation", Measure(own.value * share, own.tolerance * abs(share), 100.0))
        uncertainty = None if deviation is None else self._uncertainty(road, found, deviation, len(values))
        used = road.note("sheet.uncertainty", uncertainty)
        if used is not None:
            factor = self.book.constant("coverage_factor", 2.0)
            road.put("sheet.expanded_uncertainty", used.times(factor, found.value))

    def _uncertainty(self, road: Road, found: Measure, deviation: Measure, n: int) -> Measure | None:
        """Of the mean, J/(g K): scatter, thermometer against the rise, cup against the whole liquid side."""
        book = self.book
        typed = book.number("sheet.cup_uncertainty_typed")
        listed = book.looked_up("cup", "id", book.text("sheet.cup"), "uncertainty")
        wide = listed if typed is None else typed
        rises = self._counted(road, "rise", SUCH_AS_SAMPLE)
        sides = self._counted(road, "liquid_side", SUCH_AS_SAMPLE)
        if not rises or not sides:
            return None
        rise, side = mean(rises), mean(sides)
        thermometer = book.constant("thermometer_uncertainty", 0.01)
        of_cup = (wide or 0.0) / book.constant("coverage_factor", 2.0)
        parts = (
            deviation.value / sqrt(n),
            found.value * thermometer * sqrt(2.0) / rise.value,
            found.value * of_cup / side.value,
        )
        doubt = deviation.tolerance + found.tolerance
        return Measure(sqrt(sum(part * part for part in parts)), doubt, found.value)


def walk(book: Book, roads: tuple[Road, ...]) -> None:
    """Draw up every balance of a mixing workbook on each road."""
    mixing = Mixing(book)
    for road in roads:
        mixing.walk(road)
