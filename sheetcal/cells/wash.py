"""The washings route by route: nitric and sulfuric acid each in a line of its own, then the route's choice.

A coefficient "per mass-%" has the unit of its result; the per cent it multiplies is a pure number.
Standard library only: this file also runs inside LibreOffice's Python.
"""

from typing import Annotated

from sheetcal.cells.combustion import (
    CARBONATE_VOLUME,
    HEATS_PER_LENGTH,
    M_NITRATE,
    M_SULFATE,
    NORMAL_ACID,
    SULFURIC_PER_ML,
)
from sheetcal.cells.constants import M_S, MG_PER_G, ML_PER_L
from sheetcal.cells.primitives import is_blank, is_number, look_up
from sheetcal.cells.registry import (
    CM_OR_BLANK,
    J_OR_BLANK,
    J_PER_G,
    J_PER_ML,
    MG_PER_L,
    ML,
    PERCENT,
    PERCENT_OR_BLANK,
    TEXT,
    TEXT_OR_BLANK,
    TEXTS,
    G,
    J,
    cell,
)

CENTIMETRES = Annotated[float, "cm"]

_ACIDS = "acids of the washings; equivalents re-derived"
_TITRATION = "titration with barium hydroxide and carbonate, as in ISO 1928"
_IONS = "ions of the washings, molar masses"


@cell("LENGTH_BURNT", equation="start - left", source="measured wire", standing="derived", needs=("left <= start",))
def length_burnt(start: CENTIMETRES, left: CENTIMETRES) -> CENTIMETRES:
    """Length of the fuse wire that burned."""
    return start - left


@cell(
    "WIRE_HEAT_OF_LENGTH",
    equation="Q = h x length burnt",
    source="table of lots of the lab file",
    standing="derived",
    needs=(
        "is_blank(lot) == is_blank(burnt)",
        "is_blank(lot) or is_number(look_up(lot, lots, heats))",
    ),
)
def wire_heat_of_length(lot: TEXT_OR_BLANK, burnt: CM_OR_BLANK, lots: TEXTS, heats: HEATS_PER_LENGTH) -> J:
    """Heat of the fuse wire that burned; 0 without a lot, blank for a lot without its length."""
    return 0 if is_blank(lot) else burnt * look_up(lot, lots, heats)


@cell(
    "NITRIC_HEAT_FROM_ACID",
    equation="Q = q V - q_S m S - q_Cl m Cl; V of 0.1 mol/L",
    source=_ACIDS,
    standing="derived",
)
def nitric_heat_from_acid(
    acid_volume: ML,
    mass: G,
    sulfur: PERCENT,
    chlorine: PERCENT_OR_BLANK,
    heat_per_mL: J_PER_ML,
    sulfur_as_nitric: J_PER_G,
    chlorine_as_nitric: J_PER_G,
) -> J:
    """Heat of nitric acid from the total acid, what sulfur and chlorine gave taken out; chlorine blank is 0."""
    halide = chlorine_as_nitric * chlorine if is_number(chlorine) else 0
    return heat_per_mL * acid_volume - mass * (sulfur_as_nitric * sulfur + halide)


@cell("NITRIC_HEAT_FROM_BARIUM", equation="Q = q (20.0 - V1)", source=_TITRATION, standing="memory")
def nitric_heat_from_barium(back_titre: ML, heat_per_mL: J_PER_ML) -> J:
    """Heat of nitric acid from the back titration after barium and carbonate."""
    return heat_per_mL * (CARBONATE_VOLUME - back_titre)


@cell("NITRIC_HEAT_FROM_IONS", equation="Q = q x 0.1 mol/L equivalents of nitrate", source=_IONS, standing="derived")
def nitric_heat_from_ions(nitrate: MG_PER_L, wash_volume: ML, heat_per_mL: J_PER_ML) -> J:
    """Heat of nitric acid from nitrate in the washings."""
    grams = nitrate * wash_volume / ML_PER_L / MG_PER_G
    return heat_per_mL * (grams / M_NITRATE / NORMAL_ACID * ML_PER_L)


@cell("SULFURIC_HEAT_FROM_SULFUR", equation="Q = q m S", source=_ACIDS, standing="derived")
def sulfuric_heat_from_sulfur(mass: G, sulfur: PERCENT, heat_per_gram_percent: J_PER_G) -> J:
    """Heat of sulfuric acid from the sulfur of the charge."""
    return heat_per_gram_percent * mass * sulfur


@cell("SULFURIC_HEAT_FROM_BARIUM", equation="Q = 15.1 (V1 + V2 - 20.0)", source=_TITRATION, standing="memory")
def sulfuric_heat_from_barium(barium_volume: ML, back_titre: ML) -> J:
    """Heat of sulfuric acid from the titration with barium and carbonate."""
    return SULFURIC_PER_ML * (back_titre + barium_volume - CARBONATE_VOLUME)


@cell("SULFURIC_HEAT_FROM_IONS", equation="Q = q x 100 x sulfate as S", source=_IONS, standing="derived")
def sulfuric_heat_from_ions(sulfate: MG_PER_L, wash_volume: ML, heat_per_gram_percent: J_PER_G) -> J:
    """Heat of sulfuric acid from sulfate in the washings."""
    grams = sulfate * wash_volume / ML_PER_L / MG_PER_G * M_S / M_SULFATE
    return heat_per_gram_percent * (100 * grams)


@cell(
    "ACID_HEAT_BY_ROUTE",
    equation="by total acid, barium, ions or fixed; 0 where nothing is titrated",
    source="route that the run names",
    standing="derived",
    choices={"route": ("total acid", "barium", "ions", "fixed", "none")},
    needs=(
        "is_number(by_acid) if route == 'total acid' else is_number(by_barium) if route == 'barium'"
        " else is_number(by_ions) if route == 'ions' else route == 'none' or is_number(fixed)",
    ),
)
def acid_heat_by_route(
    route: TEXT, by_acid: J_OR_BLANK, by_barium: J_OR_BLANK, by_ions: J_OR_BLANK, fixed: J_OR_BLANK
) -> J:
    """Heat of an acid by the route that the washings were analysed."""
    stated = 0 if route == "none" else fixed
    analysed = by_barium if route == "barium" else by_ions if route == "ions" else stated
    return by_acid if route == "total acid" else analysed
