"""What a lot, a vessel or a certificate stands for: exact look-ups in the tables of the Constants tab.

Standard library only: this file also runs inside LibreOffice's Python.
"""

from typing import Annotated, Any, Sequence

from sheetcal.cells.combustion import DENSITY_FACTOR
from sheetcal.cells.primitives import look_up
from sheetcal.cells.registry import (
    ANY,
    COLUMN,
    ONE,
    SAME_AS_VALUE,
    SAME_AS_VALUES,
    TEXT,
    TEXTS,
    cell,
)

COLUMN_OF_ANY = Annotated[Sequence[Any], "any", COLUMN]
DENSITIES = Annotated[Sequence[Any], "g/cm3", COLUMN]
KG_PER_M3 = Annotated[float, "kg/m3"]

_TABLE = "the laboratory's own table, printed in this workbook"


@cell(
    "LOT_VALUE",
    equation="the value beside the lot's own name",
    source=_TABLE,
    standing="derived",
    needs=("is_number(look_up(lot, lots, values))",),
)
def lot_value(lot: TEXT, lots: TEXTS, values: COLUMN_OF_ANY) -> SAME_AS_VALUES:
    """Value of a lot, vessel or certificate, by its exact name."""
    return look_up(lot, lots, values)  # type: ignore[no-any-return]  # a cell's content


@cell(
    "LOT_TEXT",
    equation="the text beside the lot's own name",
    source=_TABLE,
    standing="derived",
    needs=("is_text(look_up(lot, lots, texts))",),
)
def lot_text(lot: TEXT, lots: TEXTS, texts: TEXTS) -> TEXT:
    """Text that belongs to a lot, vessel or certificate, by its exact name."""
    return look_up(lot, lots, texts)  # type: ignore[no-any-return]  # a cell's content


@cell(
    "LOT_MASS_FACTOR",
    equation="f = (1 - air/weights)/(1 - air/density) in vacuum, 1 in air",
    source="Archimedes' law; weights of the conventional density, OIML R 111-1",
    standing="derived",
    valid={"air_density": (0.5, 1.5), "weight_density": (7000.0, 9000.0)},
    needs=(
        "found(lot, lots)",
        "look_up(lot, lots, conventions) == 'in air' or"
        " (look_up(lot, lots, conventions) == 'in vacuum' and look_up(lot, lots, densities) > 0.1)",
    ),
)
def lot_mass_factor(
    lot: TEXT,
    lots: TEXTS,
    conventions: TEXTS,
    densities: DENSITIES,
    air_density: KG_PER_M3,
    weight_density: KG_PER_M3,
) -> ONE:
    """Value per gram weighed in air over the certificate's value: not 1 where it was certified in vacuum."""
    density = look_up(lot, lots, densities) * DENSITY_FACTOR
    factor = (1 - air_density / weight_density) / (1 - air_density / density)
    return factor if look_up(lot, lots, conventions) == "in vacuum" else 1


@cell(
    "SCALED_VALUE",
    equation="value x factor",
    source="definition of a factor",
    standing="derived",
    valid={"factor": (0.0, 1e6)},
)
def scaled_value(value: ANY, factor: ONE) -> SAME_AS_VALUE:
    """A value times a factor."""
    return value * factor
