"""One firing at the bench, as calibration and fuel share it: charge, record, wash, and who did it when.

`Rig` holds what is true of the instruments; its methods turn what really happened into what was read.
"""

from __future__ import annotations

from dataclasses import dataclass
from datetime import date
from functools import cached_property

from sheetcal.bench import combustion, curve
from sheetcal.bench.combustion import NITRIC_HEAT, Acids
from sheetcal.bench.curve import Bath, Thermometer, Timing
from sheetcal.bench.draw import Dice, stepped
from sheetcal.bench.facts import Facts, Readings, Row, amount, next_day
from sheetcal.bench.honest import Habits
from sheetcal.errors import BadInput

FIRST_START, BETWEEN, A_DAY = 7 * 60 + 5, 27, 22  # minutes after midnight, minutes, firings a day
BURNT = {"soot": 0.985, "misfire": 0.0}  # share of the heat: soot is carbon that did not burn
INSPECTIONS = {"soot": "soot", "misfire": "misfire"}


@dataclass(frozen=True, slots=True)
class Turn:
    """One run's turn: who fires which vessel when."""

    run: int
    day: date
    start: str
    operator: str
    vessel: str


@dataclass(frozen=True, slots=True)
class Weighed:
    """What the balance said of one charge, and the mass that really lay in the crucible (g)."""

    readings: Readings
    mass: float


