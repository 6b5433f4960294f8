"""Mixing: specific heat and heat capacity by mixing, temperature of a mixture, heat balance of bodies.

Standard library only: this file also runs inside LibreOffice's Python.
"""

from sheetcal.cells.primitives import is_number, total, total_size, weighted
from sheetcal.cells.registry import (
    DEGC,
    DEGC_OR_BLANK,
    G_OR_BLANK,
    HEATS,
    J_OR_BLANK,
    J_PER_G_K,
    J_PER_G_K_OR_BLANK,
    J_PER_G_OR_BLANK,
    J_PER_K,
    MASSES,
    PERCENT,
    SPECIFIC_HEATS,
    TEMPERATURES,
    TEXT,
    G,
    J,
    cell,
)

_BALANCE = "first law: heat given equals heat taken up"
_MASS = (0.0, 1e6)
_SPECIFIC = (0.0, 20.0)


@cell(
    "SPECIFIC_HEAT_BY_MIXING",
    equation="c = (m_w c_w + C)(T_f - T_w) / [m (T_x - T_f)]",
    source=_BALANCE,
    standing="derived",
    valid={
        "water": _MASS,
        "water_specific_heat": _SPECIFIC,
        "vessel_heat_capacity": (0.0, 1e6),
        "sample": (1e-6, 1e6),
    },
    needs=("hot != final",),
)
def specific_heat_by_mixing(
    water: G,
    water_specific_heat: J_PER_G_K,
    vessel_heat_capacity: J_PER_K,
    sample: G,
    hot: DEGC,
    start: DEGC,
    final: DEGC,
) -> J_PER_G_K:
    """Mean specific heat of a hot (or cold) body dropped into water, between its own two temperatures."""
    gained = (water * water_specific_heat + vessel_heat_capacity) * (final - start)
    return gained / (sample * (hot - final))


@cell(
    "VESSEL_HEAT_CAPACITY_BY_MIXING",
    equation="C = m_h c_h (T_h - T_f)/(T_f - T_w) - m_w c_w",
    source=_BALANCE,
    standing="derived",
    valid={
        "water": _MASS,
        "water_specific_heat": _SPECIFIC,
        "hot_water": _MASS,
        "hot_specific_heat": _SPECIFIC,
    },
    needs=("final != start",),
)
def vessel_heat_capacity_by_mixing(
    water: G,
    water_specific_heat: J_PER_G_K,
    hot_water: G,
    hot_specific_heat: J_PER_G_K,
    hot: DEGC,
    start: DEGC,
    final: DEGC,
) -> J_PER_K:
    """Heat capacity of the mixing vessel from hot water poured onto cold, a run without a sample."""
    given = hot_water * hot_specific_heat * (hot - final)
    return given / (final - start) - water * water_specific_heat


@cell(
    "MIXING_TEMPERATURE",
    equation="T = sum m c T / sum m c",
    source=_BALANCE,
    standing="derived",
    valid={"masses": _MASS, "specific_heats": _SPECIFIC},
    needs=("weighted(masses, specific_heats) > 0",),
)
def mixing_temperature(masses: MASSES, specific_heats: SPECIFIC_HEATS, temperatures: TEMPERATURES) -> DEGC:
    """Temperature of bodies brought together; no change of phase, no loss."""
    return weighted(masses, specific_heats, temperatures) / weighted(masses, specific_heats)


@cell(
    "START_TEMPERATURE_BY_MIXING",
    equation="T_x = T_f + (m_w c_w + C)(T_f - T_w)/(m c)",
    source=_BALANCE,
    standing="derived",
    valid={
        "water": _MASS,
        "water_specific_heat": _SPECIFIC,
        "vessel_heat_capacity": (0.0, 1e6),
        "sample": (1e-6, 1e6),
        "specific_heat": (0.01, 20.0),
    },
)
def start_temperature_by_mixing(
    water: G,
    water_specific_heat: J_PER_G_K,
    vessel_heat_capacity: J_PER_K,
    sample: G,
    specific_heat: J_PER_G_K,
    start: DEGC,
    final: DEGC,
) -> DEGC:
    """Temperature that a body of known specific heat had before it was dropped into water."""
    gained = (water * water_specific_heat + vessel_heat_capacity) * (final - start)
    return final + gained / (sample * specific_heat)


_CHANGES = ("none", "melts", "freezes", "boils", "condenses")


@cell(
    "BODY_HEAT",
    equation="m c (T2 - T1), or m c (T* - T1) +- L a + [a c' + (m - a) c](T2 - T*); a changes at T*",
    source="first law; heat gained counts positive",
    standing="derived",
    valid={
        "mass": _MASS,
        "specific_heat": _SPECIFIC,
        "latent_heat": (0.0, 1e5),
        "amount": _MASS,
        "specific_heat_after": _SPECIFIC,
    },
    choices={"change": _CHANGES},
    needs=(
        'change == "none" or is_number(latent_heat) and is_number(amount) and is_number(change_temperature)',
        'change == "none" or amount <= mass',
        'change == "none" or is_number(specific_heat_after) or end == change_temperature',
    ),
)
def body_heat(
    mass: G,
    specific_heat: J_PER_G_K,
    start: DEGC,
    end: DEGC,
    change: TEXT,
    latent_heat: J_PER_G_OR_BLANK,
    amount: G_OR_BLANK,
    change_temperature: DEGC_OR_BLANK,
    specific_heat_after: J_PER_G_K_OR_BLANK,
) -> J:
    """Heat that a body takes up between two temperatures, with a change of phase of all or part of it."""
    sign = -1 if change == "freezes" or change == "condenses" else 1
    later = specific_heat_after if is_number(specific_heat_after) else specific_heat
    before = mass * specific_heat * (change_temperature - start)
    after = (amount * later + (mass - amount) * specific_heat) * (end - change_temperature)
    changed = before + sign * latent_heat * amount + after
    return mass * specific_heat * (end - start) if change == "none" else changed


@cell(
    "CLOSURE_PERCENT",
    equation="100 (sum Q - E) / [(sum |Q| + |E|)/2]",
    source="first law: the heats gained, less what the heater gave, sum to nothing",
    standing="derived",
    needs=("total_size(heats) + abs(heater if is_number(heater) else 0) > 0",),
)
def closure_percent(heats: HEATS, heater: J_OR_BLANK) -> PERCENT:
    """What is left of the heat balance as a share of the heat exchanged, with its sign; no heater is 0."""
    given = heater if is_number(heater) else 0
    return 200 * (total(heats) - given) / (total_size(heats) + abs(given))
