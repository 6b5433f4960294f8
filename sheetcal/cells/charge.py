"""The charge before and after firing: target mass, energy of wire and thread, doubt of the aids, an instrument's value.

Standard library only: this file also runs inside LibreOffice's Python.
"""

from typing import Annotated, Any, Sequence

from sheetcal.cells.combustion import HEATS_PER_LENGTH
from sheetcal.cells.primitives import is_blank, is_number, look_up, sqrt
from sheetcal.cells.registry import (
    CM_OR_BLANK,
    COLUMN,
    G_OR_BLANK,
    J_OR_BLANK,
    J_PER_G,
    J_PER_K,
    TEXT,
    TEXT_OR_BLANK,
    TEXTS,
    G,
    J,
    K,
    cell,
)

DOUBTS_PER_GRAM = Annotated[Sequence[Any], "J/g", COLUMN]

_GUM = "propagation of independent parts, JCGM 100"


@cell(
    "TARGET_MASS",
    equation="mass usual for the class, not above the largest mass",
    source="the class in the lab file, rating of the vessel",
    standing="derived",
)
def target_mass(usual: G, largest: G) -> G:
    """Mass to weigh in for a sample."""
    return min(usual, largest)


@cell(
    "FUSE_ENERGY",
    equation="Q = h x whole length + thread + ignition; what is not known adds nothing",
    source="before firing nobody knows what will be left of the wire: all of it counts",
    standing="derived",
)
def fuse_energy(
    lot: TEXT_OR_BLANK,
    length: CM_OR_BLANK,
    thread: J_OR_BLANK,
    ignition: J_OR_BLANK,
    lots: TEXTS,
    heats: HEATS_PER_LENGTH,
) -> J:
    """Energy that wire, thread and ignition can give at most."""
    known = not is_blank(lot) and is_number(length) and is_number(look_up(lot, lots, heats))
    others = (thread if is_number(thread) else 0) + (ignition if is_number(ignition) else 0)
    return others + (length * look_up(lot, lots, heats) if known else 0)


@cell(
    "AID_UNCERTAINTY",
    equation="u = sqrt((m_1 u_1)^2 + (m_2 u_2)^2)/m, u_1 and u_2 of the lots' heats",
    source=_GUM,
    standing="derived",
    valid={"mass": (0.001, 100.0)},
    needs=(
        "is_blank(lot1) or is_number(mass1) and is_number(look_up(lot1, lots, doubts))",
        "is_blank(lot2) or is_number(mass2) and is_number(look_up(lot2, lots, doubts))",
    ),
)
def aid_uncertainty(
    lot1: TEXT_OR_BLANK,
    mass1: G_OR_BLANK,
    lot2: TEXT_OR_BLANK,
    mass2: G_OR_BLANK,
    mass: G,
    lots: TEXTS,
    doubts: DOUBTS_PER_GRAM,
) -> J_PER_G:
    """Standard uncertainty that the heats of the aids' lots give the gross value; blank where a lot states none."""
    first = 0 if is_blank(lot1) else mass1 * look_up(lot1, lots, doubts)
    second = 0 if is_blank(lot2) else mass2 * look_up(lot2, lots, doubts)
    return sqrt(first**2 + second**2) / mass


_INCLUDED = ("nothing", "wire", "wire and acids", "wire, acids and aids")


@cell(
    "RISE_FROM_VALUE",
    equation="theta = (m q + what the instrument took off already)/C, C and q as it shows them",
    source="the instrument's own equation, solved for its rise",
    standing="derived",
    valid={"heat_capacity": (100.0, 1e6), "mass": (0.001, 100.0)},
    choices={"source": ("value only",), "includes": _INCLUDED},
    needs=(
        'includes == "nothing" or is_number(wire) and is_number(thread) and is_number(ignition)',
        'includes == "nothing" or includes == "wire" or is_number(nitric) and is_number(sulfuric)',
        'includes != "wire, acids and aids" or is_number(aids)',
    ),
)
def rise_from_value(
    source: TEXT,
    value: J_PER_G,
    heat_capacity: J_PER_K,
    mass: G,
    includes: TEXT,
    wire: J_OR_BLANK,
    thread: J_OR_BLANK,
    ignition: J_OR_BLANK,
    nitric: J_OR_BLANK,
    sulfuric: J_OR_BLANK,
    aids: J_OR_BLANK,
) -> K:
    """Rise behind an instrument's gross value, so that acids, aids and basis are computed here."""
    fuse = 0 if includes == "nothing" else wire + thread + ignition
    acids = 0 if includes == "nothing" or includes == "wire" else nitric + sulfuric
    along = aids if includes == "wire, acids and aids" else 0
    return (value * mass + fuse + acids + along) / heat_capacity
