"""LibreOffice is killed at random moments while a folder is checked: every file ends with a true verdict."""

from __future__ import annotations

import contextlib
import json
import os
import random
import shutil
import signal
import threading
from pathlib import Path
from typing import Any

import pytest
from witness_case import KINDS, workbook

from sheetcal.cli import main
from sheetcal.office.pool import Pool
from sheetcal.verbs import fourth
from sheetcal.verbs.checking import Against, check_path
from sheetcal.verbs.demo_slips import type_over

pytestmark = pytest.mark.office
TWICE = "silent: office failed twice"
EACH = 8  # of so many files one is opened
DISTINCT = 15  # workbooks; the folder holds copies of them


class Killer:
    """Kills one LibreOffice of a pool after the other, each at a moment drawn at random, so many in all."""

    def __init__(self, pool: Pool, kills: int, seconds: float) -> None:
        self.pool, self.left, self.seconds = pool, kills, seconds
        self.chance = random.Random(7)
        self.done = threading.Event()
        self.thread = threading.Thread(target=self._work, daemon=True)

    def _work(self) -> None:
        while self.left and not self.done.wait(self.chance.uniform(0.0, 2.0 * self.seconds)):
            pids = self.pool.engine_pids()
            if pids:
                with contextlib.suppress(ProcessLookupError):
                    os.kill(self.chance.choice(pids), signal.SIGKILL)
                    self.left -= 1


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory, sizes: dict[str, Any]) -> Path:
    """Sound workbooks of every kind, and every eighth file with a result typed over, so that it is opened."""
    made = tmp_path_factory.mktemp("made")
    distinct = [workbook(made, KINDS[number % len(KINDS)], number // len(KINDS)) for number in range(DISTINCT)]
    place = tmp_path_factory.mktemp("checked")
    for number in range(sizes["office_killed_files"]):
        copy = place / f"{number:03d}.xlsx"
        shutil.copy(distinct[number % DISTINCT], copy)
        if number % EACH == EACH - 1:
            line = check_path(str(copy), Against()).results[-1]
            type_over(copy, *line.cell.split("!"), 5.0)
    return place


def checked(folder: Path, out: Path, office: str) -> list[dict[str, Any]]:
    """The files of the document that a `check` of the folder writes."""
    assert main(["check", str(folder), "--office", office, "--json", str(out)]) in (0, 1)
    files: list[dict[str, Any]] = json.loads(out.read_text("utf-8"))["files"]
    return files


def test_every_file_ends_with_a_true_verdict(
    folder: Path, tmp_path: Path, sizes: dict[str, Any], monkeypatch: pytest.MonkeyPatch
) -> None:
    """Verdicts, findings and values are those of an undisturbed check; where two were killed on a file, it says so.

    The folder is checked until all kills have struck.
    """
    calm = checked(folder, tmp_path / "calm.json", "never")
    assert sum(map(is_typed_over, calm)) == len(calm) // EACH
    silent = rounds = 0
    with Pool(2) as pool:
        monkeypatch.setattr(fourth, "shared_pool", lambda: pool)
        killer = Killer(pool, sizes["office_check_kills"], 0.8)
        killer.thread.start()
        while killer.left and rounds < 20:
            rounds += 1
            files = checked(folder, tmp_path / f"{rounds}.json", "auto")
            assert len(files) == len(calm) == sizes["office_killed_files"]
            for before, after in zip(calm, files, strict=True):
                silent += true_verdict(before, after)
        killer.done.set()
        killer.thread.join()
        struck = sizes["office_check_kills"] - killer.left
        afterwards = checked(folder, tmp_path / "after.json", "auto")
    print(f"\n{struck} kills over {rounds} checks of {len(calm)} files; silent {silent} times")
    assert struck == sizes["office_check_kills"]
    assert silent <= struck // 2
    assert all("office" in one["witnesses"] for one in afterwards)


def is_typed_over(one: dict[str, Any]) -> bool:
    """Whether a formula of the file was typed over."""
    return any(found["code"] == "result-typed-over" for found in one["findings"])


def true_verdict(before: dict[str, Any], after: dict[str, Any]) -> bool:
    """Holds the verdict of one file to be true; whether LibreOffice was silent on it."""
    for key in ("file", "verdict", "sound", "complete", "findings", "sha256"):
        assert after[key] == before[key], after["file"]
    spoke = after["witness_notes"]["office"]
    assert spoke in ("opened" if is_typed_over(before) else "template", TWICE), after["file"]
    assert ("office" in after["witnesses"]) == (spoke != TWICE)
    for ours, theirs in zip(before["results"], after["results"], strict=True):
        assert theirs["formula"] == ours["formula"]
        if spoke != TWICE and isinstance(ours["formula"], float):
            assert theirs["office"] == pytest.approx(ours["formula"], rel=1e-9, abs=1e-9), theirs["id"]
            assert theirs["agrees"] == (ours["agrees"] is not False)
    return spoke == TWICE