@dataclass(frozen=True)
class Rig:
    """A calorimeter as it really is; `vessel` is the one fired every time (empty: they take turns)."""

    facts: Facts
    habits: Habits
    dice: Dice
    vessel: str = ""

    @cached_property
    def vessels(self) -> dict[str, Row]:
        """Rows of the vessel table by id."""
        return {str(row["id"]): row for row in self.facts.table("vessel")}

    def heat_capacity(self, vessel: str) -> float:
        """True effective heat capacity: some 0.02 % off the value in force, the same for every workbook."""
        stated = amount(self.vessels[vessel], "heat_capacity")
        return stated * Dice("vessel", vessel, repr(stated)).normal(0.0002, 1.0)

    def bath(self, vessel: str) -> Bath:
        """The vessel in its jacket: exchange constant within some per cent of the calorimeter's own."""
        own = self.facts.number("sheet.own_cooling_constant", 0.00196)
        return Bath(k=own * Dice("bath", vessel).uniform(0.985, 1.015))

    @cached_property
    def resolution(self) -> float:
        """Smallest step of the thermometer, K."""
        text = self.facts.setting("resolution")
        return float(text) if text else 0.0001

    @cached_property
    def timing(self) -> Timing:
        """Periods as the workbook states them, and the closest step for which the record has rows."""
        fore = 5.0
        stated = self.facts.setting("main_period")
        main = float(stated) if stated else max(6.0, self.facts.number("run1.end_of_main", 14.0) - fore)
        rows = self.facts.record.shape.record_rows or 120
        for step in (30.0, 60.0):
            timing = Timing(step, fore, main)
            if len(timing.times) <= rows and (step == 60.0 or self.resolution < 0.001):
                return timing
        raise BadInput("record rows", f"{rows}", f"at least {len(timing.times)}", "Issue it with more rows.")

    def water(self, dice: Dice) -> tuple[Readings, float]:
        """Calorimeter water as weighed, and how many g it lies off the reference."""
        if self.facts.word("sheet.water_bookkeeping") not in ("constant water", "constant total"):
            return {}, 0.0
        reference = self.facts.number("sheet.water_reference", 2000.0)
        off = 0.0 if self.habits.settings_equal else dice.normal(0.12)
        shown = stepped(reference + off, 0.1)
        return {"calorimeter_water": shown}, off

    def fill(self, dice: Dice) -> Readings:
        """Oxygen and vessel water, inside the method's range."""
        low, high = self.facts.constants.get("fill_low", 2.8), self.facts.constants.get("fill_high", 3.2)
        middle = min((low + high) / 2.0 + 0.02, high - 0.05)
        pressure = middle if self.habits.settings_equal else middle + dice.uniform(-0.03, 0.03)
        water = self.facts.constants.get("vessel_water", 1.0)
        return {"oxygen_pressure": stepped(pressure, 0.01), "vessel_water": stepped(water, 0.1)}

    def fuse(self, run: int, day: date, dice: Dice) -> tuple[Readings, float]:
        """Wire or thread and the ignition pulse, and the heat they really gave, J."""
        printed = self.facts.word(f"run{run}.thread_lot")
        wires, threads = self.facts.usable("wire", day), self.facts.usable("thread", day)
        ignition = self.facts.number(f"run{run}.ignition_energy", 0.0 if wires and not printed else 21.0)
        if wires and not printed:
            readings, heat = self._wire(self._named(wires, self.facts.word(f"run{run}.fuse_lot")), dice)
        elif threads:
            readings, heat = self._thread(self._named(threads, printed), dice)
        else:
            readings, heat = {}, 0.0
        if ignition:
            readings["ignition_energy"] = ignition
        return readings, heat + ignition

    @staticmethod
    def _named(rows: list[Row], lot: str) -> Row:
        """The row of a lot, or the first one."""
        return next((row for row in rows if row["lot"] == lot), rows[0])

    def _wire(self, row: Row, dice: Dice) -> tuple[Readings, float]:
        start = amount(row, "length", 10.0)
        burnt = start * 0.65 if self.habits.pre_cut else start * dice.uniform(0.58, 0.72)
        left = stepped(start - burnt, 0.1)
        return {"fuse_lot": row["lot"], "wire_start": start, "wire_left": left}, burnt * amount(row, "heat")

    @staticmethod
    def _thread(row: Row, dice: Dice) -> tuple[Readings, float]:
        piece = row.get("piece_heat")
        if isinstance(piece, int | float):
            return {"thread_lot": row["lot"]}, piece * dice.normal(0.01, 1.0)
        mass = dice.uniform(0.0035, 0.0075)
        return {"thread_lot": row["lot"], "thread_mass": stepped(mass, 0.0001)}, mass * amount(row, "heat")

    def weigh(self, mass: float, style: str, name: str, dice: Dice) -> Weighed:
        """Crucible and charge: `style` is what is written down (all, net, gross), `name` the net field."""
        step, scatter = self.habits.mass_step, 0.00003
        tare = stepped(dice.uniform(11.0, 13.0), step)
        gross = stepped(tare + mass + dice.normal(scatter), step)
        net = round(gross - tare, 7)
        shown: Readings = {"crucible_tare": tare, "crucible_gross": gross, name: net}
        if style == "net":
            shown = {name: net}
        elif style == "gross":
            del shown[name]
        return Weighed(shown, mass)

    def rise(self, turn: Turn, theta: float, dice: Dice, variant: str = "") -> Readings:
        """The temperature block of one run whose true rise is theta (K), by the source the workbook names."""
        source = self.facts.word(f"run{turn.run}.rise_source", "record")
        bath = self.bath(turn.vessel)
        makers = {
            "record": lambda: self._record(turn, theta, bath, dice, variant),
            "three readings": lambda: _prefixed(
                "three", curve.three_readings(theta, dice, bath, resolution=max(self.resolution, 0.0001))
            ),
            "instrument": lambda: self._instrument(turn, theta, dice),
            "adiabatic": lambda: _prefixed("adiabatic", curve.adiabatic(theta, dice)),
        }
        if source not in makers:
            raise BadInput(f"run{turn.run}.rise_source '{source}'", "gives no rise", ", ".join(makers))
        return {"rise_source": source, **makers[source]()}

    def _record(self, turn: Turn, theta: float, bath: Bath, dice: Dice, variant: str) -> Readings:
        scatter = 1.5 * self.resolution if self.resolution < 0.001 else 0.3 * self.resolution
        meter = Thermometer(scatter, self.resolution)
        kept = curve.record(theta, dice, bath, self.timing, meter, variant=variant)
        return {
            "record_time": list(kept.times),
            "record_temperature": list(kept.temperatures),
            "firing_time": kept.firing_time,
            "end_of_main": kept.end_of_main,
            "record_file": f"{turn.day.isoformat()}-{turn.vessel}-{turn.start.replace(':', '')}.csv",
            "record_vessel": turn.vessel,
            "record_start": f"{turn.day.isoformat()}T{turn.start}",
            "start_temperature": stepped(kept.temperatures[0], 0.01),
            "jacket_temperature": stepped(25.0 + dice.normal(0.01), 0.01),
        }

    def _instrument(self, turn: Turn, theta: float, dice: Dice) -> Readings:
        shown = curve.shown_rise(theta, dice, resolution=min(self.resolution, 0.001)) if theta else 0.0
        return {
            "instrument_rise": shown,
            "start_temperature": stepped(25.4 - theta + dice.uniform(-0.1, 0.2), 0.01),
            "instrument_method": "4",
            "instrument_file": f"{turn.vessel}-{turn.run}.txt",
        }

    def wash(self, route: str, acid: Acids, day: date, dice: Dice) -> Readings:
        """What the wash of the vessel gave by a route, from the acids that were in it."""
        readings: Readings = {"wash_route": route}
        if route == "total acid":
            readings.update(self.titration(acid, day, dice))
        elif route == "barium":
            barium, back = combustion.barium_titration(acid)
            readings.update(barium_volume=stepped(barium, 0.05), back_titre=stepped(back, 0.05))
        elif route == "ions":
            nitrate, sulfate = (stepped(value * dice.normal(0.005, 1.0), 0.1) for value in combustion.ions(acid, 100.0))
            readings.update(wash_volume=100.0, nitrate=nitrate, sulfate=sulfate)
        elif route == "fixed":
            readings.update(nitric_fixed=stepped(acid.nitric * NITRIC_HEAT, 1.0), sulfuric_fixed=0.0)
        return readings

    def titration(self, acid: Acids, day: date, dice: Dice) -> Readings:
        """Burette and titrant for all acid of the wash."""
        lots = self.facts.usable("titrant", day)
        if not lots:
            raise BadInput("table titrant", f"no lot in force on {day.isoformat()}", "a titrant", "Issue it later.")
        lot = lots[-1]
        volume = combustion.titre(acid, amount(lot, "strength")) + dice.normal(0.03)
        start = dice.choice((0.0, 5.0, 10.0))
        return {
            "titrant_lot": lot["lot"],
            "burette_start": start,
            "burette_end": stepped(start + max(0.0, volume), 0.05),
        }

    def turns(self, runs: list[int], dice: Dice, later: dict[int, int]) -> dict[int, Turn]:
        """A turn for every run, in the order given; `later` runs wait so many working days."""
        days = [self.facts.first_day(self.habits.weekend)]
        spread = 1 + len(runs) // A_DAY + max(later.values(), default=0)
        while len(days) < spread:
            days.append(next_day(days[-1], self.habits.weekend))
        order = list(reversed(runs)) if self.habits.unordered else runs
        used: dict[date, int] = {}
        found: dict[int, Turn] = {}
        spent: dict[str, int] = {}
        for run in order:
            day = self._free_day(days[later.get(run, 0) :], used)
            used[day] = used.get(day, 0) + 1
            found[run] = self._turn(run, day, used[day] - 1, spent, later.get(run, 0), dice)
        return found

    @staticmethod
    def _free_day(days: list[date], used: dict[date, int]) -> date:
        return next((day for day in days if used.get(day, 0) < A_DAY), days[-1])

    def _turn(self, run: int, day: date, slot: int, spent: dict[str, int], later: int, dice: Dice) -> Turn:
        fit = [one for one in self.fit(day) if spent.get(one, 0) < amount(self.vessels[one], "firings_left", 1e6)]
        if not fit:
            raise BadInput(
                "table vessel",
                f"none fit to fire on {day.isoformat()}",
                "a vessel in force",
                "Issue it again.",
            )
        vessel = self.vessel or fit[(slot + later) % len(fit)]
        spent[vessel] = spent.get(vessel, 0) + 1
        minutes = FIRST_START + slot * BETWEEN + dice.integer(0, 4)
        people = self.facts.people(day)
        operator = people[0] if self.habits.one_person or len(people) < 2 else people[slot // 6 % len(people)]
        return Turn(run, day, f"{minutes // 60:02d}:{minutes % 60:02d}", operator if people else "analyst", vessel)

    def _calibrated(self, day: date) -> set[str]:
        """Vessels with a heat capacity in force on a day."""
        rows = self.facts.usable("vessel", day)
        return {str(row["id"]) for row in rows if row.get("heat_capacity") is not None}

    def fit(self, day: date) -> list[str]:
        """Vessels fit to fire: pressure test that still holds and, for a fuel, a heat capacity in force."""
        usable = self._calibrated(day) if self.facts.record.kind == "fuel" else set(self.vessels)
        return [
            one
            for one, row in self.vessels.items()
            if one in usable and str(row.get("test_due") or "2999-12-31")[:10] > day.isoformat()
        ]


def _prefixed(prefix: str, values: dict[str, float]) -> Readings:
    return {f"{prefix}_{name}": value for name, value in values.items()}


def head(turn: Turn, state: str = "valid", reason: str = "") -> Readings:
    """Who fired what and when, and whether it counts."""
    inspection = INSPECTIONS.get(reason, "clean") if state == "void" else "clean"
    return {
        "state": state,
        "void_reason": reason,
        "date": turn.day.isoformat(),
        "start": turn.start,
        "operator": turn.operator,
        "inspection": inspection,
    }


def placed(run: int, readings: Readings) -> Readings:
    """The readings of one run under their ids."""
    return {f"run{run}.{name}": value for name, value in readings.items()}
