"""`selftest`: every certain fault planted in fresh workbooks of every kind, checked, and the outcome kept."""

from __future__ import annotations

import csv
import sys
import tempfile
from collections.abc import Iterable, Iterator, Mapping
from concurrent.futures import ProcessPoolExecutor
from dataclasses import dataclass, replace
from datetime import UTC, datetime
from functools import cache
from pathlib import Path

from sheetcal.errors import BadInput
from sheetcal.inputs import read_lab, read_worklist
from sheetcal.kinds import names
from sheetcal.model import Finding, Verdict
from sheetcal.planting import Sheet, Slip, Spot, every, fresh
from sheetcal.verbs import Output
from sheetcal.verbs.checking import Against, check_path
from sheetcal.verbs.demo_week import demo_folder
from sheetcal.verbs.issuing import Order, build

PLACES, CLEAN = 5, 5  # places of each slip in a workbook; clean workbooks of each kind
MOMENT = datetime(2025, 3, 3, 6, 30)  # a Monday on which everything in the demonstration's lab file is in force
FUELS = (("coal", "coke"), ("sludge",))  # samples of the fuel workbooks; the sludge is burnt with an aid
COLUMNS = ("sample_id", "role", "fuel_class", "expected_gross")


@dataclass(frozen=True)
class Planted:
    """One slip in one place: what had to be found, and what was."""

    kind: str
    slip: str
    code: str
    at: str
    sheet: str
    cell: str
    found: bool
    right_cell: bool
    cause_wanted: bool
    cause_named: bool
    cause: str
    besides: tuple[str, ...]

    @property
    def missed(self) -> bool:
        """Whether the fault was not found, or not where it was made."""
        return not (self.found and self.right_cell)


@dataclass(frozen=True)
class Outcome:
    """All that a self-test found out."""

    planted: tuple[Planted, ...]
    clean: int
    accused: tuple[str, ...]
    nowhere: tuple[tuple[str, str, str], ...]

    @property
    def whole(self) -> bool:
        """Every fault found at every place, every clean workbook sound."""
        return bool(self.planted) and all(one.found for one in self.planted) and not self.accused


def run(into: str, places: int = PLACES, clean: int = CLEAN, workers: int = 2) -> Output:
    """Plant, check, write record and matrix; the last page as output."""
    from sheetcal.verbs import selftest_record

    folder = Path(into)
    if folder.exists() and not folder.is_dir():
        raise BadInput(into, "is a file", "a folder", "Choose another.")
    if places < 1:
        raise BadInput("--places", f"{places}", "1 or more", "Correct it.")
    if workers < 1:
        raise BadInput("--workers", f"{workers}", "1 or more", "Correct it.")
    if not folder.parent.is_dir():
        raise BadInput(into, "its folder does not exist", "an existing folder", "Make it first.")
    folder.mkdir(exist_ok=True)
    started = datetime.now(UTC)
    tested = test(tuple(names()), places, clean, workers)
    lines = selftest_record.write(folder, tested, started, {"places": places, "clean": clean})
    return Output(tuple(lines), 0 if tested.whole else 1)


def test(kinds: tuple[str, ...], places: int, clean: int, workers: int = 1) -> Outcome:
    """Every slip of these kinds at so many places, and so many clean workbooks of each."""
    jobs = [(kind, slip.name, places) for kind in kinds for slip in slips(kind)]
    planted: list[Planted] = []
    nowhere: list[tuple[str, str, str]] = []
    for number, (job, found) in enumerate(_done(jobs, workers), start=1):
        planted += found
        if not found:
            nowhere.append((job[0], job[1], _slip(job[0], job[1]).code))
        _progress(number, len(jobs))
    accused = [text for kind in kinds for seed in range(clean) for text in _accused(kind, seed)]
    return Outcome(tuple(planted), clean * len(kinds), tuple(accused), tuple(nowhere))


Job = tuple[str, str, int]


def _done(jobs: list[Job], workers: int) -> Iterator[tuple[Job, list[Planted]]]:
    if workers == 1:
        yield from ((job, plant(*job)) for job in jobs)
        return
    with ProcessPoolExecutor(workers) as pool:
        yield from zip(jobs, pool.map(_plant, jobs), strict=True)


def _plant(job: Job) -> list[Planted]:
    return plant(*job)


def _progress(number: int, of: int) -> None:
    if sys.stderr.isatty():
        sys.stderr.write("\r\x1b[K" if number == of else f"\rplanted {number} of {of} sorts of slip")


