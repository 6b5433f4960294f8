"""`demo`: the invented laboratory's week, played through with the same verbs a person uses."""

from __future__ import annotations

import contextlib
import io
import shutil
import sys
import time
from collections.abc import Iterator
from pathlib import Path

from sheetcal import verbs
from sheetcal.errors import BadInput, Refused
from sheetcal.verbs import Output
from sheetcal.verbs.demo_archive import build_archive
from sheetcal.verbs.demo_page import friday_page
from sheetcal.verbs.demo_slips import Planted, looked_for, plant
from sheetcal.verbs.demo_week import Week, demo_folder

ARCHIVE_SHEETS = 200


def run(folder: str, sheets: int = ARCHIVE_SHEETS) -> Output:
    """Play the week into an absent or empty folder; exit 0 when every slip looked for was found."""
    target = Path(folder)
    if target.exists() and (not target.is_dir() or any(target.iterdir())):
        raise Refused(folder, "is not empty", "an absent or empty folder", "Choose another.")
    if not target.parent.is_dir():
        raise BadInput(folder, "its folder does not exist", "an existing folder", "Make it first.")
    started = time.monotonic()
    _copy_inputs(demo_folder(), target)
    week = Week(target)
    with _step("issuing and filling the week's workbooks"):
        week.play()
    with _step("planting the slips"):
        planted = plant(week)
    with _step("checking what was submitted"):
        found = looked_for(week, planted)
    with _step(f"building an archive of {sheets} filled workbooks"):
        build_archive(week, sheets)
    with _step("recomputing after Friday's correction"):
        recomputed = verbs.recompute(
            [str(target / "archive"), str(target / "filled")],
            str(target / "recomputed"),
            str(target / "lab-corrected.toml"),
            workers=2,
        )
    lines = friday_page(week, found, recomputed.lines)
    spoke = any("office" in one.witnesses for one in found.verdicts.values())
    lines += _closing(spoke, time.monotonic() - started, target)
    return Output(tuple(lines), 0 if found.whole and week.right else 1)


def _closing(office: bool, seconds: float, target: Path) -> list[str]:
    engine = "LibreOffice was a witness" if office else "Everything here ran without LibreOffice"
    return [f"{engine}. {seconds:.0f} s; everything lies in {target}/ (all data invented, fuels.csv excepted)."]


@contextlib.contextmanager
def _step(text: str) -> Iterator[None]:
    """Progress on standard error; what verbs say to people is kept back."""
    sys.stderr.write(f"{text} ...\n")
    kept = io.StringIO()
    with contextlib.redirect_stderr(kept):
        yield


def _copy_inputs(source: Path, target: Path) -> None:
    """The inputs as a person would find them; the demonstration's own tables stay with the program."""
    target.mkdir(exist_ok=True)
    for name in ("loggers", "data", "worklists"):
        shutil.copytree(source / name, target / name, ignore=shutil.ignore_patterns("*.pyc"))
    for name in ("analysis.csv", "balance.csv", "fuels.csv"):
        shutil.copy(source / name, target / name)
    for name in ("issued", "filled", "submitted", "archive"):
        (target / name).mkdir()


__all__ = ["Planted", "run"]
