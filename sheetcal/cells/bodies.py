"""Bodies that exchange heat: heater and loss, what closes the balance, and the one quantity not known.

Standard library only: this file also runs inside LibreOffice's Python.
"""

from typing import Annotated, Any, Sequence

from sheetcal.cells.primitives import count, filled, is_number, sqrt, total, total_size, weighted
from sheetcal.cells.registry import (
    COLUMN,
    DEGC,
    DEGC_OR_BLANK,
    G_OR_BLANK,
    HEATS,
    J_OR_BLANK,
    J_PER_G,
    J_PER_G_K,
    J_PER_G_K_OR_BLANK,
    J_PER_G_OR_BLANK,
    J_PER_K,
    OPTIONAL,
    PERCENT,
    TEXT,
    TEXT_OR_BLANK,
    TEXTS,
    G,
    J,
    K,
    cell,
)

VOLT_OR_BLANK = Annotated[float, "V", OPTIONAL]
AMPERE_OR_BLANK = Annotated[float, "A", OPTIONAL]
S_OR_BLANK = Annotated[float, "s", OPTIONAL]
W_OR_BLANK = Annotated[float, "W", OPTIONAL]
HEATS_OR_NONE = Annotated[Sequence[Any], "J", COLUMN]

_BALANCE = "first law: the heats gained sum to what heater and room gave"
_CHANGES = ("none", "melts", "freezes", "boils", "condenses")
_CHANGE_KNOWN = 'change == "none" or is_number(amount) and is_number(change_temperature)'


@cell(
    "HEATER_HEAT",
    equation="E = U I t, 0 without a heater",
    source="Joule's law",
    standing="derived",
    needs=(
        "is_number(voltage) and is_number(current) and is_number(duration)"
        " or not (is_number(voltage) or is_number(current) or is_number(duration))",
    ),
)
def heater_heat(voltage: VOLT_OR_BLANK, current: AMPERE_OR_BLANK, duration: S_OR_BLANK) -> J:
    """Heat that the heater gave; blank where only part of it is known."""
    return voltage * current * duration if is_number(voltage) else 0


@cell(
    "LOSS_HEAT",
    equation="Q = P t, 0 without a loss",
    source="steady loss to the room",
    standing="derived",
    needs=("is_number(power) == is_number(duration)",),
)
def loss_heat(power: W_OR_BLANK, duration: S_OR_BLANK) -> J:
    """Heat lost to the room; blank where power or time is missing."""
    return power * duration if is_number(power) else 0


@cell("HEAT_LEFT", equation="Q = given - sum of gains", source=_BALANCE, standing="derived")
def heat_left(given: J, gains: HEATS_OR_NONE) -> J:
    """Heat given that the bodies known so far have not taken up."""
    return given - total(gains)


@cell(
    "CLOSURE_OF_BODIES",
    equation="100 (sum Q - E) / [(sum |Q| + |E|)/2], only where nothing is unknown",
    source=_BALANCE,
    standing="derived",
    choices={"unknown": ("none",)},
    needs=("total_size(gains) > 0",),
)
def closure_of_bodies(unknown: TEXT, gains: HEATS, given: J) -> PERCENT:
    """What is left of the heat balance as a share of the heat exchanged, with its sign."""
    return 200 * (total(gains) - given) / (total_size(gains) + abs(given))


@cell(
    "CAPACITY_AFTER",
    equation="m c, or a c' + (m - a) c after a change of the amount a",
    source="definition of the heat capacity",
    standing="derived",
    choices={"change": _CHANGES},
    needs=('change == "none" or is_number(amount)',),
)
def capacity_after(
    mass: G,
    specific_heat: J_PER_G_K,
    change: TEXT,
    amount: G_OR_BLANK,
    specific_heat_after: J_PER_G_K_OR_BLANK,
) -> J_PER_K:
    """Heat capacity of a body in its final state."""
    later = specific_heat_after if is_number(specific_heat_after) else specific_heat
    return mass * specific_heat if change == "none" else amount * later + (mass - amount) * specific_heat


