"""Materials of the bench: invented fuels with their true composition and gross value, and how they vary.

Every figure here is INVENTED for demonstration and tests; none is a measurement of a real fuel. Fuels built
around measured values come from `sheetcal.bench.measured`, with their source.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

from sheetcal.bench.draw import Dice

INVENTED = "invented"
WATER_PER_HYDROGEN = 18.015 / 2.016  # g of water per g of hydrogen in it, IUPAC atomic weights 2021
ELEMENTS = ("carbon", "hydrogen", "nitrogen", "sulfur", "chlorine")


@dataclass(frozen=True, slots=True)
class Composition:
    """True composition of the dry material, mass-%; oxygen is what is left."""

    carbon: float
    hydrogen: float
    nitrogen: float
    sulfur: float
    chlorine: float
    ash: float

    @property
    def oxygen(self) -> float:
        """Mass-% of oxygen: 100 less everything else."""
        others = self.carbon + self.hydrogen + self.nitrogen + self.sulfur + self.chlorine
        return 100.0 - self.ash - others


@dataclass(frozen=True, slots=True)
class Truth:
    """A sample as it really is; gross value (J/g, constant volume, water liquid) of the dry material.

    `scatter` is the standard deviation of the gross value from one portion to the next (J/g), None: by the
    method's r. `steady` truths are burnt as they are: no drying, no analysis bench (a certified material).
    """

    name: str
    fuel_class: str
    composition: Composition
    gross_dry: float
    total_moisture: float = 0.0
    analysis_moisture: float = 0.0
    description: str = ""
    source: str = INVENTED
    scatter: float | None = None
    steady: bool = False

    def gross_analysed(self, moisture: float | None = None) -> float:
        """Gross value of the material as it lies on the balance, J/g; the water in it gives nothing."""
        water = self.analysis_moisture if moisture is None else moisture
        return self.gross_dry * (100.0 - water) / 100.0


def _fuel(name: str, fuel_class: str, parts: tuple[float, ...], gross: float, total: float, analysed: float) -> Truth:
    return Truth(name, fuel_class, Composition(*parts), gross, total, analysed, description=name)


# name, class, (C, H, N, S, Cl, ash) dry %, gross dry J/g, total moisture %, moisture of the analysis sample %
MATERIALS: dict[str, Truth] = {
    one.name: one
    for one in (
        _fuel("hard coal, washed", "coal", (74.90, 4.70, 1.40, 0.71, 0.03, 10.40), 30_890, 10.9, 2.40),
        _fuel("gas coal", "coal", (77.60, 5.20, 1.60, 0.85, 0.04, 6.90), 32_180, 8.6, 1.70),
        _fuel("lignite, raw", "coal", (60.20, 4.60, 0.80, 0.92, 0.02, 10.80), 24_120, 41.0, 10.50),
        _fuel("foundry coke", "coke", (86.90, 0.90, 1.00, 0.60, 0.01, 9.70), 30_940, 4.1, 0.60),
        _fuel("petroleum coke, green", "coke", (88.40, 3.80, 1.50, 3.20, 0.01, 0.60), 35_290, 6.8, 0.40),
        _fuel("spruce pellets", "biomass", (50.60, 6.10, 0.11, 0.01, 0.01, 0.50), 20_510, 8.3, 7.40),
        _fuel("wheat straw", "biomass", (46.60, 5.80, 0.58, 0.09, 0.28, 6.10), 18_870, 12.2, 8.60),
        _fuel("olive kernels", "biomass", (51.50, 6.20, 0.30, 0.03, 0.03, 0.90), 21_160, 13.8, 7.20),
        _fuel("bark", "biomass", (52.30, 5.70, 0.45, 0.04, 0.02, 4.20), 20_890, 47.5, 8.10),
        _fuel("miscanthus", "biomass", (48.10, 5.60, 0.35, 0.06, 0.12, 3.10), 19_060, 14.9, 8.00),
        _fuel("recovered fuel, fluff", "recovered", (51.20, 7.00, 0.80, 0.22, 0.41, 14.80), 23_440, 21.0, 2.50),
        _fuel("recovered fuel, light", "recovered", (58.30, 8.10, 0.60, 0.15, 0.36, 11.20), 27_280, 16.2, 1.80),
        _fuel("sludge, dried", "sludge", (30.40, 4.30, 4.00, 0.90, 0.05, 40.60), 12_990, 76.5, 5.10),
        _fuel("heating oil", "liquid", (86.40, 13.30, 0.03, 0.09, 0.00, 0.00), 45_760, 0.0, 0.00),
        _fuel("rape oil", "liquid", (77.90, 11.80, 0.02, 0.01, 0.00, 0.01), 39_680, 0.1, 0.05),
        _fuel("oily rags", "waste", (62.10, 8.90, 0.30, 0.20, 0.20, 9.50), 30_450, 9.4, 2.10),
        _fuel("paint residue", "waste", (55.40, 6.60, 1.80, 0.30, 0.20, 16.50), 25_120, 17.3, 1.90),
        _fuel("process residue", "unknown", (62.50, 6.50, 3.90, 0.10, 0.05, 0.40), 26_900, 3.2, 3.00),
    )
}

# Materials that only a named honest case takes: each has a condition that surprises and is right.
RARE: dict[str, Truth] = {
    one.name: one
    for one in (
        _fuel("sludge, pressed wet", "sludge", (28.60, 4.10, 3.80, 0.90, 0.06, 43.10), 12_140, 86.5, 4.70),
        # Received dry, moist again in the laboratory: less water as received than at the balance.
        _fuel("pellets, moist again", "biomass", (50.80, 6.00, 0.12, 0.01, 0.01, 0.60), 20_480, 6.9, 7.70),
        _fuel("coke, bone dry", "coke", (88.00, 0.80, 0.90, 0.55, 0.01, 8.90), 31_330, 0.4, 0.15),
        # Limestone takes up 1 779 J/g when it gives off its carbon dioxide; the organic matter pays for half.
        replace(
            _fuel("carbonate cake", "waste", (3.00, 0.35, 0.05, 0.10, 0.03, 94.00), -762, 31.0, 1.20),
            scatter=4.0,
        ),
    )
}


def of_class(fuel_class: str) -> list[Truth]:
    """The invented fuels of a class, in their order; those of every class where it has none."""
    return [one for one in MATERIALS.values() if one.fuel_class == fuel_class] or list(MATERIALS.values())


def varied(truth: Truth, dice: Dice) -> Truth:
    """Another lot of the material: a little more or less ash, the organic part a little richer or poorer."""
    one = truth.composition
    ash = one.ash * dice.uniform(0.93, 1.07)
    share = (100.0 - ash) / (100.0 - one.ash)
    parts = {name: getattr(one, name) * share for name in ELEMENTS}
    return replace(
        truth,
        composition=Composition(**parts, ash=ash),
        gross_dry=truth.gross_dry * share * dice.normal(0.003, 1.0),
        total_moisture=truth.total_moisture * dice.uniform(0.97, 1.03),
        analysis_moisture=truth.analysis_moisture * dice.uniform(0.95, 1.05),
    )
