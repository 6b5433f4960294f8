"""Corrected rise: from a temperature record to the rise without the jacket's heat.

A record is a column of times and a column of temperatures, filled from the first place without a gap.
Standard library only: this file also runs inside LibreOffice's Python.
"""

from typing import Annotated, Any, Sequence

from sheetcal.cells.primitives import (
    at,
    count,
    filled,
    interpolate,
    is_number,
    jumps,
    largest,
    mean,
    not_rising,
    pairs,
    part,
    position,
    scatter,
    slope,
    smallest,
    trapezoid,
)
from sheetcal.cells.registry import (
    COLUMN,
    DEGC,
    K_OR_BLANK,
    K_PER_MIN,
    K_PER_MIN_OR_BLANK,
    MIN,
    MIN_OR_BLANK,
    ONE,
    PER_MIN,
    TEMPERATURES,
    TEXT,
    TIMES,
    Constant,
    K,
    cell,
)

MOMENT_TOLERANCE = Constant(
    1e-6,
    "min",
    name="moment_tolerance",
    source="a reading this close to a moment is at it",
    standing="derived",
)
LARGEST_STEP = Constant(
    15.0, "K", name="largest_step", source="no calorimeter moves further between readings", standing="memory"
)
RECORD_TIMES = Annotated[Sequence[Any], "min", COLUMN]
RECORD_TEMPERATURES = Annotated[Sequence[Any], "degC", COLUMN]
_LINE = "least-squares line"
_PFAUNDLER = "Regnault-Pfaundler, as in ISO 1928 and GOST 147"

_NUMBERS = "filled(time) == count(time) and filled(temperature) == count(temperature)"
_PAIRED = "count(time) == count(temperature) and count(time) >= 2"
_NO_GAP = "count(part(time, 1, count(time))) + count(part(temperature, 1, count(time))) == 2 * count(time)"
_RISING = "not_rising(time, count(time)) == 0"
_BELIEVABLE = (
    "smallest(temperature) >= -50 and largest(temperature) <= 200"
    " and jumps(temperature, count(time), LARGEST_STEP) == 0"
)
_PERIODS = "fore_end >= 1 and main_end > fore_end"


@cell(
    "RECORD_LENGTH",
    equation="n = number of readings, only where the record is sound",
    source="numbers only, paired, no gap, times rising, temperatures believable",
    standing="derived",
    needs=(_NUMBERS, _PAIRED, _NO_GAP, _RISING, _BELIEVABLE),
)
def record_length(time: TIMES, temperature: TEMPERATURES) -> ONE:
    """Number of readings of a sound record."""
    return count(time)


@cell(
    "RECORD_STATE",
    equation="the first thing wrong with the record, in words",
    source="numbers only, paired, no gap, times rising, temperatures believable",
    standing="derived",
)
def record_state(time: RECORD_TIMES, temperature: RECORD_TEMPERATURES) -> TEXT:
    """Whether a record can be used, and if not, why."""
    n = count(time)
    calm = smallest(temperature) >= -50 and jumps(temperature, n, LARGEST_STEP) == 0
    last = "sound" if calm and largest(temperature) <= 200 else "temperature out of range or a jump"
    rising = "fewer than two readings" if n < 2 else last if not_rising(time, n) == 0 else "times do not rise"
    paired = count(temperature) == n and pairs(part(time, 1, n), part(temperature, 1, n)) == n
    order = rising if paired else "time and temperature not paired, or a gap"
    words = (
        order if filled(time) + filled(temperature) == n + count(temperature) else "text, error or date in the record"
    )
    return "empty" if filled(time) + filled(temperature) == 0 else words


@cell(
    "READING_AT",
    equation="i = last reading with t <= moment",
    source="position in the rising times",
    standing="derived",
    valid={"length": (2.0, None)},
    needs=(
        "moment >= at(time, 1) - MOMENT_TOLERANCE",
        "moment <= at(time, length) + MOMENT_TOLERANCE",
    ),
)
def reading_at(time: TIMES, length: ONE, moment: MIN) -> ONE:
    """Position of the last reading at or before a moment."""
    return position(moment + MOMENT_TOLERANCE, part(time, 1, length))


@cell(
    "FORE_DRIFT",
    equation="g_i = slope of T over t in the fore-period",
    source=_LINE,
    standing="derived",
    valid={"fore_end": (3.0, None)},
)
def fore_drift(time: TIMES, temperature: TEMPERATURES, fore_end: ONE) -> K_PER_MIN:
    """Drift before firing, by least squares over the fore-period's readings."""
    return slope(part(temperature, 1, fore_end), part(time, 1, fore_end))