@cell(
    "CHANGE_HEAT",
    equation="+L a when melting or boiling, -L a when freezing or condensing, 0 without a change",
    source="definition of the latent heat",
    standing="derived",
    choices={"change": _CHANGES},
    needs=('change == "none" or is_number(latent_heat) and is_number(amount)',),
)
def change_heat(change: TEXT, latent_heat: J_PER_G_OR_BLANK, amount: G_OR_BLANK) -> J:
    """Heat that a body takes up by its change of phase."""
    sign = -1 if change == "freezes" or change == "condenses" else 1
    return 0 if change == "none" else sign * latent_heat * amount


@cell(
    "BODY_HEAT_FROM_PARTS",
    equation="Q = m c (T2 - T1), or m c (T* - T1) + change + capacity after x (T2 - T*)",
    source="first law; heat gained counts positive",
    standing="derived",
    needs=('change == "none" or is_number(change_temperature)',),
)
def body_heat_from_parts(
    mass: G,
    specific_heat: J_PER_G_K,
    start: DEGC,
    end: DEGC,
    change: TEXT,
    change_temperature: DEGC_OR_BLANK,
    changed: J,
    capacity: J_PER_K,
) -> J:
    """Heat that a body takes up, its change of phase and its capacity after it taken from their own lines."""
    changing = mass * specific_heat * (change_temperature - start) + changed + capacity * (end - change_temperature)
    return mass * specific_heat * (end - start) if change == "none" else changing


@cell(
    "HEAT_PER_GRAM",
    equation="c (T2 - T1), or c (T* - T1) +- L + c'(T2 - T*) where all of it changes",
    source="first law",
    standing="derived",
    needs=('change == "none" or is_number(latent_heat) and is_number(change_temperature)',),
)
def heat_per_gram(
    specific_heat: J_PER_G_K,
    start: DEGC,
    end: DEGC,
    change: TEXT,
    latent_heat: J_PER_G_OR_BLANK,
    change_temperature: DEGC_OR_BLANK,
    specific_heat_after: J_PER_G_K_OR_BLANK,
) -> J_PER_G:
    """Heat that a gram of the body takes up."""
    sign = -1 if change == "freezes" or change == "condenses" else 1
    later = specific_heat_after if is_number(specific_heat_after) else specific_heat
    after = sign * latent_heat + later * (end - change_temperature)
    before = specific_heat * (change_temperature - start)
    return specific_heat * (end - start) if change == "none" else before + after


@cell(
    "FINAL_TEMPERATURE_FROM_BALANCE",
    equation="T = T read + (given - sum of gains) / sum of capacities",
    source=_BALANCE,
    standing="derived",
    choices={"unknown": ("none",)},
    needs=("capacity > 0",),
)
def final_temperature_from_balance(unknown: TEXT, read: DEGC, left: J, capacity: J_PER_K) -> DEGC:
    """Common end temperature at which the balance would close."""
    return read + left / capacity


@cell(
    "SOLVED_MASS",
    equation="m = Q / q per gram",
    source=_BALANCE,
    standing="derived",
    choices={"unknown": ("mass",), "here": ("yes",)},
    needs=("per_gram != 0",),
)
def solved_mass(unknown: TEXT, here: TEXT, left: J, per_gram: J_PER_G) -> G:
    """Mass of the body that closes the balance."""
    return left / per_gram


@cell(
    "SOLVED_SPECIFIC_HEAT",
    equation="c = Q / [m (T2 - T1)]",
    source=_BALANCE,
    standing="derived",
    choices={"unknown": ("specific heat",), "here": ("yes",), "change": ("none",)},
    needs=("mass > 0 and end != start",),
)
def solved_specific_heat(
    unknown: TEXT, here: TEXT, left: J, mass: G, start: DEGC, end: DEGC, change: TEXT
) -> J_PER_G_K:
    """Specific heat of the body that closes the balance; no change of phase."""
    return left / (mass * (end - start))


