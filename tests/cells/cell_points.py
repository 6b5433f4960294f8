"""Points at which every cell function is tried: over its range, at its edges, with blanks and text."""

from __future__ import annotations

import math
import random
from typing import Any

from sheetcal.cells import registry
from sheetcal.cells.registry import Argument, CellFunction


class ErrorCell:
    """A cell that shows an error value."""


GOOD_POINTS = 20
TYPICAL = {
    "J": (1, 30000),
    "kJ": (10, 40),
    "g": (0.1, 5),
    "K": (0.2, 5),
    "degC": (5, 95),
    "min": (0, 30),
    "s": (10, 2000),
    "cm": (0, 12),
    "mL": (0, 30),
    "%": (0, 40),
    "1": (0, 20),
    "J/g": (100, 40000),
    "J/K": (100, 15000),
    "J/(g K)": (0.1, 5),
    "K/min": (-0.01, 0.01),
    "1/min": (0.0005, 0.01),
    "kPa": (48, 109),
    "any": (-100, 25000),
}
ON_RECORD = ("sheetcal.cells.rise", "sheetcal.cells.record")
KEYS = ["L-1", "L-2", "Wire A", "w4"]
CHOICES = {
    "state": ["valid", "Valid", "void"],
    "role": ["control", "sample"],
    "basis": ["dry", "as analysed"],
    "convention": ["in vacuum", "in air"],
    "start": ["08:05", "23:59", "00:00", "noon", ""],
}
COLUMN_TEXTS = {"conventions": ["in vacuum", "In vacuum", "in air", "in air"]}


def number(low: float, high: float, draw: random.Random) -> float:
    """A number of 12 digits: what every program stores exactly alike."""
    return float(f"{draw.uniform(low, high):.12g}")


def bounds(argument: Argument) -> tuple[float, float]:
    """Where the argument is drawn from: the typical range of its unit, cut to its valid range."""
    low, high = TYPICAL.get(argument.unit or "1", (0.1, 50.0))
    valid_low = -math.inf if argument.low is None else argument.low
    valid_high = math.inf if argument.high is None else argument.high
    if max(low, valid_low) <= min(high, valid_high):
        return max(low, valid_low), min(high, valid_high)
    return valid_low, valid_high if math.isfinite(valid_high) else valid_low + 100


def scalar(argument: Argument, draw: random.Random) -> Any:
    """One cell's content."""
    if argument.optional and draw.random() < 0.35:
        return draw.choice([None, ""])
    if argument.choices:
        text = draw.choice(argument.choices)
        return draw.choice([text, text.capitalize()])
    if argument.text:
        return draw.choice(CHOICES.get(argument.name, [*KEYS, "l-2"]))
    if argument.name in ("n", "counted", "required"):
        return float(draw.randint(2, 12))
    return number(*bounds(argument), draw)


def series(argument: Argument, length: int, draw: random.Random) -> list[Any]:
    """A range's content: numbers with a blank here and there, or a column of a table."""
    if argument.text:
        return COLUMN_TEXTS.get(argument.name, KEYS)
    values: list[Any] = [number(*bounds(argument), draw) for _ in range(length)]
    if length > 4 and argument.name in ("values", "heats"):
        values[draw.randrange(length)] = draw.choice([None, "", "void"])
    return values


def exact_record(draw: random.Random) -> tuple[list[float], list[float], int, int]:
    """A record rounded to 0.1 mK, with the positions of the last readings of fore and main period."""
    step = draw.choice([0.5, 1.0])
    fore, main, after = draw.randint(5, 9), draw.randint(8, 18), draw.randint(8, 12)
    start, jacket, rise = number(20, 24, draw), number(25, 27, draw), number(1.5, 2.5, draw)
    cooling, release = number(0.001, 0.003, draw), number(1.0, 1.6, draw)
    times = [index * step for index in range(fore + main + after)]
    fired = times[fore - 1]
    curve = [_temperature(t - fired, start, jacket, rise, cooling, release) for t in times]
    return times, [round(value, 4) for value in curve], fore, fore + main


def _temperature(t: float, start: float, jacket: float, rise: float, k: float, release: float) -> float:
    drift = jacket + (start - jacket) * math.exp(-k * t)
    if t <= 0:
        return drift
    return drift + rise * release / (release - k) * (math.exp(-k * t) - math.exp(-release * t))


def record_chain(draw: random.Random) -> dict[str, Any]:
    """A record and every value that the functions of the corrected rise hand on to each other."""
    times, temperatures, fore_end, main_end = exact_record(draw)
    tail = [None] * draw.randint(0, 4)
    known: dict[str, Any] = {"time": times + tail, "temperature": temperatures + tail}
    known.update(moment=times[fore_end - 1] + draw.choice([0, 0.2, 1e-9]), fraction=draw.choice([0.6, 0.63]))
    known.update(fore_end=float(fore_end), main_end=float(main_end))
    known.update(first=float(fore_end), last=float(main_end))
    known.update(least=draw.choice([0.01, 0.0001]), margin=draw.choice([0.01, 0.0]))
    for key, name in (
        ("length", "RECORD_LENGTH"),
        ("fore_drift", "FORE_DRIFT"),
        ("after_drift", "AFTER_DRIFT"),
        ("drift", "EARLY_DRIFT"),
        ("level", "DEPARTURE_LEVEL"),
        ("fore_scatter", "FORE_SCATTER"),
        ("after_scatter", "AFTER_SCATTER"),
        ("fore_temperature", "FORE_TEMPERATURE"),
        ("after_temperature", "AFTER_TEMPERATURE"),
        ("cooling_constant", "COOLING_CONSTANT"),
        ("mean_temperature", "TIME_MEAN_TEMPERATURE"),
        ("exchange_correction", "EXCHANGE_CORRECTION"),
        ("fraction_temperature", "TEMPERATURE_OF_FRACTION"),
        ("fraction_time", "TIME_OF_FRACTION"),
    ):
        value = registry.evaluate(name, known)
        assert isinstance(value, float)
        known[key] = float(f"{value:.12g}")
    return known


