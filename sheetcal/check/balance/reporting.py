"""What is printed of a value once it is rounded."""

from __future__ import annotations

from sheetcal.check.balance.book import Road
from sheetcal.check.balance.measure import LARGEST_SHARE, Measure, rounded


def report(road: Road, one: str, value: Measure | None, step: float, largest: float = 0.0) -> None:
    """Note the reported value: rounded, stage by stage; end to end the value itself, half a step wider.

    Where the step is too coarse for the widest tolerance a balance may have, the road end to end keeps silent.
    """
    if value is None:
        return
    if road.results is not None:
        road.put(one, Measure(rounded(value.value, step)))
        return
    width = value.tolerance + step / 2.0
    if width <= LARGEST_SHARE * max(largest, abs(value.value)):
        road.put(one, Measure(value.value, width, largest))
