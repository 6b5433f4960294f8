# ruff: noqa: RUF009 - the calls in dataclass defaults make dataclass fields
"""The laboratory as its lab file states it: people, instruments, dated calibrations, lots, limits."""

from collections.abc import Mapping
from dataclasses import dataclass, field
from datetime import date, datetime, timedelta
from types import MappingProxyType
from zoneinfo import ZoneInfo

from sheetcal import profiles
from sheetcal.errors import BadInput
from sheetcal.inputs import schema
from sheetcal.inputs.text import TextFile, nearest
from sheetcal.model import Finding
from sheetcal.profiles import Profile, Range

RISES = ("record", "three readings", "instrument", "adiabatic", "value only")
WATERS = ("constant water", "constant total", "instrument")
WASHES = ("total acid", "barium", "ions", "fixed", "none")
BASES = ("as analysed", "dry")
IN_AIR, IN_VACUUM = "in air", "in vacuum"
# J/g of benzoic acid by mass convention: what certificates state, in each, within a few J/g.
BENZOIC_BANDS = {IN_VACUUM: (26420.0, 26445.0), IN_AIR: (26445.0, 26470.0)}
BELOW_LIMIT = {"limit": 1.0, "half": 0.5, "zero": 0.0}


@dataclass(frozen=True, slots=True)
class Block:
    """A block of the lab file; `line` is where it begins."""

    line: int = field(default=0, kw_only=True)


@dataclass(frozen=True, slots=True)
class Laboratory(Block):
    """[laboratory]; altitude m, pressure kPa as read in the room."""

    name: str = schema.text()
    time_zone: str = schema.text()
    altitude: float | None = schema.quantity("m", None)
    station_pressure: float | None = schema.quantity("kPa", None, low=0)
    mass_convention: str = schema.choice(IN_AIR, IN_VACUUM)
    version: str = schema.text("")
    author: str = schema.text("")
    approved_by: str = schema.text("")


@dataclass(frozen=True, slots=True)
class Person(Block):
    """[[person]]: who may do what, until when (no end: None)."""

    id: str = schema.text()
    name: str = schema.text("")
    may: tuple[str, ...] = schema.texts()
    valid_until: date | None = schema.day(None)


@dataclass(frozen=True, slots=True)
class Calorimeter(Block):
    """[[calorimeter]]; times in min (step s), temperatures degC, masses g, cooling constant 1/min.

    `firing_wire` or `thread` is the lot usually taken, `ignition` the energy of a firing in J, `wash` the
    usual route of the acids: what a new workbook prints in, and a run may change.
    """

    id: str = schema.text()
    rise: str = schema.choice(*RISES)
    jacket: str = schema.text("")
    jacket_temperature: float | None = schema.quantity("degC", None)
    step: float | None = schema.quantity("s", None, low=0)
    resolution: float | None = schema.quantity("K", None, low=0)
    main_period: float | None = schema.quantity("min", None, low=0)
    fore_period: float | None = schema.quantity("min", None, low=0)
    after_period: float | None = schema.quantity("min", None, low=0)
    cooling_constant: float | None = schema.quantity("1/min", None, low=0)
    cooling_constant_tolerance: float | None = schema.quantity("%", None, low=0)
    convergence_temperature: float | None = schema.quantity("degC", None)
    water: str = schema.choice(*WATERS)
    water_reference: float | None = schema.quantity("g", None, low=0)
    water_tolerance: float | None = schema.quantity("g", None, low=0)
    thermometer: str = schema.text("")
    firing_wire: str = schema.text("")
    thread: str = schema.text("")
    ignition: float | None = schema.quantity("J", None)
    wash: str = schema.choice(*WASHES, default="")
    log_clock: str = schema.text("")
    log_clock_offset: float = schema.quantity("s", 0.0)


@dataclass(frozen=True, slots=True)
class Vessel(Block):
    """[[vessel]]; volume mL, rated energy kJ, rated fill MPa gauge."""

    id: str = schema.text()
    calorimeter: str = schema.text()
    volume: float | None = schema.quantity("mL", None, low=0)
    rated_energy: float = schema.quantity("kJ", low=0)
    rated_fill: float | None = schema.quantity("MPa", None, low=0)
    firings_at_start: int | None = schema.integer(None)
    firings_counted: datetime | None = schema.start(None)
    firings_allowed: int | None = schema.integer(None)
    test_due: date | None = schema.day(None)

    @property
    def firings_left(self) -> int | None:
        """Firings left when the lab file's count was taken, or None where nobody counts."""
        if self.firings_allowed is None or self.firings_at_start is None:
            return None
        return self.firings_allowed - self.firings_at_start


