"""Heat cell functions: heat, mass, specific heat and temperature of one body; electrical heat; water.

Standard library only: this file also runs inside LibreOffice's Python.
"""

from typing import Annotated

from sheetcal.cells.constants import ABSOLUTE_ZERO
from sheetcal.cells.registry import (
    DEGC,
    J_PER_G,
    J_PER_G_K,
    J_PER_K,
    Constant,
    G,
    J,
    K,
    S,
    cell,
)

VOLT = Annotated[float, "V"]
AMPERE = Annotated[float, "A"]

_IAPWS = "IAPWS SR6-08(2011), liquid water at 0.1 MPa, equation for the isobaric heat capacity"
WATER_GAS_CONSTANT = Constant(0.46151805, "J/(g K)", name="water_gas_constant", source=_IAPWS)
WATER_REDUCING = Constant(10.0, "K", name="water_reducing_temperature", source=_IAPWS)
WATER_HOT_POLE = Constant(319.85, "degC", name="water_hot_pole", source=f"{_IAPWS}; 593 K")
WATER_COLD_POLE = Constant(-41.15, "degC", name="water_cold_pole", source=f"{_IAPWS}; 232 K")


MASS = (1e-6, 1e6)
SPECIFIC = (0.01, 20.0)


@cell(
    "HEAT_FROM_RISE",
    equation="Q = m c dT",
    source="definition of the specific heat",
    standing="derived",
    valid={"mass": (0.0, 1e6), "specific_heat": (0.0, 20.0)},
)
def heat_from_rise(mass: G, specific_heat: J_PER_G_K, rise: K) -> J:
    """Heat taken up by a body that warms; its specific heat taken as constant."""
    return mass * specific_heat * rise


@cell(
    "RISE_FROM_HEAT",
    equation="dT = Q / (m c)",
    source="definition of the specific heat",
    standing="derived",
    valid={"mass": MASS, "specific_heat": SPECIFIC},
)
def rise_from_heat(heat: J, mass: G, specific_heat: J_PER_G_K) -> K:
    """Temperature rise of a body that takes up heat; its specific heat taken as constant."""
    return heat / (mass * specific_heat)


@cell(
    "MASS_FROM_HEAT",
    equation="m = Q / (c dT)",
    source="definition of the specific heat",
    standing="derived",
    valid={"specific_heat": SPECIFIC},
    needs=("rise != 0",),
)
def mass_from_heat(heat: J, specific_heat: J_PER_G_K, rise: K) -> G:
    """Mass of the body that a heat warms by a rise."""
    return heat / (specific_heat * rise)


@cell(
    "SPECIFIC_HEAT_FROM_HEAT",
    equation="c = Q / (m dT)",
    source="definition of the specific heat",
    standing="derived",
    valid={"mass": MASS},
    needs=("rise != 0",),
)
def specific_heat_from_heat(heat: J, mass: G, rise: K) -> J_PER_G_K:
    """Mean specific heat over a rise."""
    return heat / (mass * rise)


@cell(
    "FINAL_TEMPERATURE_FROM_HEAT",
    equation="T = T0 + Q / (m c)",
    source="definition of the specific heat",
    standing="derived",
    valid={"mass": MASS, "specific_heat": SPECIFIC},
)
def final_temperature_from_heat(start: DEGC, heat: J, mass: G, specific_heat: J_PER_G_K) -> DEGC:
    """Final temperature of a body that takes up heat; no change of phase."""
    return start + heat / (mass * specific_heat)


@cell(
    "HEAT_OF_CHANGE",
    equation="Q = m L",
    source="definition of the latent heat",
    standing="derived",
    valid={"mass": (0.0, 1e6), "latent_heat": (0.0, 1e5)},
)
def heat_of_change(mass: G, latent_heat: J_PER_G) -> J:
    """Heat to melt or boil a mass at its temperature of change."""
    return mass * latent_heat


@cell(
    "LATENT_HEAT_FROM_HEAT",
    equation="L = Q / m",
    source="definition of the latent heat",
    standing="derived",
    valid={"mass": MASS},
)
def latent_heat_from_heat(heat: J, mass: G) -> J_PER_G:
    """Latent heat from the heat that changed a mass."""
    return heat / mass


@cell(
    "HEAT_CAPACITY_FROM_HEAT",
    equation="C = Q / dT",
    source="definition of the heat capacity",
    standing="derived",
    needs=("rise != 0",),
)
def heat_capacity_from_heat(heat: J, rise: K) -> J_PER_K:
    """Heat capacity of a calorimeter from a known heat, electrical or of reaction, and its rise."""
    return heat / rise


@cell(
    "ELECTRICAL_HEAT",
    equation="Q = U I t",
    source="Joule's law; mean voltage and current over the duration",
    standing="derived",
    valid={"voltage": (0.0, 1000.0), "current": (0.0, 1000.0), "duration": (0.0, 1e6)},
)
def electrical_heat(voltage: VOLT, current: AMPERE, duration: S) -> J:
    """Heat of an electrical heater at steady voltage and current."""
    return voltage * current * duration


@cell(
    "WATER_SPECIFIC_HEAT",
    equation="c = -R [c3 + tau sum n(n+1) a alpha^(n+2) + tau sum m(m+1) b beta^(m+2)], tau = T/10 K, "
    "alpha = 10 K/(593 K - T), beta = 10 K/(T - 232 K)",
    source=_IAPWS,
    valid={"temperature": (0.0, 100.0)},
)
def water_specific_heat(temperature: DEGC) -> J_PER_G_K:
    """Specific heat of liquid water at 0.1 MPa; 0.1 % stated, 0.01 % at room temperature."""
    tau = (temperature - ABSOLUTE_ZERO) / WATER_REDUCING
    alpha = WATER_REDUCING / (WATER_HOT_POLE - temperature)
    beta = WATER_REDUCING / (temperature - WATER_COLD_POLE)
    hot = 20 * -1.661470539e5 * alpha**6 + 30 * 2.708781640e6 * alpha**7 + 56 * -1.557191544e8 * alpha**9
    cold = 6 * -8.237426256e-1 * beta**4 + 12 * 1.908956353 * beta**5 + 20 * -2.017597384 * beta**6
    tail = 30 * 8.546361348e-1 * beta**7
    return -WATER_GAS_CONSTANT * (-8.983025854 + tau * (hot + cold + tail))
