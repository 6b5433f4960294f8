"""Data validation: what each reading may be is shown when its cell is entered, and enforced.

One validation serves all cells that share a rule.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

from openpyxl.worksheet.datavalidation import DataValidation
from openpyxl.worksheet.worksheet import Worksheet

from sheetcal.excel.limits import Limits, is_clock, limits_of, plain, span
from sheetcal.excel.ranges import Area, areas, by_column, sqref
from sheetcal.kinds.words import shown_unit
from sheetcal.model import Field, IssueRecord, Place

AT_ONCE = 150  # areas in one validation: programs differ in how long a list of ranges may be
FIRST_DAY, LAST_DAY = 36526, 73050  # 2000-01-01 and 2099-12-31 as serial numbers
LONGEST_TEXT = 250


@dataclass(frozen=True)
class Check:
    """One rule of entry; `{cell}` in the formula is the cell itself."""

    type: str
    formula: str
    second: str
    title: str
    shown: str
    expected: str


def add(sheet: Worksheet, record: IssueRecord, places: Iterable[Place]) -> None:
    """Validate every given place (all readings of one tab that can be typed)."""
    groups: dict[Check, list[Place]] = {}
    for place in places:
        groups.setdefault(check_of(place.field, limits_of(record, place)), []).append(place)
    for check, members in groups.items():
        for found in by_column(areas(members)):
            for start in range(0, len(found), AT_ONCE):
                sheet.data_validations.dataValidation.append(_validation(check, found[start : start + AT_ONCE]))


def _validation(check: Check, found: list[Area]) -> DataValidation:
    between = check.type in ("date", "textLength")
    return DataValidation(
        type=check.type,
        operator="between" if between else None,
        formula1=check.formula.replace("{cell}", found[0].first),
        formula2=check.second or None,
        sqref=sqref(found),
        allow_blank=True,
        showInputMessage=True,
        showErrorMessage=True,
        errorStyle="stop",
        promptTitle=check.title[:32],
        prompt=check.shown[:255],
        errorTitle="Not accepted",
        error=check.expected[:255],
    )


def check_of(field: Field, limits: Limits) -> Check:
    """The rule of entry of a field."""
    if field.type == "choice":
        return _choice(field)
    if field.type in ("date", "datetime"):
        what = "a date, year-month-day" if field.type == "date" else "a date and time, year-month-day hh:mm"
        return _check(field, "date", str(FIRST_DAY), str(LAST_DAY), what)
    if is_clock(field):
        return _check(field, "custom", _CLOCK, "", "a time of day as hh:mm, 24 hours, for example 08:05")
    if field.type == "text":
        return _check(field, "textLength", "0", str(LONGEST_TEXT), f"text, at most {LONGEST_TEXT} characters")
    return _number(field, limits)


_CLOCK = 'AND(LEN({cell})=5,MID({cell},3,1)=":",ISNUMBER(TIMEVALUE({cell})),LEFT({cell},2)<"24",RIGHT({cell},2)<"60")'


def _choice(field: Field) -> Check:
    if isinstance(field.choices, str):
        table, _, column = field.choices.removeprefix("table.").partition(".")
        return _check(field, "list", f"{table}_{column}", "", "one of the list on the Constants tab")
    listed = ",".join(field.choices)
    return _check(field, "list", f'"{listed}"', "", f"one of: {', '.join(field.choices)}")


def _number(field: Field, limits: Limits) -> Check:
    tests = ["ISNUMBER({cell})"]
    if limits.low is not None:
        tests.append(f"{{cell}}>={plain(limits.low)}")
    if limits.high is not None:
        tests.append(f"{{cell}}<={plain(limits.high)}")
    step = 1.0 if field.type == "integer" and limits.resolution is None else limits.resolution
    if step:
        tests.append(f"ABS({{cell}}/{plain(step)}-ROUND({{cell}}/{plain(step)},0))<0.00001")
    return _check(field, "custom", f"AND({','.join(tests)})", "", number_in_words(field, limits, step))


def number_in_words(field: Field, limits: Limits, step: float | None) -> str:
    """`a number in g, 0.02 to 5, in steps of 0.0001; usual 0.5 to 1.2`."""
    parts = ["a whole number" if step == 1.0 else "a number"]
    unit = shown_unit(field.unit)
    parts[0] += f" in {unit}" if unit else ""
    reach = span(limits.low, limits.high)
    parts += [reach] if reach else []
    parts += [f"in steps of {plain(step)}"] if step and step != 1.0 else []
    usual = span(limits.warn_low, limits.warn_high)
    return ", ".join(parts) + (f"; usual {usual}" if usual else "")


def _check(field: Field, sort: str, formula: str, second: str, what: str) -> Check:
    hint = f" {field.hint[:1].upper()}{field.hint[1:]}." if field.hint else ""
    shown = f"{what[:1].upper()}{what[1:]}.{hint}"
    return Check(sort, formula, second, _short(field.label), shown, f"{field.label}: expected {what}. Correct it.")


def _short(label: str) -> str:
    return label if len(label) <= 32 else label[:31].rstrip() + "…"
