"""Weighing in air: what the surrounding air carries."""

from __future__ import annotations

from sheetcal.check.balance.book import Book, Road, as_number
from sheetcal.check.balance.measure import Measure

GRAMS_PER_KILOGRAM = 1000.0


def air_over_vacuum(density: float, air: float, weights: float) -> float:
    """Heat per gram as weighed in air over heat per gram in vacuum.

    The balance compares forces: body and weights each less the air they push aside. `density` of the body in
    g/cm3; `air` and `weights` in kg/m3.
    """
    one_gram_of_weights = 1.0 - air / weights
    one_gram_of_body = 1.0 - air / (GRAMS_PER_KILOGRAM * density)
    return one_gram_of_weights / one_gram_of_body


def in_vacuum(convention: object) -> bool:
    """Whether a certificate's mass convention means the mass in vacuum."""
    return isinstance(convention, str) and "vacuum" in convention


def certified_value(book: Book, road: Road, lot: str | None, factor: str, value: str) -> Measure | None:
    """The value of a certified lot per gram weighed in air, J/g; notes the factor and the value under these ids."""
    row = book.row("certified", "lot", lot)
    if row is None:
        return None
    printed, density = as_number(row.get("value")), as_number(row.get("density"))
    own: Measure | None = Measure(1.0)
    if in_vacuum(row.get("convention")):
        air, weights = book.constant("air_density", 1.2), book.constant("weight_density", 8000.0)
        own = None if density is None else Measure(air_over_vacuum(density, air, weights))
    used = road.note(factor, own)
    in_air = None if used is None or printed is None else used.times(printed)
    return road.note(value, in_air)
