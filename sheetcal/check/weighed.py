"""A weighing that does not foot: which of the three figures is the wrong one."""

from __future__ import annotations

from collections.abc import Mapping

from sheetcal.check.case import Case, is_number
from sheetcal.check.reasons import decimals
from sheetcal.check.signatures import mistyped
from sheetcal.model import Value

SAME_CRUCIBLE = 0.01  # g: what one crucible weighs from run to run


def misweighed(case: Case, block: str, name: str) -> dict[str, Value]:
    """The figure that is probably wrong and what it should be, by id; the net mass `name` where nothing tells.

    Duplicates tell whether the net mass used is right; the same crucible in other runs whether the tare is; and
    digits exchanged in one of the three give that one away.
    """
    net, gross, tare = (f"{block}.{one}" for one in (name, "crucible_gross", "crucible_tare"))
    found = {one: case.number(one) or 0.0 for one in (net, gross, tare)}
    right = {net: found[gross] - found[tare], gross: found[net] + found[tare], tare: found[gross] - found[net]}
    agrees = _agrees(case, block, {}), _agrees(case, block, {net: round(right[net], 6)})
    if agrees == (False, True):
        order = [net]
    elif agrees == (True, False):
        order = [tare, gross] if _other_tare(case, tare, found[tare]) else [gross, tare]
    else:
        order = [net, gross, tare]
    wrong = next((one for one in order if _slipped(case, one, found[one], right[one])), order[0])
    return {wrong: round(right[wrong], 6)}


def _agrees(case: Case, block: str, changed: Mapping[str, Value]) -> bool | None:
    """Whether the sample's runs agree; None where there is no second run."""
    sample = case.sample_of(block)
    if sample is None:
        return None
    span, limit = case.right.values([f"{sample}.range", f"{sample}.critical_range"], changed).values()
    return float(span) <= float(limit) if is_number(span) and is_number(limit) else None


def _other_tare(case: Case, tare: str, value: float) -> bool:
    """Whether the crucible weighed otherwise in every other run of the sheet that names it."""
    block = tare.partition(".")[0]
    own = case.text(f"{block}.crucible_id")
    others = [
        case.number(f"{run}.crucible_tare")
        for run in case.runs()
        if run != block and own and case.text(f"{run}.crucible_id") == own
    ]
    return bool(others) and all(one is not None and abs(one - value) > SAME_CRUCIBLE for one in others)


def _slipped(case: Case, one: str, found: float, right: float) -> bool:
    places = decimals(case.place(one)[0].field.resolution)
    return any(True for _ in mistyped(found, right, places))
