"""Recompute workbooks along the chain certificate -> calibration -> heat capacity and aid lots -> fuel."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping
from concurrent.futures import ProcessPoolExecutor
from dataclasses import dataclass, field
from itertools import repeat
from pathlib import Path

from sheetcal.archive.changed import Changes, Recomputed, changes
from sheetcal.archive.rows import Row, rows
from sheetcal.check.completeness import missing
from sheetcal.check.replay import replay
from sheetcal.check.submission import Submission, take_apart
from sheetcal.errors import SheetcalError
from sheetcal.excel.reader import read
from sheetcal.inputs.lab import Lab
from sheetcal.model import Value


@dataclass
class Outcome:
    """What came of one workbook; `reason` says why it was not recomputed."""

    file: str
    rows: list[Row] = field(default_factory=list)
    compared: int = 0
    reason: str = ""
    unreadable: bool = False
    complete: bool = True
    means: dict[tuple[str, str], tuple[float, str]] = field(default_factory=dict)
    changed: dict[str, Value] = field(default_factory=dict)
    causes: dict[str, str] = field(default_factory=dict)


def recompute(files: Iterable[str], lab: Lab | None, workers: int = 1) -> Iterator[Outcome]:
    """An outcome for each file in file order; calibrations first, so that their means serve the rest."""
    listed = list(files)
    first = {one.file: one for one in _all(listed, lab, Recomputed(), True, workers)}
    chain = Recomputed({key: mean for one in first.values() for key, mean in one.means.items()})
    later = [one for one in listed if first[one].reason == FUEL]
    rest = {one.file: one for one in _all(later, lab, chain, False, workers)}
    for name in listed:
        yield rest.get(name, first[name])


FUEL = "stands on calibrations"


def _all(files: list[str], lab: Lab | None, chain: Recomputed, calibrations: bool, workers: int) -> Iterator[Outcome]:
    if workers <= 1 or len(files) < 2:
        yield from (one_file(file, lab, chain, calibrations) for file in files)
        return
    with ProcessPoolExecutor(workers) as pool:
        yield from pool.map(one_file, files, repeat(lab), repeat(chain), repeat(calibrations), chunksize=4)


def one_file(file: str, lab: Lab | None, chain: Recomputed, calibrations: bool) -> Outcome:
    """Recompute one workbook; in the first pass (`calibrations`) fuel workbooks are only put off."""
    try:
        sheet = read(Path(file))
        parts = take_apart(sheet, file)
    except SheetcalError as fault:
        return Outcome(file, reason=fault.what, unreadable=True, complete=False)
    if calibrations and "aid" in parts.kind.tables:
        return Outcome(file, reason=FUEL)
    return _outcome(file, sheet.sha256, parts, lab, chain)


def _outcome(file: str, sha256: str, parts: Submission, lab: Lab | None, chain: Recomputed) -> Outcome:
    found = changes(parts.record, lab, chain)
    before = replay(parts)
    after = replay(parts, found.values) if found.values else before
    open_ids = missing(parts.kind, parts.skeleton, parts.record, parts.readings)
    return Outcome(
        file,
        list(rows(file, sha256, parts, before, after, found)),
        compared=sum(1 for value in before.values() if value is not None),
        complete=not open_ids,
        reason=f"incomplete: {len(open_ids)} readings missing" if open_ids else "",
        means=_means(parts, after, found),
        changed=found.values,
        causes=found.causes,
    )


def _means(parts: Submission, after: Mapping[str, Value], found: Changes) -> dict[tuple[str, str], tuple[float, str]]:
    """The recomputed heat capacity a calibration workbook proves, by issue id and vessel."""
    mean, vessel = after.get("sheet.effective_heat_capacity_reported"), parts.readings.get("sheet.vessel")
    if parts.record.kind != "calibration" or not isinstance(mean, int | float) or vessel is None:
        return {}
    causes = "; ".join(dict.fromkeys(found.causes.values()))
    return {(parts.record.issue_id, str(vessel)): (float(mean), causes)} if causes else {}
