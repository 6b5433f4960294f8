"""An aid lot found here joins the chain: certificate, calibration, the workbook that found it, all it was burnt in."""

from __future__ import annotations

import csv
import shutil
from datetime import datetime
from pathlib import Path

import pytest
from verbs_case import COAL, CONTROL, filled, lab_file, record_of

from sheetcal import verbs
from sheetcal.inputs import read_lab
from sheetcal.verbs.adopting import run
from sheetcal.verbs.workbook import open_workbook

AID = {"sample_id": "SO-2", "role": "aid-blank", "fuel_class": "liquid"}
CERTIFICATE = 26429.0 / 26436.0 - 1.0


@pytest.fixture(scope="module")
def laboratory(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A folder with the workbook that found SO-2, one that burnt it along, and the lab file before and after."""
    folder = tmp_path_factory.mktemp("aids")
    lab = lab_file(folder)
    (folder / "archive").mkdir()
    aid = filled(record_of("fuel", folder, [CONTROL, AID], lab=lab), folder / "archive" / "z-aid.xlsx")
    run(str(aid), str(lab), "HT", datetime(2025, 3, 4, 12))
    record = record_of("fuel", folder, [CONTROL, COAL], lab=lab, moment=datetime(2025, 3, 5, 7))
    filled(record, folder / "archive" / "a-coal.xlsx", run5__aid1_lot="SO-2", run5__aid1_mass=0.2)
    new = folder / "new.toml"
    new.write_text(lab.read_text("utf-8").replace("26436 J/g", "26429 J/g"), "utf-8")
    return folder


def recomputed(archive: Path, out: Path, lab: Path) -> dict[tuple[str, str], dict[str, str]]:
    """Rows of changes.csv by workbook and field."""
    assert verbs.recompute([str(archive)], str(out), str(lab)).code == 1
    with (out / "changes.csv").open(encoding="utf-8", newline="") as stream:
        return {(Path(row["file"]).stem, row["field"]): row for row in csv.DictReader(stream)}


def test_the_aid_takes_the_value_its_own_workbook_now_gives(laboratory: Path, tmp_path: Path) -> None:
    """The workbook comes later by name and is recomputed first; the aid takes its mean, rounded as adopted."""
    rows = recomputed(laboratory / "archive", tmp_path / "out", laboratory / "new.toml")
    found = float(rows["z-aid", "sample2.gross_analysed"]["new"])
    issue_id = open_workbook(laboratory / "archive" / "z-aid.xlsx").parts.record.issue_id
    heat = rows["a-coal", "run5.aid1_heat"]
    assert float(heat["new"]) == pytest.approx(0.2 * float(f"{found:.0f}"))
    assert heat["cause"].endswith(f" -> workbook {issue_id} -> aid SO-2")
    assert heat["cause"].startswith("certificate BA-31 26436 -> 26429 J/g")
    assert "aid SO-2" in rows["a-coal", "run5.gross_run"]["cause"]
    assert "aid SO-2" not in rows["a-coal", "run6.gross_run"]["cause"]


def test_where_that_workbook_is_lost_the_recorded_sensitivity_serves(laboratory: Path, tmp_path: Path) -> None:
    """The aid then moves by the certificate times the sensitivity that was adopted with it."""
    (tmp_path / "archive").mkdir()
    shutil.copy(laboratory / "archive" / "a-coal.xlsx", tmp_path / "archive")
    rows = recomputed(tmp_path / "archive", tmp_path / "out", laboratory / "new.toml")
    heat = rows["a-coal", "run5.aid1_heat"]
    sensitivity = read_lab(laboratory / "lab.toml").all_lots[-1].sensitivity
    assert sensitivity is not None
    assert float(heat["new"]) / float(heat["old"]) - 1.0 == pytest.approx(sensitivity * CERTIFICATE, rel=1e-6)
    assert heat["cause"] == "certificate BA-31 26436 -> 26429 J/g -> aid SO-2"


def test_a_lot_restated_in_the_lab_file_wins(laboratory: Path, tmp_path: Path) -> None:
    """What the new lab file says of the lot itself comes before its workbook and its certificate."""
    lab = tmp_path / "lab.toml"
    head, mark, rest = (laboratory / "new.toml").read_text("utf-8").rpartition('heat = "')
    lab.write_text(f"{head}{mark}40000 J/g{rest[rest.index(chr(34)) :]}", "utf-8")
    rows = recomputed(laboratory / "archive", tmp_path / "out", lab)
    heat = rows["a-coal", "run5.aid1_heat"]
    assert float(heat["new"]) == pytest.approx(8000.0) and heat["cause"].endswith("-> 40000 J/g")
