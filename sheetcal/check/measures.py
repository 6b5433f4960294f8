"""Units as numbers carry them through a formula, and what a part of a formula may stand for."""

from dataclasses import dataclass
from fractions import Fraction
from functools import lru_cache

from sheetcal import units
from sheetcal.check import weights
from sheetcal.check.tree import Node

SAME_SCALE = 1e-9  # two factors closer than this are one unit spelled twice
# The spellings a message uses, most usual first.
_SPELLINGS = (
    "1", "J", "kJ", "MJ", "g", "kg", "mg", "K", "min", "s", "h", "J/g", "kJ/kg", "MJ/kg", "J/K", "kJ/K",
    "J/(g K)", "K/min", "K/s", "1/min", "1/s", "J/kJ", "kJ/J", "mL", "L", "cm", "m", "MPa", "kPa", "Pa",
    "mol", "mol/L", "mmol", "g/mol", "J/mol", "kJ/mol", "J/(mol K)", "W", "V", "A", "J/mL", "J/cm",
    "mg/L", "g/mL", "kg/m3", "cm3/g", "cm3/mol", "J/min", "1/K", "1/g", "K min", "g K", "J g", "J K",
)  # fmt: skip

Powers = tuple[tuple[str, Fraction], ...]


@dataclass(frozen=True, slots=True)
class Unit:
    """Powers of the base dimensions and the size in base units."""

    powers: Powers
    scale: float

    def same(self, other: "Unit") -> bool:
        """Whether numbers in the two units may be added."""
        return self.powers == other.powers and abs(self.scale / other.scale - 1.0) < SAME_SCALE

    def times(self, other: "Unit", power: Fraction | int = 1) -> "Unit":
        """The unit of a product with `other` to a power."""
        found = dict(self.powers)
        for name, exponent in other.powers:
            found[name] = found.get(name, Fraction(0)) + exponent * power
        kept = tuple(sorted((name, exponent) for name, exponent in found.items() if exponent))
        return Unit(kept, self.scale * other.scale ** float(power))

    def __str__(self) -> str:
        for text in _SPELLINGS:
            if self.same(unit_of(text)):
                return text
        powers = " ".join(f"{name}^{exponent}" for name, exponent in self.powers) or "1"
        return f"{powers} x {self.scale:.6g}"


PURE = Unit((), 1.0)
KELVIN = Unit((("temperature", Fraction(1)),), 1.0)
# Points on a scale with a zero of its own, and the unit of its steps; a spreadsheet counts days as numbers.
POINTS = {"degC": KELVIN, "date": PURE}


@lru_cache(maxsize=512)
def unit_of(text: str) -> Unit:
    """The unit that `text` names; `%` counts as 1. Raises BadInput."""
    powers = tuple((name, Fraction(power).limit_denominator(1000)) for name, power in units.dimensions(text))
    parts = dict(units.registry().Quantity(1.0, units.parse(text)).unit_items())
    percent = float(str(parts.get("percent", 0)))
    return Unit(powers, units.factor(text) / 0.01**percent)


@dataclass(frozen=True, slots=True)
class Measure:
    """What a part of a formula stands for: a number with unit and weight.

    `series` says whether a reference is a range; None where only its use in the formula tells.
    """

    unit: Unit
    weight: Node = weights.NONE
    series: bool | None = None

    @property
    def is_point(self) -> bool:
        """Whether the unit is the step of a scale with its own zero."""
        return any(self.unit.same(step) for step in POINTS.values())

    @property
    def name(self) -> str:
        """The unit as a message names it: degC or date for a point on such a scale."""
        if self.is_point and self.weight == weights.ONE:
            return next(name for name, step in POINTS.items() if self.unit.same(step))
        return "a pure number" if self.unit.same(PURE) else str(self.unit)


@dataclass(frozen=True, slots=True)
class Words:
    """A part of a formula that is text."""

    name: str = "text"


@dataclass(frozen=True, slots=True)
class Neutral:
    """A literal 0, "", an error value, or a cell nobody knows the unit of: it goes with every unit."""

    name: str = "nothing"


Meaning = Measure | Words | Neutral
TEXT = Words()
NEUTRAL = Neutral()
NUMBER = Measure(PURE)


def meaning(unit: str | None, series: bool | None = None) -> Meaning:
    """What a cell in a unit of the contract stands for; None is text, "date" a day of the calendar.

    Raises BadInput for an unknown unit.
    """
    if unit is None:
        return TEXT
    if unit in POINTS:
        return Measure(POINTS[unit], weights.ONE, series)
    return Measure(unit_of(unit), weights.NONE, series)


def agrees(one: Meaning, other: Meaning) -> bool:
    """Whether two results may stand in one cell."""
    if isinstance(one, Neutral) or isinstance(other, Neutral):
        return True
    if isinstance(one, Measure) and isinstance(other, Measure):
        return one.unit.same(other.unit) and one.weight == other.weight
    return one == other
