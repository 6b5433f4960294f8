"""Combustion: from the certificate and the charge to the gross value at constant volume.

A coefficient "per mass-%" has the unit of its result; the per cent it multiplies is a pure number.
Standard library only: this file also runs inside LibreOffice's Python.
"""

from typing import Annotated, Any, Sequence

from sheetcal.cells.constants import (
    ABSOLUTE_ZERO,
    J_PER_KJ,
    KPA_PER_MPA,
    M_C,
    M_H,
    M_O,
    M_S,
    MG_PER_G,
    ML_PER_L,
    R,
)
from sheetcal.cells.primitives import is_blank, is_number, look_up
from sheetcal.cells.registry import (
    CM_OR_BLANK,
    COLUMN,
    DEGC,
    G_OR_BLANK,
    J_OR_BLANK,
    J_PER_G,
    J_PER_G_K,
    J_PER_K,
    J_PER_ML,
    KJ,
    KPA,
    MG_PER_L_OR_BLANK,
    ML,
    ML_OR_BLANK,
    MPA,
    ONE,
    PERCENT,
    PERCENT_OR_BLANK,
    TEXT,
    TEXT_OR_BLANK,
    TEXTS,
    Constant,
    G,
    J,
    K,
    cell,
)

KG_PER_M3 = Annotated[float, "kg/m3"]
G_PER_CM3 = Annotated[float, "g/cm3"]
HEATS_PER_LENGTH = Annotated[Sequence[Any], "J/cm", COLUMN]
HEATS_PER_PIECE = Annotated[Sequence[Any], "J", COLUMN]
HEATS_PER_GRAM = Annotated[Sequence[Any], "J/g", COLUMN]
STRENGTHS = Annotated[Sequence[Any], "mol/L", COLUMN]
HEAT_CAPACITIES = Annotated[Sequence[Any], "J/K", COLUMN]

_CERT = "certificate conditions of benzoic acid (Washburn form); three of its terms confirmed"
PRESSURE_TERM = Constant(197e-6, "1/MPa", "certificate_pressure_term", _CERT, "memory")
MASS_TERM = Constant(0.042, "mL/g", "certificate_mass_term", f"{_CERT}; 42e-6 L/g", "memory")
WATER_TERM = Constant(0.030, "1", "certificate_water_term", f"{_CERT}; 30e-6 L/g, 1 g water taken as 1 mL", "memory")
TEMPERATURE_TERM = Constant(45e-6, "1/K", "certificate_temperature_term", _CERT, "memory")
PRESSURE_REFERENCE = Constant(3.04, "MPa", "certificate_pressure", _CERT, "memory")
MASS_REFERENCE = Constant(0.003, "g/mL", "certificate_mass_by_volume", _CERT, "memory")
WATER_REFERENCE = Constant(0.003, "1", "certificate_water_by_volume", _CERT, "memory")
TEMPERATURE_REFERENCE = Constant(25.0, "degC", "certificate_temperature", _CERT, "memory")
DENSITY_FACTOR = Constant(1000.0, "kg cm3/(g m3)", "density_factor", "unit conversion, exact")
NORMAL_ACID = Constant(0.1, "mol/L", "reference_acid_strength", "acid volumes are stated at this strength", "derived")
SULFURIC_AS_ACID = Constant(
    6.238,
    "mL/g",
    "acid_of_sulfur",
    "0.1 mol/L acid of 1 % sulfur as H2SO4: 2 x 10 mg/g / 32.06 g/mol",
    "derived",
)
CHLORINE_AS_ACID = Constant(
    2.821,
    "mL/g",
    "acid_of_chlorine",
    "0.1 mol/L acid of 1 % chlorine as HCl: 10 mg/g / 35.45 g/mol",
    "derived",
)
CARBONATE_VOLUME = Constant(
    20.0, "mL", "carbonate_volume", "ISO 1928 titration: 20.0 mL of 0.05 mol/L Na2CO3 added", "memory"
)
SULFURIC_PER_ML = Constant(15.1, "J/mL", "sulfuric_per_barium", "H2SO4 by 0.05 mol/L Ba(OH)2, GOST 21261-91")
OXYGEN_OF_AIR = Constant(0.2095, "1", "oxygen_of_air", "mole fraction in dry air")
M_NITRATE = Constant(62.004, "g/mol", "molar_mass_nitrate", "IUPAC conventional atomic weights", "derived")
M_SULFATE = Constant(96.056, "g/mol", "molar_mass_sulfate", "IUPAC conventional atomic weights", "derived")

