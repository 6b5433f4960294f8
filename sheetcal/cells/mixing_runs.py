"""Runs of mixing: temperatures from the water's record, roles of the runs, masses that must add up.

Standard library only: this file also runs inside LibreOffice's Python.
"""

from typing import Annotated

from sheetcal.cells.primitives import at, floor, interpolate, is_number, part, slope, sqrt, trapezoid
from sheetcal.cells.registry import (
    ANY,
    DEGC,
    DEGC_OR_BLANK,
    J_PER_G_K,
    J_PER_G_K_OR_BLANK,
    J_PER_K,
    K_PER_MIN,
    MIN,
    ONE,
    OPTIONAL,
    SAME_AS_VALUE,
    TEMPERATURES,
    TEXT,
    TIMES,
    Constant,
    G,
    K,
    cell,
)

J_PER_K_OR_BLANK = Annotated[float, "J/K", OPTIONAL]
SLOPE_OR_BLANK = Annotated[float, "J/(g K**2)", OPTIONAL]
LIQUID_REFERENCE = Constant(
    20.0,
    "degC",
    "liquid_reference",
    "a liquid's specific heat is stated at this temperature",
    "derived",
)

_LINE = "least-squares line"
_ROLES = "role and state that the sheet gives the run"
_PERIOD = "first >= 1 and last > first"


@cell(
    "TIME_OF_STEP",
    equation="t_x = t2 - integral of (T - T1) dt / (T2 - T1)",
    source="equal areas; for an exponential approach this is 1 - 1/e = 63 % of the step",
    standing="derived",
    needs=(_PERIOD, "at(temperature, last) != at(temperature, first)"),
)
def time_of_step(time: TIMES, temperature: TEMPERATURES, first: ONE, last: ONE) -> MIN:
    """Moment at which a step, up or down, may be taken to have happened at once."""
    start = at(temperature, first)
    area = trapezoid(time, temperature, first, last) - start * (at(time, last) - at(time, first))
    return at(time, last) - area / (at(temperature, last) - start)


@cell(
    "LINE_AT",
    equation="T of the line through readings first..last, at the moment",
    source=_LINE,
    standing="derived",
    needs=("first >= 1 and last - first >= 2",),
)
def line_at(time: TIMES, temperature: TEMPERATURES, first: ONE, last: ONE, moment: MIN) -> DEGC:
    """Temperature of a steady drift, extended to a moment."""
    return interpolate(moment, part(temperature, first, last), part(time, first, last))


@cell(
    "AFTER_BEND",
    equation="slope of the later half less slope of the earlier half",
    source=_LINE,
    standing="derived",
    needs=("main_end >= 1 and length - main_end >= 5",),
)
def after_bend(time: TIMES, temperature: TEMPERATURES, main_end: ONE, length: ONE) -> K_PER_MIN:
    """How far the drift still changes after the main period: not 0 while the body gives off heat."""
    middle = floor((main_end + length) / 2)
    early = slope(part(temperature, main_end, middle), part(time, main_end, middle))
    return slope(part(temperature, middle, length), part(time, middle, length)) - early


@cell(
    "LIQUID_SPECIFIC_HEAT",
    equation="c of water, or c(20) + b (T - 20 degC)",
    source="the liquid named on the sheet",
    standing="derived",
    choices={"liquid": ("water", "other")},
    needs=("is_number(of_water) if liquid == 'water' else is_number(stated)",),
)
def liquid_specific_heat(
    liquid: TEXT,
    of_water: J_PER_G_K_OR_BLANK,
    stated: J_PER_G_K_OR_BLANK,
    per_kelvin: SLOPE_OR_BLANK,
    temperature: DEGC,
) -> J_PER_G_K:
    """Specific heat of the liquid at its own mean temperature; without a slope the stated one is kept."""
    change = per_kelvin * (temperature - LIQUID_REFERENCE) if is_number(per_kelvin) else 0
    return of_water if liquid == "water" else stated + change


