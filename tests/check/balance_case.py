"""Filled workbooks for the balance tests: readings made backwards from a truth, results by the cell functions."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass, field

from sheetcal import profiles
from sheetcal.check.balance import Balance, balances
from sheetcal.formulas.compute import compute
from sheetcal.formulas.freeze import freeze
from sheetcal.kinds.layout import Skeleton, skeleton
from sheetcal.model import Constant, IssueRecord, Shape, SheetKind, Value
from sheetcal.verbs.tables import constants

FAR = "2999-12-31"
OTHER_UNIT = Constant("other_unit", 2.326, "J/g", "one Btu_IT/lb", "unit definition", "derived")
K, A, B = 0.00195, 1.2, 5.0  # 1/min: jacket, release, firing lag

TABLES: dict[str, tuple[Mapping[str, Value], ...]] = {
    "vessel": (
        {"id": "V1", "heat_capacity": 10138.7, "calibration": "C", "valid_from": "2025-01-15", "valid_until": FAR,
         "rise_low": 1.5, "rise_high": 3.2, "energy_low": 16.0, "energy_high": 32.0, "rated_energy": 35.0,
         "rated_fill": 3.3, "volume": 310.0, "firings_left": 100.0, "test_due": FAR, "certificate": "BA",
         "sensitivity": 0.996},
    ),
    "wire": ({"lot": "FW", "heat": 9.6, "length": 10.0, "valid_until": FAR},),
    "thread": ({"lot": "TH", "piece_heat": 45.6, "heat": 16220.0, "valid_until": FAR},),
    "titrant": ({"lot": "NT", "strength": 0.1003, "standardised": "2025-02-03", "valid_until": FAR},),
    "aid": (
        {"lot": "SO", "heat": 46060.0, "what": "oil", "valid_until": FAR, "certificate": "BA", "sensitivity": 1.0},
    ),
    "certified": (
        {"lot": "BA", "value": 26436.0, "uncertainty": 4.0, "coverage": 2.0, "convention": "in vacuum",
         "basis": "as analysed", "density": 1.32, "valid_until": FAR},
        {"lot": "IHC", "value": 31748.0, "uncertainty": 70.0, "coverage": 2.0, "convention": "in air",
         "basis": "dry", "density": 1.32, "valid_until": FAR},
    ),
    "balance": ({"id": "B1", "check_mass": 1.0, "check_limit": 0.0003, "calibrated_until": FAR},),
    "person": ({"id": "MR", "may": "fuel", "valid_until": FAR},),
}  # fmt: skip


@dataclass
class Case:
    """A kind, what was issued and what was typed; `results` are those of the cell functions."""

    kind: SheetKind
    record: IssueRecord
    readings: dict[str, Value | list[Value]]
    results: dict[str, Value] = field(default_factory=dict)

    @property
    def skeleton(self) -> Skeleton:
        return skeleton(self.kind, self.record.shape)

    def computed(self) -> Case:
        """The case with its results computed."""
        self.results = compute(self.skeleton, self.record, self.readings)
        return self

    def with_readings(self, **changes: Value | list[Value]) -> Case:
        """A copy with other readings (`run1__state="void"`), computed again."""
        changed = {one.replace("__", "."): value for one, value in changes.items()}
        return Case(self.kind, self.record, {**self.readings, **changed}).computed()

    def balances(self) -> dict[str, Balance]:
        return balances(self.kind, self.record, self.readings, self.results)


def issue(
    kind_name: str, shape: Shape, profile: str = "iso-18125", **tables: tuple[Mapping[str, Value], ...]
) -> Case:
    """An empty workbook of a kind under a profile."""
    kind = freeze(kind_name)
    stated = constants(kind, profiles.load(profile), None, {"other_unit": OTHER_UNIT})
    rows = {name: tables.get(name, TABLES.get(name, ())) for name in kind.tables}
    record = IssueRecord(
        issue_id="test", kind=kind.name, kind_version=kind.version, profile=profile, profile_version=1,
        issued_at="2025-03-03T07:00:00Z", tool="0", lab_name="", lab_sha256="", shape=shape, constants=stated,
        tables=rows, prefilled={}, locked=(),
    )  # fmt: skip
    return Case(kind, record, {})


def curve(t: float, theta: float, start: float, jacket: float = 25.35, k: float = K) -> float:
    """Exact temperature t min after firing, fore-period of 5 min: release with a firing lag, METHODS' curve."""
    drifting = jacket + (start - jacket) * math.exp(-k * (t + 5.0))
    if t <= 0.0:
        return drifting
    c = A * B / (B - A)
    first = (math.exp(-k * t) - math.exp(-A * t)) / (A - k)
    second = (math.exp(-k * t) - math.exp(-B * t)) / (B - k)
    return drifting + theta * c * (first - second)


