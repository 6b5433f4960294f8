"""Probable causes of a wrong value, best first. None is named unless it fits far better than an accident."""

from __future__ import annotations

import re

from sheetcal.check.signatures import Known, named

BLANKS = re.compile("[ \u00a0\u2009\u202f]")
WITH_COMMA = re.compile(r"[+-]?\d{1,15},\d{1,15}", re.ASCII)


def of_value(found: float, expected: float, moisture: float | None = None, digits: int | None = None) -> list[str]:
    """Sentences that explain `found` in place of `expected` by the two numbers alone, best first."""
    return named(found, expected, Known(moisture=moisture, digits=digits))


def comma_readings(text: str) -> tuple[float, float] | None:
    """Both readings of a number written with a comma: decimal, and thousands; None when it is no such number."""
    clean = BLANKS.sub("", text)
    if not WITH_COMMA.fullmatch(clean):
        return None
    return float(clean.replace(",", ".")), float(clean.replace(",", ""))
