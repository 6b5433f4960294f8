"""Balance of the fuel sheet: heat of each run, mass of each basis, elements and first law for the net values."""

from __future__ import annotations

from collections.abc import Mapping
from itertools import chain

from sheetcal.check.balance import composition, net
from sheetcal.check.balance.acids import Acids, Wash, nitric_heat, sulfuric_heat
from sheetcal.check.balance.book import Book, Road
from sheetcal.check.balance.firing import (
    LEAST_HEAT,
    acid_volume,
    corrected_rises,
    heat_capacity,
    ignition_heat,
    thread_heat,
    weighed_mass,
    wire_heat,
)
from sheetcal.check.balance.measure import Measure, mean, middle, total, widest
from sheetcal.check.balance.weighing import certified_value

ELEMENTS_IN_WASH = ("sulfur", "chlorine")
MEDIAN_FROM = 4  # runs: fewer are fired again where they do not agree
# 95 % points of the range of n normal values over their deviation, as ISO 5725-6 prints them: two, then 4 to 20.
RANGE_OF_TWO = 2.8
RANGE_OF_CHANCE = (3.6, 3.9, 4.0, 4.2, 4.3, 4.4, 4.5, 4.6, 4.6, 4.7, 4.7, 4.8, 4.8, 4.9, 4.9, 5.0, 5.0)
TAKEN_OFF: Mapping[str, tuple[str, ...]] = {
    "nothing": (),
    "wire": ("fuse",),
    "wire and acids": ("fuse", "acids"),
    "wire and acids and aids": ("fuse", "acids", "aids"),
}
SOURCES = 5  # wire, thread, nitric and sulfuric acid, aids: all must be known before the fuel's share is


