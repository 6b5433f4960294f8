"""One number for all readings of a workbook: printed on paper and given by `check`, so that both can be matched."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Iterator

from sheetcal.check.submission import Submission
from sheetcal.kinds.dates import iso
from sheetcal.model import Field, Value

DATES = ("date", "datetime")
SHORT = 16  # digits shown on paper


def readings_sha256(parts: Submission) -> str:
    """SHA-256 over one line `id=value` for every reading and label that is not blank, sorted by id.

    Numbers to 12 digits and dates to the minute, as far as every program keeps them in saving; texts in quotes
    with their white space made single. Whatever format the file has, the same readings give the same hash.
    """
    lines = sorted(f"{one}={text}\n" for one, text in reading_texts(parts))
    return hashlib.sha256("".join(lines).encode()).hexdigest()


def short(digest: str) -> str:
    """The hash as paper shows it: its first 16 digits in groups of four."""
    return " ".join(digest[at : at + 4] for at in range(0, SHORT, 4))


def reading_texts(parts: Submission) -> Iterator[tuple[str, str]]:
    """(id, text) of every reading and label that is not blank, each element of a series by itself."""
    for one, value in parts.readings.items():
        field = parts.skeleton.places[one].field
        if not isinstance(value, list):
            if value not in (None, ""):
                yield one, _text(field, value)
            continue
        for number, element in enumerate(value, start=1):
            if element not in (None, ""):
                yield f"{one}[{number}]", _text(field, element)


def _text(field: Field, value: Value) -> str:
    if isinstance(value, bool) or not isinstance(value, int | float):
        text = " ".join(value.split()) if isinstance(value, str) else value
        return json.dumps(text, ensure_ascii=True)
    if field.type in DATES and 0 <= value < 2_900_000:
        return iso(float(value), field.type == "datetime")
    return f"{float(value) + 0.0:.12g}"
