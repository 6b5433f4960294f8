"""Net values with a coefficient for each element, and what chlorine changes.

Per cents are pure numbers; a coefficient "per mass-%" has the unit of its result.
Standard library only: this file also runs inside LibreOffice's Python.
"""

from sheetcal.cells.basis import WATER_PER_HYDROGEN
from sheetcal.cells.constants import M_H, WATER_VAPORISATION
from sheetcal.cells.primitives import is_number
from sheetcal.cells.registry import (
    J_PER_G,
    ONE,
    ONE_OR_BLANK,
    PERCENT,
    PERCENT_OR_BLANK,
    TEXT,
    TEXT_OR_BLANK,
    cell,
)

_PER_CENT = (0.0, 100.0)
_MOIST = (0.0, 95.0)


@cell(
    "NET_P_DRY_FROM_GROSS",
    equation="q_p,net,d = q_V,gr,d - k_H H - k_O O - k_N N",
    source="energy balance of combustion with water as vapour, form of ISO 1928 and ISO 18125",
    valid={"hydrogen": _PER_CENT, "oxygen": _PER_CENT, "nitrogen": _PER_CENT},
)
def net_p_dry_from_gross(
    gross_dry: J_PER_G,
    hydrogen: PERCENT,
    oxygen: PERCENT,
    nitrogen: PERCENT,
    hydrogen_coefficient: J_PER_G,
    oxygen_coefficient: J_PER_G,
    nitrogen_coefficient: J_PER_G,
) -> J_PER_G:
    """Net value at constant pressure of the dry fuel; one coefficient per mass-% for each element."""
    gas = oxygen_coefficient * oxygen + nitrogen_coefficient * nitrogen
    return gross_dry - hydrogen_coefficient * hydrogen - gas


@cell(
    "NET_P_DRY_WITH_CHLORINE",
    equation="q = q_p,net,d + k_H x h Cl - k_Cl Cl, Cl in mass per cent",
    source="products HCl(g) in place of HCl(aq): hydrogen bound by chlorine gives no water",
    standing="derived",
    valid={"chlorine": _PER_CENT, "hydrogen_per_chlorine": (0.0, 0.1)},
    needs=("is_number(chlorine) or hydrogen_per_chlorine == 0 and chlorine_coefficient == 0",),
)
def net_p_dry_with_chlorine(
    net_p_dry: J_PER_G,
    chlorine: PERCENT_OR_BLANK,
    hydrogen_coefficient: J_PER_G,
    hydrogen_per_chlorine: ONE,
    chlorine_coefficient: J_PER_G,
) -> J_PER_G:
    """Net value at constant pressure, dry, chlorine leaving as HCl gas where the profile counts it, per mass-%."""
    halogen = chlorine if is_number(chlorine) else 0
    return net_p_dry + (hydrogen_coefficient * hydrogen_per_chlorine - chlorine_coefficient) * halogen


@cell(
    "VAPORISATION_OF_DRY_FUEL",
    equation="L H/(2 M_H) / 100",
    source="CODATA: water gas less liquid at 298.15 K, ideal gas",
    standing="derived",
    valid={"hydrogen": _PER_CENT},
)
def vaporisation_of_dry_fuel(hydrogen: PERCENT) -> J_PER_G:
    """Heat to vaporise the water of combustion, per gram of dry fuel, at constant pressure."""
    return WATER_VAPORISATION * hydrogen / (2 * M_H) / 100


_BASES = "definition of the bases, ISO 1170"


@cell(
    "DRY_FACTOR",
    equation="f = 100/(100 - M)",
    source=_BASES,
    standing="derived",
    valid={"moisture": _MOIST},
)
def dry_factor(moisture: PERCENT) -> ONE:
    """Factor from a moist basis to dry."""
    return 100 / (100 - moisture)


@cell(
    "ASH_FREE_FACTOR",
    equation="f = (100 - A_d)/100",
    source=_BASES,
    standing="derived",
    valid={"ash_dry": _PER_CENT},
)
def ash_free_factor(ash_dry: PERCENT) -> ONE:
    """Factor from dry ash-free to dry."""
    return (100 - ash_dry) / 100


@cell(
    "ASH_DRY",
    equation="d = ad f_ad = ar f_ar; below a limit: share x limit",
    source=_BASES,
    standing="derived",
    needs=(
        'basis == "dry" or is_number(analysed) and basis == "as analysed"'
        ' or is_number(received) and basis == "as received"',
    ),
)
def ash_dry(
    value: PERCENT, mark: TEXT_OR_BLANK, share: ONE, basis: TEXT, analysed: ONE_OR_BLANK, received: ONE_OR_BLANK
) -> PERCENT:
    """Ash on the dry basis by the factor of its own; a value marked "<" counts with a share of its limit."""
    factor = analysed if basis == "as analysed" else received
    return value * (share if mark == "<" else 1) * (1 if basis == "dry" else factor)


@cell(
    "ELEMENT_DRY",
    equation="d = ad f_ad = ar f_ar = daf f_daf; below a limit: share x limit",
    source=_BASES,
    standing="derived",
    needs=(
        'basis == "dry" or is_number(analysed) and basis == "as analysed"'
        ' or is_number(received) and basis == "as received" or is_number(ash_free) and basis == "dry ash-free"',
    ),
)
def element_dry(
    value: PERCENT,
    mark: TEXT_OR_BLANK,
    share: ONE,
    basis: TEXT,
    analysed: ONE_OR_BLANK,
    received: ONE_OR_BLANK,
    ash_free: ONE_OR_BLANK,
) -> PERCENT:
    """An element on the dry basis by the factor of its own; a value marked "<" counts with a share of its limit."""
    moist = analysed if basis == "as analysed" else received
    factor = 1 if basis == "dry" else ash_free if basis == "dry ash-free" else moist
    return value * (share if mark == "<" else 1) * factor


@cell(
    "HYDROGEN_WITHOUT_MOISTURE",
    equation="H_d - 100 (f - 1)/8.937 where the value counts the moisture's hydrogen",
    source="hydrogen of the moisture, 1 g in 8.937 g of water",
    standing="derived",
    choices={"includes": ("total", "without moisture")},
    needs=(
        "includes == 'without moisture' or is_number(analysed) if basis == 'as analysed'"
        " else includes == 'without moisture' or is_number(received) or basis != 'as received'",
    ),
)
def hydrogen_without_moisture(
    hydrogen: PERCENT, basis: TEXT, includes: TEXT, analysed: ONE_OR_BLANK, received: ONE_OR_BLANK
) -> PERCENT:
    """Hydrogen of the dry fuel; only a value as analysed or as received can hold the moisture's."""
    factor = analysed if basis == "as analysed" else received
    moist = includes == "total" and (basis == "as analysed" or basis == "as received")
    return hydrogen - (100 * (factor - 1) / WATER_PER_HYDROGEN if moist else 0)
