"""Build an issue record: which samples, places, constants and prefilled readings a new workbook gets."""

from __future__ import annotations

import secrets
from collections.abc import Mapping
from datetime import UTC, datetime
from typing import Any

from sheetcal import __version__, profiles, units
from sheetcal.errors import BadInput, BadInputs, Refused, SheetcalError
from sheetcal.inputs.lab import Calorimeter, FuelClass, Lab
from sheetcal.inputs.worklist import WorklistSample
from sheetcal.kinds import load, skeleton
from sheetcal.kinds.layout import Skeleton, owners
from sheetcal.kinds.record import constants_sha256, with_values
from sheetcal.model import Constant, IssueRecord, Shape, SheetKind, Value
from sheetcal.profiles import Profile
from sheetcal.verbs.entering import check_choice, impossible
from sheetcal.verbs.order import MOST_RUNS, MOST_SAMPLES, Order, refuse_bounds, refuse_foreign
from sheetcal.verbs.sample_values import (
    given_by,
    refuse_chlorine,
    refuse_strange_controls,
    runs_of,
    sample_ranges,
    sample_values,
)
from sheetcal.verbs.tables import constants, tables

__all__ = ["Order", "build", "new_id", "refuse_chlorine", "refuse_foreign"]

ALPHABET = "abcdefghjkmnpqrstvwxyz23456789"  # no letter that a reader takes for a digit
MOST_ROWS = 120
PLAIN_PROFILE = "first-principles"
DEFAULT_RUNS = {"calibration": 5, "specific-heat": 3, "vaporisation": 2, "heat-balance": 0}


def new_id() -> str:
    """An unguessable id of four groups, e.g. b7k2m-9qxfd-h4t8w-n3c6r (97 bits)."""
    return "-".join("".join(secrets.choice(ALPHABET) for _ in range(5)) for _ in range(4))


def build(order: Order) -> IssueRecord:
    """The issue record of a new workbook. Raises BadInput or Refused, saying what to do."""
    kind = load(order.kind)
    refuse_bounds(order)
    moment = order.moment or _now(order.lab)
    calorimeter = _calorimeter(order, kind)
    samples = _samples(order, kind)
    classes = _classes(order, samples)
    name = _profile_name(order, kind, samples, classes)
    profile = order.lab.profile(name) if order.lab else profiles.load(name)
    _refuse_unfit(order, kind, profile)
    unit = order.unit or (order.lab.reporting.unit if order.lab else "") or "MJ/kg"
    extra = _extra_constants(unit, calorimeter)
    rows = tables(kind, order.lab, calorimeter.id if calorimeter else "", moment, profile)
    _refuse_without_tables(order, kind, rows)
    _refuse_without_heat_capacity(order, kind, rows, moment)
    stated = constants(kind, profile, order.lab, extra)
    shape = _shape(order, kind, samples, classes, calorimeter, rows, stated, profile)
    record = IssueRecord(
        issue_id=new_id(),
        kind=kind.name,
        kind_version=kind.version,
        profile=profile.name,
        profile_version=profile.version,
        issued_at=_stamp(order, moment),
        tool=__version__,
        lab_name=order.lab.laboratory.name if order.lab else "",
        lab_sha256=order.lab.sha256 if order.lab else "",
        shape=shape,
        constants=stated,
        tables=rows,
        prefilled={},
        locked=(),
        settings={
            "paper": order.paper,
            "unit": unit,
            "time_zone": order.lab.laboratory.time_zone if order.lab else "UTC",
            "mass_convention": order.lab.laboratory.mass_convention if order.lab else "in air",
            "calorimeter": calorimeter.id if calorimeter else "",
            "main_period": repr(calorimeter.main_period) if calorimeter and calorimeter.main_period else "",
            "resolution": repr(calorimeter.resolution) if calorimeter and calorimeter.resolution else "",
            **_counted(order.lab, calorimeter),
        },
    )
    return _prefill(order, kind, record, profile, calorimeter, samples, classes)


def _counted(lab: Lab | None, calorimeter: Calorimeter | None) -> dict[str, str]:
    """When the firings of each vessel were counted: from then on workbooks count them."""
    vessels = [one for one in lab.vessels if calorimeter and one.calorimeter == calorimeter.id] if lab else []
    return {f"firings_counted {one.id}": one.firings_counted.isoformat() for one in vessels if one.firings_counted}


def _now(lab: Lab | None) -> datetime:
    now = datetime.now(lab.zone if lab else UTC)
    return now.replace(tzinfo=None, microsecond=0)


