"""Build an issue record: which samples, places, constants and prefilled readings a new workbook gets."""

from __future__ import annotations

import secrets
from collections.abc import Mapping
from dataclasses import dataclass, field
from datetime import UTC, datetime
from typing import Any

from sheetcal import __version__, profiles, units
from sheetcal.errors import BadInput, BadInputs, Refused, SheetcalError
from sheetcal.inputs.lab import Calorimeter, FuelClass, Lab
from sheetcal.inputs.worklist import Worklist, WorklistSample
from sheetcal.kinds import load, skeleton
from sheetcal.kinds.layout import owners
from sheetcal.kinds.record import constants_sha256, with_values
from sheetcal.model import Constant, IssueRecord, Shape, SheetKind, Value
from sheetcal.profiles import Profile
from sheetcal.verbs.tables import constants, tables

ALPHABET = "abcdefghjkmnpqrstvwxyz23456789"  # no letter that a reader takes for a digit
MOST_ROWS = 120
MOST_SAMPLES = 60
MOST_PLACES = 20
PLAIN_PROFILE = "first-principles"
DEFAULT_RUNS = {"calibration": 5, "specific-heat": 3, "vaporisation": 2, "heat-balance": 0}


@dataclass(frozen=True)
class Order:
    """What the user asked of `issue`; `moment` is local time at the laboratory."""

    kind: str
    lab: Lab | None = None
    worklist: Worklist | None = None
    samples: int | None = None
    runs: int | None = None
    spare: int | None = None
    bodies: int | None = None
    calorimeter: str | None = None
    profile: str | None = None
    unit: str | None = None
    paper: str = "A4"
    job: str = ""
    moment: datetime | None = None
    values: Mapping[str, Value] = field(default_factory=dict)


def new_id() -> str:
    """An unguessable id of four groups, e.g. b7k2m-9qxfd-h4t8w-n3c6r (97 bits)."""
    return "-".join("".join(secrets.choice(ALPHABET) for _ in range(5)) for _ in range(4))


def build(order: Order) -> IssueRecord:
    """The issue record of a new workbook. Raises BadInput or Refused, saying what to do."""
    kind = load(order.kind)
    moment = order.moment or _now(order.lab)
    calorimeter = _calorimeter(order, kind)
    samples = _samples(order, kind)
    classes = {one.sample_id: order.lab.fuel_class(one.fuel_class) for one in samples if order.lab and one.fuel_class}
    name = _profile_name(order, kind, samples, classes)
    profile = order.lab.profile(name) if order.lab else profiles.load(name)
    _refuse_unfit(order, kind, profile)
    extra = _extra_constants(order, profile, calorimeter)
    rows = tables(kind, order.lab, calorimeter.id if calorimeter else "", moment, profile)
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
            "unit": order.unit or "MJ/kg",
            "time_zone": order.lab.laboratory.time_zone if order.lab else "UTC",
            "mass_convention": order.lab.laboratory.mass_convention if order.lab else "in air",
            "calorimeter": calorimeter.id if calorimeter else "",
            "main_period": repr(calorimeter.main_period) if calorimeter and calorimeter.main_period else "",
            "resolution": repr(calorimeter.resolution) if calorimeter and calorimeter.resolution else "",
        },
    )
    return _prefill(order, kind, record, profile, calorimeter, samples, classes)


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
        if order.worklist or order.samples:
            raise BadInput(f"issue {kind.name}", "has no samples", "--runs", "Leave --worklist and --samples out.")
        return ()
    if order.worklist is not None:
        return order.worklist.samples
    count = 1 if order.samples is None else order.samples
    if not 1 <= count <= MOST_SAMPLES:
        raise BadInput("--samples", f"{count}", f"1 to {MOST_SAMPLES}", "Split the list.")
    return tuple(WorklistSample(sample_id="", line=0) for _ in range(count))


def _profile_name(
    order: Order, kind: SheetKind, samples: tuple[WorklistSample, ...], classes: Mapping[str, FuelClass]
) -> str:
    """The one profile of the workbook: as asked, or that of all fuel classes, or first principles."""
    if order.profile:
        return order.profile
    wanted = {classes[one.sample_id].profile for one in samples if one.role == "sample" and one.sample_id in classes}
    if len(wanted) > 1:
        listed = "; ".join(f"{name}: {', '.join(_with_profile(name, samples, classes))}" for name in sorted(wanted))
        what = f"needs several profiles ({listed})"
        raise Refused(_worklist_name(order), what, "one profile a workbook", "Split the worklist.")
    if wanted:
        return wanted.pop()
    if kind.name in ("calibration", "fuel"):
        return "iso-1928"
    return PLAIN_PROFILE


