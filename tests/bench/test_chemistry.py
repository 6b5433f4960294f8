"""The bench's chemistry and water: acids, buoyancy, washes, saturation line, mixing, boiling, bodies."""

from __future__ import annotations

import pytest

from sheetcal.bench import Dice, combustion, equilibrium, mixing, steam
from sheetcal.bench.combustion import Acids, Charge


def test_heats_and_titres_of_the_acids() -> None:
    """6.0 J per mL of 0.1 mol/L nitric acid (GOST 147), 94.1 J per g and % S, 2.82 mL per g and % Cl."""
    assert Acids(1e-4, 0.0, 0.0).heat == pytest.approx(6.0)
    assert combustion.acids(1.0, 1.0, 0.0, 0.0).heat == pytest.approx(94.1, rel=0.001)
    assert combustion.titre(combustion.acids(1.0, 0.0, 1.0, 0.0), 0.1) == pytest.approx(2.82, rel=0.001)


def test_the_barium_titration_tells_the_two_acids_apart() -> None:
    """ISO form: nitric acid is 6.0 (20.0 - V1), sulfuric acid 15.1 (V1 + V2 - 20.0) J."""
    acid = combustion.acids(1.0, 0.8, 0.0, 45.0)
    barium, back = combustion.barium_titration(acid)
    assert 6.0 * (20.0 - back) == pytest.approx(45.0, rel=1e-9)
    assert 15.1 * (back + barium - 20.0) == pytest.approx(acid.heat - 45.0, rel=0.003)


def test_ions_of_a_wash() -> None:
    """1 mmol of nitric acid in 100 mL is 620 mg/L of nitrate; 1 mmol of sulfuric acid 961 mg/L of sulfate."""
    nitrate, sulfate = combustion.ions(Acids(1e-3, 1e-3, 0.0), 100.0)
    assert (nitrate, sulfate) == (pytest.approx(620.04), pytest.approx(960.6))


def test_buoyancy_of_benzoic_acid() -> None:
    """1.000760 with weights of 8.0 g/cm3 at 1.2 kg/m3: 26 434 J/g in vacuum reads 26 454 in air."""
    assert combustion.buoyancy(1.320) == pytest.approx(1.000760, abs=1e-6)
    assert 26_434 * combustion.buoyancy(1.320) == pytest.approx(26_454, abs=0.5)


def test_a_rise_is_heat_over_heat_capacity() -> None:
    """26.4 kJ and the small heats in 10 000 J/K; 10 g more water lowers the rise by 0.42 %."""
    charge = Charge(26_400.0, 0.0, 60.0, 0.0, Acids(0.0, 0.0, 0.0))
    assert charge.rise(10_000.0) == pytest.approx(2.646)
    assert charge.rise(10_000.0, 10.0) / charge.rise(10_000.0) == pytest.approx(1 - 41.81 / 10_041.81)


def test_water_boils_on_the_published_line() -> None:
    """99.974 degC at 101.325 kPa, 99.606 at 100 kPa, 80 at 47.41 kPa (IAPWS-95)."""
    line = {101.325: 99.974, 100.0: 99.606, 47.41: 80.0}
    for pressure, celsius in line.items():
        assert steam.boiling_point(pressure) == pytest.approx(celsius, abs=0.01)
    assert steam.vaporisation(99.974) == pytest.approx(2256.5, abs=0.2)
    assert steam.vaporisation(90.0) == pytest.approx(2282.5, abs=0.2)


def test_warming_water_takes_its_heat_content() -> None:
    """0 to 100 degC takes 419.1 J/g at 0.1 MPa (steam tables), 20 to 30 degC 41.82."""
    assert steam.heat_content(0.0, 100.0) == pytest.approx(419.1, abs=0.2)
    assert steam.heat_content(20.0, 30.0) == pytest.approx(41.82, abs=0.01)
    assert steam.heat_content(30.0, 20.0) == pytest.approx(-41.82, abs=0.01)


def test_a_dropped_piece_gives_its_specific_heat_back() -> None:
    """Mixing by heat contents, read back with mean specific heats: every invented metal within 0.05 %."""
    assert len(mixing.METALS) == 4
    for metal in mixing.METALS:
        end = mixing.end_temperature(150.0, 61.5, 20.0, metal, 98.9)
        gained = (150.0 * steam.heat_capacity((20.0 + end) / 2) + 61.5) * (end - 20.0)
        found = gained / (metal.mass * (98.9 - end))
        assert found == pytest.approx(metal.heat(end, 98.9) / (98.9 - end), rel=5e-4)


def test_bodies_end_where_all_heats_cancel() -> None:
    """Water and hot iron of the demo week's example: 850 g at 24.60, 412 g at 184.0 and so on end at 26.55."""
    parts = [
        equilibrium.Part("water", 850.0, 4.1824, 24.60),
        equilibrium.Part("copper cup", 310.0, 0.3846, 24.60),
        equilibrium.Part("iron plate", 412.0, 0.4495, 184.0),
        equilibrium.Part("ice", 60.0, 2.06, -6.0, after=4.1824),
    ]
    assert equilibrium.end_temperature(parts, 5400.0) == pytest.approx(26.55, abs=0.01)
    assert len(equilibrium.parts_of(8, Dice("bodies"))) == 8
