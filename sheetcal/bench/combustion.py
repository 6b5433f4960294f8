"""What one firing sets free, from chemistry: heats of charge and acids, and what the wash then holds.

The gross value of a fuel counts nitrogen as N2, sulfur as SO2 and chlorine as HCl in water. Nitric acid and
the step from SO2 to sulfuric acid come on top; both end in the wash together with the hydrochloric acid.
"""

from __future__ import annotations

from dataclasses import dataclass

NITRIC_HEAT = 60_000.0  # J/mol HNO3(aq) from N2, O2, water: -59.7 to -60.1 kJ/mol by concentration
SULFURIC_HEAT = 301_500.0  # J/mol H2SO4(aq) from SO2, O2, water: 301 to 302 kJ/mol
SULFUR, CHLORINE = 32.06, 35.45  # g/mol, IUPAC abridged atomic weights
NITRATE, SULFATE = 62.004, 96.06  # g/mol
WATER_HEAT = 4.181  # J/(g K), liquid water between 23 and 26 degC, IAPWS
BENZOIC_IN_VACUUM = 26_436.0  # J/g under certificate conditions, invented lot
BENZOIC_DENSITY = 1.320  # g/cm3
AIR, WEIGHTS = 0.0012, 8.0  # g/cm3, conventional air and weights, OIML R 111-1


def buoyancy(density: float) -> float:
    """Mass in vacuum over mass as weighed in air: the body displaces more air than the weights do."""
    return (1.0 - AIR / WEIGHTS) / (1.0 - AIR / density)


@dataclass(frozen=True, slots=True)
class Acids:
    """Amounts of acid in the vessel after a firing, mol."""

    nitric: float
    sulfuric: float
    hydrochloric: float

    @property
    def heat(self) -> float:
        """J set free beyond the gross value: hydrochloric acid is part of that already."""
        return self.nitric * NITRIC_HEAT + self.sulfuric * SULFURIC_HEAT

    @property
    def equivalents(self) -> float:
        """mol of base that neutralises the wash."""
        return self.nitric + 2.0 * self.sulfuric + self.hydrochloric


def acids(mass: float, sulfur: float, chlorine: float, nitric_heat: float) -> Acids:
    """Acids from a mass (g) with sulfur and chlorine (mass-% as burnt), where nitric acid gave a heat (J)."""
    return Acids(
        nitric=nitric_heat / NITRIC_HEAT,
        sulfuric=mass * sulfur / 100.0 / SULFUR,
        hydrochloric=mass * chlorine / 100.0 / CHLORINE,
    )


@dataclass(frozen=True, slots=True)
class Charge:
    """One firing as it really is: heats in J by where they come from, acids in mol."""

    sample: float
    aids: float
    fuse: float
    ignition: float
    acids: Acids

    @property
    def heat(self) -> float:
        """All heat set free in the vessel, J."""
        return self.sample + self.aids + self.fuse + self.ignition + self.acids.heat

    def rise(self, heat_capacity: float, water_off: float = 0.0) -> float:
        """True rise in K of a calorimeter (J/K) with so many g of water more than its reference."""
        return self.heat / (heat_capacity + water_off * WATER_HEAT)


def titre(acid: Acids, strength: float) -> float:
    """mL of a base (mol/L) that the whole wash takes."""
    return acid.equivalents / strength * 1000.0


def barium_titration(acid: Acids) -> tuple[float, float]:
    """(mL barium hydroxide, mL hydrochloric acid back) of the ISO titration of the washings.

    0.05 mol/L Ba(OH)2 neutralises all acid; barium left with the nitrate and chloride then falls out as
    carbonate from 20.0 mL of 0.05 mol/L Na2CO3, and 0.1 mol/L HCl titrates what is left of that.
    """
    barium = acid.equivalents / 0.1 * 1000.0
    soluble = acid.nitric + acid.hydrochloric
    back = (20.0e-3 * 0.1 - soluble) / 0.1 * 1000.0
    return barium, back


def ions(acid: Acids, volume: float) -> tuple[float, float]:
    """(nitrate, sulfate) in mg/L of a wash made up to a volume in mL."""
    litres = volume / 1000.0
    return acid.nitric * NITRATE * 1000.0 / litres, acid.sulfuric * SULFATE * 1000.0 / litres
