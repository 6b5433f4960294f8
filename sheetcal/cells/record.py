"""What a temperature record says of itself: its length, when it was fired, stuck readings, how well it gives the rise.

Standard library only: this file also runs inside LibreOffice's Python.
"""

from typing import Annotated, Any, Sequence

from sheetcal.cells.primitives import (
    at,
    count,
    deviation,
    floor,
    interpolate,
    not_above_line,
    part,
    scatter,
    slope,
    sqrt,
    stuck,
)
from sheetcal.cells.registry import (
    COLUMN,
    DEGC,
    DEGC_OR_BLANK,
    K_PER_MIN,
    MIN,
    ONE,
    ONE_OR_BLANK,
    TEMPERATURES,
    TEXT,
    TIMES,
    K,
    cell,
)

TEMPERATURES_OR_NONE = Annotated[Sequence[Any], "degC", COLUMN]

_EARLY = "the earlier half of the fore-period: free of the rise even where the firing time was typed late"
_GUM = "propagation of independent parts, JCGM 100"


@cell(
    "RECORD_COUNT",
    equation="n = number of readings, only where the record is sound",
    source="the line that judges the record",
    standing="derived",
    choices={"state": ("sound",)},
)
def record_count(state: TEXT, time: TIMES) -> ONE:
    """Number of readings of a record that was found sound."""
    return count(time)


@cell(
    "EARLY_DRIFT",
    equation="slope of T over t, the earlier half of the fore-period",
    source=_EARLY,
    standing="derived",
    valid={"fore_end": (4.0, None)},
)
def early_drift(time: TIMES, temperature: TEMPERATURES, fore_end: ONE) -> K_PER_MIN:
    """Drift of the earlier half of the fore-period."""
    half = floor(fore_end / 2) + 1
    return slope(part(temperature, 1, half), part(time, 1, half))


@cell(
    "DEPARTURE_LEVEL",
    equation="line of the early readings at t = 0, plus the larger of 5 x their scatter and the least departure",
    source=_EARLY,
    standing="derived",
    valid={"fore_end": (4.0, None), "least": (0.0, None)},
)
def departure_level(time: TIMES, temperature: TEMPERATURES, fore_end: ONE, least: K) -> DEGC:
    """Temperature at time 0 of a line that no reading crosses before the charge is fired."""
    half = floor(fore_end / 2) + 1
    early_temperatures = part(temperature, 1, half)
    early_times = part(time, 1, half)
    return interpolate(0, early_temperatures, early_times) + max(5 * scatter(early_temperatures, early_times), least)


@cell(
    "FIRING_FOUND",
    equation="last reading before T - g t stays above the level",
    source="the calorimeter leaves its fore drift at firing and does not come back to it",
    standing="derived",
    valid={"length": (4.0, None)},
    needs=("not_above_line(temperature, time, length, drift, level) >= 1",),
)
def firing_found(time: TIMES, temperature: TEMPERATURES, length: ONE, drift: K_PER_MIN, level: DEGC) -> MIN:
    """Time of the last reading before the record leaves its early drift."""
    return at(time, not_above_line(temperature, time, length, drift, level))


@cell(
    "EQUAL_RUNNING",
    equation="readings equal to the three after them while the end of the main period is still far",
    source="a temperature that has still to move does not stand still for four readings",
    standing="derived",
    needs=("fore_end >= 1 and main_end - fore_end >= 4",),
)
def equal_running(temperature: TEMPERATURES, fore_end: ONE, main_end: ONE, margin: K) -> ONE:
    """How many readings of the main period stand still though the temperature is off its end by more than a margin."""
    return stuck(temperature, fore_end + 1, main_end, margin)


@cell(
    "RISE_UNCERTAINTY",
    equation="u^2 = s_i^2 + s_f^2 + L^2 [(w u(g_i))^2 + ((1 - w) u(g_f))^2], w = (t_mf - t_m)/(t_mf - t_mi)",
    source=_GUM + "; Regnault-Pfaundler with L the main period; u(g) = s/(s_t sqrt(n - 1)) of each drift",
    standing="derived",
    needs=(
        "fore_end >= 3 and main_end > fore_end and length - main_end >= 2",
        "after_temperature != fore_temperature",
    ),
)
def rise_uncertainty(
    time: TIMES,
    fore_end: ONE,
    main_end: ONE,
    length: ONE,
    fore_scatter: K,
    after_scatter: K,
    fore_temperature: DEGC,
    after_temperature: DEGC,
    mean_temperature: DEGC,
) -> K:
    """Standard uncertainty of the corrected rise from the scatter of the two drifts alone."""
    share = (after_temperature - mean_temperature) / (after_temperature - fore_temperature)
    duration = at(time, main_end) - at(time, fore_end)
    early = fore_scatter * share * duration / deviation(part(time, 1, fore_end))
    late = after_scatter * (1 - share) * duration / deviation(part(time, main_end, length))
    drifts = early**2 / (fore_end - 1) + late**2 / (length - main_end)
    return sqrt(fore_scatter**2 + after_scatter**2 + drifts)


@cell(
    "END_TEMPERATURE",
    equation="temperature at the end of the main period, by the source of the rise",
    source="the sheet's choice of record, three readings, instrument or adiabatic",
    standing="derived",
    valid={"main_end": (1.0, None)},
    choices={"source": ("record", "three readings", "instrument", "adiabatic")},
    needs=(
        "is_number(main_end) and count(temperature) >= main_end if source == 'record'"
        " else is_number(three) if source == 'three readings'"
        " else is_number(instrument) if source == 'instrument' else is_number(adiabatic)",
    ),
)
def end_temperature(
    source: TEXT,
    temperature: TEMPERATURES_OR_NONE,
    main_end: ONE_OR_BLANK,
    three: DEGC_OR_BLANK,
    instrument: DEGC_OR_BLANK,
    adiabatic: DEGC_OR_BLANK,
) -> DEGC:
    """Temperature at which the calorimeter arrived."""
    typed = three if source == "three readings" else instrument if source == "instrument" else adiabatic
    return at(temperature, main_end) if source == "record" else typed
