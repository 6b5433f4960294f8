"""Balance of the calibration sheet: what the certified charge and its helpers gave, over the rise they made."""

from __future__ import annotations

from collections.abc import Callable
from math import hypot, sqrt

from sheetcal.check.balance import atoms
from sheetcal.check.balance.acids import TENTH
from sheetcal.check.balance.book import Book, Road
from sheetcal.check.balance.conditions import condition_factor
from sheetcal.check.balance.firing import (
    LEAST_HEAT,
    acid_volume,
    corrected_rises,
    ignition_heat,
    thread_heat,
    weighed_mass,
    wire_heat,
)
from sheetcal.check.balance.measure import Measure, mean, scatter, total
from sheetcal.check.balance.reporting import report
from sheetcal.check.balance.weighing import certified_value

STEP = 0.1  # J/K
COVERAGE = 2.0


class Calibration:
    """One workbook; what both roads need is gathered once."""

    def __init__(self, book: Book) -> None:
        self.book = book
        begun = book.begun()
        self.runs = [run for run in range(1, book.shape.places + 1) if f"run{run}" in begun]
        self.rises = corrected_rises(book, self.runs)
        self.vessel = book.text("sheet.vessel")

    def walk(self, road: Road) -> None:
        """Note every balance of the workbook, in the order of the sheet."""
        lot = self.book.text("sheet.certified_lot")
        value = certified_value(self.book, road, lot, "sheet.mass_factor", "sheet.certified_value")
        for run in self.runs:
            self._run(road, run, value)
        self._sheet(road)

    def _run(self, road: Road, run: int, value: Measure | None) -> None:
        at = f"run{run}."
        mass = road.note(at + "mass", weighed_mass(self.book, at, "pellet_mass"))
        rise = road.note(at + "corrected_rise", self.rises.get(run))
        pellet = self._pellet(road, at, mass, value)
        wire = road.note(at + "wire_heat", wire_heat(self.book, at))
        thread = road.note(at + "thread_heat", thread_heat(self.book, at))
        nitric = road.note(at + "nitric_heat", self._nitric(road, at))
        sources = [one for one in (pellet, wire, thread, nitric) if one is not None]
        if len(sources) == 4 and rise is not None and rise.value != 0.0:
            self._heat_capacity(road, at, [*sources, Measure(ignition_heat(self.book, at))], rise)

    def _pellet(self, road: Road, at: str, mass: Measure | None, value: Measure | None) -> Measure | None:
        """Heat of the certified charge at the conditions of this run, J."""
        if mass is None or value is None:
            return None
        volume = self.book.looked_up("vessel", "id", self.vessel, "volume")
        factor = condition_factor(self.book, at, volume, mass.value)
        used = road.note(at + "condition_factor", factor)
        own = None if used is None else used.times(mass.value * value.value)
        return road.note(at + "pellet_heat", own)

    def _nitric(self, road: Road, at: str) -> Measure | None:
        """Heat of the nitric acid by its moles, J; a fixed heat where nothing was titrated."""
        acid = road.note(at + "acid_volume", acid_volume(self.book, at))
        if acid is None:
            fixed = self.book.number(at + "nitric_fixed")
            return None if fixed is None else Measure(fixed)
        exact = TENTH * atoms.NITRIC_ENERGY
        doubt = abs(self.book.constant("nitric_heat", exact) - exact) * acid.value
        return Measure(exact * acid.value, doubt, self._expected(road, at))

    def _expected(self, road: Road, at: str) -> float:
        """Heat of the whole run, J: its largest term is that of the pellet."""
        pellet = road.before(at + "pellet_heat")
        return LEAST_HEAT if pellet is None else pellet.value

    def _heat_capacity(self, road: Road, at: str, sources: list[Measure], rise: Measure) -> None:
        """The heat set free is what the calorimeter took up over the rise."""
        heat = total(sources)
        own = Measure(
            heat.value / rise.value,
            abs(heat.tolerance / rise.value) + abs(heat.value) * rise.tolerance / rise.value**2,
        )
        filled = road.note(at + "heat_capacity_as_filled", own)
        released = road.note(at + "total_heat", heat._replace(largest=heat.value))
        if released is not None:
            road.put(at + "energy", released.times(0.001))
        if filled is not None:
            road.put(at + "effective_heat_capacity", self._at_reference(at, filled))

    def _at_reference(self, at: str, filled: Measure) -> Measure:
        """With the reference water in place of the water that was there, J/K."""
        water, reference = self.book.number(at + "calorimeter_water"), self.book.number("sheet.water_reference")
        if water is None or reference is None:
            return filled
        specific_heat = self.book.constant("water_specific_heat", 4.18)
        dry_parts = filled.value - water * specific_heat
        return filled._replace(value=dry_parts + reference * specific_heat)

    def _sheet(self, road: Road) -> None:
        counted = [run for run in self.runs if self.book.text(f"run{run}.state") == "valid"]
        values = [one for run in counted if (one := road.before(f"run{run}.effective_heat_capacity")) is not None]
        energies = [one for run in counted if (one := road.before(f"run{run}.energy")) is not None]
        for name, choose in (("energy_low", min), ("energy_high", max)):
            if energies:
                road.put(f"sheet.{name}", _extreme(choose, energies))
        if not values:
            return
        found = road.note("sheet.effective_heat_capacity", mean(values))
        if found is not None:
            self._mean(road, found)
            self._scatter(road, found, values)

    def _mean(self, road: Road, found: Measure) -> None:
        """The mean as reported, against the value in force, and each run against it."""
        step = self.book.constant("heat_capacity_step", STEP)
        report(road, "sheet.effective_heat_capacity_reported", found, step)
        in_force = self.book.looked_up("vessel", "id", self.vessel, "heat_capacity")
        if in_force:
            road.put("sheet.change", _percent_off(found, Measure(in_force)))
        for run in self.runs:
            value = road.before(f"run{run}.effective_heat_capacity")
            if value is not None and found.value != 0.0:
                road.put(f"run{run}.deviation_from_mean", _percent_off(value, found))

    def _scatter(self, road: Road, found: Measure, values: list[Measure]) -> None:
        """Scatter of the runs and, with the certificate, uncertainty of their mean."""
        if len(values) < 2 or found.value == 0.0:
            return
        deviation = road.note("sheet.deviation", scatter(values))
        if deviation is None:
            return
        own = scatter(values)
        share = 100.0 * own.value / found.value
        road.put("sheet.relative_deviation", Measure(share, 100.0 * own.tolerance / found.value, 100.0))
        lot = self.book.text("sheet.certified_lot")
        printed = [self.book.looked_up("certified", "lot", lot, name) for name in ("value", "uncertainty", "coverage")]
        value, wide, coverage = printed
        if not value or wide is None or not coverage:
            return
        of_mean = deviation.value / sqrt(len(values))
        of_certificate = found.value * wide / (coverage * value)
        doubt = deviation.tolerance / sqrt(len(values)) + found.tolerance * wide / (coverage * value)
        uncertainty = road.note("sheet.uncertainty", Measure(hypot(of_mean, of_certificate), doubt, found.value))
        if uncertainty is not None:
            factor = self.book.constant("coverage_factor", COVERAGE)
            road.put("sheet.expanded_uncertainty", uncertainty.times(factor, found.value))


def _extreme(choose: Callable[..., Measure], parts: list[Measure]) -> Measure:
    """The smallest or largest, which may be any part within the tolerances."""
    found: Measure = choose(parts, key=lambda one: one.value)
    return found._replace(tolerance=max(one.tolerance for one in parts))


def _percent_off(value: Measure, reference: Measure) -> Measure:
    off = 100.0 * (value.value - reference.value) / reference.value
    return Measure(off, 100.0 * (value.tolerance + reference.tolerance) / abs(reference.value), 100.0)


def walk(book: Book, roads: tuple[Road, ...]) -> None:
    """Draw up every balance of a calibration workbook on each road."""
    calibration = Calibration(book)
    for road in roads:
        calibration.walk(road)
