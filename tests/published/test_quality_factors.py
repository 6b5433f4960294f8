"""Critical ranges, Grubbs' limits and Student's t as printed and as their distributions give them.

Sources: quality_factors.csv (computed from the distributions), scipy.stats, and the printed tables of ISO 5725-2 and
ISO 5725-6 as laboratories quote them (from memory, so a unit of the last printed digit is allowed).
"""

from __future__ import annotations

import pytest
from outside import Check, Deviations, of, outside, table, value
from scipy import stats

ROWS = table("quality_factors.csv")
FILE = "quality_factors.csv, from the distributions"
PRINTED_F = {2: 2.8, 3: 3.3, 4: 3.6, 5: 3.9, 6: 4.0, 7: 4.2, 8: 4.3, 9: 4.4, 10: 4.5, 12: 4.6, 15: 4.8, 20: 5.0}
PRINTED_G = {4: 1.481, 5: 1.715, 6: 1.887, 7: 2.020, 8: 2.126, 9: 2.215, 10: 2.290, 12: 2.412, 15: 2.549, 20: 2.709}


def listed(name: str, column: str) -> dict[int, float]:
    return {int(row["n_or_p"]): float(row["value"]) for row in ROWS if (row["table"], row["name"]) == (name, column)}


def factor(n: int) -> float:
    return value("CRITICAL_RANGE", limit=2.8, n=n)


@outside(FILE, 19, 0.0501, "")
def critical_ranges() -> Deviations:
    """f(n) of CRITICAL_RANGE for n 2 to 20, half the printed decimal"""
    for n, exact in listed("critical_range_f", "f95").items():
        if n <= 20:
            yield f"n {n}", factor(n) - exact


@outside("ISO 5725-6 as printed (memory)", 12, 1e-9, "")
def critical_ranges_as_printed() -> Deviations:
    """f(n) of CRITICAL_RANGE"""
    for n, printed in PRINTED_F.items():
        yield f"n {n}", factor(n) - printed


@outside("scipy.stats.studentized_range", 6, 0.0501, "")
def critical_ranges_by_scipy() -> Deviations:
    """f(n) of CRITICAL_RANGE at 95 % and infinite degrees of freedom"""
    for n in (2, 3, 4, 8, 13, 20):
        yield f"n {n}", factor(n) - float(stats.studentized_range.ppf(0.95, n, 1e6))


@outside(FILE, 17, 0.0005001, "")
def grubbs() -> Deviations:
    """GRUBBS_LIMIT for n 4 to 20, half its last digit"""
    for n, exact in listed("grubbs_single_two_sided", "alpha0.05").items():
        if 4 <= n <= 20:
            yield f"n {n}", value("GRUBBS_LIMIT", n=n) - exact


@outside("scipy.stats.t", 17, 0.0005001, "")
def grubbs_by_scipy() -> Deviations:
    """GRUBBS_LIMIT for n 4 to 20, from Student's t"""
    for n in range(4, 21):
        t = stats.t.isf(0.05 / (2 * n), n - 2)
        yield f"n {n}", value("GRUBBS_LIMIT", n=n) - float((n - 1) / n**0.5 * (t * t / (n - 2 + t * t)) ** 0.5)


@outside("ISO 5725-2 as printed (memory)", 10, 0.00101, "")
def grubbs_as_printed() -> Deviations:
    """GRUBBS_LIMIT, one unit of the last printed digit"""
    for n, printed in PRINTED_G.items():
        yield f"n {n}", value("GRUBBS_LIMIT", n=n) - printed


@outside("scipy.stats.t", 18, 0.0005001, "")
def student() -> Deviations:
    """SLOPE_LIMIT for n 3 to 20, half its last digit"""
    for n in range(3, 21):
        yield f"n {n}", value("SLOPE_LIMIT", n=n) - float(stats.t.ppf(0.975, n - 2))


@pytest.mark.parametrize("check", of(__name__), ids=lambda check: check.deviations.__name__)
def test_quality_factors(check: Check) -> None:
    """To the last digit carried."""
    check.hold()


def test_grubbs_at_three_is_left_out() -> None:
    """With three values the limit 1.1543 and the largest possible 1.1547 leave nothing to find."""
    limits = listed("grubbs_single_two_sided", "alpha0.05")
    assert limits[3] == pytest.approx(2 / 3**0.5, abs=0.0005)
    with pytest.raises(Exception, match="outside"):
        value("GRUBBS_LIMIT", n=3)
