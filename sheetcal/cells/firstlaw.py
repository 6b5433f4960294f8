"""First law: energy, heat and work; energy and enthalpy at constant pressure.

Standard library only: this file also runs inside LibreOffice's Python.
"""

from typing import Annotated

from sheetcal.cells.constants import J_PER_KJ
from sheetcal.cells.registry import G_PER_MOL, J_PER_G, KJ_PER_MOL, KPA, J, cell

LITRE = Annotated[float, "L"]
_FIRST_LAW = "first law"
_POSITIVE = (0.0, None)


@cell(
    "ENERGY_FROM_HEAT_AND_WORK",
    equation="dU = Q + W",
    source=_FIRST_LAW,
    standing="derived",
)
def energy_from_heat_and_work(heat: J, work: J) -> J:
    """Change of internal energy; heat and work count positive when the body takes them up."""
    return heat + work


@cell(
    "WORK_AT_CONSTANT_PRESSURE",
    equation="W = -p (V2 - V1)",
    source="definition of the volume work",
    standing="derived",
    valid={"pressure": _POSITIVE, "start_volume": _POSITIVE, "end_volume": _POSITIVE},
)
def work_at_constant_pressure(pressure: KPA, start_volume: LITRE, end_volume: LITRE) -> J:
    """Work done on a body at constant pressure (kPa times L is J); negative when it expands."""
    return pressure * (start_volume - end_volume)


@cell(
    "ENERGY_FROM_ENTHALPY",
    equation="dU = dH - p dV",
    source="definition of the enthalpy, constant pressure",
    standing="derived",
    valid={"pressure": _POSITIVE},
)
def energy_from_enthalpy(enthalpy: J, pressure: KPA, volume_change: LITRE) -> J:
    """Change of internal energy from the change of enthalpy at constant pressure."""
    return enthalpy - pressure * volume_change


@cell(
    "ENTHALPY_FROM_ENERGY_AND_VOLUME",
    equation="dH = dU + p dV",
    source="definition of the enthalpy, constant pressure",
    standing="derived",
    valid={"pressure": _POSITIVE},
)
def enthalpy_from_energy_and_volume(energy: J, pressure: KPA, volume_change: LITRE) -> J:
    """Change of enthalpy from the change of internal energy at constant pressure."""
    return energy + pressure * volume_change


@cell(
    "MOLAR_VALUE",
    equation="x_m = x M",
    source="definition of the molar mass",
    standing="derived",
    valid={"molar_mass": (1.0, 1e6)},
)
def molar_value(value: J_PER_G, molar_mass: G_PER_MOL) -> KJ_PER_MOL:
    """A value per gram as a value per mole."""
    return value * molar_mass / J_PER_KJ


@cell(
    "SPECIFIC_VALUE",
    equation="x = x_m / M",
    source="definition of the molar mass",
    standing="derived",
    valid={"molar_mass": (1.0, 1e6)},
)
def specific_value(value: KJ_PER_MOL, molar_mass: G_PER_MOL) -> J_PER_G:
    """A value per mole as a value per gram."""
    return value * J_PER_KJ / molar_mass
