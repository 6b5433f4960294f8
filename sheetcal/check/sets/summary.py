"""What is kept of one workbook, so that ten thousand can be looked at together: no cells, no formulas."""

from __future__ import annotations

import hashlib
from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass, replace
from datetime import datetime
from functools import lru_cache
from pathlib import PurePath

from sheetcal.check.fingerprint import readings_sha256
from sheetcal.check.submission import Submission
from sheetcal.kinds.dates import moment_of
from sheetcal.model import Field, Shape, SheetKind, Value

FINE = 3000.0  # steps of its last digit a value must span to be a reading of high resolution
# Set beforehand or equal by nature, so that equal values tell nothing; the full crucible follows from its parts.
BY_NATURE = {"calorimeter_water", "crucible_tare", "crucible_gross", "instrument_heat_capacity", "instrument_gross",
             "cup_empty", "voltage", "current", "duration"}  # fmt: skip
WEAK = ("burette_end", "wire_left", "crucible_tare", "start_temperature", "residue_mass")
ABOUT = ("start", "operator", "remarks", "record_start", "control_ref", "state")  # what a copy is given anew
FILES = ("record_file", "instrument_file")
WEIGHED = ("sample_mass", "pellet_mass", "aid1_mass", "aid2_mass")
RECORDED = ("record", "three readings")
LEAST_RECORD = 10  # readings a record must hold to be told from another
LARGEST = 1e12
LAST_DAY = 365_000.0
SHORT = 16  # bytes of a digest

Read = Callable[[str], Value]


@dataclass(frozen=True, slots=True)
class Fired:
    """One run begun. `fine`: (name, value, step) of readings of high resolution; `weak`: others that vary by chance.

    `vessel` is the one the logger names, where it does. `minutes`: how long the record shows it at work.
    `material`: the certified lot, else the sample's id. `value`: gross value J/g, or heat capacity J/K where it is
    calibrated. `control`: deviation from its certificate in %. `calibration`: what its heat capacity comes from.
    `files`: names of its logger's and instrument's files, without ending.
    """

    run: str
    sample: str | None
    material: str
    role: str
    state: str
    operator: str
    vessel: str
    typed_vessel: str
    started: datetime | None
    day: float | None
    minutes: float
    fine: tuple[tuple[str, float, float], ...]
    weak: tuple[tuple[str, float], ...]
    record: bytes | None
    value: float | None
    control: float | None
    calibration: str
    cites: str
    files: tuple[str, ...] = ()

    @property
    def counts(self) -> bool:
        """Whether it was carried through and is not void."""
        return self.state == "valid"


@dataclass(frozen=True, slots=True)
class Lot:
    """One sample of a fuel workbook: who sent what, and what was found, by the name of the quantity."""

    sample: str
    name: str
    origin: tuple[str, str, str]
    found: tuple[tuple[str, float], ...]


@dataclass(frozen=True, slots=True)
class Tally:
    """Firings of a vessel as the workbook knew them at issue: counted when, how many were left."""

    vessel: str
    counted: datetime | None
    done: float
    left: float


@dataclass(frozen=True, slots=True)
class Summary:
    """One workbook. `measured`: digest of all the bench read, None before it has read enough to tell it by.

    `logged`: lines of the instrument's log that belong to its runs. `checked`: False for a second source only.
    """

    file: str
    sha256: str
    kind: str
    kind_version: int
    shape: Shape
    issue_id: str
    issued_at: str
    profile: str
    calorimeter: str
    cites: tuple[str, ...]
    readings: str
    measured: str | None
    balance: str
    control_ref: str
    control_action: float | None
    runs: tuple[Fired, ...]
    lots: tuple[Lot, ...]
    tallies: tuple[Tally, ...]
    logged: tuple[int, ...] = ()
    checked: bool = True

    @property
    def latest(self) -> datetime:
        """The last start of a run; the beginning of time where there is none."""
        return max((one.started for one in self.runs if one.started), default=datetime.min)


def earlier(summary: Summary) -> Summary:
    """The same of a workbook that is at hand but not checked."""
    return replace(summary, checked=False)


