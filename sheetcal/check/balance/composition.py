"""Composition by bookkeeping of mass: what 100 g of a basis hold, dry matter, moisture and ash apart."""

from __future__ import annotations

from collections.abc import Mapping

from sheetcal.check.balance import atoms
from sheetcal.check.balance.book import Book, Road
from sheetcal.check.balance.measure import Measure

Dry = Mapping[str, Measure]

ELEMENTS = ("carbon", "nitrogen", "sulfur", "chlorine", "oxygen")
WHOLE = 100.0
WATER_PER_HYDROGEN = atoms.WATER / (2 * atoms.H)

# Heat per gram of each part in kJ, dry matter. Channiwala and Parikh, Fuel 81 (2002) 1051.
ESTIMATE = {
    "carbon": 34.91,
    "hydrogen": 117.83,
    "sulfur": 10.05,
    "oxygen": -10.34,
    "nitrogen": -1.51,
    "ash": -2.11,
}


def dry_elements(book: Book, road: Road, head: str, moisture: float | None) -> Dry:
    """Ash and elements in % of the dry matter, noted on the way; what is not known is left out.

    moisture: of the analysis sample, %.
    """
    dry: dict[str, Measure] = {}
    wet = {"as analysed": moisture, "as received": counted(book, head, "total_moisture"), "dry": 0.0}
    ash = _note(road, head, "ash", _from_basis(book, head, "ash", wet), dry)
    wet["dry ash-free"] = None if ash is None else ash.value
    for name in ELEMENTS:
        _note(road, head, name, _from_basis(book, head, name, wet), dry)
    _note(road, head, "hydrogen", _hydrogen(book, head, wet), dry)
    return dry


def _note(road: Road, head: str, name: str, own: Measure | None, dry: dict[str, Measure]) -> Measure | None:
    found = road.note(f"{head}{name}_dry", own)
    if found is not None:
        dry[name] = found
    return found


def _from_basis(
    book: Book, head: str, name: str, wet: Mapping[str, float | None], moisture_part: float = 0.0
) -> Measure | None:
    """% of dry matter of a value typed on its own basis.

    `moisture_part`: % of the basis that belongs to the moisture and not to the dry matter.
    """
    value, basis = counted(book, head, name), book.text(f"{head}{name}_basis")
    other = None if basis is None else wet.get(basis)
    if value is None or other is None or other >= WHOLE:
        return None
    if basis == "dry ash-free":
        return Measure(value * (WHOLE - other) / WHOLE)
    return Measure(WHOLE * (value - moisture_part) / (WHOLE - other), largest=WHOLE * value / (WHOLE - other))


def counted(book: Book, head: str, name: str) -> float | None:
    """The value typed; one marked `<` counts as a share of the limit it names."""
    value = book.number(head + name)
    if value is None or book.text(f"{head}{name}_mark") != "<":
        return value
    return value * book.constant("below_limit_share", 0.5)


def _hydrogen(book: Book, head: str, wet: Mapping[str, float | None]) -> Measure | None:
    """Hydrogen of the dry matter; where it was given in all, that of the moisture is taken off."""
    basis = book.text(head + "hydrogen_basis")
    moisture = wet.get(basis or "") or 0.0
    if book.text(head + "hydrogen_includes") != "total" or basis not in ("as analysed", "as received"):
        return _from_basis(book, head, "hydrogen", wet)
    in_moisture = moisture / WATER_PER_HYDROGEN
    found = _from_basis(book, head, "hydrogen", wet, in_moisture)
    if found is None:
        return None
    printed = moisture / book.constant("water_per_hydrogen", WATER_PER_HYDROGEN)
    return found._replace(tolerance=abs(printed - in_moisture) * WHOLE / (WHOLE - moisture))


def as_analysed(dry: Measure | None, moisture: float | None) -> Measure | None:
    """% of the analysis sample, which is dry matter and moisture."""
    return None if dry is None or moisture is None else dry.times((WHOLE - moisture) / WHOLE)


def estimate(dry: Dry) -> Measure | None:
    """Gross value of dry matter from its composition, J/g; None where a part is not known."""
    if any(name not in dry for name in ESTIMATE):
        return None
    terms = [10.0 * heat * dry[name].value for name, heat in ESTIMATE.items()]
    doubt = sum(10.0 * abs(heat) * dry[name].tolerance for name, heat in ESTIMATE.items())
    return Measure(sum(terms), doubt, max(terms))
