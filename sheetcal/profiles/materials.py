"""Specific heats of solids that a measured one may belong to, each figure with its source and standing."""

from __future__ import annotations

import csv
from dataclasses import dataclass
from functools import cache
from importlib import resources


@dataclass(frozen=True, slots=True)
class Material:
    """One solid: specific heat at 25 degC in J/(g K), its change per kelvin, half-width of the book value, g/cm3.

    grade: A critically evaluated, C a handbook value without a stated uncertainty.
    """

    name: str
    specific_heat: float
    slope: float
    width: float
    density: float
    grade: str
    source: str
    slope_source: str


@cache
def materials() -> tuple[Material, ...]:
    """Every material of materials.csv, in its order; the width there is in % of the value."""
    text = (resources.files("sheetcal.profiles") / "materials.csv").read_text("utf-8")
    rows = csv.DictReader(line for line in text.splitlines() if not line.startswith("#"))
    return tuple(
        Material(
            name=row["name"],
            specific_heat=float(row["specific_heat"]),
            slope=float(row["slope"]),
            width=float(row["specific_heat"]) * float(row["width"]) / 100.0,
            density=float(row["density"]),
            grade=row["grade"],
            source=row["source"] if row["standing"] == "published" else f"{row['source']} [memory]",
            slope_source=f"{row['slope_source']} [{row['slope_standing']}]",
        )
        for row in rows
    )
