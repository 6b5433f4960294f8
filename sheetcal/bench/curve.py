"""Temperature records of an isoperibol calorimeter, by its exact curve; and the shorter ways to state a rise.

With ignition at t = 0 and the heat set free with a firing lag (two exponentials, rates a and b),
T = Tinf + (T0 - Tinf) exp(-k (t + fore)) + theta h(t),
h = c [(exp(-kt) - exp(-at))/(a - k) - (exp(-kt) - exp(-bt))/(b - k)], c = ab/(b - a),
the solution of Newton's law of exchange with the jacket; nothing is fitted and nothing approximated.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from math import exp

from sheetcal.bench.draw import Dice, stepped
from sheetcal.errors import BadInput

# What a record can suffer: the physics of each is in `_bath`, `_start`, `_spoil`.
VARIANTS = {
    "": "an ordinary record",
    "jacket above": "the jacket stays 0.6 K above the end temperature",
    "jacket below": "the jacket lies 0.6 K below the start temperature",
    "fore drift": "the calorimeter starts 4 K colder than usual against its jacket",
    "outlier": "one reading of the after-period is 20 mK too high",
    "restart": "the logger restarts: from there the time counts from 0 again",
    "stirrer off": "no stirring: scatter twentyfold, exchange constant halved",
    "misfire": "nothing burns: no rise",
}


@dataclass(frozen=True, slots=True)
class Bath:
    """A calorimeter in its jacket: k, a, b in 1/min, t_inf in degC (jacket plus what the stirrer adds)."""

    k: float = 0.00196
    t_inf: float = 25.35
    a: float = 1.2
    b: float = 5.0


@dataclass(frozen=True, slots=True)
class Timing:
    """How a record is taken: step in s, periods in min."""

    step: float = 30.0
    fore: float = 5.0
    main: float = 9.0
    after: float = 5.0

    @property
    def times(self) -> tuple[float, ...]:
        """All times of reading in min, from 0 at the first one; the firing is one of them."""
        step = self.step / 60.0
        count = round((self.fore + self.main + self.after) / step)
        return tuple(round(number * step, 4) for number in range(count + 1))


@dataclass(frozen=True, slots=True)
class Thermometer:
    """Scatter of a single reading and the smallest step shown, both K."""

    scatter: float = 0.00015
    resolution: float = 0.0001


@dataclass(frozen=True, slots=True)
class Record:
    """What the logger keeps: min and degC, equally long; firing and end of the main period in min."""

    times: tuple[float, ...]
    temperatures: tuple[float, ...]
    firing_time: float
    end_of_main: float


def release(t: float, bath: Bath) -> float:
    """h(t): share of the rise seen t min after ignition, exchange with the jacket included; 0 before."""
    if t <= 0.0:
        return 0.0
    k, a, b = bath.k, bath.a, bath.b
    cooled = exp(-k * t)
    slow = (cooled - exp(-a * t)) / (a - k)
    quick = (cooled - exp(-b * t)) / (b - k)
    return a * b / (b - a) * (slow - quick)


def temperature(t: float, theta: float, start: float, bath: Bath, fore: float = 5.0) -> float:
    """Exact temperature in degC, t min after ignition, of a calorimeter at `start` when the record begins."""
    return bath.t_inf + (start - bath.t_inf) * exp(-bath.k * (t + fore)) + theta * release(t, bath)


def usual_start(theta: float, bath: Bath, dice: Dice) -> float:
    """A start that ends near the jacket, as a careful analyst sets it, degC."""
    return bath.t_inf - theta + dice.uniform(-0.05, 0.35)


def record(
    theta: float,
    dice: Dice,
    bath: Bath | None = None,
    timing: Timing | None = None,
    thermometer: Thermometer | None = None,
    start: float | None = None,
    variant: str = "",
) -> Record:
    """The record of a true rise theta (K). Raises BadInput for a variant that is not in VARIANTS."""
    if variant not in VARIANTS:
        raise BadInput(f"record variant '{variant}'", "is not known", ", ".join(VARIANTS))
    bath, timing, meter = bath or Bath(), timing or Timing(), thermometer or Thermometer()
    theta = 0.0 if variant == "misfire" else theta
    begin = usual_start(theta or 2.5, bath, dice) if start is None else start
    begin, bath = _setting(variant, theta, begin, bath)
    scatter = meter.scatter * (20.0 if variant == "stirrer off" else 1.0)
    true = [temperature(t - timing.fore, theta, begin, bath, timing.fore) for t in timing.times]
    shown = [stepped(value + dice.normal(scatter), meter.resolution) for value in true]
    times = [stepped(t, 0.01) for t in timing.times]
    _spoil(variant, times, shown, timing, dice)
    return Record(tuple(times), tuple(shown), stepped(timing.fore, 0.01), stepped(timing.fore + timing.main, 0.01))


def _setting(variant: str, theta: float, start: float, bath: Bath) -> tuple[float, Bath]:
    """Start temperature and bath of a variant."""
    if variant == "jacket above":
        return start, replace(bath, t_inf=start + theta + 0.6)
    if variant == "jacket below":
        return start, replace(bath, t_inf=start - 0.6)
    if variant == "fore drift":
        return start - 4.0, bath
    if variant == "stirrer off":
        return start, replace(bath, k=bath.k / 2.0)
    return start, bath


def _spoil(variant: str, times: list[float], shown: list[float], timing: Timing, dice: Dice) -> None:
    """What a fault of the logger does to a record that was right."""
    after = [index for index, t in enumerate(times) if t > timing.fore + timing.main]
    if variant == "outlier":
        index = dice.choice(after)
        shown[index] = round(shown[index] + 0.020, 6)
    if variant == "restart":
        first = after[0] - dice.integer(2, 6)
        zero = times[first]
        times[first:] = [stepped(t - zero, 0.01) for t in times[first:]]


def three_readings(
    theta: float,
    dice: Dice,
    bath: Bath | None = None,
    timing: Timing | None = None,
    resolution: float = 0.001,
) -> dict[str, float]:
    """The hand form of a true rise: times in min, temperatures in degC, drifts in K/min, as read."""
    bath, timing = bath or Bath(), timing or Timing(step=60.0)
    start = usual_start(theta, bath, dice)

    def at(t: float) -> float:
        return temperature(t - timing.fore, theta, start, bath, timing.fore)

    a, c = timing.fore, timing.fore + timing.main
    first, last = at(a), at(c)
    before, after = (first - at(0.0)) / timing.fore, (at(c + timing.after) - last) / timing.after
    readings = {
        "time_a": a,
        "time_c": c,
        "time_b": stepped(_crossing(at, a, c, first + 0.6 * (last - first)), 0.01),
    }
    readings["temperature_a"] = stepped(first + dice.normal(resolution / 4.0), resolution)
    readings["temperature_c"] = stepped(last + dice.normal(resolution / 4.0), resolution)
    readings["drift_before"] = stepped(before + dice.normal(resolution / 20.0), 0.00001)
    readings["drift_after"] = stepped(after + dice.normal(resolution / 20.0), 0.00001)
    return readings


def _crossing(curve: object, low: float, high: float, level: float) -> float:
    """Time at which a rising curve passes a level, by halving."""
    assert callable(curve)
    for _ in range(60):
        middle = (low + high) / 2.0
        low, high = (middle, high) if curve(middle) < level else (low, middle)
    return (low + high) / 2.0


def adiabatic(theta: float, dice: Dice, duration: float = 12.0, resolution: float = 0.0001) -> dict[str, float]:
    """Start and end temperature under a jacket that follows, with the small steady drift that is left."""
    drift = stepped(dice.uniform(0.0001, 0.0006), 0.00001)
    start = stepped(dice.uniform(22.0, 23.0), resolution)
    end = start + theta + drift * duration + dice.normal(resolution * 2.0)
    return {
        "start": start,
        "end": stepped(end, resolution),
        "drift_before": drift,
        "drift_after": drift,
        "duration": duration,
    }


def shown_rise(theta: float, dice: Dice, scatter: float = 0.0003, resolution: float = 0.0001) -> float:
    """The corrected rise that an instrument shows for a true one, K."""
    return stepped(theta + dice.normal(scatter), resolution)
