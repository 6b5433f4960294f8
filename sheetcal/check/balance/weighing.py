"""Weighing in air: what the surrounding air carries."""

from __future__ import annotations

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
