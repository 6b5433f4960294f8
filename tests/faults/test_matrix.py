"""Every certain fault that a slip leaves is found, in its cell, and its cause is named; nothing clean is accused.

The slips are those of `sheetcal selftest`. CI plants each of them in one of its kinds, a full run in all of them.
"""

from __future__ import annotations

from typing import Any

import pytest

from sheetcal.check.catalogue import ALONE, catalogue
from sheetcal.kinds import names
from sheetcal.verbs import selftesting
from sheetcal.verbs.selftest_record import NOT_HERE, STATISTICAL, UNPLANTED, figures
from sheetcal.verbs.selftesting import Outcome, Planted

RIGHT_CELL, CAUSE = 98.0, 95.0


def _jobs(kinds: int) -> list[tuple[str, str]]:
    """(kind, slip): each slip in so many of its kinds, in turn, so that every kind gets its share."""
    by_slip: dict[str, list[str]] = {}
    for kind in names():
        for slip in selftesting.slips(kind):
            by_slip.setdefault(slip.name, []).append(kind)
    jobs = []
    for number, (slip, where) in enumerate(sorted(by_slip.items())):
        turned = where[number % len(where) :] + where[: number % len(where)]
        jobs += [(kind, slip) for kind in turned[:kinds]]
    return jobs


@pytest.fixture(scope="module")
def tested(sizes: dict[str, Any]) -> Outcome:
    """Everything planted and checked, once."""
    planted: list[Planted] = []
    nowhere = []
    for kind, slip in _jobs(sizes["matrix_kinds"]):
        found = selftesting.plant(kind, slip, sizes["matrix_places"])
        planted += found
        if not found:
            nowhere.append((kind, slip, ""))
    return Outcome(tuple(planted), 0, (), tuple(nowhere))


def _told(listed: list[Planted]) -> list[str]:
    return [f"{one.code} in {one.kind} at {one.at} by {one.slip}: {one.cause} {one.besides}" for one in listed]


def test_every_planted_fault_is_found(tested: Outcome) -> None:
    """A hundred of a hundred."""
    assert len(tested.planted) > 150
    assert _told([one for one in tested.planted if not one.found]) == []


def test_the_right_cell_is_named(tested: Outcome) -> None:
    """98 per cent of the findings stand where the slip was made."""
    wrong = [one for one in tested.planted if not one.right_cell]
    assert figures(tested)["right cell %"] >= RIGHT_CELL, _told(wrong)


def test_the_cause_is_rightly_named(tested: Outcome) -> None:
    """95 per cent of the slips that leave a trace are named by it."""
    wrong = [one for one in tested.planted if one.cause_wanted and not one.cause_named]
    assert figures(tested)["with a recognisable cause"] >= 15
    assert figures(tested)["cause rightly named %"] >= CAUSE, _told(wrong)


def test_every_certain_code_has_a_slip() -> None:
    """What the workbook alone shows is planted, or it stands in a short list with the reason."""
    slips = {slip.code for kind in names() for slip in selftesting.slips(kind)}
    alone = {one.code for one in catalogue() if one.needs == ALONE and STATISTICAL not in one.meaning}
    alone = {code for code in alone if not code.startswith("live-")}
    assert alone - slips - set(UNPLANTED) == set()
    assert len(alone & slips) > 120
    assert len(UNPLANTED) + len(NOT_HERE) <= 20


def test_every_slip_happens_somewhere(tested: Outcome) -> None:
    """A code for which no place was found in the kinds tried is planted in another, or stands in the list."""
    planted = {one.code for one in tested.planted} | set(NOT_HERE)
    missing = {_code(kind, name) for kind, name, _ in tested.nowhere} - planted
    for code in sorted(missing):
        ways = [(kind, slip.name) for kind in names() for slip in selftesting.slips(kind) if slip.code == code]
        assert any(selftesting.plant(kind, name, 1) for kind, name in ways), code


def _code(kind: str, name: str) -> str:
    return next(slip.code for slip in selftesting.slips(kind) if slip.name == name)
