"""Slips of the keyboard: text for a number, decimal comma, dates, units in the cell, impossible values, nothing."""

from __future__ import annotations

from collections.abc import Callable, Iterator

from sheetcal.kinds.dates import serial
from sheetcal.model import Place
from sheetcal.planting.package import Content, error, formula, number, text, truth
from sheetcal.planting.registry import Spot, slip
from sheetcal.planting.sheet import Sheet

Change = Callable[[float], Content]


def numbers(sheet: Sheet) -> Iterator[tuple[Place, float]]:
    """Typed numbers of blocks that count."""
    for place in sheet.places("reading", "number", "integer"):
        value = sheet.readings[place.id]
        if isinstance(value, float | int) and not isinstance(value, bool):
            yield place, float(value)


def _typed(sheet: Sheet, change: Change, *words: str, only: Callable[[float], bool] = lambda _: True) -> Iterator[Spot]:
    """Something typed into the cell of a number, nothing else touched: what needs it gives what a program gives."""
    for place, value in numbers(sheet):
        if only(value):
            yield Spot(place.id, cells={place.where: change(value)}, blank=(place.id,), cause=words)


def _has_nought(value: float) -> bool:
    return "0" in f"{value:.10g}"


def _fraction(value: float) -> bool:
    return value != int(value)


@slip("reading-not-number")
def number_typed_with_its_unit(sheet: Sheet) -> Iterator[Spot]:
    """`1.0012 g` in the cell of a mass."""
    for place, value in numbers(sheet):
        if place.field.unit not in (None, "1"):
            typed = text(f"{value:.10g} {place.field.unit}")
            yield Spot(place.id, cells={place.where: typed}, blank=(place.id,), cause=("unit",))


@slip("reading-not-number")
def number_stored_as_text(sheet: Sheet) -> Iterator[Spot]:
    """A cell in text format, or pasted from a message."""
    yield from _typed(sheet, lambda value: text(f"{value:.10g}"), "text")


@slip("reading-not-number")
def letter_for_a_digit(sheet: Sheet) -> Iterator[Spot]:
    """The letter O for a nought."""
    yield from _typed(sheet, lambda value: text(f"{value:.10g}".replace("0", "O", 1)), "letter", only=_has_nought)


@slip("reading-not-number")
def minus_that_is_a_dash(sheet: Sheet) -> Iterator[Spot]:
    """A figure pasted from a document, its minus a typographer's."""
    yield from _typed(sheet, lambda value: text(f"\u2212{abs(value):.10g}"), "minus", only=lambda value: value < 0)


@slip("reading-not-number")
def no_number_at_all(sheet: Sheet) -> Iterator[Spot]:
    """`see note` where a number belongs."""
    yield from _typed(sheet, lambda _: text("see note"))


@slip("reading-not-number")
def truth_for_a_number(sheet: Sheet) -> Iterator[Spot]:
    """TRUE in the cell of a number."""
    yield from _typed(sheet, lambda _: truth(True))


@slip("reading-decimal-comma")
def decimal_comma(sheet: Sheet) -> Iterator[Spot]:
    """A comma where the program wants a point."""
    yield from _typed(sheet, lambda value: text(f"{value:.10g}".replace(".", ",")), "comma", only=_fraction)


@slip("reading-date")
def number_taken_for_a_date(sheet: Sheet) -> Iterator[Spot]:
    """1.12 became the first of December: the value, and the look the program gave the cell."""
    dated = next(place.where for place in sheet.places("reading", "date"))
    for place, _ in numbers(sheet):
        day = number(serial("2025-12-01"))
        yield Spot(place.id, cells={place.where: day}, blank=(place.id,), style={place.where: dated}, cause=("date",))


@slip("reading-date")
def date_that_is_none(sheet: Sheet) -> Iterator[Spot]:
    """`yesterday` in the cell of a date."""
    for place in sheet.places("reading", "date"):
        yield Spot(place.id, cells={place.where: text("yesterday")}, blank=(place.id,))


@slip("reading-error-value")
def error_value_pasted(sheet: Sheet) -> Iterator[Spot]:
    """#N/A copied from another table."""
    yield from _typed(sheet, lambda _: error("#N/A"))


@slip("reading-formula")
def sum_in_the_cell_of_a_reading(sheet: Sheet) -> Iterator[Spot]:
    """`=11.8231-10.8219` instead of the reading."""
    for place, value in numbers(sheet):
        written = formula(f"={value + 10.0!r}-10", value)
        yield Spot(place.id, cells={place.where: written})