def record_readings(
    run: int, theta: float, step: float = 0.5, after: float = 5.0
) -> dict[str, Value | list[Value]]:
    """Record of a rise theta, K, rounded to 0.1 mK; fired at 5 min, main period 9 min."""
    count = round((14.0 + after) / step) + 1
    times = [round(step * number, 4) for number in range(count)]
    temperatures = [round(curve(t - 5.0, theta, 25.2 - theta), 4) for t in times]
    return {
        f"run{run}.record_time": list[Value](times),
        f"run{run}.record_temperature": list[Value](temperatures),
        f"run{run}.rise_source": "record",
        f"run{run}.firing_time": 5.0,
        f"run{run}.end_of_main": 14.0,
    }


def firing_readings(run: int, theta: float) -> dict[str, Value | list[Value]]:
    """What a firing of any kind leaves on the bench."""
    typed: dict[str, Value] = {
        "state": "valid", "date": "2025-03-03", "start": "09:10", "operator": "MR", "vessel": "V1",
        "crucible_tare": 11.1234, "fuse_lot": "FW", "wire_start": 10.0, "wire_left": 4.1, "thread_lot": "TH",
        "ignition_energy": 21.0, "vessel_water": 1.0, "oxygen_pressure": 3.02, "calorimeter_water": 1999.2,
        "jacket_temperature": 25.0, "inspection": "clean", "burette_start": 0.1, "burette_end": 9.05,
        "titrant_lot": "NT",
    }  # fmt: skip
    return {**record_readings(run, theta), **{f"run{run}.{name}": value for name, value in typed.items()}}


SHEET: dict[str, Value | list[Value]] = {
    "sheet.water_reference": 2000.0,
    "sheet.water_bookkeeping": "constant water",
    "sheet.own_cooling_constant": K,
    "sheet.room_temperature": 22.0,
    "sheet.station_pressure": 98.4,
    "sheet.balance": "B1",
    "sheet.balance_check": 1.0,
}
COAL = {
    "carbon": 73.6,
    "hydrogen": 4.5,
    "nitrogen": 1.5,
    "sulfur": 0.68,
    "chlorine": 0.42,
    "oxygen": 7.2,
    "ash": 12.1,
}


def sample_readings(sample: int, role: str = "sample", basis: str = "dry") -> dict[str, Value | list[Value]]:
    """Analysis of a coal-like sample, every value on one basis."""
    typed: dict[str, Value] = {
        "role": role, "total_moisture": 12.4, "analysis_moisture": 2.5, "hydrogen_includes": "without moisture",
        "client_moisture": 10.0, "repeatability_limit": 140.0, "repeatability_basis": "dry", "runs_required": 2.0,
        "expected_gross": 30000.0, "needs_approval": "no", "composition_limit": 15.0,
    }  # fmt: skip
    for name, value in COAL.items():
        typed |= {name: value, f"{name}_basis": basis, f"{name}_source": "measured"}
    return {f"sample{sample}.{name}": value for name, value in typed.items()}


def fuel(samples: int = 1, runs: int = 2, spare: int = 2, profile: str = "iso-18125") -> Case:
    """A filled, clean fuel workbook: gross value about 29.3 kJ/g as analysed, an aid in every run."""
    case = issue("fuel", Shape(samples, runs, spare, record_rows=60), profile)
    case.readings.update(SHEET)
    for sample in range(1, samples + 1):
        case.readings.update(sample_readings(sample))
        first = (sample - 1) * (runs + spare) + 1
        for run in range(first, first + runs):
            mass = 0.80 + 0.01 * run
            theta = (29300.0 * mass + 46060.0 * 0.0712 + 56.6 + 45.6 + 21.0 + 90.0) / 10138.7
            case.readings.update(firing_readings(run, theta))
            typed: dict[str, Value] = {
                "sample_mass": round(mass, 4), "crucible_gross": round(11.1234 + mass, 4), "aid1_lot": "SO",
                "aid1_mass": 0.0712, "wash_route": "total acid",
            }  # fmt: skip
            case.readings.update({f"run{run}.{name}": value for name, value in typed.items()})
    return case.computed()