def summary_of(parts: Submission, file: str, sha256: str, results: Mapping[str, Value] | None = None) -> Summary:
    """The summary of a workbook taken apart. `results`: where the file stores none, or those known to be right."""
    values = {**parts.typed, **(results or {})}
    own = {one: value for one, value in parts.readings.items() if not isinstance(value, list)}

    def read(one: str) -> Value:
        return own[one] if one in own else values.get(one)

    record = parts.record
    runs = [one for one in _blocks(parts, "run") if _begun(parts, one)]
    return Summary(
        file, sha256, record.kind, record.kind_version, record.shape, record.issue_id, record.issued_at,
        record.profile, _text(read("sheet.calorimeter")), tuple(record.cites.values()), readings_sha256(parts),
        _measured(parts), _text(read("sheet.balance")), _text(read("sheet.control_ref")),
        _constant(parts, "control_action"),
        tuple(_fired(parts, read, one) for one in runs),
        tuple(_lot(read, one) for one in _blocks(parts, "sample")), tuple(_tallies(parts)),
    )  # fmt: skip


def _blocks(parts: Submission, scope: str) -> list[str]:
    shape = parts.skeleton.shape
    if scope not in parts.kind.scopes:
        return []
    number = shape.samples if scope == "sample" else shape.places * (shape.samples or 1)
    return [f"{scope}{one}" for one in range(1, number + 1)]


def _begun(parts: Submission, run: str) -> bool:
    """Whether anything was weighed, read or dated in a run."""
    names = ("date", "start", "record_temperature", *WEIGHED)
    return any(parts.readings.get(f"{run}.{name}") not in (None, "", []) for name in names)


def _fired(parts: Submission, read: Read, run: str) -> Fired:
    place = parts.skeleton.places.get(f"{run}.date")
    sample = place.sample if place else None
    role = _text(read(f"{sample}.role")) if sample else ("calibration" if parts.kind.name == "calibration" else "")
    lot = _text(read(f"{sample}.control_lot" if sample else "sheet.certified_lot"))
    typed = _text(read(f"{run}.vessel")) or _text(read("sheet.vessel"))
    day, record = _day(read(f"{run}.date")), parts.readings.get(f"{run}.record_temperature")
    series = _series(record) if _text(read(f"{run}.rise_source")) in ("", *RECORDED) else ()
    return Fired(
        run, sample, lot or (_text(read(f"{sample}.sample_id")) if sample else parts.kind.name), role,
        _text(read(f"{run}.state")), _text(read(f"{run}.operator")),
        _text(read(f"{run}.record_vessel")) or typed, typed,
        _usual(moment_of(day, read(f"{run}.start"))), day, _span(parts.readings.get(f"{run}.record_time")),
        tuple(_fine(parts, run)), tuple(_weak(read, run)), _digest(series) if len(series) >= LEAST_RECORD else None,
        _number(read(f"{run}.{'heat_capacity' if role == 'calibration' else 'gross'}_counted")),
        _number(read(f"{run}.control_counted")), _calibration(parts, typed), _text(read(f"{run}.control_ref")),
        tuple(PurePath(name).stem for name in (_text(read(f"{run}.{file}")) for file in FILES) if name),
    )  # fmt: skip


def _fine(parts: Submission, run: str) -> Iterable[tuple[str, float, float]]:
    """Readings of one run of high resolution that are measured, not set."""
    for name, step in _fine_names(parts.kind):
        value = _number(_single(parts.readings.get(f"{run}.{name}")))
        if value is not None and abs(value) >= FINE * step:
            yield name, value, step


@lru_cache(maxsize=64)
def _fine_names(kind: SheetKind) -> tuple[tuple[str, float], ...]:
    """(name, step) of lines of a run that can hold such a reading."""
    return tuple((one.name, one.resolution or 0.0) for one in kind.fields if one.scope == "run" and is_fine(one))


def is_fine(field: Field) -> bool:
    """Whether a line can hold a reading that two runs do not share but by chance."""
    return bool(field.role == "reading" and field.step is None and field.resolution and not field.series
                and field.type == "number" and field.name not in BY_NATURE and field.origin == "person")  # fmt: skip


