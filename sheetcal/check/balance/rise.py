"""The corrected rise of many records at once by a road without drifts, means or end readings.

The calorimeter gains the heat of the run once, and stirring and the jacket all the time. Integrated from the
first reading: T - T0 = a + theta [after] + b t - G (integral of T - T0), linear in a, theta, b and G. One least
squares over all readings of fore- and after-period gives theta; the main period enters by its integral only,
taken as the integral of cubic pieces, split at firing where the slope jumps.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from math import sqrt

import numpy as np
from numpy.typing import NDArray

Numbers = NDArray[np.float64]
Places = NDArray[np.intp]

BEYOND = 1e6  # no record runs for two years or reaches a million degrees
FEWEST = 3  # readings of a period, below which nothing can be said
SMALL_STEP = 0.3  # K; below it the record cannot tell its own cooling constant
SLACK = 1e-9  # min; times are typed with two decimals
FIRM = 1e9  # weight of a cooling constant taken as known
UNKNOWNS = 4


@dataclass(frozen=True, slots=True)
class Record:
    """One temperature record: times in min, temperatures in degC, shapes (n,).

    `fired` and `ended` are the positions of the last readings of fore- and main period, `cooling` the
    calorimeter's own constant in 1/min, used where the record cannot tell it.
    """

    times: Numbers
    temperatures: Numbers
    fired: int
    ended: int
    cooling: float = 0.0


@dataclass(frozen=True, slots=True)
class Rise:
    """A corrected rise in K with the tolerance against another road, and the cooling constant in 1/min."""

    theta: float
    tolerance: float
    cooling: float
    scatter: float


def read_record(
    times: Sequence[object], temperatures: Sequence[object], fired: float, ended: float, cooling: float = 0.0
) -> Record | None:
    """The record, or None where it is not numbers only, paired, rising, with three readings in either period."""
    if len(times) != len(temperatures) or not _numbers_only(times) or not _numbers_only(temperatures):
        return None
    t = np.array(times, dtype=float)
    first, last = np.searchsorted(t, (fired + SLACK, ended + SLACK), side="right") - 1
    enough = first + 1 >= FEWEST and len(t) - last >= FEWEST and last > first
    if not enough or bool((t[1:] <= t[:-1]).any()):
        return None
    return Record(t, np.array(temperatures, dtype=float), int(first), int(last), cooling)


def _numbers_only(values: Sequence[object]) -> bool:
    """Plain numbers, none beyond what a minute or a degree can be."""
    return set(map(type, values)) <= {float, int} and max(map(abs, values), default=0.0) < BEYOND  # type: ignore[arg-type]


def rises(records: Sequence[Record], resolution: float) -> list[Rise]:
    """The rise of every record; `resolution` of the thermometer in K."""
    if not records:
        return []
    t, y, steps = _stack(records)
    fired = np.array([one.fired for one in records])
    ended = np.array([one.ended for one in records])
    lengths = np.array([len(one.times) for one in records])
    position = np.arange(t.shape[1])
    after = position >= ended[:, None]
    used = (after & (position < lengths[:, None])) | (position <= fired[:, None])
    integral = _integral(t, y, steps, fired)
    own = np.array([one.cooling for one in records])
    solution, scatter = _solve(t, y, after, used, integral, own)
    sharpest, longest = _main_period(y, steps, fired, ended)
    noise = np.maximum(scatter, resolution / sqrt(12.0))
    width = np.abs(solution[:, 3]) * longest * sharpest / 6.0 + 5.0 * noise
    return [Rise(*row) for row in np.stack((solution[:, 1], width, solution[:, 3], scatter), axis=1).tolist()]


def _stack(records: Sequence[Record]) -> tuple[Numbers, Numbers, Numbers]:
    """Times and temperatures from the first reading on, shape (records, n), padded in line; steps (records, n - 1)."""
    longest = max(len(one.times) for one in records)
    t = np.empty((len(records), longest))
    y = np.empty((len(records), longest))
    beyond = np.arange(1.0, longest + 1.0)
    for row, one in enumerate(records):
        n = len(one.times)
        t[row, :n] = one.times - one.times[0]
        y[row, :n] = one.temperatures - one.temperatures[0]
        t[row, n:] = t[row, n - 1] + beyond[: longest - n]
        y[row, n:] = y[row, n - 1] + beyond[: longest - n] * (y[row, n - 1] - y[row, n - 2]) / (
            t[row, n - 1] - t[row, n - 2]
        )
    return t, y, t[:, 1:] - t[:, :-1]


def _integral(t: Numbers, y: Numbers, steps: Numbers, fired: Places) -> Numbers:
    """Time integral of y from the first reading to each, K min, by cubic pieces with estimated slopes."""
    row = np.arange(len(y))
    chord = (y[:, 1:] - y[:, :-1]) / steps
    slope = np.empty_like(y)
    slope[:, 0], slope[:, -1] = chord[:, 0], chord[:, -1]
    left, right = steps[:, :-1], steps[:, 1:]
    slope[:, 1:-1] = (chord[:, :-1] * right + chord[:, 1:] * left) / (left + right)
    begins, ends = slope[:, :-1].copy(), slope[:, 1:].copy()
    begins[row, fired] = _slope_after(t, chord, fired)
    ends[row, fired - 1] = chord[row, fired - 1]
    pieces = steps * (y[:, :-1] + y[:, 1:]) / 2.0 + steps**2 * (begins - ends) / 12.0
    whole = np.zeros_like(y)
    np.cumsum(pieces, axis=1, out=whole[:, 1:])
    return whole


def _slope_after(t: Numbers, chord: Numbers, fired: Places) -> Numbers:
    """Slope just after firing, from the cubic through the firing reading and the next three."""
    row = np.arange(len(t))
    t0, t1, t2, t3 = (t[row, fired + k] for k in range(4))
    c01, c12, c23 = (chord[row, fired + k] for k in range(3))
    second = (c12 - c01) / (t2 - t0)
    third = ((c23 - c12) / (t3 - t1) - second) / (t3 - t0)
    result: Numbers = c01 - (t1 - t0) * second + (t1 - t0) * (t2 - t0) * third
    return result


def _solve(
    t: Numbers, y: Numbers, after: NDArray[np.bool_], used: NDArray[np.bool_], integral: Numbers, own: Numbers
) -> tuple[Numbers, Numbers]:
    """Least squares for (a, theta, b, G) of each record, shape (records, 4), and its residual scatter in K.

    Columns are brought to about 1. A record without a step takes G as known.
    """
    columns = np.stack((np.ones_like(t), after.astype(float), t, -integral), axis=2)
    scale = np.maximum(np.abs(np.where(used[:, :, None], columns, 0.0)).max(axis=1), 1e-12)
    scaled = np.where(used[:, :, None], columns / scale[:, None, :], 0.0)
    seen = np.where(used, y, 0.0)
    across = scaled.transpose(0, 2, 1)
    normal = across @ scaled
    target = (across @ seen[:, :, None])[:, :, 0]
    firm = np.where(seen.max(axis=1) - seen.min(axis=1) < SMALL_STEP, FIRM, 0.0)
    normal[:, 3, 3] += firm
    target[:, 3] += firm * own * scale[:, 3]
    solution = _solved(normal, target[:, :, None])
    left = seen - (scaled @ solution)[:, :, 0]
    freedom = np.maximum(used.sum(axis=1) - UNKNOWNS, 1)
    return solution[:, :, 0] / scale, np.sqrt((left * left).sum(axis=1) / freedom)


def _solved(normal: Numbers, target: Numbers) -> Numbers:
    """The solutions; where readings all but coincide and one system has none, those of least size."""
    try:
        solution: Numbers = np.linalg.solve(normal, target).astype(np.float64)
        return solution
    except np.linalg.LinAlgError:
        least: Numbers = np.linalg.pinv(normal, hermitian=True) @ target
        return least


def _main_period(y: Numbers, steps: Numbers, fired: Places, ended: Places) -> tuple[Numbers, Numbers]:
    """Largest change of one step in the main period, K, and its longest step, min."""
    position = np.arange(steps.shape[1])
    inside = (position >= fired[:, None]) & (position < ended[:, None])
    change = np.where(inside, np.abs(y[:, 1:] - y[:, :-1]), 0.0).max(axis=1)
    return change, np.where(inside, steps, 0.0).max(axis=1)
