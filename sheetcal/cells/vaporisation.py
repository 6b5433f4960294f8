"""Vaporisation: enthalpy from heater powers, energy from enthalpy, totals for a liquid.

Standard library only: this file also runs inside LibreOffice's Python.
"""

from sheetcal.cells.constants import ABSOLUTE_ZERO, J_PER_KJ, KPA_CM3_PER_J, R
from sheetcal.cells.primitives import is_number, log10
from sheetcal.cells.registry import (
    CM3_PER_G,
    CM3_PER_MOL,
    DEGC,
    G_OR_BLANK,
    G_PER_ML_OR_BLANK,
    G_PER_MOL,
    J_PER_G,
    KJ,
    KPA,
    ML_OR_BLANK,
    Constant,
    G,
    J,
    S,
    W,
    cell,
)

_TWO_POWERS = "energy balance of the boiler at two powers; the loss to the room is the same at both"
_VOLUME_WORK = "definition of the enthalpy; work p (V_g - V_l) against the vapour pressure"
_DURATION = (0.001, 1e6)
_MASS = (1e-6, 1e5)
_PRESSURE = (0.01, 10000.0)

_ANTOINE = "Antoine equation of water 1..100 degC, widely printed: log10(p/mmHg) = 8.07131 - 1730.63/(233.426 + t)"
MMHG = Constant(0.133322368, "kPa", "millimetre_of_mercury", "conventional millimetre of mercury")
ANTOINE_B = Constant(1730.63, "K", "antoine_slope_water", _ANTOINE, "memory")
ANTOINE_POLE = Constant(-233.426, "degC", "antoine_pole_water", _ANTOINE, "memory")


@cell(
    "VAPORISATION_FROM_TWO_POWERS",
    equation="h = (E1/t1 - E2/t2) / (m1/t1 - m2/t2)",
    source=_TWO_POWERS,
    standing="derived",
    valid={"mass1": _MASS, "time1": _DURATION, "mass2": _MASS, "time2": _DURATION},
    needs=("mass1 / time1 != mass2 / time2",),
)
def vaporisation_from_two_powers(energy1: J, mass1: G, time1: S, energy2: J, mass2: G, time2: S) -> J_PER_G:
    """Enthalpy of vaporisation from two heater powers, free of the steady loss."""
    return (energy1 / time1 - energy2 / time2) / (mass1 / time1 - mass2 / time2)


@cell(
    "LOSS_FROM_TWO_POWERS",
    equation="P_loss = (E1 m2 - E2 m1) / (t1 m2 - t2 m1)",
    source=_TWO_POWERS,
    standing="derived",
    valid={"mass1": _MASS, "time1": _DURATION, "mass2": _MASS, "time2": _DURATION},
    needs=("mass1 / time1 != mass2 / time2",),
)
def loss_from_two_powers(energy1: J, mass1: G, time1: S, energy2: J, mass2: G, time2: S) -> W:
    """Steady loss of the boiler to the room."""
    return (energy1 * mass2 - energy2 * mass1) / (time1 * mass2 - time2 * mass1)


@cell(
    "VAPORISATION_FROM_ONE_POWER",
    equation="h = E / m",
    source="energy balance of the boiler, its loss neglected",
    standing="derived",
    valid={"mass": _MASS},
)
def vaporisation_from_one_power(energy: J, mass: G) -> J_PER_G:
    """Enthalpy of vaporisation from one heater power; too high by the loss."""
    return energy / mass


@cell(
    "VAPOUR_WORK_MEASURED",
    equation="w = p (V_g - V_l)",
    source=_VOLUME_WORK,
    standing="derived",
    valid={"pressure": _PRESSURE, "vapour_volume": (0.0, 1e7), "liquid_volume": (0.0, 100.0)},
    needs=("vapour_volume > liquid_volume",),
)
def vapour_work_measured(pressure: KPA, vapour_volume: CM3_PER_G, liquid_volume: CM3_PER_G) -> J_PER_G:
    """Volume work of vaporisation from measured volumes."""
    return pressure * (vapour_volume - liquid_volume) / KPA_CM3_PER_J