@cell(
    "AFTER_DRIFT",
    equation="g_f = slope of T over t in the after-period",
    source=_LINE,
    standing="derived",
    valid={"main_end": (1.0, None)},
    needs=("length - main_end >= 2",),
)
def after_drift(time: TIMES, temperature: TEMPERATURES, main_end: ONE, length: ONE) -> K_PER_MIN:
    """Drift after the main period, by least squares over the after-period's readings."""
    return slope(part(temperature, main_end, length), part(time, main_end, length))


@cell(
    "FORE_SCATTER",
    equation="s = sqrt(sum (T - line)^2 / (n - 2))",
    source=_LINE,
    standing="derived",
    valid={"fore_end": (3.0, None)},
)
def fore_scatter(time: TIMES, temperature: TEMPERATURES, fore_end: ONE) -> K:
    """Scatter of the fore-period's readings about their drift."""
    return scatter(part(temperature, 1, fore_end), part(time, 1, fore_end))


@cell(
    "AFTER_SCATTER",
    equation="s = sqrt(sum (T - line)^2 / (n - 2))",
    source=_LINE,
    standing="derived",
    valid={"main_end": (1.0, None)},
    needs=("length - main_end >= 2",),
)
def after_scatter(time: TIMES, temperature: TEMPERATURES, main_end: ONE, length: ONE) -> K:
    """Scatter of the after-period's readings about their drift."""
    return scatter(part(temperature, main_end, length), part(time, main_end, length))


@cell(
    "FORE_TEMPERATURE",
    equation="t_mi = mean T of the fore-period",
    source=_PFAUNDLER,
    valid={"fore_end": (3.0, None)},
)
def fore_temperature(temperature: TEMPERATURES, fore_end: ONE) -> DEGC:
    """Mean temperature of the fore-period."""
    return mean(part(temperature, 1, fore_end))


@cell(
    "AFTER_TEMPERATURE",
    equation="t_mf = mean T of the after-period",
    source=_PFAUNDLER,
    valid={"main_end": (1.0, None)},
    needs=("length - main_end >= 2",),
)
def after_temperature(temperature: TEMPERATURES, main_end: ONE, length: ONE) -> DEGC:
    """Mean temperature of the after-period."""
    return mean(part(temperature, main_end, length))


@cell(
    "COOLING_CONSTANT",
    equation="G = (g_i - g_f) / (t_mf - t_mi)",
    source=_PFAUNDLER,
    needs=("after_temperature != fore_temperature",),
)
def cooling_constant(
    fore_drift: K_PER_MIN, after_drift: K_PER_MIN, fore_temperature: DEGC, after_temperature: DEGC
) -> PER_MIN:
    """Cooling constant of the calorimeter in its jacket (Newton's law)."""
    return (fore_drift - after_drift) / (after_temperature - fore_temperature)


@cell(
    "CONVERGENCE_TEMPERATURE",
    equation="t_inf = t_mf + g_f / G",
    source=_PFAUNDLER,
    needs=("cooling_constant != 0",),
)
def convergence_temperature(after_temperature: DEGC, after_drift: K_PER_MIN, cooling_constant: PER_MIN) -> DEGC:
    """Temperature at which the calorimeter would come to rest."""
    return after_temperature + after_drift / cooling_constant


@cell(
    "TIME_MEAN_TEMPERATURE",
    equation="t_m = integral of T over the main period / its duration, by trapezoids",
    source=_PFAUNDLER,
    needs=(_PERIODS, "at(time, main_end) > at(time, fore_end)"),
)
def time_mean_temperature(time: TIMES, temperature: TEMPERATURES, fore_end: ONE, main_end: ONE) -> DEGC:
    """Mean temperature over time of the main period."""
    return trapezoid(time, temperature, fore_end, main_end) / (at(time, main_end) - at(time, fore_end))


@cell(
    "EXCHANGE_CORRECTION",
    equation="d_ex = (tau_f - tau_i) [g_f + G (t_mf - t_m)]",
    source=_PFAUNDLER,
    needs=(_PERIODS,),
)
def exchange_correction(
    time: TIMES,
    fore_end: ONE,
    main_end: ONE,
    after_drift: K_PER_MIN,
    cooling_constant: PER_MIN,
    after_temperature: DEGC,
    mean_temperature: DEGC,
) -> K:
    """Part of the rise that the jacket and the stirrer gave during the main period."""
    duration = at(time, main_end) - at(time, fore_end)
    return duration * (after_drift + cooling_constant * (after_temperature - mean_temperature))


@cell(
    "TEMPERATURE_OF_FRACTION",
    equation="t_x = t_i + x (t_f - t_i)",
    source="Dickinson 1914; fraction by the profile",
    valid={"fraction": (0.05, 0.95)},
    needs=(_PERIODS,),
)
def temperature_of_fraction(temperature: TEMPERATURES, fore_end: ONE, main_end: ONE, fraction: ONE) -> DEGC:
    """Temperature at which a fraction of the observed rise is reached."""
    start = at(temperature, fore_end)
    return start + fraction * (at(temperature, main_end) - start)


