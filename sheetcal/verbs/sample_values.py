"""What a workbook prints of its samples: labels, limits, worklist values, and the band round the target mass."""

from __future__ import annotations

from collections.abc import Mapping

from sheetcal import profiles
from sheetcal.errors import BadInput, BadInputs, Refused, SheetcalError
from sheetcal.inputs.lab import FuelClass
from sheetcal.inputs.worklist import WorklistSample
from sheetcal.model import IssueRecord, Value
from sheetcal.profiles import Profile
from sheetcal.verbs.order import Order

NATURE_LOWEST = -3000.0  # J/g; carbonates take up heat: a class stated from 0 does not mean "never below"


def given_by(sample: WorklistSample) -> list[str]:
    """Names of the readings a worklist line gives: they are printed locked. A blank cell stays an open reading."""
    plain = {
        "expected_gross": _positive(sample.expected_gross),
        "approval": sample.approval,
        "hydrogen_includes": sample.hydrogen,
    }
    found = [name for name, value in plain.items() if value not in (None, "")]
    for one in sample.values:
        parts = {"": one.value, "_mark": one.mark, "_basis": one.basis, "_source": one.source}
        found += [f"{one.quantity}{end}" for end, value in parts.items() if value not in (None, "")]
    return found + [f"{quantity}_source" for quantity, _ in sample.sources]


def runs_of(sample: WorklistSample, order: Order, classes: Mapping[str, FuelClass]) -> int:
    """Required runs of one sample: worklist, option, fuel class, or 2."""
    if sample.runs is not None:
        return sample.runs
    if order.runs is not None:
        return order.runs
    return classes[sample.sample_id].runs if sample.sample_id in classes else 2


def sample_values(
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


def _first_limit(fuel_class: FuelClass, profile: Profile) -> float | None:
    """The largest mass of a first firing: what the class says, or the profile for a material nobody knows."""
    unknown = profile.coefficients.get("unknown_mass")
    return fuel_class.first_mass or (unknown.in_unit("g") if unknown else None)


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
    expected = fuel_class.expected or profiles.class_gross(fuel_class.name) if fuel_class else None
    unknown = profile.coefficients.get("unknown_energy")
    needs_approval = bool(fuel_class and fuel_class.needs_approval)
    known = _positive(sample.expected_gross) or (_control_gross(sample, record) if sample.role == "control" else None)
    fallback = expected[1] if expected else (unknown.in_unit("J/g") if unknown else None)
    composition = profile.coefficients.get("composition_limit")
    limit_of_class = fuel_class.composition_limit if fuel_class else None
    chlorine = profile.coefficients.get("chlorine_limit")
    chlorine_of_class = fuel_class.chlorine_limit if fuel_class else None
    return {
        "chlorine_limit": chlorine_of_class
        if chlorine_of_class is not None
        else (chlorine.in_unit("%") if chlorine else None),
        "repeatability_limit": limit,
        "repeatability_basis": basis,
        "needs_approval": "yes" if needs_approval else "no",
        "expected_gross": fallback if known is None else known,
        "first_mass": fuel_class.first_mass if fuel_class else None,
        "first_limit": _first_limit(fuel_class, profile) if needs_approval and fuel_class else None,
        "expected_low": (expected[0] if expected[0] > 0 else NATURE_LOWEST) if expected else None,
        "expected_high": expected[1] if expected else None,
        "composition_limit": limit_of_class
        if limit_of_class is not None
        else (composition.value if composition else None),
    }


def _positive(value: float | None) -> float | None:
    """An expected heat that can limit a charge; none or less than none says nothing of it."""
    return value if value is not None and value > 0 else None


def _control_gross(sample: WorklistSample, record: IssueRecord) -> float | None:
    """J/g of a control: its certificate for a mass weighed as the laboratory weighs, or the book value."""
    for table, column in (("aid", "heat"), ("certified", "value")):
        for row in record.tables.get(table, ()):
            value = row.get(column)
            if row.get("lot") == sample.sample_id and isinstance(value, int | float):
                return float(round(value))
    return None


def sample_ranges(
    number: int, fuel_class: FuelClass | None, values: Mapping[str, Value]
) -> dict[str, dict[str, float]]:
    """Usual ranges of a sample's class; its target mass is judged by a rule."""
    if fuel_class is None or values.get(f"sample{number}.role") != "sample":
        return {}
    return {
        f"sample{number}.{name}": {"warn_low": low, "warn_high": high}
        for name, (low, high) in fuel_class.ranges.items()
    }


def refuse_strange_controls(order: Order, record: IssueRecord, samples: tuple[WorklistSample, ...]) -> None:
    """A control is a lot whose value the lab file states: without it no deviation can be shown. Raises BadInputs."""
    lots = [str(row["lot"]) for row in record.tables.get("certified", ())]
    faults = [
        BadInput(order.where(one), f"control {one.sample_id} is no certified lot", ", ".join(lots), "Name the lot.")
        for one in samples
        if one.role == "control" and one.sample_id not in lots
    ]
    if faults:
        raise BadInputs(faults)


def refuse_chlorine(record: IssueRecord) -> None:
    """Stop before issue a sample whose chlorine is known to be above the method's limit. Raises BadInputs."""
    whole = next((one.value for one in record.constants if one.name == "chlorine_limit"), None)
    faults: list[SheetcalError] = []
    for number in range(1, record.shape.samples + 1):
        limit = record.prefilled.get(f"sample{number}.chlorine_limit", whole)
        value = record.prefilled.get(f"sample{number}.chlorine")
        if isinstance(limit, int | float) and isinstance(value, int | float) and value > limit:
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
