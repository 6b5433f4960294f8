"""Filled workbooks for the balance tests: readings made backwards from a truth, results by the cell functions."""

from __future__ import annotations

import math
import random
from collections.abc import Mapping
from dataclasses import dataclass, field, replace

from sheetcal import profiles
from sheetcal.check.balance import Balance, balances
from sheetcal.check.balance.book import key_of, speaking
from sheetcal.formulas.compute import compute
from sheetcal.kinds import Skeleton, load, skeleton
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
        {"lot": "BA", "substance": "benzoic acid", "value": 26436.0, "uncertainty": 4.0, "coverage": 2.0,
         "convention": "in vacuum", "basis": "as analysed", "density": 1.32, "valid_until": FAR},
        {"lot": "IHC", "substance": "coal", "value": 31748.0, "uncertainty": 70.0, "coverage": 2.0,
         "convention": "in air", "basis": "dry", "density": 1.32, "valid_until": FAR},
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


def issue(kind_name: str, shape: Shape, profile: str = "iso-18125", **tables: tuple[Mapping[str, Value], ...]) -> Case:
    """An empty workbook of a kind under a profile."""
    kind = load(kind_name)
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


@dataclass(frozen=True)
class Logger:
    """How a record is taken: step and after-period in min, noise and resolution in K."""

    step: float = 0.5
    after: float = 5.0
    noise: float = 0.00015
    resolution: float = 0.0001


BY_HAND = Logger(step=1.0, after=6.0, noise=0.0003, resolution=0.001)


def record_readings(run: int, theta: float, logger: Logger = Logger()) -> dict[str, Value | list[Value]]:
    """Record of a rise theta, K; fired at 5 min, main period 9 min. The same run has the same noise."""
    dice = random.Random(run)
    times = [round(logger.step * number, 4) for number in range(round((14.0 + logger.after) / logger.step) + 1)]
    exact = [curve(t - 5.0, theta, 25.2 - theta) + dice.gauss(0.0, logger.noise) for t in times]
    shown = [round(round(one / logger.resolution) * logger.resolution, 4) for one in exact]
    return {
        f"run{run}.record_time": list[Value](times),
        f"run{run}.record_temperature": list[Value](shown),
        f"run{run}.rise_source": "record",
        f"run{run}.firing_time": 5.0,
        f"run{run}.end_of_main": 14.0,
    }


def firing_readings(run: int, theta: float, logger: Logger = Logger()) -> dict[str, Value | list[Value]]:
    """What a firing of any kind leaves on the bench."""
    typed: dict[str, Value] = {
        "state": "valid", "date": "2025-03-03", "start": "09:10", "operator": "MR", "vessel": "V1",
        "crucible_tare": 11.1234, "fuse_lot": "FW", "wire_start": 10.0, "wire_left": 4.1, "thread_lot": "TH",
        "ignition_energy": 21.0, "vessel_water": 1.0, "oxygen_pressure": 3.02, "calorimeter_water": 1999.2,
        "jacket_temperature": 25.0, "inspection": "clean", "burette_start": 0.1, "burette_end": 9.05,
        "titrant_lot": "NT",
    }  # fmt: skip
    return {**record_readings(run, theta, logger), **{f"run{run}.{name}": value for name, value in typed.items()}}


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


def fuel(
    samples: int = 1, runs: int = 2, spare: int = 2, profile: str = "iso-18125", logger: Logger = Logger()
) -> Case:
    """A filled, clean fuel workbook: gross value about 29.3 kJ/g as analysed, an aid in every run."""
    case = issue("fuel", Shape(samples, runs, spare, record_rows=60), profile)
    case.readings.update(SHEET)
    for sample in range(1, samples + 1):
        case.readings.update(sample_readings(sample))
        first = (sample - 1) * (runs + spare) + 1
        for run in range(first, first + runs):
            mass = 0.80 + 0.01 * run
            theta = (29300.0 * mass + 46060.0 * 0.0712 + 56.6 + 45.6 + 21.0 + 90.0) / 10138.7
            case.readings.update(firing_readings(run, theta, logger))
            typed: dict[str, Value] = {
                "sample_mass": round(mass, 4), "crucible_gross": round(11.1234 + mass, 4), "aid1_lot": "SO",
                "aid1_mass": 0.0712, "wash_route": "total acid",
            }  # fmt: skip
            case.readings.update({f"run{run}.{name}": value for name, value in typed.items()})
    return case.computed()


