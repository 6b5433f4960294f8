"""Bases and net values: analysed, dry, dry ash-free, as received; from gross to net.

Per cents are pure numbers; a coefficient "per mass-%" has the unit of its result.
Standard library only: this file also runs inside LibreOffice's Python.
"""

from sheetcal.cells.constants import M_CL, M_H, M_N, M_O, M_WATER, WATER_VAPORISATION, R
from sheetcal.cells.primitives import is_number
from sheetcal.cells.registry import (
    J_PER_G,
    ONE,
    PERCENT,
    PERCENT_OR_BLANK,
    TEXT,
    TEXT_OR_BLANK,
    Constant,
    K,
    cell,
)

WATER_PER_HYDROGEN = Constant(
    8.937,
    "1",
    "water_per_hydrogen",
    "mass of water per mass of hydrogen, 18.015/(2 x 1.008) rounded",
    "derived",
)
_BASES = ("dry", "as analysed", "as received", "dry ash-free")
_DEFINITION = "definition of the bases, ISO 1170"
_PER_CENT = (0.0, 100.0)
_MOIST = (0.0, 95.0)
_BASIS_NEEDS = (
    'basis == "dry" or (is_number(analysis_moisture) if basis == "as analysed"'
    ' else is_number(total_moisture) if basis == "as received" else is_number(ash_dry))'
)
_NET_P = "energy balance of combustion with water as vapour, form of ISO 1928 and ISO 18125"

_COMPOSITION = "Channiwala and Parikh 2002, Fuel 81, 1051"
EST_C = Constant(349.1, "J/g", "estimate_carbon", _COMPOSITION)
EST_H = Constant(1178.3, "J/g", "estimate_hydrogen", _COMPOSITION)
EST_S = Constant(100.5, "J/g", "estimate_sulfur", _COMPOSITION)
EST_O = Constant(103.4, "J/g", "estimate_oxygen", _COMPOSITION)
EST_N = Constant(15.1, "J/g", "estimate_nitrogen", _COMPOSITION)
EST_ASH = Constant(21.1, "J/g", "estimate_ash", _COMPOSITION)


@cell(
    "BASIS_DRY",
    equation="d = ad 100/(100 - M_ad) = ar 100/(100 - M_T) = daf (100 - A_d)/100; marked <: share x value",
    source=_DEFINITION,
    standing="derived",
    valid={
        "value": _PER_CENT,
        "share": (0.0, 1.0),
        "analysis_moisture": _MOIST,
        "total_moisture": _MOIST,
        "ash_dry": _PER_CENT,
    },
    choices={"mark": ("<",), "basis": _BASES},
    needs=(_BASIS_NEEDS,),
)
def basis_dry(
    value: PERCENT,
    mark: TEXT_OR_BLANK,
    share: ONE,
    basis: TEXT,
    analysis_moisture: PERCENT_OR_BLANK,
    total_moisture: PERCENT_OR_BLANK,
    ash_dry: PERCENT_OR_BLANK,
) -> PERCENT:
    """An analysis value on the dry basis; a value marked "<" counts with a share of its limit."""
    counted = value * share if mark == "<" else value
    other = counted * (100 - ash_dry) / 100 if basis == "dry ash-free" else counted
    received = counted * 100 / (100 - total_moisture) if basis == "as received" else other
    return counted * 100 / (100 - analysis_moisture) if basis == "as analysed" else received


@cell(
    "HYDROGEN_DRY",
    equation="as BASIS_DRY, with H - M/8.937 where the value includes the moisture's hydrogen",
    source=_DEFINITION,
    standing="derived",
    valid={
        "value": _PER_CENT,
        "share": (0.0, 1.0),
        "analysis_moisture": _MOIST,
        "total_moisture": _MOIST,
        "ash_dry": _PER_CENT,
    },
    choices={"mark": ("<",), "basis": _BASES, "includes": ("total", "without moisture")},
    needs=(
        _BASIS_NEEDS,
        'includes == "without moisture" or basis == "dry" or basis == "dry ash-free"'
        ' or value >= (analysis_moisture if basis == "as analysed" else total_moisture) / WATER_PER_HYDROGEN',
    ),
)
def hydrogen_dry(
    value: PERCENT,
    mark: TEXT_OR_BLANK,
    share: ONE,
    basis: TEXT,
    includes: TEXT,
    analysis_moisture: PERCENT_OR_BLANK,
    total_moisture: PERCENT_OR_BLANK,
    ash_dry: PERCENT_OR_BLANK,
) -> PERCENT:
    """Hydrogen on the dry basis, without the moisture's hydrogen."""
    counted = value * share if mark == "<" else value
    water = analysis_moisture if basis == "as analysed" else total_moisture
    inherent = counted - water / WATER_PER_HYDROGEN if includes == "total" else counted
    by_water = inherent * 100 / (100 - water)
    free = counted * (100 - ash_dry) / 100 if basis == "dry ash-free" else by_water
    return counted if basis == "dry" else free


