"""A folder with what the commands are tried on: workbooks made by the commands themselves, and files that are none."""

from __future__ import annotations

import shutil
from datetime import datetime
from pathlib import Path

import pytest

from sheetcal.cli import main
from sheetcal.verbs.demo_week import Week, demo_folder


@pytest.fixture(scope="session")
def bench(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Workbooks by name: `blank`, `filled` (a heat balance), `calibration` (filled) and its lab file; bad files."""
    folder = tmp_path_factory.mktemp("bench")
    demo = demo_folder()
    assert main(["issue", "heat-balance", "-o", str(folder / "blank.xlsx")]) == 0
    data = str(demo / "data" / "HB1.csv")
    assert main(["fill", str(folder / "blank.xlsx"), "--from", data, "-o", str(folder / "filled.xlsx")]) == 0
    assert main(["issue", "specific-heat", "-o", str(folder / "drop.xlsx"), "--runs", "2"]) == 0
    _calibration(folder, demo)
    (folder / "good.csv").write_text("field,value,unit\nbody1.mass,5,g\n", "utf-8")
    _bad_files(folder)
    return folder


def _calibration(folder: Path, demo: Path) -> None:
    """The demonstration's first calibration, filled, with the lab file before it was adopted."""
    week = folder / "week"
    week.mkdir()
    for name in ("issued", "filled", "submitted"):
        (week / name).mkdir()
    for name in ("loggers", "data", "worklists"):
        shutil.copytree(demo / name, week / name)
    played = Week(week)
    row = played.rows["C1"]
    played.issue("C1", datetime.fromisoformat(row["issued"]), week / "issued" / "C1.xlsx")
    played.fill("C1", week / "issued" / "C1.xlsx", played.filled("C1"))
    shutil.copy(played.filled("C1"), folder / "calibration.xlsx")
    shutil.copy(played.lab, folder / "lab.toml")


def _bad_files(folder: Path) -> None:
    whole = (folder / "blank.xlsx").read_bytes()
    (folder / "paper.xlsx").write_bytes(b"%PDF-1.7\n%\xe2\xe3\xcf\xd3\n1 0 obj\n<<>>\nendobj\n")
    (folder / "cut.xlsx").write_bytes(whole[: len(whole) // 2])
    (folder / "empty.xlsx").write_bytes(b"")
    (folder / "text.xlsx").write_text("mass,rise\n1,2\n", "utf-8")
    (folder / "none").mkdir()
    (folder / "none" / "notes.txt").write_text("no workbook\n", "utf-8")
    (folder / "plain.txt").write_text("a file that was here before\n", "utf-8")
    written = {
        "id.csv": "field,value,unit\nbody9.mass,5,g\n",
        "unit.csv": "field,value,unit\nbody1.mass,5,stone\n",
        "bare.csv": "field,value,unit\nbody1.specific_heat,1,cal/(g K)\n",
        "column.csv": "field,value,unit,colour\nbody1.mass,5,g,red\n",
        "comma.csv": 'field,value,unit\nbody1.mass,"5,2",g\n',
        "twice.csv": "field,value,unit\nbody1.mass,5,g\nbody1.mass,6,g\n",
        "locked.csv": "field,value,unit\nsheet.closure,5,%\n",
        "range.csv": "field,value,unit\nbody1.specific_heat,900,J/(g K)\n",
        "key.json": '{"body1.masss": "5 g"}',
        "broken.json": '{"body1.mass": ',
        "worklist.csv": "sample_id,colour\nS-1,red\n",
        "lab-key.toml": (folder / "lab.toml").read_text("utf-8").replace("[control]", "[control]\ncolour = 3", 1),
        "lab-broken.toml": "[laboratory\nname = 1\n",
        "logger.csv": "temp,time\n1,2\n",
    }
    for name, text in written.items():
        (folder / name).write_text(text, "utf-8")
