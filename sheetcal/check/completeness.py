"""What is still missing: required readings of required places and of spare places begun."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from functools import lru_cache

from sheetcal.kinds.dates import serial
from sheetcal.kinds.layout import Skeleton, owners
from sheetcal.model import Field, IssueRecord, SheetKind, Value

Readings = Mapping[str, "Value | list[Value]"]
UNCOUNTED = ("void", "not needed")


def missing(kind: SheetKind, plan: Skeleton, record: IssueRecord, readings: Readings) -> list[str]:
    """Ids of required readings that hold nothing, in workbook order; a gap in a series names its element."""
    found: list[str] = []
    for one in required(kind, plan, record, readings):
        value = readings.get(one)
        if _empty(value):
            found.append(one)
        elif isinstance(value, list):
            found += _gaps(one, value, readings)
    return found


def required(kind: SheetKind, plan: Skeleton, record: IssueRecord, readings: Readings) -> Iterator[str]:
    """Ids of every reading the workbook cannot do without, block by block."""
    for block in required_blocks(kind, plan, record, readings):
        for one in required_fields(kind, block.rstrip("0123456789")):
            if _is_needed(one, block, record, readings):
                yield f"{block}.{one.name}"


def _gaps(one: str, values: list[Value], readings: Readings) -> list[str]:
    """Elements that hold nothing up to the end of the longest series of the same block."""
    block = one.partition(".")[0]
    lengths = [
        len(other) for name, other in readings.items() if isinstance(other, list) and name.startswith(f"{block}.")
    ]
    padded = values + [None] * (max(lengths) - len(values))
    return [f"{one}[{number}]" for number, value in enumerate(padded, start=1) if value is None or value == ""]


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
        blocks += [f"run{run}" for run in group if f"run{run}" in started or run in counting[:wanted]]
    return blocks


def begun(readings: Readings, record: IssueRecord) -> set[str]:
    """Blocks in which a person or a logger has filled anything beyond what was printed at issue."""
    printed = record.prefilled
    return {
        one.partition(".")[0]
        for one, value in readings.items()
        if not _empty(value) and not (one in printed and _is_printed(value, printed[one]))
    }


def _is_printed(value: Value | list[Value], printed: Value) -> bool:
    """Whether a cell still holds what was printed there; printed dates are text, in the cell they are numbers."""
    if value == printed:
        return True
    if isinstance(printed, str) and isinstance(value, float | int) and not isinstance(value, bool):
        try:
            return serial(printed) == value
        except ValueError:
            return False
    return False


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


def _is_needed(one: Field, block: str, record: IssueRecord, readings: Readings) -> bool:
    """Whether the field's condition holds here; a void run needs only its reason."""
    if readings.get(f"{block}.state") in UNCOUNTED and one.name not in ("state", "void_reason"):
        return False
    return all(_holds(block, name, values, record, readings) for name, values in (one.needed or {}).items())


def _holds(block: str, name: str, values: tuple[str, ...], record: IssueRecord, readings: Readings) -> bool:
    one = name if "." in name else f"{block}.{name}"
    value = readings.get(one, record.prefilled.get(one) if one in record.locked else None)
    if "*" in values:
        return not _empty(value)
    if "-" in values:
        return _empty(value)
    return value in values


def _empty(value: Value | list[Value]) -> bool:
    return value is None or value == "" or value == []
