"""Temperature records from a logger: notes, header, two columns whose spelling is found from the content."""

import os
import re
from collections.abc import Mapping
from dataclasses import dataclass, field
from datetime import datetime

from sheetcal import units
from sheetcal.errors import BadInput
from sheetcal.inputs.table import moment
from sheetcal.inputs.text import Faults, TextFile, read_text

HEADERS = {"time_s": "s", "time_min": "min"}
TEMPERATURE = "temperature_degC"
SEPARATORS = {",": "comma", ";": "semicolon", "\t": "tab", " ": "blank"}
NOTES = ("calorimeter", "vessel", "channel", "start", "fired at", "run", "operator", "thermometer")
Pairs = list[tuple[float, float]]


@dataclass(frozen=True)
class LoggerRecord:
    """A record: `time` in min and `temperature` in degC, both (n,), as stored; `notes` by name.

    Nothing is sorted or mended: an uneven or restarted record is judged in the workbook.
    """

    source: TextFile
    time: tuple[float, ...]
    temperature: tuple[float, ...]
    notes: Mapping[str, str] = field(default_factory=dict)
    firing_time: float | None = None
    start: datetime | None = None

    @property
    def vessel(self) -> str:
        """The vessel the notes name, or empty."""
        return self.notes.get("vessel", "")

    @property
    def calorimeter(self) -> str:
        """The calorimeter the notes name, or empty."""
        return self.notes.get("calorimeter", "")


@dataclass(frozen=True, slots=True)
class _Lines:
    """The file taken apart: notes, header cells (empty where there is none) and data, with lines."""

    notes: list[tuple[int, str]]
    header: tuple[int, str] | None
    data: list[tuple[int, str]]


def read_logger(path: str | os.PathLike[str], log_time: str | None = None) -> LoggerRecord:
    """The record in a logger file. Raises BadInput or BadInputs, naming file and line.

    `log_time` ("s" or "min") is the unit of the time column of a file without header.
    """
    source = read_text(path)
    lines = _take_apart(source)
    faults = Faults(source)
    unit = _time_unit(source, lines, log_time)
    notes = _notes(lines.notes)
    firing_time, start = _firing_time(notes, lines, faults), _start(notes, lines, faults)
    pairs = _pairs(source, lines, faults)
    faults.close()
    return LoggerRecord(
        source=source,
        time=tuple(units.convert(time, unit, "min") for time, _ in pairs),
        temperature=tuple(temperature for _, temperature in pairs),
        notes=notes,
        firing_time=firing_time,
        start=start,
    )


def _take_apart(source: TextFile) -> _Lines:
    """Notes are `#` lines before the first other line; a header is a first line that starts with a letter."""
    notes: list[tuple[int, str]] = []
    rest: list[tuple[int, str]] = []
    for line, text in enumerate(source.text.splitlines(), 1):
        stripped = text.strip()
        if stripped.startswith("#") and not rest:
            notes.append((line, stripped.lstrip("#").strip()))
        elif stripped:
            rest.append((line, text.strip(" \r\n")))
    if rest and re.match(r"[\"']?[A-Za-z]", rest[0][1]):
        return _Lines(notes, rest[0], rest[1:])
    return _Lines(notes, None, rest)


def _time_unit(source: TextFile, lines: _Lines, log_time: str | None) -> str:
    """Unit of the time column, from the header or from `log_time`. Raises BadInput where neither says it."""
    if log_time is not None and log_time not in ("s", "min"):
        raise BadInput("--log-time", f"'{log_time}' is not known", "s or min", "Correct the option.")
    if lines.header is None:
        if log_time is None:
            do = "Give --log-time s or --log-time min."
            raise BadInput(source.where(1), "has no header", f"time_s or time_min,{TEMPERATURE}", do)
        return log_time
    line, text = lines.header
    cells = [cell.strip(" \"'") for cell in re.split(r"[,;\t]", text)]
    if len(cells) != 2 or cells[0] not in HEADERS or cells[1] != TEMPERATURE:
        expected = f"time_s,{TEMPERATURE} or time_min,{TEMPERATURE}"
        raise BadInput(source.where(line), f"header '{text[:60]}'", expected, "Correct the header.")
    unit = HEADERS[cells[0]]
    if log_time is not None and log_time != unit:
        what = f"header says {unit}, --log-time says {log_time}"
        raise BadInput(source.where(line), what, "one unit of time", "Leave the option out.")
    return unit