def calibration(runs: int = 5, spare: int = 0, profile: str = "iso-1928") -> Case:
    """A filled, clean calibration with masses spread from 0.6 to 1.2 g."""
    case = issue("calibration", Shape(0, runs, spare, record_rows=60), profile)
    case.readings.update(SHEET)
    case.readings.update(
        {"sheet.vessel": "V1", "sheet.certified_lot": "BA", "sheet.reason": "due", "sheet.mass_plan": "mapping",
         "sheet.runs_required": 5.0}
    )  # fmt: skip
    for run in range(1, runs + 1):
        mass = 0.5 + 0.14 * run
        theta = (26456.1 * mass + 56.6 + 45.6 + 21.0 + 54.0) / (10138.7 + 3.0 * (-1) ** run)
        case.readings.update(firing_readings(run, theta))
        typed: dict[str, Value] = {
            "pellet_mass": round(mass, 4), "crucible_gross": round(11.1234 + mass, 4),
            "start_temperature": round(25.2 - theta, 2),
        }  # fmt: skip
        case.readings.update({f"run{run}.{name}": value for name, value in typed.items()})
    return case.computed()


CUP: dict[str, Value] = {"id": "MC", "what": "cup", "heat_capacity": 61.5, "uncertainty": 1.0, "valid_until": FAR}


def mixing(runs: int = 3, spare: int = 0, **sheet: Value) -> Case:
    """A filled, clean mixing sheet: a copper-like body of 120 g from 99 degC into 150 g of water."""
    case = issue("specific-heat", Shape(0, runs, spare, record_rows=60), "first-principles", cup=(CUP,))
    typed: dict[str, Value] = {
        "cup_source": "given", "cup": "MC", "liquid": "water", "direction": "hot sample", "material": "copper",
        "runs_required": 3.0, "check_specific_heat": 0.3846, "check_body": "copper", "room_temperature": 22.0,
        **sheet,
    }  # fmt: skip
    case.readings.update({f"sheet.{name}": value for name, value in typed.items()})
    weighed = (
        (182.40, 333.04, 98.9, 19.89, 24.89),
        (182.38, 331.59, 99.0, 20.23, 25.26),
        (182.41, 333.2, 98.9, 20.12, 25.09),
    )
    for run in range(1, runs + 1):
        empty, filled, hot, start, final = weighed[(run - 1) % 3]
        values: dict[str, Value] = {
            "role": "sample", "state": "valid", "date": "2025-03-06", "start": "10:00", "operator": "MR",
            "cup_empty": empty, "cup_with_water": filled, "sample_mass": 120.34, "sample_start_temperature": hot,
            "time_in_heater": 20.0, "transfer_time": 3.0, "temperature_source": "typed",
            "start_temperature_typed": start, "final_temperature_typed": final, "end_mass": filled + 120.35,
        }  # fmt: skip
        case.readings.update({f"run{run}.{name}": value for name, value in values.items()})
    return case.computed()


def mixing_record(run: int, step: float, drift: float = 0.01) -> dict[str, Value | list[Value]]:
    """Record of a drop at 2 min: a step in K with a rate of 3 per min, and a drift in K/min, rounded to 0.01 K."""
    times = [round(0.25 * number, 2) for number in range(40)]
    shown = [
        round(20.0 + drift * t + (step * (1.0 - math.exp(-3.0 * (t - 2.0))) if t > 2.0 else 0.0), 2) for t in times
    ]
    return {
        f"run{run}.temperature_source": "record", f"run{run}.drop_time": 2.0, f"run{run}.end_of_mixing": 5.0,
        f"run{run}.record_time": list[Value](times), f"run{run}.record_temperature": list[Value](shown),
    }  # fmt: skip


