"""Balance of the boil-off sheet: power in is vapour out and loss; energy is enthalpy less the work of the vapour."""

from __future__ import annotations

from math import log

import numpy as np

from sheetcal.check.balance.atoms import R
from sheetcal.check.balance.book import Book, Road
from sheetcal.check.balance.measure import Measure, mean
from sheetcal.check.balance.reporting import report

ABSOLUTE_ZERO = -273.15  # degC
STEP = 0.1  # J/g
KILO = 1000.0  # J per kJ, and kPa cm3 per J


class BoilOff:
    """One workbook on one road."""

    def __init__(self, book: Book, road: Road) -> None:
        self.book, self.road = book, road
        self.molar_mass = book.number("sheet.molar_mass")
        self.pressure = book.number("sheet.station_pressure")
        boiling = book.number("sheet.boiling_temperature")
        self.boiling = None if boiling is None else boiling - ABSOLUTE_ZERO

    def walk(self) -> None:
        """Note every balance of the workbook, in the order of the sheet."""
        counted = [run for run in range(1, self.book.shape.places + 1) if self._run(f"run{run}.")]
        measured = self._measured(counted)
        enthalpy = self._enthalpy(measured)
        work = self._work()
        if enthalpy is not None:
            self._molar("enthalpy", enthalpy)
            report(self.road, "sheet.enthalpy_reported", enthalpy, self.book.constant("vaporisation_step", STEP))
        energy = self._energy(enthalpy, work)
        self._amounts(enthalpy, energy)

    def _run(self, at: str) -> bool:
        """One power: what the heater gave, what was condensed; whether the run counts."""
        names = ("voltage", "current", "duration", "condensate_mass")
        volts, amperes, seconds, grams = (self.book.number(at + name) for name in names)
        if volts is not None and amperes is not None:
            self.road.put(at + "power", Measure(volts * amperes))
            if seconds is not None:
                self.road.put(at + "electrical_heat", Measure(volts * (amperes * seconds)))
        if grams is not None and seconds:
            self.road.put(at + "rate", Measure(grams / seconds))
        heat = self.road.before(at + "electrical_heat")
        if heat is not None and grams:
            self.road.put(at + "enthalpy_single", Measure(heat.value / grams))
        return self.book.text(at + "state") == "valid"

    def _measured(self, counted: list[int]) -> Measure | None:
        """Enthalpy from the powers: each power is the vapour's heat and one loss; least squares over all."""
        road = self.road
        pairs = [(road.before(f"run{run}.rate"), road.before(f"run{run}.power")) for run in counted]
        known = [(rate.value, power.value) for rate, power in pairs if rate is not None and power is not None]
        single = [one for run in counted if (one := road.before(f"run{run}.enthalpy_single")) is not None]
        alone = road.note("sheet.enthalpy_single", mean(single) if single else None)
        free = None
        if len({rate for rate, _ in known}) > 1:
            rates, powers = np.array(known).T
            solution = np.linalg.lstsq(np.column_stack((rates, np.ones_like(rates))), powers, rcond=None)[0]
            enthalpy, loss = (float(one) for one in solution)
            free = road.note("sheet.enthalpy_from_powers", Measure(enthalpy))
            road.put("sheet.loss", Measure(loss, largest=float(powers.max())))
        return road.note("sheet.enthalpy_measured", alone if free is None else free)

    def _enthalpy(self, measured: Measure | None) -> Measure | None:
        """By the source chosen, J/g; measured against table where both are there."""
        typed = self.book.number("sheet.enthalpy_table")
        table = None if typed is None else Measure(typed)
        if measured is not None and table is not None and table.value != 0.0:
            off = 100.0 * (measured.value - table.value) / table.value
            self.road.put("sheet.enthalpy_deviation", Measure(off, largest=100.0))
        line = self.road.note("sheet.enthalpy_from_line", self._line())
        by_source = {"measured here": measured, "table": table, "vapour-pressure line": line}
        return self.road.note("sheet.enthalpy", by_source.get(self.book.text("sheet.enthalpy_source") or ""))

    def _line(self) -> Measure | None:
        """Clausius and Clapeyron: the slope of ln p against 1/T, J/g."""
        names = ("pressure1", "temperature1", "pressure2", "temperature2")
        p1, t1, p2, t2 = (self.book.number(f"sheet.line_{name}") for name in names)
        if p1 is None or t1 is None or p2 is None or t2 is None or not self.molar_mass or t1 == t2:
            return None
        warm, warmer = t1 - ABSOLUTE_ZERO, t2 - ABSOLUTE_ZERO
        slope = (log(p2) - log(p1)) * warm * warmer / (warmer - warm)
        return Measure(R * slope / self.molar_mass)

    def _work(self) -> Measure | None:
        """Work against the room as liquid turns to vapour, J/g, by the form chosen."""
        book, road = self.book, self.road
        density = book.number("sheet.liquid_density")
        liquid = road.note("sheet.liquid_volume", Measure(1.0 / density) if density else None)
        forms = {
            "measured volumes": road.note("sheet.work_measured", self._work_of(liquid, self._typed_volume())),
            "ideal gas": road.note("sheet.work_ideal", self._work_of(Measure(0.0), self._ideal_volume())),
            "second virial": road.note("sheet.work_virial", self._work_of(liquid, self._virial_volume())),
        }
        work = road.note("sheet.work", forms.get(book.text("sheet.work_form") or ""))
        if work is not None and liquid is not None and self.pressure:
            vapour = KILO * work.value / self.pressure + liquid.value
            road.put("sheet.liquid_share", Measure(100.0 * liquid.value / vapour))
        return work

    def _typed_volume(self) -> float | None:
        return self.book.number("sheet.vapour_volume")

    def _ideal_volume(self) -> float | None:
        """Of the ideal vapour, cm3/g; at no pressure typed any will do, for its work is the same."""
        if self.boiling is None or not self.molar_mass:
            return None
        return KILO * R * self.boiling / (self.pressure or 100.0) / self.molar_mass

    def _virial_volume(self) -> float | None:
        """Of a vapour with a second virial coefficient in powers of the pressure, cm3/g."""
        ideal, virial = self._ideal_volume(), self.book.number("sheet.virial")
        if ideal is None or virial is None or not self.molar_mass or self.pressure is None:
            return None
        return ideal + virial / self.molar_mass

    def _work_of(self, liquid: Measure | None, vapour: float | None) -> Measure | None:
        """Pressure times the gain of volume, J/g; volumes in cm3/g."""
        if liquid is None or vapour is None:
            return None
        pressure = self.pressure or 100.0
        return Measure(pressure * (vapour - liquid.value) / KILO, largest=pressure * vapour / KILO)

    def _energy(self, enthalpy: Measure | None, work: Measure | None) -> Measure | None:
        """First law: what the heat leaves in the vapour once its work is done, J/g."""
        if enthalpy is None:
            return None
        road = self.road
        ideal_work = road.before("sheet.work_ideal")
        ideal = None if ideal_work is None else enthalpy.value - ideal_work.value
        if ideal is not None:
            road.put("sheet.energy_ideal", Measure(ideal, largest=enthalpy.value))
        own = None if work is None else Measure(enthalpy.value - work.value, largest=enthalpy.value)
        energy = road.note("sheet.energy", own)
        if energy is None:
            return None
        self._molar("energy", energy)
        report(road, "sheet.energy_reported", energy, self.book.constant("vaporisation_step", STEP))
        of_ideal = road.before("sheet.energy_ideal")
        if of_ideal is not None and energy.value != 0.0:
            off = 100.0 * (of_ideal.value - energy.value) / energy.value
            road.put("sheet.ideal_deviation", Measure(off, largest=100.0))
        return energy

    def _molar(self, name: str, value: Measure) -> None:
        if self.molar_mass is not None:
            self.road.put(f"sheet.{name}_molar", value.times(self.molar_mass / KILO))

    def _amounts(self, enthalpy: Measure | None, energy: Measure | None) -> None:
        """Totals for the amount boiled, kJ."""
        book, road = self.book, self.road
        names = ("amount_mass", "amount_volume", "amount_density")
        mass, volume, density = (book.number(f"sheet.{name}") for name in names)
        if mass is None and volume is not None and density is not None:
            mass = volume * density
        amount = road.note("sheet.amount", None if mass is None else Measure(mass))
        for name, value in (("total_enthalpy", enthalpy), ("total_energy", energy)):
            if amount is not None and value is not None:
                road.put(f"sheet.{name}", value.times(amount.value / KILO))


def walk(book: Book, roads: tuple[Road, ...]) -> None:
    """Draw up every balance of a boil-off workbook on each road."""
    for road in roads:
        BoilOff(book, road).walk()
