"""Worklists, analysis, data and instrument files are read, or refused naming file, line and advice."""

import json
from collections.abc import Callable
from datetime import date, datetime
from pathlib import Path
from typing import Any

import pytest

from sheetcal.errors import BadInput, SheetcalError
from sheetcal.inputs import read_analysis, read_data, read_instrument_log, read_worklist

Reader = Callable[[Path], Any]


def write(tmp_path: Path, text: str, name: str = "in.csv") -> Path:
    path = tmp_path / name
    path.write_text(text, encoding="utf-8")
    return path


W = "sample_id,fuel_class,runs,expected_gross,S,S_mark\n"
A = "sample,quantity,value,unit,basis,determined,by,source,mark\n"
D = "field,value,unit\n"
I = "time,instrument,run,quantity,value,unit\n"  # noqa: E741 - beside W, A and D it reads well

MALFORMED: list[tuple[Reader, str, int | None, tuple[str, ...]]] = [
    (read_worklist, "sample_id;runs\nS-1;2\n", 1, ("separated by ;", "comma-separated")),
    (read_worklist, "sample_id\truns\nS-1\t2\n", 1, ("separated by a tab",)),
    (read_worklist, "sampleid,runs\nS-1,2\n", 1, ("unknown column 'sampleid'", "'sample_id'")),
    (read_worklist, "order,runs\nO-1,2\n", 1, ("column 'sample_id' is missing",)),
    (read_worklist, "sample_id,sample_id\nS-1,S-1\n", 1, ("stands twice",)),
    (read_worklist, "sample_id,\nS-1,2\n", 1, ("column 2 has no name",)),
    (read_worklist, W, None, ("no samples",)),
    (read_worklist, W + "S-1,coal,2\n", 2, ("has 3 cells", "6 cells")),
    (read_worklist, W + "S-1,coal,2,30000,,\nS-1,coal,2,,,\n", 3, ("stands already on line 2",)),
    (read_worklist, W + ",coal,2,30000,,\n", 2, ("sample_id is empty",)),
    (read_worklist, W + "S-1,coal,0,30000,,\n", 2, ("runs '0'", "1 to 20")),
    (read_worklist, W + "S-1,coal,two,30000,,\n", 2, ("runs 'two'",)),
    (read_worklist, W + 'S-1,coal,2,"30,0",,\n', 2, ("decimal comma", "Write 30.0")),
    (read_worklist, W + "S-1,coal,2,30.0,,\n", 2, ("looks like MJ/kg", "Write 30000")),
    (read_worklist, W + "S-1,coal,2,99000,,\n", 2, ("-3000 to 60000",)),
    (read_worklist, W + "S-1,coal,2,30000,n.d.,\n", 2, ("Leave the cell empty",)),
    (read_worklist, W + "S-1,coal,2,30000,0.5,>\n", 2, ("S_mark '>'", "< or nothing")),
    (read_worklist, W + "S-1,coal,2,30000,105,\n", 2, ("0 % to 100 %",)),
    (read_worklist, W + 'S-1,"coal,2,30000,,\n', 2, ("quotation mark",)),
    (read_worklist, "sample_id,role\nS-1,blank\n", 2, ("role 'blank'", "aid-blank")),
    (read_worklist, "sample_id,basis\nS-1,dray\n", 2, ("basis 'dray'", "'dry'")),
    (read_worklist, "sample_id,received\nS-1,28.02.2025\n", 2, ("not a date", "2025-03-03")),
    (read_worklist, "sample_id,received\nS-1,2025-02-30\n", 2, ("not a date",)),
    (read_worklist, "sample_id,hydrogen\nS-1,dry\n", 2, ("hydrogen 'dry'",)),
    (read_worklist, "sample_id,Cl,Cl_source\nS-1,1,guess\n", 2, ("Cl_source 'guess'",)),
    (read_analysis, A, None, ("no rows",)),
    (read_analysis, A + "S-1,sulphur,1,%,dry,,,,\n", 2, ("'sulphur' is not known", "'sulfur'")),
    (read_analysis, A + "S-1,S,1,g,dry,,,,\n", 2, ("does not measure",)),
    (read_analysis, A + 'S-1,S,"0,5",%,dry,,,,\n', 2, ("decimal comma",)),
    (read_analysis, A + "S-1,S,-1,%,dry,,,,\n", 2, ("0 % to 100 %",)),
    (read_analysis, A + "S-1,S,1,%,damp,,,,\n", 2, ("basis 'damp'",)),
    (read_analysis, A + "S-1,S,1,%,dry,yesterday,,,\n", 2, ("not a date and time",)),
    (read_analysis, A + "S-1,S,1,%,dry,2025-03-03T25:00,,,\n", 2, ("not a date and time",)),
    (read_analysis, A + "S-1,S,1,%,dry,,,,~\n", 2, ("mark '~'",)),
    (read_analysis, A + ",S,1,%,dry,,,,\n", 2, ("sample is empty",)),
    (read_analysis, A + "S-1,S,1,%,dry,,,,\nS-1,S,2,%,dry,,,,\n", 3, ("stands already on line 2",)),
    (read_data, "field,wert\nrun1.x,1\n", 1, ("unknown column 'wert'",)),
    (read_data, D, None, ("no rows",)),
    (read_data, D + "run0.crucible_gross,1,g\n", 2, ("not a field id",)),
    (read_data, D + "run01.crucible_gross,1,g\n", 2, ("not a field id",)),
    (read_data, D + "Run1.crucible_gross,1,g\n", 2, ("not a field id",)),
    (read_data, D + "run1.crucible_gross,1,g\nrun1.crucible_gross,1,g\n", 3, ("stands twice",)),
    (read_data, D + "run1.crucible_gross,1,gram_force\n", 2, ("is not known",)),
    (read_instrument_log, I + "2025-03-03T07:03,B,r,water,2000.0,kilo\n", 2, ("is not known",)),
    (read_instrument_log, I + "07:03,B,r,water,2000.0,g\n", 2, ("not a date and time",)),
    (read_instrument_log, "time,run\n2025-03-03T07:03,r\n", 1, ("column 'instrument' is missing",)),
]


