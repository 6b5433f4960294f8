"""`selftest` leaves dated evidence: what was planted and found, what it stands on, what changed since the last one."""

from __future__ import annotations

import csv
import json
from datetime import UTC, datetime
from pathlib import Path

import pytest

from sheetcal import verbs
from sheetcal.cli import main
from sheetcal.excel.cellvalues import Cell
from sheetcal.excel.reader import read
from sheetcal.kinds import names
from sheetcal.planting import every
from sheetcal.verbs import selftest_record, selftesting
from sheetcal.verbs.selftesting import Outcome, Planted

KIND = "heat-balance"
SIZES = {"places": 1, "clean": 1}
NOON = datetime(2026, 3, 4, 12, tzinfo=UTC)
Evidence = tuple[Path, Outcome, list[str]]


@pytest.fixture(scope="module")
def evidence(tmp_path_factory: pytest.TempPathFactory) -> Evidence:
    """The test of one kind, written down: the folder, the outcome, the last page."""
    folder = tmp_path_factory.mktemp("evidence")
    outcome = selftesting.test((KIND,), places=1, clean=1)
    return folder, outcome, selftest_record.write(folder, outcome, NOON, SIZES)


def _record(folder: Path) -> dict[str, object]:
    found: dict[str, object] = json.loads(sorted(folder.glob("*-record.json"))[-1].read_text("utf-8"))
    return found


def test_the_record_says_what_it_stands_on(evidence: Evidence) -> None:
    """Date, versions of programs and packages, every kind and profile with version and hash, sizes, results."""
    record = _record(evidence[0])
    assert record["date"] == "2026-03-04T12:00:00Z"
    stands_on = record["environment"]
    assert isinstance(stands_on, dict)
    assert {"sheetcal", "Python", "numpy", "openpyxl", "pint", "pyoo", "LibreOffice"} <= set(stands_on)
    assert {f"kind {name}" for name in names()} <= set(stands_on)
    assert all("sha256" in value for key, value in stands_on.items() if key.startswith(("kind ", "profile ")))
    assert record["compared_with"] is None and record["whole"] is True
    assert isinstance(record["not_planted"], dict) and "control-drift" in record["not_planted"]


def test_the_matrix_is_there_three_times(evidence: Evidence) -> None:
    """Text, CSV and JSON say the same: a row for each fault planted."""
    folder, outcome, _ = evidence
    with next(folder.glob("*-matrix.csv")).open(encoding="utf-8", newline="") as stream:
        rows = list(csv.DictReader(stream))
    listed = json.loads(next(folder.glob("*-matrix.json")).read_text("utf-8"))
    assert len(rows) == len(listed) == len(outcome.planted) > 40
    assert [row["code"] for row in rows] == [row["code"] for row in listed]
    assert {row["found"] for row in rows} == {"yes"}
    text = next(folder.glob("*-matrix.txt")).read_text("utf-8")
    assert all(one.code in text for one in outcome.planted) and KIND in text.splitlines()[0]


def test_the_last_page_is_short(evidence: Evidence) -> None:
    """About ten lines, the outcome in the last one."""
    _, outcome, page = evidence
    assert 5 <= len(page) <= 14
    assert outcome.whole and outcome.clean == 1
    assert "every certain fault was found" in page[-1]


def test_a_second_record_says_what_changed(evidence: Evidence, monkeypatch: pytest.MonkeyPatch) -> None:
    """Another LibreOffice and a fault no longer found: both stand in the comparison; without a change it says so."""
    folder, outcome, _ = evidence
    same = selftest_record.write(folder, outcome, NOON.replace(hour=13), SIZES)
    assert any("no changes" in line for line in same)
    stands_on = {**selftest_record.environment(), "LibreOffice": "99.1"}
    monkeypatch.setattr(selftest_record, "environment", lambda: stands_on)
    lost = _lost(outcome.planted[0])
    page = selftest_record.write(folder, Outcome((lost, *outcome.planted[1:]), 1, (), ()), NOON.replace(hour=14), SIZES)
    changes = _record(folder)["changes"]
    assert isinstance(changes, list) and len(changes) == 2
    assert "re-validation was due: LibreOffice was" in changes[0] and "is 99.1" in changes[0]
    assert changes[1].startswith(f"{lost.code} {KIND}: ")
    assert any("NOT FOUND" in line for line in page) and "NOT everything was found" in page[-1]


def _lost(one: Planted) -> Planted:
    return Planted(one.kind, one.slip, one.code, one.at, one.sheet, one.cell, False, False, False, False, "", ())


def test_a_check_that_stops_is_a_fault_not_found(monkeypatch: pytest.MonkeyPatch) -> None:
    """The self-test goes on and says that the check stopped."""

    def stop(_: bytes) -> None:
        raise ZeroDivisionError("on purpose")

    monkeypatch.setattr(selftesting, "checked", stop)
    (one,) = selftesting.plant("vaporisation", "calculation by hand", 1)
    assert not one.found and "the check stopped: ZeroDivisionError" in one.cause


def test_slips_are_planted_as_a_program_computes(tmp_path: Path) -> None:
    """A planted reading gives the same cells as the workbook written anew with it, but for the table at a glance."""
    sheet = selftesting.sheets("vaporisation")[0]
    slip = next(one for one in every(sheet) if one.name == "decimal point forgotten")
    for spot in slip.places(sheet, 3):
        anew = type(sheet)(sheet.record, {**sheet.read, **spot.readings})
        planted, written = (_cells(tmp_path, data) for data in (sheet.planted(spot), anew.data))
        for tab in ("Readings", "Results", "Constants"):
            assert planted[tab] == written[tab]


def _cells(folder: Path, data: bytes) -> dict[str, dict[str, Cell]]:
    path = folder / "book.xlsx"
    path.write_bytes(data)
    return read(path).cells


def test_the_command_refuses_what_it_cannot_do(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """A file for a folder, a folder that is nowhere, no places, no workers: one line each, exit code 2."""
    (tmp_path / "file").write_text("x")
    for options in (
        ["--into", str(tmp_path / "file")], ["--into", str(tmp_path / "a" / "b")],
        ["--into", str(tmp_path), "--places", "0"], ["--into", str(tmp_path), "--workers", "0"],
    ):  # fmt: skip
        assert main(["selftest", *options]) == 2
        assert len(capsys.readouterr().err.splitlines()) == 1


def test_the_command_plants_in_every_kind(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """All kinds, with the places asked for; the exit code follows the outcome."""
    asked: list[tuple[object, ...]] = []

    def test(*given: object) -> Outcome:
        asked.append(given)
        return Outcome((_lost_anywhere(),), 0, (), ())

    monkeypatch.setattr(selftesting, "test", test)
    output = verbs.selftest(str(tmp_path / "evidence"), places=2, workers=1)
    assert output.code == 1
    assert asked == [(tuple(names()), 2, selftesting.CLEAN, 1)]
    assert len(list((tmp_path / "evidence").iterdir())) == 5


def _lost_anywhere() -> Planted:
    return Planted(KIND, "a slip", "formula-altered", "", "", "", False, False, False, False, "", ())