class Fuel:
    """One workbook; what both roads need is gathered once."""

    def __init__(self, book: Book) -> None:
        self.book = book
        self.acids = Acids.of(book)
        begun = book.begun()
        self.samples = {
            sample: [run for run in book.runs_of(sample) if f"run{run}" in begun]
            for sample in range(1, book.shape.samples + 1)
        }
        self.rises: Mapping[int, Measure] = corrected_rises(book, chain.from_iterable(self.samples.values()))

    def walk(self, road: Road) -> None:
        """Note every balance of the workbook, in the order of the sheet."""
        for sample, runs in self.samples.items():
            self._sample(road, sample, runs)

    def _sample(self, road: Road, sample: int, runs: list[int]) -> None:
        head = f"sample{sample}."
        counted = [run for run in runs if self.book.text(f"run{run}.state") == "valid"]
        moisture = self._moisture_for_basis(head, counted)
        dry = composition.dry_elements(self.book, road, head, moisture)
        target = self._control_target(road, head)
        for run in runs:
            self._run(road, head, run, dry, target)
        self._values(road, head, counted)
        net.values(self.book, road, head, dry, self._heat_per_gram(road, head, counted))

    def _moisture_for_basis(self, head: str, counted: list[int]) -> float | None:
        """The sample's own analysis moisture, else the mean of the runs'."""
        own = composition.counted(self.book, head, "analysis_moisture")
        if own is not None:
            return own
        each = [self._moisture(head, run) for run in counted]
        known = [one for one in each if one is not None]
        return sum(known) / len(known) if known else None

    def _moisture(self, head: str, run: int) -> float | None:
        own = self.book.number(f"run{run}.analysis_moisture")
        return composition.counted(self.book, head, "analysis_moisture") if own is None else own

    def _run(self, road: Road, head: str, run: int, dry: composition.Dry, target: Measure | None) -> None:
        """Heat balance of one firing."""
        at = f"run{run}."
        mass = road.note(at + "mass", weighed_mass(self.book, at, "sample_mass"))
        rise = self.rises.get(run) or self._rise_behind_value(road, head, run, dry, mass)
        heat = self._total_heat(road, run, rise)
        wire = road.note(at + "wire_heat", wire_heat(self.book, at))
        thread = road.note(at + "thread_heat", thread_heat(self.book, at))
        aids = self._aids(road, at, heat)
        nitric, sulfuric = self._acids(road, head, run, dry, mass, heat)
        known = [one for one in (wire, thread, nitric, sulfuric, aids) if one is not None]
        if heat is None or mass is None or mass.value <= 0.0 or len(known) < SOURCES:
            return
        others = [*known, Measure(ignition_heat(self.book, at))]
        of_fuel = total([heat, *(one.times(-1.0) for one in others)])
        self._gross(road, head, run, of_fuel.times(1.0 / mass.value, heat.value / mass.value), target)

    def _rise_behind_value(
        self, road: Road, head: str, run: int, dry: composition.Dry, mass: Measure | None
    ) -> Measure | None:
        """The rise an instrument must have seen that shows only its gross value, K.

        Its heat is what it ascribes to the fuel and all it has taken off for other sources already.
        """
        at, book = f"run{run}.", self.book
        shown, capacity = book.number(at + "instrument_gross"), book.number(at + "instrument_heat_capacity")
        taken = TAKEN_OFF.get(book.text(at + "instrument_includes") or "")
        if book.text(at + "rise_source") != "value only" or None in (shown, capacity, mass, taken):
            return None
        assert shown is not None and capacity is not None and mass is not None and taken is not None
        parts: list[Measure | None] = [Measure(shown * mass.value)]
        if "fuse" in taken:
            parts += [wire_heat(book, at), thread_heat(book, at), Measure(ignition_heat(book, at))]
        if "acids" in taken:
            parts += self._acids(road, head, run, dry, mass, None)
        if "aids" in taken:
            parts += [self._aid_heat(at + "aid1"), self._aid_heat(at + "aid2")]
        known = [one for one in parts if one is not None]
        return total(known).times(1.0 / capacity) if len(known) == len(parts) and capacity > 0.0 else None

    def _total_heat(self, road: Road, run: int, own_rise: Measure | None) -> Measure | None:
        """Heat that warmed vessel, water and parts by the rise."""
        at = f"run{run}."
        rise = road.note(at + "corrected_rise", own_rise)
        vessel = self.book.looked_up("vessel", "id", self.book.text(at + "vessel"), "heat_capacity")
        own = None if vessel is None else heat_capacity(self.book, at, vessel)
        capacity = road.note(at + "heat_capacity_used", own)
        heat = None if rise is None or capacity is None else rise.times(capacity.value)
        return road.note(at + "total_heat", heat)

    def _aid_heat(self, aid: str) -> Measure | None:
        lot, mass = self.book.text(aid + "_lot"), self.book.number(aid + "_mass")
        if lot is None:
            return Measure(0.0) if mass is None else None
        heat = self.book.looked_up("aid", "lot", lot, "heat")
        return None if heat is None or mass is None else Measure(heat * mass)

    def _aids(self, road: Road, at: str, heat: Measure | None) -> Measure | None:
        """Heat of all that was burnt along, J, and its share of the whole."""
        each = [road.note(f"{at}{aid}_heat", self._aid_heat(at + aid)) for aid in ("aid1", "aid2")]
        known = [aid for aid in each if aid is not None]
        aids = road.note(at + "aid_heat", total(known) if len(known) == len(each) else None)
        if aids is not None and heat is not None and heat.value != 0.0:
            share = 100.0 * aids.value / heat.value
            road.put(at + "aid_share", Measure(share, abs(share) * heat.tolerance / abs(heat.value), 100.0))
        return aids

    def _acids(
        self,
        road: Road,
        head: str,
        run: int,
        dry: composition.Dry,
        mass: Measure | None,
        heat: Measure | None,
    ) -> tuple[Measure | None, Measure | None]:
        """Nitric and sulfuric heat; no tolerance wider than the total heat allows."""
        at, book = f"run{run}.", self.book
        acid = road.note(at + "acid_volume", acid_volume(book, at))
        moisture = self._moisture(head, run)
        there = {
            name: road.note(f"{at}{name}_analysed", composition.as_analysed(dry.get(name), moisture))
            for name in ELEMENTS_IN_WASH
        }
        if book.text(head + "role") == "control" and not self._control_is_dry(head):
            there["sulfur"] = Measure(0.0)  # a certified substance holds none
        typed = (
            "barium_volume",
            "back_titre",
            "wash_volume",
            "nitrate",
            "sulfate",
            "nitric_fixed",
            "sulfuric_fixed",
        )
        numbers = [book.number(at + name) for name in typed]
        grams = None if mass is None else mass.value
        wash = Wash(book.text(at + "wash_route"), acid, grams, there["sulfur"], there["chlorine"], *numbers)
        found = nitric_heat(wash, self.acids), sulfuric_heat(wash, self.acids)
        largest = LEAST_HEAT if heat is None else heat.value
        nitric, sulfuric = (None if one is None else one._replace(largest=max(one.largest, largest)) for one in found)
        return road.note(at + "nitric_heat", nitric), road.note(at + "sulfuric_heat", sulfuric)

    def _gross(self, road: Road, head: str, run: int, own: Measure, target: Measure | None) -> None:
        """Gross value of the run as analysed and dry, and how far a control lies off its target."""
        at = f"run{run}."
        gross = road.note(at + "gross_run", own)
        moisture = self._moisture(head, run)
        dry = None
        if gross is not None and moisture is not None and moisture < 100.0:
            share = (100.0 - moisture) / 100.0
            dry = road.note(at + "gross_run_dry", gross.times(1.0 / share, own.largest / share))
        if self.book.text(head + "role") != "control" or target is None or target.value == 0.0:
            return
        found = dry if self._control_is_dry(head) else gross
        if found is not None:
            off = 100.0 * (found.value - target.value) / target.value
            road.put(at + "control_deviation", Measure(off, 100.0 * found.tolerance / target.value, 100.0))

    def _control_is_dry(self, head: str) -> bool:
        row = self.book.row("certified", "lot", self.book.text(head + "control_lot"))
        return row is not None and row.get("basis") == "dry"

    def _control_target(self, road: Road, head: str) -> Measure | None:
        """The book value per gram as this sheet weighs, in air."""
        lot = self.book.text(head + "control_lot")
        return certified_value(self.book, road, lot, head + "control_mass_factor", head + "control_target")

    def _values(self, road: Road, head: str, counted: list[int]) -> None:
        """Means and range of the runs that count."""
        heat = self._heat_per_gram(road, head, counted)
        analysed = [one for run in counted if (one := road.before(f"run{run}.gross_run")) is not None]
        dry = [one for run in counted if (one := road.before(f"run{run}.gross_run_dry")) is not None]
        as_dry = self.book.text(head + "repeatability_basis") == "dry"
        on_basis, largest = (dry, heat.dry) if as_dry else (analysed, heat.analysed)
        span = road.note(head + "range", widest(on_basis, largest) if len(on_basis) > 1 else None)
        final = middle if self._apart(head, span, len(on_basis)) else mean
        if analysed:
            road.put(head + "gross_analysed", final(analysed, heat.analysed))
        if dry:
            road.put(head + "gross_dry", final(dry, heat.dry))

    def _apart(self, head: str, span: Measure | None, n: int) -> bool:
        """Whether so many runs lie further apart than chance lets the limit of two grow to."""
        limit = self.book.number(head + "repeatability_limit")
        if limit is None or span is None or not MEDIAN_FROM <= n < MEDIAN_FROM + len(RANGE_OF_CHANCE):
            return False
        return span.value > limit * RANGE_OF_CHANCE[n - MEDIAN_FROM] / RANGE_OF_TWO

    def _heat_per_gram(self, road: Road, head: str, counted: list[int]) -> net.HeatPerGram:
        """Mean total heat per gram of sample, the largest term of every value of the sample."""
        analysed, dry = [], []
        for run in counted:
            heat, mass = road.before(f"run{run}.total_heat"), road.before(f"run{run}.mass")
            if heat is None or mass is None or mass.value <= 0.0:
                continue
            analysed.append(heat.value / mass.value)
            moisture = self._moisture(head, run)
            if moisture is not None and moisture < 100.0:
                dry.append(100.0 * analysed[-1] / (100.0 - moisture))
        return net.HeatPerGram(_plain_mean(analysed), _plain_mean(dry))


def _plain_mean(values: list[float]) -> float:
    return sum(values) / len(values) if values else 0.0


def walk(book: Book, roads: tuple[Road, ...]) -> None:
    """Draw up every balance of a fuel workbook on each road."""
    fuel = Fuel(book)
    for road in roads:
        fuel.walk(road)
