"""What a certified heat is worth away from the conditions of its certificate."""

from __future__ import annotations

from sheetcal.check.balance.book import Book
from sheetcal.check.balance.measure import Measure

# Certificate point and slopes in ppm, as printed with certified benzoic acid (NIST SRM 39j; from memory).
PRESSURE, PRESSURE_SLOPE = 3.04, 197.0  # MPa absolute, per MPa
SAMPLE, SAMPLE_SLOPE = 3.0, 42.0  # g per litre of vessel
WATER, WATER_SLOPE = 3.0, 30.0  # g per litre of vessel
TEMPERATURE, TEMPERATURE_SLOPE = 25.0, -45.0  # degC
MILLION = 1e6
KILO = 1000.0


def condition_factor(book: Book, run: str, volume: float | None, mass: float) -> Measure | None:
    """Heat per gram at the conditions of this run over that of the certificate; 1 where it is not applied.

    volume: of the vessel, mL; mass: burnt, g. The combustion is referred to the jacket's temperature.
    """
    if book.constant("condition_factor", 1.0) == 0.0:
        return Measure(1.0)
    gauge, water = book.number(run + "oxygen_pressure"), book.number(run + "vessel_water")
    if gauge is None or water is None or not volume:
        return None
    outside = book.number("sheet.station_pressure")
    absolute = gauge + (book.constant("ambient_pressure", 0.1) if outside is None else outside / KILO)
    jacket = book.number(run + "jacket_temperature")
    at = TEMPERATURE if jacket is None else jacket
    litres = volume / KILO
    parts = (
        PRESSURE_SLOPE * (absolute - PRESSURE),
        SAMPLE_SLOPE * (mass / litres - SAMPLE),
        WATER_SLOPE * (water / litres - WATER),
        TEMPERATURE_SLOPE * (at - TEMPERATURE),
    )
    return Measure(1.0 + sum(parts) / MILLION)
