"""Calibration: the conditions of the run, the heat capacity at the reference water, and what the runs say.

Standard library only: this file also runs inside LibreOffice's Python.
"""

from typing import Annotated

from sheetcal.cells.constants import KPA_PER_MPA
from sheetcal.cells.primitives import choose, floor, is_number, sqrt
from sheetcal.cells.registry import (
    ANY,
    G_OR_BLANK,
    J_OR_BLANK,
    J_PER_G,
    J_PER_G_K,
    J_PER_K,
    J_PER_ML,
    ML_OR_BLANK,
    MPA,
    ONE,
    ONE_OR_BLANK,
    OPTIONAL,
    PERCENT,
    PERCENT_OR_BLANK,
    SAME,
    SAME_AS_VALUE,
    TEXT,
    TEXT_OR_BLANK,
    Constant,
    J,
    cell,
)

KPA_OR_BLANK = Annotated[float, "kPa", OPTIONAL]
DATE = Annotated[float, "date"]
SAME_AS_VALUE_OR_BLANK = Annotated[float, SAME + "value", OPTIONAL]

AMBIENT = Constant(
    0.1, "MPa", "ambient_pressure", "round atmosphere; 0.1 MPa is 20 ppm of the certificate value", "derived"
)
_CERTIFICATE = "conditions named in the certificate"
_STUDENT = "Student's t, two-sided 5 %, n - 2 degrees of freedom"
_GUM = "propagation of independent parts, JCGM 100"


@cell(
    "OXYGEN_ABSOLUTE",
    equation="P = gauge + station pressure, or + a round atmosphere",
    source="definition of a gauge pressure",
    standing="derived",
)
def oxygen_absolute(gauge: MPA, station_pressure: KPA_OR_BLANK) -> MPA:
    """Absolute oxygen pressure; without a station pressure a round atmosphere is added."""
    return gauge + (station_pressure / KPA_PER_MPA if is_number(station_pressure) else AMBIENT)


@cell(
    "CONDITION_FACTOR",
    equation="f where certificate conditions are corrected for, else 1",
    source=_CERTIFICATE,
    standing="derived",
    needs=("applied != 1 or is_number(factor)",),
)
def condition_factor(applied: ONE, factor: ONE_OR_BLANK) -> ONE:
    """Factor of the certificate conditions as the profile or the lab file wants it; applied: 1 yes, 0 no."""
    return factor if applied == 1 else 1


@cell(
    "NITRIC_HEAT_FROM_TITRE",
    equation="Q = q V of 0.1 mol/L, or the fixed heat",
    source="formation of nitric acid from nitrogen, oxygen and water",
    standing="derived",
    needs=("is_number(acid_volume) or is_number(fixed)",),
)
def nitric_heat_from_titre(acid_volume: ML_OR_BLANK, fixed: J_OR_BLANK, heat_per_mL: J_PER_ML) -> J:
    """Heat of nitric acid where no sulfur and no chlorine were burnt: all acid is nitric."""
    return heat_per_mL * acid_volume if is_number(acid_volume) else fixed


@cell(
    "HEAT_CAPACITY_AT_REFERENCE",
    equation="eps - (m - m0) c",
    source="calorimeter water weighed against the reference",
    standing="derived",
    needs=("is_number(reference) or not is_number(water)",),
)
def heat_capacity_at_reference(
    heat_capacity: J_PER_K, water: G_OR_BLANK, reference: G_OR_BLANK, specific_heat: J_PER_G_K
) -> J_PER_K:
    """Effective heat capacity brought to the reference mass of calorimeter water."""
    return heat_capacity - ((water - reference) * specific_heat if is_number(water) else 0)


@cell(
    "OUTLIER_STATISTIC",
    equation="|x - mean| / s",
    source="Grubbs' statistic of one value, ISO 5725-2",
    standing="memory",
    needs=("deviation > 0",),
)
def outlier_statistic(value: ANY, mean: SAME_AS_VALUE, deviation: SAME_AS_VALUE) -> ONE:
    """How many standard deviations one run lies off the mean of all that count."""
    return abs(value - mean) / deviation


