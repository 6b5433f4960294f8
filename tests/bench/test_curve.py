"""The bench's temperature record solves Newton's law of exchange exactly, and its faults are what they say."""

from __future__ import annotations

import math
import statistics
from dataclasses import replace

import pytest

from sheetcal.bench import VARIANTS, Bath, Dice, Thermometer, Timing, record, temperature
from sheetcal.bench.curve import adiabatic, release, shown_rise, three_readings
from sheetcal.errors import BadInput

BATH = Bath(k=0.00196, t_inf=25.35)
EXACT = Thermometer(scatter=0.0, resolution=1e-9)
THETA, START = 2.5, 22.9


def heat_rate(t: float) -> float:
    """Rate at which the rise is set free: two exponentials, 1/min, its integral is 1."""
    a, b = BATH.a, BATH.b
    return a * b / (b - a) * (math.exp(-a * t) - math.exp(-b * t))


def test_the_curve_obeys_the_heat_balance_of_the_calorimeter() -> None:
    """dT/dt = -k (T - Tinf) + theta rate, at 200 times, by a central difference: nothing is approximated."""
    step = 1e-5
    for number in range(1, 201):
        t = number * 0.07
        slope = (temperature(t + step, THETA, START, BATH) - temperature(t - step, THETA, START, BATH)) / (2 * step)
        exchange = -BATH.k * (temperature(t, THETA, START, BATH) - BATH.t_inf)
        assert slope == pytest.approx(exchange + THETA * heat_rate(t), abs=2e-8)


def test_with_no_exchange_the_whole_rise_is_seen() -> None:
    """k -> 0: the temperature ends at start plus theta."""
    still = replace(BATH, k=1e-12)
    assert temperature(60.0, THETA, START, still) == pytest.approx(START + THETA, abs=1e-8)


def test_a_very_quick_second_step_gives_the_one_exponential_curve() -> None:
    """b -> infinity: h = a/(a - k) (exp(-kt) - exp(-at)), the textbook curve."""
    quick = replace(BATH, b=1e7)
    for t in (0.5, 1.0, 3.0, 9.0):
        single = BATH.a / (BATH.a - BATH.k) * (math.exp(-BATH.k * t) - math.exp(-BATH.a * t))
        assert release(t, quick) == pytest.approx(single, abs=1e-6)


def test_before_firing_there_is_only_exchange() -> None:
    """h is 0 up to the firing, and the lag makes it start with no slope."""
    assert release(0.0, BATH) == release(-3.0, BATH) == 0.0
    assert release(0.001, BATH) < 1e-5


def test_a_record_has_its_times_periods_and_scatter() -> None:
    """39 readings at 30 s, firing at 5, end of main at 14, scatter and last digit as the thermometer's."""
    kept = record(THETA, Dice("scatter"), BATH)
    exact = [temperature(t - 5.0, THETA, kept_start(), BATH) for t in kept.times]
    assert kept.times[0] == 0.0 and kept.times[-1] == 19.0 and len(kept.times) == 39
    assert (kept.firing_time, kept.end_of_main) == (5.0, 14.0)
    residuals = [shown - true for shown, true in zip(kept.temperatures, exact, strict=True)]
    assert 0.5 * 0.00015 < statistics.stdev(residuals) < 2.0 * 0.00015
    assert all(round(shown, 4) == shown for shown in kept.temperatures)


def kept_start() -> float:
    """The start that `record` draws for the key of the test above."""
    return BATH.t_inf - THETA + Dice("scatter").uniform(-0.05, 0.35)


def test_a_slow_hand_read_record() -> None:
    """60 s and 1 mK: 20 readings, three decimals."""
    kept = record(THETA, Dice("hand"), BATH, Timing(step=60.0), Thermometer(0.0003, 0.001))
    assert len(kept.times) == 20 and all(round(shown, 3) == shown for shown in kept.temperatures)


def test_the_same_dice_give_the_same_record() -> None:
    """Determinism: equal keys, equal records; another key, another record."""
    assert record(2.4, Dice(3, "a")) == record(2.4, Dice(3, "a"))
    assert record(2.4, Dice(3, "a")) != record(2.4, Dice(3, "b"))