@cell(
    "BASIS_ANALYSED",
    equation="ad = d (100 - M_ad)/100",
    source=_DEFINITION,
    standing="derived",
    valid={"dry_value": _PER_CENT, "moisture": _PER_CENT},
)
def basis_analysed(dry_value: PERCENT, moisture: PERCENT) -> PERCENT:
    """An analysis value from dry to as analysed, or to as received with the total moisture."""
    return dry_value * (100 - moisture) / 100


@cell(
    "DRY_FROM_ANALYSED",
    equation="d = ad 100/(100 - M_ad)",
    source=_DEFINITION,
    standing="derived",
    valid={"moisture": _MOIST},
)
def dry_from_analysed(value: J_PER_G, moisture: PERCENT) -> J_PER_G:
    """Gross value from as analysed to dry. A net value is recomputed, never scaled."""
    return value * 100 / (100 - moisture)


@cell(
    "ANALYSED_FROM_DRY",
    equation="ad = d (100 - M_ad)/100",
    source=_DEFINITION,
    standing="derived",
    valid={"moisture": _PER_CENT},
)
def analysed_from_dry(value: J_PER_G, moisture: PERCENT) -> J_PER_G:
    """Gross value from dry to as analysed."""
    return value * (100 - moisture) / 100


@cell(
    "AS_RECEIVED_FROM_DRY",
    equation="ar = d (100 - M_T)/100",
    source=_DEFINITION,
    standing="derived",
    valid={"total_moisture": _PER_CENT},
)
def as_received_from_dry(value: J_PER_G, total_moisture: PERCENT) -> J_PER_G:
    """Gross value from dry to as received."""
    return value * (100 - total_moisture) / 100


@cell(
    "DRY_FROM_AS_RECEIVED",
    equation="d = ar 100/(100 - M_T)",
    source=_DEFINITION,
    standing="derived",
    valid={"total_moisture": _MOIST},
)
def dry_from_as_received(value: J_PER_G, total_moisture: PERCENT) -> J_PER_G:
    """Gross value from as received to dry."""
    return value * 100 / (100 - total_moisture)


@cell(
    "DAF_FROM_DRY",
    equation="daf = d 100/(100 - A_d)",
    source=_DEFINITION,
    standing="derived",
    valid={"ash_dry": _MOIST},
)
def daf_from_dry(value: J_PER_G, ash_dry: PERCENT) -> J_PER_G:
    """Gross value from dry to dry ash-free."""
    return value * 100 / (100 - ash_dry)


@cell(
    "DRY_FROM_DAF",
    equation="d = daf (100 - A_d)/100",
    source=_DEFINITION,
    standing="derived",
    valid={"ash_dry": _PER_CENT},
)
def dry_from_daf(value: J_PER_G, ash_dry: PERCENT) -> J_PER_G:
    """Gross value from dry ash-free to dry."""
    return value * (100 - ash_dry) / 100


_DRY_FUEL = {"hydrogen": _PER_CENT, "oxygen": _PER_CENT, "nitrogen": _PER_CENT}


@cell(
    "NET_P_DRY",
    equation="q_p,net,d = q_V,gr,d - k_H H - k_ON (O + N)",
    source=_NET_P,
    valid=_DRY_FUEL,
)
def net_p_dry(
    gross_dry: J_PER_G,
    hydrogen: PERCENT,
    oxygen: PERCENT,
    nitrogen: PERCENT,
    hydrogen_coefficient: J_PER_G,
    oxygen_nitrogen_coefficient: J_PER_G,
) -> J_PER_G:
    """Net value at constant pressure of the dry fuel; coefficients per mass-%."""
    return gross_dry - hydrogen_coefficient * hydrogen - oxygen_nitrogen_coefficient * (oxygen + nitrogen)


@cell(
    "NET_P_AT_MOISTURE",
    equation="q_p,net,m = q_p,net,d (100 - M)/100 - k_M M",
    source=_NET_P,
    valid={"moisture": _PER_CENT},
)
def net_p_at_moisture(net_p_dry: J_PER_G, moisture: PERCENT, moisture_coefficient: J_PER_G) -> J_PER_G:
    """Net value at constant pressure of the fuel with moisture; coefficient per mass-%."""
    return net_p_dry * (100 - moisture) / 100 - moisture_coefficient * moisture


@cell(
    "NET_V_DRY",
    equation="q_V,net,d = q_V,gr,d - k_H H",
    source=_NET_P,
    valid={"hydrogen": _PER_CENT},
)
def net_v_dry(gross_dry: J_PER_G, hydrogen: PERCENT, hydrogen_coefficient: J_PER_G) -> J_PER_G:
    """Net value at constant volume of the dry fuel; coefficient per mass-%."""
    return gross_dry - hydrogen_coefficient * hydrogen


@cell(
    "NET_V_AT_MOISTURE",
    equation="q_V,net,m = q_V,net,d (100 - M)/100 - k_M M",
    source=_NET_P,
    valid={"moisture": _PER_CENT},
)
def net_v_at_moisture(net_v_dry: J_PER_G, moisture: PERCENT, moisture_coefficient: J_PER_G) -> J_PER_G:
    """Net value at constant volume of the fuel with moisture; coefficient per mass-%."""
    return net_v_dry * (100 - moisture) / 100 - moisture_coefficient * moisture


