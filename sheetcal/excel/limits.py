"""What a reading may be: the kind's limits, or those the issue record sets in their place, and in words."""

from __future__ import annotations

from dataclasses import dataclass

from sheetcal.model import Field, IssueRecord, Place


@dataclass(frozen=True)
class Limits:
    """Refused outside low..high, marked outside warn_low..warn_high; None where there is no bound."""

    low: float | None
    high: float | None
    warn_low: float | None
    warn_high: float | None
    resolution: float | None


def limits_of(record: IssueRecord, place: Place) -> Limits:
    """The limits of one place: by its id, else by its field, else the kind's own."""
    return _limits(record, place.id, place.field)


def _limits(record: IssueRecord, one: str, field: Field) -> Limits:
    stated = {**record.ranges.get(field.key, {}), **record.ranges.get(one, {})}
    names = ("low", "high", "warn_low", "warn_high", "resolution")
    return Limits(*(stated.get(name, getattr(field, name)) for name in names))


def plain(value: float) -> str:
    """A limit as a person writes it."""
    return f"{value:.10f}".rstrip("0").rstrip(".")


def span(low: float | None, high: float | None) -> str:
    """`0.02 to 5`, `from 5`, `up to 60`, or nothing."""
    if low is not None and high is not None:
        return f"{plain(low)} to {plain(high)}"
    if low is not None:
        return f"from {plain(low)}"
    return f"up to {plain(high)}" if high is not None else ""


SHORT_HINT = 48


def in_words(field: Field, limits: Limits) -> str:
    """The allowed range as printed beside the field: refused outside, and what is usual; else a short hint."""
    words = _in_words(field, limits)
    return words or (field.hint if len(field.hint) <= SHORT_HINT else "")


def _in_words(field: Field, limits: Limits) -> str:
    if field.type in ("number", "integer"):
        usual = span(limits.warn_low, limits.warn_high)
        parts = [span(limits.low, limits.high), f"usual {usual}" if usual else ""]
        return "; ".join(part for part in parts if part)
    if field.type == "choice":
        return choices_in_words(field)
    if field.type in ("date", "datetime"):
        return "date" if field.type == "date" else "date and time"
    return "hh:mm" if is_clock(field) else ""


def choices_in_words(field: Field) -> str:
    """Short lists are printed in full, so that a paper copy can be ticked."""
    if isinstance(field.choices, str):
        return "from the list"
    text = " / ".join(field.choices)
    return text if len(text) <= 44 else "from the list"


def is_clock(field: Field) -> bool:
    """Whether a text reading is a time of day."""
    return field.type == "text" and "hh:mm" in field.label
