"""What an instrument stored by itself betrays what was typed by habit, from another run, or left out."""

from __future__ import annotations

from datetime import datetime, timedelta
from pathlib import Path
from typing import Any

import pytest
from planting import CONTROL, MONDAY, Book, coal, filled, lab, write

from sheetcal.errors import BadInputs, SheetcalError
from sheetcal.inputs.worklist import read_worklist
from sheetcal.model import Finding, Verdict
from sheetcal.verbs.checking import Against, check_set
from sheetcal.verbs.issuing import Order, build
from sheetcal.verbs.second import second

HEAD = "time,instrument,run,quantity,value,unit"
CODES = ("instrument-log", "log-run-missing")


@pytest.fixture(scope="module")
def books(tmp_path_factory: pytest.TempPathFactory) -> dict[str, Book]:
    """A control and a coal: CAL-A with records and weighed water, CAL-B with the instrument's own rise."""
    folder = tmp_path_factory.mktemp("books")
    rows = [CONTROL, coal("S-2501")]
    lines = [
        ",".join(row.get(name, "") for name in ("sample_id", "role", "expected_gross", "fuel_class")) for row in rows
    ]
    (folder / "worklist.csv").write_text("\n".join(["sample_id,role,expected_gross,fuel_class", *lines]), "utf-8")
    worklist = read_worklist(folder / "worklist.csv")
    return {
        name: filled(build(Order("fuel", lab=lab(), worklist=worklist, calorimeter=name, moment=MONDAY)), 3)
        for name in ("CAL-A", "CAL-B")
    }


def started(book: Book, run: str) -> datetime:
    """When a run was started."""
    return datetime.fromisoformat(f"{book.readings[f'{run}.date']}T{book.readings[f'{run}.start']}")


def row(book: Book, run: str, name: str, value: float | None = None, unit: str = "g", **facts: Any) -> str:
    """A line of the log, two minutes before the run was started, by what the sheet holds if nothing else is said."""
    stored = book.readings[f"{run}.{name}"] if value is None else value
    time = started(book, run) + timedelta(minutes=facts.get("minutes", -2))
    called = facts.get("called", f"mon-S-2501-{run[3:]}" if run in ("run5", "run6") else f"mon-BA-31-{run[3:]}")
    return f"{time:%Y-%m-%dT%H:%M},{facts.get('by', 'BAL-2')},{called},{facts.get('quantity', name)},{stored},{unit}"


def verdict(book: Book, folder: Path, log: list[str], changes: dict[str, Any] | None = None) -> Verdict:
    """The verdict on the workbook beside the log."""
    path = write(folder, book.data(changes))
    (folder / "log.csv").write_text("\n".join([HEAD, *log]) + "\n", "utf-8")
    (found,) = check_set([str(path)], Against(second=second(None, str(folder / "log.csv"))))
    return found


def told(found: Verdict) -> list[Finding]:
    """What the log has to say."""
    return [one for one in found.findings if one.code in CODES]


RUNS = ("run1", "run2", "run5", "run6")


def test_water_typed_by_habit(books: dict[str, Book], tmp_path: Path) -> None:
    """1991.5 g by the balance's file, 2000.0 typed: cell, both values and the effect; the other runs are silent."""
    book = books["CAL-A"]
    log = [row(book, run, "calorimeter_water", 1991.5 if run == "run5" else None) for run in RUNS]
    found = verdict(book, tmp_path, log)
    (one,) = told(found)
    assert (one.code, one.field, one.certain, one.severity) == (
        "instrument-log",
        "run5.calorimeter_water",
        True,
        "error",
    )
    assert f"{one.sheet}!{one.cell}" == book.cell("run5.calorimeter_water")
    assert (one.found, one.expected) == (2000.0, 1991.5) and "BAL-2" in one.message
    assert one.effect is not None and 25.0 < one.effect["change"] < 60.0
    assert found.verdict == "reject" and not any("--instrument-log" in text for text in found.not_checked)


def test_a_log_that_agrees_is_silent(books: dict[str, Book], tmp_path: Path) -> None:
    """Water, masses in mg, rises, in any order, beside rows of other days and instruments: nothing, and sound."""
    book = books["CAL-A"]
    log = [row(book, run, "calorimeter_water") for run in reversed(RUNS)]
    log += [
        row(book, run, "sample_mass", 1000.0 * book.readings[f"{run}.sample_mass"], "mg", by="BAL-1") for run in RUNS
    ]
    log += ["2025-02-01T09:00,BAL-9,other-1,calorimeter_water,1.0,g", "2025-03-03T23:00,BAL-9,,humidity,40,%"]
    found = verdict(book, tmp_path, log)
    assert told(found) == [] and found.sound