def _stamp(order: Order, moment: datetime) -> str:
    """Issue time in UTC, from the laboratory's local time."""
    zone = order.lab.zone if order.lab else UTC
    return moment.replace(tzinfo=zone).astimezone(UTC).strftime("%Y-%m-%dT%H:%M:%SZ")


def _calorimeter(order: Order, kind: SheetKind) -> Calorimeter | None:
    if order.lab is None and order.calorimeter:
        raise BadInput(
            f"--calorimeter {order.calorimeter}", "no lab file names it", "--lab L.toml", "Give the lab file."
        )
    if order.lab is None or "run" not in kind.scopes or "vessel" not in kind.tables:
        return None
    return order.lab.calorimeter(order.calorimeter)


def _samples(order: Order, kind: SheetKind) -> tuple[WorklistSample, ...]:
    if "sample" not in kind.scopes:
        return ()
    if order.worklist is None:
        return tuple(WorklistSample(sample_id="", line=0) for _ in range(order.samples or 1))
    listed = order.worklist.samples
    if len(listed) > MOST_SAMPLES:
        raise BadInput(order.where(), f"{len(listed)} samples", f"at most {MOST_SAMPLES} a workbook", "Split the list.")
    return listed


def _classes(order: Order, samples: tuple[WorklistSample, ...]) -> dict[str, FuelClass]:
    """The fuel class of every sample that names one. Raises all that are not known."""
    found: dict[str, FuelClass] = {}
    faults: list[SheetcalError] = []
    for one in samples:
        if order.lab is None or not one.fuel_class:
            continue
        try:
            found[one.sample_id] = order.lab.fuel_class(one.fuel_class)
        except BadInput as fault:
            faults.append(BadInput(order.where(one), f"{one.sample_id}: {fault.what}", fault.expected, fault.do))
    if faults:
        raise BadInputs(faults)
    return found


def _profile_name(
    order: Order, kind: SheetKind, samples: tuple[WorklistSample, ...], classes: Mapping[str, FuelClass]
) -> str:
    """The one profile of the workbook: as asked, or that of all fuel classes, or first principles."""
    wanted: dict[str, list[str]] = {}
    for one in samples:
        if one.role == "sample" and one.sample_id in classes:
            wanted.setdefault(classes[one.sample_id].profile, []).append(one.sample_id)
    listed = "; ".join(f"{name}: {', '.join(ids)}" for name, ids in sorted(wanted.items()))
    do = "Split the worklist: one file a profile."
    if len(wanted) > 1:
        raise Refused(order.where(), f"needs several profiles ({listed})", "one profile a workbook", do)
    if order.profile and wanted and order.profile not in wanted:
        what = f"its fuel classes are done by another profile than {order.profile} ({listed})"
        raise Refused(order.where(), what, f"--profile {min(wanted)}", "Leave --profile out, or change the class.")
    if order.profile or wanted:
        return order.profile or min(wanted)
    return "iso-1928" if kind.name in ("calibration", "fuel") else PLAIN_PROFILE


def _refuse_unfit(order: Order, kind: SheetKind, profile: Profile) -> None:
    if kind.name not in profile.kinds:
        fit = [name for name in profiles.names() if kind.name in profiles.load(name).kinds]
        raise BadInput(f"profile {profile.name}", f"does not serve {kind.name}", " or ".join(fit), "Choose one.")


def _extra_constants(unit: str, calorimeter: Calorimeter | None) -> dict[str, Constant]:
    """Constants that follow from options and instrument: the second unit, the tolerance of the water."""
    divisor = units.convert(1.0, unit, "J/g")
    extra = {
        "other_unit": Constant("other_unit", divisor, "J/g", f"one {unit}", "unit definition", "derived"),
    }
    if calorimeter and calorimeter.water_tolerance is not None:
        name, label = "water_tolerance", "calorimeter water, tolerance"
        extra[name] = Constant(name, calorimeter.water_tolerance, "g", label, "lab file", "laboratory")
    return extra


def _refuse_without_tables(order: Order, kind: SheetKind, rows: Mapping[str, Any]) -> None:
    """A calibration needs a vessel and a certified lot to look up."""
    where = order.lab.path if order.lab else f"issue {kind.name}"
    for table, what in {"vessel": "vessel", "certified": "certified lot"}.items() if kind.name == "calibration" else ():
        if not rows.get(table):
            raise Refused(where, f"no {what}", f"--lab with a [[{table}]]", "Give it.")


