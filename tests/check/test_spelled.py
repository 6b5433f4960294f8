"""A number that arrived as text is read as it was meant where that is plain, and the way it came is named."""

import random

import pytest

from sheetcal.check.spelled import read_as, without_marks
from sheetcal.model import Field

GRAMS = Field("run", "sample_mass", "Sample mass", "g", "reading", low=0.02, high=5.0, resolution=0.0001)
MINUTES = Field("run", "firing_time", "Firing", "min", "reading", resolution=0.01)


@pytest.mark.parametrize(
    ("text", "meant", "why", "severity"),
    [
        (" +  1.0012 g", 1.0012, "line of the balance", "warning"),
        ("ST,GS,+  1.0012 g", 1.0012, "line of the balance", "warning"),
        ("N     +    1.0012 g  ", 1.0012, "line of the balance", "warning"),
        ("S S   1001.2 mg", 1.0012, "line of the balance", "warning"),
        ("G 1.0012 ?", 1.0012, "line of the balance", "warning"),
        ("1.0012 g", 1.0012, "unit was typed", "warning"),
        ("98.2 mg", 0.0982, "unit was typed", "warning"),
        ("12.0 mg", None, "unit was typed", "warning"),
        ("1.0012 degC", None, "unit was typed", "warning"),
        ("&:àà&é", 1.0012, "keyboard is set to French", "error"),
        ("&;àà&é", 1.0012, "keyboard is set to French", "error"),
        ("+.éé+ě", 1.0012, "keyboard is set to Czech", "error"),
        ("!.))!@", 1.0012, "shift key", "error"),
        ("*1.0012*", 1.0012, "scanner", "error"),
        ("]C11.0012", 1.0012, "scanner", "error"),
        ("\u200b1.0012\ufeff", 1.0012, "nobody sees", "error"),
        ("1 001.2", 1001.2, "part the thousands", "error"),
        ("7:30", None, "a clock time", "error"),
        ("-", None, "not determined", "error"),
        ("<0.05", None, "a limit", "error"),
        ("l.OO12", None, "letter O or l", "error"),
        ("1.OOO2", None, "letter O or l", "error"),
        ("1.00l2", None, "letter O or l", "error"),
        ("\uff11.0012", None, "look like digits", "error"),
        ("see notebook", None, None, "error"),
    ],
)
def test_what_was_meant(text: str, meant: float | None, why: str | None, severity: str) -> None:
    found = read_as(text, GRAMS)
    assert found.value == (None if meant is None else pytest.approx(meant))
    assert (why in (found.why or "")) if why else found.why is None
    assert found.severity == severity


def test_minutes_and_seconds() -> None:
    for text, meant in (("7:30", 7.5), ("5:06", 5.1), ("5'30\"", 5.5), ("14:15.0", 14.25)):
        assert read_as(text, MINUTES).value == pytest.approx(meant)
        assert "minutes and seconds" in str(read_as(text, MINUTES).why)


def test_words_are_never_taken_for_numbers() -> None:
    """Of 3000 random short words and remarks none is read as a number."""
    source = random.Random(7)
    letters = "abcdefghijklmnopqrstuvwxyz ,'-éèàç"
    for _ in range(3000):
        text = "".join(source.choice(letters) for _ in range(source.randint(3, 9)))
        found = read_as(text, GRAMS).value
        assert found is None or set(text.strip()) <= set("&é\"'(-è_çà.,;: "), text


def test_marks_nobody_sees() -> None:
    assert without_marks(" A1\u200b ") == "A1"
    assert without_marks("A1") == "A1"
    assert without_marks("two words") == "two words"
