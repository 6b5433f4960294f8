"""One workbook twice, the same readings under two ids, runs copied from other workbooks.

Values that repeat by nature (empty crucibles, oxygen, water, check weights, controls that are always pressed to
the same mass) weigh little or nothing; what is left must be beyond chance over all pairs looked at.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Callable, Iterable, Iterator, Mapping
from dataclasses import dataclass
from datetime import datetime
from itertools import combinations
from math import comb

from sheetcal.check.sets.said import Run, Said, every_run, related, statistical
from sheetcal.check.sets.summary import WEIGHED, Fired, Summary
from sheetcal.model import Value

LEVEL = 1e-3  # one set of honest workbooks in so many is accused of copying
ALIKE = 5.0  # of 1/5 of its value a reading of high resolution varies at least
PRESSED = 6.0  # pellets of one material are pressed closer to one mass
SAME_MATERIAL = 0.03  # two runs of one material at the same mass share the last digit of their rise so often
RECORD = 1e-12  # whole records are equal by chance less often than that
WEAK = 0.05
MOST = 40  # workbooks or runs of one group compared with each other


@dataclass(frozen=True)
class Difference:
    """How two files of one issue id differ, beyond what one holds and the other not yet.

    `contrary`: (id, value in the first, value in the second); blank in one of them where each holds readings that
    the other lacks. `noted`: all of them stand in the corrections.
    """

    contrary: tuple[tuple[str, Value, Value], ...]
    noted: bool


Compare = Callable[[Summary, Summary], Difference]


def look(books: list[Summary], compare: Compare) -> Iterator[Said]:
    """All findings on copies."""
    yield from _versions(books, compare)
    twins = list(_twins(books))
    yield from twins
    told = {one.file for one in twins}
    yield from _copied(books, told)


def _grouped(books: Iterable[Summary], key: Callable[[Summary], str | None]) -> Iterator[list[Summary]]:
    groups: dict[str, list[Summary]] = {}
    for book in books:
        name = key(book)
        if name is not None:
            groups.setdefault(name, []).append(book)
    yield from (group[:MOST] for group in groups.values() if len(group) > 1)


def _versions(books: list[Summary], compare: Compare) -> Iterator[Said]:
    """Files with one issue id: copies and stages are notes, contradictions are not."""
    for group in _grouped(books, lambda book: book.issue_id):
        told: set[str] = set()
        for one, other in combinations(group, 2):
            for said in _version(one, other, compare):
                if said.file not in told:
                    told.add(said.file)
                    yield said


def _version(one: Summary, other: Summary, compare: Compare) -> Iterator[Said]:
    if one.sha256 == other.sha256:
        return _copy(one, other, "byte for byte the same file as {}")
    if one.readings == other.readings:
        return _copy(one, other, "holds the same readings as {}: the workbook saved again")
    difference = compare(one, other)
    if not difference.contrary:
        return _copy(one, other, "another stage of the workbook in {}: none of its readings contradict")
    number = f"{len(difference.contrary)} reading{'s' if len(difference.contrary) > 1 else ''}"
    if difference.noted:
        return _copy(one, other, f"{number} amended against {{}}, each noted under Corrections")
    return _contrary(one, other, difference, number)


def _copy(one: Summary, other: Summary, text: str) -> Iterator[Said]:
    """A note at the later file; at the earlier where that alone is checked."""
    book, known = (other, one) if other.checked else (one, other)
    if book.checked:
        yield Said("workbook-copied", book.file, "sheet.issue_id", text.format(known.file), "note")


def _contrary(one: Summary, other: Summary, difference: Difference, number: str) -> Iterator[Said]:
    field, mine, theirs = difference.contrary[0]
    for book, known, found, expected in ((one, other, mine, theirs), (other, one, theirs, mine)):
        if book.checked:
            message = f"{number} not as in {known.file}, which bears the same issue id"
            cause = "two copies of the workbook were both filled: decide which one counts"
            facts = {"found": found, "expected": expected, "likely_cause": cause}
            yield Said("issue-twice", book.file, field, message, "error", facts)


def _twins(books: list[Summary]) -> Iterator[Said]:
    """All that was measured is equal under another issue id, and no revision says so."""
    for group in _grouped(books, lambda book: book.measured):
        first, *others = sorted(group, key=lambda book: (book.latest, book.issued_at, book.file))
        for book in others:
            if related(book, first):
                continue
            blamed, known = (book, first) if book.checked else (first, book)
            if blamed.checked:
                chance = len(books) ** 2 * (ALIKE / 3000.0) ** 3
                message = f"all readings of its runs are those of {known.file} (issue id {known.issue_id})"
                yield Said("readings-twice", blamed.file, "sheet.issue_id", message, "error", statistical(chance))


def _copied(books: list[Summary], told: set[str]) -> Iterator[Said]:
    """Runs that share readings beyond chance with an earlier run."""
    runs = every_run(books)
    shares = _shares(runs)
    pairs = len(runs) * (len(runs) - 1) / 2
    best: dict[tuple[str, str], tuple[float, Run, Run]] = {}
    for one, other in _candidates(runs):
        if one.book is other.book or related(one.book, other.book):
            continue  # runs of one workbook are compared by its own check
        chance = pairs * chance_of(one.fired, other.fired, shares)
        copy, source = _later(one, other)
        place = (copy.book.file, copy.fired.run)
        free = copy.book.checked and copy.book.file not in told
        if free and chance < min(LEVEL, best[place][0] if place in best else LEVEL):
            best[place] = (chance, copy, source)
    yield from (_said(*found) for found in best.values())


def _candidates(runs: list[Run]) -> Iterator[tuple[Run, Run]]:
    """Pairs with the same record, or with two equal readings of high resolution; each once."""
    groups: dict[object, list[int]] = {}
    for number, run in enumerate(runs):
        keys: list[object] = [run.fired.record] if run.fired.record else []
        keys += combinations([(name, value) for name, value, _ in run.fired.fine], 2)
        for key in keys:
            groups.setdefault(key, []).append(number)
    seen = {pair for group in groups.values() if len(group) > 1 for pair in combinations(group[:MOST], 2)}
    yield from ((runs[first], runs[second]) for first, second in sorted(seen))


def _shares(runs: list[Run]) -> Mapping[tuple[str, float], float]:
    """How often a value that varies little stands in other runs than a pair."""
    counts = Counter(read for run in runs for read in run.fired.weak)
    return {read: max(WEAK, (number - 2) / max(len(runs) - 2, 1)) for read, number in counts.items()}


def chance_of(one: Fired, other: Fired, shares: Mapping[tuple[str, float], float]) -> float:
    """Chance that two honest runs agree in at least what these agree in."""
    chance, same = 1.0, bool(one.material) and one.material == other.material
    if one.record and one.record == other.record:
        chance *= RECORD
    theirs = {name: value for name, value, _ in other.fine}
    both = [(name, value, step) for name, value, step in one.fine if name in theirs]
    equal = [field for field in both if theirs[field[0]] == field[1]]
    for name, value, step in equal:
        share = min(1.0, ALIKE * step / abs(value))
        if same:
            share = PRESSED * share if name in WEIGHED else max(share, SAME_MATERIAL)
        chance *= min(1.0, share)
    weak = [read for read in one.weak if read in other.weak]
    for read in weak:
        chance *= shares.get(read, WEAK)
    return min(1.0, chance * comb(len(both), len(equal)) * comb(max(len(one.weak), len(weak)), len(weak)))


def _later(one: Run, other: Run) -> tuple[Run, Run]:
    """(copy, source): the later run is the copy, where it is checked."""
    first, second = sorted((one, other), key=lambda run: (run.fired.started or datetime.min, run.book.issued_at))
    return (second, first) if second.book.checked else (first, second)


def _said(chance: float, copy: Run, source: Run) -> Said:
    theirs = {(name, value) for name, value, _ in source.fired.fine} | set(source.fired.weak)
    equal = [name for name, value, _ in copy.fired.fine if (name, value) in theirs]
    equal += [name for name, value in copy.fired.weak if (name, value) in theirs and name not in equal]
    record = bool(copy.fired.record) and copy.fired.record == source.fired.record
    words = (["the whole temperature record"] if record else []) + [name.replace("_", " ") for name in equal]
    where = source.name
    message = f"{copy.fired.run}: {', '.join(words)} equal to {where}"
    place = "record_temperature" if record else equal[0]
    cause = f"the readings of {where} were copied"
    return Said(
        "run-copied", copy.book.file, copy.at(place), message, "warning",
        {"likely_cause": cause, **statistical(chance)},
    )  # fmt: skip
