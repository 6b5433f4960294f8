"""The corrected rise by an adiabatic jacket, and by the readings a person took by hand.

Records: tests/published/test_synthetic_records.py holds every road against exact curves.
"""

from __future__ import annotations

import pytest

from sheetcal.cells import registry


def test_a_record_in_an_adiabatic_jacket_and_by_hand() -> None:
    args = {"start_temperature": 22.0, "end_temperature": 24.5, "drift_before": 0.001, "duration": 10.0}
    assert registry.evaluate("RISE_ADIABATIC", args) == pytest.approx(2.49)
    assert registry.evaluate("RISE_ADIABATIC", {**args, "drift_after": 0.003}) == pytest.approx(2.48)
    assert registry.evaluate("RISE_ADIABATIC", {**args, "drift_before": None}) == pytest.approx(2.5)
    hand = {"time_a": 5, "temperature_a": 22.0, "time_b": 6.2, "time_c": 14, "temperature_c": 24.5}
    drifts = {"fore_drift": 0.002, "after_drift": -0.001}
    assert registry.evaluate("RISE_FROM_THREE_READINGS", {**hand, **drifts}) == pytest.approx(2.5054)
    assert registry.evaluate("RISE_FROM_THREE_READINGS", {**hand, **drifts, "time_b": 4}) is None
