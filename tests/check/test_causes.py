"""A cause is named where a wrong value bears the signature of a well-known slip, and not otherwise."""

import random

import pytest

from sheetcal.check.causes import comma_readings, of_value

RIGHT = 24_279.71


@pytest.mark.parametrize(
    ("found", "words"),
    [
        (RIGHT * 4.184, "thermochemical"),
        (RIGHT / 4.184, "thermochemical"),
        (RIGHT * 4.1868, "IT calories"),
        (RIGHT / 4.1855, "15 degC calories"),
        (RIGHT / 2.326, "Btu/lb"),
        (RIGHT * 1055.06, "Btu and joules"),
        (RIGHT * 1.8, "degF"),
        (RIGHT * 10.0, "factor of ten"),
        (RIGHT / 100.0, "factor of a hundred"),
        (RIGHT / 1000.0, "kJ and J"),
        (RIGHT * 1e6, "a million"),
        (-RIGHT, "sign"),
    ],
)
def test_a_ratio_betrays_a_unit(found: float, words: str) -> None:
    causes = of_value(found, RIGHT)
    assert len(causes) == 1
    assert words in causes[0]


def test_moisture_betrays_itself_by_its_own_figure() -> None:
    dry = 100.0 / 97.5
    assert "applied twice" in of_value(RIGHT * dry, RIGHT, 2.5)[0]
    assert "ratio 1.0256 = 100/(100 - 2.5)" in of_value(RIGHT * dry, RIGHT, 2.5)[0]
    assert "left out" in of_value(RIGHT / dry, RIGHT, 2.5)[0]
    assert "inverted" in of_value(RIGHT / dry**2, RIGHT, 2.5)[0]
    assert of_value(RIGHT * dry, RIGHT, None) == []
    assert of_value(RIGHT * dry, RIGHT, 100.0) == []


def test_digits_exchanged_or_mistyped() -> None:
    assert of_value(1.0213, 1.0123, digits=4) == ["two digits were probably exchanged: 1.0213 for 1.0123"]
    assert of_value(0.9123, 9.0123, digits=4)[0].startswith("two digits were probably exchanged")
    assert of_value(1.0723, 1.0123, digits=4) == ["one digit was probably mistyped: 1.0723 for 1.0123"]
    assert of_value(10.0123, 1.0123, digits=4) == []
    assert of_value(1.0813, 1.0123, digits=4) == []
    assert of_value(2e9, 1e9, digits=4) == []


def test_a_short_number_is_explained_by_its_sign_or_a_power_of_ten_alone() -> None:
    """3 for -3 and 30 for 3 are exact; that 5 differs from 6 by one digit says nothing."""
    assert of_value(-3.0, 3.0) == ["the sign was probably lost or added"]
    assert "factor of ten" in of_value(30.0, 3.0)[0]
    assert of_value(6.0, 5.0, digits=1) == []
    assert of_value(12.0, 3.0) == []


def test_no_cause_is_named_of_accidents() -> None:
    """Of 4000 wrong values within 20 %, none looks like a slip of unit, sign, power or moisture."""
    source = random.Random(5)
    named = [of_value(RIGHT * source.uniform(0.8, 1.2), RIGHT, source.uniform(0.5, 10.0)) for _ in range(4000)]
    assert sum(bool(one) for one in named) <= 4
    assert of_value(0.0, RIGHT) == []
    assert of_value(RIGHT, 0.0, 2.5) == []


def test_a_comma_is_read_both_ways() -> None:
    assert comma_readings("7,90") == (7.9, 790.0)
    assert comma_readings(" 2,413 ") == (2.413, 2413.0)
    assert comma_readings("-1\u00a0234,5") == (-1234.5, -12345.0)
    for text in ("7.90", "1,2,3", "a,b", ",5", "5,", "\uff11,5", ""):
        assert comma_readings(text) is None, text
