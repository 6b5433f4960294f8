"""Fill readings from data, analysis and logger files: adds to what is there, never overwrites in silence."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass, field
from datetime import UTC, datetime
from difflib import get_close_matches
from functools import partial

from sheetcal.errors import BadInput, BadInputs, Refused, SheetcalError
from sheetcal.inputs.analysis import AnalysisValue
from sheetcal.inputs.data import DataFile, DataValue
from sheetcal.inputs.logger import LoggerRecord
from sheetcal.kinds.dates import iso, serial
from sheetcal.kinds.layout import Skeleton
from sheetcal.model import Field, IssueRecord, Place, Value

Readings = dict[str, "Value | list[Value]"]
CORRECTIONS = 10


@dataclass
class Filling:
    """New readings for one workbook; faults are collected so that all are reported."""

    skeleton: Skeleton
    record: IssueRecord
    before: Mapping[str, Value | list[Value]]
    allow_out_of_range: bool = False
    amend: bool = False
    reason: str = ""
    readings: Readings = field(default_factory=dict)
    faults: list[SheetcalError] = field(default_factory=list)
    passed_over: set[str] = field(default_factory=set)
    amended: list[tuple[str, Value, Value]] = field(default_factory=list)

    def data(self, data: DataFile) -> None:
        """Take the values of a data file, or the rows of an analysis file."""
        for one in data.values.values():
            self._guard(partial(self._value, one))
        self.analysis(data.analysis)

    def analysis(self, rows: Iterable[AnalysisValue]) -> None:
        """Take late analysis values; of several moistures each run takes the one nearest its weighing."""
        samples = self._samples()
        grouped: dict[tuple[str, str], list[AnalysisValue]] = {}
        for row in rows:
            if row.sample not in samples:
                self.passed_over.add(row.sample)
                continue
            grouped.setdefault((samples[row.sample], row.quantity), []).append(row)
        for (owner, quantity), values in grouped.items():
            if quantity == "analysis_moisture" and len(values) > 1:
                self._guard(partial(self._nearest, owner, values))
            else:
                latest = max(values, key=lambda one: one.determined or datetime.min)
                self._guard(partial(self._analysis, owner, latest))

    def log(self, run: str, record: LoggerRecord) -> None:
        """Take a temperature record for one run, with vessel, start and firing time of its notes."""
        main = self.record.settings.get("main_period", "")
        values: dict[str, Value | list[Value]] = {
            "record_time": list(record.time),
            "record_temperature": list(record.temperature),
            "firing_time": record.firing_time,
            "record_file": record.source.path.name,
            "record_vessel": record.vessel,
            "record_start": record.start.isoformat(timespec="minutes") if record.start else None,
        }
        if record.firing_time is not None and main:
            values["end_of_main"] = record.firing_time + float(main)
        where = record.source.where()
        for name, value in values.items():
            one = f"{run}.{name}"
            if value not in (None, "") and one in self.skeleton.places:
                self._guard(partial(self._put, one, value, where))
        if f"{run}.record_time" not in self.skeleton.places:
            self.faults.append(BadInput(f"--log {run}", "no such run", "a run of this workbook", "See `fields`."))

    def finish(self) -> Readings:
        """All readings, old and new. Raises BadInputs when anything was refused."""
        if self.faults:
            raise BadInputs(self.faults) if len(self.faults) > 1 else self.faults[0]
        merged: Readings = {**self.before, **self.readings}
        self._corrections(merged)
        return merged

    def _guard(self, action: Callable[[], None]) -> None:
        try:
            action()
        except SheetcalError as fault:
            self.faults.append(fault)

    def _samples(self) -> dict[str, str]:
        return {
            str(value): one.partition(".")[0]
            for one, value in self.record.prefilled.items()
            if one.endswith(".sample_id")
        }

    def _value(self, given: DataValue) -> None:
        name, _, index = given.id.partition("[")
        place = self.skeleton.places.get(name)
        if place is None:
            near = get_close_matches(given.id, self.skeleton.places, 1)
            raise BadInput(given.where, f"no field {given.id}", near[0] if near else "a field id", "See `fields`.")
        fld = place.field
        if fld.series and index:
            raise BadInput(given.where, f"{given.id}: one element of a series", "the whole series", "Give the list.")
        if fld.series:
            self._put(name, list(given.numbers(fld.unit or "1")), given.where)
        elif fld.unit is not None and fld.type in ("number", "integer"):
            self._put(name, given.number(fld.unit), given.where)
        else:
            self._put(name, self._text(given, fld), given.where)

    @staticmethod
    def _text(given: DataValue, fld: Field) -> Value:
        if isinstance(given.value, list) or given.value is None:
            raise BadInput(given.where, f"{given.id}: a list", "one value", "Give one value.")
        text = str(given.value).strip()
        if fld.type in ("date", "datetime"):
            try:
                serial(text)
            except ValueError:
                raise BadInput(given.where, f"{given.id}: {text!r}", "a date as 2025-03-04", "Correct it.") from None
        return text

    def _analysis(self, owner: str, row: AnalysisValue) -> None:
        where = f"analysis of {row.sample}, line {row.line}"
        parts: dict[str, Value] = {
            "": row.value,
            "_mark": row.mark,
            "_basis": row.basis,
            "_source": row.source,
            "_determined": iso(serial(row.determined.isoformat()), True) if row.determined else None,
        }
        for end, value in parts.items():
            one = f"{owner}.{row.quantity}{end}"
            if one in self.skeleton.places and value not in (None, "") and not self._printed(one, value):
                self._put(one, value, where)

    def _printed(self, one: str, value: Value) -> bool:
        """True where the worklist printed the same source already."""
        return one in self.record.locked and self.record.prefilled.get(one) == value

    def _nearest(self, owner: str, values: list[AnalysisValue]) -> None:
        """Each run takes the moisture determined nearest its own weighing; the sample the one most runs took."""
        taken: list[AnalysisValue] = []
        for place in self.skeleton.places.values():
            if place.sample != owner or place.field.key != "run.analysis_moisture":
                continue
            run = place.id.partition(".")[0]
            weighed = self._weighed(run)
            if weighed is None:
                continue
            row = min(values, key=lambda one: abs(((one.determined or weighed) - weighed).total_seconds()))
            taken.append(row)
            self._put(f"{run}.analysis_moisture", row.value, f"analysis of {row.sample}, line {row.line}")
            if row.determined:
                moment = row.determined.isoformat(timespec="minutes")
                self._put(f"{run}.analysis_moisture_determined", moment, f"analysis, line {row.line}")
        chosen = max(taken, key=taken.count) if taken else max(values, key=lambda one: one.determined or datetime.min)
        self._analysis(owner, chosen)

    def _weighed(self, run: str) -> datetime | None:
        both = {**self.before, **self.readings}
        day, start = both.get(f"{run}.date"), both.get(f"{run}.start")
        if not isinstance(day, str):
            return None
        clock = start if isinstance(start, str) and len(start) == 5 else "12:00"
        try:
            return datetime.fromisoformat(f"{day[:10]}T{clock}")
        except ValueError:
            return None

    def _put(self, one: str, value: Value | list[Value], where: str) -> None:
        place = self.skeleton.places[one]
        if place.field.locked or place.field.step or one in self.record.locked:
            raise Refused(where, f"{one} is locked", "a reading", "Leave it out.")
        if isinstance(value, list):
            self._check_series(place, value, where)
        else:
            self._check(place, value, where)
        old = self.readings.get(one, self.before.get(one))
        if old is not None and old != value and not self._still_as_issued(one, old):
            self._amend(one, old, value, where)
        self.readings[one] = value

    def _still_as_issued(self, one: str, old: Value | list[Value]) -> bool:
        return one in self.record.prefilled and self.record.prefilled[one] == old

    def _amend(self, one: str, old: Value | list[Value], new: Value | list[Value], where: str) -> None:
        if not self.amend:
            raise Refused(
                where,
                f"{one} already holds {_short(old)}, not {_short(new)}",
                "an empty reading",
                "Use --amend --reason.",
            )
        self.amended.append((one, _short(old), _short(new)))

    def _corrections(self, merged: Readings) -> None:
        """Old, new, when and why of every amended reading go into the next free correction lines."""
        free = [n for n in range(1, CORRECTIONS + 1) if f"sheet.correction{n}_cell" not in merged]
        if len(self.amended) > len(free):
            raise Refused(
                "fill",
                f"{len(self.amended)} amendments",
                f"{len(free)} free correction lines",
                "Issue again.",
            )
        for number, (one, old, new) in zip(free, self.amended, strict=False):
            row = {
                "cell": f"{one} {self.skeleton.places[one].where}",
                "old": str(old),
                "new": str(new),
                "who": "sheetcal fill",
                "when": datetime.now(UTC).strftime("%Y-%m-%dT%H:%M:%SZ"),
                "why": self.reason,
            }
            merged.update({f"sheet.correction{number}_{name}": text for name, text in row.items()})

    def _check_series(self, place: Place, values: list[Value], where: str) -> None:
        room = self.skeleton.shape.record_rows
        if len(values) > room:
            raise Refused(where, f"{place.id}: {len(values)} readings", f"at most {room}", "Shorten the record.")
        for number, value in enumerate(values, start=1):
            if isinstance(value, float | int):
                self._check(place, value, f"{where}, reading {number}")

    def _check(self, place: Place, value: Value, where: str) -> None:
        fld = place.field
        if fld.choices and not isinstance(fld.choices, str) and value not in fld.choices:
            raise BadInput(where, f"{place.id}: {value!r}", ", ".join(fld.choices), "Choose one.")
        if isinstance(fld.choices, str):
            self._check_table(place, value, where)
        if fld.name == "start" and fld.unit is None and not _is_clock(value):
            raise BadInput(where, f"{place.id}: {value!r}", "a time as 08:05", "Correct it.")
        if isinstance(value, float | int):
            low, high = self._limits(place)
            outside = (low is not None and value < low) or (high is not None and value > high)
            if outside and not (self.allow_out_of_range and not self._stops(place, float(value))):
                shown_low = "" if low is None else f"{low:g}"
                shown_high = "" if high is None else f"{high:g}"
                raise Refused(
                    where,
                    f"{place.id}: {value:g} {fld.unit}",
                    f"{shown_low} to {shown_high} {fld.unit}",
                    "Correct it, or confirm with --allow-out-of-range.",
                )

    def _limits(self, place: Place) -> tuple[float | None, float | None]:
        ranges = self.record.ranges.get(place.id) or self.record.ranges.get(place.field.key) or {}
        return ranges.get("low", place.field.low), ranges.get("high", place.field.high)

    def _stops(self, place: Place, value: float) -> bool:
        """Readings that a stop limit guards: `--allow-out-of-range` never covers those."""
        return place.field.name in ("oxygen_pressure", "sample_mass", "pellet_mass", "chlorine")

    def _check_table(self, place: Place, value: Value, where: str) -> None:
        assert isinstance(place.field.choices, str)
        _, table, column = place.field.choices.split(".")
        known = [str(row.get(column)) for row in self.record.tables.get(table, ())]
        if known and str(value) not in known:
            raise BadInput(where, f"{place.id}: {value!r}", ", ".join(known), "Choose one.")


def _is_clock(value: Value) -> bool:
    try:
        datetime.strptime(str(value), "%H:%M")
    except ValueError:
        return False
    return len(str(value)) == 5


def _short(value: Value | list[Value]) -> Value:
    if isinstance(value, list):
        return f"{len(value)} readings"
    return value


def outcome(skeleton: Skeleton, readings: Mapping[str, object], missing: int) -> str:
    """`214 readings, 6 missing`."""
    count = sum(1 for one in readings if one in skeleton.places and not skeleton.places[one].field.locked)
    return f"{count} readings, {missing} missing"
