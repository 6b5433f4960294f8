"""Read a lab file: every fault with its line, what was expected, what to do."""

import dataclasses
import os
import re
import tomllib
from collections.abc import Iterable, Mapping
from typing import Any, TypeVar
from zoneinfo import ZoneInfo

from sheetcal import profiles
from sheetcal.errors import BadInput, SheetcalError
from sheetcal.inputs import lab, schema
from sheetcal.inputs.lab import Lab
from sheetcal.inputs.lab_lines import TomlLines, find_lines
from sheetcal.inputs.text import Faults, TextFile, nearest, read_text
from sheetcal.profiles import Range

T = TypeVar("T", bound=lab.Block)

TABLES = {"laboratory": lab.Laboratory, "control": lab.Control, "reporting": lab.Reporting}
ARRAYS = {
    "person": lab.Person,
    "calorimeter": lab.Calorimeter,
    "vessel": lab.Vessel,
    "calibration": lab.Calibration,
    "certified": lab.Certified,
    "lot": lab.Lot,
    "titrant": lab.Titrant,
    "balance": lab.Balance,
    "thermometer": lab.Thermometer,
    "cup": lab.Cup,
}
KNOWN = (*TABLES, *ARRAYS, "class", "limits", "profile")
# Readings whose marked range a laboratory may set in [limits]: scope of the field, unit of the range.
RANGES = {
    "room_temperature": ("sheet", "degC"),
    "station_pressure": ("sheet", "kPa"),
    "jacket_temperature": ("run", "degC"),
    "start_temperature": ("run", "degC"),
    "oxygen_pressure": ("run", "MPa"),
    "vessel_water": ("run", "mL"),
    "calorimeter_water": ("run", "g"),
    "pellet_mass": ("run", "g"),
    "wire_start": ("run", "cm"),
    "wire_left": ("run", "cm"),
    "thread_mass": ("run", "g"),
    "ignition_energy": ("run", "J"),
}


class _Reader:
    """One lab file while it is read: its text, its lines, its faults."""

    def __init__(self, source: TextFile, data: Mapping[str, Any]) -> None:
        self.source = source
        self.data = data
        self.lines: TomlLines = find_lines(source.text)
        self.faults = Faults(source)

    def fault(self, table: str, block: int, key: str, what: str, expected: str = "", do: str = "") -> None:
        """Note a fault at a key."""
        self.faults.add(self.lines.of(table, block, key), what, expected, do)

    def value_fault(self, table: str, block: int, key: str, error: SheetcalError) -> None:
        """Note what is wrong with the value of a key."""
        self.faults.add_error(self.lines.of(table, block, key), key, error)


def read_lab(path: str | os.PathLike[str]) -> Lab:
    """The laboratory a lab file states. Raises BadInput or BadInputs, naming file, line and what to do."""
    return parse_lab(read_text(path))


def parse_lab(source: TextFile) -> Lab:
    """As `read_lab`, of text already read."""
    reader = _Reader(source, _toml(source))
    for name in reader.data:
        if name not in KNOWN:
            reader.fault(name, 0, "", f"unknown table '{name}'", nearest(name, KNOWN), "Correct the name.")
    found = Lab(
        source=source,
        laboratory=_laboratory(reader),
        people=_blocks(reader, "person", lab.Person),
        calorimeters=_blocks(reader, "calorimeter", lab.Calorimeter),
        vessels=_blocks(reader, "vessel", lab.Vessel),
        calibrations=_blocks(reader, "calibration", lab.Calibration),
        certified=_blocks(reader, "certified", lab.Certified),
        all_lots=_blocks(reader, "lot", lab.Lot),
        all_titrants=_blocks(reader, "titrant", lab.Titrant),
        balances=_blocks(reader, "balance", lab.Balance),
        thermometers=_blocks(reader, "thermometer", lab.Thermometer),
        cups=_blocks(reader, "cup", lab.Cup),
        control=_table(reader, "control", lab.Control),
        classes=_classes(reader),
        reporting=_table(reader, "reporting", lab.Reporting) or lab.Reporting(),
        overrides={**_limits(reader), **_overrides(reader, "profile", reader.data.get("profile"))},
        profile_overrides=_profile_overrides(reader),
        ranges=_ranges(reader),
    )
    if not reader.faults.found:
        _check_references(reader, found)
    reader.faults.close()
    return found


