"""After a certificate was corrected, everything that stands on it moves, and nothing else."""

from __future__ import annotations

from pathlib import Path

import pytest
from archive_case import Done, gathered, recompute, relative

from sheetcal.verbs.demo_week import Week

CERTIFICATE = 100.0 * (26429.0 / 26436.0 - 1.0)  # -0.0265 %
ROUNDING = 100.0 * 0.06 / 8800.0  # heat capacities are adopted to 0.1 J/K
BOOKS = ("C1", "C2", "C3", "W1", "W7", "W8", "W11", "SH1", "VP1", "HB1")


@pytest.fixture(scope="module")
def done(week: Week, corrected: Path, tmp_path_factory: pytest.TempPathFactory) -> Done:
    folder = tmp_path_factory.mktemp("chain")
    return recompute(gathered(week, folder / "archive", BOOKS), folder / "out", corrected)


def test_calibrations_with_the_corrected_lot_move_by_its_correction(done: Done) -> None:
    """The January and September calibrations move by -0.0265 % times their sensitivity, which is near 1."""
    for book in ("C1", "C2", "C3"):
        row = done.of(book)["sheet.effective_heat_capacity"]
        assert relative(row) == pytest.approx(0.996 * CERTIFICATE, abs=0.0005)
        assert row["cause"] == "certificate BA-31 26436 -> 26429 J/g"
        assert row["sample_id"] == "" and row["calorimeter"] in ("CAL-A", "CAL-B")


def test_everything_calibrated_with_it_moves_with_its_calibration(done: Done, week: Week) -> None:
    """Gross values of CAL-A move by -0.0265 %: -7 J/g at 26.5 MJ/kg; the cause names each vessel's own calibration."""
    book = done.of("W1")
    vessels = {"run1": "A1", "run2": "A2"}
    for run, row in ((one.partition(".")[0], row) for one, row in book.items() if one.endswith(".gross_run")):
        assert relative(row) == pytest.approx(CERTIFICATE, abs=0.002)
        cause = book[f"{run}.effective_heat_capacity"]["cause"]
        assert row["cause"] == cause
        assert cause.count("->") == 3 and cause.startswith("certificate BA-31 26436 -> 26429 J/g -> calibration ")
        vessels[run] = cause[-2:]
    for vessel, name in (("A1", "C1"), ("A2", "C2")):
        causes = {book[f"{run}.effective_heat_capacity"]["cause"] for run, one in vessels.items() if one == vessel}
        assert causes == {f"certificate BA-31 26436 -> 26429 J/g -> calibration {week.ids[name]} -> vessel {vessel}"}
    coal = book["sample3.gross_dry"]
    assert float(coal["change"]) / float(coal["old"]) * 26500 == pytest.approx(-7.0, abs=0.2)


def test_a_control_and_its_target_move_together(done: Done) -> None:
    """W1's controls were burnt in vessels calibrated with the same lot: their deviation stays."""
    book = done.of("W1")
    assert relative(book["sample1.control_target"]) == pytest.approx(CERTIFICATE, abs=1e-6)
    assert abs(float(book["sample1.control_deviation_mean"]["change"])) < 0.002


def test_samples_on_the_other_lot_stay_and_their_control_moves(done: Done) -> None:
    """W11 was calibrated with BA-32: samples stay; its control, burnt with BA-31, moves +0.026 % against its target."""
    book = done.of("W11")
    assert {row["sample_id"] for row in book.values()} == {"BA-31"}
    assert "run1.gross_run" not in book
    assert float(book["run1.control_deviation"]["change"]) == pytest.approx(0.0265, abs=0.0005)
    assert float(book["sample1.control_target"]["change"]) == pytest.approx(-7.0, abs=0.02)


def test_the_calibration_with_the_other_lot_stays(done: Done) -> None:
    """W7's own mean (BA-32) stays; only its comparison with the value in force before it moves."""
    book = done.of("W7")
    assert set(book) == {"sheet.heat_capacity_in_force", "sheet.change"}
    assert "calibration" in book["sheet.change"]["cause"]


def test_an_aid_on_the_corrected_lot_moves_its_sample_as_well(done: Done) -> None:
    """S-2509 was burnt with BA-31: its aid moves by the certificate, its gross value by both together."""
    book = done.of("W8")
    runs = [
        one.partition(".")[0]
        for one, row in book.items()
        if one.endswith(".gross_run") and row["sample_id"] == "S-2509"
    ]
    assert len(runs) == 2
    for run in runs:
        aid, total, gross = (book[f"{run}.{name}"] for name in ("aid1_heat", "total_heat", "gross_run"))
        assert relative(aid) == pytest.approx(CERTIFICATE, abs=1e-6)
        mass = (float(total["old"]) - float(aid["old"])) / float(gross["old"])
        expected = (float(total["change"]) - float(aid["change"])) / mass
        assert float(gross["change"]) == pytest.approx(expected, rel=0.02)
        assert gross["cause"].endswith("; certificate BA-31 26436 -> 26429 J/g -> aid BA-31")
        assert "calibration" in gross["cause"] and "aid" not in total["cause"]


