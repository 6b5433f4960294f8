"""Controls of one vessel and samples of one source over several workbooks, in time order."""

from __future__ import annotations

from collections.abc import Iterator
from datetime import datetime
from itertools import groupby
from statistics import fmean, stdev

from sheetcal.check.sets.chances import beyond_t, farthest_of, longest_run
from sheetcal.check.sets.said import Run, Said, distinct, every_run, statistical
from sheetcal.check.sets.summary import Lot, Summary

LEVEL = 1e-2  # one set of right workbooks in so many gets a finding on its controls
LEVEL_SOURCE = 1e-3
LEAST_CHART = 6  # below that the test for one value that lies apart has no power
LEAST_EARLIER = 5
LATEST = 40  # samples of one source that a new one is compared with
WORDS = {
    "gross_daf": ("gross value, dry ash-free", "J/g", 0.002),
    "ash_dry": ("ash, dry", "%", 0.01),
    "total_moisture": ("total moisture", "%", 0.01),
}


def look(books: list[Summary]) -> Iterator[Said]:
    """All findings on series."""
    listed = distinct(books)
    charts = _charts(listed)
    for runs in charts.values():
        yield from one_side(runs, len(charts))
        yield from apart(runs, len(charts))
    yield from unlike(listed)


def _charts(books: list[Summary]) -> dict[tuple[str, str], list[Run]]:
    """Controls that count, by vessel and calibration, in time order."""
    found: dict[tuple[str, str], list[Run]] = {}
    for run in every_run(books):
        if run.fired.role == "control" and run.fired.counts and run.fired.control is not None and run.fired.started:
            found.setdefault((run.fired.typed_vessel, run.fired.calibration), []).append(run)
    return {key: sorted(runs, key=lambda run: run.fired.started or datetime.min) for key, runs in found.items()}


def one_side(runs: list[Run], charts: int) -> Iterator[Said]:
    """So many controls running above, or below, their target that chance does not do it."""
    sides = [(side, list(same)) for side, same in groupby(runs, key=lambda run: (run.fired.control or 0.0) > 0.0)]
    above, longest = max(sides, key=lambda one: len(one[1]))
    chance = charts * longest_run(len(longest), len(runs))
    if chance >= LEVEL or not longest[-1].book.checked:
        return
    last, vessel = longest[-1], longest[-1].fired.typed_vessel
    mean = fmean(run.fired.control or 0.0 for run in longest)
    message = (
        f"{len(longest)} controls of vessel {vessel} running lie {'above' if above else 'below'} their target, "
        f"{mean:+.2f} % on average, since {longest[0].fired.started:%Y-%m-%d}"
    )
    cause = "the heat capacity has drifted: calibrate before the limit is reached"
    yield Said("control-drift", last.book.file, last.at("control_deviation"), message, "warning",
               {"found": last.fired.control, "likely_cause": cause, **statistical(chance)})  # fmt: skip


def apart(runs: list[Run], charts: int) -> Iterator[Said]:
    """The control farthest from the mean of its vessel's (Grubbs, both sides)."""
    values = [run.fired.control or 0.0 for run in runs]
    if len(runs) < LEAST_CHART or not (spread := stdev(values)):
        return
    mean = fmean(values)
    far = max(runs, key=lambda run: abs((run.fired.control or 0.0) - mean))
    statistic = abs((far.fired.control or 0.0) - mean) / spread
    chance = charts * farthest_of(statistic, len(runs))
    if chance < LEVEL and far.book.checked:
        message = (
            f"{far.fired.run}: control of vessel {far.fired.typed_vessel} lies {statistic:.2f} standard deviations "
            f"from the mean of {len(runs)}"
        )
        yield Said("control-apart", far.book.file, far.at("control_deviation"), message, "warning",
                   {"found": far.fired.control, "expected": mean, **statistical(chance)})  # fmt: skip


def unlike(books: list[Summary]) -> Iterator[Said]:
    """A sample unlike the earlier ones of the same client and description."""
    dated = sorted(books, key=lambda book: (book.latest, book.issued_at, book.file))
    before: dict[tuple[str, str, str], list[tuple[Summary, Lot]]] = {}
    tests = sum(len(lot.found) for book in dated if book.checked for lot in book.lots)
    for book in dated:
        for lot in book.lots:
            if not lot.found or not (lot.origin[0] or lot.origin[1]):
                continue
            known = before.setdefault(lot.origin, [])
            if book.checked:
                yield from _unlike(book, lot, known, tests)
            known.append((book, lot))
            del known[:-LATEST]


def _unlike(book: Summary, lot: Lot, known: list[tuple[Summary, Lot]], tests: int) -> Iterator[Said]:
    for name, value in lot.found:
        values = [found for other, one in known if other is not book for what, found in one.found if what == name]
        if len(values) < LEAST_EARLIER:
            continue
        label, unit, least = WORDS[name]
        mean = fmean(values)
        spread = max(stdev(values), least * abs(mean), 1e-9)
        chance = tests * beyond_t((value - mean) / (spread * (1.0 + 1.0 / len(values)) ** 0.5), len(values) - 1)
        if chance < LEVEL_SOURCE:
            message = (
                f"{lot.sample}: {label} {value:.6g} {unit}, but {mean:.6g} {unit} in the {len(values)} earlier samples "
                "of this client and description"
            )
            yield Said("unlike-earlier", book.file, f"{lot.sample}.{name}", message, "warning",
                       {"found": value, "expected": mean, **statistical(chance)})  # fmt: skip
