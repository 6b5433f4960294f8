"""Gas term: from energy at constant volume to enthalpy at constant pressure, and what it rests on.

Standard library only: this file also runs inside LibreOffice's Python.
"""

from sheetcal.cells.constants import J_PER_KJ, R
from sheetcal.cells.registry import G_PER_MOL, J_PER_MOL_K, KJ_PER_MOL, MOL, ONE, TEXT, G, K, cell

_IDEAL = "first law; ideal gas, condensed volumes neglected"
_TEMPERATURE = (200.0, 1000.0)
_ATOMS = (0.0, 500.0)


@cell(
    "GAS_TERM",
    equation="dn R T",
    source=_IDEAL,
    standing="derived",
    valid={"gas_change": (-1000.0, 1000.0), "temperature": _TEMPERATURE},
)
def gas_term(gas_change: ONE, temperature: K) -> KJ_PER_MOL:
    """Enthalpy less energy of a reaction, from the moles of gas formed less those used, per mole."""
    return gas_change * R * temperature / J_PER_KJ


@cell(
    "ENTHALPY_FROM_ENERGY",
    equation="dH = dU + dn R T",
    source=_IDEAL,
    standing="derived",
    valid={"gas_change": (-1000.0, 1000.0), "temperature": _TEMPERATURE},
)
def enthalpy_from_energy(energy: KJ_PER_MOL, gas_change: ONE, temperature: K) -> KJ_PER_MOL:
    """Reaction enthalpy from reaction energy, per mole burnt."""
    return energy + gas_change * R * temperature / J_PER_KJ


@cell(
    "ENERGY_FROM_REACTION_ENTHALPY",
    equation="dU = dH - dn R T",
    source=_IDEAL,
    standing="derived",
    valid={"gas_change": (-1000.0, 1000.0), "temperature": _TEMPERATURE},
)
def energy_from_reaction_enthalpy(enthalpy: KJ_PER_MOL, gas_change: ONE, temperature: K) -> KJ_PER_MOL:
    """Reaction energy from reaction enthalpy, per mole burnt."""
    return enthalpy - gas_change * R * temperature / J_PER_KJ


@cell(
    "CP_FROM_CV",
    equation="Cp = Cv + R",
    source="ideal gas",
    standing="derived",
    valid={"cv": (0.0, 1e5)},
)
def cp_from_cv(cv: J_PER_MOL_K) -> J_PER_MOL_K:
    """Molar heat capacity at constant pressure of an ideal gas."""
    return cv + R


@cell(
    "CV_FROM_CP",
    equation="Cv = Cp - R",
    source="ideal gas",
    standing="derived",
    needs=("cp > R",),
)
def cv_from_cp(cp: J_PER_MOL_K) -> J_PER_MOL_K:
    """Molar heat capacity at constant volume of an ideal gas."""
    return cp - R


@cell(
    "MOLES_FROM_MASS",
    equation="n = m / M",
    source="definition of the molar mass",
    standing="derived",
    valid={"mass": (0.0, 1e6), "molar_mass": (1.0, 1e6)},
)
def moles_from_mass(mass: G, molar_mass: G_PER_MOL) -> MOL:
    """Amount of substance of a mass."""
    return mass / molar_mass


@cell(
    "GAS_CHANGE_OF_COMBUSTION",
    equation="dn = (o + n)/2 - h/4, one less for a gas",
    source="combustion to CO2, liquid water, N2 and SO2; O2 the only other gas",
    standing="derived",
    valid={"hydrogen": _ATOMS, "oxygen": _ATOMS, "nitrogen": _ATOMS},
    choices={"phase": ("solid", "liquid", "gas")},
)
def gas_change_of_combustion(hydrogen: ONE, oxygen: ONE, nitrogen: ONE, phase: TEXT) -> ONE:
    """Moles of gas formed less moles used, per mole burnt; atom counts of the formula."""
    condensed = (oxygen + nitrogen) / 2 - hydrogen / 4
    return condensed - 1 if phase == "gas" else condensed