@pytest.mark.parametrize(("reader", "text", "line", "parts"), MALFORMED)
def test_a_malformed_table_names_file_line_and_advice(
    tmp_path: Path, reader: Reader, text: str, line: int | None, parts: tuple[str, ...]
) -> None:
    """The first line of the message begins with the file and the line of the fault."""
    path = write(tmp_path, text)
    with pytest.raises(SheetcalError) as caught:
        reader(path)
    first = str(caught.value).splitlines()[0]
    assert first.startswith(str(path) + (f", line {line}: " if line else ": ")), first
    for part in parts:
        assert part in first


def test_the_malformed_tables_are_counted() -> None:
    """The table above has not shrunk."""
    assert len(MALFORMED) == 46


@pytest.mark.parametrize(
    ("text", "line", "part"),
    [
        ('{"run1.crucible_gross": 11.8,,}', 1, "is not JSON"),
        ('{\n"run1.crucible_gross": 11.8\n', 3, "is not JSON"),
        ("[1, 2]", 1, "holds no object"),
        ('{"run1.crucible_gross": NaN}', None, "NaN"),
        ('{"run1.crucible_gross": 1e999}', 1, "infinite"),
        ('{\n"gross": 1}', 2, "not a field id"),
        ('{"run1.a": {"b": 1}}', 1, "nested"),
        ('{"run1.a": [[1]]}', 1, "nested"),
        ('{"run1.a": 1,\n"run1.a": 2}', 1, "stands twice"),
        ("[" * 100_000, None, "is not taken"),
    ],
)
def test_malformed_json(tmp_path: Path, text: str, line: int | None, part: str) -> None:
    """A JSON file is refused with its line where JSON has one."""
    path = write(tmp_path, text, "in.json")
    with pytest.raises(SheetcalError) as caught:
        read_data(path)
    first = str(caught.value).splitlines()[0]
    assert part in first
    assert first.startswith(str(path) + (f", line {line}: " if line else ": ")), first


def test_data_of_another_suffix_is_refused(tmp_path: Path) -> None:
    """Only .csv and .json are data."""
    with pytest.raises(BadInput, match=r"'\.xlsx'"):
        read_data(write(tmp_path, "x", "in.xlsx"))


def test_worklist_values_marks_and_sources(tmp_path: Path) -> None:
    """A value keeps its mark, source and basis; a blank cell stays open."""
    head = "sample_id,S,Cl,Cl_mark,Cl_source,Cl_basis,total_moisture,total_moisture_source,hydrogen,role\n"
    row = "S-1,<0.05,0.02,<,client,d,,measured,without_moisture,control\nS-2,,,,,,11.8,,,\n"
    first, second = read_worklist(write(tmp_path, head + row)).samples
    sulfur, chlorine = first.value("sulfur"), first.value("chlorine")
    assert sulfur is not None and (sulfur.value, sulfur.mark, sulfur.basis) == (0.05, "<", "")
    assert chlorine is not None
    assert (chlorine.value, chlorine.mark, chlorine.source, chlorine.basis) == (0.02, "<", "client", "dry")
    assert first.value("total_moisture") is None
    assert first.source("total_moisture") == "measured"
    assert (first.role, first.hydrogen, second.role) == ("control", "without moisture", "sample")
    moisture = second.value("total_moisture")
    assert moisture is not None and (moisture.value, moisture.basis) == (11.8, "as received")
    assert second.value("sulfur") is None


def test_a_worklist_row(tmp_path: Path) -> None:
    """Every plain column arrives as it is meant, blank cells and byte-order mark included."""
    head = "\ufeffsample_id,order,client,description,fuel_class,received,condition,runs,"
    head += "expected_gross,customer_limit,basis\n"
    row = 'S-1,O-1,K,"coal, hold 2",coal,2025-02-28,sealed,2,30000,net >= 25.00 MJ/kg,ar\n'
    one = read_worklist(write(tmp_path, "# invented\n" + head[1:] + row)).samples[0]
    assert (one.description, one.received, one.runs) == ("coal, hold 2", date(2025, 2, 28), 2)
    assert (one.expected_gross, one.basis, one.line) == (30000.0, "as received", 3)
    assert read_worklist(write(tmp_path, head + row)).samples[0].sample_id == "S-1"


