"""Fill readings from data, analysis and logger files: adds to what is there, never overwrites in silence."""

from __future__ import annotations

import getpass
import math
import sys
from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass, field
from datetime import UTC, datetime
from difflib import get_close_matches
from functools import partial
from pathlib import Path

from sheetcal.check.completeness import missing
from sheetcal.errors import BadInput, BadInputs, Refused, SheetcalError
from sheetcal.formulas.compute import compute
from sheetcal.inputs import read_data, read_logger
from sheetcal.inputs.analysis import AnalysisValue
from sheetcal.inputs.data import DataFile, DataValue
from sheetcal.inputs.logger import LoggerRecord
from sheetcal.kinds.dates import iso, serial
from sheetcal.kinds.layout import Skeleton
from sheetcal.model import IssueRecord, Place, Value
from sheetcal.verbs import entering, outputs
from sheetcal.verbs.workbook import open_workbook, readings_iso, refuse_altered

Readings = dict[str, "Value | list[Value]"]
CORRECTIONS = 10


@dataclass(frozen=True)
class Wish:
    """What was asked of `fill`: data file, RUN=FILE of each logger, unit of a time column without header."""

    data: str | None = None
    logs: tuple[str, ...] = ()
    log_time: str | None = None
    allow_out_of_range: bool = False
    amend: bool = False
    reason: str = ""


def run(file: str, wish: Wish, target: Path, force: bool) -> str:
    """Fill a workbook into `target` and say what it holds. Raises SheetcalError; then nothing is written."""
    if wish.data is None and not wish.logs:
        raise BadInput("fill", "nothing to fill", "--from DATA or --log RUN=FILE", "Give one.")
    if wish.amend and not wish.reason.strip():
        raise BadInput("fill --amend", "no reason", "--reason TEXT", "Say why.")
    opened = open_workbook(file)
    refuse_altered(opened)
    parts = opened.parts
    work = Filling(parts.skeleton, parts.record, readings_iso(parts), wish)
    for entry in wish.logs:
        run_id, _, path = entry.partition("=")
        if not path:
            raise BadInput(f"--log {entry}", "is not RUN=FILE", "--log run1=record.csv", "Correct it.")
        work.log(run_id, read_logger(path, wish.log_time))
    if wish.data is not None:
        work.data(read_data(wish.data))
    readings = work.finish()
    outputs.write(parts.record, {**readings, **compute(parts.skeleton, parts.record, readings)}, target, force)
    for line in work.notes():
        sys.stderr.write(f"{line}\n")
    return outcome(parts.skeleton, readings, len(missing(parts.kind, parts.skeleton, parts.record, readings)))


