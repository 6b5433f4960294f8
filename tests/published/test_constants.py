"""Constants of nature, atomic weights and conversions equal those of two reference libraries.

Sources: scipy.constants (CODATA 2018 and later; SI 2019, exact), periodictable (IUPAC atomic weights), for the cell
functions, the profiles and the checker alike.
"""

from __future__ import annotations

import periodictable
import pytest
import scipy.constants
from outside import Check, Deviations, of, outside, percent

from sheetcal import profiles, units
from sheetcal.cells import registry
from sheetcal.check.balance import atoms

SCIPY = "scipy.constants"
TABLE = "periodictable (IUPAC atomic weights)"
WORDS = {"H": "hydrogen", "C": "carbon", "N": "nitrogen", "O": "oxygen", "S": "sulfur", "Cl": "chlorine"}
# Interval weights: the last digit of the conventional value; periodictable carries the abridged one.
DIGITS = {"H": 1e-4, "C": 1e-3, "N": 1e-3, "O": 1e-3, "S": 1e-2, "Cl": 1e-2}
CELLS = registry.constants()
EXACT = profiles.load("first-principles").coefficients
CODATA_VAPORISATION = 285_830.0 - 241_826.0  # J/mol, CODATA key values for thermodynamics (1989)


def weight(symbol: str) -> float:
    return float(periodictable.elements.symbol(symbol).mass)


@outside(SCIPY, 3, 1e-12, "%")
def gas_constant() -> Deviations:
    """R of cell functions, profile and checker"""
    for where, found in (
        ("cells", float(CELLS["gas_constant"])),
        ("profile", EXACT["gas_constant"].value),
        ("checker", atoms.R),
    ):
        yield where, percent(found, scipy.constants.R)


@outside(SCIPY, 3, 0.0, "K")
def temperatures() -> Deviations:
    """Absolute zero and the reference temperature"""
    yield "absolute zero", float(CELLS["absolute_zero"]) + scipy.constants.zero_Celsius
    yield "reference, profile", EXACT["reference_temperature"].value - scipy.constants.zero_Celsius - 25.0
    yield "reference, checker", atoms.T - scipy.constants.zero_Celsius - 25.0


@outside(SCIPY, 7, 1e-4, "%")
def conversions() -> Deviations:
    """Calories, Btu, kWh, atmosphere, pound by the unit registry, mm of mercury of the cells"""
    listed = {
        "cal_th": (units.convert(1, "cal_th", "J"), scipy.constants.calorie_th),
        "cal_IT": (units.convert(1, "cal_IT", "J"), scipy.constants.calorie_IT),
        "Btu_IT": (units.convert(1, "Btu_IT", "J"), scipy.constants.Btu_IT),
        "kWh": (units.convert(1, "kWh", "J"), scipy.constants.kilo * scipy.constants.hour),
        "atm": (units.convert(1, "atm", "Pa"), scipy.constants.atm),
        "lb": (units.convert(1, "lb", "kg"), scipy.constants.lb),
        "millimetre of mercury": (1000 * float(CELLS["millimetre_of_mercury"]), scipy.constants.mmHg),
    }
    for what, (found, expected) in listed.items():
        yield what, percent(found, expected)


@outside(TABLE, 12, 1.0, "last digits")
def atomic_weights() -> Deviations:
    """Atomic weights of cell functions and checker, in units of their last digit"""
    own = {"H": atoms.H, "C": atoms.C, "N": atoms.N, "O": atoms.O, "S": atoms.S, "Cl": atoms.CL}
    for symbol, word in WORDS.items():
        yield f"{word}, cells", (float(CELLS[f"atomic_weight_{word}"]) - weight(symbol)) / DIGITS[symbol]
        yield f"{word}, checker", (own[symbol] - weight(symbol)) / DIGITS[symbol]


@outside(TABLE, 3, 0.001, "g/mol")
def molar_masses() -> Deviations:
    """Water, nitrate and sulfate"""
    yield "water", float(CELLS["molar_mass_water"]) - 2 * weight("H") - weight("O")
    yield "nitrate", float(CELLS["molar_mass_nitrate"]) - weight("N") - 3 * weight("O")
    yield "sulfate", (float(CELLS["molar_mass_sulfate"]) - 32.06 - 4 * weight("O"))


@outside("scipy.constants, periodictable, CODATA key values 1989", 6, 0.001, "%")
def exact_coefficients() -> Deviations:
    """Net coefficients of the profile with exact ones, from R, 298.15 K, atomic weights, 44 004 J/mol"""
    rt = scipy.constants.R * 298.15
    hydrogen, oxygen, nitrogen = weight("H"), weight("O"), weight("N")
    water = 2 * hydrogen + oxygen
    listed = {
        "net_p_hydrogen": (CODATA_VAPORISATION / 2 - rt / 4) / hydrogen,
        "net_p_oxygen": rt / 2 / oxygen,
        "net_p_nitrogen": rt / 2 / nitrogen,
        "net_p_moisture": CODATA_VAPORISATION / water,
        "net_v_hydrogen": (CODATA_VAPORISATION - rt) / 2 / hydrogen,
        "net_v_moisture": (CODATA_VAPORISATION - rt) / water,
    }
    for what, expected in listed.items():
        yield what, percent(EXACT[what].value, 0.01 * expected)


@outside("CODATA key values for thermodynamics 1989", 3, 0.0, "J/mol")
def vaporisation_of_water() -> Deviations:
    """Water gas less liquid, of cell functions, profile and checker"""
    yield "cells", float(CELLS["water_vaporisation"]) - CODATA_VAPORISATION
    yield "profile", EXACT["water_vaporisation"].value - CODATA_VAPORISATION
    yield "checker", atoms.VAPORISATION - CODATA_VAPORISATION


@pytest.mark.parametrize("check", of(__name__), ids=lambda check: check.deviations.__name__)
def test_constants(check: Check) -> None:
    """Equal, or equal to the last digit carried."""
    check.hold()


def test_conversion_factors_of_the_cells_are_powers_of_ten() -> None:
    """Every factor that a formula names between two spellings of a unit is what the unit registry says."""
    used = 0
    for name, constant in CELLS.items():
        if "exact" in constant.source and name.endswith(("per_kilojoule", "per_gram", "per_litre", "per_megapascal")):
            numerator, denominator = constant.unit.split("/")
            assert units.convert(1.0, denominator, numerator) == pytest.approx(float(constant), rel=1e-12), name
            used += 1
    assert used == 4
