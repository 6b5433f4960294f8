"""On exact synthetic records the corrected rise is right to the stated parts of a millikelvin."""

from __future__ import annotations

import math
import random
from typing import Any

import pytest

from sheetcal.cells import registry

RECORDS = 200
MAIN, FORE, AFTER = 9.0, 6.0, 12.0  # minutes


def _record(draw: random.Random, step: float) -> tuple[dict[str, Any], float]:
    """A record from the closed-form curve of an isoperibol calorimeter, to 0.1 mK, and its true rise."""
    theta, k = draw.uniform(1.5, 2.5), draw.uniform(0.0005, 0.003)
    lam = draw.uniform(11, 13) / MAIN  # release finished, and the trapezoid still fine enough
    start = draw.uniform(21, 23)
    jacket = start + theta + draw.uniform(-0.5, 1.1)  # the after-period is not far from rest

    def curve(t: float) -> float:
        drift = jacket + (start - jacket) * math.exp(-k * t)
        heat = theta * lam / (lam - k) * (math.exp(-k * t) - math.exp(-lam * t)) if t > 0 else 0.0
        return round(drift + heat, 4)

    times = [index * step for index in range(round((FORE + MAIN + AFTER) / step) + 1)]
    known = {
        "time": times,
        "temperature": [curve(t - FORE) for t in times],
        "fired": FORE,
        "end": FORE + MAIN,
    }
    return known, theta


STEPS = [
    ("length", "RECORD_LENGTH"),
    ("fore_drift", "FORE_DRIFT"),
    ("after_drift", "AFTER_DRIFT"),
    ("fore_temperature", "FORE_TEMPERATURE"),
    ("after_temperature", "AFTER_TEMPERATURE"),
    ("cooling_constant", "COOLING_CONSTANT"),
    ("convergence_temperature", "CONVERGENCE_TEMPERATURE"),
    ("mean_temperature", "TIME_MEAN_TEMPERATURE"),
    ("fraction_temperature", "TEMPERATURE_OF_FRACTION"),
    ("fraction_time", "TIME_OF_FRACTION"),
]


def _rises(known: dict[str, Any]) -> tuple[float, float]:
    """Corrected rises by Regnault-Pfaundler and by Dickinson's fraction."""
    known = {**known, "fraction": 0.60, "length": registry.evaluate("RECORD_LENGTH", known)}
    known["fore_end"] = registry.evaluate("READING_AT", {**known, "moment": known["fired"]})
    known["main_end"] = registry.evaluate("READING_AT", {**known, "moment": known["end"]})
    for key, name in STEPS:
        known[key] = registry.evaluate(name, known)
    results = []
    for name in ("EXCHANGE_CORRECTION", "EXCHANGE_BY_FRACTION"):
        known["exchange_correction"] = registry.evaluate(name, known)
        value = registry.evaluate("RISE_FROM_RECORD", known)
        assert isinstance(value, float)
        results.append(value)
    return results[0], results[1]


@pytest.mark.parametrize(("step", "pfaundler", "dickinson"), [(0.5, 0.4e-3, 1.2e-3), (1.0, 1.2e-3, None)])
def test_exact_records(step: float, pfaundler: float, dickinson: float | None) -> None:
    draw = random.Random(20)
    used = 0
    for _ in range(RECORDS):
        known, theta = _record(draw, step)
        by_pfaundler, by_fraction = _rises(known)
        assert by_pfaundler == pytest.approx(theta, abs=pfaundler)
        assert dickinson is None or by_fraction == pytest.approx(theta, abs=dickinson)
        used += 1
    assert used == RECORDS


def test_a_record_in_an_adiabatic_jacket_and_by_hand() -> None:
    args = {"start_temperature": 22.0, "end_temperature": 24.5, "drift_before": 0.001, "duration": 10.0}
    assert registry.evaluate("RISE_ADIABATIC", args) == pytest.approx(2.49)
    assert registry.evaluate("RISE_ADIABATIC", {**args, "drift_after": 0.003}) == pytest.approx(2.48)
    assert registry.evaluate("RISE_ADIABATIC", {**args, "drift_before": None}) == pytest.approx(2.5)
    hand = {"time_a": 5, "temperature_a": 22.0, "time_b": 6.2, "time_c": 14, "temperature_c": 24.5}
    drifts = {"fore_drift": 0.002, "after_drift": -0.001}
    assert registry.evaluate("RISE_FROM_THREE_READINGS", {**hand, **drifts}) == pytest.approx(2.5054)
    assert registry.evaluate("RISE_FROM_THREE_READINGS", {**hand, **drifts, "time_b": 4}) is None