@dataclass(frozen=True, slots=True)
class Calibration(Block):
    """[[calibration]]: the effective heat capacity of a vessel in its calorimeter, J/K, dated, never edited.

    `sensitivity` is the relative change of the value for a relative change of the certificate.
    """

    vessel: str = schema.text()
    issue: str = schema.text()
    value: float = schema.quantity("J/K", low=0)
    n: int = schema.integer()
    rsd: float | None = schema.quantity("%", None)
    certificate: str = schema.text()
    sensitivity: float = schema.quantity("1", 1.0)
    rise: Range | None = schema.pair("K", None)
    energy: Range | None = schema.pair("kJ", None)
    slope: float | None = schema.quantity("J/K**2", None)
    technique: str = schema.text("")
    valid_from: datetime = schema.start()
    valid_until: datetime = schema.end()
    workbook_sha256: str = schema.text("")
    adopted_by: str = schema.text("")


@dataclass(frozen=True, slots=True)
class Certified(Block):
    """[[certified]]: a certified lot; value and expanded uncertainty U in J/g, density g/cm3."""

    lot: str = schema.text()
    substance: str = schema.text()
    value: float = schema.quantity("J/g", low=0)
    U: float | None = schema.quantity("J/g", None, low=0)
    k: float = schema.quantity("1", 2.0, low=0)
    mass: str = schema.choice(IN_AIR, IN_VACUUM)
    mass_note: str = schema.text("")
    density: float | None = schema.quantity("g/cm3", None, low=0)
    conditions: str = schema.text("")
    certificate: str = schema.text("")
    valid_from: datetime | None = schema.start(None)
    valid_until: datetime | None = schema.end(None)


@dataclass(frozen=True, slots=True)
class Lot(Block):
    """[[lot]]: what burns along; `heat` and its uncertainty `u` are (value, "J/g", "J/cm" or "J")."""

    id: str = schema.text()
    what: str = schema.choice("firing wire", "thread", "aid oil", "capsule", "bag", "tape", "aid")
    heat: tuple[float, str] = schema.heat()
    u: tuple[float, str] | None = schema.heat(None)
    length: float | None = schema.quantity("cm", None, low=0)
    standing: str = schema.choice("derived", "published", "memory", "laboratory", default="laboratory")
    source: str = schema.text("")
    issue: str = schema.text("")
    certificate: str = schema.text("")
    sensitivity: float | None = schema.quantity("1", None)
    valid_from: datetime | None = schema.start(None)
    valid_until: datetime | None = schema.end(None)


@dataclass(frozen=True, slots=True)
class Titrant(Block):
    """[[titrant]]: strength in mol of acid per L, good for `valid` days from the day it was standardised."""

    lot: str = schema.text()
    strength: float = schema.quantity("mol/L", low=0)
    standardised: date = schema.day()
    valid: float = schema.quantity("d", low=0)
    against: str = schema.text("")
    issue: str = schema.text("")

    @property
    def valid_until(self) -> date:
        """The last day on which it may be used."""
        return self.standardised + timedelta(days=int(self.valid))


@dataclass(frozen=True, slots=True)
class Balance(Block):
    """[[balance]]; masses in g."""

    id: str = schema.text()
    resolution: float = schema.quantity("g", low=0)
    check_mass: float | None = schema.quantity("g", None, low=0)
    check_limit: float | None = schema.quantity("g", None, low=0)
    calibrated_until: date | None = schema.day(None)


@dataclass(frozen=True, slots=True)
class Thermometer(Block):
    """[[thermometer]]; resolution K."""

    id: str = schema.text()
    resolution: float | None = schema.quantity("K", None, low=0)
    certificate: str = schema.text("")
    calibrated_until: date | None = schema.day(None)


@dataclass(frozen=True, slots=True)
class Cup(Block):
    """[[cup]]: mixing cup, boil-off pot or solution vessel; heat capacity and U in J/K, mass g."""

    id: str = schema.text()
    what: str = schema.choice("mixing cup", "boil-off pot", "solution vessel")
    heat_capacity: float | None = schema.quantity("J/K", None, low=0)
    U: float | None = schema.quantity("J/K", None, low=0)
    mass: float | None = schema.quantity("g", None, low=0)
    issue: str = schema.text("")
    valid_from: datetime | None = schema.start(None)
    valid_until: datetime | None = schema.end(None)


