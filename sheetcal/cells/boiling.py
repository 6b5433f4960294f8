"""Boiling off: heater powers against rates, the vapour-pressure line, the form of the volume work.

Standard library only: this file also runs inside LibreOffice's Python.
"""

from typing import Annotated, Any, Sequence

from sheetcal.cells.constants import ABSOLUTE_ZERO, KPA_CM3_PER_J, R
from sheetcal.cells.primitives import interpolate, largest, log, slope, smallest
from sheetcal.cells.registry import (
    CM3_PER_G,
    DEGC,
    DEGC_OR_BLANK,
    G_PER_ML,
    G_PER_MOL,
    J_PER_G,
    J_PER_G_OR_BLANK,
    KPA,
    ONE,
    PERCENT,
    TEXT,
    G,
    S,
    W,
    cell,
)

VOLT = Annotated[float, "V"]
AMPERE = Annotated[float, "A"]
G_PER_S = Annotated[float, "g/s"]
POWERS = Annotated[Sequence[Any], "W"]
RATES = Annotated[Sequence[Any], "g/s"]

_POWERS = "energy balance of the boiler; the loss to the room is the same at all powers"
_BOTH = "pairs(powers, rates) >= 2 and count(powers) == count(rates) and largest(rates) > smallest(rates)"
_CLAUSIUS = "Clausius and Clapeyron; vapour as an ideal gas, volume of the liquid neglected"
_SOURCE = "the source chosen on the sheet"


@cell("HEATER_POWER", equation="P = U I", source="Joule's law", standing="derived")
def heater_power(voltage: VOLT, current: AMPERE) -> W:
    """Power of a heater at steady voltage and current."""
    return voltage * current


@cell(
    "BOILING_RATE",
    equation="r = m / t",
    source="definition of a rate",
    standing="derived",
    needs=("duration > 0",),
)
def boiling_rate(mass: G, duration: S) -> G_PER_S:
    """Mass condensed per second."""
    return mass / duration


@cell(
    "VAPORISATION_FROM_POWERS",
    equation="h = slope of P over r",
    source=_POWERS,
    standing="derived",
    needs=(_BOTH,),
)
def vaporisation_from_powers(powers: POWERS, rates: RATES) -> J_PER_G:
    """Enthalpy of vaporisation from two or more heater powers, free of the steady loss."""
    return slope(powers, rates)


@cell(
    "LOSS_FROM_POWERS",
    equation="P at r = 0 on the line of P over r",
    source=_POWERS,
    standing="derived",
    needs=(_BOTH,),
)
def loss_from_powers(powers: POWERS, rates: RATES) -> W:
    """Steady loss of the boiler to the room."""
    return interpolate(0, powers, rates)


@cell(
    "RATIO_OF",
    equation="largest / smallest",
    source="spread of the heater powers",
    standing="derived",
    needs=("smallest(powers) > 0",),
)
def ratio_of(powers: POWERS) -> ONE:
    """Largest power over smallest power."""
    return largest(powers) / smallest(powers)


@cell(
    "VAPORISATION_FROM_LINE",
    equation="h = R ln(p2/p1) / (1/T1 - 1/T2) / M",
    source=_CLAUSIUS,
    standing="derived",
    valid={"molar_mass": (1.0, 2000.0)},
    needs=("pressure1 > 0 and pressure2 > 0 and temperature1 != temperature2",),
)
def vaporisation_from_line(
    pressure1: KPA, temperature1: DEGC, pressure2: KPA, temperature2: DEGC, molar_mass: G_PER_MOL
) -> J_PER_G:
    """Enthalpy of vaporisation from two points of the vapour-pressure line."""
    first = temperature1 - ABSOLUTE_ZERO
    second = temperature2 - ABSOLUTE_ZERO
    return R * log(pressure2 / pressure1) * first * second / (second - first) / molar_mass