@cell(
    "GAS_TERM_OF_FUEL",
    equation="R T [H/(4 M_H) - O/(2 M_O) - N/(2 M_N)] / 100",
    source="first law; ideal gas; fuel solid or liquid, water liquid",
    standing="derived",
    valid={**_DRY_FUEL, "temperature": (200.0, 1000.0)},
)
def gas_term_of_fuel(hydrogen: PERCENT, oxygen: PERCENT, nitrogen: PERCENT, temperature: K) -> J_PER_G:
    """Gross value at constant pressure less gross value at constant volume."""
    gas = hydrogen / (4 * M_H) - oxygen / (2 * M_O) - nitrogen / (2 * M_N)
    return R * temperature * gas / 100


@cell(
    "VAPORISATION_OF_FUEL",
    equation="L [H/(2 M_H) + M/M_W] / 100",
    source="CODATA: water gas less liquid at 298.15 K, ideal gas",
    standing="derived",
    valid={"hydrogen": _PER_CENT, "moisture": _PER_CENT},
)
def vaporisation_of_fuel(hydrogen: PERCENT, moisture: PERCENT) -> J_PER_G:
    """Heat to vaporise the water of combustion and of moisture, per gram of fuel, at constant pressure."""
    return WATER_VAPORISATION * (hydrogen / (2 * M_H) + moisture / M_WATER) / 100


@cell(
    "NET_P_WITH_CHLORINE",
    equation="q_p,net,d = q_V,gr,d - k_H (H - Cl M_H/M_Cl) - k_ON (O + N) - k_Cl Cl",
    source="element balance with HCl(g) as product",
    standing="derived",
    valid={**_DRY_FUEL, "chlorine": _PER_CENT},
)
def net_p_with_chlorine(
    gross_dry: J_PER_G,
    hydrogen: PERCENT,
    oxygen: PERCENT,
    nitrogen: PERCENT,
    chlorine: PERCENT,
    hydrogen_coefficient: J_PER_G,
    oxygen_nitrogen_coefficient: J_PER_G,
    chlorine_coefficient: J_PER_G,
) -> J_PER_G:
    """Net value at constant pressure of the dry fuel, chlorine as HCl gas; coefficients per mass-%."""
    free = hydrogen - chlorine * M_H / M_CL
    formed = hydrogen_coefficient * free + oxygen_nitrogen_coefficient * (oxygen + nitrogen)
    return gross_dry - formed - chlorine_coefficient * chlorine


@cell(
    "COMPOSITION_ESTIMATE",
    equation="q = 349.1 C + 1178.3 H + 100.5 S - 103.4 O - 15.1 N - 21.1 ash",
    source=_COMPOSITION,
    valid={
        "carbon": _PER_CENT,
        "hydrogen": _PER_CENT,
        "sulfur": _PER_CENT,
        "oxygen": _PER_CENT,
        "nitrogen": _PER_CENT,
        "ash": _PER_CENT,
    },
)
def composition_estimate(
    carbon: PERCENT, hydrogen: PERCENT, sulfur: PERCENT, oxygen: PERCENT, nitrogen: PERCENT, ash: PERCENT
) -> J_PER_G:
    """Gross value, dry, estimated from the composition: a plausibility test, never for pure compounds."""
    gain = EST_C * carbon + EST_H * hydrogen + EST_S * sulfur
    return gain - EST_O * oxygen - EST_N * nitrogen - EST_ASH * ash


@cell(
    "OXYGEN_BY_DIFFERENCE",
    equation="O = 100 - C - H - N - S - A - Cl",
    source="definition; all on one basis, dry",
    standing="derived",
    valid={
        "carbon": _PER_CENT,
        "hydrogen": _PER_CENT,
        "nitrogen": _PER_CENT,
        "sulfur": _PER_CENT,
        "ash": _PER_CENT,
        "chlorine": _PER_CENT,
    },
    needs=("carbon + hydrogen + nitrogen + sulfur + ash <= 100.5",),
)
def oxygen_by_difference(
    carbon: PERCENT,
    hydrogen: PERCENT,
    nitrogen: PERCENT,
    sulfur: PERCENT,
    ash: PERCENT,
    chlorine: PERCENT_OR_BLANK,
) -> PERCENT:
    """Oxygen by difference, never below 0; a blank chlorine counts as 0."""
    halogen = chlorine if is_number(chlorine) else 0
    return max(0, 100 - carbon - hydrogen - nitrogen - sulfur - ash - halogen)


@cell(
    "SUM_OF_COMPOSITION",
    equation="C + H + N + S + O + A + Cl",
    source="definition; all on one basis, dry",
    standing="derived",
)
def sum_of_composition(
    carbon: PERCENT,
    hydrogen: PERCENT,
    nitrogen: PERCENT,
    sulfur: PERCENT,
    oxygen: PERCENT,
    ash: PERCENT,
    chlorine: PERCENT_OR_BLANK,
) -> PERCENT:
    """Sum of elements and ash; a blank chlorine counts as 0."""
    return carbon + hydrogen + nitrogen + sulfur + oxygen + ash + (chlorine if is_number(chlorine) else 0)