@dataclass
class Filling:
    """New readings for one workbook; faults are collected so that all are reported."""

    skeleton: Skeleton
    record: IssueRecord
    before: Mapping[str, Value | list[Value]]
    wish: Wish = field(default_factory=Wish)
    readings: Readings = field(default_factory=dict)
    sources: dict[str, str] = field(default_factory=dict)
    faults: list[SheetcalError] = field(default_factory=list)
    passed_over: set[str] = field(default_factory=set)
    amended: dict[str, tuple[Value, Value]] = field(default_factory=dict)
    unusual: dict[str, str] = field(default_factory=dict)

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
            "record_start": _moment(record.start),
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
        """All readings, old and new. Raises what was refused, all of it."""
        merged: Readings = {**self.before, **self.readings}
        for one, rule in entering.new_stops(self.skeleton, self.record, self.before, merged):
            where = self.sources.get(one, "fill")
            self.faults.append(entering.stop(one, rule, where, merged.get(one)))
        if self.faults:
            raise BadInputs(self.faults) if len(self.faults) > 1 else self.faults[0]
        self._corrections(merged)
        if self.wish.allow_out_of_range:
            self._confirm(merged)
        return merged

    def notes(self) -> list[str]:
        """What people should know besides: samples of other workbooks, readings outside their usual range."""
        found = []
        if self.passed_over:
            found.append(f"passed over {len(self.passed_over)} samples that are not in this workbook")
        if self.unusual and not self.wish.allow_out_of_range:
            found += [f"outside the usual range: {text}" for text in self.unusual.values()]
        return found

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
        if index and not fld.series:
            raise BadInput(given.where, f"{given.id}: {name} is no series", name, "Leave the index out.")
        if index:
            self._element(name, int(index[:-1]), given.number(fld.unit or "1"), given.where)
        elif fld.series:
            self._put(name, _ended(given.numbers(fld.unit or "1")), given.where)
        elif fld.unit is not None and fld.type in ("number", "integer"):
            self._put(name, given.number(fld.unit), given.where)
        else:
            self._put(name, self._text(given, place), given.where)

    @staticmethod
    def _text(given: DataValue, place: Place) -> Value:
        if isinstance(given.value, list | bool) or given.value is None:
            raise BadInput(given.where, f"{given.id}: {given.value!r}", "one value", "Give one value.")
        return entering.entered_text(str(given.value).strip(), place.field, given.id, given.where)

    def _analysis(self, owner: str, row: AnalysisValue) -> None:
        where = f"analysis of {row.sample}, line {row.line}"
        parts: dict[str, Value] = {
            "": row.value,
            "_mark": row.mark,
            "_basis": row.basis,
            "_source": row.source,
            "_determined": _moment(row.determined),
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
                where = f"analysis of {row.sample}, line {row.line}"
                self._put(f"{run}.analysis_moisture_determined", _moment(row.determined), where)
        held = self.before.get(f"{owner}.analysis_moisture")
        if held is None or held not in [one.value for one in values]:
            latest = max(values, key=lambda one: one.determined or datetime.min)
            self._analysis(owner, max(taken, key=taken.count) if taken else latest)

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

    def _element(self, name: str, number: int, value: float, where: str) -> None:
        """One element of a series, counted from 1; an empty place is filled without an amendment."""
        held = self.readings.get(name, self.before.get(name)) or []
        series = list(held) if isinstance(held, list) else [held]
        if number > self.skeleton.shape.record_rows:
            room = self.skeleton.shape.record_rows
            raise Refused(where, f"{name}[{number}]", f"at most {room} readings", "Correct the number.")
        series += [None] * (number - len(series))
        self._check(self.skeleton.places[name], value, f"{where}, reading {number}")
        old = series[number - 1]
        if old is not None and old != value:
            self._amend(f"{name}[{number}]", old, value, where)
        series[number - 1] = value
        self.readings[name] = series
        self.sources[name] = where

    def _put(self, one: str, value: Value | list[Value], where: str) -> None:
        place = self.skeleton.places[one]
        if place.field.locked or place.field.step or one in self.record.locked:
            raise Refused(where, f"{one} is locked", "a reading", "Leave it out.")
        if isinstance(value, list):
            self._check_series(place, value, where)
        else:
            self._check(place, value, where)
        old = self.readings.get(one, self.before.get(one))
        if old is not None and not _adds(old, value) and not self._still_as_issued(one, old):
            self._amend(one, old, value, where)
        self.readings[one] = value
        self.sources[one] = where

    def _still_as_issued(self, one: str, old: Value | list[Value]) -> bool:
        return one in self.record.prefilled and self.record.prefilled[one] == old

    def _amend(self, one: str, old: Value | list[Value], new: Value | list[Value], where: str) -> None:
        if not self.wish.amend:
            raise Refused(
                where,
                f"{one} already holds {_short(old)}, not {_short(new)}",
                "an empty reading",
                "Use --amend --reason.",
            )
        self.amended.setdefault(one, (_short(old), _short(new)))

    def _corrections(self, merged: Readings) -> None:
        """Old, new, who, when and why of every amended reading go into the next free correction lines."""
        free = [n for n in range(1, CORRECTIONS + 1) if f"sheet.correction{n}_cell" not in merged]
        if len(self.amended) > len(free):
            what = f"{len(self.amended)} amendments"
            raise Refused("fill", what, f"at most {len(free)}: the free correction lines", "Issue it anew.")
        now = datetime.now(UTC).strftime("%Y-%m-%dT%H:%M:%SZ")
        for number, (one, (old, new)) in zip(free, self.amended.items(), strict=False):
            row = {
                "cell": f"{one} {self.skeleton.places[one.partition('[')[0]].where}",
                "old": str(old),
                "new": str(new),
                "who": _user(),
                "when": now,
                "why": self.wish.reason,
            }
            merged.update({f"sheet.correction{number}_{name}": text for name, text in row.items()})

    def _confirm(self, merged: Readings) -> None:
        """What was confirmed at entry is said in the remarks of its block."""
        for one, text in self.unusual.items():
            remarks = f"{one.partition('.')[0]}.remarks"
            remarks = remarks if remarks in self.skeleton.places else "sheet.remarks"
            confirmed = f"confirmed at entry: {text}"
            held = str(merged.get(remarks) or "")
            if confirmed not in held:
                merged[remarks] = f"{held}; {confirmed}" if held else confirmed

    def _check_series(self, place: Place, values: list[Value], where: str) -> None:
        room = self.skeleton.shape.record_rows
        if len(values) > room:
            raise Refused(where, f"{place.id}: {len(values)} readings", f"at most {room}", "Shorten the record.")
        for number, value in enumerate(values, start=1):
            if isinstance(value, float | int):
                self._check(place, value, f"{where}, reading {number}")

    def _check(self, place: Place, value: Value, where: str) -> None:
        entering.check_choice(place, value, self.record, where)
        if isinstance(value, float | int):
            self._check_number(place, float(value), where)

    def _check_number(self, place: Place, value: float, where: str) -> None:
        if not math.isfinite(value):
            raise BadInput(where, f"{place.id}: {value}", "a finite number", "Correct it.")
        entering.check_whole(place, value, where)
        span = entering.impossible(place, value, self.record)
        if span is not None and not self.wish.allow_out_of_range:
            unit = "" if place.field.unit in (None, "1") else f" {place.field.unit}"
            do = "Correct it, or confirm with --allow-out-of-range."
            raise Refused(where, f"{place.id}: {value:g}{unit}", span, do)
        span = span or entering.unusual(place, value, self.record)
        if span is not None:
            self.unusual.setdefault(place.id, f"{place.id} {value:g} ({span})")


def _moment(moment: datetime | None) -> Value:
    """Date and time as a reading holds it."""
    return None if moment is None else iso(serial(moment.isoformat()))


def _user() -> str:
    try:
        return f"{getpass.getuser()} (sheetcal fill)"
    except (KeyError, OSError, ImportError):  # no name for the user of this machine
        return "sheetcal fill"


def _adds(old: Value | list[Value], new: Value | list[Value]) -> bool:
    """True where nothing that stands is changed: the same value, or a series that only goes on."""
    if isinstance(old, list) and isinstance(new, list):
        return len(old) <= len(new) and all(one in (None, other) for one, other in zip(old, new, strict=False))
    return old == new


def _ended(values: list[float | None]) -> list[Value]:
    """A series up to its last reading."""
    last = max((number for number, value in enumerate(values, start=1) if value is not None), default=0)
    return list(values[:last])


def _short(value: Value | list[Value]) -> Value:
    if isinstance(value, list):
        return f"{len(value)} readings"
    return value


def outcome(skeleton: Skeleton, readings: Mapping[str, object], missing: int) -> str:
    """`214 readings, 6 missing`."""
    count = sum(1 for one in readings if one in skeleton.places and not skeleton.places[one].field.locked)
    return f"{count} readings, {missing} missing"