def _toml(source: TextFile) -> dict[str, Any]:
    """The parsed text. Raises BadInput with the line tomllib names."""
    try:
        return tomllib.loads(source.text)
    except tomllib.TOMLDecodeError as fault:
        place = re.search(r"\s*\(at line (\d+), column \d+\)|\s*\(at end of document\)", str(fault))
        line = int(place.group(1)) if place and place.group(1) else source.text.count("\n") + 1
        reason = (str(fault)[: place.start()] if place else str(fault)).strip()
        what = f"is not TOML ({reason[:1].lower()}{reason[1:]})"
        raise BadInput(source.where(line), what, 'key = "value" under a [table]', "Correct it.") from fault
    except RecursionError as fault:
        raise BadInput(source.where(), "is nested too deeply", "a lab file", "Give the right file.") from fault


def _laboratory(reader: _Reader) -> lab.Laboratory:
    found = _table(reader, "laboratory", lab.Laboratory)
    if found is None:
        if "laboratory" not in reader.data:
            reader.fault("", 0, "", "has no [laboratory]", "name, time_zone, mass_convention", "Add the table.")
        return lab.Laboratory(name="", time_zone="UTC", mass_convention=lab.IN_AIR)
    try:
        ZoneInfo(found.time_zone)
    except (OSError, ValueError, KeyError):
        do = "Correct the name."
        what = f"time_zone '{found.time_zone}' is not known"
        reader.fault("laboratory", 0, "time_zone", what, "a name such as Europe/Vienna", do)
    return found


def _table(reader: _Reader, name: str, shape: type[T]) -> T | None:
    """The one table called `name`, or None where it is absent or faulty."""
    data = reader.data.get(name)
    if data is None:
        return None
    if not isinstance(data, dict):
        reader.fault(name, 0, "", f"'{name}' is written as [[{name}]] or as a value", f"[{name}] once", "Correct it.")
        return None
    return _block(reader, name, 0, data, shape)


def _blocks(reader: _Reader, name: str, shape: type[T]) -> tuple[T, ...]:
    """All blocks [[name]] in file order; faulty ones are noted and left out."""
    data = reader.data.get(name, [])
    if not isinstance(data, list) or not all(isinstance(one, dict) for one in data):
        reader.fault(name, 0, "", f"'{name}' is one table or a value", f"[[{name}]], with two brackets", "Correct it.")
        return ()
    found = (_block(reader, name, number, one, shape) for number, one in enumerate(data))
    return tuple(one for one in found if one is not None)


def _block(reader: _Reader, table: str, number: int, data: Mapping[str, Any], shape: type[T], **given: Any) -> T | None:
    """One block as its dataclass, or None with its faults noted."""
    before = len(reader.faults.found)
    kinds = {f.name: (f, kind) for f in dataclasses.fields(shape) if (kind := schema.kind_of(f)) is not None}
    values: dict[str, Any] = dict(given)
    for key, raw in data.items():
        if key not in kinds:
            expected = nearest(key, kinds)
            reader.fault(table, number, key, f"unknown key '{key}' in {table}", expected, "Correct the key.")
            continue
        try:
            values[key] = kinds[key][1].read(raw)
        except BadInput as error:
            reader.value_fault(table, number, key, error)
    for key, (field, kind) in kinds.items():
        if schema.required(field) and key not in data:
            reader.fault(table, number, "", f"{table} has no '{key}'", kind.expected, "Add the key.")
    if len(reader.faults.found) > before:
        return None
    return shape(line=reader.lines.of(table, number) or 0, **values)


def _classes(reader: _Reader) -> dict[str, lab.FuelClass]:
    data = reader.data.get("class", {})
    if not isinstance(data, dict) or not all(isinstance(one, dict) for one in data.values()):
        reader.fault("class", 0, "", "'class' holds a value", "tables such as [class.coal]", "Correct it.")
        return {}
    found = {}
    for name, table in data.items():
        one = _block(reader, f"class.{name}", 0, table, lab.FuelClass, name=name)
        if one is not None:
            found[name] = one
    return found


def _overrides(reader: _Reader, table: str, data: Any) -> dict[str, float]:
    """Coefficients a table restates, by name, in the unit the profiles use."""
    found: dict[str, float] = {}
    for key, raw in (data if isinstance(data, dict) else {}).items():
        if isinstance(raw, dict) or (table == "limits" and key in RANGES):
            continue
        if key not in profiles.all_names():
            names = profiles.all_names() | (set(RANGES) if table == "limits" else set())
            reader.fault(table, 0, key, f"unknown key '{key}' in {table}", nearest(key, names), "Correct the key.")
            continue
        unit = profiles.known(key).unit
        try:
            raw = int(raw) if isinstance(raw, bool) and unit == "1" else raw
            found[key] = schema.read_quantity(raw, unit)
        except BadInput as error:
            reader.value_fault(table, 0, key, error)
    return found