@cell(
    "SLOPE_LIMIT",
    equation="t(0.975, n - 2)",
    source=_STUDENT,
    standing="published",
    valid={"n": (3.0, 20.0)},
)
def slope_limit(n: ONE) -> ONE:
    """Limit for the t of a slope found from n runs."""
    return choose(
        n - 2,
        12.706,
        4.303,
        3.182,
        2.776,
        2.571,
        2.447,
        2.365,
        2.306,
        2.262,
        2.228,
        2.201,
        2.179,
        2.16,
        2.145,
        2.131,
        2.12,
        2.11,
        2.101,
    )


@cell("SLOPE_WORDS", equation="line where |t| > limit, else constant", source=_STUDENT, standing="derived")
def slope_words(t: ONE, limit: ONE) -> TEXT:
    """Whether one heat capacity serves all rises."""
    return "line: it changes with the rise" if abs(t) > limit else "constant: no slope seen"


@cell(
    "CALIBRATION_UNCERTAINTY",
    equation="u = sqrt(s^2/n + (eps U/(k q))^2)",
    source=_GUM,
    standing="derived",
    needs=("n > 0 and coverage > 0 and value > 0",),
)
def calibration_uncertainty(
    mean: J_PER_K, deviation: J_PER_K, n: ONE, certificate: J_PER_G, coverage: ONE, value: J_PER_G
) -> J_PER_K:
    """Standard uncertainty of the mean heat capacity: scatter of the runs and the certificate."""
    return sqrt(deviation**2 / n + (mean * certificate / (coverage * value)) ** 2)


@cell(
    "EXPANDED_UNCERTAINTY",
    equation="U = k u",
    source=_GUM,
    standing="derived",
    valid={"coverage": (1.0, 10.0)},
)
def expanded_uncertainty(value: ANY, coverage: ONE) -> SAME_AS_VALUE:
    """Expanded uncertainty from a standard uncertainty."""
    return coverage * value


@cell(
    "CALIBRATION_NEXT",
    equation="enough runs and scatter within the limit: adopt; else one more run",
    source="method profile",
    standing="derived",
)
def calibration_next(
    counted: ONE_OR_BLANK, required: ONE, relative_deviation: PERCENT_OR_BLANK, limit: PERCENT
) -> TEXT:
    """What the runs so far ask for."""
    done = counted if is_number(counted) else 0
    wide = is_number(relative_deviation) and relative_deviation > limit
    judged = "scatter above the limit: find the run, fire again" if wide else "enough runs: adopt the mean"
    fewer = "one more run" if required - done == 1 else "runs still to be done"
    return judged if done >= required else fewer


_KEPT = "range of the last mapping calibration, kept by one of usual mass within the limit of change"


@cell("LOW_END_COVERED", equation="own, or the smaller of own and in force", source=_KEPT, standing="derived")
def low_end_covered(
    value: ANY,
    in_force: SAME_AS_VALUE_OR_BLANK,
    change: PERCENT_OR_BLANK,
    limit: PERCENT,
    plan: TEXT_OR_BLANK,
) -> SAME_AS_VALUE:
    """Low end of the range that the heat capacity covers."""
    steady = is_number(change) and abs(change) <= limit
    kept = plan != "mapping" and is_number(in_force) and steady
    return min(value, in_force) if kept else value


@cell("HIGH_END_COVERED", equation="own, or the larger of own and in force", source=_KEPT, standing="derived")
def high_end_covered(
    value: ANY,
    in_force: SAME_AS_VALUE_OR_BLANK,
    change: PERCENT_OR_BLANK,
    limit: PERCENT,
    plan: TEXT_OR_BLANK,
) -> SAME_AS_VALUE:
    """High end of the range that the heat capacity covers."""
    steady = is_number(change) and abs(change) <= limit
    kept = plan != "mapping" and is_number(in_force) and steady
    return max(value, in_force) if kept else value


@cell(
    "VALID_UNTIL",
    equation="last day + 30.17 days for each month, whole days",
    source="the shortest six months of a calendar are 181 days: no method is stretched",
    standing="derived",
    valid={"months": (0.0, 60.0)},
)
def valid_until(last: DATE, months: ONE) -> DATE:
    """Last day on which the calibration may be used."""
    return floor(last) + floor(30.17 * months)
