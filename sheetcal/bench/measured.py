"""True samples for an archive of fuel sheets, built around fuels that were really measured.

Composition and gross value come from a table of measured fuels with its source; what that table does not give
(chlorine, moistures) is invented, within what such fuels have, and every truth says so in its source.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass

from sheetcal.bench.draw import Dice, stepped
from sheetcal.bench.materials import Composition, Truth
from sheetcal.errors import BadInput

COLUMNS = ("id", "name", "fuel_class", "C", "H", "N", "S", "ash", "gross_dry", "source")

# Moistures (%) of received and of analysis sample, where the table gives none: within what a class has.
MOISTURES = {"coal": ((5.0, 13.0), (1.0, 4.0)), "coke": ((2.0, 8.0), (0.2, 1.2))}
USUAL_MOISTURES = ((8.5, 22.0), (4.0, 8.5))


@dataclass(frozen=True, slots=True)
class Lot:
    """The samples of one archived workbook, as they really are, and the seed its readings are drawn with."""

    truths: tuple[Truth, ...]
    seed: int

    def worklist(self) -> list[dict[str, str]]:
        """Rows of a worklist for `issue`, by the columns of the contract; analysis values come later."""
        return [_worklist_row(truth, number) for number, truth in enumerate(self.truths, start=1)]


def true_sample(row: Mapping[str, str], dice: Dice) -> Truth:
    """One measured fuel as a true sample. Raises BadInput for a row that lacks a number."""
    missing = [name for name in COLUMNS if not row.get(name)]
    if missing:
        raise BadInput(f"fuels, {row.get('id', 'row without id')}", f"has no {missing[0]}", ", ".join(COLUMNS))
    carbon, hydrogen, nitrogen, sulfur, ash, gross = (
        float(row[name]) for name in ("C", "H", "N", "S", "ash", "gross_dry")
    )
    chlorine = stepped(dice.uniform(0.005, 0.12), 0.001)
    composition = Composition(carbon, hydrogen, nitrogen, sulfur, chlorine, ash)
    total, analysed = MOISTURES.get(row["fuel_class"], USUAL_MOISTURES)
    return Truth(
        name=f"{row['id']} {row['name']}",
        fuel_class=row["fuel_class"],
        composition=composition,
        gross_dry=gross,
        total_moisture=stepped(dice.uniform(*total), 0.1),
        analysis_moisture=stepped(dice.uniform(*analysed), 0.01),
        description=row["name"],
        source=f"{row['source']}; chlorine and moistures invented",
    )


def archive(rows: Iterable[Mapping[str, str]], seed: int, sheets: int = 200, samples: int = 2) -> list[Lot]:
    """True samples for so many workbooks, each of one fuel class; fuels come again with other moistures.

    rows: the table of measured fuels, columns as in COLUMNS. Raises BadInput for a row that lacks one.
    """
    dice = Dice("archive", seed)
    by_class: dict[str, list[Mapping[str, str]]] = {}
    for row in rows:
        by_class.setdefault(row.get("fuel_class", ""), []).append(row)
    groups = [
        _group(listed, start, samples)
        for _, listed in sorted(by_class.items())
        for start in range(0, len(listed), samples)
    ]
    return [_lot(groups[number % len(groups)], dice.child(number), seed, number) for number in range(sheets)]


def _group(rows: Sequence[Mapping[str, str]], start: int, samples: int) -> list[Mapping[str, str]]:
    """The next fuels of a class, from its beginning again where they run out."""
    return [rows[(start + step) % len(rows)] for step in range(samples)]


def _lot(rows: Sequence[Mapping[str, str]], dice: Dice, seed: int, number: int) -> Lot:
    truths = tuple(true_sample(row, dice.child(place, row.get("id", ""))) for place, row in enumerate(rows))
    return Lot(truths, seed * 100_003 + number)


def _worklist_row(truth: Truth, number: int) -> dict[str, str]:
    expected = stepped(max(3000.0, truth.gross_analysed() * 1.04), 100)
    return {
        "sample_id": truth.name.split()[0] if number == 1 else f"{truth.name.split()[0]}-{number}",
        "client": "archive, invented",
        "description": truth.description,
        "fuel_class": truth.fuel_class,
        "runs": "2",
        "role": "sample",
        "expected_gross": f"{expected:.0f}",
        "basis": "ar",
        "remarks": truth.source,
    }
