"""Second sources of `check`: earlier workbooks, an instrument's log, and the other workbooks of the set."""

from __future__ import annotations

import os
import sys
from collections.abc import Iterable, Iterator, Mapping, Sequence
from concurrent.futures import ProcessPoolExecutor
from dataclasses import replace
from functools import lru_cache
from itertools import repeat

from sheetcal.archive.opening import Source, sources
from sheetcal.archive.walk import walk
from sheetcal.check.findings.logged import Log, lines
from sheetcal.check.fingerprint import reading_texts
from sheetcal.check.second import Second
from sheetcal.check.sets import together, unlisted
from sheetcal.check.sets.copies import Difference
from sheetcal.check.sets.said import Said
from sheetcal.check.sets.summary import Summary, earlier, summary_of
from sheetcal.check.sets.together import Together
from sheetcal.check.submission import take_apart
from sheetcal.errors import SheetcalError
from sheetcal.inputs.instrument_log import read_instrument_log
from sheetcal.model import Verdict

OURS = ("remarks", "correction")  # notes and corrections never contradict


def second(history: str | None, log: str | None) -> Second:
    """What was given beside the workbooks. Raises BadInput or BadInputs for a log that cannot be read."""
    return Second(Log(read_instrument_log(log)) if log else None, history is not None)


def history_files(folder: str | None, files: Sequence[str]) -> list[str]:
    """Workbooks below the folder that are not checked themselves. Raises BadInput for a folder without any."""
    if folder is None:
        return []
    own = {os.path.realpath(one) for one in files}
    return [one for one in walk([folder]).files if os.path.realpath(one) not in own]


def read_history(files: list[str], log: Log | None, workers: int) -> list[Summary]:
    """Summaries of earlier workbooks; what cannot be read is counted on standard error and is no second source."""
    with sources(files) as listed:
        if workers > 1 and len(listed) > 1:
            with ProcessPoolExecutor(workers) as pool:
                found = list(pool.map(_summary, listed, repeat(log), chunksize=8))
        else:
            found = [_summary(one, log) for one in listed]
    lost = sum(one is None for one in found)
    if lost:
        sys.stderr.write(f"--history: {lost} of {len(found)} workbooks could not be read and were passed over\n")
    return [one for one in found if one is not None]


def _summary(source: Source, log: Log | None) -> Summary | None:
    """One earlier workbook by the values it stores; None for what is no workbook of ours."""
    try:
        file = source.read(computed=True)
        parts = take_apart(file, source.file)
        book = earlier(summary_of(parts, source.file, file.sha256))
        return replace(book, logged=lines(book, log)) if log else book
    except SheetcalError:
        return None
    except Exception:  # one earlier file that nobody thought of must not stop the check
        return None


def join(verdicts: Iterable[tuple[Verdict, Summary | None]], past: list[Summary], log: Log | None) -> Iterator[Verdict]:
    """The verdicts with what the set says, in their order."""
    listed = list(verdicts)
    books = [summary for _, summary in listed if summary] + past
    said = together.look(books, _compare)
    if log is not None:
        _add(said, unlisted.look(books, log))
    yield from (together.joined(verdict, summary, said) for verdict, summary in listed)


def _add(to: Together, more: Iterable[Said]) -> None:
    for one in more:
        to.said.setdefault(one.file, []).append(one)


def _compare(one: Summary, other: Summary) -> Difference:
    """How two files of one issue id differ; they are read again for it, which is rare."""
    mine, theirs = _readings(one.file, one.sha256), _readings(other.file, other.sha256)
    contrary = [name for name in mine if name in theirs and theirs[name] != mine[name]]
    more, less = [name for name in mine if name not in theirs], [name for name in theirs if name not in mine]
    noted = _noted(mine) | _noted(theirs)
    apart = contrary + (more + less if more and less else [])  # each holds what the other lacks: no stages of one
    own = [name for name in apart if not name.partition(".")[2].startswith(OURS)]
    return Difference(
        tuple((name, _plain(mine.get(name)), _plain(theirs.get(name))) for name in own),
        all(name in noted or name.partition("[")[0] in noted for name in own),
    )


def _noted(readings: Mapping[str, str]) -> set[str]:
    """Ids that stand under Corrections."""
    return {
        text.strip('"').partition(" ")[0]
        for name, text in readings.items()
        if name.startswith("sheet.correction") and name.endswith("_cell")
    }


@lru_cache(maxsize=8)
def _readings(path: str, sha256: str) -> dict[str, str]:
    """What was filled in, by id; a line that still holds what was printed in it at issue is not filled yet."""
    with sources([path]) as listed:
        parts = take_apart(listed[0].read(computed=True), path)
    printed = parts.record.prefilled
    return {one: text for one, text in reading_texts(parts) if parts.readings.get(one) != printed.get(one, object())}


def _plain(text: str | None) -> str | float | None:
    if text is None:
        return None
    try:
        return float(text)
    except ValueError:
        return text.strip('"')