@cell(
    "TIME_OF_FRACTION",
    equation="tau_x: T(tau_x) = t_x, straight line between the two readings around it",
    source="Dickinson 1914",
    needs=(
        _PERIODS,
        "fraction_temperature >= at(temperature, fore_end)",
        "fraction_temperature < at(temperature, main_end)",
    ),
)
def time_of_fraction(
    time: TIMES, temperature: TEMPERATURES, fore_end: ONE, main_end: ONE, fraction_temperature: DEGC
) -> MIN:
    """Time at which the temperature of the fraction is passed."""
    before = fore_end - 1 + position(fraction_temperature, part(temperature, fore_end, main_end))
    return interpolate(fraction_temperature, part(time, before, before + 1), part(temperature, before, before + 1))


@cell(
    "EXCHANGE_BY_FRACTION",
    equation="d_ex = g_i (tau_x - tau_i) + g_f (tau_f - tau_x)",
    source="Dickinson 1914",
    needs=(_PERIODS,),
)
def exchange_by_fraction(
    time: TIMES,
    fore_end: ONE,
    main_end: ONE,
    fore_drift: K_PER_MIN,
    after_drift: K_PER_MIN,
    fraction_time: MIN,
) -> K:
    """Exchange with the jacket, the fore drift up to the time of the fraction and the after drift from it."""
    before = fore_drift * (fraction_time - at(time, fore_end))
    return before + after_drift * (at(time, main_end) - fraction_time)


@cell(
    "RISE_FROM_RECORD",
    equation="theta = t_f - t_i - d_ex",
    source=_PFAUNDLER,
    needs=(_PERIODS,),
)
def rise_from_record(temperature: TEMPERATURES, fore_end: ONE, main_end: ONE, exchange_correction: K) -> K:
    """Corrected temperature rise."""
    return at(temperature, main_end) - at(temperature, fore_end) - exchange_correction


@cell(
    "RISE_FROM_THREE_READINGS",
    equation="theta = t_c - t_a - r1 (b - a) - r2 (c - b)",
    source="hand form of ASTM D240 and D5865: a firing, b 60 % of the rise, c end; rising rates positive",
    standing="memory",
    needs=("time_a <= time_b and time_b <= time_c",),
)
def rise_from_three_readings(
    time_a: MIN,
    temperature_a: DEGC,
    time_b: MIN,
    time_c: MIN,
    temperature_c: DEGC,
    fore_drift: K_PER_MIN,
    after_drift: K_PER_MIN,
) -> K:
    """Corrected rise from the readings at firing, at 60 % of the rise and at the end."""
    before = fore_drift * (time_b - time_a)
    return temperature_c - temperature_a - before - after_drift * (time_c - time_b)


@cell(
    "RISE_ADIABATIC",
    equation="theta = t_f - t_i - (g_1 + g_2)/2 x duration",
    source="adiabatic jacket; what drift remains is taken as steady",
    standing="derived",
    valid={"duration": (0.0, None)},
    needs=(
        "is_number(drift_before) or is_blank(drift_before) and is_blank(drift_after)",
        "is_number(duration) or is_blank(drift_before)",
    ),
)
def rise_adiabatic(
    start_temperature: DEGC,
    end_temperature: DEGC,
    drift_before: K_PER_MIN_OR_BLANK,
    drift_after: K_PER_MIN_OR_BLANK,
    duration: MIN_OR_BLANK,
) -> K:
    """Rise in an adiabatic jacket less the residual drift; without drifts the plain difference."""
    last_drift = drift_after if is_number(drift_after) else drift_before
    drift = (drift_before + last_drift) / 2 * duration if is_number(drift_before) else 0
    return end_temperature - start_temperature - drift


_SOURCES = ("record", "three readings", "instrument", "adiabatic", "value only")


@cell(
    "RISE_BY_SOURCE",
    equation="theta of the chosen source",
    source="the sheet's choice of record, three readings, instrument, adiabatic or value only",
    standing="derived",
    choices={"source": _SOURCES},
    needs=(
        "is_number(from_record) if source == 'record'"
        " else is_number(from_three) if source == 'three readings'"
        " else is_number(from_instrument) if source == 'instrument'"
        " else is_number(adiabatic) if source == 'adiabatic' else is_number(from_value)",
    ),
)
def rise_by_source(
    source: TEXT,
    from_record: K_OR_BLANK,
    from_three: K_OR_BLANK,
    from_instrument: K_OR_BLANK,
    adiabatic: K_OR_BLANK,
    from_value: K_OR_BLANK,
) -> K:
    """Corrected rise from the source that the run names."""
    last = from_value if source == "value only" and is_number(from_value) else adiabatic
    by_instrument = from_instrument if source == "instrument" else last
    by_hand = from_three if source == "three readings" else by_instrument
    return from_record if source == "record" else by_hand
