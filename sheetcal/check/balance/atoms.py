"""Atoms, moles and the exact coefficients that follow from them, at 298.15 K.

Atomic weights: IUPAC conventional values 2021. R: 2019 SI. Formation enthalpies in J/mol: CODATA key values
(1989) for water, SO2 and HCl(g); NBS tables of chemical thermodynamic properties (1982) for the acids in water.
"""

from __future__ import annotations

from typing import NamedTuple

R = 8.31446261815324  # J/(mol K)
T = 298.15  # K
RT = R * T  # J/mol, p dV of one mole of gas

H, C, N, O, S, CL = 1.008, 12.011, 14.007, 15.999, 32.06, 35.45  # g/mol  # noqa: E741
WATER = 2 * H + O
NITRATE = N + 3 * O
SULFATE = S + 4 * O

DFH_WATER = -285_830.0
DFH_WATER_GAS = -241_826.0
DFH_SO2 = -296_810.0
DFH_HCL_GAS = -92_310.0
DFH_HCL_WATER = -166_540.0  # in 600 H2O
DFH_H2SO4_WATER = -887_810.0  # in 115 H2O
DFH_HNO3_WATER = -207_130.0  # between 0.1 mol/L (-206 900) and endless dilution (-207 360), the middle

VAPORISATION = DFH_WATER_GAS - DFH_WATER  # 44 004 J/mol, liquid to ideal gas
HCL_RELEASE = DFH_HCL_GAS - DFH_HCL_WATER  # dissolved to gas


def _energy_of_nitric() -> float:
    """Heat at constant volume of 1/2 N2 + 5/4 O2 + 1/2 H2O(l) -> HNO3(aq), J/mol, positive."""
    enthalpy = DFH_HNO3_WATER - 0.5 * DFH_WATER
    return -(enthalpy + 1.75 * RT)


def _energy_of_sulfuric() -> float:
    """Heat at constant volume of SO2 + 1/2 O2 + H2O(l) -> H2SO4(aq), J/mol, positive."""
    enthalpy = DFH_H2SO4_WATER - DFH_SO2 - DFH_WATER
    return -(enthalpy + 1.5 * RT)


NITRIC_ENERGY = _energy_of_nitric()
SULFURIC_ENERGY = _energy_of_sulfuric()


class Moles(NamedTuple):
    """Moles of each element in a portion of fuel, without its moisture."""

    hydrogen: float
    oxygen: float = 0.0
    nitrogen: float = 0.0
    carbon: float = 0.0
    sulfur: float = 0.0
    chlorine: float = 0.0


def moles_per_gram(hydrogen: float, oxygen: float = 0.0, nitrogen: float = 0.0, chlorine: float = 0.0) -> Moles:
    """Moles per gram from mass per cent.

    Carbon and sulfur take one O2 and give one gas molecule each, so they never count in the gas change.
    """
    return Moles(0.01 * hydrogen / H, 0.01 * oxygen / O, 0.01 * nitrogen / N, chlorine=0.01 * chlorine / CL)


def gas_change(fuel: Moles, gaseous: float = 0.0) -> float:
    """Moles of gas made less used when fuel burns to CO2, H2O(l), N2, SO2 and HCl(aq).

    gaseous: moles of fuel that were gas themselves; 0 for solids and liquids.
    """
    burnt_hydrogen = fuel.hydrogen - fuel.chlorine
    oxygen_used = fuel.carbon + fuel.sulfur + burnt_hydrogen / 4 - fuel.oxygen / 2
    return fuel.carbon + fuel.sulfur + fuel.nitrogen / 2 - oxygen_used - gaseous


def water_made(fuel: Moles) -> float:
    """Moles of water formed; hydrogen bound by chlorine makes none."""
    return (fuel.hydrogen - fuel.chlorine) / 2


def release_at_constant_pressure(fuel: Moles, gaseous: float = 0.0) -> float:
    """What turns the gross heat at constant volume into the net heat at constant pressure, J.

    First law: the work done on the surroundings is RT per mole of gas; water and HCl leave as gases.
    """
    work = RT * gas_change(fuel, gaseous)
    return -(work + VAPORISATION * water_made(fuel) + HCL_RELEASE * fuel.chlorine)


def release_at_constant_volume(fuel: Moles) -> float:
    """What turns the gross into the net heat, both at constant volume, J: the water's energy of vaporisation."""
    return -(VAPORISATION - RT) * water_made(fuel)
