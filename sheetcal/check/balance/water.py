"""Liquid water between 0 and 100 degC at one atmosphere: enthalpy and the specific heat that follows from it.

Polynomial of eighth degree through the specific heat of IAPWS-95 at 0.101325 MPa, which it meets within
0.00001 J/(g K). The heat a step takes is a difference of enthalpies, whatever its width.
"""

from __future__ import annotations

from sheetcal.check.balance.measure import Measure

BOILING = 100.0  # degC
FIT = 0.0003  # J/(g K), between good correlations of the last thirty years, 70 ppm
SPECIFIC_HEAT = (
    4.219435,
    -0.344043,
    1.258277,
    -2.907634,
    5.038466,
    -6.270797,
    5.220755,
    -2.532657,
    0.533877,
)  # J/(g K), rising powers of t/100 degC


def specific_heat(temperature: float) -> float:
    """At a temperature in degC, J/(g K)."""
    x = temperature / BOILING
    return sum(coefficient * x**power for power, coefficient in enumerate(SPECIFIC_HEAT))


def enthalpy(temperature: float) -> float:
    """Above 0 degC, J/g."""
    x = temperature / BOILING
    terms = (coefficient * x ** (power + 1) / (power + 1) for power, coefficient in enumerate(SPECIFIC_HEAT))
    return BOILING * sum(terms)


def between(first: float, last: float) -> Measure | None:
    """Mean specific heat between two temperatures in degC, J/(g K); None outside the liquid.

    The tolerance is what the value at the mean temperature differs by, for sheets that take that.
    """
    if not (_liquid(first) and _liquid(last)):
        return None
    middle = specific_heat((first + last) / 2.0)
    if abs(last - first) < 1e-6:
        return Measure(middle, FIT)
    mean = (enthalpy(last) - enthalpy(first)) / (last - first)
    return Measure(mean, FIT + abs(mean - middle))


def at_mean(first: float, last: float) -> Measure | None:
    """Specific heat at the mean of two temperatures in degC, J/(g K); None outside the liquid."""
    middle = (first + last) / 2.0
    return Measure(specific_heat(middle), FIT) if _liquid(middle) else None


def _liquid(temperature: float) -> bool:
    return 0.0 <= temperature <= BOILING