_BALANCE = "energy balance of the vessel, as in ISO 1928 and GOST 147"
_LOT_TABLE = "table of lots of the lab file"


@cell(
    "NET_MASS",
    equation="m = net, or gross - tare",
    source="weighing",
    standing="derived",
    needs=("is_number(net) or is_number(gross) and is_number(tare)",),
)
def net_mass(net: G_OR_BLANK, gross: G_OR_BLANK, tare: G_OR_BLANK) -> G:
    """Mass weighed: the net reading where it is given, else the difference of two weighings."""
    return net if is_number(net) else gross - tare


@cell(
    "CERTIFICATE_FACTOR",
    equation="f = 1 + 1e-6 [197 (P - 3.04) + 42 (m/V - 3) + 30 (w/V - 3) - 45 (t - 25)], MPa, g/L, degC",
    source=_CERT,
    standing="memory",
    valid={
        "oxygen_pressure": (0.1, 10.0),
        "mass": (0.0, 20.0),
        "water": (0.0, 1000.0),
        "volume": (1.0, 5000.0),
        "temperature": (0.0, 60.0),
    },
)
def certificate_factor(oxygen_pressure: MPA, mass: G, water: ML, volume: ML, temperature: DEGC) -> ONE:
    """Certified value at the conditions of the run over that at certificate conditions.

    Outside 2 to 4 MPa, 2 to 4 g/L and 20 to 30 degC it is an extrapolation.
    """
    filling = PRESSURE_TERM * (oxygen_pressure - PRESSURE_REFERENCE)
    charge = MASS_TERM * (mass / volume - MASS_REFERENCE) + WATER_TERM * (water / volume - WATER_REFERENCE)
    return 1 + filling + charge - TEMPERATURE_TERM * (temperature - TEMPERATURE_REFERENCE)


@cell(
    "MASS_CONVENTION_FACTOR",
    equation="f = (1 - a/w) / (1 - a/d)",
    source="air buoyancy of the weights and of the substance",
    standing="derived",
    valid={"density": (0.1, 25.0), "air_density": (0.0, 2.0), "weight_density": (1.0, 25.0)},
)
def mass_convention_factor(density: G_PER_CM3, air_density: KG_PER_M3, weight_density: G_PER_CM3) -> ONE:
    """Value per gram weighed in air over value per gram in vacuum."""
    air = air_density / DENSITY_FACTOR
    return (1 - air / weight_density) / (1 - air / density)


@cell(
    "CERTIFIED_VALUE",
    equation="q = value x factor in air, where the certificate gives it in vacuum",
    source="mass convention of the certificate",
    standing="derived",
    choices={"convention": ("in vacuum", "in air")},
)
def certified_value(value: J_PER_G, convention: TEXT, factor_in_air: ONE) -> J_PER_G:
    """Certified value for a mass weighed in air."""
    return value * factor_in_air if convention == "in vacuum" else value


@cell(
    "WIRE_HEAT",
    equation="Q = h (start - left)",
    source=_LOT_TABLE,
    standing="derived",
    valid={"start": (0.0, 1000.0), "left": (0.0, 1000.0)},
    needs=(
        "is_blank(lot) or is_number(start) and is_number(left)",
        "is_blank(lot) or left <= start",
        "is_text(lot) or is_blank(start) and is_blank(left)",
        "is_blank(lot) or is_number(look_up(lot, lots, heats))",
    ),
)
def wire_heat(lot: TEXT_OR_BLANK, start: CM_OR_BLANK, left: CM_OR_BLANK, lots: TEXTS, heats: HEATS_PER_LENGTH) -> J:
    """Heat of the fuse wire that burned; 0 without a lot."""
    return 0 if is_blank(lot) else look_up(lot, lots, heats) * (start - left)


