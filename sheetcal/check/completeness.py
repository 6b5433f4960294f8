"""What is still missing: required readings of required places and of spare places begun."""

from __future__ import annotations

from collections.abc import Mapping
from functools import lru_cache

from sheetcal.kinds.layout import Skeleton, owners
from sheetcal.model import Field, IssueRecord, SheetKind, Value

Readings = Mapping[str, "Value | list[Value]"]
UNCOUNTED = ("void", "not needed")


def missing(kind: SheetKind, plan: Skeleton, record: IssueRecord, readings: Readings) -> list[str]:
    """Ids of required readings that hold nothing, in workbook order."""
    found: list[str] = []
    for block in required_blocks(kind, plan, record, readings):
        scope = block.rstrip("0123456789")
        found += [
            f"{block}.{one.name}"
            for one in required_fields(kind, scope)
            if _empty(readings.get(f"{block}.{one.name}")) and _is_needed(one, block, kind, plan, record, readings)
        ]
    return found


def required_blocks(kind: SheetKind, plan: Skeleton, record: IssueRecord, readings: Readings) -> list[str]:
    """`sheet`, every sample and body, and the run places that count: required ones and spare ones begun."""
    started = begun(readings, record)
    blocks = ["sheet"]
    blocks += [f"sample{number}" for number in range(1, plan.shape.samples + 1)]
    blocks += [
        f"body{number}" for number in range(1, plan.shape.bodies + 1) if number <= 2 or f"body{number}" in started
    ]
    for sample, group in _by_sample(kind, plan).items():
        wanted = _wanted(record, sample, plan)
        counting = [run for run in group if readings.get(f"run{run}.state") not in UNCOUNTED]
        blocks += [
            f"run{run}" for run in group if f"run{run}" in started or (run in counting[:wanted] and run in group)
        ]
    return blocks


def begun(readings: Readings, record: IssueRecord) -> set[str]:
    """Blocks in which a person or a logger has filled anything beyond what was printed at issue."""
    return {
        one.partition(".")[0]
        for one, value in readings.items()
        if not _empty(value) and record.prefilled.get(one) != value
    }


def _by_sample(kind: SheetKind, plan: Skeleton) -> dict[int | None, list[int]]:
    groups: dict[int | None, list[int]] = {}
    for sample, run in owners(kind, plan.shape):
        groups.setdefault(sample, []).append(run)
    return groups


def _wanted(record: IssueRecord, sample: int | None, plan: Skeleton) -> int:
    stated = record.prefilled.get(f"sample{sample}.runs_required") if sample else None
    return int(stated) if isinstance(stated, int | float) else plan.shape.runs


@lru_cache(maxsize=64)
def required_fields(kind: SheetKind, scope: str) -> tuple[Field, ...]:
    """Readings of a scope that may be required."""
    return tuple(one for one in kind.fields if one.scope == scope and one.needed is not None and one.step is None)


def _is_needed(
    one: Field, block: str, kind: SheetKind, plan: Skeleton, record: IssueRecord, readings: Readings
) -> bool:
    """Whether the field's condition holds here; a void run needs only its reason."""
    state = readings.get(f"{block}.state")
    if state in UNCOUNTED and one.name not in ("state", "void_reason"):
        return False
    assert one.needed is not None
    return all(_holds(block, name, values, record, readings) for name, values in one.needed.items())


def _holds(block: str, name: str, values: tuple[str, ...], record: IssueRecord, readings: Readings) -> bool:
    one = name if "." in name else f"{block}.{name}"
    value = readings.get(one, record.prefilled.get(one))
    if "*" in values:
        return not _empty(value)
    if "-" in values:
        return _empty(value)
    return value in values


def _empty(value: Value | list[Value]) -> bool:
    return value is None or value == "" or value == []