@cell(
    "SOLVED_START",
    equation="T1 = T2 - Q/(m c), or T* - (Q - change - capacity after x (T2 - T*))/(m c)",
    source=_BALANCE,
    standing="derived",
    choices={"unknown": ("start temperature",), "here": ("yes",)},
    needs=("mass > 0 and specific_heat > 0", 'change == "none" or is_number(change_temperature)'),
)
def solved_start(
    unknown: TEXT,
    here: TEXT,
    left: J,
    mass: G,
    specific_heat: J_PER_G_K,
    end: DEGC,
    change: TEXT,
    change_temperature: DEGC_OR_BLANK,
    changed: J,
    capacity: J_PER_K,
) -> DEGC:
    """Start temperature of the body that closes the balance."""
    later = 0 if change == "none" else changed + capacity * (end - change_temperature)
    return (end if change == "none" else change_temperature) - (left - later) / (mass * specific_heat)


@cell(
    "SOLVED_END",
    equation="T2 = T1 + Q/(m c), or T* + (Q - m c (T* - T1) - change)/capacity after",
    source=_BALANCE,
    standing="derived",
    choices={"unknown": ("end temperature",), "here": ("yes",)},
    needs=("capacity > 0", 'change == "none" or is_number(change_temperature)'),
)
def solved_end(
    unknown: TEXT,
    here: TEXT,
    left: J,
    mass: G,
    specific_heat: J_PER_G_K,
    start: DEGC,
    change: TEXT,
    change_temperature: DEGC_OR_BLANK,
    changed: J,
    capacity: J_PER_K,
) -> DEGC:
    """End temperature of the body that closes the balance."""
    earlier = 0 if change == "none" else mass * specific_heat * (change_temperature - start) + changed
    return (start if change == "none" else change_temperature) + (left - earlier) / capacity


@cell(
    "SOLVED_LATENT_HEAT",
    equation="L = +-(Q - m c (T* - T1) - capacity after x (T2 - T*)) / a",
    source=_BALANCE,
    standing="derived",
    choices={"unknown": ("latent heat",), "here": ("yes",), "change": _CHANGES[1:]},
    needs=("amount > 0",),
)
def solved_latent_heat(
    unknown: TEXT,
    here: TEXT,
    left: J,
    mass: G,
    specific_heat: J_PER_G_K,
    start: DEGC,
    end: DEGC,
    change: TEXT,
    change_temperature: DEGC,
    amount: G,
    capacity: J_PER_K,
) -> J_PER_G:
    """Latent heat of the body that closes the balance."""
    sign = -1 if change == "freezes" or change == "condenses" else 1
    sensible = mass * specific_heat * (change_temperature - start) + capacity * (end - change_temperature)
    return sign * (left - sensible) / amount


@cell(
    "SOLVED_HEATER",
    equation="E = sum of gains + loss",
    source=_BALANCE,
    standing="derived",
    choices={"unknown": ("heater",)},
)
def solved_heater(unknown: TEXT, gains: HEATS, loss: J) -> J:
    """Heat that the heater must have given."""
    return total(gains) + loss


_GUM = "propagation of independent parts, JCGM 100"


@cell(
    "BODY_HEAT_UNCERTAINTY",
    equation="u = sqrt((m c)^2 2 u_T^2 + (Q/m u_m)^2)",
    source=_GUM,
    standing="derived",
    needs=("mass > 0",),
)
def body_heat_uncertainty(
    mass: G, specific_heat: J_PER_G_K, gained: J, temperature_uncertainty: K, mass_uncertainty: G_OR_BLANK
) -> J:
    """Standard uncertainty of a body's heat from its two temperatures and its mass."""
    weighed = gained / mass * mass_uncertainty if is_number(mass_uncertainty) else 0
    return sqrt(2 * (mass * specific_heat * temperature_uncertainty) ** 2 + weighed**2)


@cell("ROOT_OF_SQUARES", equation="sqrt(sum u^2)", source=_GUM, standing="derived")
def root_of_squares(values: HEATS) -> J:
    """Standard uncertainty of a sum of independent heats."""
    return sqrt(weighted(values, values))


