"""Many files through one pool: none is lost, none is wrong, and LibreOffice does not grow."""

from __future__ import annotations

import statistics
import time
from pathlib import Path
from typing import Any

from office_books import push_sums, shown, truth, write_sums

from sheetcal.office.jobs import Open
from sheetcal.office.pool import Limits, Pool

GROWTH = 60e6  # bytes, after all over after the first fifth


def files(folder: Path, count: int) -> list[Open]:
    """As many files as asked, each with results of its own."""
    return [write_sums(folder / f"{number}.xlsx", number) for number in range(count)]


def test_memory_after_many_files(tmp_path: Path, sizes: dict[str, Any]) -> None:
    """After all of them LibreOffice holds at most 60 MB more than after the first fifth; every answer is true."""
    count = sizes["office_files"]
    jobs = files(tmp_path, count)
    resident = []
    with Pool(1, Limits(documents=count * 2 // 5)) as pool:  # 200 of 500: what is tested is also what is set
        for number, job in enumerate(jobs):
            assert shown(pool.run(job)) == truth(number)
            resident.append(pool.resident())
    fifth, last, most = resident[count // 5 - 1], resident[-1], max(resident)
    assert len(resident) == count
    assert min(resident) > 50e6
    assert last - fifth <= GROWTH
    assert most - fifth <= GROWTH
    print(
        f"{count} files: {fifth / 1e6:.0f} MB after a fifth, {last / 1e6:.0f} MB after all, {most / 1e6:.0f} MB at most"
    )


def test_a_filled_template_costs_no_memory(sizes: dict[str, Any]) -> None:
    """Filling the same template again and again leaves LibreOffice as large as it was."""
    count = sizes["office_files"] * 4
    with Pool(1) as pool:
        pool.run(push_sums(0.0))
        before = None
        for number in range(count):
            assert shown(pool.run(push_sums(number))) == truth(number)
            before = before or (pool.resident() if number == count // 5 else None)
        assert before is not None
        assert pool.resident() - before <= GROWTH / 4
        assert len(pool.engine_pids()) == 1


def test_cold_start(tmp_path: Path) -> None:
    """From a new pool to its first answer; printed, held only to a bound that a slow machine keeps."""
    job = write_sums(tmp_path / "a.xlsx", 1.0)
    seconds = []
    for _ in range(3):
        started = time.monotonic()
        with Pool(1) as pool:
            assert shown(pool.run(job)) == truth(1.0)
            seconds.append(time.monotonic() - started)
    print(f"cold start to the first answer: {statistics.median(seconds):.2f} s")
    assert statistics.median(seconds) < 10