def _weak(read: Read, run: str) -> Iterable[tuple[str, float]]:
    for name in WEAK:
        value = _number(read(f"{run}.{name}"))
        if value is not None:
            yield name, value


def _measured(parts: Submission) -> str | None:
    """A digest of all readings of runs and bodies that a person or a logger entered; None where there are few."""
    lines, fine = [], 0
    for one, value in parts.readings.items():
        field = parts.skeleton.places[one].field
        own = field.role != "reading" or field.locked or field.type in ("date", "datetime") or field.name in ABOUT
        if own or field.scope not in ("run", "body"):
            continue
        lines.append(f"{one}={_flat(value)}")
        fine += is_fine(field) or (isinstance(value, list) and len(value) >= LEAST_RECORD)
    return _digest(sorted(lines)).hex() if fine >= 3 else None


def _flat(value: Value | list[Value]) -> str:
    if isinstance(value, list):
        return " ".join(map(_flat, value))
    number = _number(value)
    return str(value) if number is None else f"{number:.12g}"


def _lot(read: Read, sample: str) -> Lot:
    origin = tuple(_text(read(f"{sample}.{name}")) for name in ("client", "description", "fuel_class"))
    named = ("gross_daf", "ash_dry", "total_moisture")
    values = [(name, _number(read(f"{sample}.{name}"))) for name in named]
    found = tuple((name, value) for name, value in values if value is not None)
    if _text(read(f"{sample}.role")) not in ("sample", ""):
        found = ()
    return Lot(sample, _text(read(f"{sample}.sample_id")), (origin[0], origin[1], origin[2]), found)


def _tallies(parts: Submission) -> Iterable[Tally]:
    for row in parts.record.tables.get("vessel", ()):
        done, left = _number(row.get("firings_done")), _number(row.get("firings_left"))
        counted = parts.record.settings.get(f"firings_counted {row.get('id')}", "")
        if done is not None and left is not None:
            yield Tally(_text(row.get("id")), _moment(counted), done, left)


def _calibration(parts: Submission, vessel: str) -> str:
    """The workbook that a vessel's heat capacity comes from, as issued."""
    rows = parts.record.tables.get("vessel", ())
    return next((_text(row.get("calibration")) for row in rows if row.get("id") == vessel), "")


def _constant(parts: Submission, name: str) -> float | None:
    return next((one.value for one in parts.record.constants if one.name == name), None)


def _span(times: Value | list[Value]) -> float:
    """Minutes from the first to the last time of a record; 0 where there is none."""
    series = _series(times)
    span = max(series) - min(series) if series else 0.0
    return span if span < 24.0 * 60.0 else 0.0


def _series(values: Value | list[Value]) -> tuple[float, ...]:
    numbers = map(_number, values) if isinstance(values, list) else ()
    return tuple(one for one in numbers if one is not None)


def _digest(values: Iterable[object]) -> bytes:
    return hashlib.blake2b("\n".join(map(str, values)).encode("utf-8", "surrogatepass"), digest_size=SHORT).digest()


def _single(value: Value | list[Value]) -> Value:
    return None if isinstance(value, list) else value


def _number(value: object) -> float | None:
    """A number that can be reckoned with: no truth value, nothing beyond all measure."""
    known = isinstance(value, float | int) and not isinstance(value, bool) and -LARGEST < value < LARGEST
    return float(value) if known else None  # type: ignore[arg-type]


def _day(value: object) -> float | None:
    """The serial number of a day between 1900 and 2900."""
    day = _number(value)
    return day if day is not None and 0.0 < day < LAST_DAY else None


def _usual(moment: datetime | None) -> datetime | None:
    """A moment to which minutes can be added."""
    return moment if moment is not None and 1900 <= moment.year < 2900 else None


def _text(value: object) -> str:
    return "" if value is None else str(value).strip()


def _moment(text: str) -> datetime | None:
    try:
        return _usual(datetime.fromisoformat(text).replace(tzinfo=None))
    except ValueError:
        return None
