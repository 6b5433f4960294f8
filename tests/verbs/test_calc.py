"""`calc` evaluates one cell function from values with units."""

from __future__ import annotations

import pytest

from sheetcal import verbs
from sheetcal.errors import BadInput, OutOfRange, SheetcalError

CASES = [
    ("HEAT_FROM_RISE", ["mass=180 g", "specific_heat=4.18 J/(g K)", "rise=12.5 K"], None, "9405 J"),
    ("heat_from_rise", ["mass=0.18 kg", "specific_heat=4.18 kJ/(kg K)", "rise=12500 mK"], None, "9405 J"),
    ("HEAT_FROM_RISE", ["mass=180 g", "specific_heat=4.18 J/(g K)", "rise=12.5 K"], "kJ", "9.405 kJ"),
    ("HEAT_FROM_RISE", ["mass=180 g", "specific_heat=4.18 J/(g K)", "rise=12.5 K"], "cal_th", "2247.84894837 cal_th"),
    ("SMALLEST_OF", ["values=35, 32 kJ"], None, "32 kJ"),
    ("SUM_OF_TWO", ["first=1 kJ", "second=500 J"], None, "1.5 kJ"),
    ("READING_AT", ["time=0, 30, 60, 90 s", "moment=1 min", "length=4"], None, "3"),
    ("IN_MJ", ["value=28360 J/g"], None, "28.36 MJ/kg"),
]


@pytest.mark.parametrize(("name", "arguments", "to", "answer"), CASES)
def test_values_are_taken_in_any_unit_and_answered_in_the_function_s(
    name: str, arguments: list[str], to: str | None, answer: str
) -> None:
    """Units convert, series share one unit, --to changes the answer's unit."""
    assert verbs.calc(name, arguments, to).lines == (answer,)


@pytest.mark.parametrize(
    ("name", "arguments", "words"),
    [
        ("HEAT_FROM_RISE", ["mass=180", "specific_heat=4.18 J/(g K)", "rise=12.5 K"], "g"),
        ("HEAT_FROM_RISE", ["mass=180 K", "specific_heat=4.18 J/(g K)", "rise=12.5 K"], "g"),
        ("HEAT_FROM_RISE", ["mass=180 g", "specific_heat=1 cal/(g K)", "rise=12.5 K"], "cal_th"),
        ("HEAT_FROM_RISE", ["mass=180 g", "rise=12.5 K"], "specific_heat"),
        ("HEAT_FROM_RISE", ["mass=180 g", "mass=181 g", "specific_heat=4.18 J/(g K)", "rise=12.5 K"], "twice"),
        ("HEAT_FROM_RISE", ["weight=180 g"], "mass (g)"),
        ("HEAT_FROM_RISE", ["180 g"], "NAME='VALUE UNIT'"),
        ("HEAT_FROM_RIES", ["mass=180 g"], "HEAT_FROM_RISE"),
        ("HEAT_FROM_RISE", ["mass=nan g", "specific_heat=4.18 J/(g K)", "rise=12.5 K"], "nan"),
        ("HEAT_FROM_RISE", ["mass=1e999 g", "specific_heat=4.18 J/(g K)", "rise=12.5 K"], ""),
        ("HEAT_FROM_RISE", ["mass=-180 g", "specific_heat=4.18 J/(g K)", "rise=12.5 K"], "mass"),
        ("HEAT_FROM_RISE", ["mass=", "specific_heat=4.18 J/(g K)", "rise=12.5 K"], "g"),
    ],
)
def test_what_does_not_fit_is_named(name: str, arguments: list[str], words: str) -> None:
    """Unit, argument and range are told in one line."""
    with pytest.raises(SheetcalError) as caught:
        verbs.calc(name, arguments)
    assert words in str(caught.value) and "\n" not in str(caught.value)


def test_an_answer_in_another_quantity_is_refused() -> None:
    """A heat is no temperature."""
    with pytest.raises(BadInput):
        verbs.calc("HEAT_FROM_RISE", ["mass=180 g", "specific_heat=4.18 J/(g K)", "rise=12.5 K"], "K")


def test_beyond_the_valid_range_the_range_is_named() -> None:
    """OutOfRange carries argument and range; no number is given."""
    with pytest.raises(OutOfRange, match="moisture"):
        verbs.calc("DRY_FROM_ANALYSED", ["value=20000 J/g", "moisture=100 %"])


def test_a_text_is_answered_as_it_is() -> None:
    """Functions that answer in words need no unit."""
    answer = verbs.calc("WHAT_NEXT", ["counted=1", "required=2", "range=0 J/g", "critical_range=120 J/g"]).lines[0]
    assert answer and not answer[0].isdigit()
