"""Specific heats: water, ice and thirty-four substances whose sources can be compared; Cp less Cv of real gases.

Sources: specific_heat.csv (CRC Handbook, NIST-JANAF, Perry, Zabransky, IAPWS through the packages chemicals 1.5.2,
janaf 1.4.0, iapws 1.5.5 and CoolProp 8.0.0; handbooks for alloys and glass) and cp_minus_cv.csv (CoolProp 8.0.0).
Graded A: primary tables; B: a polynomial with stated bounds; C: no uncertainty stated; X: known to be wrong.
"""

from __future__ import annotations

from collections import defaultdict

import pytest
from outside import Check, Deviations, of, outside, percent, table, value

from sheetcal import profiles
from sheetcal.check.balance.water import specific_heat as balance_of_water
from sheetcal.kinds import load

ROWS = table("specific_heat.csv")
GASES = table("cp_minus_cv.csv")
SPECIFIC = "specific_heat.csv: CRC, NIST-JANAF, Perry, Zabransky, IAPWS"
GAS = "cp_minus_cv.csv: CoolProp 8.0.0"
MIXING = profiles.load("first-principles").coefficients


def rows(substance: str, start: str = "") -> list[dict[str, str]]:
    return [row for row in ROWS if row["substance"] == substance and row["source"].startswith(start)]


def name(row: dict[str, str]) -> str:
    return f"{row['substance']} {row['T_K']} K, {row['source']}"


def celsius(row: dict[str, str]) -> float:
    return float(row["T_K"]) - 273.15


@outside(SPECIFIC, 7, 0.04, "%")
def water() -> Deviations:
    """WATER_SPECIFIC_HEAT at 15, 20 and 25 degC against all sources"""
    for row in rows("water"):
        yield name(row), percent(value("WATER_SPECIFIC_HEAT", temperature=celsius(row)), float(row["cp_J_gK"]))


@outside(SPECIFIC, 3, 0.006, "%")
def water_by_iapws_95() -> Deviations:
    """WATER_SPECIFIC_HEAT at 15, 20 and 25 degC against IAPWS-95"""
    for row in rows("water", "IAPWS-95"):
        yield name(row), percent(value("WATER_SPECIFIC_HEAT", temperature=celsius(row)), float(row["cp_J_gK"]))


@outside(SPECIFIC, 3, 0.0015, "%")
def water_of_the_balance() -> Deviations:
    """Water of the checker at 15, 20 and 25 degC against IAPWS-95, half its last digit"""
    for row in rows("water", "IAPWS-95"):
        yield name(row), percent(balance_of_water(celsius(row)), float(row["cp_J_gK"]))


@outside(SPECIFIC, 1, 0.5, "%")
def ice() -> Deviations:
    """Specific heat of ice near -6 degC, the profile's, against IAPWS between 0 and -10 degC"""
    known = {round(celsius(row)): float(row["cp_J_gK"]) for row in rows("ice Ih")}
    at_six = known[0] + 0.6 * (known[-10] - known[0])
    yield "ice Ih -6 degC", percent(MIXING["ice_specific_heat"].in_unit("J/(g K)"), at_six)


@outside(SPECIFIC, 34, 2.0, "%")
def agreement_of_sources() -> Deviations:
    """Spread of graded-A sources of one substance: below the warning for a check body, 2 %"""
    listed: dict[tuple[str, str], list[float]] = defaultdict(list)
    for row in ROWS:
        if row["grade"] == "A":
            listed[row["substance"], row["T_K"]].append(float(row["cp_J_gK"]))
    for (substance, kelvin), found in listed.items():
        if len(found) > 1:
            yield f"{substance} {kelvin} K", percent(max(found), min(found))


@outside(SPECIFIC, 107, 1e-9, "%")
def recovered_by_mixing() -> Deviations:
    """SPECIFIC_HEAT_BY_MIXING after MIXING_TEMPERATURE, every graded-A and -B value of a body dropped at 80 degC"""
    for row in ROWS:
        if row["grade"] in "AB":
            yield name(row), percent(_by_mixing(float(row["cp_J_gK"])), float(row["cp_J_gK"]))


def _by_mixing(c: float) -> float:
    masses, temperatures = [150.0, 60.0], [22.0, 80.0]
    cold = {"water": masses[0], "water_specific_heat": 4.181, "vessel_heat_capacity": 0.0}
    final = value("MIXING_TEMPERATURE", masses=masses, specific_heats=[4.181, c], temperatures=temperatures)
    return value("SPECIFIC_HEAT_BY_MIXING", **cold, sample=masses[1], hot=80.0, start=22.0, final=final)


@outside(GAS, 18, 1e-4, "J/(mol K)")
def gases_off_by_the_listed_amount() -> Deviations:
    """Cp less CP_FROM_CV of the real gas, against the listed difference from R"""
    for row in GASES:
        off = float(row["Cp_J_mol_K"]) - value("CP_FROM_CV", cv=float(row["Cv_J_mol_K"]))
        yield f"{row['gas']} {row['T_K']} K", off - float(row["diff_minus_R_J_mol_K"])


@outside(GAS, 18, 1e-12, "J/(mol K)")
def ideal_gases_there_and_back() -> Deviations:
    """CP_FROM_CV of CV_FROM_CP, ideal heat capacities"""
    for row in GASES:
        ideal = float(row["Cp0_ideal_J_mol_K"])
        yield f"{row['gas']} {row['T_K']} K", value("CP_FROM_CV", cv=value("CV_FROM_CP", cp=ideal)) - ideal


@pytest.mark.parametrize("check", of(__name__), ids=lambda check: check.deviations.__name__)
def test_heat_capacities(check: Check) -> None:
    """Each within what its sources allow."""
    check.hold()


def test_all_rows_are_named() -> None:
    """126 specific heats, of which 107 are graded A or B and 3 are known to be wrong; 18 gases."""
    assert len(ROWS) == 126
    assert sum(row["grade"] in "AB" for row in ROWS) == 107
    assert [row["substance"] for row in ROWS if row["grade"] == "X"] == [
        "Stainless Steel 304", "aluminium bronze", "aluminium bronze",
    ]  # fmt: skip
    assert len(GASES) == 18


def test_the_sheet_takes_every_specific_heat_of_the_table() -> None:
    """No substance of the table is refused at entry as a body of a heat balance."""
    field = load("heat-balance").field("body.specific_heat")
    assert field.low is not None and field.high is not None
    assert all(field.low <= float(row["cp_J_gK"]) <= field.high for row in ROWS)


def test_real_gases_are_off_as_the_ideal_form_says() -> None:
    """Near 1 atm the ideal Cp - Cv = R is good to 0.6 % for air and its gases and off by 15 % for butane."""
    off = {row["gas"]: abs(float(row["diff_dev_pct"])) for row in GASES if row["T_K"] == "298.15"}
    assert all(off[gas] < 0.6 for gas in ("N2", "O2", "dry air (pseudo-pure)", "H2 (normal)", "He", "CO"))
    assert off["C4H10"] > 15
