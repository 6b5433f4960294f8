"""Over many workbooks habits are found as often as they must be, and honest laboratories not more often than stated."""

from __future__ import annotations

import random
from collections import Counter
from dataclasses import replace
from typing import Any

import pytest
from sets_case import Bench, book, codes, laboratory, said

from sheetcal.check.sets import charts, copies, habits
from sheetcal.check.sets.summary import Lot, Summary

LEVELS = {
    "run-copied": copies.LEVEL,
    "readings-twice": copies.LEVEL,
    "digits-preferred": habits.LEVEL,
    "duplicates-too-close": habits.LEVEL,
    "control-drift": charts.LEVEL,
    "control-apart": charts.LEVEL,
    "unlike-earlier": charts.LEVEL_SOURCE,
}
HONEST = {
    "ordinary": Bench(),
    "with records": Bench(records=True),
    "pre-cut wire": Bench(wire_cut=True),
    "one operator": Bench(operators=("MR",)),
    "samples as even as a standard": Bench(scatter=0.0),
}


@pytest.mark.parametrize("name", HONEST)
def test_honest_laboratories_are_accused_no_more_often_than_stated(name: str, sizes: dict[str, Any]) -> None:
    """22 workbooks and 210 runs a laboratory; each code within its level (3.5 sigma), certain ones never."""
    number = sizes["honest_sets"]
    seen = Counter(code for seed in range(number) for code in set(codes(laboratory(seed, HONEST[name]))))
    assert set(seen) <= set(LEVELS), seen
    for code, level in LEVELS.items():
        assert seen[code] <= number * level + 3.5 * (number * level) ** 0.5 + 1.0, (code, seen[code], number)


def _share(code: str, bench: Bench, number: int) -> float:
    return sum(code in codes(laboratory(seed, bench)) for seed in range(number)) / number


def test_habits_are_found(sizes: dict[str, Any]) -> None:
    """Last digits 0 and 5 in 3 of 10 readings, duplicates drawn together to a fifth, a drift of 0.02 % a day.

    Measured at the levels above; a weak habit is found less often, as it must be.
    """
    number = sizes["habit_sets"]
    one = ("MR",)
    assert _share("digits-preferred", Bench(digits="05", preferred=0.3, operators=one), number) >= 0.8
    assert _share("duplicates-too-close", Bench(made_to_agree=0.2, operators=one), number) >= 0.8
    assert _share("control-drift", Bench(drift=0.02), number) >= 0.9
    assert _share("digits-preferred", Bench(digits="05", preferred=0.05, operators=one), number) <= 0.3


def test_last_digits_at_the_level_of_the_chance_stated() -> None:
    """Chi-square with df 9 over 101 readings: a chance below 5 % comes up in 5 % of honest sets; 100 are too few."""
    dice = random.Random(7)
    low = sum(habits.digit_chance(_counts(dice, 101)) < 0.05 for _ in range(2000))
    assert 60 <= low <= 140
    assert habits.LEAST_DIGITS == 100


def _counts(dice: random.Random, number: int) -> list[int]:
    drawn = Counter(dice.randrange(10) for _ in range(number))
    return [drawn[digit] for digit in range(10)]


def test_a_balance_with_a_place_less_has_no_favourite_digit() -> None:
    """Masses read to the milligram all end in 0 of the sheet's last place: honest."""
    books = [_rounded(one) for one in laboratory(3, Bench(operators=("MR",)))]
    assert "digits-preferred" not in codes(books)


def _rounded(one: Summary) -> Summary:
    runs = [
        replace(
            run, fine=tuple((name, round(value, 3 if "mass" in name else 4), step) for name, value, step in run.fine)
        )
        for run in one.runs
    ]
    return replace(one, runs=tuple(runs))


@pytest.mark.parametrize("records", [False, True])
def test_a_copied_run_is_found_and_the_later_one_is_named(records: bool, sizes: dict[str, Any]) -> None:
    """Every copy, of a control or a sample, and nothing else; its chance is stated and far below the level."""
    for seed in range(sizes["habit_sets"]):
        dice, books = random.Random(seed), laboratory(seed, Bench(records=records))
        first = dice.randrange(2, len(books) - 1)
        later = dice.randrange(first + 1, len(books))
        source, place = dice.choice(books[first].runs), dice.randrange(10)
        runs = list(books[later].runs)
        runs[place] = replace(runs[place], fine=source.fine, weak=source.weak, record=source.record)
        books[later] = replace(books[later], runs=tuple(runs))
        found = [one for one in said(books) if one.code == "run-copied"]
        assert [(one.file, one.one.partition(".")[0]) for one in found] == [(books[later].file, runs[place].run)]
        assert f"{source.run} of {books[first].file}" in found[0].message
        assert found[0].facts["certain"] is False and found[0].facts["false_alarm"] < 1e-4


def test_a_sample_unlike_those_before_it() -> None:
    """Total moisture 8.1 for 81.0 among five earlier sludges of one client; four are too few to say so."""
    values = (80.6, 81.9, 79.8, 82.3, 81.2)
    books = [book(f"a{number}.xlsx", [], (_sludge(value),), number=number) for number, value in enumerate(values)]
    last = book("b.xlsx", [], (_sludge(8.1),), number=20)
    (found,) = said([*books, last])
    assert (found.code, found.file, found.one) == ("unlike-earlier", "b.xlsx", "sample1.total_moisture")
    assert found.facts["found"] == 8.1 and found.facts["false_alarm"] < 1e-3
    assert codes([*books[1:], last]) == []
    assert codes([*books, book("b.xlsx", [], (_sludge(80.1),), number=20)]) == []


def _sludge(moisture: float) -> Lot:
    return Lot("sample1", "S", ("Waterworks", "sludge", "sludge"), (("total_moisture", moisture),))


def test_one_control_apart_from_the_others() -> None:
    """0.35 % among controls that scatter by 0.08 %: named with its file; an ordinary one is not."""
    books = laboratory(11)
    runs = list(books[9].runs)
    runs[0] = replace(runs[0], control=0.45)
    books[9] = replace(books[9], runs=tuple(runs))
    (found,) = [one for one in said(books) if one.code == "control-apart"]
    assert (found.file, found.one) == (books[9].file, "run1.control_deviation")
    assert 0.0 < found.facts["false_alarm"] < charts.LEVEL
