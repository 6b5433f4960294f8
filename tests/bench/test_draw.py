"""The same key gives the same chance everywhere, and what an instrument shows has no stray digits."""

from __future__ import annotations

import statistics

from sheetcal.bench import Dice, stepped


def test_a_key_gives_pinned_numbers() -> None:
    """Chance rests on the raw stream of PCG64 alone: these digits must never move."""
    dice = Dice("pinned", 1)
    assert [round(dice.fraction(), 12) for _ in range(3)] == PINNED


PINNED = [0.498210448357, 0.106365963547, 0.763904921173]


def test_a_child_does_not_depend_on_what_was_drawn_before() -> None:
    """A reading added in one place moves no other reading."""
    first, second = Dice("seed", 4), Dice("seed", 4)
    for _ in range(7):
        second.normal(1.0)
    assert first.child("run", 2).fraction() == second.child("run", 2).fraction()
    assert first.child("run", 2).fraction() != first.child("run", 3).fraction()


def test_normal_and_uniform_have_their_moments() -> None:
    """2000 draws: mean and standard deviation within 4 of their standard errors."""
    dice = Dice("moments")
    normal = [dice.normal(2.0, 10.0) for _ in range(2000)]
    uniform = [dice.uniform(-1.0, 3.0) for _ in range(2000)]
    assert abs(statistics.mean(normal) - 10.0) < 4 * 2.0 / 2000**0.5
    assert abs(statistics.stdev(normal) - 2.0) < 4 * 2.0 / 4000**0.5
    assert abs(statistics.mean(uniform) - 1.0) < 4 * (4 / 12**0.5) / 2000**0.5
    assert all(-1.0 < value < 3.0 for value in uniform)


def test_integer_reaches_both_ends_and_no_further() -> None:
    """Whole numbers from low to high, both included."""
    dice = Dice("ends")
    assert {dice.integer(2, 4) for _ in range(200)} == {2, 3, 4}


def test_stepped_shows_what_an_instrument_shows() -> None:
    """Whole multiples of the step, half to even, as the shortest decimal."""
    assert stepped(22.345678, 0.0001) == 22.3457
    assert stepped(0.25, 0.1) == 0.2
    assert stepped(7.337, 0.05) == 7.35
    assert stepped(30123.0, 10) == 30120.0
