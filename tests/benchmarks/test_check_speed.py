"""A check with three witnesses costs at most half a bare load by openpyxl, the first file at most as much as one.

A fuel workbook of 10 samples with 2 filled runs of 4 places and its charts; imports are excluded on both sides.
Ratios are printed beside the baseline; the test fails beyond 1.3 x the bar, for the machine may be busy.
"""

from __future__ import annotations

import gc
import importlib
import os
import pkgutil
import subprocess
import sys
import time
from collections.abc import Callable
from pathlib import Path
from typing import Any

import openpyxl
import pytest

import sheetcal.check
from sheetcal.verbs.checking import Against, check_path

sys.path.insert(0, str(Path(__file__).parents[1] / "check"))

import planting

BAR_WARM, BAR_FIRST, BAR_MEMORY = 0.5, 1.0, 150.0  # of a bare load, of a bare load, MB
TOLERATED = 1.3
FIRST = """
import importlib, pkgutil, sys, time
from pathlib import Path
import sheetcal.check
from sheetcal.verbs.checking import Against, check_path
for one in pkgutil.walk_packages(sheetcal.check.__path__, "sheetcal.check."):
    importlib.import_module(one.name)
began = time.perf_counter()
verdict = check_path(sys.argv[1], Against())
took = time.perf_counter() - began
status = dict(line.split(":", 1) for line in Path("/proc/self/status").read_text().splitlines())
print(took, int(status["VmHWM"].split()[0]) / 1024.0, verdict.verdict)
"""


@pytest.fixture(scope="module")
def workbook(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """10 samples, one of them the control, 2 runs and 2 reserve places each, all with records and charts."""
    folder = tmp_path_factory.mktemp("speed")
    rows = [planting.CONTROL, *(planting.coal(f"S-{number}") for number in range(1, 10))]
    book = planting.filled(planting.issue("fuel", folder, rows))
    shape = book.record.shape
    assert (shape.samples, shape.runs, shape.places) == (10, 2, 4)
    return planting.write(folder, book.data())


def seconds(work: Callable[[], Any]) -> float:
    """Duration of one call, garbage of others collected before."""
    gc.collect()
    began = time.perf_counter()
    work()
    return time.perf_counter() - began


def first_file(path: Path) -> tuple[float, float]:
    """(seconds, MB) of the first check in a process of its own, everything imported before.

    The highest memory is the process's own (VmHWM): ru_maxrss would count the parent's before exec.
    """
    command = [sys.executable, "-c", FIRST, str(path)]
    done = subprocess.run(command, check=True, capture_output=True, text=True, env={**os.environ})
    took, memory, verdict = done.stdout.split()
    assert verdict == "sound"
    return float(took), float(memory)


@pytest.mark.benchmark
def test_check_is_within_the_bar(workbook: Path, sizes: dict[str, Any]) -> None:
    """Ratios of warm and first check to a bare load of the same file, and the memory of a check."""
    for one in pkgutil.walk_packages(sheetcal.check.__path__, "sheetcal.check."):
        importlib.import_module(one.name)
    against = Against()
    verdict = check_path(str(workbook), against)
    assert verdict.sound
    assert verdict.witnesses == ("typed", "formula", "balance")
    assert len(verdict.results) > 1500
    warm, bare, first, memory = [], [], [], []
    for _ in range(max(3, int(sizes["read_benchmark"]))):  # in turns, so that a busy moment hits all alike
        bare.append(seconds(lambda: openpyxl.load_workbook(workbook)))
        warm.append(seconds(lambda: check_path(str(workbook), against)))
        took, used = first_file(workbook)
        first.append(took)
        memory.append(used)
    ratios = min(warm) / min(bare), min(first) / min(bare)
    print(
        f"\nopenpyxl {min(bare):.3f} s; check warm {min(warm):.3f} s = {ratios[0]:.2f} x (bar {BAR_WARM}), "
        f"first file {min(first):.3f} s = {ratios[1]:.2f} x (bar {BAR_FIRST}); memory {max(memory):.0f} MB "
        f"(bar {BAR_MEMORY:.0f})"
    )
    assert ratios[0] <= TOLERATED * BAR_WARM
    assert ratios[1] <= TOLERATED * BAR_FIRST
    assert max(memory) <= BAR_MEMORY
