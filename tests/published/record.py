"""Corrected rises of a temperature record by the cell functions and by the checker's own road."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from sheetcal.cells import registry
from sheetcal.check.balance.rise import read_record, rises

RESOLUTION = 0.0001  # K
FRACTION = 0.60
STEPS = (
    ("length", "RECORD_LENGTH"),
    ("fore_end", "READING_AT"),
    ("main_end", "READING_AT"),
    ("fore_drift", "FORE_DRIFT"),
    ("after_drift", "AFTER_DRIFT"),
    ("fore_temperature", "FORE_TEMPERATURE"),
    ("after_temperature", "AFTER_TEMPERATURE"),
    ("cooling_constant", "COOLING_CONSTANT"),
    ("mean_temperature", "TIME_MEAN_TEMPERATURE"),
    ("fraction_temperature", "TEMPERATURE_OF_FRACTION"),
    ("fraction_time", "TIME_OF_FRACTION"),
    ("by_pfaundler", "EXCHANGE_CORRECTION"),
    ("by_dickinson", "EXCHANGE_BY_FRACTION"),
)
Given = tuple[Sequence[float], Sequence[float], float, float]


def rises_by_cells(
    times: Sequence[float], temperatures: Sequence[float], fired: float, ended: float
) -> tuple[dict[str, Any], float, float]:
    """(every step, Regnault-Pfaundler, Dickinson) of a record; times in min, temperatures in degC."""
    known: dict[str, Any] = {"time": list(times), "temperature": list(temperatures), "fraction": FRACTION}
    moments = {"fore_end": fired, "main_end": ended}
    for key, name in STEPS:
        known[key] = registry.evaluate(name, {**known, "moment": moments.get(key)})
    return known, _rise(known, "by_pfaundler"), _rise(known, "by_dickinson")


def _rise(known: dict[str, Any], exchange: str) -> float:
    result = registry.evaluate("RISE_FROM_RECORD", {**known, "exchange_correction": known[exchange]})
    assert isinstance(result, float), result
    return result


def rises_by_balance(records: Sequence[Given]) -> list[float]:
    """The corrected rise of each record by least squares over fore- and after-period, as the checker takes it."""
    read = [read_record(*record) for record in records]
    sound = [one for one in read if one is not None]
    assert len(sound) == len(records)
    return [one.theta for one in rises(sound, RESOLUTION)]
