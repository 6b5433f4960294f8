"""Recompute workbooks along the chain certificate -> calibration -> heat capacity and aid lots -> fuel."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator
from concurrent.futures import ProcessPoolExecutor
from contextlib import ExitStack
from dataclasses import dataclass, field
from itertools import repeat
from typing import Any, TypeVar

from sheetcal.archive.changed import Changes, Recomputed
from sheetcal.archive.evaluate import Evaluated, evaluate
from sheetcal.archive.opening import Source, sources
from sheetcal.archive.rows import Row, rows
from sheetcal.archive.turn import AID_LOT, CALIBRATION, OTHER, turn
from sheetcal.check.completeness import missing
from sheetcal.check.submission import Submission, take_apart
from sheetcal.errors import SheetcalError
from sheetcal.inputs.lab import Lab
from sheetcal.model import Value

Result = TypeVar("Result")
AID_PLACES, VESSEL_PLACES = 0, 1  # as adopted: heats of aids in whole J/g, heat capacities to 0.1 J/K
TOGETHER = 4  # files handed to a worker at a time


@dataclass
class Outcome:
    """What came of one workbook; `reason` says why it was not (wholly) recomputed.

    `means` are heat capacities or aid heats it proves that moved, with their cause; `split` tells that its runs
    fall under different sets of constants. `later` marks a workbook whose turn has not come.
    """

    file: str
    rows: list[Row] = field(default_factory=list)
    compared: int = 0
    reason: str = ""
    unreadable: bool = False
    complete: bool = True
    later: bool = False
    split: bool = False
    means: dict[tuple[str, str], tuple[float, str]] = field(default_factory=dict)
    changed: dict[str, Value] = field(default_factory=dict)
    causes: dict[str, str] = field(default_factory=dict)

    @property
    def moved(self) -> bool:
        """True where at least one result moved."""
        return any(row.moved for row in self.rows)


def recompute(files: Iterable[str], lab: Lab | None, workers: int = 1) -> Iterator[Outcome]:
    """An outcome for each file in file order; what others stand on comes first, so that it serves them."""
    listed = list(files)
    with ExitStack() as stack:
        opened = stack.enter_context(sources(listed))
        found = dict(zip(listed, opened, strict=True))
        pool = stack.enter_context(ProcessPoolExecutor(workers)) if workers > 1 and len(listed) > 1 else None
        turns = dict(zip(listed, _map(pool, turn, [one.copy or one.file for one in opened]), strict=True))
        done: dict[str, Outcome] = {}
        chain = Recomputed()
        # Calibrations cite earlier ones: once their means are known, they are gone through again.
        for place in (CALIBRATION, CALIBRATION, AID_LOT):
            if place == CALIBRATION and done and not chain.means:
                continue
            early = [found[one] for one in listed if turns[one] == place]
            for one in _all(pool, early, lab, chain, place):
                if one.later:
                    turns[one.file] = place + 1
                else:
                    done[one.file] = one
            chain = _chain(done.values())
        rest = _all(pool, [found[one] for one in listed if one not in done], lab, chain, OTHER)
        for name in listed:
            yield done[name] if name in done else next(rest)


def _all(
    pool: ProcessPoolExecutor | None, files: list[Source], lab: Lab | None, chain: Recomputed, place: int
) -> Iterator[Outcome]:
    return _map(pool, one_file, files, repeat(lab), repeat(chain), repeat(place))


def _map(
    pool: ProcessPoolExecutor | None, function: Callable[..., Result], *columns: Iterable[Any]
) -> Iterator[Result]:
    """`map`, over the workers where there are any; results come in the order of the files."""
    return pool.map(function, *columns, chunksize=TOGETHER) if pool else map(function, *columns)


def _chain(outcomes: Iterable[Outcome]) -> Recomputed:
    """All that was recomputed so far; where two workbooks of one issue id disagree, neither serves."""
    means: dict[tuple[str, str], tuple[float, str]] = {}
    unsure: set[tuple[str, str]] = set()
    for outcome in outcomes:
        for key, mean in outcome.means.items():
            if means.setdefault(key, mean)[0] != mean[0]:
                unsure.add(key)
    return Recomputed({key: mean for key, mean in means.items() if key not in unsure}, frozenset(unsure))


def one_file(source: Source, lab: Lab | None, chain: Recomputed, place: int) -> Outcome:
    """Recompute one workbook when its turn has come. Nothing a file holds makes this raise."""
    file = source.file
    try:
        sheet = source.read()
        parts = take_apart(sheet, file)
        if _turn(parts) > place:
            return Outcome(file, later=True)
        if not parts.record_whole:
            return Outcome(file, reason="its issue record was altered: see `sheetcal check`", complete=False)
        return _outcome(file, sheet.sha256, parts, lab, chain)
    except SheetcalError as fault:
        reason = "; expected ".join(part for part in (fault.what, fault.expected) if part)
        return Outcome(file, reason=reason, unreadable=True, complete=False)
    except (ArithmeticError, LookupError, TypeError, ValueError, RecursionError, MemoryError, OSError) as fault:
        reason = f"cannot be evaluated ({type(fault).__name__}: {fault})"
        return Outcome(file, reason=reason, unreadable=True, complete=False)


def _turn(parts: Submission) -> int:
    if parts.kind.name == "calibration":
        return CALIBRATION
    return AID_LOT if _blanks(parts) else OTHER


def _blanks(parts: Submission) -> list[str]:
    """Samples burnt to find the heat of an aid."""
    return [
        one.partition(".")[0]
        for one, value in parts.record.prefilled.items()
        if one.endswith(".role") and value == "aid-blank"
    ]


def _outcome(file: str, sha256: str, parts: Submission, lab: Lab | None, chain: Recomputed) -> Outcome:
    found = evaluate(parts, lab, chain)
    open_ids = missing(parts.kind, parts.skeleton, parts.record, parts.readings)
    compared = sum(1 for value in found.before.values() if value is not None)
    return Outcome(
        file,
        list(rows(file, sha256, found)),
        compared=compared,
        complete=not open_ids,
        reason=f"incomplete: {len(open_ids)} readings missing; what there is was recomputed" if open_ids else "",
        split=bool(found.own),
        means=_means(found),
        changed=found.common.values,
        causes=_causes(found),
    )


def _causes(found: Evaluated) -> dict[str, str]:
    every: dict[str, Changes] = {"": found.common, **found.own}
    return {one: cause for changes in every.values() for one, cause in changes.causes.items()}


def _means(found: Evaluated) -> dict[tuple[str, str], tuple[float, str]]:
    """What the workbook proves for others, where it moved: rounded as it is adopted."""
    parts = found.parts
    issue_id = parts.record.issue_id
    proved: dict[tuple[str, str], str] = {}
    if parts.kind.name == "calibration":
        proved[issue_id, str(parts.readings.get("sheet.vessel"))] = "sheet.effective_heat_capacity_reported"
    for block in _blanks(parts):
        proved[issue_id, str(parts.record.prefilled.get(f"{block}.sample_id"))] = f"{block}.gross_analysed"
    means = {}
    for key, one in proved.items():
        value, causes = found.after.get(one), found.causes(one)
        if causes and isinstance(value, int | float):
            places = AID_PLACES if one.endswith("_analysed") else VESSEL_PLACES
            means[key] = (float(f"{value:.{places}f}"), "; ".join(causes))
    return means