def boil_off(runs: int = 2, spare: int = 0, **sheet: Value) -> Case:
    """A filled, clean boil-off sheet: water at two powers."""
    case = issue("vaporisation", Shape(0, runs, spare), "first-principles")
    typed: dict[str, Value] = {
        "substance": "water", "molar_mass": 18.015, "enthalpy_source": "measured here", "enthalpy_table": 2258.6,
        "line_pressure1": 70.12, "line_temperature1": 90.0, "line_pressure2": 101.325, "line_temperature2": 99.97,
        "flammable": "no", "heater": "enclosed", "vented": "yes", "station_pressure": 98.4,
        "boiling_temperature": 99.16, "work_form": "measured volumes", "vapour_volume": 1719.5, "virial": -454.0,
        "liquid_density": 0.959, "amount_mass": 250.0, "room_temperature": 22.0, **sheet,
    }  # fmt: skip
    case.readings.update({f"sheet.{name}": value for name, value in typed.items()})
    powers = ((47.95, 2.503, 600.0, 30.38), (59.80, 3.121, 600.0, 48.09), (53.20, 2.800, 600.0, 38.02))
    for run in range(1, runs + 1):
        names = ("voltage", "current", "duration", "condensate_mass")
        case.readings.update({f"run{run}.{name}": value for name, value in zip(names, powers[run - 1], strict=True)})
        case.readings.update({f"run{run}.state": "valid", f"run{run}.date": "2025-03-06"})
    return case.computed()


BODIES: tuple[dict[str, Value], ...] = (
    {"name": "water", "mass": 850.0, "specific_heat": 4.1824, "start": 24.60},
    {"name": "cup", "mass": 310.0, "specific_heat": 0.3846, "start": 24.60},
    {"name": "plate", "mass": 412.0, "specific_heat": 0.4495, "start": 184.0},
    {"name": "ice", "substance": "ice", "mass": 60.0, "specific_heat": 2.06, "start": -6.0, "change": "melts",
     "change_temperature": 0.0, "latent_heat": 333.5, "amount_changed": 60.0, "specific_heat_after": 4.19},
)  # fmt: skip


def bodies(**changes: Value) -> Case:
    """A filled, clean heat balance: water, cup, hot plate, ice and a heater; changes as `body4__mass`."""
    case = issue("heat-balance", Shape(bodies=len(BODIES)), "first-principles")
    case.readings.update(
        {"sheet.unknown": "none", "sheet.date": "2025-03-06", "sheet.start": "10:00", "sheet.operator": "MR",
         "sheet.heater_voltage": 12.0, "sheet.heater_current": 3.75, "sheet.heater_time": 120.0,
         "sheet.loss_power": 0.5, "sheet.loss_time": 120.0, "sheet.temperature_uncertainty": 0.02,
         "sheet.mass_uncertainty": 0.01, "sheet.station_pressure": 98.4, "sheet.room_temperature": 22.0}
    )  # fmt: skip
    for number, body in enumerate(BODIES, start=1):
        whole: dict[str, Value] = {"substance": "other", "change": "none", "end": 26.43, **body}
        case.readings.update({f"body{number}.{name}": value for name, value in whole.items()})
    return case.with_readings(**changes)


def disagreeing(case: Case) -> list[str]:
    """Results outside a tolerance, on either road."""
    found = []
    for one, balance in case.balances().items():
        result = case.results[one]
        assert isinstance(result, int | float), one
        off = [abs(result - balance.value) > balance.tolerance]
        if balance.end_to_end is not None and balance.end_to_end_tolerance is not None:
            off.append(abs(result - balance.end_to_end) > balance.end_to_end_tolerance)
        if any(off):
            found.append(one)
    return found


def spoken(case: Case) -> set[str]:
    return set(case.balances())


def shown(case: Case, begun: tuple[str, ...] = ("sample1", "run1", "run2")) -> set[str]:
    """Results the balance must speak on, where the sheet shows one in a begun block."""
    keys = speaking(case.kind)
    return {
        one
        for one, value in case.results.items()
        if key_of(one) in keys and value is not None and one.partition(".")[0] in begun
    }


def stated(case: Case, **values: float) -> Case:
    """The same readings on a sheet whose constants were restated."""
    constants: tuple[Constant, ...] = tuple(
        replace(one, value=values.get(one.name, one.value)) for one in case.record.constants
    )
    return replace(case, record=replace(case.record, constants=constants)).computed()