def _with_profile(name: str, samples: tuple[WorklistSample, ...], classes: Mapping[str, FuelClass]) -> list[str]:
    """The samples whose fuel class asks for a profile."""
    return [one.sample_id for one in samples if one.sample_id in classes and classes[one.sample_id].profile == name]


def _worklist_name(order: Order) -> str:
    return order.worklist.source.path.name if order.worklist else f"issue {order.kind}"


def _refuse_unfit(order: Order, kind: SheetKind, profile: Profile) -> None:
    if kind.name not in profile.kinds:
        fit = [name for name in profiles.names() if kind.name in profiles.load(name).kinds]
        raise BadInput(f"profile {profile.name}", f"does not serve {kind.name}", " or ".join(fit), "Choose one.")


def _extra_constants(order: Order, profile: Profile, calorimeter: Calorimeter | None) -> dict[str, Constant]:
    """Constants that follow from options and instrument: the second unit, the tolerance of the water."""
    unit = order.unit or (order.lab.reporting.unit if order.lab else "") or "MJ/kg"
    divisor = units.convert(1.0, unit, "J/g")
    extra = {
        "other_unit": Constant("other_unit", divisor, "J/g", f"one {unit}", "unit definition", "derived"),
    }
    if calorimeter and calorimeter.water_tolerance is not None:
        extra["water_tolerance"] = Constant(
            "water_tolerance",
            calorimeter.water_tolerance,
            "g",
            "calorimeter water, tolerance",
            "lab file",
            "laboratory",
        )
    return extra


def _refuse_without_heat_capacity(order: Order, kind: SheetKind, rows: Mapping[str, Any], moment: datetime) -> None:
    """A fuel workbook needs a heat capacity in force for every vessel it offers."""
    if kind.name != "fuel":
        return
    where = order.lab.path if order.lab else "issue fuel"
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
    least = DEFAULT_RUNS.get(kind.name, kind.runs_default)
    if kind.name == "calibration":
        stated = profile.coefficients.get("calibration_runs")
        least = max(5, int(stated.value) if stated else 5)
    wanted = least if order.runs is None else order.runs
    if not 1 <= wanted <= MOST_PLACES:
        raise BadInput("--runs", f"{wanted}", f"1 to {MOST_PLACES}", "Choose fewer.")
    if kind.name == "calibration" and wanted < least:
        raise BadInput("--runs", f"{wanted}", f"at least {least} by profile {profile.name}", "Plan more.")
    return wanted


def runs_of(sample: WorklistSample, order: Order, classes: Mapping[str, FuelClass]) -> int:
    """Required runs of one sample: worklist, option, fuel class, or 2."""
    if sample.runs is not None:
        return sample.runs
    if order.runs is not None:
        return order.runs
    return classes[sample.sample_id].runs if sample.sample_id in classes else 2


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
    if not 0 <= spare <= MOST_PLACES:
        raise BadInput("--spare", f"{spare}", f"0 to {MOST_PLACES}", "Choose fewer.")
    runs = max((runs_of(one, order, classes) for one in samples), default=0) or (
        _runs(order, kind, profile) if "run" in kind.scopes else 0
    )
    bodies = 0
    if "body" in kind.scopes:
        bodies = 4 if order.bodies is None else order.bodies
        if not 2 <= bodies <= 8:
            raise BadInput("--bodies", f"{bodies}", "2 to 8", "Split the balance.")
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
    values = _sheet_values(order, record, calorimeter)
    ranges = _ranges(order, profile, calorimeter)
    for number, sample in enumerate(samples, start=1):
        fuel_class = classes.get(sample.sample_id)
        values.update(_sample_values(order, record, number, sample, fuel_class, profile))
        ranges.update(_sample_ranges(record.shape, number, fuel_class, values))
    for _, run in owners(kind, record.shape):
        values.update({f"run{run}.{name}": value for name, value in _run_values(calorimeter).items()})
    values.update(order.values)
    known = {one: value for one, value in values.items() if one in plan.places and value not in (None, "")}
    locked = tuple(
        one for one in known if _is_locked(one, plan.places[one].field.origin, plan.places[one].field.locked)
    )
    whole = with_values(record, prefilled=known, locked=locked, ranges=ranges, skeleton_sha256=plan.sha256)
    return with_values(whole, prefilled={**known, "sheet.constants_id": constants_sha256(record)[:16]})


def _is_locked(one: str, origin: str, always: bool) -> bool:
    return always or (origin == "worklist" and one.startswith("sample"))


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


