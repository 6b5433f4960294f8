"""Slips made from the limits a kind states itself: a plain change of a reading, or a date that had passed, breaks each.

The kind's cell functions say whether a limit is broken; of several changes that one is taken that breaks least besides.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass, field
from datetime import date, timedelta
from itertools import combinations, islice, product
from typing import Any

from sheetcal.formulas.compute import Engine
from sheetcal.kinds.layout import REFERENCE
from sheetcal.model import IssueRecord, Place, Rule
from sheetcal.planting.cases import WAYS, with_table
from sheetcal.planting.record import spoiled_records
from sheetcal.planting.registry import Slip, Spot, generated, spread
from sheetcal.planting.sheet import Sheet

FACTORS = (0.5, 2.0, 0.9, 1.1, 0.97, 1.03, 0.2, 5.0, 0.0, -1.0)
STEPS = (-1.0, 1.0, -5.0, 5.0, -20.0, 20.0)
GOOD = 12  # ways of breaking a limit, of which the gentlest is taken
MOST_TRIES, FEW_TRIES = 300, 80
PAIRED = 8  # readings nearest to a limit of which two are changed together
DIGITS = (1, 2, 3, 5, 10, 30, 100)  # of the display
LIVE = ("void-without-reason",)  # afterwards it is said as a missing reading
WEIGHTS = {"error": 100, "warning": 10, "note": 1}
Change = tuple[Mapping[str, Any], IssueRecord | None]


@dataclass(frozen=True)
class Limit(Slip):
    """A limit as a slip; its places are sought only where they are wanted."""

    rule: Rule | None = field(default=None)

    def places(self, sheet: Sheet, most: int) -> list[Spot]:
        """One way in each of some blocks, evenly spread."""
        assert self.rule is not None
        blocks = _blocks(sheet, self.rule)
        chosen = spread(blocks, most)
        found = [one for block in chosen if (one := _broken(sheet, self.rule, block, MOST_TRIES))]
        others = (_broken(sheet, self.rule, block, FEW_TRIES) for block in blocks if block not in chosen)
        return found or [one for one in others if one][:1]


@generated
def limits(sheet: Sheet) -> Iterator[Slip]:
    """A slip for each limit of the kind that is judged after the work and is no duty."""
    for rule in sheet.plan.kind.rules:
        if not rule.code.startswith("live-") and rule.code not in LIVE:
            yield Limit(f"limit {rule.code}", rule.code, (sheet.kind,), lambda _: (), rule=rule)


def _blocks(sheet: Sheet, rule: Rule) -> list[str]:
    """Blocks in use of the rule's scope."""
    if rule.scope == "run":
        return sheet.runs()
    blocks = dict.fromkeys(one.partition(".")[0] for one in sheet.plan.places)
    return [one for one in blocks if one.startswith(rule.scope)]


def _broken(sheet: Sheet, rule: Rule, block: str, tries: int) -> Spot | None:
    """The gentlest of the first changes that break the limit; None where none does, or it is broken already."""
    anchor = sheet.plan.places[f"{block}.{rule.place}"]
    if Engine(sheet.plan, sheet.record, sheet.readings).holds(anchor, rule):
        return None
    other = next((one for one in sheet.plan.kind.rules if rule.unless and one.code == rule.unless), None)
    gentlest: tuple[int, Change] | None = None
    tried = islice(_changes(sheet, rule, anchor), tries)
    ways = (way for way in tried if _breaks(sheet, way, anchor, rule, other))
    for way in islice(ways, GOOD):
        besides = _besides(sheet, way, rule, block)
        if gentlest is None or besides < gentlest[0]:
            gentlest = (besides, way)
        if not besides:
            break
    if gentlest is None or (gentlest[0] >= WEIGHTS["error"] and rule.severity != "error"):
        return None  # an error is said instead
    return Spot(anchor.id, readings=gentlest[1][0], issued=gentlest[1][1])


def _breaks(sheet: Sheet, way: Change, anchor: Place, rule: Rule, other: Rule | None) -> bool:
    engine = _engine(sheet, way)
    return engine.holds(anchor, rule) and not (other is not None and engine.holds(anchor, other))


def _engine(sheet: Sheet, way: Change) -> Engine:
    typed, issued = way
    record = issued or sheet.record
    now = {**record.prefilled, **sheet.read, **typed}
    return Engine(sheet.plan, record, {one: value for one, value in now.items() if value is not None})