def _notes(lines: list[tuple[int, str]]) -> dict[str, str]:
    """`vessel A1; fired at 5.00 min` as {"vessel": "A1", "fired at": "5.00 min"}."""
    found: dict[str, str] = {}
    for _, text in lines:
        for part in text.split(";"):
            name, value = _name_and_value(part.strip())
            if value:
                found[name] = value
    return found


def _name_and_value(part: str) -> tuple[str, str]:
    for name in NOTES:
        if part.lower().startswith(name + " "):
            return name, part[len(name) :].strip()
    name, _, value = part.partition(" ")
    return name, value.strip()


def _firing_time(notes: Mapping[str, str], lines: _Lines, faults: Faults) -> float | None:
    """The firing time of the notes, in min."""
    if "fired at" not in notes:
        return None
    try:
        return units.quantity(notes["fired at"], "min")
    except BadInput as error:
        faults.add_error(_note_line(lines, "fired at"), "fired at", error)
        return None


def _start(notes: Mapping[str, str], lines: _Lines, faults: Faults) -> datetime | None:
    """Local date and time at which the record starts."""
    if "start" not in notes:
        return None
    try:
        return moment(notes["start"])
    except BadInput as error:
        faults.add_error(_note_line(lines, "start"), "start", error)
        return None


def _note_line(lines: _Lines, name: str) -> int:
    return next(line for line, text in lines.notes if name in text.lower())


def _pairs(source: TextFile, lines: _Lines, faults: Faults) -> Pairs:
    """Time and temperature of each data line, as the one spelling that fits all lines reads them."""
    if len(lines.data) < 2:
        faults.add(None, f"holds {len(lines.data)} readings", "time, temperature a line", "Give the record.")
        return []
    spellings = [(sign, decimal) for sign in SEPARATORS for decimal in ".," if sign != decimal]
    fits = [pairs for one in spellings if (pairs := _read_all(lines.data, *one)) is not None]
    distinct = [pairs for position, pairs in enumerate(fits) if pairs not in fits[:position]]
    if len(distinct) == 1 and not _comma_twice(lines.data):
        return distinct[0]
    if len(distinct) > 1 or _comma_twice(lines.data):
        line, text = lines.data[0]
        expected = "a semicolon or tab between the columns"
        faults.add(line, f"'{text[:40]}' can be read two ways", expected, "Save it with another separator.")
        return []
    _name_bad_lines(lines.data, spellings, faults)
    return []


def _comma_twice(data: list[tuple[int, str]]) -> bool:
    """True where the comma serves as separator and as decimal sign: 0,5,24,31."""
    return all(re.fullmatch(r"[+-]?\d+(,\d+){2,3}", text) for _, text in data)


def _read_all(data: list[tuple[int, str]], sign: str, decimal: str) -> Pairs | None:
    """All lines read with one separator and decimal sign, or None where one line does not fit."""
    pairs = [_read_one(text, sign, decimal) for _, text in data]
    fitting = [pair for pair in pairs if pair is not None]
    return fitting if len(fitting) == len(pairs) else None


def _read_one(text: str, sign: str, decimal: str) -> tuple[float, float] | None:
    cells = text.split() if sign == " " else [cell.strip() for cell in text.split(sign)]
    pattern = rf"[+-]?\d+(?:{re.escape(decimal)}\d+)?(?:[eE][+-]?\d+)?"
    if len(cells) != 2 or not all(re.fullmatch(pattern, cell) for cell in cells):
        return None
    time, temperature = (float(cell.replace(decimal, ".")) for cell in cells)
    return time, temperature


def _name_bad_lines(data: list[tuple[int, str]], spellings: list[tuple[str, str]], faults: Faults) -> None:
    """Note the lines that do not fit the spelling which fits most of them."""
    sign, decimal = max(spellings, key=lambda one: sum(_read_one(t, *one) is not None for _, t in data))
    point = "point" if decimal == "." else "comma"
    expected = f"two numbers, {SEPARATORS[sign]} between them, decimal {point}"
    for line, text in data:
        if _read_one(text, sign, decimal) is None:
            shown = "".join(c if c.isprintable() else f"\\x{ord(c):02x}" for c in text[:40])
            faults.add(line, f"'{shown}' is not time and temperature", expected, "Correct the line.")
