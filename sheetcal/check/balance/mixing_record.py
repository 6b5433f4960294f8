"""The two temperatures of a drop into a liquid from its record: both lines, carried to the time of the step.

The time of the step is taken by another way than the sheet's: by equal areas where the liquid warms, by 63 % of
the step where it cools. What the two ways differ in, times the drift, is the tolerance.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from sheetcal.check.balance.measure import Measure
from sheetcal.check.balance.rise import Record

Numbers = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class Line:
    """A drift: its value at time 0, degC, and its slope, K/min."""

    level: float
    slope: float

    def at(self, time: float) -> float:
        """Temperature on the line, degC."""
        return self.level + self.slope * time


def temperatures(record: Record, fraction: float) -> tuple[Measure, Measure] | None:
    """Fore-line and after-line at the step, degC; None where nothing moved."""
    t, y = record.times, record.temperatures
    step = float(y[record.ended] - y[record.fired])
    if step == 0.0:
        return None
    by_fraction, by_areas = _time_of_fraction(record, fraction), _time_of_areas(record, step)
    moment, other = (by_areas, by_fraction) if step > 0.0 else (by_fraction, by_areas)
    lines = _line(t[: record.fired + 1], y[: record.fired + 1]), _line(t[record.ended :], y[record.ended :])
    apart = abs(moment - other)
    fore, after = (Measure(line.at(moment), abs(line.slope) * apart) for line in lines)
    return fore, after


def _line(t: Numbers, y: Numbers) -> Line:
    """Least squares through a period, about its middle."""
    middle = float(t.mean())
    from_middle = t - middle
    slope = float(from_middle @ y / (from_middle @ from_middle))
    return Line(float(y.mean()) - slope * middle, slope)


def _time_of_fraction(record: Record, fraction: float) -> float:
    """When the share of the step is first passed, min."""
    t = record.times[record.fired : record.ended + 1]
    y = record.temperatures[record.fired : record.ended + 1]
    share = (y - y[0]) / (y[-1] - y[0]) - fraction
    passed = np.flatnonzero(share >= 0.0)
    place = int(passed[0])
    before, after = float(share[place - 1]), float(share[place])
    return float(t[place - 1] + (t[place] - t[place - 1]) * before / (before - after))


def _time_of_areas(record: Record, step: float) -> float:
    """When a sudden step would have the same time integral over the main period, min."""
    t = record.times[record.fired : record.ended + 1]
    risen = record.temperatures[record.fired : record.ended + 1] - record.temperatures[record.fired]
    area = float(((risen[1:] + risen[:-1]) * (t[1:] - t[:-1])).sum()) / 2.0
    return float(t[-1]) - area / step
