"""A part of the demonstration week, issued, filled and adopted once for all tests of this folder."""

from __future__ import annotations

import shutil
from pathlib import Path

import pytest

from sheetcal.verbs.demo_week import Week, demo_folder

PLAYED = ("C3", "C1", "C2", "W1", "W3", "W8", "W7", "W11", "SH1", "VP1", "HB1")


@pytest.fixture(scope="session")
def week(tmp_path_factory: pytest.TempPathFactory) -> Week:
    """The week's folder; `filled/` holds the workbooks named in PLAYED."""
    folder = tmp_path_factory.mktemp("week")
    source = demo_folder()
    for name in ("loggers", "data", "worklists"):
        shutil.copytree(source / name, folder / name)
    for name in ("issued", "filled"):
        (folder / name).mkdir()
    shutil.copy(source / "analysis.csv", folder)
    played = Week(folder)
    played.rows = {name: row for name, row in played.rows.items() if name in PLAYED}
    played.play()
    return played


@pytest.fixture(scope="session")
def corrected(week: Week) -> Path:
    """The lab file after the producer's correction of BA-31."""
    return week.folder / "lab-corrected.toml"