def test_masses_and_rises_of_the_instrument(books: dict[str, Book], tmp_path: Path) -> None:
    """A mass and a rise typed wrong where the instrument stored both; the row names issue id and run, or nothing."""
    book = books["CAL-B"]
    name = f"{book.record.issue_id} run5"
    rise = book.readings["run5.instrument_rise"]
    log = [
        row(book, "run5", "sample_mass", called=name, by="BAL-1"),
        row(book, "run5", "instrument_rise", unit="K", called="", by="CAL-B", quantity="rise", minutes=1),
        row(book, "run6", "instrument_rise", unit="mK", called="", by="CAL-B", quantity="rise", minutes=1,
            value=1000.0 * book.readings["run6.instrument_rise"]),
    ]  # fmt: skip
    assert told(verdict(book, tmp_path, log)) == []
    wrong = {"run5.instrument_rise": round(rise + 0.01, 4), "run5.sample_mass": 1.0, "run5.crucible_gross": None}
    found = told(verdict(book, tmp_path, log, wrong))
    assert {one.field for one in found} == {"run5.instrument_rise", "run5.sample_mass"}
    assert {one.expected for one in found} == {rise, book.readings["run5.sample_mass"]}


def test_a_run_that_is_on_no_workbook(books: dict[str, Book], tmp_path: Path) -> None:
    """The third firing of a sample stayed in a drawer: said once, at the sample, with the log's name of the run."""
    book = books["CAL-B"]
    log = [row(book, run, "instrument_rise", unit="K", by="CAL-B", quantity="rise") for run in RUNS]
    third = "2025-03-03T16:20,CAL-B,mon-S-2501-3,rise,2.4001,K"
    assert told(verdict(book, tmp_path, log)) == []
    found = verdict(book, tmp_path, [*log, third, third.replace("rise,2.4001,K", "sample_mass,1.0,g")])
    (one,) = told(found)
    assert (one.code, one.field, one.found) == ("log-run-missing", "sample2.sample_id", "mon-S-2501-3")
    assert "2025-03-03 16:20" in one.message and "runs here: 2" in one.message and found.verdict == "hold"


def test_a_run_that_stands_on_an_earlier_workbook_is_not_missing(books: dict[str, Book], tmp_path: Path) -> None:
    """The same log beside a second workbook of the sample, checked or as history: its runs are known."""
    first, other = books["CAL-A"], books["CAL-B"]
    for name, book in (("a.xlsx", first), ("b.xlsx", other)):
        write(tmp_path, book.data(), name)
    named = [(book, run, f"{book.record.issue_id} {run}") for book in (first, other) for run in RUNS]
    log = [row(book, run, "sample_mass", by="BAL-1", called=called) for book, run, called in named]
    (tmp_path / "log.csv").write_text("\n".join([HEAD, *log, "2025-03-03T16:20,CAL-B,S-2501-x,rise,2.4,K"]), "utf-8")
    for past in ([], [str(tmp_path / "b.xlsx")]):
        files = [str(tmp_path / "a.xlsx")] if past else [str(tmp_path / "a.xlsx"), str(tmp_path / "b.xlsx")]
        checked = Against(second=second(str(tmp_path) if past else None, str(tmp_path / "log.csv")))
        found = [one for verdict in check_set(files, checked, past) for one in told(verdict)]
        assert [(one.code, one.found) for one in found] == [("log-run-missing", "S-2501-x")]


def test_the_clock_of_the_log(books: dict[str, Book], tmp_path: Path) -> None:
    """A run typed two hours off the instrument's time is told; summer time or a wrong clock for all runs is not."""
    book = books["CAL-B"]

    def log(minutes: dict[str, int]) -> list[str]:
        names = {run: f"{book.record.issue_id} {run}" for run in RUNS}
        return [
            row(
                book,
                run,
                "instrument_rise",
                unit="K",
                by="CAL-B",
                quantity="rise",
                called=names[run],
                minutes=minutes[run],
            )
            for run in RUNS
        ]

    assert told(verdict(book, tmp_path, log(dict.fromkeys(RUNS, 62)))) == []
    assert told(verdict(book, tmp_path, log(dict.fromkeys(RUNS, 121)))) == []
    (one,) = told(verdict(book, tmp_path, log({**dict.fromkeys(RUNS, 1), "run6": 121})))
    assert (one.field, one.severity) == ("run6.start", "warning") and "121 min after" in one.message


def test_a_log_that_is_none_is_refused(tmp_path: Path) -> None:
    """Missing columns, a decimal comma, an unknown unit: each with its line, before any workbook is read."""
    path = tmp_path / "log.csv"
    for text, words in (
        ("time,instrument\n", "missing"),
        (f'{HEAD}\n2025-03-03T09:00,BAL-2,a,water,"2000,0",g\n', "decimal comma"),
        (f"{HEAD}\n2025-03-03T09:00,BAL-2,a,water,2000.0,stone\n", "stone"),
    ):
        path.write_text(text, "utf-8")
        with pytest.raises((BadInputs, SheetcalError)) as caught:
            second(None, str(path))
        assert words in str(caught.value)