@dataclass(frozen=True, slots=True)
class Control(Block):
    """[control]: limits in % of the target; the second material's gross value (dry) and U in J/g."""

    material: str = schema.text()
    per: str = schema.text("")
    warning: float | None = schema.quantity("%", None, low=0)
    action: float | None = schema.quantity("%", None, low=0)
    rules: tuple[str, ...] = schema.texts(())
    second: str = schema.text("")
    second_per: str = schema.text("")
    second_gross_dry: float | None = schema.quantity("J/g", None)
    second_U: float | None = schema.quantity("J/g", None, low=0)


@dataclass(frozen=True, slots=True)
class FuelClass(Block):
    """[class.NAME]; heats J/g, `first_mass` g, ranges in mass per cent."""

    name: str = field(kw_only=True)
    profile: str = schema.text()
    title: str = schema.text("")
    r: float | None = schema.quantity("J/g", None, low=0)
    R: float | None = schema.quantity("J/g", None, low=0)
    r_basis: str = schema.choice(*BASES, default="")
    r_origin: str = schema.text("")
    expected: Range | None = schema.pair("J/g", None)
    first_mass: float | None = schema.quantity("g", None, low=0)
    runs: int = schema.integer(2)
    needs_approval: bool = schema.flag(False)
    chlorine_limit: float | None = schema.quantity("%", None)
    aid: str = schema.text("")
    composition_limit: float | None = schema.quantity("%", None, low=0)
    total_moisture: Range | None = schema.pair("%", None)
    analysis_moisture: Range | None = schema.pair("%", None)
    ash: Range | None = schema.pair("%", None)
    carbon: Range | None = schema.pair("%", None)
    hydrogen: Range | None = schema.pair("%", None)
    nitrogen: Range | None = schema.pair("%", None)
    sulfur: Range | None = schema.pair("%", None)
    chlorine: Range | None = schema.pair("%", None)
    oxygen: Range | None = schema.pair("%", None)

    @property
    def ranges(self) -> Mapping[str, Range]:
        """Usual range by quantity: the lab file's own before common practice."""
        quantities = ("total_moisture", "analysis_moisture", "ash", "carbon", "hydrogen", "nitrogen")
        names = (*quantities, "sulfur", "chlorine", "oxygen")
        own = {name: getattr(self, name) for name in names if getattr(self, name) is not None}
        return MappingProxyType({**profiles.class_ranges(self.name), **own})


@dataclass(frozen=True, slots=True)
class Reporting(Block):
    """[reporting]: what a value below its limit counts for, and the unit shown beside MJ/kg."""

    below_limit: str = schema.choice(*BELOW_LIMIT, default="")
    unit: str = schema.text("")


