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
    OPTIONAL,
    SAME_AS_VALUE,
    SAME_AS_VALUES,
    TEXT,
    TEXTS,
    cell,
)

COLUMN_OF_ANY = Annotated[Sequence[Any], "any", COLUMN]
G_PER_CM3_OR_BLANK = Annotated[float, "g/cm3", OPTIONAL]
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
    "MASS_FACTOR",
    equation="f = (1 - air/weights)/(1 - air/density) in vacuum, 1 in air",
    source="Archimedes' law; weights of the conventional density, OIML R 111-1",
    standing="derived",
    choices={"convention": ("in vacuum", "in air")},
    needs=("weight_density > 0 and (convention == 'in air' or is_number(density))",),
)
def mass_factor(
    convention: TEXT, density: G_PER_CM3_OR_BLANK, air_density: KG_PER_M3, weight_density: KG_PER_M3
) -> ONE:
    """Value per gram weighed in air over the certificate's value: not 1 where it was certified in vacuum."""
    factor = (1 - air_density / weight_density) / (1 - air_density / (density * DENSITY_FACTOR))
    return factor if convention == "in vacuum" else 1


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