@cell(
    "HEAT_CAPACITY_BY_SOURCE",
    equation="as given, or the mean of the blank runs",
    source="the source chosen on the sheet",
    standing="derived",
    choices={"source": ("given", "blank runs")},
    needs=("is_number(given) if source == 'given' else is_number(measured)",),
)
def heat_capacity_by_source(source: TEXT, given: J_PER_K_OR_BLANK, measured: J_PER_K_OR_BLANK) -> J_PER_K:
    """Heat capacity of the cup from the source that the sheet names."""
    return given if source == "given" else measured


@cell(
    "WATER_SIDE",
    equation="m_w c_w + C",
    source="first law",
    standing="derived",
    valid={"water": (0.0, 1e6), "specific_heat": (0.0, 20.0)},
)
def water_side(water: G, specific_heat: J_PER_G_K, vessel_heat_capacity: J_PER_K) -> J_PER_K:
    """Heat capacity of the liquid and its cup."""
    return water * specific_heat + vessel_heat_capacity


@cell(
    "MASS_SUM_ERROR",
    equation="end - (cup with water + sample)",
    source="mass is kept",
    standing="derived",
)
def mass_sum_error(end: G, cup_with_water: G, sample: G) -> G:
    """Mass found at the end less what was put together: water carried over or lost."""
    return end - cup_with_water - sample


@cell(
    "SAMPLE_COUNTED",
    equation="the value, where the run is valid and a sample's",
    source=_ROLES,
    standing="derived",
    choices={"state": ("valid",), "role": ("sample",)},
)
def sample_counted(value: ANY, state: TEXT, role: TEXT) -> SAME_AS_VALUE:
    """A run's value where it counts for the sample."""
    return value


@cell(
    "BLANK_COUNTED",
    equation="the value, where the run is valid and a blank",
    source=_ROLES,
    standing="derived",
    choices={"state": ("valid",), "role": ("blank",)},
)
def blank_counted(value: ANY, state: TEXT, role: TEXT) -> SAME_AS_VALUE:
    """A run's value where it counts for the cup."""
    return value


@cell(
    "CHECK_DEVIATION",
    equation="100 (found - book)/book",
    source="check body of known specific heat",
    standing="derived",
    choices={"role": ("check body",)},
    needs=("reference > 0",),
)
def check_deviation(found: J_PER_G_K, reference: J_PER_G_K, role: TEXT) -> Annotated[float, "%"]:
    """A check body's specific heat against its book value."""
    return 100 * (found - reference) / reference


@cell(
    "SPECIFIC_HEAT_UNCERTAINTY",
    equation="u = sqrt(s^2/n + c^2 [2 (u_T/dT)^2 + (U_C/k/(m_w c_w + C))^2])",
    source="propagation of independent parts, JCGM 100",
    standing="derived",
    needs=("n > 0 and rise != 0 and capacity > 0 and coverage > 0",),
)
def specific_heat_uncertainty(
    mean: J_PER_G_K,
    deviation: J_PER_G_K,
    n: ONE,
    rise: K,
    temperature_uncertainty: K,
    capacity: J_PER_K,
    cup_uncertainty: J_PER_K_OR_BLANK,
    coverage: ONE,
) -> J_PER_G_K:
    """Standard uncertainty of a mean specific heat: scatter, the two temperatures of the water, the cup."""
    cup = cup_uncertainty / coverage / capacity if is_number(cup_uncertainty) else 0
    relative = 2 * (temperature_uncertainty / rise) ** 2 + cup**2
    return sqrt(deviation**2 / n + mean**2 * relative)


@cell(
    "TEMPERATURE_BY_SOURCE",
    equation="as typed, or from the record",
    source="the source chosen on the sheet",
    standing="derived",
    choices={"source": ("typed", "record")},
    needs=("is_number(typed) if source == 'typed' else is_number(from_record)",),
)
def temperature_by_source(source: TEXT, typed: DEGC_OR_BLANK, from_record: DEGC_OR_BLANK) -> DEGC:
    """Temperature of the liquid from the source that the run names."""
    return typed if source == "typed" else from_record


@cell(
    "FIRST_POSITION",
    equation="1, where the record is sound",
    source="records are filled from the first line",
    standing="derived",
    valid={"length": (2.0, None)},
)
def first_position(length: ONE) -> ONE:
    """Position of the first reading of a record."""
    return 1
