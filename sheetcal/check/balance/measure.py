"""One number of a balance: its value, how far it may be off, and the largest term of its own equation."""

from __future__ import annotations

from collections.abc import Iterable
from decimal import ROUND_HALF_EVEN, ROUND_HALF_UP, Decimal
from math import fsum, sqrt
from typing import NamedTuple

TIE_DIGITS = Decimal("1e-9")  # ties are judged on x/step rounded to nine decimals
UNIT = Decimal(1)
LARGEST_STEPS = 1e15  # a double holds no digit below the step from here on
LARGEST_SHARE = 0.001  # of the largest term: no balance is wider


class Measure(NamedTuple):
    """A value, its tolerance and the largest term of its equation, all in the result's unit.

    `largest` is 0 where the value itself is the largest term. `absolute` is a width that no share of the
    largest term can express: half a step of rounding, or the least tolerance of a rise.
    """

    value: float
    tolerance: float = 0.0
    largest: float = 0.0
    absolute: float = 0.0

    def times(self, factor: float, largest: float = 0.0) -> Measure:
        """The value times an exact factor; its tolerance goes along."""
        return Measure(self.value * factor, self.tolerance * abs(factor), largest)


def mean(parts: list[Measure], largest: float = 0.0) -> Measure:
    """The mean, built from the differences against the first part; tolerances do not cancel.

    Without `largest` the largest term of any part is taken.
    """
    n = len(parts)
    first = parts[0].value
    value = first + fsum(one.value - first for one in parts) / n
    term = largest or max(one.largest for one in parts)
    return Measure(value, fsum(one.tolerance for one in parts) / n, term)


def middle(parts: list[Measure], largest: float = 0.0) -> Measure:
    """The median: of the parts in order the middle one, or the mean of the two in the middle."""
    ordered = sorted(parts, key=lambda one: one.value)
    half = len(ordered) // 2
    return mean(ordered[half : half + 1] if len(ordered) % 2 else ordered[half - 1 : half + 1], largest)


def widest(parts: list[Measure], largest: float = 0.0) -> Measure:
    """The largest difference between any two parts, and what their tolerances allow."""
    low = min(parts, key=lambda one: one.value)
    high = max(parts, key=lambda one: one.value)
    spread = 2.0 * max(one.tolerance for one in parts)
    return Measure(high.value - low.value, spread, largest or abs(high.value))


def scatter(parts: list[Measure]) -> Measure:
    """Standard deviation of one value, from the squares of the differences of all pairs; two parts at least."""
    n = len(parts)
    squares = fsum((one.value - other.value) ** 2 for row, one in enumerate(parts) for other in parts[:row])
    spread = sqrt(n / (n - 1.0)) * max(one.tolerance for one in parts)
    return Measure(sqrt(squares / (n * (n - 1.0))), spread, max(abs(one.value) for one in parts))


def total(parts: Iterable[Measure], largest: float = 0.0) -> Measure:
    """The sum; tolerances add up."""
    listed = list(parts)
    return Measure(fsum(one.value for one in listed), fsum(one.tolerance for one in listed), largest)


def rounded(value: float, step: float) -> float:
    """The value on the nearest step, ties to even, in decimal arithmetic.

    A tie is one of value/step rounded to nine decimals, so that 24.4999999999999 steps count as 24.5.
    """
    if abs(value) >= LARGEST_STEPS * step:
        return value
    exact_step = Decimal(repr(step))
    steps = (Decimal(repr(value)) / exact_step).quantize(TIE_DIGITS, ROUND_HALF_UP)
    return float(steps.quantize(UNIT, ROUND_HALF_EVEN) * exact_step)
