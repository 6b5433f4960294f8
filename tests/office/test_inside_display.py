"""A person at a real Calc window checks the worksheet by the menu, goes on typing, and takes the marks off again.

Everything is done by the keyboard, under a virtual display. Pictures are left in pytest's folder for looking at.
"""

from __future__ import annotations

import time
from collections.abc import Iterator
from pathlib import Path

import pytest
from display import Display, display
from inside_case import Calc, running, slow, until

WORKBOOK = Path(__file__).parents[2] / "workbooks" / "fuel-filled.xlsx"
SMALL = WORKBOOK.with_name("heat-balance-filled.xlsx")
BAR = 0.5  # seconds in which Calc must answer
TOLERATED = 1.3  # the machine may be busy
FIELD, BESIDE = "E45", "F45"  # the crucible's name: free text, and nothing is computed from it


@pytest.fixture(scope="module")
def screen(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Display]:
    with display(tmp_path_factory.mktemp("screen")) as one:
        yield one


@pytest.fixture(scope="module")
def calc(tmp_path_factory: pytest.TempPathFactory, screen: Display) -> Iterator[Calc]:
    with running(tmp_path_factory.mktemp("desk"), screen.name) as one:
        yield one


@pytest.mark.office
def test_checked_by_keyboard_while_work_goes_on(calc: Calc, screen: Display, tmp_path: Path) -> None:
    """Alt+L C: within half a second a typed reading is in its cell though the check still runs; then the verdict."""
    calc.stated(python=slow(tmp_path, 4))
    key = calc.open(WORKBOOK)
    calc.do("put", key=key, tab="Results", ref="F119", content=29600.0)
    calc.do("select", key=key, tab="Readings", ref=FIELD)
    screen.activate("fuel-filled.xlsx")
    screen.keys("alt+l")
    screen.picture(tmp_path / "menu.png")
    screen.keys("c", pause=0.0)
    assert calc.do("longest", key=key, seconds=1.5) <= BAR * TOLERATED
    assert "being checked" in calc.do("bar", key=key)[0]
    began = time.monotonic()
    screen.words("seven")
    screen.keys("Return", pause=0.0)
    until(lambda: calc.do("text", key=key, tab="Readings", ref=FIELD).lower(), lambda text: text == "seven", 5)
    assert time.monotonic() - began <= BAR * TOLERATED
    assert "being checked" in calc.do("bar", key=key)[0]
    calc.do("select", key=key, tab="Readings", ref=BESIDE)
    screen.words("half")  # and is not disturbed in the middle of a word
    assert calc.do("longest", key=key, seconds=30) <= BAR * TOLERATED
    said = calc.verdict(key)
    assert said[0] == "Not right: 1 error." and "changed since then" in said[1]
    screen.words(" a word")
    screen.keys("Return")
    assert calc.do("text", key=key, tab="Readings", ref=BESIDE).lower() == "half a word"
    screen.picture(tmp_path / "verdict.png")
    go_through(calc, screen, key, tmp_path)
    calc.do("close", key=key)
    assert calc.left_behind() == []


def go_through(calc: Calc, screen: Display, key: str, folder: Path) -> None:
    """Next finding, list, remove: by the letters of the menu."""
    screen.keys("alt+l", "n")
    until(lambda: calc.do("bar", key=key)[0], lambda said: said == "1 of 1: Results F119")
    facts = calc.do("facts", key=key)
    assert (facts["active"], facts["selection"]) == ("Results", "$Results.$F$119")
    assert calc.do("style", key=key, tab="Results", ref="F119") == "sheetcal error"
    screen.keys("Down")
    screen.picture(folder / "cell.png")
    screen.keys("alt+l", "s")
    until(lambda: calc.do("facts", key=key)["active"], lambda tab: tab == "Findings")
    screen.picture(folder / "list.png")
    screen.keys("alt+l", "r")
    until(lambda: calc.do("bar", key=key), lambda said: said == ["The marks are removed."])
    facts = calc.do("facts", key=key)
    assert facts["active"] == "Results" and [tab["name"] for tab in facts["tabs"]][-1] == "Issue record"
    assert not any(tab["comments"] for tab in facts["tabs"])
    screen.picture(folder / "removed.png")


@pytest.mark.office
def test_what_is_just_being_typed_is_checked_too(calc: Calc, screen: Display, tmp_path: Path) -> None:
    calc.stated()
    key = calc.open(WORKBOOK)
    calc.do("select", key=key, tab="Readings", ref="F52")
    screen.activate("fuel-filled.xlsx")
    screen.words("40")
    screen.keys("alt+l", "c")
    assert calc.do("text", key=key, tab="Readings", ref="F52").startswith("40")
    said = calc.verdict(key)
    assert said[0] != "Sound: nothing to put right."
    screen.picture(tmp_path / "typed.png")
    calc.do("close", key=key)


@pytest.mark.office
def test_many_marks_do_not_hold_calc(calc: Calc, tmp_path: Path) -> None:
    """Eighty wrong readings: the copy and every slice of marking leave Calc free within half a second."""
    calc.stated()
    key = calc.open(WORKBOOK)
    for row in range(60, 160):
        calc.do("put", key=key, tab="Readings", ref=f"E{row}", content="x,1")
    copied = calc.do("timed", key=key, command="check")
    marked = calc.do("longest", key=key, seconds=60)
    assert "errors" in calc.verdict(key)[0]
    count = sum(len(tab["comments"]) for tab in calc.do("facts", key=key)["tabs"])
    print(f"\ncopy {copied:.3f} s, longest wait while checking and marking {marked:.3f} s, {count} comments")
    assert count >= 50 and copied <= BAR * TOLERATED and marked <= BAR * TOLERATED
    calc.do("close", key=key)


@pytest.mark.office
def test_a_german_calc_speaks_german_and_ends_cleanly(screen: Display, tmp_path: Path) -> None:
    """Opened by the same letter; then quitted while a check runs: nothing stays behind."""
    with running(tmp_path / "german", screen.name, "de") as calc:
        key = calc.open(SMALL)
        calc.do("put", key=key, tab="Results", ref="E6", content=7000.0)
        screen.activate(SMALL.name)
        screen.keys("alt+l")
        screen.picture(tmp_path / "menu.png")
        screen.keys("p")
        until(lambda: calc.do("bar", key=key), lambda said: said[:1] == ["Nicht in Ordnung: 1 Fehler."])
        until(lambda: calc.do("facts", key=key)["tabs"][-1]["name"], lambda name: name == "Befunde")
        until(lambda: calc.do("bar", key=key), lambda said: len(said) > 1 and said[1].startswith("Stand des Blatts"))
        screen.picture(tmp_path / "verdict.png")
        calc.stated(python=slow(tmp_path, 20))
        calc.do("settle", key=key)
        calc.do("dispatch", key=key, command="check")
        until(calc.left_behind, bool)
        assert calc.do("quit") is True
        calc.process.wait(20)
        assert calc.left_behind() == []