@slip("reading-impossible")
def decimal_point_forgotten(sheet: Sheet) -> Iterator[Spot]:
    """The digits of the display without their point, where no such value can be."""
    for place, value in numbers(sheet):
        high, digits = _limit(sheet, place, "high", place.field.high), _decimals(place)
        without = float(f"{value:.{digits}f}".replace(".", ""))
        if high is not None and digits and without > high > 0.0 < value:
            yield Spot(place.id, readings={place.id: without}, cause=("decimal point", "factor"))


def _decimals(place: Place) -> int:
    """Decimals that the instrument shows."""
    shown = f"{place.field.resolution or 1.0:.10f}".rstrip("0")
    return len(shown.partition(".")[2])


IN_ANOTHER = {"g": (1000.0, 0.0, "mg"), "MPa": (10.0, 0.0, "bar"), "kPa": (10.0, 0.0, "hPa"), "min": (60.0, 0.0, " s"),
              "degC": (1.0, 273.15, "kelvin")}  # fmt: skip


@slip("reading-impossible")
def reading_in_another_unit(sheet: Sheet) -> Iterator[Spot]:
    """The figure as the instrument shows it, in a unit that the sheet does not want."""
    for place, value in numbers(sheet):
        factor, offset, word = IN_ANOTHER.get(place.field.unit or "", (1.0, 0.0, ""))
        high, typed = _limit(sheet, place, "high", place.field.high), round(value * factor + offset, 6)
        if word and value and place.id.startswith("run") and high is not None and typed > high:
            yield Spot(place.id, readings={place.id: typed}, cause=(word, "decimal point"))


@slip("reading-impossible")
def sign_lost(sheet: Sheet) -> Iterator[Spot]:
    """A minus before what cannot be negative."""
    for place, value in numbers(sheet):
        low = _limit(sheet, place, "low", place.field.low)
        if low is not None and value > 0.0 and -value < low:
            yield Spot(place.id, readings={place.id: -value}, cause=("sign",))


@slip("reading-impossible")
def no_choice_of_the_list(sheet: Sheet) -> Iterator[Spot]:
    """A word that the list does not offer."""
    for place in sheet.places("reading"):
        if place.field.choices and place.field.type not in ("number", "integer"):
            yield Spot(place.id, readings={place.id: "something else"})


@slip("reading-impossible")
def time_that_is_none(sheet: Sheet) -> Iterator[Spot]:
    """`noon` for the start of a run."""
    for place in sheet.places("reading"):
        if place.field.name == "start" and place.field.type == "text":
            yield Spot(place.id, readings={place.id: "noon"})


@slip("reading-out-of-range")
def beyond_the_usual(sheet: Sheet) -> Iterator[Spot]:
    """A value that can be, but is not usual: just beyond the marked limit, inside the refused one."""
    limited = {f"{rule.scope}.{rule.place}" for rule in sheet.plan.kind.rules}  # there a limit says more
    for place, _ in numbers(sheet):
        for end, sign in (("high", 1.0), ("low", -1.0)):
            usual = _limit(sheet, place, f"warn_{end}", getattr(place.field, f"warn_{end}"))
            refused = _limit(sheet, place, end, getattr(place.field, end))
            if usual is not None and place.field.key not in limited:
                beyond = usual + sign * (place.field.resolution or abs(usual) * 0.01 or 0.01)
                if refused is None or sign * (refused - beyond) > 0:
                    yield Spot(place.id, readings={place.id: beyond})


@slip("reading-missing", also=("value-awaited",))
def reading_forgotten(sheet: Sheet) -> Iterator[Spot]:
    """A reading that every sheet needs, left empty."""
    for place in sheet.places("reading"):
        needed = place.field.needed == {} and place.id in sheet.read and not place.field.series
        if needed and place.field.name != "state":
            yield Spot(place.id, readings={place.id: None})


@slip("reading-stray-marks")
def blank_behind_a_name(sheet: Sheet) -> Iterator[Spot]:
    """A name pasted with what stood around it."""
    for place in sheet.places("reading", "text"):
        if place.field.name in ("crucible_id", "control_ref", "record_file", "record_vessel", "instrument_file"):
            yield Spot(place.id, readings={place.id: f"{sheet.readings[place.id]}\u00a0"})


def _limit(sheet: Sheet, place: Place, end: str, kind: float | None) -> float | None:
    """The limit of a place: what profile, class or laboratory set, else the kind's."""
    own = sheet.record.ranges.get(place.id) or sheet.record.ranges.get(place.field.key) or {}
    return own.get(end, kind)
