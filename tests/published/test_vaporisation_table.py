"""Energy from enthalpy of vaporisation: measured volumes, second virial coefficient and ideal gas, against IAPWS-95.

Source: vaporisation.csv: IAPWS-95 and IF97 by the package iapws 1.5.5, Helmholtz equations by CoolProp 8.0.0. The two
evaluations of IAPWS-95 are one formulation, IF97 is a fit of its own.
"""

from __future__ import annotations

import pytest
from outside import Check, Deviations, of, outside, percent, table, value

SOURCE = "vaporisation.csv: IAPWS-95, IF97 (iapws 1.5.5), CoolProp 8.0.0"
MOST_PRESSURE = 1e7  # Pa; above it the cell functions decline
ROWS = table("vaporisation.csv")
USED = [row for row in ROWS if float(row["psat_Pa"]) <= MOST_PRESSURE]
WATER = [row for row in USED if row["fluid"] == "Water"]


def name(row: dict[str, str]) -> str:
    return f"{row['fluid']} {row['T_K']} K, {row['source']}"


def liquid(row: dict[str, str]) -> float:
    return 1000.0 * float(row["v_liquid_m3_kg"])  # cm3/g


def kilopascal(row: dict[str, str]) -> float:
    return float(row["psat_Pa"]) / 1000.0


def celsius(row: dict[str, str]) -> float:
    return float(row["T_K"]) - 273.15


def energy(row: dict[str, str], work: float) -> float:
    return value("VAPORISATION_ENERGY_FROM_ENTHALPY", enthalpy=float(row["dvapH_J_g"]), work=work)


def by_virial(row: dict[str, str]) -> float:
    """Energy of vaporisation with the second virial coefficient, J/g."""
    work = value(
        "VAPOUR_WORK_VIRIAL",
        pressure=kilopascal(row),
        boiling=celsius(row),
        molar_mass=float(row["M_g_mol"]),
        virial=float(row["B_cm3_mol"]),
        liquid_volume=liquid(row),
    )
    return energy(row, work)


@outside(SOURCE, 151, 0.001, "%")
def measured_volumes() -> Deviations:
    """dU from dH, VAPOUR_WORK_MEASURED, water to 580 K and six other fluids"""
    for row in USED:
        work = value(
            "VAPOUR_WORK_MEASURED",
            pressure=kilopascal(row),
            vapour_volume=1000.0 * float(row["v_vapour_m3_kg"]),
            liquid_volume=liquid(row),
        )
        yield name(row), percent(energy(row, work), float(row["dvapU_J_g"]))


@outside(SOURCE, 96, 0.01, "%")
def second_virial_to_373() -> Deviations:
    """dU from dH, VAPOUR_WORK_VIRIAL, water up to 373.15 K"""
    for row in WATER:
        if float(row["T_K"]) <= 373.15:
            yield name(row), percent(by_virial(row), float(row["dvapU_J_g"]))


@outside(SOURCE, 22, 0.05, "%")
def second_virial_to_423() -> Deviations:
    """dU from dH, VAPOUR_WORK_VIRIAL, water from 373.15 to 423.15 K"""
    for row in WATER:
        if 373.15 < float(row["T_K"]) <= 423.15:
            yield name(row), percent(by_virial(row), float(row["dvapU_J_g"]))


@outside(SOURCE, 151, 0.0002, "% of dU")
def second_virial_off_by_the_listed_amount() -> Deviations:
    """dU by VAPOUR_WORK_VIRIAL less dU, against the listed error of that form"""
    for row in USED:
        off = percent(by_virial(row), float(row["dvapU_J_g"]))
        yield name(row), off - float(row["virial_err_dvapU_pct"])


@outside(SOURCE, 151, 0.0002, "% of dU")
def ideal_off_by_the_listed_amount() -> Deviations:
    """dU by VAPOUR_WORK_IDEAL less dU, against the listed error of that form"""
    for row in USED:
        work = value("VAPOUR_WORK_IDEAL", boiling=celsius(row), molar_mass=float(row["M_g_mol"]))
        off = percent(energy(row, work), float(row["dvapU_J_g"]))
        yield name(row), off - float(row["idealgas_err_dvapU_pct"])


@outside(SOURCE, 47, 0.08, "K")
def boiling_of_water() -> Deviations:
    """SATURATION_TEMPERATURE_OF_WATER from the vapour pressure, 47 to 110 kPa"""
    for row in WATER:
        if 47.0 <= kilopascal(row) <= 110.0:
            yield name(row), value("SATURATION_TEMPERATURE_OF_WATER", pressure=kilopascal(row)) - celsius(row)


@pytest.mark.parametrize("check", of(__name__), ids=lambda check: check.deviations.__name__)
def test_vaporisation(check: Check) -> None:
    """Each form of the volume work is as good as it says, and off by what is listed where it is not."""
    check.hold()


def test_the_rows_left_out_are_those_above_ten_megapascal() -> None:
    """12 rows near the critical point lie beyond the range of the cell functions, which decline them."""
    left = [row for row in ROWS if row not in USED]
    assert len(ROWS) == 163 and len(left) == 12
    for row in left:
        with pytest.raises(Exception, match="outside"):
            by_virial(row)


def test_water_boils_with_an_error_of_an_eighth_per_cent_in_the_ideal_form() -> None:
    """At 1 atm the ideal form is off by 0.13 %, for ethanol by more: the sheet names the form it used."""
    at_boiling = [row for row in WATER if abs(float(row["T_K"]) - 373.124) < 0.01]
    assert len(at_boiling) == 3
    for row in at_boiling:
        assert float(row["idealgas_err_dvapU_pct"]) == pytest.approx(-0.133, abs=0.001)
