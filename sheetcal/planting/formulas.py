"""Slips in formulas: a sign turned, a neighbour's cell, a range too short, a number in place of a cell, rounding."""

from __future__ import annotations

import re
from collections.abc import Callable, Iterator

from sheetcal.kinds.layout import column_letter
from sheetcal.model import Place
from sheetcal.planting.package import formula
from sheetcal.planting.registry import Spot, slip
from sheetcal.planting.sheet import Sheet

CELL = re.compile(r"(?<![A-Za-z0-9_!:$.])([A-Z]{1,2})(\d+)(?![A-Za-z0-9_(:.])")
RANGE = re.compile(r"(?<![A-Za-z0-9_!:$.])([A-Z]{1,2})(\d+):([A-Z]{1,2})(\d+)")
Rewrite = Callable[[str, Place], str | None]


def rewritten(sheet: Sheet, change: Rewrite, *words: str) -> Iterator[Spot]:
    """Formulas of numbers that the change touches; the stored value stays, as if nothing was calculated."""
    for place in sheet.places("result", "number", "integer"):
        assert place.formula is not None
        written = change(place.formula, place)
        value = sheet.results[place.id]
        if written and written != place.formula and isinstance(value, float | int):
            yield Spot(place.id, cells={place.where: formula(written, value)}, cause=words)


def _last(pattern: re.Pattern[str], written: str, new: Callable[[re.Match[str]], str]) -> str | None:
    """The last match replaced: the value, not the guards before it."""
    found = list(pattern.finditer(written))
    if not found:
        return None
    last = found[-1]
    return written[: last.start()] + new(last) + written[last.end() :]


@slip("formula-altered", also=("formula-dimension",))
def cell_of_the_column_beside(sheet: Sheet) -> Iterator[Spot]:
    """A reference that slid one column to the right when the formula was copied."""

    def slid(written: str, place: Place) -> str | None:
        return _last(CELL, written, lambda one: f"{column_letter(_number(one[1]) + 1)}{one[2]}")

    yield from rewritten(sheet, slid)


@slip("formula-altered", also=("formula-dimension",))
def result_times_a_factor_of_ones_own(sheet: Sheet) -> Iterator[Spot]:
    """A correction that somebody thought right."""
    yield from rewritten(sheet, lambda written, _: f"=({written[1:]})*1.0042")


@slip("formula-altered", also=("formula-dimension",))
def rounded_in_mid_chain(sheet: Sheet) -> Iterator[Spot]:
    """ROUND around a result that others stand on."""
    for place in sheet.places("result", "number"):
        value = sheet.results[place.id]
        if place.field.step and not place.field.step.reported and isinstance(value, float) and value != round(value, 1):
            yield Spot(place.id, cells={place.where: formula(f"=ROUND({(place.formula or '')[1:]},1)", value)})


@slip("formula-altered", also=("formula-dimension",))
def plus_for_minus(sheet: Sheet) -> Iterator[Spot]:
    """A sign turned in the value of the formula."""

    def turned(written: str, place: Place) -> str | None:
        return _last(re.compile(r"(?<=[A-Z0-9)])-(?=[A-Z])"), written, lambda _: "+")

    yield from rewritten(sheet, turned)


@slip("formula-altered", also=("formula-dimension",))
def range_too_short(sheet: Sheet) -> Iterator[Spot]:
    """A range that ends one column or row before its last cell."""

    def short(written: str, place: Place) -> str | None:
        return _last(RANGE, written, _shorter)

    yield from rewritten(sheet, short)


def _shorter(one: re.Match[str]) -> str:
    if one[1] != one[3]:
        return f"{one[1]}{one[2]}:{column_letter(_number(one[3]) - 1)}{one[4]}"
    return f"{one[1]}{one[2]}:{one[3]}{int(one[4]) - 1}"


@slip("formula-volatile")
def clock_in_a_formula(sheet: Sheet) -> Iterator[Spot]:
    """A formula that asks for today."""
    yield from rewritten(sheet, lambda written, _: f"={written[1:]}+0*TODAY()")


@slip("formula-circular")
def formula_that_takes_its_own_result(sheet: Sheet) -> Iterator[Spot]:
    """The own cell added."""
    yield from rewritten(sheet, lambda written, place: f"={written[1:]}+0*{place.cell}")


@slip("formula-equivalent")
def formula_written_in_another_way(sheet: Sheet) -> Iterator[Spot]:
    """Changed, and gives the same whatever is typed."""
    yield from rewritten(sheet, lambda written, _: f"=IF(TRUE(),{written[1:]},{written[1:]})")


@slip("formula-dimension")
def mass_added_to_a_heat(sheet: Sheet) -> Iterator[Spot]:
    """A cell of another unit added to a result per gram."""
    masses = [place for place in sheet.places("reading", "number") if place.field.unit == "g"]
    for place in sheet.places("result", "number"):
        mass = next((one for one in masses if one.id.partition(".")[0] == place.id.partition(".")[0]), None)
        if place.field.unit in ("J/g", "J", "J/K", "J/(g K)") and mass is not None and place.formula:
            where = mass.cell if mass.tab == place.tab else f"{mass.tab}!{mass.cell}"
            value = sheet.results[place.id]
            if isinstance(value, float | int):
                yield Spot(place.id, cells={place.where: formula(f"=({place.formula[1:]})+{where}", value)})


def _number(letters: str) -> int:
    total = 0
    for letter in letters:
        total = total * 26 + ord(letter) - 64
    return total
