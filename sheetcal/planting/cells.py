"""Slips in single cells that nobody should touch: results typed over, stored values, labels, constants."""

from __future__ import annotations

import re
from collections.abc import Callable, Iterator

from sheetcal.kinds.glance import glances
from sheetcal.kinds.record import constant_cells
from sheetcal.model import Place
from sheetcal.planting.package import formula, number, text
from sheetcal.planting.registry import Spot, slip
from sheetcal.planting.sheet import Sheet

LARGE = 100.0  # of a result: its last digits are a small part of it


def _numbers(sheet: Sheet, *units: str) -> Iterator[tuple[Place, float]]:
    """Results that are numbers other than 0, of some units or of any."""
    for place in sheet.places("result", "number", "integer"):
        value = sheet.results[place.id]
        if isinstance(value, float | int) and value and (not units or place.field.unit in units):
            yield place, float(value)


def _over(sheet: Sheet, change: Callable[[float], float], *words: str, units: tuple[str, ...] = ()) -> Iterator[Spot]:
    """A changed value typed over the formula of a result."""
    for place, value in _numbers(sheet, *units):
        yield Spot(place.id, cells={place.where: number(change(value))}, cause=words)


@slip("result-typed-over")
def result_typed_over_unchanged(sheet: Sheet) -> Iterator[Spot]:
    """Copied and pasted as a value: equal today."""
    yield from _over(sheet, lambda value: value)


@slip("result-typed-over")
def result_typed_over_by_a_better_one(sheet: Sheet) -> Iterator[Spot]:
    """A figure that pleases more: no cause to be recognised."""
    yield from _over(sheet, lambda value: value * 1.00237)


@slip("result-typed-over")
def result_rounded_by_hand(sheet: Sheet) -> Iterator[Spot]:
    """The figure of the calculator, with fewer digits."""
    for place, value in _numbers(sheet):
        if abs(value) > LARGE and abs(value - round(value)) > 1e-3:
            yield Spot(place.id, cells={place.where: number(float(round(value)))}, cause=("rounded", "cut off"))


@slip("result-typed-over")
def result_typed_in_kilojoules(sheet: Sheet) -> Iterator[Spot]:
    """J typed as kJ."""
    yield from _over(sheet, lambda value: value / 1000.0, "thousand", units=("J/g", "J", "J/K"))


@slip("result-typed-over")
def result_typed_in_calories(sheet: Sheet) -> Iterator[Spot]:
    """J/g typed as cal/g."""
    yield from _over(sheet, lambda value: value / 4.184, "calories", units=("J/g", "J/K", "J/(g K)"))


@slip("result-typed-over")
def result_with_its_sign_lost(sheet: Sheet) -> Iterator[Spot]:
    """A minus forgotten, or one too many."""
    for place, value in _numbers(sheet):
        if place.field.unit not in (None, "1"):  # a count has no sign to lose
            yield Spot(place.id, cells={place.where: number(-value)}, cause=("sign",))


@slip("result-typed-over", ("fuel",))
def result_of_the_other_basis(sheet: Sheet) -> Iterator[Spot]:
    """The value as analysed typed where the dry one belongs, and the other way round."""
    for place, value in _numbers(sheet, "J/g"):
        other = place.id.replace("_dry", "_analysed") if place.id.endswith("_dry") else ""
        held = sheet.results.get(other)
        if isinstance(held, float) and held != value:
            yield Spot(place.id, cells={place.where: number(held)}, cause=("basis", "moisture", "as analysed"))


@slip("result-typed-over")
def result_of_the_run_beside(sheet: Sheet) -> Iterator[Spot]:
    """The value of the neighbouring run copied over."""
    for place, value in _numbers(sheet):
        block, _, name = place.id.partition(".")
        if block.startswith(("run", "body")):
            head, count = re.fullmatch(r"([a-z]+)(\d+)", block).groups()  # type: ignore[union-attr]
            other = sheet.results.get(f"{head}{int(count) - 1}.{name}")
            if isinstance(other, float) and other and abs(other / value - 1) > 1e-3:
                yield Spot(place.id, cells={place.where: number(other)}, cause=(f"{head}{int(count) - 1}", "neighbour"))


@slip("result-typed-over")
def formula_deleted(sheet: Sheet) -> Iterator[Spot]:
    """The delete key on the wrong cell."""
    for place in sheet.places("result"):
        yield Spot(place.id, cells={place.where: None})


@slip("result-typed-over")
def table_at_a_glance_typed_over(sheet: Sheet) -> Iterator[Spot]:
    """The front page made prettier than the results."""
    for one in glances(sheet.plan):
        held = one.value({**sheet.readings, **sheet.results})
        if isinstance(held, float):
            yield Spot(f"{one.tab}!{one.cell}", cells={f"{one.tab}!{one.cell}": number(held * 1.01)})


@slip("result-stale")
def stored_value_forged(sheet: Sheet) -> Iterator[Spot]:
    """The stored value changed in the file, the formula left in place."""
    for place, value in _numbers(sheet):
        assert place.formula is not None
        yield Spot(place.id, cells={place.where: formula(place.formula, value * 1.01)})


@slip("label-altered")
def label_rewritten(sheet: Sheet) -> Iterator[Spot]:
    """What a line is called, changed by hand."""
    for tab, row, name in _lines(sheet):
        yield Spot(f"{tab}!B{row}", cells={f"{tab}!B{row}": text(f"{name} (corrected)")})


@slip("label-altered")
def unit_rewritten(sheet: Sheet) -> Iterator[Spot]:
    """Another unit written beside a line."""
    for place in sheet.plan.places.values():
        if place.tab in ("Readings", "Results") and place.field.unit in ("g", "J/g", "J/K", "K") and place.column == 5:
            yield Spot(f"{place.tab}!C{place.row}", cells={f"{place.tab}!C{place.row}": text("kg")})


def _lines(sheet: Sheet) -> Iterator[tuple[str, int, str]]:
    """Tab, row and label of each line of the grid."""
    seen = set()
    for place in sheet.plan.places.values():
        if place.tab in ("Front", "Readings", "Results") and (place.tab, place.row) not in seen:
            seen.add((place.tab, place.row))
            yield place.tab, place.row, place.field.label


@slip("label-altered")
def printed_reading_overwritten(sheet: Sheet) -> Iterator[Spot]:
    """A value the worklist or the laboratory file printed, typed over."""
    for one in sheet.record.locked:
        place = sheet.plan.places.get(one)
        value = sheet.readings.get(one)
        if place is not None and place.formula is None and isinstance(value, float | int):
            yield Spot(one, cells={place.where: number(value + 1.0)})


@slip("constant-altered")
def constant_typed_over(sheet: Sheet) -> Iterator[Spot]:
    """A constant of the laboratory or of the method changed on its tab."""
    for _, cell, value, _ in constant_cells(sheet.plan.kind, sheet.record):
        if isinstance(value, float) and value:
            yield Spot(f"Constants!{cell}", cells={f"Constants!{cell}": number(value * 1.003)})


@slip("record-altered")
def issue_record_edited(sheet: Sheet) -> Iterator[Spot]:
    """The hidden tab unhidden and changed."""
    yield Spot("Issue record", cells={"Issue record!B1": text("aaaaa-bbbbb-ccccc-ddddd")})
