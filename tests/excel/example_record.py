"""An invented issue record and readings, made by hand: what the writer's tests write.

All figures are invented, except coefficients, which come from the profile and the cell functions.
"""

from __future__ import annotations

import math
from typing import Any

from sheetcal import kinds, profiles
from sheetcal.cells import registry
from sheetcal.formulas.compute import compute
from sheetcal.kinds.layout import Skeleton, owners
from sheetcal.model import Constant, IssueRecord, Shape, Value

ROWS = 60
TABLES: dict[str, tuple[dict[str, Value], ...]] = {
    "balance": ({"id": "BAL-2", "check_mass": 20.0, "check_limit": 0.0003, "calibrated_until": "2025-09-30"},),
    "person": (
        {"id": "MR", "may": "calibration, fuel", "valid_until": "2026-01-31", "entitled_until": "2026-01-31",
         "releases_until": "1999-12-31"},
        {"id": "HT", "may": "release, adopt, amend", "valid_until": "2999-12-31", "entitled_until": "1999-12-31",
         "releases_until": "2999-12-31"},
    ),
    "vessel": tuple(
        {
            "id": name, "heat_capacity": value, "calibration": "q4m8t-2zxwp-k7n3d-h9b5c",
            "valid_from": "2025-01-15T16:00", "valid_until": "2025-07-15", "rise_low": 1.58, "rise_high": 3.15,
            "energy_low": 16.0, "energy_high": 31.9, "rated_energy": 35.0, "rated_fill": 3.3, "volume": 310.0,
            "firings_left": 88, "test_due": "2025-11-30", "certificate": "BA-31", "sensitivity": 0.996,
        }
        for name, value in (("A1", 10138.7), ("A2", 10175.4))
    ),
    "wire": ({"lot": "W-7", "heat": 9.6, "length": 10.0, "valid_until": "2999-12-31"},),
    "thread": ({"lot": "T-3", "piece_heat": 50.0, "heat": 17500.0, "valid_until": "2999-12-31"},),
    "titrant": ({"lot": "N-12", "strength": 0.1003, "standardised": "2025-02-20", "valid_until": "2025-05-20"},),
    "aid": (
        {"lot": "CAP-5", "heat": 21120.0, "what": "gelatine capsule", "valid_until": "2025-12-31",
         "certificate": "BA-31", "sensitivity": 0.9},
    ),
    "certified": (
        {"lot": "BA-31", "value": 26436.0, "convention": "in vacuum", "basis": "as analysed", "density": 1.32,
         "valid_until": "2026-06-30"},
    ),
}  # fmt: skip
SAMPLE: dict[str, Value] = {
    "order": "2025-114", "client": "Hafenwerk Ost (invented)", "fuel_class": "bituminous coal",
    "description": "Steam coal ex barge, split B, received in two sealed bags, one slightly torn at the seam",
    "received": "2025-02-28", "condition": "dry, < 0.2 mm", "role": "sample", "needs_approval": "no",
    "customer_limit": "24.0 MJ/kg net", "customer_basis": "ar", "expected_gross": 26500, "first_mass": 1.0,
    "runs_required": 2, "repeatability_limit": 120.0, "repeatability_basis": "as analysed", "total_moisture": 11.2,
    "total_moisture_source": "measured", "expected_low": 18000.0, "expected_high": 35000.0, "composition_limit": 3.0,
}  # fmt: skip
ANALYSIS: dict[str, Value] = {
    "analysis_moisture": 2.15, "ash": 9.84, "ash_basis": "dry", "carbon": 72.1, "carbon_basis": "dry",
    "hydrogen": 4.62, "hydrogen_basis": "dry", "hydrogen_includes": "without moisture", "nitrogen": 1.5,
    "nitrogen_basis": "dry", "sulfur": 0.61, "sulfur_basis": "dry", "oxygen": 11.2, "oxygen_basis": "dry",
    "chlorine": 0.05, "chlorine_mark": "<", "chlorine_basis": "dry",
    "analysis_moisture_determined": "2025-03-03T09:20", "ash_source": "by difference",
}  # fmt: skip
RUN: dict[str, Value] = {
    "state": "valid", "date": "2025-03-03", "operator": "MR", "crucible_id": "7", "crucible_tare": 10.8214,
    "crucible_gross": 11.8227, "fuse_lot": "W-7", "wire_start": 10.0, "vessel_water": 1.0, "oxygen_pressure": 3.02,
    "calorimeter_water": 2000.0, "jacket_temperature": 25.0, "start_temperature": 22.31, "inspection": "clean",
    "wire_left": 2.1, "wash_route": "total acid", "burette_start": 0.0, "burette_end": 11.4, "titrant_lot": "N-12",
    "rise_source": "record", "firing_time": 5.0, "end_of_main": 14.0, "ignition_energy": 12.0,
    "record_file": "loggers/2025-03-03_A1_run01.csv",
}  # fmt: skip


def shape(samples: int = 2, runs: int = 2, spare: int = 2, rows: int = ROWS) -> Shape:
    """The size of an example workbook."""
    kind = kinds.load("fuel")
    sizes = tuple((name, len(TABLES.get(name, ()))) for name in kind.tables)
    return Shape(samples, runs, spare, 0, rows, sizes, tuple(kind.constants))


