"""Net values with a coefficient for each element, and what chlorine changes.

Per cents are pure numbers; a coefficient "per mass-%" has the unit of its result.
Standard library only: this file also runs inside LibreOffice's Python.
"""

from sheetcal.cells.constants import M_H, WATER_VAPORISATION
from sheetcal.cells.registry import J_PER_G, ONE, PERCENT, PERCENT_OR_BLANK, TEXT, TEXT_OR_BLANK, cell

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
)
def net_p_dry_with_chlorine(
    net_p_dry: J_PER_G,
    chlorine: PERCENT,
    hydrogen_coefficient: J_PER_G,
    hydrogen_per_chlorine: ONE,
    chlorine_coefficient: J_PER_G,
) -> J_PER_G:
    """Net value at constant pressure, dry, chlorine leaving as HCl gas; coefficients per mass-%."""
    return net_p_dry + (hydrogen_coefficient * hydrogen_per_chlorine - chlorine_coefficient) * chlorine


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


@cell(
    "ASH_DRY",
    equation="d = ad 100/(100 - M_ad) = ar 100/(100 - M_T); below a limit: share x limit",
    source="definition of the bases, ISO 1170",
    standing="derived",
    valid={
        "value": _PER_CENT,
        "share": (0.0, 1.0),
        "analysis_moisture": _MOIST,
        "total_moisture": _MOIST,
    },
    choices={"mark": ("<",), "basis": ("dry", "as analysed", "as received")},
    needs=(
        'basis == "dry" or (is_number(analysis_moisture) if basis == "as analysed"'
        " else is_number(total_moisture))",
    ),
)
def ash_dry(
    value: PERCENT,
    mark: TEXT_OR_BLANK,
    share: ONE,
    basis: TEXT,
    analysis_moisture: PERCENT_OR_BLANK,
    total_moisture: PERCENT_OR_BLANK,
) -> PERCENT:
    """Ash on the dry basis; a value marked "<" counts with a share of its limit."""
    counted = value * share if mark == "<" else value
    moisture = analysis_moisture if basis == "as analysed" else total_moisture
    return counted if basis == "dry" else counted * 100 / (100 - moisture)