def _refuse_without_heat_capacity(order: Order, kind: SheetKind, rows: Mapping[str, Any], moment: datetime) -> None:
    """A fuel workbook needs a heat capacity in force for every vessel it offers."""
    if kind.name != "fuel":
        return
    where = order.lab.path if order.lab else "issue fuel"
    if order.lab and not rows.get("vessel"):
        what = "no vessel in service: pressure test past its date, or no firings left"
        raise Refused(where, what, "a vessel that may be fired", "STOP: have the vessels tested first.")
    if not rows.get("vessel"):
        raise Refused(where, "no vessel with an effective heat capacity", "--lab with a [[calibration]]", "Give it.")
    without = [str(row["id"]) for row in rows["vessel"] if row["heat_capacity"] is None]
    if len(without) == len(rows["vessel"]):
        raise Refused(
            where,
            f"no effective heat capacity in force on {moment:%Y-%m-%d} for vessel {', '.join(without)}",
            "a [[calibration]] that has not run out",
            "Calibrate and adopt it.",
        )


def _runs(order: Order, kind: SheetKind, profile: Profile) -> int:
    """Run places a kind without samples needs; a calibration at least what its profile asks for."""
    least = DEFAULT_RUNS.get(kind.name, kind.runs_default)
    if kind.name == "calibration":
        stated = profile.coefficients.get("calibration_runs")
        least = max(5, int(stated.value) if stated else 5)
    wanted = least if order.runs is None else order.runs
    if kind.name == "calibration" and wanted < least:
        raise BadInput("--runs", f"{wanted}", f"at least {least} by profile {profile.name}", "Plan more.")
    return wanted


def _shape(
    order: Order,
    kind: SheetKind,
    samples: tuple[WorklistSample, ...],
    classes: Mapping[str, FuelClass],
    calorimeter: Calorimeter | None,
    rows: Mapping[str, Any],
    stated: tuple[Constant, ...],
    profile: Profile,
) -> Shape:
    spare = kind.spare_default if order.spare is None else order.spare
    runs = max((runs_of(one, order, classes) for one in samples), default=0) or (
        _runs(order, kind, profile) if "run" in kind.scopes else 0
    )
    whole = (runs + spare) * max(1, len(samples))
    if whole > MOST_RUNS:
        raise BadInput(order.where(), f"{whole} run places", f"at most {MOST_RUNS} a workbook", "Split the list.")
    bodies = (4 if order.bodies is None else order.bodies) if "body" in kind.scopes else 0
    return Shape(
        samples=len(samples),
        runs=runs,
        spare=spare if "run" in kind.scopes else 0,
        bodies=bodies,
        record_rows=_record_rows(kind, calorimeter),
        table_rows=tuple((name, len(entries)) for name, entries in rows.items()),
        constants=tuple(one.name for one in stated),
    )


def _record_rows(kind: SheetKind, calorimeter: Calorimeter | None) -> int:
    """Rows for a temperature record: half as many again as the calorimeter's periods need, at most 120."""
    if not any(one.series for one in kind.fields):
        return 0
    if calorimeter is None or not calorimeter.step or not calorimeter.main_period:
        return 60
    fore, after = calorimeter.fore_period or 5.0, calorimeter.after_period or 5.0
    readings = (fore + calorimeter.main_period + after) * 60.0 / calorimeter.step + 1
    return min(MOST_ROWS, max(30, int(readings * 1.5)))


def _prefill(
    order: Order,
    kind: SheetKind,
    record: IssueRecord,
    profile: Profile,
    calorimeter: Calorimeter | None,
    samples: tuple[WorklistSample, ...],
    classes: Mapping[str, FuelClass],
) -> IssueRecord:
    """The record with labels, worklist values and the instrument's usual choices printed in."""
    plan = skeleton(kind, record.shape)
    refuse_strange_controls(order, record, samples)
    values = _sheet_values(order, record, calorimeter)
    ranges = _ranges(order, profile, calorimeter)
    for number, sample in enumerate(samples, start=1):
        fuel_class = classes.get(sample.sample_id)
        values.update(sample_values(order, record, number, sample, fuel_class, profile))
        ranges.update(sample_ranges(number, fuel_class, values))
    for _, run in owners(kind, record.shape):
        values.update({f"run{run}.{name}": value for name, value in _run_values(calorimeter).items()})
    values.update(order.values)
    known = {one: value for one, value in values.items() if one in plan.places and value not in (None, "")}
    given = {f"sample{number}.{name}" for number, one in enumerate(samples, start=1) for name in given_by(one)}
    locked = tuple(one for one in known if plan.places[one].field.locked or one in given)
    _refuse_unprintable(order, plan, with_values(record, ranges=ranges), known, samples)
    whole = with_values(record, prefilled=known, locked=locked, ranges=ranges, skeleton_sha256=plan.sha256)
    return with_values(whole, prefilled={**known, "sheet.constants_id": constants_sha256(record)[:16]})