def _sample_values(
    order: Order,
    record: IssueRecord,
    number: int,
    sample: WorklistSample,
    fuel_class: FuelClass | None,
    profile: Profile,
) -> dict[str, Value]:
    """Labels, limits and worklist values of one sample, by id."""
    control = sample.role == "control"
    values: dict[str, Value] = {
        "sample_id": sample.sample_id,
        "order": sample.order,
        "client": sample.client,
        "description": sample.description,
        "fuel_class": sample.fuel_class,
        "received": sample.received.isoformat() if sample.received else "",
        "condition": sample.condition,
        "role": sample.role,
        "approval": sample.approval,
        "customer_limit": sample.customer_limit,
        "customer_basis": sample.basis,
        "expected_gross": sample.expected_gross,
        "runs_required": float(runs_of(sample, order, {sample.sample_id: fuel_class} if fuel_class else {})),
        "control_lot": sample.sample_id if control else "",
        "hydrogen_includes": sample.hydrogen.replace("_", " "),
    }
    values.update(_class_values(sample, fuel_class, profile, order, record))
    for one in sample.values:
        parts: dict[str, Value] = {"": one.value, "_mark": one.mark, "_basis": one.basis, "_source": one.source}
        values.update({f"{one.quantity}{end}": value for end, value in parts.items()})
    values.update({f"{quantity}_source": source for quantity, source in sample.sources})
    return {f"sample{number}.{name}": value for name, value in values.items()}


def _class_values(
    sample: WorklistSample, fuel_class: FuelClass | None, profile: Profile, order: Order, record: IssueRecord
) -> dict[str, Value]:
    """What the fuel class says of target mass, limits and expected values. Raises Refused without a limit."""
    stated = profile.coefficients.get("repeatability_limit")
    limit = fuel_class.r if fuel_class and fuel_class.r is not None else (stated.value if stated else None)
    if limit is None and sample.role != "control":
        where = order.lab.path if order.lab else f"profile {profile.name}"
        raise Refused(
            where,
            f"no repeatability limit for {sample.sample_id or 'the samples'} (class {sample.fuel_class or 'none'})",
            'r = "... J/g" in the class',
            "Give it.",
        )
    basis = (fuel_class.r_basis if fuel_class else "") or profile.texts.get("r_basis", "as analysed")
    expected = fuel_class.expected if fuel_class else None
    unknown = profile.coefficients.get("unknown_energy")
    needs_approval = bool(fuel_class and fuel_class.needs_approval)
    fallback = expected[1] if expected else (unknown.in_unit("J/g") if unknown else None)
    composition = profile.coefficients.get("composition_limit")
    limit_of_class = fuel_class.composition_limit if fuel_class else None
    return {
        "repeatability_limit": limit,
        "repeatability_basis": basis,
        "needs_approval": "yes" if needs_approval else "no",
        "expected_gross": sample.expected_gross if sample.expected_gross is not None else fallback,
        "first_mass": fuel_class.first_mass if fuel_class else None,
        "first_limit": (fuel_class.first_mass or 0.5) if needs_approval and fuel_class else None,
        "expected_low": expected[0] if expected else None,
        "expected_high": expected[1] if expected else None,
        "composition_limit": limit_of_class
        if limit_of_class is not None
        else (composition.value if composition else None),
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


def _sample_ranges(
    shape: Shape, number: int, fuel_class: FuelClass | None, values: Mapping[str, Value]
) -> dict[str, dict[str, float]]:
    """Usual ranges of a sample's class, and the band round its target mass."""
    if fuel_class is None or values.get(f"sample{number}.role") != "sample":
        return {}
    found = {
        f"sample{number}.{name}": {"warn_low": low, "warn_high": high}
        for name, (low, high) in fuel_class.ranges.items()
    }
    if fuel_class.first_mass:
        band = {"warn_low": fuel_class.first_mass * 0.7, "warn_high": fuel_class.first_mass * 1.3}
        for run in range((number - 1) * shape.places + 1, number * shape.places + 1):
            found[f"run{run}.sample_mass"] = band
    return found


def refuse_chlorine(record: IssueRecord) -> None:
    """Stop before issue a sample whose chlorine is known to be above the method's limit. Raises BadInputs."""
    limit = next((one.value for one in record.constants if one.name == "chlorine_limit"), None)
    faults: list[SheetcalError] = []
    for number in range(1, record.shape.samples + 1):
        value = record.prefilled.get(f"sample{number}.chlorine")
        if limit is not None and isinstance(value, int | float) and value > limit:
            name = record.prefilled.get(f"sample{number}.sample_id")
            faults.append(
                Refused(
                    f"worklist, {name}, Cl",
                    f"chlorine {value:g} % above the method's limit: corrosion, chlorine gas",
                    f"at most {limit:g} %",
                    "STOP: not by this method. Take the sample off the worklist.",
                )
            )
    if faults:
        raise BadInputs(faults)
