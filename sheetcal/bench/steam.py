"""Water and its vapour as the bench needs them: heat capacity, saturation line, enthalpy of vaporisation."""

from __future__ import annotations

from itertools import pairwise
from math import exp

# Saturation pressure: Wagner and Pruss, J. Phys. Chem. Ref. Data 22 (1993) 783, eq. 1 (from memory; a test
# compares it with IAPWS-95).
CRITICAL_TEMPERATURE, CRITICAL_PRESSURE = 647.096, 22_064.0  # K, kPa
SATURATION = (
    (-7.85951783, 1.0), (1.84408259, 1.5), (-11.7866497, 3.0), (22.6807411, 3.5), (-15.9618719, 4.0),
    (1.80122502, 7.5),
)  # fmt: skip
# J/(g K) of liquid water by degC, common steam tables at 0.1 MPa (from memory); straight lines between.
HEAT_CAPACITY = (
    (0.0, 4.2194), (5.0, 4.2050), (10.0, 4.1955), (15.0, 4.1888), (20.0, 4.1844), (25.0, 4.1816),
    (30.0, 4.1801), (40.0, 4.1796), (50.0, 4.1815), (60.0, 4.1851), (70.0, 4.1902), (80.0, 4.1969),
    (90.0, 4.2053), (100.0, 4.2157),
)  # fmt: skip


def saturation_pressure(celsius: float) -> float:
    """Vapour pressure of water, kPa."""
    kelvin = celsius + 273.15
    far = 1.0 - kelvin / CRITICAL_TEMPERATURE
    total = sum(factor * far**power for factor, power in SATURATION)
    return CRITICAL_PRESSURE * exp(CRITICAL_TEMPERATURE / kelvin * total)


def boiling_point(pressure: float) -> float:
    """degC at which water boils under a pressure in kPa, by halving."""
    low, high = 1.0, 200.0
    for _ in range(60):
        middle = (low + high) / 2.0
        low, high = (middle, high) if saturation_pressure(middle) < pressure else (low, middle)
    return (low + high) / 2.0


def vaporisation(celsius: float) -> float:
    """Enthalpy of vaporisation of water, J/g, within 0.2 of IAPWS-95 from 80 to 101 degC."""
    below = 100.0 - celsius
    return 2256.4 + 2.625 * below - 0.0022 * below * below


def heat_capacity(celsius: float) -> float:
    """Specific heat of liquid water, J/(g K), 0 to 100 degC."""
    for (low, below), (high, above) in pairwise(HEAT_CAPACITY):
        if celsius <= high:
            return below + (above - below) * (celsius - low) / (high - low)
    return HEAT_CAPACITY[-1][1]


def heat_content(low: float, high: float) -> float:
    """J that warm one gram of liquid water from low to high degC; Simpson's rule over each degree or less."""
    parts = max(2, 2 * int(abs(high - low) + 1.0))
    width = (high - low) / parts
    inner = sum((4.0 if step % 2 else 2.0) * heat_capacity(low + step * width) for step in range(1, parts))
    return (heat_capacity(low) + inner + heat_capacity(high)) * width / 3.0