def _besides(sheet: Sheet, way: Change, rule: Rule, block: str) -> int:
    """How much else the change breaks: in the same run, or anywhere; an error weighs most: it may hide this."""
    engine = _engine(sheet, way)
    own = rule.scope in ("run", "body")
    return sum(
        WEIGHTS[one.severity]
        for one in sheet.plan.kind.rules
        if one.code != rule.code and not one.code.startswith("live-") and (not own or one.scope == rule.scope)
        for other in ([block] if own else _blocks(sheet, one))
        if engine.holds(sheet.plan.places[f"{other}.{one.place}"], one)
    )


def _changes(sheet: Sheet, rule: Rule, anchor: Place) -> Iterator[Change]:
    """What could break a limit: ways known for it, what it names itself, what had run out, what that stands on."""
    block = anchor.id.partition(".")[0]
    if rule.code in WAYS:
        yield from WAYS[rule.code](sheet, block)
    direct: list[str] = []
    tables: list[str] = []
    for reference in REFERENCE.findall(rule.formula):
        (tables if reference.startswith("table.") else direct).append(reference)
    ids = [one for ref in direct for one in sheet.plan.resolve(anchor, ref) if one in sheet.plan.places]
    for table in tables:
        yield from (({}, record) for record in _run_out(sheet, table))
    roots = list(_roots(sheet, ids))
    if f"{block}.record_temperature" in sheet.read and any(one.startswith(f"{block}.") for one in roots):
        yield from ((typed, None) for typed in spoiled_records(sheet, block))
    for one in roots:
        for value in _values(sheet, sheet.plan.places[one]):
            yield {one: value}, None
    for one, other in combinations([one for one in roots[:PAIRED] if sheet.plan.places[one].field.choices], 2):
        for pair in product(*(list(_values(sheet, sheet.plan.places[name])) for name in (one, other))):
            yield dict(zip((one, other), pair, strict=True)), None


def _roots(sheet: Sheet, ids: Iterable[str]) -> Iterator[str]:
    """Readings that can be typed, those nearest to the limit first."""
    seen, wave = set(ids), list(dict.fromkeys(ids))
    while wave:
        following: list[str] = []
        for one in wave:
            place = sheet.plan.places[one]
            if place.field.step is None:
                if place.field.role == "reading" and not sheet.locked(place) and not place.field.series:
                    yield one
                continue
            for reference in place.field.step.args.values():
                for root in sheet.plan.resolve(place, reference):
                    if root in sheet.plan.places and root not in seen:
                        seen.add(root)
                        following.append(root)
        wave = following


def _values(sheet: Sheet, place: Place) -> Iterator[Any]:
    """What may be typed in a cell by a slip, within what is possible there."""
    held, fld = sheet.readings.get(place.id), place.field
    if fld.type in ("number", "integer"):
        yield from _numbers(sheet, place, held)
    elif fld.type in ("date", "datetime"):
        if isinstance(held, str):
            day = date.fromisoformat(held[:10])
            yield from (f"{day + timedelta(days)}{held[10:]}" for days in (1, -1, 40, -40, 400, -400))
    elif isinstance(fld.choices, tuple) and fld.choices:
        yield from (one for one in fld.choices if one != held)
    elif isinstance(fld.choices, str):
        _, table, column = fld.choices.split(".")
        yield from (row[column] for row in sheet.record.tables.get(table, ()) if row.get(column) != held)
    elif held:
        yield from (None, "another")


def _numbers(sheet: Sheet, place: Place, held: Any) -> Iterator[float]:
    """The limits of the field first, then the value moved a little and much."""
    own = sheet.record.ranges.get(place.id) or sheet.record.ranges.get(place.field.key) or {}
    ends = {end: own.get(end, getattr(place.field, end)) for end in ("low", "high", "warn_low", "warn_high")}
    tried: list[float] = []
    if isinstance(held, float | int):
        fine = [sign * count * (place.field.resolution or 1.0) for count in DIGITS for sign in (1, -1)]
        tried += [float(held) * factor for factor in FACTORS] + [float(held) + step for step in (*fine, *STEPS)]
    for end in ("warn_low", "warn_high", "low", "high"):
        if ends[end] is not None:
            tried.append(float(ends[end]))
    for value in dict.fromkeys(round(one, 6) for one in tried):
        low, high = ends["low"], ends["high"]
        if value != held and (low is None or value >= low) and (high is None or value <= high):
            yield value


def _run_out(sheet: Sheet, reference: str) -> Iterator[IssueRecord]:
    """The sheet as issued with what the table column holds past its day, or used up."""
    _, table, column = reference.split(".")
    unit = {one.partition(":")[0]: one.partition(":")[2] for one in sheet.plan.kind.tables[table]}[column]
    if unit == "text":
        return
    yield with_table(sheet, table, **{column: "2020-01-01" if unit == "date" else 0.0})