@cell(
    "THREAD_HEAT",
    equation="Q = heat of one piece, or mass x heat per gram",
    source=_LOT_TABLE,
    standing="derived",
    valid={"mass": (0.0, 10.0)},
    needs=(
        "is_text(lot) or is_blank(mass)",
        "is_blank(lot) or is_number(look_up(lot, lots, gram_heats) if is_number(mass)"
        " else look_up(lot, lots, piece_heats))",
    ),
)
def thread_heat(
    lot: TEXT_OR_BLANK,
    mass: G_OR_BLANK,
    lots: TEXTS,
    piece_heats: HEATS_PER_PIECE,
    gram_heats: HEATS_PER_GRAM,
) -> J:
    """Heat of the ignition thread; 0 without a lot, one piece of the lot without a mass."""
    by_mass = mass * look_up(lot, lots, gram_heats) if is_number(mass) else look_up(lot, lots, piece_heats)
    return 0 if is_blank(lot) else by_mass


@cell(
    "AID_HEAT",
    equation="Q = m q of the lot",
    source=_LOT_TABLE,
    standing="derived",
    valid={"mass": (0.0, 10.0)},
    needs=(
        "is_blank(lot) == is_blank(mass)",
        "is_blank(lot) or is_number(look_up(lot, lots, heats))",
    ),
)
def aid_heat(lot: TEXT_OR_BLANK, mass: G_OR_BLANK, lots: TEXTS, heats: HEATS_PER_GRAM) -> J:
    """Heat of a combustion aid or capsule; 0 where there is none."""
    return 0 if is_blank(lot) else mass * look_up(lot, lots, heats)


@cell(
    "IGNITION_HEAT",
    equation="Q = electrical energy",
    source=_BALANCE,
    standing="derived",
    valid={"energy": (0, 1000)},
)
def ignition_heat(energy: J_OR_BLANK) -> J:
    """Electrical energy of the ignition; a blank counts as none."""
    return energy if is_number(energy) else 0


@cell(
    "TITRE",
    equation="V = end - start",
    source="reading of the burette",
    standing="derived",
    needs=("end >= start",),
)
def titre(start: ML, end: ML) -> ML:
    """Volume delivered by a burette."""
    return end - start


@cell(
    "ACID_VOLUME",
    equation="V = (end - start) c / 0.1 mol/L",
    source="strength of the titrant lot",
    standing="derived",
    needs=(
        "is_number(start) and is_number(end)",
        "end >= start",
        "is_blank(lot) or is_number(look_up(lot, lots, strengths))",
    ),
)
def acid_volume(start: ML_OR_BLANK, end: ML_OR_BLANK, lot: TEXT_OR_BLANK, lots: TEXTS, strengths: STRENGTHS) -> ML:
    """Titre as a volume of 0.1 mol/L; without a lot the titrant is taken as just that."""
    return end - start if is_blank(lot) else (end - start) * look_up(lot, lots, strengths) / NORMAL_ACID


_ROUTES = ("total acid", "barium", "ions", "fixed", "none")
_WASHINGS = "acids of the washings; equivalents re-derived (37.4 and 16.9 J per g and % in the nitric heat)"


@cell(
    "NITRIC_HEAT",
    equation="total acid: 6.0 V - 37.4 m S - 16.9 m Cl; barium: 6.0 (20.0 - V1); ions: 6.0 x nitrate",
    source=_WASHINGS,
    standing="derived",
    valid={"acid_volume": (0.0, 500.0), "back_titre": (0.0, 100.0), "mass": (0.0, 20.0)},
    choices={"route": _ROUTES},
    needs=(
        "is_number(acid_volume) and is_number(sulfur) if route == 'total acid' else is_number(back_titre)"
        " if route == 'barium' else is_number(nitrate) and is_number(wash_volume) if route == 'ions'"
        " else route == 'none' or is_number(fixed)",
    ),
)
def nitric_heat(
    route: TEXT,
    acid_volume: ML_OR_BLANK,
    mass: G,
    sulfur: PERCENT_OR_BLANK,
    chlorine: PERCENT_OR_BLANK,
    back_titre: ML_OR_BLANK,
    nitrate: MG_PER_L_OR_BLANK,
    wash_volume: ML_OR_BLANK,
    fixed: J_OR_BLANK,
    heat_per_mL: J_PER_ML,
    sulfur_as_nitric: J_PER_G,
    chlorine_as_nitric: J_PER_G,
) -> J:
    """Heat of formation of nitric acid, by the route of the washings; a blank chlorine is 0."""
    halide = chlorine_as_nitric * mass * chlorine if is_number(chlorine) else 0
    by_acid = heat_per_mL * acid_volume - sulfur_as_nitric * mass * sulfur - halide
    by_titre = heat_per_mL * (CARBONATE_VOLUME - back_titre)
    by_ions = heat_per_mL * (nitrate * wash_volume / MG_PER_G / M_NITRATE / NORMAL_ACID)
    stated = 0 if route == "none" else fixed
    washed = by_titre if route == "barium" else by_ions if route == "ions" else stated
    return by_acid if route == "total acid" else washed


