"""The demonstration plays through: every slip a workbook can show is found, every right sheet is believed."""

from __future__ import annotations

import csv
import hashlib
import json
from pathlib import Path
from typing import Any

import pytest

from sheetcal.errors import Refused
from sheetcal.verbs import Output
from sheetcal.verbs.playing import run

LEFT = (
    "lab.toml", "lab-corrected.toml", "worklist.csv", "loggers", "data", "sources.csv", "issued", "filled", "submitted",
    "planted.csv", "check.json", "check.txt", "archive", "recomputed", "register.sqlite",
)  # fmt: skip


# What right workbooks still show, (code, block), and nothing else.
RIGHT_FINDINGS: dict[str, list[tuple[str, str]]] = {
    "W2-coke": [("reading-out-of-range", "sample2")],
    "W2-charcoal": [("reading-out-of-range", "sample1")],
    "W3": [("calorimeter-water", "run13"), ("calorimeter-water", "run14"), ("moisture-order", "sample2")],
    "W5": [("calorimeter-water", "run1")],
    "W6": [("reading-out-of-range", "sample1")],
    "W8": [("control-warning", "run1")],
    "W10-waste": [("aid-share", "run5"), ("aid-share", "run6")],
    "W10-unknown": [("one-more-run", "sample1"), ("reading-missing", "run2"), ("rise-range", "run1")],
    "W11": [("reading-out-of-range", "sample2")],
}


def test_every_slip_looked_for_is_found(played: tuple[Path, Output]) -> None:
    """Exit code 0: all slips found, all right workbooks with the verdict listed for them."""
    _, output = played
    page = "\n".join(output.lines)
    assert "NOT FOUND" not in page
    assert "slips looked for" in page
    assert output.code == 0, page


def test_what_it_leaves_behind(played: tuple[Path, Output], sizes: dict[str, Any]) -> None:
    """The folder holds what the contract lists, and no temporary file."""
    folder, _ = played
    assert all((folder / name).exists() for name in LEFT)
    assert len(list((folder / "archive").glob("*.xlsx"))) == sizes["demo_archive"]
    assert not list(folder.rglob(".*"))
    rows = list(csv.DictReader((folder / "planted.csv").read_text("utf-8").splitlines()))
    assert len(rows) == 30
    document = json.loads((folder / "check.json").read_text("utf-8"))
    assert document["summary"]["files"] == 19
    with (folder / "sources.csv").open(encoding="utf-8") as stream:
        sources = list(csv.DictReader(stream))
    assert len(sources) >= sizes["demo_archive"]
    assert all("Ghugare" in row["source"] for row in sources)


def test_right_workbooks_show_only_what_is_listed(played: tuple[Path, Output]) -> None:
    """Nothing beyond the list of what right sheets still show."""
    from sheetcal.verbs.checking import Against, check_path

    folder, _ = played
    seen = 0
    for path in sorted((folder / "filled").glob("*.xlsx")):
        verdict = check_path(str(path), Against())
        found = sorted({(one.code, (one.field or "").partition(".")[0]) for one in verdict.findings})
        assert found == sorted(RIGHT_FINDINGS.get(path.stem, [])), path.stem
        seen += 1
    assert seen == 19


def test_recomputed_after_the_correction(played: tuple[Path, Output]) -> None:
    """What was burnt on BA-31 moves by -0.0265 %; W11's sample stands on BA-32 and stays, its control moves."""
    folder, _ = played
    with (folder / "recomputed" / "changes.csv").open(encoding="utf-8") as stream:
        rows = list(csv.DictReader(stream))
    coal = [row for row in rows if row["file"].endswith("W1.xlsx") and row["field"] == "sample2.gross_dry"]
    assert len(coal) == 1
    assert float(coal[0]["change_relative"]) == pytest.approx(-0.000265, abs=3e-6)
    w11 = [row for row in rows if row["file"].endswith("W11.xlsx")]
    assert not [row for row in w11 if row["field"].startswith("sample2.")]
    assert [row for row in w11 if row["field"] == "sample1.control_target"]
    sludge = [row for row in rows if row["file"].endswith("W8.xlsx") and row["field"] == "run5.aid1_heat"]
    assert len(sludge) == 1
    assert "BA-31" in sludge[0]["cause"]


def test_an_occupied_folder_is_refused(tmp_path: Path) -> None:
    """Nothing of the user's is touched."""
    kept = tmp_path / "mine.txt"
    kept.write_text("mine", "utf-8")
    before = hashlib.sha256(kept.read_bytes()).hexdigest()
    with pytest.raises(Refused, match="not empty"):
        run(str(tmp_path))
    assert hashlib.sha256(kept.read_bytes()).hexdigest() == before
    assert len(list(tmp_path.iterdir())) == 1
