"""Every slip that moves a reported result by 0.15 % of its largest term is found by some balance."""

from __future__ import annotations

import balance_case
import sensitivity
from balance_case import Case

AIM = 0.15  # % of the largest term


def fuel_terms(case: Case) -> dict[str, tuple[str, float]]:
    """Reported results, the unrounded ones behind them, and the total heat per gram on their basis."""
    heat, mass = case.results["run1.total_heat"], case.results["run1.mass"]
    assert isinstance(heat, float) and isinstance(mass, float)
    dry = heat / mass / (1 - 0.025)
    received = dry * (1 - 0.124)
    return {
        "sample1.gross_dry_reported": ("sample1.gross_dry", dry),
        "sample1.gross_as_received_reported": ("sample1.gross_as_received", received),
        "sample1.net_p_as_received_reported": ("sample1.net_p_as_received", received),
        "sample1.net_v_as_received": ("sample1.net_v_as_received", received),
        "sample1.gross_analysed": ("sample1.gross_analysed", heat / mass),
    }


def test_fuel() -> None:
    """Fuel: each reading, constant and formula behind five results, either sign."""
    case = balance_case.fuel(spare=0)
    lines = sensitivity.table(case, fuel_terms(case))
    print("\n" + sensitivity.printed(lines))
    assert len(lines) == 5
    assert max(one.worst for one in lines) <= AIM
