"""Chance that repeats: the same key gives the same numbers on every machine and with every numpy.

Only the raw words of PCG64 are taken from numpy, whose stream is promised; what is made of them is made here,
because numpy may change its distributions between versions.
"""

from __future__ import annotations

import hashlib
from collections.abc import Sequence
from decimal import ROUND_HALF_EVEN, Decimal
from statistics import NormalDist
from typing import TypeVar

import numpy as np

T = TypeVar("T")

_WORD = 2.0**-53
_GAUSS = NormalDist()


class Dice:
    """A stream of chance named by a key; `child` names an independent one, whatever was drawn before."""

    def __init__(self, *key: int | str) -> None:
        self.key = key
        digest = hashlib.sha256("\x1f".join(str(part) for part in key).encode()).digest()
        words = [int.from_bytes(digest[start : start + 4], "big") for start in range(0, 32, 4)]
        self._source = np.random.PCG64(np.random.SeedSequence(words))

    def child(self, *key: int | str) -> Dice:
        """The stream of a longer key."""
        return Dice(*self.key, *key)

    def fraction(self) -> float:
        """Uniform between 0 and 1, both excluded."""
        word = int(self._source.random_raw())
        return ((word >> 11) + 0.5) * _WORD

    def uniform(self, low: float, high: float) -> float:
        """Uniform between two limits."""
        return low + (high - low) * self.fraction()

    def normal(self, deviation: float, mean: float = 0.0) -> float:
        """Normal with a standard deviation and a mean."""
        return mean + deviation * _GAUSS.inv_cdf(self.fraction())

    def integer(self, low: int, high: int) -> int:
        """A whole number from low to high, both included."""
        return low + int(self.fraction() * (high - low + 1))

    def choice(self, values: Sequence[T]) -> T:
        """One of several values, all alike."""
        return values[self.integer(0, len(values) - 1)]

    def chance(self, share: float) -> bool:
        """True in a share of the cases."""
        return self.fraction() < share


def stepped(value: float, step: float) -> float:
    """A value as an instrument of that resolution shows it, half to even, without stray binary digits."""
    width = Decimal(str(step))
    whole = (Decimal(value) / width).to_integral_value(ROUND_HALF_EVEN)
    return float(whole * width)
