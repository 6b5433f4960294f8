"""A logger's record is read in whatever spelling its content shows, or refused where two are possible."""

from datetime import datetime
from pathlib import Path

import pytest

from sheetcal.errors import SheetcalError
from sheetcal.inputs import read_logger

NOTE = "# calorimeter CAL-A; vessel A2; channel T1; start 2025-03-03T07:35; fired at 5.00 min\n"
HEAD = "time_min,temperature_degC\n"
ROWS = [(0.0, 22.3151), (0.5, 22.3164), (1.0, 22.3178)]


def write(tmp_path: Path, text: str) -> Path:
    path = tmp_path / "log.csv"
    path.write_bytes(text.encode("utf-8"))
    return path


def rows(sign: str = ",", decimal: str = ".", end: str = "\n") -> str:
    lines = (f"{time:.2f}{sign}{temperature:.4f}" for time, temperature in ROWS)
    return end.join(line.replace(".", "~") for line in lines).replace("~", decimal) + end


def test_notes_header_and_readings(tmp_path: Path) -> None:
    """The line of notes gives vessel, start and firing time; the readings come as stored."""
    record = read_logger(write(tmp_path, NOTE + HEAD + rows()))
    assert (record.calorimeter, record.vessel, record.firing_time) == ("CAL-A", "A2", 5.0)
    assert record.start == datetime(2025, 3, 3, 7, 35)
    assert list(zip(record.time, record.temperature, strict=True)) == ROWS


@pytest.mark.parametrize(
    ("sign", "decimal"),
    [(",", "."), (";", "."), (";", ","), ("\t", "."), ("\t", ","), (" ", "."), ("  ", ",")],
)
@pytest.mark.parametrize("end", ["\n", "\r\n"])
def test_separator_and_decimal_sign_by_content(tmp_path: Path, sign: str, decimal: str, end: str) -> None:
    """Every spelling with one possible reading gives the same record."""
    record = read_logger(write(tmp_path, rows(sign, decimal, end)), log_time="min")
    assert list(zip(record.time, record.temperature, strict=True)) == ROWS


def test_seconds_become_minutes(tmp_path: Path) -> None:
    """A time column in seconds, by header or by option, is converted."""
    by_header = read_logger(write(tmp_path, "time_s;temperature_degC\n0;22,1\n30;22,2\n"))
    by_option = read_logger(write(tmp_path, "0;22,1\n30;22,2\n"), log_time="s")
    assert by_header.time == by_option.time == (0.0, 0.5)
    assert by_header.temperature == (22.1, 22.2)


def test_a_restarted_record_is_not_mended(tmp_path: Path) -> None:
    """Times that jump back are stored as they are: the workbook judges them."""
    record = read_logger(write(tmp_path, HEAD + "0.0,22.1\n0.5,22.2\n0.0,22.3\n"))
    assert record.time == (0.0, 0.5, 0.0)


def test_a_note_may_be_absent_or_unknown(tmp_path: Path) -> None:
    """Notes are optional and unknown ones are kept."""
    record = read_logger(write(tmp_path, "# probe P7\n" + HEAD + rows()))
    assert (record.vessel, record.firing_time, record.start) == ("", None, None)
    assert record.notes["probe"] == "P7"


MALFORMED = [
    # text, log_time, line, parts of the message
    (rows(), None, 1, ("has no header", "--log-time s")),
    (HEAD + rows(), "s", 1, ("header says min",)),
    (HEAD + rows(), "h", None, ("--log-time", "s or min")),
    ("time,temperature\n" + rows(), None, 1, ("header 'time,temperature'", "time_min,temperature_degC")),
    ("time_min,temperature_K\n" + rows(), None, 1, ("temperature_degC",)),
    ("time_min,temperature_degC,jacket\n" + rows(), None, 1, ("Correct the header",)),
    (HEAD + "0.0,22.1\n0.5,abc\n1.0,22.3\n", None, 3, ("'0.5,abc'", "decimal point")),
    (HEAD + "0.0,22.1\n0.5\n1.0,22.3\n", None, 3, ("two numbers, comma between them",)),
    (HEAD + "0.0,22.1\n0.5,22.2,7\n1.0,22.3\n", None, 3, ("'0.5,22.2,7'",)),
    (HEAD + "0;22,1\n1;22,2\n2;22.3\n3;22,4\n", None, 4, ("decimal comma",)),
    (HEAD + "0.0,22.1\n0.5,\x07\n1.0,22.3\n", None, 3, ("\\x07",)),
    (HEAD + "0.0,inf\n0.5,inf\n", None, 2, ("not time and temperature",)),
    (HEAD + "0,00,22,31\n0,50,22,32\n", None, 2, ("two ways", "semicolon or tab")),
    (HEAD + "0,22,31\n1,22,32\n", None, 2, ("two ways",)),
    (HEAD, None, None, ("holds 0 readings",)),
    (HEAD + "0.0,22.1\n", None, None, ("holds 1 readings",)),
    ("# fired at 7:30\n" + HEAD + rows(), None, 1, ("fired at",)),
    ("# fired at 5.00\n" + HEAD + rows(), None, 1, ("has no unit", "min")),
    ("#\n# start 3 March\n" + HEAD + rows(), None, 2, ("not a date and time",)),
]


@pytest.mark.parametrize(("text", "log_time", "line", "parts"), MALFORMED)
def test_a_malformed_record_names_file_line_and_advice(
    tmp_path: Path, text: str, log_time: str | None, line: int | None, parts: tuple[str, ...]
) -> None:
    """Each fault names the file, its line, what was expected and what to do."""
    path = write(tmp_path, text)
    with pytest.raises(SheetcalError) as caught:
        read_logger(path, log_time)
    first = str(caught.value).splitlines()[0]
    if line:
        assert first.startswith(f"{path}, line {line}: "), first
    for part in parts:
        assert part in first


def test_the_malformed_records_are_counted() -> None:
    """The table above has not shrunk."""
    assert len(MALFORMED) == 19


def test_one_restless_line_does_not_hide_the_others(tmp_path: Path) -> None:
    """All bad lines of a record are named together."""
    text = HEAD + "".join(f"{i},22.{i}\n" for i in range(20)) + "x\ny\n"
    with pytest.raises(SheetcalError) as caught:
        read_logger(write(tmp_path, text))
    assert len(str(caught.value).splitlines()) == 2