def exact(variant: str) -> list[float]:
    """Temperatures of a variant without scatter."""
    return list(record(THETA, Dice("v"), BATH, thermometer=EXACT, start=START, variant=variant).temperatures)


def test_jacket_above_and_below() -> None:
    """A jacket above the end warms the whole record; one below the start cools the fore-period."""
    above, below = exact("jacket above"), exact("jacket below")
    assert above[10] > above[0] and above[-1] > above[-8]
    assert below[10] < below[0]


def test_a_large_fore_drift() -> None:
    """Starting 4 K colder the fore-period climbs by 4 K x k more each minute."""
    usual, steep = exact(""), exact("fore drift")
    gain = (steep[10] - steep[0] - usual[10] + usual[0]) / 5.0
    assert gain == pytest.approx(4.0 * BATH.k, rel=0.01)


def test_an_outlier_is_one_reading_of_20_millikelvin() -> None:
    """All readings but one are those of the ordinary record."""
    off = [b - a for a, b in zip(exact(""), exact("outlier"), strict=True)]
    assert sorted(round(value, 6) for value in off)[-2:] == [0.0, 0.02]


def test_a_restart_counts_the_time_from_zero_again() -> None:
    """The times fall once, to 0, and rise on both sides of it."""
    times = record(THETA, Dice("v"), BATH, variant="restart").times
    falls = [index for index in range(1, len(times)) if times[index] <= times[index - 1]]
    assert len(falls) == 1 and times[falls[0]] == 0.0


def test_without_stirring_the_scatter_is_twentyfold() -> None:
    """Scatter of the fore-period round its own line."""
    quiet = record(THETA, Dice("s"), BATH, start=START).temperatures[:11]
    wild = record(THETA, Dice("s"), BATH, start=START, variant="stirrer off").temperatures[:11]
    assert scatter(wild) > 5 * scatter(quiet)


def scatter(values: tuple[float, ...]) -> float:
    """Standard deviation of what is left of second differences: drift gone, scatter times root 6."""
    second = [a - 2 * b + c for a, b, c in zip(values, values[1:], values[2:], strict=False)]
    return statistics.pstdev(second) / 6**0.5


def test_a_misfire_has_no_rise() -> None:
    """The record is the drift alone."""
    flat = exact("misfire")
    assert max(flat) - min(flat) < 0.12
    assert flat[-1] - flat[10] == pytest.approx((flat[10] - flat[0]) * 14 / 5, rel=0.1, abs=0.01)


def test_every_variant_gives_a_record_and_a_stranger_is_refused() -> None:
    """Eight variants; a name that is none of them is named in the refusal."""
    made = [record(THETA, Dice("all"), BATH, variant=name) for name in VARIANTS]
    assert len(made) == 8 and all(len(one.times) == len(one.temperatures) for one in made)
    with pytest.raises(BadInput, match="spilt"):
        record(THETA, Dice("all"), variant="spilt")


def test_the_hand_form_holds_the_rise() -> None:
    """Two drifts carried to the time of 0.60 of the step leave the true rise within 2 mK (read to 1 mK)."""
    for seed in range(20):
        got = three_readings(THETA, Dice("three", seed), BATH)
        exchange = got["drift_before"] * (got["time_b"] - got["time_a"])
        exchange += got["drift_after"] * (got["time_c"] - got["time_b"])
        assert got["temperature_c"] - got["temperature_a"] - exchange == pytest.approx(THETA, abs=0.002)


def test_adiabatic_and_instrument_hold_the_rise() -> None:
    """What is stated gives the true rise back within 4 standard deviations of its scatter."""
    for seed in range(20):
        got = adiabatic(THETA, Dice("adiabatic", seed))
        found = got["end"] - got["start"] - got["drift_before"] * got["duration"]
        assert found == pytest.approx(THETA, abs=0.001)
        assert shown_rise(THETA, Dice("shown", seed)) == pytest.approx(THETA, abs=0.0013)