@cell(
    "SATURATION_FROM_LINE",
    equation="1/T = 1/T1 - ln(p/p1) (1/T1 - 1/T2)/ln(p2/p1)",
    source=_CLAUSIUS,
    standing="derived",
    needs=("pressure1 > 0 and pressure2 > 0 and pressure > 0 and pressure1 != pressure2",),
)
def saturation_from_line(pressure: KPA, pressure1: KPA, temperature1: DEGC, pressure2: KPA, temperature2: DEGC) -> DEGC:
    """Boiling temperature at a pressure, between two points of the vapour-pressure line."""
    first = temperature1 - ABSOLUTE_ZERO
    second = temperature2 - ABSOLUTE_ZERO
    share = log(pressure / pressure1) / log(pressure2 / pressure1)
    return ABSOLUTE_ZERO + first * second / (second - share * (second - first))


@cell(
    "SATURATION_BY_SUBSTANCE",
    equation="of water, or from the line given",
    source="the substance named on the sheet",
    standing="derived",
    needs=("is_number(of_water) if substance == 'water' else is_number(from_line)",),
)
def saturation_by_substance(substance: TEXT, of_water: DEGC_OR_BLANK, from_line: DEGC_OR_BLANK) -> DEGC:
    """Boiling temperature that the pressure of the room asks for."""
    return of_water if substance == "water" else from_line


_SOURCES = ("measured here", "table", "vapour-pressure line")


@cell(
    "VAPORISATION_BY_SOURCE",
    equation="measured here, from a table, or from the vapour-pressure line",
    source=_SOURCE,
    standing="derived",
    choices={"source": _SOURCES},
    needs=(
        "is_number(measured) if source == 'measured here' else is_number(table) if source == 'table'"
        " else is_number(from_line)",
    ),
)
def vaporisation_by_source(
    source: TEXT, measured: J_PER_G_OR_BLANK, table: J_PER_G_OR_BLANK, from_line: J_PER_G_OR_BLANK
) -> J_PER_G:
    """Enthalpy of vaporisation from the source that the sheet names."""
    other = table if source == "table" else from_line
    return measured if source == "measured here" else other


_FORMS = ("measured volumes", "ideal gas", "second virial")


@cell(
    "WORK_BY_FORM",
    equation="by measured volumes, ideal gas or second virial coefficient",
    source=_SOURCE,
    standing="derived",
    choices={"form": _FORMS},
    needs=(
        "is_number(measured) if form == 'measured volumes' else is_number(ideal) if form == 'ideal gas'"
        " else is_number(virial)",
    ),
)
def work_by_form(form: TEXT, measured: J_PER_G_OR_BLANK, ideal: J_PER_G_OR_BLANK, virial: J_PER_G_OR_BLANK) -> J_PER_G:
    """Volume work of vaporisation by the form that the sheet names."""
    other = ideal if form == "ideal gas" else virial
    return measured if form == "measured volumes" else other


@cell(
    "LIQUID_VOLUME",
    equation="v = 1/rho",
    source="definition of the density",
    standing="derived",
    needs=("density > 0",),
)
def liquid_volume(density: G_PER_ML) -> CM3_PER_G:
    """Volume of a gram of liquid."""
    return 1 / density


@cell(
    "LIQUID_SHARE",
    equation="100 p V_l / (w + p V_l)",
    source="definition of a share",
    standing="derived",
    needs=("work > 0",),
)
def liquid_share(pressure: KPA, liquid_volume: CM3_PER_G, work: J_PER_G) -> PERCENT:
    """Volume of the liquid as a share of that of the vapour."""
    liquid = pressure * liquid_volume / KPA_CM3_PER_J
    return 100 * liquid / (work + liquid)


@cell(
    "FORM_WORDS",
    equation="the form of the volume work, and what it leaves out",
    source=_SOURCE,
    standing="derived",
    choices={"form": ("measured volumes", "ideal gas", "second virial")},
)
def form_words(form: TEXT) -> TEXT:
    """Which form of the volume work the energy stands on."""
    last = "ideal gas; volume of the liquid left out" if form == "ideal gas" else "second virial coefficient"
    return "measured volumes" if form == "measured volumes" else last
