"""Probable causes of a disagreement in its workbook: the place's own equation, its neighbours, its history."""

from __future__ import annotations

import re
from collections.abc import Iterator, Mapping

from sheetcal.check import terms
from sheetcal.check.case import Case, called, is_number
from sheetcal.check.signatures import BASES, Candidate, Known, named
from sheetcal.model import Field, Value

ROUNDED = ("ROUNDED_TO_STEP", "IN_MJ")
TABLE = re.compile(r"table\.(\w+)\.(\w+)\[(\d+)\]")
NAMES = ("id", "lot")  # what a row of a table is known by
KILOGRAMS = 1000.0  # kg/m3 in 1 g/cm3


def of_place(case: Case, one: str, found: Value, expected: Value) -> list[str]:
    """Sentences for a reading or result, best first; empty where nothing fits or one of the two is no number."""
    if not is_number(found) or not is_number(expected) or found == expected:
        return []
    place, _ = case.place(one)
    more = [*_neighbours(case, one, place.field), *terms.of_result(case, one, float(expected))]
    known = known_of(case, one, place.field)
    sentences = named(float(found), float(expected), known, more)
    return sentences or _before_rounding(case, one, float(found), float(expected), place.field)


def known_of(case: Case, one: str, fld: Field) -> Known:
    """What the workbook knows of a place beside its value."""
    block = one.partition(".")[0]
    sample = case.sample_of(block)
    number = case.number
    own = number(f"{block}.moisture_used") if block.startswith("run") else None
    return Known(
        unit=fld.unit,
        name=fld.name,
        digits=None if fld.step else decimals(fld.resolution),
        moisture=own if own is not None else number(f"{sample}.moisture_for_basis") if sample else None,
        total_moisture=number(f"{sample}.total_moisture_counted") if sample else None,
        ash=number(f"{sample}.ash_dry") if sample else None,
        molar_mass=number("sheet.molar_mass"),
    )


def _before_rounding(case: Case, one: str, found: float, expected: float, fld: Field) -> list[str]:
    """A rounded result inherits the causes of the value it rounds."""
    if fld.step is None or fld.step.cell not in ROUNDED:
        return []
    place, _ = case.place(one)
    ids = case.parts.skeleton.resolve(place, fld.step.args["value"])
    before = case.expected.get(ids[0]) if ids else None
    if not is_number(before) or not before or not expected:
        return []
    if abs(found - before) < abs(found - expected) and abs(found - expected) <= 1.01 * _step(case, place.field):
        return ["the value was probably rounded to the wrong side, or not rounded"]
    if fld.step.cell == "IN_MJ":
        return of_place(case, ids[0], found * float(before) / expected, before)
    more = terms.of_result(case, ids[0], float(before))
    upper = case.place(ids[0])[0].field
    known = known_of(case, ids[0], upper)
    half = 0.5 * _step(case, fld)
    return named(found, float(before), Known(known.unit, known.name, None, half, known.moisture,
                 known.total_moisture, known.ash, known.molar_mass), more)  # fmt: skip


def _step(case: Case, fld: Field) -> float:
    """What a rounded result is rounded to."""
    reference = fld.step.args.get("step", "") if fld.step else ""
    name = reference.removeprefix("const.")
    return next((one.value for one in case.parts.record.constants if one.name == name), fld.resolution or 0.0)


def _neighbours(case: Case, one: str, fld: Field) -> Iterator[Candidate]:
    """The same line of other runs, samples or bodies; other results of the block in the same unit."""
    block = one.partition(".")[0]
    for other, place in case.parts.skeleton.places.items():
        home = other.partition(".")[0]
        same_line = place.field.key == fld.key and home != block
        same_unit = home == block and other != one and _alike(place.field, fld)
        if not same_line and not same_unit:
            continue
        value = case.expected.get(other) if place.field.step else case.parts.readings.get(other)
        if is_number(value) and value:
            if same_line:
                yield Candidate(float(value), f"the value of {home} probably stands in the place of {block}'s", 3)
            else:
                yield Candidate(float(value), f"the value of the line `{called(place.field.label)}` stands here", 3)


def _alike(other: Field, fld: Field) -> bool:
    """Whether the two are values of heat per mass that a person may take for each other."""
    based = any(f"_{name}" in fld.name for name in BASES) and any(f"_{name}" in other.name for name in BASES)
    return based and other.unit == fld.unit and other.step is not None and not other.series


# --- constants --------------------------------------------------------------------------------------------


def of_constant(case: Case, one: str, found: Value, expected: Value) -> list[str]:
    """Sentences for a constant or a value of a table, best first."""
    if not is_number(found) or not is_number(expected) or found == expected:
        return []
    match = TABLE.fullmatch(one)
    unit = _unit(case, one, match)
    earlier = [Candidate(value, words, 0) for value, words in case.earlier.get(one, ())]
    rows = list(_rows(case, match, float(expected))) if match else []
    return named(float(found), float(expected), Known(unit=unit), [*earlier, *rows])


def _unit(case: Case, one: str, match: re.Match[str] | None) -> str | None:
    if match is None:
        name = one.partition(".")[2]
        return next((item.unit for item in case.parts.record.constants if item.name == name), None)
    columns = dict(column.split(":") for column in case.parts.kind.tables.get(match[1], ()))
    return columns.get(match[2])


def _rows(case: Case, match: re.Match[str], expected: float) -> Iterator[Candidate]:
    """The same column of other rows, and a certificate's value for the other way of weighing."""
    table, column, number = match[1], match[2], int(match[3])
    rows = case.parts.record.tables.get(table, ())
    for index, row in enumerate(rows, start=1):
        value = row.get(column)
        if index != number and is_number(value):
            name = next((row[key] for key in NAMES if key in row), index)
            yield Candidate(float(value), f"the value of {table} {name} was probably taken", 0)
    if table == "certified" and column == "value" and number <= len(rows):
        yield from _conventions(case, rows[number - 1], expected)


def _conventions(case: Case, row: Mapping[str, Value], expected: float) -> Iterator[Candidate]:
    """A mass in air weighs less than in vacuum by the air it displaces, less that of the weights."""
    constants = {one.name: one.value for one in case.parts.record.constants}
    air, weights, density = constants.get("air_density"), constants.get("weight_density"), row.get("density")
    if not is_number(density) or not air or not weights:
        return
    factor = (1.0 - air / weights) / (1.0 - air / (KILOGRAMS * float(density)))
    in_vacuum = row.get("convention") == "in vacuum"
    value, words = (expected * factor, "in air") if in_vacuum else (expected / factor, "in vacuum")
    yield Candidate(value, f"the certificate's value per gram weighed {words} was probably taken (buoyancy)", 0)


def decimals(resolution: float | None) -> int | None:
    """Decimal places of a resolution: 0.0001 -> 4."""
    if resolution is None or resolution <= 0:
        return None
    text = f"{resolution:.10f}".rstrip("0")
    return len(text.partition(".")[2])
