"""The acids in the wash by moles: how much was formed, and what heat its formation gave.

Nitric acid comes from N2, O2 and water, sulfuric acid from SO2, O2 and water. The heats are those of the
formation enthalpies; how far the profile's rounded figures lie from them is the tolerance.
"""

from __future__ import annotations

from dataclasses import dataclass

from sheetcal.check.balance import atoms
from sheetcal.check.balance.book import Book
from sheetcal.check.balance.measure import Measure

TENTH = 1e-4  # mol of equivalents in 1 mL of 0.1 eq/L, acid or base
MILLI = 1e-3


@dataclass(frozen=True, slots=True)
class Acids:
    """The profile's heats: nitric J/mL, sulfuric J/(g %) and J/mL, and what S and Cl take from the titre."""

    nitric: float
    sulfuric: float
    sulfuric_titrated: float
    sulfur_as_nitric: float
    chlorine_as_nitric: float
    carbonate: float

    @classmethod
    def of(cls, book: Book) -> Acids:
        """As the workbook prints them; a coefficient it lacks counts as exact."""
        molar = 0.01 * atoms.NITRIC_ENERGY
        return cls(
            book.constant("nitric_heat", TENTH * atoms.NITRIC_ENERGY),
            book.constant("sulfuric_heat", 0.01 * atoms.SULFURIC_ENERGY / atoms.S),
            book.constant("sulfuric_per_barium", TENTH / 2 * atoms.SULFURIC_ENERGY),
            book.constant("sulfur_as_nitric", 2 * molar / atoms.S),
            book.constant("chlorine_as_nitric", molar / atoms.CL),
            book.constant("carbonate_volume", 20.0),
        )


@dataclass(frozen=True, slots=True)
class Wash:
    """What the wash of one run was found to hold; None is not determined."""

    route: str | None
    acid: Measure | None  # mL of 0.1 mol/L
    mass: float | None  # g of sample
    sulfur: Measure | None  # % of the sample that went into the acid
    chlorine: Measure | None
    barium: float | None  # mL of 0.05 mol/L
    back: float | None  # mL of 0.1 mol/L
    volume: float | None  # mL
    nitrate: float | None  # mg/L
    sulfate: float | None  # mg/L
    nitric_fixed: float | None  # J
    sulfuric_fixed: float | None  # J


def nitric_heat(wash: Wash, acids: Acids) -> Measure | None:
    """Heat of the nitric acid, J; None where the route's readings are not there."""
    if wash.route == "total acid":
        return _nitric_by_total_acid(wash, acids)
    if wash.route == "barium" and wash.back is not None:
        return _nitric(TENTH * (acids.carbonate - wash.back), acids)
    if wash.route == "ions" and wash.volume is not None and wash.nitrate is not None:
        return _nitric(_moles(wash.nitrate, wash.volume, atoms.NITRATE), acids)
    return _fixed(wash.route, wash.nitric_fixed)


def sulfuric_heat(wash: Wash, acids: Acids) -> Measure | None:
    """Heat of the sulfuric acid beyond SO2, J; None where the route's readings are not there."""
    if wash.route == "total acid":
        if wash.sulfur is None or wash.mass is None:
            return None
        grams = 0.01 * wash.mass * wash.sulfur.value
        return _sulfuric(grams / atoms.S, acids.sulfuric * 100.0 * atoms.S, wash.sulfur.tolerance * wash.mass)
    if wash.route == "barium" and wash.back is not None and wash.barium is not None:
        equivalents = TENTH * (wash.back + wash.barium - acids.carbonate)
        return _sulfuric(equivalents / 2, acids.sulfuric_titrated / (TENTH / 2))
    if wash.route == "ions" and wash.volume is not None and wash.sulfate is not None:
        return _sulfuric(_moles(wash.sulfate, wash.volume, atoms.SULFATE), acids.sulfuric * 100.0 * atoms.S)
    return _fixed(wash.route, wash.sulfuric_fixed)


def _nitric_by_total_acid(wash: Wash, acids: Acids) -> Measure | None:
    """All acid less two equivalents per sulfur and one per chlorine of the sample."""
    if wash.acid is None or wash.mass is None or wash.sulfur is None:
        return None
    chlorine = wash.chlorine or Measure(0.0)
    sulfur_moles = 0.01 * wash.mass * wash.sulfur.value / atoms.S
    chlorine_moles = 0.01 * wash.mass * chlorine.value / atoms.CL
    nitric = TENTH * wash.acid.value - 2 * sulfur_moles - chlorine_moles
    exact_sulfur = 0.02 * atoms.NITRIC_ENERGY / atoms.S
    exact_chlorine = 0.01 * atoms.NITRIC_ENERGY / atoms.CL
    doubt = (
        abs(acids.nitric - TENTH * atoms.NITRIC_ENERGY) * wash.acid.value
        + abs(acids.sulfur_as_nitric - exact_sulfur) * wash.mass * wash.sulfur.value
        + abs(acids.chlorine_as_nitric - exact_chlorine) * wash.mass * chlorine.value
        + wash.mass * (exact_sulfur * wash.sulfur.tolerance + exact_chlorine * chlorine.tolerance)
    )
    return Measure(nitric * atoms.NITRIC_ENERGY, doubt, acids.nitric * wash.acid.value)


def _nitric(moles: float, acids: Acids) -> Measure:
    return Measure(moles * atoms.NITRIC_ENERGY, abs(moles) * abs(acids.nitric / TENTH - atoms.NITRIC_ENERGY))


def _sulfuric(moles: float, molar_heat: float, gram_percent: float = 0.0) -> Measure:
    """`molar_heat` as the profile's figure means it, J/mol; `gram_percent` the doubt in g x % of sulfur."""
    doubt = abs(moles) * abs(molar_heat - atoms.SULFURIC_ENERGY)
    return Measure(moles * atoms.SULFURIC_ENERGY, doubt + 0.01 * gram_percent * atoms.SULFURIC_ENERGY / atoms.S)


def _moles(milligrams_per_litre: float, millilitres: float, molar_mass: float) -> float:
    return MILLI * milligrams_per_litre * MILLI * millilitres / molar_mass


def _fixed(route: str | None, heat: float | None) -> Measure | None:
    if route == "none":
        return Measure(0.0)
    return Measure(heat) if route == "fixed" and heat is not None else None
