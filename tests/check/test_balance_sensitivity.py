"""Every slip that moves a reported result by 0.15 % of its largest term is found by some balance."""

from __future__ import annotations

from collections.abc import Callable

import balance_case
import pytest
import sensitivity
from balance_case import Case

AIM = 0.15  # % of the largest term


def number(case: Case, one: str) -> float:
    value = case.results[one]
    assert isinstance(value, int | float), one
    return float(value)


def fuel(case: Case) -> dict[str, tuple[str, float]]:
    """Reported results, the unrounded ones behind them, and the total heat per gram on their basis."""
    analysed = number(case, "run1.total_heat") / number(case, "run1.mass")
    dry = analysed / (1 - 0.025)
    received = dry * (1 - 0.124)
    return {
        "sample1.gross_dry_reported": ("sample1.gross_dry", dry),
        "sample1.gross_as_received_reported": ("sample1.gross_as_received", received),
        "sample1.net_p_as_received_reported": ("sample1.net_p_as_received", received),
        "sample1.net_v_as_received": ("sample1.net_v_as_received", received),
        "sample1.gross_analysed": ("sample1.gross_analysed", analysed),
    }


def calibration(case: Case) -> dict[str, tuple[str, float]]:
    mean = number(case, "sheet.effective_heat_capacity")
    return {"sheet.effective_heat_capacity_reported": ("sheet.effective_heat_capacity", mean)}


def mixing(case: Case) -> dict[str, tuple[str, float]]:
    return {"sheet.specific_heat_reported": ("sheet.specific_heat", number(case, "sheet.specific_heat"))}


def boil_off(case: Case) -> dict[str, tuple[str, float]]:
    """The enthalpy is the largest term of its energy too."""
    enthalpy = number(case, "sheet.enthalpy")
    return {
        "sheet.enthalpy_reported": ("sheet.enthalpy", enthalpy),
        "sheet.energy_reported": ("sheet.energy", enthalpy),
    }


def bodies(case: Case) -> dict[str, tuple[str, float]]:
    """Nothing is rounded for a report here; the closure stands on the heat exchanged, the unknown on its heat."""
    return {
        "sheet.closure": ("sheet.closure", 100.0),
        "sheet.heat_gained": ("sheet.heat_gained", abs(number(case, "body3.gained"))),
    }


Terms = Callable[[Case], dict[str, tuple[str, float]]]

CASES: dict[str, tuple[Callable[[], Case], Terms, int, float]] = {
    "fuel, 30 s records": (lambda: balance_case.fuel(spare=0), fuel, 5, AIM),
    "fuel, ASTM D5865": (lambda: balance_case.fuel(spare=0, profile="astm-d5865"), fuel, 5, AIM),
    "fuel, 60 s read by hand to 1 mK": (lambda: balance_case.fuel(spare=0, logger=balance_case.BY_HAND), fuel, 5, AIM),
    "calibration": (balance_case.calibration, calibration, 1, AIM),
    "specific-heat": (balance_case.mixing, mixing, 1, AIM),
    "vaporisation": (balance_case.boil_off, boil_off, 2, AIM),
    "heat-balance": (balance_case.bodies, bodies, 2, AIM),
}


@pytest.mark.parametrize("name", CASES)
def test_smallest_change_found(name: str) -> None:
    """Each reading, constant and formula behind a kind's results, either sign; the table is printed."""
    make, terms, count, aim = CASES[name]
    case = make()
    assert balance_case.disagreeing(case) == []
    lines = sensitivity.table(case, terms(case))
    print(f"\n{name}\n" + sensitivity.printed(lines))
    assert len(lines) == count
    assert max(one.worst for one in lines) <= aim
