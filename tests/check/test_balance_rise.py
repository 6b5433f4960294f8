"""The balance's rise, without drifts or end readings, finds what exact curves and honest records hold."""

from __future__ import annotations

import csv
import random
import time
from math import exp
from pathlib import Path

import pytest

from sheetcal.check.balance.rise import Record, read_record, rises

DEMO = Path(__file__).parent / "demo_records"
RECORDS = 200
BAR = 3.0  # ms for 20 records of 40 readings


def exact(t: float, theta: float, k: float, lam: float, start: float, far: float) -> float:
    """METHODS' exact isoperibol curve, ignition at t = 0, fore-period from -5 min."""
    drifting = far + (start - far) * exp(-k * (t + 5.0))
    if t <= 0.0:
        return drifting
    return drifting + theta * lam / (lam - k) * (exp(-k * t) - exp(-lam * t))


def synthetic(step: float) -> tuple[list[Record], list[float]]:
    """200 records rounded to 0.1 mK, no noise, by step in min, and their true rises."""
    dice = random.Random(20250303)
    records, truths = [], []
    for _ in range(RECORDS):
        theta, k = dice.uniform(1.5, 2.5), dice.uniform(0.0005, 0.003)
        lam = dice.uniform(11.0, 13.0) / 9.0
        far = 25.0 + dice.uniform(-0.5, 1.0)
        start = far - theta + dice.uniform(-1.0, 1.0)
        times = [step * number - 5.0 for number in range(round(24.0 / step) + 1)]
        shown = [round(exact(t, theta, k, lam, start, far), 4) for t in times]
        record = read_record(times, shown, 0.0, 9.0)
        assert record is not None
        records.append(record)
        truths.append(theta)
    return records, truths


@pytest.mark.parametrize(("step", "limit"), [(0.5, 0.0002), (1.0, 0.0004)])
def test_exact_curves(step: float, limit: float) -> None:
    """200 exact curves: within 0.2 mK at 30 s and 0.4 mK at 60 s."""
    records, truths = synthetic(step)
    assert len(records) == RECORDS
    off = [rise.theta - truth for rise, truth in zip(rises(records, 0.0001), truths, strict=True)]
    print(f"\n{step * 60:.0f} s: worst {max(map(abs, off)) * 1000:.3f} mK")
    assert max(map(abs, off)) < limit


def test_cooling_constant_is_found() -> None:
    """The least squares gives back the jacket's own constant within 1 %."""
    times = [0.5 * number - 5.0 for number in range(49)]
    shown = [exact(t, 2.0, 0.002, 1.4, 23.5, 25.3) for t in times]
    record = read_record(times, shown, 0.0, 9.0)
    assert record is not None
    assert rises([record], 0.0001)[0].cooling == pytest.approx(0.002, rel=0.01)


def logger(path: Path) -> Record:
    rows = [line.split(",") for line in path.read_text().splitlines() if line[0].isdigit()]
    record = read_record([float(row[0]) for row in rows], [float(row[1]) for row in rows], 5.0, 14.0)
    assert record is not None
    return record


def test_demo_records() -> None:
    """Six logger records of the demo week: within the stated tolerance of the rises a right sheet shows."""
    paths = sorted(DEMO.glob("*.csv"))
    paths.remove(DEMO / "expected.csv")
    assert len(paths) == 6
    with (DEMO / "expected.csv").open(newline="") as lines:
        shown = {row["run"]: float(row["theta_K"]) for row in csv.DictReader(lines)}
    for path, rise in zip(paths, rises([logger(one) for one in paths], 0.0001), strict=True):
        assert abs(rise.theta - shown[path.stem]) <= rise.tolerance <= 0.0012


def test_one_call_equals_many() -> None:
    """Records of different lengths solved together give what each gives alone."""
    half, _ = synthetic(0.5)
    whole, _ = synthetic(1.0)
    mixed = [half[0], whole[0], half[1], whole[1]]
    together = rises(mixed, 0.0001)
    alone = [rises([one], 0.0001)[0] for one in mixed]
    assert [one.theta for one in together] == pytest.approx([one.theta for one in alone], abs=1e-9)
    assert rises([], 0.0001) == []


def test_wrong_methods_are_seen() -> None:
    """Swapped drifts, a correction of the wrong sign, or none: outside the tolerance on a strong exchange."""
    times = [0.5 * number - 5.0 for number in range(39)]
    shown = [round(exact(t, 2.0, 0.002, 1.4, 22.5, 26.5), 4) for t in times]
    record = read_record(times, shown, 0.0, 9.0)
    assert record is not None
    rise = rises([record], 0.0001)[0]
    none = shown[28] - shown[10]
    for wrong in (none, 2 * none - 2.0):
        assert abs(wrong - rise.theta) > rise.tolerance


def test_a_misfire_and_a_dead_thermometer_have_no_rise() -> None:
    """Without a step the record cannot tell its cooling constant: the calorimeter's own is taken."""
    times = [0.5 * number for number in range(39)]
    drift = [25.0 + 0.001 * t for t in times]
    still = [25.0] * 39
    found = [read_record(times, shown, 5.0, 14.0, 0.002) for shown in (drift, still)]
    records = [one for one in found if one is not None]
    assert len(records) == 2
    for rise in rises(records, 0.0001):
        assert rise.theta == pytest.approx(0.0, abs=1e-6)
        assert rise.cooling == pytest.approx(0.002, rel=1e-3)


TIMES: list[object] = [0.0, 1.0, 2.0, 3.0, 4.0, 5.0, 6.0]
SPOILED = {
    "a text": (TIMES, [25.0, "25,1", 25.2, 26.0, 27.0, 27.1, 27.2], 2.0, 4.0),
    "a truth value": (TIMES, [25.0, True, 25.2, 26.0, 27.0, 27.1, 27.2], 2.0, 4.0),
    "a gap": (TIMES, [25.0, None, 25.2, 26.0, 27.0, 27.1, 27.2], 2.0, 4.0),
    "a time too many": ([*TIMES, 7.0], [25.0] * 7, 2.0, 4.0),
    "two equal times": ([0.0, 1.0, 1.0, 3.0, 4.0, 5.0, 6.0], [25.0] * 7, 2.0, 4.0),
    "two fore readings": (TIMES, [25.0] * 7, 1.0, 4.0),
    "two after readings": (TIMES, [25.0] * 7, 2.0, 5.0),
    "firing outside": (TIMES, [25.0] * 7, -1.0, 4.0),
    "nothing": ([], [], 2.0, 4.0),
}


@pytest.mark.parametrize("case", SPOILED)
def test_spoiled_records_are_left_out(case: str) -> None:
    """A record that is not numbers only, paired, rising, with three readings a period has no balance."""
    times, temperatures, fired, ended = SPOILED[case]
    assert read_record(times, temperatures, fired, ended) is None


@pytest.mark.benchmark
def test_speed() -> None:
    """Twenty records of forty readings are solved in one batch; the time is reported."""
    records, _ = synthetic(0.5)
    best = 1.0
    for _ in range(20):
        begun = time.perf_counter()
        solved = rises(records[:20], 0.0001)
        best = min(best, time.perf_counter() - begun)
    print(f"\n20 records: {best * 1000:.2f} ms, aim {BAR} ms")
    assert len(solved) == 20