@cell(
    "SULFURIC_HEAT",
    equation="total acid: 94.1 m S; barium: 15.1 (V1 + V2 - 20.0); ions: sulfate as S, 94.1 J per g and %",
    source=_WASHINGS,
    standing="derived",
    valid={"barium_volume": (0.0, 100.0), "back_titre": (0.0, 100.0), "mass": (0.0, 20.0)},
    choices={"route": _ROUTES},
    needs=(
        "is_number(sulfur) if route == 'total acid' else is_number(barium_volume) and is_number(back_titre)"
        " if route == 'barium' else is_number(sulfate) and is_number(wash_volume) if route == 'ions'"
        " else route == 'none' or is_number(fixed)",
    ),
)
def sulfuric_heat(
    route: TEXT,
    mass: G,
    sulfur: PERCENT_OR_BLANK,
    barium_volume: ML_OR_BLANK,
    back_titre: ML_OR_BLANK,
    sulfate: MG_PER_L_OR_BLANK,
    wash_volume: ML_OR_BLANK,
    fixed: J_OR_BLANK,
    heat_per_gram_percent: J_PER_G,
) -> J:
    """Heat of formation of sulfuric acid from sulfur dioxide, by the route of the washings."""
    by_barium = SULFURIC_PER_ML * (back_titre + barium_volume - CARBONATE_VOLUME)
    grams = sulfate * wash_volume / ML_PER_L / MG_PER_G * M_S / M_SULFATE
    by_ions = heat_per_gram_percent * (100 * grams)
    stated = 0 if route == "none" else fixed
    washed = by_barium if route == "barium" else by_ions if route == "ions" else stated
    return heat_per_gram_percent * mass * sulfur if route == "total acid" else washed


@cell(
    "TOTAL_HEAT",
    equation="Q = eps theta",
    source=_BALANCE,
    standing="derived",
    valid={"heat_capacity": (0, 1e6)},
)
def total_heat(heat_capacity: J_PER_K, rise: K) -> J:
    """Heat released in the vessel."""
    return heat_capacity * rise


@cell(
    "HEAT_CAPACITY_WITH_WATER",
    equation="eps + (m - m0) c",
    source="calorimeter water weighed against the reference of the calibration",
    standing="derived",
    valid={"heat_capacity": (0.0, 1e6), "water": (0.0, 10000.0), "reference": (0.0, 10000.0)},
    needs=("is_number(reference) or is_blank(water)",),
)
def heat_capacity_with_water(
    heat_capacity: J_PER_K, water: G_OR_BLANK, reference: G_OR_BLANK, specific_heat: J_PER_G_K
) -> J_PER_K:
    """Effective heat capacity with the water of this run; as calibrated where no water is given."""
    return heat_capacity + (water - reference) * specific_heat if is_number(water) else heat_capacity


@cell(
    "HEAT_CAPACITY_OF_VESSEL",
    equation="eps of the vessel, exact look-up",
    source="calibrations of the lab file",
    standing="derived",
    needs=("is_number(look_up(vessel, vessels, values))",),
)
def heat_capacity_of_vessel(vessel: TEXT, vessels: TEXTS, values: HEAT_CAPACITIES) -> J_PER_K:
    """Effective heat capacity of the calorimeter with the vessel used."""
    return look_up(vessel, vessels, values)  # type: ignore[no-any-return]  # a cell's content