@dataclass(frozen=True)
class Lab:
    """A lab file as read. Moments are local times of the laboratory."""

    source: TextFile
    laboratory: Laboratory
    people: tuple[Person, ...] = ()
    calorimeters: tuple[Calorimeter, ...] = ()
    vessels: tuple[Vessel, ...] = ()
    calibrations: tuple[Calibration, ...] = ()
    certified: tuple[Certified, ...] = ()
    all_lots: tuple[Lot, ...] = ()
    all_titrants: tuple[Titrant, ...] = ()
    balances: tuple[Balance, ...] = ()
    thermometers: tuple[Thermometer, ...] = ()
    cups: tuple[Cup, ...] = ()
    control: Control | None = None
    classes: Mapping[str, FuelClass] = field(default_factory=dict)
    reporting: Reporting = field(default_factory=Reporting)
    overrides: Mapping[str, float] = field(default_factory=dict)
    profile_overrides: Mapping[str, Mapping[str, float]] = field(default_factory=dict)
    ranges: Mapping[str, Range] = field(default_factory=dict)

    @property
    def path(self) -> str:
        """The file, as given."""
        return str(self.source.path)

    @property
    def sha256(self) -> str:
        """Hash of the bytes that were read."""
        return self.source.sha256

    @property
    def zone(self) -> ZoneInfo:
        """The laboratory's time zone."""
        return ZoneInfo(self.laboratory.time_zone)

    def calorimeter(self, name: str | None = None) -> Calorimeter:
        """The calorimeter called `name`; the only one where `name` is None. Raises BadInput."""
        ids = [one.id for one in self.calorimeters]
        if name is None and len(ids) == 1:
            return self.calorimeters[0]
        if name in ids:
            return self.calorimeters[ids.index(name)]
        what = "several calorimeters, none chosen" if name is None else f"no calorimeter '{name}'"
        raise BadInput(self.path, what, nearest(name or "", ids) if ids else "a [[calorimeter]]", "Name one.")

    def vessels_of(self, calorimeter: str) -> tuple[Vessel, ...]:
        """The vessels of a calorimeter, in file order."""
        return tuple(one for one in self.vessels if one.calorimeter == calorimeter)

    def vessel(self, name: str) -> Vessel:
        """The vessel called `name`. Raises BadInput."""
        for one in self.vessels:
            if one.id == name:
                return one
        ids = [one.id for one in self.vessels] or ["a [[vessel]]"]
        raise BadInput(self.path, f"no vessel '{name}'", nearest(name, ids), "Name one of them.")

    def calibration_at(self, vessel: str, moment: datetime) -> Calibration | None:
        """The calibration in force: the last adopted before `moment`, or None where that one has run out."""
        last = self.last_calibration(vessel, moment)
        return last if last is not None and moment <= last.valid_until else None

    def last_calibration(self, vessel: str, moment: datetime) -> Calibration | None:
        """The last calibration adopted before `moment`, also where it has run out."""
        adopted = [one for one in self.calibrations if one.vessel == vessel and one.valid_from <= moment]
        return max(adopted, key=lambda one: (one.valid_from, one.line), default=None)

    def certificate(self, lot: str, moment: datetime | None = None) -> Certified | None:
        """The certified value of a lot as stated last (before `moment`), or None for an unknown lot."""
        stated = [one for one in self.certified if one.lot == lot]
        if moment is not None:
            stated = [one for one in stated if one.valid_from is None or one.valid_from <= moment]
        return max(stated, key=lambda one: (one.valid_from or datetime.min, one.line), default=None)

    def lots(self, what: str | None = None) -> tuple[Lot, ...]:
        """Lots of a kind ("firing wire", "thread", "aid oil", ...), all where None, in file order."""
        return tuple(one for one in self.all_lots if what is None or one.what == what)

    def aids(self) -> tuple[Lot, ...]:
        """Lots that may serve as a combustion aid: everything but what fires the charge."""
        return tuple(one for one in self.all_lots if one.what not in ("firing wire", "thread"))

    def titrants(self) -> tuple[Titrant, ...]:
        """All titrant lots, in file order."""
        return self.all_titrants

    def people_for(self, kind: str, on: date | None = None) -> tuple[Person, ...]:
        """Who may do sheets of a kind (or "release", "adopt", ...), on a day where one is given."""
        able = (one for one in self.people if kind in one.may)
        return tuple(one for one in able if not on or not one.valid_until or on <= one.valid_until)

    def fuel_class(self, name: str) -> FuelClass:
        """The fuel class called `name`. Raises BadInput, naming the nearest."""
        if name in self.classes:
            return self.classes[name]
        expected = nearest(name, self.classes) if self.classes else f"a table [class.{name}]"
        raise BadInput(self.path, f"no fuel class '{name}'", expected, "Correct the name or add the class.")

    def profile(self, name: str) -> Profile:
        """A method profile with this laboratory's overrides and limits. Raises BadInput."""
        values = {**self.overrides, **self.profile_overrides.get(name, {})}
        if self.reporting.below_limit:
            values["below_limit_share"] = BELOW_LIMIT[self.reporting.below_limit]
        if self.control is not None:
            limits = {"control_warning": self.control.warning, "control_action": self.control.action}
            values = {**{name: v for name, v in limits.items() if v is not None}, **values}
        return profiles.load(name).restated(values, f"lab file {self.source.path.name}")

    def faults(self) -> tuple[Finding, ...]:
        """What is wrong with the values themselves: a certified value outside the band of its convention."""
        return tuple(_outside_band(self, one) for one in self.certified if not _inside_band(one))


def _inside_band(one: Certified) -> bool:
    if one.substance.lower() != "benzoic acid":
        return True
    low, high = BENZOIC_BANDS[one.mass]
    return low <= one.value <= high


def _outside_band(lab: Lab, one: Certified) -> Finding:
    """The finding on a benzoic acid value that its mass convention cannot have."""
    low, high = BENZOIC_BANDS[one.mass]
    other = IN_VACUUM if one.mass == IN_AIR else IN_AIR
    other_low, other_high = BENZOIC_BANDS[other]
    likely = f"the value is one {other}: the mass convention was mistaken (0.076 %)"
    return Finding(
        code="certificate-band",
        sort="fault",
        severity="error",
        message=f"{lab.source.where(one.line)}: certified.{one.lot}.value cannot be a value {one.mass}: "
        f"expected {low:.0f} to {high:.0f} J/g. Read the certificate again and correct `mass` or `value`.",
        field=f"certified.{one.lot}.value",
        found=one.value,
        expected=f"{low:.0f} to {high:.0f} J/g",
        likely_cause=likely if other_low <= one.value <= other_high else None,
        action="reject",
    )