def stuck_readings(drawn: dict[str, Any], draw: random.Random) -> list[Any]:
    """The record with three to six equal readings just after firing."""
    at, many = int(drawn["fore_end"]), draw.randint(3, 6)
    values = list(drawn["temperature"])
    values[at : at + many] = [values[at]] * many
    return values


def rounding_point(draw: random.Random) -> dict[str, Any]:
    """A value at, just beside or far from a tie of its step."""
    step = draw.choice([1.0, 10.0, 100.0, 0.1, 0.01, 0.002, 0.0001])
    beside = draw.choice([0.0, 0.0, 1e-12, -1e-12, 1e-7, -1e-7, 0.3])
    value = (draw.randint(-30000, 30000) + draw.choice([0.0, 0.5]) + beside) * step
    return {"value": float(f"{value:.15g}"), "step": step}


def body_point(function: CellFunction, draw: random.Random) -> dict[str, Any]:
    """A body of a heat balance, half of the time with a change of phase."""
    point = default_point(function, draw)
    point["amount"] = draw.choice([point["mass"], number(0, point["mass"], draw)])
    if draw.random() < 0.3:
        point.update(specific_heat_after=None, end=point["change_temperature"])
    return point


def candidate_point(function: CellFunction, draw: random.Random) -> dict[str, Any]:
    """A table of four materials, some of them near the value found; a key that tells one of them."""
    drawn = default_point(function, draw)
    near = {"places": [1.0, 2.0, 3.0, 4.0], "slopes": [0.0001, 0.0002, None, 0.0], "widths": [0.002, 0.0, 0.01, None]}
    near["values"] = [number(0.3, 0.5, draw) for _ in KEYS]
    near["densities"] = [2.7, 8.9, 7.1, None]
    drawn.update({name: value for name, value in near.items() if name in drawn})
    usual = {"found": 0.4, "doubt": 0.05, "temperature": 60.0, "density": draw.choice([0.0, 8.8]), "share": 0.05}
    drawn.update({name: value for name, value in usual.items() if name in drawn and function.name != "CANDIDATE_WORDS"})
    drawn.update({"before": draw.choice([None, 1998.0, 999.0, 0.0])} if "before" in drawn else {})
    drawn.update({"found": float(draw.randint(0, 8))} if "key" in drawn else {})
    drawn.update({"key": draw.choice([0.0, 1000.0]) + draw.choice([996.0, 998.0, 999.0])} if "key" in drawn else {})
    drawn.update({"found": float(draw.randint(0, 9))} if function.name == "CANDIDATE_WORDS" else {})
    return drawn


def default_point(function: CellFunction, draw: random.Random) -> dict[str, Any]:
    """Each argument drawn by itself."""
    table = any(argument.text and argument.series for argument in function.args)
    length = len(KEYS) if table else draw.randint(3, 9)
    return {
        argument.name: series(argument, length, draw) if argument.series else scalar(argument, draw)
        for argument in function.args
    }


def point(function: CellFunction, draw: random.Random) -> dict[str, Any]:
    """One point of the function."""
    if function.name == "ROUNDED_TO_STEP":
        return rounding_point(draw)
    if function.name.startswith("CANDIDATE"):
        return candidate_point(function, draw)
    if function.name == "BODY_HEAT":
        return body_point(function, draw)
    drawn = default_point(function, draw)
    on_record = any(argument.series and argument.unit == "degC" for argument in function.args)
    if on_record or function.body.__module__ in ON_RECORD:
        drawn.update({key: value for key, value in record_chain(draw).items() if key in drawn})
    if function.name == "EQUAL_RUNNING" and draw.random() < 0.7:
        drawn["temperature"] = stuck_readings(drawn, draw)
    if "start" in drawn and "end" in drawn and draw.random() < 0.8:
        drawn["end"] = scalar(function.argument("end"), draw)
    return drawn


def good_points(function: CellFunction) -> list[dict[str, Any]]:
    """At least 20 points where the function has a result. Raises AssertionError when they cannot be found."""
    draw = random.Random(function.name)
    found: list[dict[str, Any]] = []
    for _ in range(2000):
        drawn = point(function, draw)
        if registry.evaluate(function.name, drawn) is not None:
            found.append(drawn)
        if len(found) == GOOD_POINTS:
            return found
    raise AssertionError(f"{function.name}: only {len(found)} points with a result")


def edge_points(function: CellFunction) -> list[dict[str, Any]]:
    """Bounds, values just beyond them, blanks, text, an error value, a strange choice, an empty range."""
    good = good_points(function)[0]
    return [{**good, argument.name: odd} for argument in function.args for odd in _odd(argument, good)]


def _odd(argument: Argument, good: dict[str, Any]) -> list[Any]:
    if argument.series:
        return [[None] * len(good[argument.name])]
    if argument.text:
        return [None, "", "nonsense", 7.0, ErrorCell()]
    ends = [value for value in (argument.low, argument.high) if value is not None]
    beyond = [ends[0] - 1.0, ends[-1] + 1.0] if ends else []
    return [None, "", "24,812", 0.0, ErrorCell(), *ends, *beyond]