@cache
def sheets(kind: str) -> tuple[Sheet, ...]:
    """Fresh workbooks of a kind, filled; of fuel two, since not every slip can happen with every fuel."""
    lab = read_lab(demo_folder() / "lab.toml")
    if kind != "fuel":
        calorimeter = "CAL-A" if kind == "calibration" else None
        return (fresh(build(Order(kind, lab=lab, calorimeter=calorimeter, moment=MOMENT))),)
    found = []
    with tempfile.TemporaryDirectory() as folder:
        for fuels in FUELS:
            worklist = Path(folder) / "worklist.csv"
            rows = [("BA-31", "control", "", "26456"), *((f"S-{fuel}", "sample", fuel, "") for fuel in fuels)]
            with worklist.open("w", encoding="utf-8", newline="") as stream:
                csv.writer(stream).writerows([COLUMNS, *rows])
            order = Order(kind, lab=lab, worklist=read_worklist(worklist), calorimeter="CAL-A", moment=MOMENT)
            found.append(fresh(build(order)))
    return tuple(found)


@cache
def slips(kind: str) -> tuple[Slip, ...]:
    """The slips that happen in a kind."""
    return tuple(every(sheets(kind)[0]))


def _slip(kind: str, name: str) -> Slip:
    return next(one for one in slips(kind) if one.name == name)


def places_of(kind: str, slip: Slip, most: int) -> tuple[Sheet, list[Spot]]:
    """The first workbook of the kind in which the slip can happen, and where."""
    for sheet in sheets(kind):
        spots = slip.places(sheet, most)
        if spots:
            return sheet, spots
    return sheets(kind)[0], []


def plant(kind: str, name: str, most: int) -> list[Planted]:
    """One slip at its places, each in a workbook of its own."""
    slip = _slip(kind, name)
    sheet, spots = places_of(kind, slip, most)
    return [_judged(sheet, slip, spot) for spot in spots]


def _judged(sheet: Sheet, slip: Slip, spot: Spot) -> Planted:
    data = sheet.planted(spot)
    try:
        return judged(sheet, slip, spot, checked(data).findings)
    except Exception as fault:  # a check that stops has not found anything; the test goes on and says so
        said = f"the check stopped: {type(fault).__name__}: {fault}"
        return replace(judged(sheet, slip, spot, ()), cause=said)


def checked(data: bytes) -> Verdict:
    """The verdict on a workbook given as bytes."""
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / "planted.xlsx"
        path.write_bytes(data)
        return check_path(str(path), Against())


def judged(sheet: Sheet, slip: Slip, spot: Spot, findings: Iterable[Finding]) -> Planted:
    """What the findings say of a slip: its code, its cell, its cause."""
    tab, cell = sheet.where(spot.at)
    listed = list(findings)
    hits = [one for one in listed if one.code in (slip.code, *slip.also) and one.certain]
    there = [one for one in hits if not spot.at or (one.sheet, one.cell or "") == (tab, cell)]
    said = [text for one in there for text in (one.likely_cause, *one.causes) if text]
    named = any(word in text for text in said for word in spot.cause)
    besides = tuple(dict.fromkeys(one.code for one in listed if one not in hits))
    return Planted(
        sheet.kind, slip.name, slip.code, spot.at, tab, cell, bool(hits), bool(there), bool(spot.cause), named,
        said[0] if said else "", besides,
    )  # fmt: skip


def _accused(kind: str, seed: int) -> list[str]:
    """What is said of a clean workbook; nothing must be."""
    every_one = sheets(kind)
    sheet = fresh(every_one[seed % len(every_one)].record, seed + 100)
    verdict = checked(sheet.planted())
    said = [f"{kind}, seed {seed + 100}: {one.code} {one.field or ''}" for one in verdict.findings if _fault(one)]
    return said or ([] if verdict.sound else [f"{kind}, seed {seed + 100}: {verdict.verdict}"])


def _fault(one: Finding) -> bool:
    return one.certain and one.sort == "fault"


def by_code(planted: Iterable[Planted]) -> Mapping[tuple[str, str], list[Planted]]:
    """The matrix: what was planted, by code and kind."""
    cells: dict[tuple[str, str], list[Planted]] = {}
    for one in planted:
        cells.setdefault((one.code, one.kind), []).append(one)
    return cells