def _refuse_unprintable(
    order: Order, plan: Skeleton, record: IssueRecord, known: Mapping[str, Value], samples: tuple[WorklistSample, ...]
) -> None:
    """What would be printed must be among the choices and within the range of its field. Raises all that is not."""
    faults: list[SheetcalError] = []
    for one, value in known.items():
        place = plan.places[one]
        listed = place.sample is not None and one.startswith("sample")
        where = order.where(samples[int(str(place.sample)[6:]) - 1]) if listed else order.where()
        try:
            check_choice(place, value, record, where)
        except BadInput as fault:
            faults.append(fault)
        number = isinstance(value, int | float) and not isinstance(value, bool)
        span = impossible(place, float(value), record) if number else None  # type: ignore[arg-type]
        if span is not None:
            faults.append(BadInput(where, f"{one}: {value:g} {place.field.unit}", span, "Correct the worklist."))
    if faults:
        raise BadInputs(faults)


def _sheet_values(order: Order, record: IssueRecord, calorimeter: Calorimeter | None) -> dict[str, Value]:
    lab = order.lab
    weighing = [one for one in lab.balances if (one.check_mass or 0) < 500] if lab else []
    return {
        "sheet.issue_id": record.issue_id,
        "sheet.job": order.job,
        "sheet.kind": record.kind,
        "sheet.version": str(record.kind_version),
        "sheet.profile": f"{record.profile} {record.profile_version}",
        "sheet.calorimeter": calorimeter.id if calorimeter else "",
        "sheet.issued_at": record.issued_at,
        "sheet.water_bookkeeping": calorimeter.water if calorimeter else "",
        "sheet.own_cooling_constant": calorimeter.cooling_constant if calorimeter else None,
        "sheet.water_reference": calorimeter.water_reference if calorimeter else None,
        "sheet.own_jacket_temperature": calorimeter.jacket_temperature if calorimeter else None,
        "sheet.own_convergence_temperature": calorimeter.convergence_temperature if calorimeter else None,
        "sheet.own_resolution": calorimeter.resolution if calorimeter else None,
        "sheet.own_main_period": calorimeter.main_period if calorimeter else None,
        "sheet.balance": weighing[0].id if len(weighing) == 1 else "",
        "sheet.runs_required": float(record.shape.runs),
    }


def _run_values(calorimeter: Calorimeter | None) -> dict[str, Value]:
    if calorimeter is None:
        return {"state": "planned"}
    fore, main = calorimeter.fore_period, calorimeter.main_period
    return {
        "state": "planned",
        "rise_source": calorimeter.rise,
        "end_of_main": fore + main if calorimeter.rise == "record" and fore and main else None,
        "fuse_lot": calorimeter.firing_wire,
        "thread_lot": calorimeter.thread,
        "ignition_energy": calorimeter.ignition,
        "wash_route": calorimeter.wash,
    }


def _ranges(order: Order, profile: Profile, calorimeter: Calorimeter | None) -> dict[str, dict[str, float]]:
    """Limits of the whole workbook that profile, instrument or lab file set in place of the kind's."""
    found: dict[str, dict[str, float]] = {}
    low, high = (profile.coefficients.get(name) for name in ("fill_low", "fill_high"))
    if low and high:
        found["run.oxygen_pressure"] = {"warn_low": low.value, "warn_high": high.value}
    if calorimeter and calorimeter.water_reference and calorimeter.water_tolerance:
        reference = calorimeter.water_reference  # the tolerance is judged by the rule calorimeter-water
        found["run.calorimeter_water"] = {"low": reference - 60.0, "high": reference + 60.0}
    if calorimeter and calorimeter.jacket_temperature is not None:
        jacket = calorimeter.jacket_temperature
        found["run.record_temperature"] = {"warn_low": jacket - 6.0, "warn_high": jacket + 6.0}
    usual = order.lab.laboratory.station_pressure if order.lab else None
    if usual is not None:
        found["sheet.station_pressure"] = {"warn_low": usual - 3.0, "warn_high": usual + 3.0}
    for name, (low_end, high_end) in (order.lab.ranges if order.lab else {}).items():
        found[name] = {"warn_low": low_end, "warn_high": high_end}
    return found
