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
    "AID_DOUBT",
    equation="u = m x standard uncertainty of the lot's heat; 0 without an aid",
    source=_GUM,
    standing="derived",
    needs=("is_blank(lot) or is_number(mass) and is_number(look_up(lot, lots, doubts))",),
)
def aid_doubt(lot: TEXT_OR_BLANK, mass: G_OR_BLANK, lots: TEXTS, doubts: DOUBTS_PER_GRAM) -> J:
    """Standard uncertainty of the heat of an aid; blank where its lot states none."""
    return 0 if is_blank(lot) else mass * look_up(lot, lots, doubts)


@cell(
    "AID_UNCERTAINTY",
    equation="u = sqrt(u_1^2 + u_2^2)/m",
    source=_GUM,
    standing="derived",
    valid={"mass": (0.001, 100.0)},
)
def aid_uncertainty(first: J, second: J, mass: G) -> J_PER_G:
    """Standard uncertainty that the heats of the aids' lots give the gross value."""
    return sqrt(first**2 + second**2) / mass


_INCLUDED = ("nothing", "wire", "wire and acids", "wire and acids and aids")


@cell(
    "TAKEN_OFF",
    equation="wire + thread + ignition + acids + aids, as far as the instrument has taken them off",
    source="what the run says of its instrument",
    standing="derived",
    choices={"includes": _INCLUDED},
)
def taken_off(includes: TEXT, wire: J, thread: J, ignition: J, nitric: J, sulfuric: J, aids: J) -> J:
    """Heat that an instrument has taken off before it shows a gross value; blank until all are known."""
    fuse = 0 if includes == "nothing" else wire + thread + ignition
    acids = 0 if includes == "nothing" or includes == "wire" else nitric + sulfuric
    return fuse + acids + (aids if includes == "wire and acids and aids" else 0)


@cell(
    "RISE_FROM_VALUE",
    equation="theta = (m q + what the instrument took off already)/C, C and q as it shows them",
    source="the instrument's own equation, solved for its rise",
    standing="derived",
    valid={"heat_capacity": (100.0, 1e6), "mass": (0.001, 100.0)},
    choices={"source": ("value only",)},
)
def rise_from_value(source: TEXT, value: J_PER_G, heat_capacity: J_PER_K, mass: G, taken: J) -> K:
    """Rise behind an instrument's gross value, so that acids, aids and basis are computed here."""
    return (value * mass + taken) / heat_capacity