@cell(
    "EFFECTIVE_HEAT_CAPACITY",
    equation="eps = (m q + Q_fuse + Q_ign + Q_N) / theta",
    source=_BALANCE,
    needs=("rise > 0",),
)
def effective_heat_capacity(pellet_heat: J, fuse: J, thread: J, ignition: J, nitric: J, rise: K) -> J_PER_K:
    """Effective heat capacity from the firing of a certified substance."""
    return (pellet_heat + fuse + thread + ignition + nitric) / rise


@cell("PELLET_HEAT", equation="Q = m q f", source=_BALANCE, valid={"mass": (0.0, 20.0)})
def pellet_heat(mass: G, value: J_PER_G, factor: ONE) -> J:
    """Heat of the certified substance at the conditions of the run."""
    return mass * value * factor


@cell(
    "GROSS_VALUE",
    equation="q_V,gr = (Q - Q_fuse - Q_ign - Q_N - Q_S - Q_aid) / m",
    source=_BALANCE,
    valid={"mass": (0.01, 20.0)},
)
def gross_value(
    total_heat: J, wire: J, thread: J, ignition: J, nitric: J, sulfuric: J, aid1: J, aid2: J, mass: G
) -> J_PER_G:
    """Gross calorific value at constant volume, as analysed."""
    return (total_heat - wire - thread - ignition - nitric - sulfuric - aid1 - aid2) / mass


@cell(
    "CHARGE_ENERGY",
    equation="E = m q + Q_aid",
    source="first law",
    standing="derived",
    valid={"mass": (0.0, 100.0), "expected": (0.0, 2e5)},
)
def charge_energy(mass: G, expected: J_PER_G, aid_heat: J) -> KJ:
    """Energy that the charge will release."""
    return (mass * expected + aid_heat) / J_PER_KJ


@cell(
    "LARGEST_MASS",
    equation="m = (share x rated - Q_aid) / q, not above the first limit",
    source="rating of the vessel",
    standing="derived",
    valid={
        "rated": (0.1, 1000.0),
        "share": (0.01, 1.0),
        "expected": (100.0, 2e5),
        "first_limit": (0.0, 100.0),
    },
)
def largest_mass(rated: KJ, share: ONE, aid_heat: J, expected: J_PER_G, first_limit: G_OR_BLANK) -> G:
    """Largest mass that may be weighed for the vessel; never below 0."""
    by_rating = max(0, (share * rated * J_PER_KJ - aid_heat) / expected)
    return min(by_rating, first_limit) if is_number(first_limit) else by_rating


@cell("AID_SHARE", equation="100 Q_aid / Q", source="share of heat", standing="derived", needs=("total > 0",))
def aid_share(aid: J, total: J) -> PERCENT:
    """Share of the heat that the combustion aid gave."""
    return 100 * aid / total


@cell(
    "OXYGEN_RATIO",
    equation="(p + 0.2095 p_air) V / (R T) / [m (C/M_C + H/(4 M_H) + S/M_S - O/(2 M_O))]",
    source="O2 filled over O2 needed, ideal gas; combustion to CO2, H2O and SO2",
    standing="derived",
    valid={
        "pressure_gauge": (0.0, 10.0),
        "volume": (1.0, 5000.0),
        "mass": (0.001, 100.0),
        "carbon": (0.0, 100.0),
        "hydrogen": (0.0, 100.0),
        "sulfur": (0.0, 100.0),
        "oxygen": (0.0, 100.0),
        "station_pressure": (30.0, 120.0),
        "temperature": (0.0, 60.0),
    },
    needs=("carbon / M_C + hydrogen / (4 * M_H) + sulfur / M_S > oxygen / (2 * M_O)",),
)
def oxygen_ratio(
    pressure_gauge: MPA,
    volume: ML,
    mass: G,
    carbon: PERCENT,
    hydrogen: PERCENT,
    sulfur: PERCENT,
    oxygen: PERCENT,
    station_pressure: KPA,
    temperature: DEGC,
) -> ONE:
    """Oxygen filled over oxygen needed for complete combustion; the air left in the vessel is counted."""
    pressure = pressure_gauge + OXYGEN_OF_AIR * station_pressure / KPA_PER_MPA
    filled = pressure * volume / (R * (temperature - ABSOLUTE_ZERO))
    needed = mass / 100 * (carbon / M_C + hydrogen / (4 * M_H) + sulfur / M_S - oxygen / (2 * M_O))
    return filled / needed
