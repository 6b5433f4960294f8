"""Which material a measured specific heat may belong to: said where the name on the sheet is none of them."""

from __future__ import annotations

from collections.abc import Mapping

from sheetcal.check.case import Case
from sheetcal.model import Value

MOST = 6
REFERENCE = 25.0  # degC of the book values
FITS = 0.05  # of the density
TABLE, RESULT = "material", "sheet.specific_heat"

Row = Mapping[str, Value]


def look(case: Case) -> None:
    """One note where no material within the uncertainty is the one named on the front page."""
    rows = case.parts.record.tables.get(TABLE, ())
    found, doubt = case.number(RESULT), case.number("sheet.expanded_uncertainty")
    temperature = case.number("sheet.sample_temperature")
    if found is None or doubt is None or temperature is None:
        return
    alike = [row for row in rows if _distance(row, found, temperature) <= doubt + _number(row, "width")]
    named = case.text("sheet.material").lower()
    if not alike or any(_name(row).lower() in named for row in alike):
        return
    density = case.number("sheet.density")
    alike.sort(key=lambda row: (not _fits(row, density), _distance(row, found, temperature)))
    message = f"at {temperature:.1f} degC: {_listed(alike)}; the material named is none of these"
    case.add(
        "candidates", RESULT, message, "note",
        found=found, expected=", ".join(_name(row) for row in alike[:MOST]),
    )  # fmt: skip


def _listed(alike: list[Row]) -> str:
    if len(alike) > MOST:
        return f"{len(alike)} materials have this specific heat within 2 u, too many to name"
    return (
        "; ".join(f"{row['title']}, {row['source']}" for row in alike)
        + (" has" if len(alike) == 1 else " have")
        + " this specific heat within 2 u"
    )


def _distance(row: Row, found: float, temperature: float) -> float:
    """How far the book value, carried to the temperature, is from the one found, J/(g K)."""
    return abs(_number(row, "specific_heat") + _number(row, "slope") * (temperature - REFERENCE) - found)


def _fits(row: Row, density: float | None) -> bool:
    return density is not None and abs(_number(row, "density") - density) <= FITS * density


def _name(row: Row) -> str:
    """The material's name without its grade."""
    return str(row.get("title", "")).partition(" (")[0]


def _number(row: Row, column: str) -> float:
    value = row.get(column)
    return float(value) if isinstance(value, int | float) else 0.0
