"""Which material of a table a measured specific heat may belong to.

The key of a material is 1000 less its place in the table, and 1000 more where its density fits: the largest
keys come first, and 0 is none. Standard library only: this file also runs inside LibreOffice's Python.
"""

from typing import Annotated, Any, Sequence

from sheetcal.cells.primitives import at, count_alike, floor, is_number, next_alike
from sheetcal.cells.registry import (
    COLUMN,
    DEGC,
    J_PER_G_K,
    ONE,
    ONE_OR_BLANK,
    TEXT,
    TEXT_OR_BLANK,
    TEXTS,
    cell,
)

BOOK_VALUES = Annotated[Sequence[Any], "J/(g K)", COLUMN]
BOOK_SLOPES = Annotated[Sequence[Any], "J/(g K**2)", COLUMN]
BOOK_DENSITIES = Annotated[Sequence[Any], "g/cm3", COLUMN]
PLACES = Annotated[Sequence[Any], "1", COLUMN]
G_PER_CM3 = Annotated[float, "g/cm3"]

_BOOK = "table of materials: book value at 25 degC, its slope with temperature, half its width"
_ALIKE = "|c_25 + b (T - 25 degC) - c| <= U + width"


@cell("CANDIDATES_FOUND", equation=f"number of materials with {_ALIKE}", source=_BOOK, standing="derived")
def candidates_found(
    values: BOOK_VALUES,
    slopes: BOOK_SLOPES,
    widths: BOOK_VALUES,
    found: J_PER_G_K,
    doubt: J_PER_G_K,
    temperature: DEGC,
    book_temperature: DEGC,
) -> ONE:
    """How many materials of the table have this specific heat within its expanded uncertainty."""
    return count_alike(values, slopes, temperature - book_temperature, found, widths, doubt)


@cell(
    "CANDIDATE_KEY",
    equation=f"largest key below the one before with {_ALIKE}; key = 1000 - place, + 1000 where the density fits",
    source=_BOOK,
    standing="derived",
    valid={"share": (0.0, 1.0)},
)
def candidate_key(
    places: PLACES,
    values: BOOK_VALUES,
    slopes: BOOK_SLOPES,
    widths: BOOK_VALUES,
    densities: BOOK_DENSITIES,
    found: J_PER_G_K,
    doubt: J_PER_G_K,
    temperature: DEGC,
    book_temperature: DEGC,
    density: G_PER_CM3,
    share: ONE,
    before: ONE_OR_BLANK,
) -> ONE:
    """Key of the next material with this specific heat, density matches first; 0 when there is none."""
    shift = temperature - book_temperature
    below = before if is_number(before) else 1000000
    return next_alike(places, values, slopes, shift, found, widths, doubt, densities, density, share, below)


@cell(
    "CANDIDATE_NAME",
    equation="name at the place that the key tells",
    source=_BOOK,
    standing="derived",
    valid={"key": (1.0, 1999.0), "found": (1.0, 6.0)},
    needs=("filled(names) >= 1000 * (1 + floor(key / 1000)) - key",),
)
def candidate_name(key: ONE, found: ONE, names: TEXTS) -> TEXT:
    """Name of the material of a key; blank for the key of none, and where there are too many to name."""
    return at(names, 1000 * (1 + floor(key / 1000)) - key)  # type: ignore[return-value]  # a column of texts


@cell(
    "CANDIDATE_WORDS",
    equation="how many materials were found: none, a number, or too many to name",
    source=_BOOK,
    standing="derived",
)
def candidate_words(found: ONE, first: TEXT_OR_BLANK) -> TEXT:
    """What the candidates come to."""
    some = "too many to name" if found > 6 else "see the names below"
    return "none of the table" if found == 0 else first if found == 1 else some