def test_a_formula_guard_is_taken_off(tmp_path: Path) -> None:
    """The quote that keeps a text from being run as a formula is not part of the text."""
    path = write(tmp_path, "sample_id,remarks\nS-1,'=late\nS-2,'quoted'\n")
    assert [one.remarks for one in read_worklist(path).samples] == ["=late", "'quoted'"]


def test_analysis_values(tmp_path: Path) -> None:
    """Quantities, bases and sources take the tool's words, units become per cent, blanks are passed over."""
    rows = (
        "S-1,H,4.60,%,d,2025-03-03T08:00,SK,measured,\n"
        "S-1,Cl,200,mg/kg,dry,2025-03-03T08:00,SK,by difference,<\n"
        "S-1,analysis_moisture,2.6,,,2025-03-03 09:00,SK,,\n"
        "S-1,ash,,%,dry,,,,\n"
    )
    hydrogen, chlorine, moisture = read_analysis(write(tmp_path, A + rows))
    assert (hydrogen.quantity, hydrogen.value, hydrogen.basis) == ("hydrogen", 4.60, "dry")
    assert hydrogen.determined == datetime(2025, 3, 3, 8) and hydrogen.by == "SK"
    assert (chlorine.value, chlorine.mark, chlorine.source) == (pytest.approx(0.02), "<", "difference")
    assert (moisture.basis, moisture.value) == ("as analysed", 2.6)


def test_the_same_quantity_at_another_time_is_no_repeat(tmp_path: Path) -> None:
    """Several moistures of one sample stand side by side; the runs choose."""
    rows = "S-1,analysis_moisture,8.9,%,,2025-03-04T09:00,,,\nS-1,analysis_moisture,8.4,%,,2025-03-06T07:30,,,\n"
    assert len(read_analysis(write(tmp_path, A + rows))) == 2


def test_data_from_csv_and_json_is_the_same(tmp_path: Path) -> None:
    """A value may carry its unit in the column or in the text; empty and null say nothing."""
    table = D + "run1.crucible_gross,11.8231,\nrun1.aid1_mass,98.2,mg\nrun1.inspection,clean,\nrun1.wire_left,,\n"
    document = {
        "run1.crucible_gross": 11.8231,
        "run1.aid1_mass": "98.2 mg",
        "run1.inspection": "clean",
        "run1.wire_left": None,
    }
    for path in (write(tmp_path, table), write(tmp_path, json.dumps(document), "in.json")):
        values = read_data(path).values
        assert list(values) == ["run1.crucible_gross", "run1.aid1_mass", "run1.inspection"]
        assert values["run1.crucible_gross"].number("g") == 11.8231
        assert values["run1.aid1_mass"].number("g") == pytest.approx(0.0982)
        assert values["run1.inspection"].value == "clean"


def test_a_series_and_one_element(tmp_path: Path) -> None:
    """A list is a series, a bracketed id one element of it."""
    text = '{"run1.record_temperature": [22.31, null, "22.35 degC"], "run1.record_time[7]": 3}'
    values = read_data(write(tmp_path, text, "in.json")).values
    assert values["run1.record_temperature"].numbers("degC") == [22.31, None, 22.35]
    assert values["run1.record_time[7]"].number("min") == 3.0


@pytest.mark.parametrize(
    ("row", "unit", "part"),
    [
        ('run1.a,"7,90",', "%", "decimal comma"),
        ("run1.a,98.2 mg,mg", "g", "unit beside the column"),
        ("run1.a,98.2,mL", "g", "does not measure"),
        ("run1.a,n.d.,", "%", "Leave the cell empty"),
        ("run1.a,clean,", "g", "not a number"),
        ("run1.a,12.5 degC,", "K", "for a difference"),
    ],
)
def test_a_value_that_is_no_number_names_its_line(tmp_path: Path, row: str, unit: str, part: str) -> None:
    """A fault found late, when the field's unit is known, still names file and line."""
    path = write(tmp_path, D + row + "\n")
    with pytest.raises(BadInput) as caught:
        read_data(path).values["run1.a"].number(unit)
    assert str(caught.value).startswith(f"{path}, line 2: run1.a: ")
    assert part in str(caught.value)


def test_an_analysis_file_is_known_by_its_header(tmp_path: Path) -> None:
    """`fill` takes both files by the same option."""
    data = read_data(write(tmp_path, A + "S-1,S,1,%,dry,,,,\n"))
    assert not data.values
    assert data.analysis[0].quantity == "sulfur"


def test_an_instrument_log(tmp_path: Path) -> None:
    """What a balance stored keeps time, instrument and unit."""
    row = "2025-03-04T12:40,BAL-2,W3-S-2507-1,calorimeter_water,1991.5,g\n"
    (one,) = read_instrument_log(write(tmp_path, I + row))
    assert (one.time, one.value, one.unit) == (datetime(2025, 3, 4, 12, 40), 1991.5, "g")
