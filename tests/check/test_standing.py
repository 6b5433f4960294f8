"""Against the lab file each run is held to what was in force when it was fired, not when the workbook was issued."""

from __future__ import annotations

from pathlib import Path

import pytest
from planting import CONTROL, Book, check, coal, filled, issue, lab, write

from sheetcal.inputs.lab import Lab
from sheetcal.inputs.lab_reader import parse_lab
from sheetcal.inputs.text import TextFile

NEW = """
[[calibration]]
vessel = "A1"
issue = "C9"
value = "10180.0 J/K"
n = 5
rsd = "0.04 %"
certificate = "BA-31"
rise = ["1.58 K", "3.15 K"]
energy = ["16.0 kJ", "31.9 kJ"]
valid_from = {since}
valid_until = 2025-09-15
"""


def restated(add: str = "", *replaced: tuple[str, str]) -> Lab:
    """The demonstration's lab file with blocks added and words replaced."""
    text = lab().source.text + add
    for old, new in replaced:
        assert old in text
        text = text.replace(old, new)
    return parse_lab(TextFile(lab().source.path, "changed", text))


@pytest.fixture(scope="module")
def book(tmp_path_factory: pytest.TempPathFactory) -> Book:
    """A control and a coal, Monday from 07:05, CAL-A."""
    return filled(issue("fuel", tmp_path_factory.mktemp("book"), [CONTROL, coal("S-1")]), 1)


def test_a_calibration_adopted_before_the_run(book: Book, tmp_path: Path) -> None:
    """Adopted at 07:30: A1's run of 08:00 is named with both values; that of 07:05 and vessel A2 are not."""
    path = write(tmp_path, book.data())
    found = check(path, lab=restated(NEW.format(since="2025-03-03T07:30:00")))
    (one,) = found.findings
    assert (one.code, one.field, one.severity) == ("calibration-superseded", "run5.effective_heat_capacity", "warning")
    assert f"{one.sheet}!{one.cell}" == book.cell("run5.effective_heat_capacity")
    assert (one.found, one.expected) == (10138.7, 10180.0) and "C9" in one.message
    assert found.verdict == "hold"


def test_what_was_in_force_is_silent(book: Book, tmp_path: Path) -> None:
    """The lab file as at issue, and one that was calibrated anew the day after, say nothing."""
    path = write(tmp_path, book.data())
    assert check(path, lab=lab()).sound
    assert check(path, lab=restated(NEW.format(since="2025-03-04T07:30:00"))).sound


def test_a_balance_that_had_run_out(book: Book, tmp_path: Path) -> None:
    """The lab file learned afterwards that the balance's calibration ended in February: said once, at the first run."""
    path = write(tmp_path, book.data())
    name = book.record.prefilled["sheet.balance"]
    balance = next(one for one in lab().balances if one.id == name)
    head, _, tail = lab().source.text.partition(f'[[balance]]\nid = "{name}"')
    own, mark, rest = tail.partition("[[")
    until = f"calibrated_until = {balance.calibrated_until}"
    assert until in own
    text = f'{head}[[balance]]\nid = "{name}"{own.replace(until, "calibrated_until = 2025-02-20")}{mark}{rest}'
    found = check(path, lab=parse_lab(TextFile(lab().source.path, "changed", text)))
    (one,) = found.findings
    assert (one.code, one.field, one.found) == ("balance-expired", "run1.date", "2025-03-03")
    assert one.expected == "until 2025-02-20" and found.verdict == "hold"
