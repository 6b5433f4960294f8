"""Sets of workbooks as summaries, drawn at random: what an honest laboratory leaves behind in some weeks.

Nothing here knows the checker's tests: masses are weighed, rises read and titres taken as a bench does, with the
scatter it has. `Bench` says how this laboratory works; each departure from its defaults is honest or a habit to be
found, as the test that sets it says.
"""

from __future__ import annotations

import random
from dataclasses import dataclass, replace
from datetime import datetime, timedelta

from sheetcal.check.sets.copies import Difference
from sheetcal.check.sets.said import Said
from sheetcal.check.sets.summary import Fired, Lot, Summary, Tally
from sheetcal.check.sets.together import look
from sheetcal.model import Shape

FIRST = datetime(2025, 1, 6, 7, 0)
CAPACITY = 10_140.0  # J/K
EPOCH = datetime(1899, 12, 30)


@dataclass(frozen=True)
class Bench:
    """How a laboratory works: sheets a day apart, samples a sheet, relative scatter of one run and of a sample.

    `digits`: last digits that are preferred, and the share of readings in which they are. `made_to_agree`: by what
    factor the difference of duplicates is made smaller. `drift`: % a sheet by which the heat capacity runs away.
    """

    sheets: int = 20
    samples: int = 4
    repeats: float = 0.0008
    scatter: float = 0.0008
    operators: tuple[str, ...] = ("MR", "JO")
    digits: str = ""
    preferred: float = 0.0
    made_to_agree: float = 1.0
    drift: float = 0.0
    wire_cut: bool = False
    records: bool = False
    clients: int = 6


def laboratory(seed: int, bench: Bench = Bench()) -> list[Summary]:
    """The summaries of some weeks: a calibration of two vessels first, then a sheet a day."""
    dice = random.Random(seed)
    books = [_calibration(dice, bench, vessel, number) for number, vessel in enumerate(("A1", "A2"))]
    return books + [_sheet(dice, bench, number) for number in range(bench.sheets)]


def _calibration(dice: random.Random, bench: Bench, vessel: str, number: int) -> Summary:
    runs = []
    for place in range(5):
        value = CAPACITY * (1.0 + dice.gauss(0.0, bench.repeats))
        start = FIRST - timedelta(days=10 - 2 * number) + timedelta(minutes=35 * place)
        runs.append(_run(dice, bench, f"run{place + 1}", None, "BA-31", "calibration", vessel, start, 26_450.0, value))
    return book(f"cal-{vessel}.xlsx", runs, kind="calibration", number=100 + number)


def _sheet(dice: random.Random, bench: Bench, number: int) -> Summary:
    runs, lots, start = [], [], FIRST + timedelta(days=number)
    operator = bench.operators[number % len(bench.operators)]
    for sample in range(1, bench.samples + 2):
        control = sample == 1
        true = 26_450.0 if control else dice.uniform(17_000.0, 32_000.0)
        pair = [
            true * (1.0 + dice.gauss(0.0, bench.repeats) + (0.0 if control else dice.gauss(0.0, bench.scatter)))
            for _ in range(2)
        ]
        middle = sum(pair) / 2.0
        for place, value in enumerate(pair if control else [middle + bench.made_to_agree * (x - middle) for x in pair]):
            vessel = ("A1", "A2")[place]
            role = "control" if control else "sample"
            name = f"run{2 * (sample - 1) + place + 1}"
            material = "BA-31" if control else f"S-{number}-{sample}"
            one = _run(dice, bench, name, f"sample{sample}", material, role, vessel, start, value, value, operator)
            runs.append(_controlled(one, value / true, bench.drift * number) if control else one)
            start += timedelta(minutes=33)
        lots.append(_lot(dice, bench, number, sample))
    return book(f"W{number:02d}.xlsx", runs, tuple(lots), number=number)


def _controlled(one: Fired, ratio: float, drift: float) -> Fired:
    return replace(one, control=100.0 * (ratio - 1.0) + drift)


def _lot(dice: random.Random, bench: Bench, number: int, sample: int) -> Lot:
    if sample == 1:
        return Lot("sample1", "BA-31", ("", "", ""), ())
    client = dice.randrange(bench.clients)
    found = (
        ("gross_daf", 33_000.0 + 100.0 * client + dice.gauss(0.0, 150.0)),
        ("ash_dry", 8.0 + client + dice.gauss(0.0, 0.8)),
        ("total_moisture", 10.0 + client + dice.gauss(0.0, 0.7)),
    )
    return Lot(f"sample{sample}", f"S-{number}-{sample}", (f"client {client}", "coal", "coal"), found)


def _run(
    dice: random.Random, bench: Bench, name: str, sample: str | None, material: str, role: str, vessel: str,
    start: datetime, heat: float, value: float, operator: str = "MR",
) -> Fired:  # fmt: skip
    mass = dice.gauss(1.0, 0.01) if role != "sample" else dice.uniform(0.9, 1.1)
    mass = _digit(dice, bench, round(mass, 4))
    rise = round(heat * mass / CAPACITY * (1.0 + dice.gauss(0.0, 2e-4)), 4)
    weighed = "pellet_mass" if role == "calibration" else "sample_mass"
    fine = ((weighed, mass, 1e-4),) if bench.records else ((weighed, mass, 1e-4), ("instrument_rise", rise, 1e-4))
    weak = (
        ("burette_end", round(dice.gauss(8.0, 0.7) / 0.05) * 0.05),
        ("start_temperature", round(dice.gauss(22.9, 0.1), 2)),
        ("wire_left", 10.0 if bench.wire_cut else round(dice.uniform(2.0, 5.0), 1)),
        ("crucible_tare", dice.choice((11.6074, 12.4859, 11.6701)) + round(dice.gauss(0.0, 1e-4), 4)),
    )  # fmt: skip
    record = dice.randbytes(16) if bench.records else None
    day = float((start - EPOCH).days)
    return Fired(
        name, sample, material, role, "valid", operator, vessel, vessel, start, day, 19.0 if bench.records else 0.0,
        fine, weak, record, value, None, "cal", "",
    )  # fmt: skip


def _digit(dice: random.Random, bench: Bench, mass: float) -> float:
    """A mass with one of the preferred last digits, as often as they are."""
    if bench.digits and dice.random() < bench.preferred:
        return round(round(mass, 3) + int(dice.choice(bench.digits)) * 1e-4, 4)
    return mass


def book(
    file: str, runs: list[Fired], lots: tuple[Lot, ...] = (), kind: str = "fuel", number: int = 0, checked: bool = True,
    tallies: tuple[Tally, ...] = (), **facts: str,
) -> Summary:  # fmt: skip
    """One summary; its readings are its own."""
    own = {"sha256": f"sha {file}", "readings": f"readings {file}", "issue_id": f"id {file}", **facts}
    return Summary(
        file, own["sha256"], kind, 1, Shape(5, 2), own["issue_id"], f"2025-01-{number % 28 + 1:02d}T06:00:00Z",
        "iso-1928", own.get("calorimeter", "CAL-A"), (), own["readings"], f"measured {file}", "BAL-1", "", 0.25,
        tuple(runs), lots, tallies, (), checked,
    )  # fmt: skip


def said(books: list[Summary]) -> list[Said]:
    """All that is said of a set; files of one id are taken to contradict each other."""
    together = look(books, lambda one, other: Difference((("run1.sample_mass", 1.0, 1.1),), False))
    return [one for of_file in together.said.values() for one in of_file]


def codes(books: list[Summary]) -> list[str]:
    """The codes of all that is said of a set, sorted."""
    return sorted(one.code for one in said(books))