def _limits(reader: _Reader) -> dict[str, float]:
    return _overrides(reader, "limits", reader.data.get("limits"))


def _ranges(reader: _Reader) -> dict[str, Range]:
    """Marked ranges of readings that [limits] sets, by field: `run.vessel_water`."""
    data = reader.data.get("limits", {})
    found: dict[str, Range] = {}
    for key, raw in (data if isinstance(data, dict) else {}).items():
        if key in RANGES:
            scope, unit = RANGES[key]
            try:
                found[f"{scope}.{key}"] = schema.read_pair(raw, unit)
            except BadInput as error:
                reader.value_fault("limits", 0, key, error)
    return found


def _profile_overrides(reader: _Reader) -> dict[str, dict[str, float]]:
    """Overrides for one profile only: [profile.NAME]."""
    data = reader.data.get("profile", {})
    found = {}
    for key, raw in (data if isinstance(data, dict) else {}).items():
        if not isinstance(raw, dict):
            continue
        table = f"profile.{key}"
        if key not in profiles.names():
            reader.fault(table, 0, "", f"no profile '{key}'", nearest(key, profiles.names()), "Correct the name.")
            continue
        found[key] = _overrides(reader, table, raw)
    return found


def _check_references(reader: _Reader, found: Lab) -> None:
    """Note ids that stand twice and names that nothing answers to."""
    _unique(reader, "person", (one.id for one in found.people))
    _unique(reader, "calorimeter", (one.id for one in found.calorimeters))
    _unique(reader, "vessel", (one.id for one in found.vessels))
    _unique(reader, "balance", (one.id for one in found.balances))
    _unique(reader, "calibration", (f"{one.vessel} of {one.valid_from}" for one in found.calibrations))
    _unique(reader, "certified", (f"{one.lot} of {one.valid_from}" for one in found.certified))
    _unique(reader, "lot", (f"{one.id} of {one.valid_from}" for one in found.all_lots))
    _unique(reader, "titrant", (f"{one.lot} of {one.standardised}" for one in found.all_titrants))
    lots = [one.id for one in found.all_lots]
    for number, calorimeter in enumerate(found.calorimeters):
        for key, lot in (("firing_wire", calorimeter.firing_wire), ("thread", calorimeter.thread)):
            if lot:
                _refers(reader, "calorimeter", number, key, lot, lots)
    vessels = [one.id for one in found.vessels]
    certified = [one.lot for one in found.certified]
    calorimeters = [one.id for one in found.calorimeters]
    for number, vessel in enumerate(found.vessels):
        _refers(reader, "vessel", number, "calorimeter", vessel.calorimeter, calorimeters)
    for number, one in enumerate(found.calibrations):
        _refers(reader, "calibration", number, "vessel", one.vessel, vessels)
        _refers(reader, "calibration", number, "certificate", one.certificate, certified)
        _ordered(reader, "calibration", number, one.valid_from, one.valid_until)
    for number, burnt in enumerate(found.all_lots):
        if burnt.certificate:
            _refers(reader, "lot", number, "certificate", burnt.certificate, certified)
    for name, fuel in found.classes.items():
        _refers(reader, f"class.{name}", 0, "profile", fuel.profile, profiles.names())


def _unique(reader: _Reader, table: str, names: Iterable[str]) -> None:
    seen: set[str] = set()
    for number, name in enumerate(names):
        if name in seen:
            reader.fault(table, number, "", f"{table} '{name}' stands twice", "each once", "Remove or rename one.")
        seen.add(name)


def _refers(reader: _Reader, table: str, number: int, key: str, name: str, known: list[str]) -> None:
    """Note a name that none of `known` answers to."""
    if name not in known:
        expected = nearest(name, known) if known else "a block of that name"
        reader.fault(table, number, key, f"{key} '{name}' is not known", expected, "Correct the name.")


def _ordered(reader: _Reader, table: str, number: int, start: Any, end: Any) -> None:
    if end < start:
        what = f"ends at {end.isoformat()}, before it begins"
        reader.fault(table, number, "valid_until", what, f"after {start.isoformat()}", "Correct the date.")


def keys_of(table: str) -> tuple[str, ...]:
    """The keys of a table, in the order of its dataclass."""
    shape = {**TABLES, **ARRAYS}[table]
    return tuple(f.name for f in dataclasses.fields(shape) if schema.kind_of(f) is not None)