@cell(
    "VAPOUR_WORK_IDEAL",
    equation="w = R T / M",
    source="ideal gas, liquid volume neglected",
    standing="derived",
    valid={"boiling": (-250.0, 700.0), "molar_mass": (1.0, 2000.0)},
)
def vapour_work_ideal(boiling: DEGC, molar_mass: G_PER_MOL) -> J_PER_G:
    """Volume work of vaporisation with the vapour as an ideal gas."""
    return R * (boiling - ABSOLUTE_ZERO) / molar_mass


@cell(
    "VAPOUR_WORK_VIRIAL",
    equation="w = R T/M + p B/M - p V_l",
    source="second virial coefficient, volume form p V = R T + B p",
    standing="derived",
    valid={
        "pressure": _PRESSURE,
        "boiling": (-250.0, 700.0),
        "molar_mass": (1.0, 2000.0),
        "virial": (-20000.0, 1000.0),
        "liquid_volume": (0.0, 100.0),
    },
)
def vapour_work_virial(
    pressure: KPA, boiling: DEGC, molar_mass: G_PER_MOL, virial: CM3_PER_MOL, liquid_volume: CM3_PER_G
) -> J_PER_G:
    """Volume work of vaporisation with the second virial coefficient of the vapour."""
    ideal = R * (boiling - ABSOLUTE_ZERO) / molar_mass
    return ideal + pressure * (virial / molar_mass - liquid_volume) / KPA_CM3_PER_J


@cell(
    "VAPORISATION_ENERGY_FROM_ENTHALPY",
    equation="dU = dH - w",
    source=_VOLUME_WORK,
    standing="derived",
    valid={"enthalpy": (0.0, 1e5)},
)
def vaporisation_energy_from_enthalpy(enthalpy: J_PER_G, work: J_PER_G) -> J_PER_G:
    """Energy of vaporisation from the enthalpy and the volume work."""
    return enthalpy - work


@cell(
    "VAPORISATION_ENTHALPY_FROM_ENERGY",
    equation="dH = dU + w",
    source=_VOLUME_WORK,
    standing="derived",
    valid={"energy": (0.0, 1e5)},
)
def vaporisation_enthalpy_from_energy(energy: J_PER_G, work: J_PER_G) -> J_PER_G:
    """Enthalpy of vaporisation from the energy and the volume work."""
    return energy + work


@cell(
    "MASS_OF_LIQUID",
    equation="m, or V rho",
    source="definition of the density",
    standing="derived",
    valid={"mass": (0.0, 1e6), "volume": (0.0, 1e6), "density": (0.0, 25.0)},
    needs=("is_number(mass) or is_number(volume) and is_number(density)",),
)
def mass_of_liquid(mass: G_OR_BLANK, volume: ML_OR_BLANK, density: G_PER_ML_OR_BLANK) -> G:
    """Mass of a liquid, typed or from its volume."""
    return mass if is_number(mass) else volume * density


@cell(
    "TOTAL_VAPORISATION_HEAT",
    equation="Q = m h",
    source="definition of the enthalpy of vaporisation",
    standing="derived",
    valid={"mass": (0.0, 1e6), "enthalpy": (0.0, 1e5)},
)
def total_vaporisation_heat(mass: G, enthalpy: J_PER_G) -> KJ:
    """Heat to vaporise a mass of liquid."""
    return mass * enthalpy / J_PER_KJ


@cell(
    "SATURATION_TEMPERATURE_OF_WATER",
    equation="t = 1730.63 K/(8.07131 - log10(p/mmHg)) - 233.426 degC",
    source=f"{_ANTOINE}; within 0.08 K of IAPWS-95 from 47 to 110 kPa",
    standing="memory",
    valid={"pressure": (47.0, 110.0)},
)
def saturation_temperature_of_water(pressure: KPA) -> DEGC:
    """Boiling point of water at the station's pressure, to judge a boiling temperature read."""
    return ANTOINE_POLE + ANTOINE_B / (8.07131 - log10(pressure / MMHG))