def test_kinds_without_certificate_stay(done: Done) -> None:
    """Specific heat, boiling and heat balance stand on no certificate: not one row."""
    assert not done.of("SH1") and not done.of("VP1") and not done.of("HB1")
    assert done.summary["files"]["recomputed"] == len(BOOKS)


def test_a_lost_calibration_is_replaced_by_its_recorded_sensitivity(
    week: Week, corrected: Path, tmp_path: Path
) -> None:
    """Without the calibration workbooks the sensitivity serves, and the cause says so."""
    done = recompute(gathered(week, tmp_path / "archive", ["W1"]), tmp_path / "out", corrected)
    row = done.of("W1")["run1.effective_heat_capacity"]
    assert relative(row) == pytest.approx(0.996 * CERTIFICATE, abs=0.0005)
    assert row["cause"].endswith("by recorded sensitivity (calibration workbook not found)")


def test_two_copies_that_disagree_serve_nobody(week: Week, corrected: Path, tmp_path: Path) -> None:
    """Two workbooks of one issue id with different means: the sensitivity serves, and the cause says why."""
    from sheetcal import verbs

    archive = gathered(week, tmp_path / "archive", ["C1", "W1"])
    data = tmp_path / "data.csv"
    data.write_text("field,value,unit\nrun1.burette_end,9.90,mL\n", "utf-8")
    copy = str(archive / "C1 (1).xlsx")
    verbs.fill(str(archive / "C1.xlsx"), str(data), amend=True, reason="a second reading", out=copy)
    causes = {row["cause"] for row in recompute(archive, tmp_path / "out", corrected).of("W1").values()}
    assert any("A1 by recorded sensitivity (its workbooks disagree)" in cause for cause in causes)


def test_a_restated_calibration_wins_over_its_workbook(week: Week, corrected: Path, tmp_path: Path) -> None:
    """Where the new lab file states the calibration itself, that value is taken, workbook found or not."""
    lab = tmp_path / "lab.toml"
    head, mark, block = corrected.read_text("utf-8").partition(f'issue = "{week.ids["C1"]}"\nvalue = "')
    lab.write_text(head + mark + "10000.0 J/K" + block[block.index('"') :], "utf-8")
    done = recompute(gathered(week, tmp_path / "archive", ["C1", "C2", "W1"]), tmp_path / "out", lab)
    rows = [row for one, row in done.of("W1").items() if one.endswith(".effective_heat_capacity")]
    restated = [row for row in rows if row["new"] == "10000.0"]
    assert restated and len(restated) < len(rows)
    assert all("restated" in row["cause"] for row in restated)
    assert all("vessel A2" in row["cause"] for row in rows if row not in restated)


def test_without_a_lab_file_nothing_changes(week: Week, tmp_path: Path) -> None:
    """Any row then comes from the stored values or the tool; a right archive gives none."""
    done = recompute(gathered(week, tmp_path / "archive", BOOKS), tmp_path / "out", None)
    assert (done.code, done.rows, done.summary["lab"]) == (0, [], None)
    assert done.summary["results"]["compared"] > 1000


def test_the_lab_file_of_the_day_changes_nothing(week: Week, tmp_path: Path) -> None:
    """Later calibrations of the same file are other identities: they never replace an earlier one."""
    done = recompute(gathered(week, tmp_path / "archive", BOOKS), tmp_path / "out", week.lab)
    assert (done.code, done.rows) == (0, [])


def test_another_mass_convention_of_a_certificate_moves_what_stands_on_it(week: Week, tmp_path: Path) -> None:
    """BA-32 restated as a value in vacuum: the calibration moves by buoyancy, +0.076 %."""
    lab = tmp_path / "lab.toml"
    text = week.lab.read_text("utf-8")
    head, mark, rest = text.partition('lot = "BA-32"')
    lab.write_text(head + mark + rest.replace('mass = "in air"', 'mass = "in vacuum"', 1), "utf-8")
    done = recompute(gathered(week, tmp_path / "archive", ["W7", "W11"]), tmp_path / "out", lab)
    assert relative(done.of("W7")["sheet.effective_heat_capacity"]) == pytest.approx(0.0757, abs=0.001)
    moved = [relative(row) for one, row in done.of("W11").items() if one.endswith(".effective_heat_capacity")]
    assert moved == [pytest.approx(0.076, abs=0.002)] * 3