def record(size: Shape | None = None, **changes: Any) -> IssueRecord:
    """An issue record of kind fuel under the profile iso-1928."""
    size = size or shape()
    values: dict[str, Any] = {
        "issue_id": "b7k2m-9qxfd-h4t8w-n3c6r", "kind": "fuel", "kind_version": 1, "profile": "iso-1928",
        "profile_version": 1, "issued_at": "2025-03-02T16:30:00Z", "tool": "sheetcal 0.2.0",
        "lab_name": "Ollerby Wharf Fuels Laboratory (invented)", "lab_sha256": "9c1e" * 16, "shape": size,
        "constants": constants(size.constants), "tables": TABLES, "prefilled": prefilled(size),
        "locked": tuple(one for one in prefilled(size) if one.endswith(("total_moisture", "total_moisture_source"))),
        "ranges": {
            "sample2.hydrogen": {"low": 0.0, "high": 14.0},
            "run.vessel_water": {"warn_low": 0.9, "warn_high": 1.1},
        },
        "settings": {"paper": "A4"},
    }  # fmt: skip
    return IssueRecord(**{**values, **changes})


def constants(names: tuple[str, ...]) -> tuple[Constant, ...]:
    """The profile's coefficients, those of the cell functions, and an invented unit."""
    profile, known = profiles.load("iso-1928"), registry.constants()
    found = []
    for name in names:
        if name in profile.coefficients:
            one = profile.coefficients[name]
            found.append(Constant(name, one.value, one.unit, one.label, one.source, one.standing, "2026-12-31"))
        elif name in known:
            own = known[name]
            label = name.replace("_", " ")
            found.append(Constant(name, float(own), own.unit, label, own.source, "published", ""))
        else:
            found.append(Constant(name, 4.1868, "1", "J per cal_IT", "exact", "published", ""))
    return tuple(found)


def prefilled(size: Shape) -> dict[str, Value]:
    """What the issue prints: labels, class values, the main period's end."""
    values: dict[str, Value] = {
        "sheet.issue_id": "b7k2m-9qxfd-h4t8w-n3c6r", "sheet.job": "Week 10", "sheet.kind": "fuel 1",
        "sheet.profile": "iso-1928 1", "sheet.calorimeter": "CAL-A", "sheet.constants_id": "5d0f8a1c77b2",
        "sheet.issued_at": "2025-03-02T16:30:00Z", "sheet.water_bookkeeping": "constant water",
        "sheet.own_cooling_constant": 0.00196, "sheet.water_reference": 2000.0,
    }  # fmt: skip
    for sample in range(1, size.samples + 1):
        values |= {f"sample{sample}.{name}": value for name, value in SAMPLE.items()}
        values[f"sample{sample}.sample_id"] = f"W-{411 + sample}"
    for run in range(1, size.samples * size.places + 1):
        values |= {f"run{run}.rise_source": "record", f"run{run}.end_of_main": 14.0}
    return values


def readings(layout: Skeleton, filled: int = 2) -> dict[str, Any]:
    """Readings of the first `filled` runs of each sample, drawn from an exact curve."""
    values: dict[str, Any] = {
        "sheet.balance": "BAL-2", "sheet.balance_check": 20.0001, "sheet.room_temperature": 22.4,
        "sheet.station_pressure": 98.3, "sheet.remarks": "Stirrer belt changed before the first run.",
    }  # fmt: skip
    seen: dict[int | None, int] = {}
    for sample, run in owners(layout.kind, layout.shape):
        seen[sample] = seen.get(sample, 0) + 1
        if sample is not None:
            values |= {f"sample{sample}.{name}": value for name, value in ANALYSIS.items()}
        if seen[sample] <= filled:
            values |= {f"run{run}.{name}": value for name, value in RUN.items()}
            values[f"run{run}.vessel"] = "A1" if run % 2 else "A2"
            values[f"run{run}.start"] = f"{8 + run % 8:02d}:05"
            times, temperatures = curve(2.6 + 0.001 * run, layout.shape.record_rows)
            values |= {f"run{run}.record_time": times, f"run{run}.record_temperature": temperatures}
    return values


def curve(step: float, rows: int) -> tuple[list[float], list[float]]:
    """Times (min) and temperatures (degC), each (n,): a step of `step` K in a jacket at 25 degC, 0.1 mK readings."""
    times, temperatures, now = [], [], 22.31
    for number in range(min(rows, 49)):
        time = number * 0.5
        burnt = math.exp(-(time - 5.5) / 0.9) - math.exp(-(time - 5.0) / 0.9) if time > 5.0 else 0.0
        now += 0.5 * 0.00196 * (25.0 - now) + step * burnt
        times.append(time)
        temperatures.append(round(now, 4))
    return times, temperatures


def example(samples: int = 2, filled: int = 2, **changes: Any) -> tuple[IssueRecord, dict[str, Any], Skeleton]:
    """Record, values (readings and results) and layout of a filled example."""
    size = shape(samples)
    one = record(size, **changes)
    layout = kinds.skeleton(kinds.load("fuel"), size)
    values = readings(layout, filled)
    return one, {**values, **compute(layout, one, values)}, layout