@cell(
    "CLOSURE_TOLERANCE",
    equation="100 x 2 u / [(sum |Q| + |E|)/2], or the usual tolerance",
    source=_GUM,
    standing="derived",
    needs=("total_size(gains) > 0",),
)
def closure_tolerance(uncertainty: J_OR_BLANK, gains: HEATS, given: J, usual: PERCENT) -> PERCENT:
    """Closure that the readings' own uncertainty allows; without it the usual tolerance."""
    exchanged = (total_size(gains) + abs(given)) / 2
    return 100 * 2 * uncertainty / exchanged if is_number(uncertainty) else usual


@cell(
    "MASS_UNCERTAINTY",
    equation="u = u_Q / |q per gram|",
    source=_GUM,
    standing="derived",
    needs=("per_gram != 0",),
)
def mass_uncertainty(solved: G, uncertainty: J, per_gram: J_PER_G) -> G:
    """Standard uncertainty of a mass found from the balance."""
    return uncertainty / abs(per_gram)


@cell(
    "FOUND_SPECIFIC_HEAT_UNCERTAINTY",
    equation="u = u_Q / (m |T2 - T1|)",
    source=_GUM,
    standing="derived",
    needs=("mass > 0 and end != start",),
)
def found_specific_heat_uncertainty(solved: J_PER_G_K, uncertainty: J, mass: G, start: DEGC, end: DEGC) -> J_PER_G_K:
    """Standard uncertainty of a specific heat found from the balance."""
    return uncertainty / (mass * abs(end - start))


@cell(
    "TEMPERATURE_UNCERTAINTY",
    equation="u = u_Q / C",
    source=_GUM,
    standing="derived",
    needs=("capacity > 0",),
)
def temperature_uncertainty(solved: DEGC, uncertainty: J, capacity: J_PER_K) -> K:
    """Standard uncertainty of a temperature found from the balance."""
    return uncertainty / capacity


@cell(
    "LATENT_HEAT_UNCERTAINTY",
    equation="u = u_Q / a",
    source=_GUM,
    standing="derived",
    needs=("amount > 0",),
)
def latent_heat_uncertainty(solved: J_PER_G, uncertainty: J, amount: G) -> J_PER_G:
    """Standard uncertainty of a latent heat found from the balance."""
    return uncertainty / amount


@cell("HEATER_UNCERTAINTY", equation="u = u_Q", source=_GUM, standing="derived")
def heater_uncertainty(solved: J, uncertainty: J) -> J:
    """Standard uncertainty of a heater's heat found from the balance."""
    return uncertainty


@cell(
    "BALANCE_STAGE",
    equation="issued, bench or complete",
    source="bookkeeping of this workbook",
    standing="derived",
)
def balance_stage(names: TEXTS, gains: HEATS_OR_NONE, unknown: TEXT_OR_BLANK) -> TEXT:
    """Stage of a heat balance from its named bodies and those whose heat is known."""
    hidden = 0 if unknown == "none" or unknown == "heater" else 1
    started = "complete" if filled(names) >= 2 and count(gains) + hidden >= filled(names) else "bench"
    return "issued" if filled(names) == 0 else started


@cell(
    "BALANCE_NEXT_STEP",
    equation="the next step in words",
    source="bookkeeping of this workbook",
    standing="derived",
)
def balance_next_step(names: TEXTS, gains: HEATS_OR_NONE, unknown: TEXT_OR_BLANK) -> TEXT:
    """What is to be done next in a heat balance."""
    hidden = 0 if unknown == "none" or unknown == "heater" else 1
    known = filled(names) >= 2 and count(gains) + hidden >= filled(names)
    return "have it checked" if known else "fill the bodies"


@cell("CAPACITY_OF", equation="m c", source="definition of the heat capacity", standing="derived")
def capacity_of(mass: G, specific_heat: J_PER_G_K) -> J_PER_K:
    """Heat capacity of a body."""
    return mass * specific_heat


@cell(
    "WATER_OF_BODY",
    equation="m where the body is water or ice, else 0",
    source="what may turn to steam",
    standing="derived",
)
def water_of_body(mass: G, substance: TEXT) -> G:
    """Mass of a body that would boil as water."""
    return mass if substance == "water" or substance == "ice" else 0
