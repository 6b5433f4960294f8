"""Two faults in one workbook are both found: neither hides the other."""

from __future__ import annotations

from itertools import combinations
from typing import Any

from sheetcal.planting import Sheet, Slip, Spot
from sheetcal.verbs import selftesting

# Twenty common slips, each with the place, counted from the first, at which it is planted.
COMMON = (
    ("result typed over by a better one", -1), ("result typed in kilojoules", 3), ("result with its sign lost", 25),
    ("formula deleted", 11), ("stored value forged", -7), ("label rewritten", 6), ("constant typed over", 1),
    ("number typed with its unit", 4), ("decimal comma", -1), ("number taken for a date", 8), ("reading forgotten", 9),
    ("sign lost", -3), ("plus for minus", -2), ("cell of the column beside", 5), ("row hidden", 7),
    ("protection switched off", 1), ("calculation by hand", 0), ("tab added", 0), ("firing time early", 0),
    ("digits exchanged in a mass", -1),
)  # fmt: skip


def _spots(sheet: Sheet) -> list[tuple[Slip, Spot]]:
    """The twenty, each at its place."""
    slips = {slip.name: slip for slip in selftesting.slips("fuel")}
    found = []
    for name, number in COMMON:
        listed = list(slips[name].spots(sheet))
        assert listed, name
        found.append((slips[name], listed[max(number, -len(listed)) if number < 0 else min(number, len(listed) - 1)]))
    assert len({spot.at or slip.name for slip, spot in found}) == len(COMMON), "two slips in one cell"
    return found


def test_both_of_two_faults_are_found(sizes: dict[str, Any]) -> None:
    """Every pair in a full run, an even sample of them in CI."""
    sheet = selftesting.sheets("fuel")[0]
    spots = _spots(sheet)
    pairs = list(combinations(spots, 2))
    assert len(pairs) == 190
    step = len(pairs) / sizes["fault_pairs"]
    missed, tried = [], 0
    for number in range(sizes["fault_pairs"]):
        pair = pairs[int(number * step)]
        findings = selftesting.checked(sheet.planted(*(spot for _, spot in pair))).findings
        for slip, spot in pair:
            tried += 1
            one = selftesting.judged(sheet, slip, spot, findings)
            if one.missed:
                other = next(other.name for other, _ in pair if other is not slip)
                missed.append(f"{slip.name} at {spot.at}, beside {other}: {[f.code for f in findings]}")
    assert missed == []
    assert tried == 2 * sizes["fault_pairs"]
