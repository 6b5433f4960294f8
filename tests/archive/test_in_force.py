"""Each run is evaluated with the set in force at its own date and time."""

from __future__ import annotations

from datetime import datetime
from pathlib import Path

import pytest
from archive_case import gathered, recompute, relative

from sheetcal.archive.changed import Recomputed, changes
from sheetcal.archive.in_force import boundaries, era, moment_of, titrant_at
from sheetcal.inputs import read_lab
from sheetcal.verbs.demo_week import Week
from sheetcal.verbs.workbook import open_workbook

WIRE = """
[[lot]]
id = "FW-9"
what = "firing wire"
heat = "19.2 J/cm"
length = "10.0 cm"
valid_from = 2025-03-06T00:00:00
"""
TITRANT = """
[[titrant]]
lot = "NT-14"
strength = "0.2006 mol/L"
standardised = 2025-03-05
valid = "30 d"
"""


@pytest.fixture(scope="module")
def restated(week: Week, tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A lab file that restates the wire from Thursday and the titrant from Wednesday on."""
    path = tmp_path_factory.mktemp("restated") / "lab.toml"
    path.write_text(week.lab.read_text("utf-8") + WIRE + TITRANT, "utf-8")
    return path


def test_only_runs_of_the_later_days_take_the_later_wire(week: Week, restated: Path, tmp_path: Path) -> None:
    """W3 spans Tuesday to Thursday: Thursday's three runs take the restated wire, Tuesday's keep the old one."""
    done = recompute(gathered(week, tmp_path / "archive", ["W3"]), tmp_path / "out", restated)
    wires = {one: row for one, row in done.of("W3").items() if one.endswith(".wire_heat")}
    assert {row["measured_on"] for row in wires.values()} == {"2025-03-06"}
    assert len(wires) >= 3 and all(relative(row) == pytest.approx(100.0) for row in wires.values())
    runs = {one.partition(".")[0] for one in wires}
    gross = {one.partition(".")[0]: row for one, row in done.of("W3").items() if one.endswith(".gross_run")}
    assert set(gross) == runs
    assert {row["cause"] for row in gross.values()} == {"lot FW-9 9.6 -> 19.2 J/cm"}
    assert {row["sample_id"] for one, row in done.of("W3").items() if one.endswith(".gross_dry")} == {
        "S-2506",
        "S-2507",
    }


def test_results_over_runs_of_both_sets_are_the_mean_of_their_own(week: Week, restated: Path, tmp_path: Path) -> None:
    """The mean of a sample fired on both days moves by the share of its later runs."""
    done = recompute(gathered(week, tmp_path / "archive", ["W3"]), tmp_path / "out", restated)
    book = done.of("W3")
    later = [
        float(row["change"])
        for row in book.values()
        if row["sample_id"] == "S-2506" and row["field"].endswith(".gross_run")
    ]
    mean = next(
        row for row in book.values() if row["sample_id"] == "S-2506" and row["field"].endswith(".gross_analysed")
    )
    assert len(later) == 1 and float(mean["change"]) == pytest.approx(later[0] / 3.0)


def test_a_workbook_of_two_sets_is_not_revised(week: Week, restated: Path, tmp_path: Path) -> None:
    """One table cannot hold two values of a lot: the workbook is recomputed, and says why it has no revised copy."""
    done = recompute(gathered(week, tmp_path / "archive", ["W3"]), tmp_path / "out", restated, revise=True)
    assert done.rows and not (done.out / "revised").exists()
    assert "its runs fall under different constants" in done.not_recomputed["W3.xlsx"]


def test_a_titrant_standardised_again_serves_from_its_day_on(restated: Path) -> None:
    """The strength of a lot is the last one standardised by the day; before the first there is none."""
    lab = read_lab(restated)
    days = (datetime(2025, 2, 1, 9), datetime(2025, 3, 4, 23, 59), datetime(2025, 3, 5, 0, 0))
    assert [titrant_at(lab, "NT-14", day) for day in days] == [None, 0.1003, 0.2006]


def test_moments_between_the_same_boundaries_find_the_same_constants(week: Week, restated: Path) -> None:
    """The eras cut time exactly where something begins to hold."""
    lab = read_lab(restated)
    bounds = boundaries(lab)
    record = open_workbook(week.filled("W3")).parts.record
    assert len(bounds) >= 6 and list(bounds) == sorted(set(bounds))
    for number, bound in enumerate(bounds, start=1):
        assert era(bounds, bound) == number
        found = changes(record, lab, Recomputed(), bound)
        assert found.values == changes(record, lab, Recomputed(), bound.replace(second=30)).values


@pytest.mark.parametrize(
    ("day", "start", "expected"),
    [
        (45722.0, "08:05", datetime(2025, 3, 6, 8, 5)),
        (45722.0, None, datetime(2025, 3, 6, 12, 0)),
        (45722.0, "8 o'clock", datetime(2025, 3, 6, 12, 0)),
        ("6 March", "08:05", None),
        (True, "08:05", None),
        (1e12, "08:05", None),
        (None, None, None),
    ],
)
def test_the_moment_of_a_run_is_its_date_and_start(day: object, start: object, expected: datetime | None) -> None:
    """A day that is no date gives no moment; a start that is no time counts as noon."""
    assert moment_of(day, start) == expected
