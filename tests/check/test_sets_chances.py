"""The chances that statistical findings state are those of scipy, and of counting every case."""

from __future__ import annotations

from itertools import groupby, product

import pytest
from scipy import stats

from sheetcal.check.sets import chances


def test_tails_are_scipy_s() -> None:
    """Chi-square, variance ratio, Student's t and the normal, over the range in which they are used."""
    seen = 0
    for freedom in (1, 2, 3, 9, 10, 33, 150, 399, 400):
        for share in (0.01, 0.2, 0.7, 1.0, 1.6, 4.0):
            mine, theirs = chances.above_chi_square(share * freedom, freedom), stats.chi2.sf(share * freedom, freedom)
            assert mine == pytest.approx(theirs, rel=1e-9, abs=1e-12)
            seen += 1
    for freedom, other in product((1, 2, 8, 40, 300), (2, 8, 11, 90)):
        for ratio in (0.02, 0.3, 1.0, 2.5):
            expected = stats.f.cdf(ratio, freedom, other)
            assert chances.below_f(ratio, freedom, other) == pytest.approx(expected, rel=1e-9, abs=1e-13)
            seen += 1
    for freedom, t in product((1, 2, 5, 30, 400), (0.0, 0.4, 2.0, 9.0)):
        assert chances.beyond_t(t, freedom) == pytest.approx(2.0 * stats.t.sf(t, freedom), rel=1e-9)
        seen += 1
    for z in (-3.0, 0.0, 1.0, 8.0):
        assert chances.beyond_normal(z) == pytest.approx(stats.norm.sf(z), rel=1e-12)
        seen += 1
    assert seen == 54 + 80 + 20 + 4


def test_many_degrees_of_freedom_and_edges() -> None:
    """The cube-root form above 400 is good to 0.1 % in the body; nothing and everything give 1 and 0."""
    for share in (0.9, 1.0, 1.1):
        theirs = stats.chi2.sf(share * 1000, 1000)
        assert chances.above_chi_square(share * 1000, 1000) == pytest.approx(theirs, rel=2e-3)
    assert chances.above_chi_square(0.0, 3) == 1.0
    assert chances.below_f(0.0, 3, 4) == 0.0
    assert (chances.beta_share(0.0, 2.0, 3.0), chances.beta_share(1.0, 2.0, 3.0)) == (0.0, 1.0)


@pytest.mark.parametrize("number", [1, 2, 5, 9, 13])
def test_runs_on_one_side_are_counted_out(number: int) -> None:
    """Against all 2**n ways in which n values can lie above or below."""
    ways = [max(len(list(same)) for _, same in groupby(one)) for one in product((0, 1), repeat=number)]
    for length in range(1, number + 1):
        exact = sum(way >= length for way in ways) / len(ways)
        assert chances.longest_run(length, number) == pytest.approx(exact, abs=1e-12)


def test_the_farthest_value_has_the_chance_of_grubbs_table() -> None:
    """Limits of ISO 5725-2 at 5 % and 1 %, both sides, as printed; a value beyond all that is possible has none."""
    table = {4: (1.481, 1.496), 6: (1.887, 1.973), 10: (2.290, 2.482), 20: (2.708, 3.001), 40: (3.036, 3.381)}
    for number, (five, one) in table.items():
        assert chances.farthest_of(five, number) == pytest.approx(0.05, rel=0.04)
        assert chances.farthest_of(one, number) == pytest.approx(0.01, rel=0.08)
    assert chances.farthest_of(9.0, 5) == 0.0
    assert chances.farthest_of(1.0, 2) == 1.0
