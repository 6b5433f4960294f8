"""A lab file is read whole, or refused naming file, line, what was expected and what to do."""

import os
import pickle
from datetime import date, datetime
from pathlib import Path

import pytest

from sheetcal.errors import BadInput, BadInputs, SheetcalError
from sheetcal.inputs import append_block, block_text, read_lab
from sheetcal.inputs.lab_lines import find_lines

ROOT = Path(__file__).parents[2]
DEMO = ROOT / "workbooks" / "demo" / "lab.toml"

SMALL = """\
[laboratory]
name = "Small"
time_zone = "Europe/Vienna"
mass_convention = "in air"

[[calorimeter]]
id = "C"
rise = "record"
water = "constant water"

[[vessel]]
id = "V"
calorimeter = "C"
rated_energy = "35 kJ"

[[certified]]
lot = "B"
substance = "benzoic acid"
value = "26434 J/g"
mass = "in vacuum"

[[calibration]]
vessel = "V"
issue = "x"
value = "10135.0 J/K"
n = 5
certificate = "B"
valid_from = 2025-01-15T16:00:00
valid_until = 2025-07-15

[class.coal]
profile = "iso-1928"
"""


def small(tmp_path: Path, old: str = "", new: str = "", end: str = "") -> Path:
    """The small lab file with one text replaced and something added."""
    assert old in SMALL
    path = tmp_path / "lab.toml"
    path.write_text((SMALL.replace(old, new, 1) if old else SMALL) + end, encoding="utf-8")
    return path


MALFORMED = [
    # old text, new text, added at the end, line of the fault, parts of the message
    (
        'value = "10135.0 J/K"',
        "value = 10135.0",
        "",
        25,
        ("value: 10135.0 has no unit", 'Write "10135.0 J/K"'),
    ),
    ('value = "10135.0 J/K"', 'value = "10135,0 J/K"', "", 25, ("decimal comma",)),
    ('value = "10135.0 J/K"', 'value = "10135.0 J/g"', "", 25, ("does not measure", "J/K")),
    ('value = "10135.0 J/K"', 'value = "10135.0 kcal/K"', "", 25, ("cal_th",)),
    ('value = "10135.0 J/K"', 'value = "0 J/K"', "", 25, ("too small", "more than 0 J/K")),
    ('value = "10135.0 J/K"', 'value_J_K = "10135.0 J/K"', "", 25, ("unknown key 'value_J_K'", "'value'")),
    ("n = 5", "n = 5.5", "", 26, ("not a whole number",)),
    ("n = 5", 'n = "5"', "", 26, ("not a whole number",)),
    ("n = 5", "n = true", "", 26, ("not a whole number",)),
    ("n = 5\n", "", "", 22, ("calibration has no 'n'", "Add the key")),
    ('vessel = "V"', 'vessel = "W"', "", 23, ("vessel 'W' is not known",)),
    ('certificate = "B"', 'certificate = "BB"', "", 27, ("'BB' is not known", "'B'")),
    ("valid_until = 2025-07-15", 'valid_until = "July"', "", 29, ("not a date", "without quotation marks")),
    ("valid_until = 2025-07-15", "valid_until = 2024-07-15", "", 29, ("before it begins",)),
    ("valid_from = 2025-01-15T16:00:00", "valid_from = 2025-01-15T16:00:00Z", "", 28, ("time zone", "local")),
    ('calorimeter = "C"', 'calorimeter = "D"', "", 13, ("calorimeter 'D' is not known",)),
    ('rise = "record"', 'rise = "recorder"', "", 8, ("'recorder' is not known", "'record'")),
    ('mass = "in vacuum"', 'mass = "vacuum"', "", 20, ("'in air' or 'in vacuum'",)),
    ('profile = "iso-1928"', 'profile = "iso1928"', "", 32, ("'iso-1928'",)),
    ('time_zone = "Europe/Vienna"', 'time_zone = "Wien"', "", 3, ("time_zone 'Wien'", "Europe/Vienna")),
    ('time_zone = "Europe/Vienna"', 'time_zone = "../../etc/passwd"', "", 3, ("is not known",)),
    ('name = "Small"', 'name = ""', "", 2, ("not a text",)),
    ('name = "Small"\n', "", "", 1, ("laboratory has no 'name'",)),
    ("[laboratory]", "[laboratry]", "", 1, ("unknown table 'laboratry'", "'laboratory'")),
    ("[[vessel]]", "[vessel]", "", 11, ("[[vessel]], with two brackets",)),
    ("[laboratory]", "[[laboratory]]", "", 1, ("[laboratory] once",)),
    ('rated_energy = "35 kJ"', 'rated_energy = "35 kJ', "", 14, ("is not TOML",)),
    ("[class.coal]", "[class.coal]\nr_J_g = 120", "", 32, ("unknown key 'r_J_g'",)),
    ("", "", 'expected = ["33 kJ/g", "15 kJ/g"]\n', 33, ("from high to low",)),
    ("", "", 'expected = ["33 kJ/g"]\n', 33, ("is not a range",)),
    ("", "", "needs_approval = 1\n", 33, ("true or false",)),
    ("", "", '[[vessel]]\nid = "V"\ncalorimeter = "C"\nrated_energy = "1 kJ"\n', 33, ("stands twice",)),
    ("", "", '[[person]]\nid = "P"\nmay = "fuel"\n', 35, ("is not a list",)),
    ("", "", '[[lot]]\nid = "L"\nwhat = "aid oil"\nheat = 46060\n', 36, ("J/g, J/cm or J",)),
    ("", "", '[[lot]]\nid = "L"\nwhat = "aid oil"\nheat = "46060 K"\n', 36, ("is not a heat",)),
    ("", "", '[[lot]]\nid = "L"\nwhat = "oil"\nheat = "1 J/g"\n', 35, ("'aid oil'",)),
    ("", "", "[profile]\nnet_p_hydrogn = 1\n", 34, ("'net_p_hydrogen'",)),
    ("", "", "[profile]\nnet_p_hydrogen = 212.2\n", 34, ("has no unit", "J/g")),
    ("", "", "[profile.iso1928]\nnet_p_hydrogen = 1\n", 33, ("no profile 'iso1928'",)),
    ("", "", '[limits]\nroom_temperature = "20 degC"\n', 34, ("is not a range",)),
    ("", "", '[limits]\nrom_temperature = ["1 degC", "2 degC"]\n', 34, ("'room_temperature'",)),
    ("", "", '[reporting]\nbelow_limit = "third"\n', 34, ("'half'",)),
    ("", "", "surplus\n", 33, ("is not TOML",)),
]


@pytest.mark.parametrize(("old", "new", "end", "line", "parts"), MALFORMED)
def test_a_malformed_lab_file_names_file_line_and_advice(
    tmp_path: Path, old: str, new: str, end: str, line: int, parts: tuple[str, ...]
) -> None:
    """Each fault is one line that begins with the file and the line it stands on."""
    path = small(tmp_path, old, new, end)
    with pytest.raises(SheetcalError) as caught:
        read_lab(path)
    first = str(caught.value).splitlines()[0]
    assert first.startswith(f"{path}, line {line}: "), first
    for part in parts:
        assert part in first
    assert str(pickle.loads(pickle.dumps(caught.value))) == str(caught.value)


def test_the_malformed_files_are_counted() -> None:
    """The table above has not shrunk."""
    assert len(MALFORMED) == 43


@pytest.mark.parametrize(
    ("content", "part"),
    [
        (b"", "is empty"),
        (b"  \n", "is empty"),
        (b"[laboratory]\nname = 'a\0'", "NUL"),
        (b"[laboratory]\nname = '\xff'", "line 2: is not UTF-8"),
        ("[laboratory]".encode("utf-16"), "NUL"),
        (b"x = " + b"[" * 100_000, "is nested too deeply"),
        (b"%PDF-1.7 binary", "line 1: is not TOML"),
    ],
)
def test_what_is_no_lab_file_is_refused_in_one_line(tmp_path: Path, content: bytes, part: str) -> None:
    """Empty, binary and hostile files end in one line."""
    path = tmp_path / "lab.toml"
    path.write_bytes(content)
    with pytest.raises(BadInput) as caught:
        read_lab(path)
    assert part in str(caught.value)
    assert "\n" not in str(caught.value)


def test_a_missing_file_and_a_directory_are_refused(tmp_path: Path) -> None:
    """A wrong path says so."""
    with pytest.raises(BadInput, match="does not exist"):
        read_lab(tmp_path / "none.toml")
    with pytest.raises(BadInput, match="is a directory"):
        read_lab(tmp_path)


def test_several_faults_are_reported_at_once(tmp_path: Path) -> None:
    """All faults of one file come together, twenty at most."""
    path = small(tmp_path, end="".join(f"[limits{i}]\n" for i in range(30)))
    with pytest.raises(BadInputs) as caught:
        read_lab(path)
    assert len(caught.value.faults) == 20


def test_the_small_file_reads(tmp_path: Path) -> None:
    """The base of the malformed files is itself right, so each refusal is due to its change."""
    lab = read_lab(small(tmp_path))
    assert lab.calorimeter().id == "C"
    assert lab.fuel_class("coal").runs == 2
    assert lab.faults() == ()


def test_the_demo_lab_file() -> None:
    """The invented laboratory reads, with units converted and blocks counted."""
    lab = read_lab(DEMO)
    counts = (lab.people, lab.calorimeters, lab.vessels, lab.calibrations, lab.certified, lab.classes)
    assert [len(one) for one in counts] == [4, 2, 3, 3, 2, 8]
    assert [len(one) for one in (lab.lots(), lab.titrants(), lab.balances, lab.cups)] == [5, 4, 2, 3]
    cal_a = lab.calorimeter("CAL-A")
    assert (cal_a.resolution, cal_a.step, cal_a.cooling_constant) == (pytest.approx(1e-4), 30.0, 0.00196)
    assert [one.id for one in lab.vessels_of("CAL-A")] == ["A1", "A2"]
    assert lab.vessel("A2").firings_left == 13
    assert lab.lots("firing wire")[0].heat == (9.6, "J/cm")
    assert lab.lots("thread")[0].heat == (45.6, "J")
    assert [one.id for one in lab.aids()] == ["SO-1", "CP-2", "PB-1"]
    assert lab.titrants()[2].valid_until == date(2025, 3, 5)
    assert lab.fuel_class("recovered").runs == 3
    assert len(lab.sha256) == 64


def test_the_calibration_in_force_is_that_of_the_moment() -> None:
    """Expiry counts at the date and time of the run."""
    lab = read_lab(DEMO)
    assert lab.calibration_at("A1", datetime(2025, 1, 15, 15, 59)) is None
    before = lab.calibration_at("B1", datetime(2025, 3, 6, 23, 58))
    assert before is not None and before.value == 8814.7
    assert lab.calibration_at("B1", datetime(2025, 3, 7, 13, 5)) is None
    last = lab.last_calibration("B1", datetime(2025, 3, 7, 13, 5))
    assert last is not None and last.issue == "C3"


def test_a_date_as_end_includes_its_day() -> None:
    """Valid until 15 July means the whole of that day."""
    lab = read_lab(DEMO)
    assert lab.calibration_at("A1", datetime(2025, 7, 15, 23, 0)) is not None
    assert lab.calibration_at("A1", datetime(2025, 7, 16, 0, 0)) is None


def test_people_by_kind_and_day() -> None:
    """Authorisation ends on its day."""
    lab = read_lab(DEMO)
    assert [one.id for one in lab.people_for("fuel")] == ["MR", "JO"]
    assert [one.id for one in lab.people_for("calibration")] == ["MR"]
    assert [one.id for one in lab.people_for("fuel", date(2025, 10, 1))] == ["MR"]


def test_profile_with_the_laboratorys_own_values() -> None:
    """Overrides reach every profile, say where they come from, and rule over the named method's figures."""
    lab = read_lab(DEMO)
    for name in ("iso-1928", "iso-18125", "iso-21654", "astm-d240", "first-principles"):
        values = lab.profile(name).coefficients
        assert values["net_p_hydrogen"].value == 212.2
        assert values["nitric_heat"].value == 6.0
        assert values["condition_factor"].value == 0.0
        assert values["below_limit_share"].value == 0.5
        assert values["net_p_hydrogen"].source == "lab file lab.toml"


def test_limits_and_overrides_for_one_profile(tmp_path: Path) -> None:
    """[limits] fills an absent limit and sets marked ranges; [profile.NAME] reaches that profile only."""
    more = (
        '[limits]\nrepeatability_limit = "0.2 MJ/kg"\nroom_temperature = ["19 degC", "25 degC"]\n'
        '[profile.iso-1928]\nnet_p_hydrogen = "212.1 J/g"\n'
    )
    lab = read_lab(small(tmp_path, end=more))
    assert lab.profile("iso-21654").value("repeatability_limit", "J/g") == pytest.approx(200)
    assert lab.ranges["sheet.room_temperature"] == (19.0, 25.0)
    assert lab.profile("iso-1928").coefficients["net_p_hydrogen"].value == 212.1
    assert lab.profile("iso-18125").coefficients["net_p_hydrogen"].value == 212.2


def test_class_ranges_of_the_lab_file_come_first() -> None:
    """The laboratory's own range stands beside the usual ones of the class."""
    ranges = read_lab(DEMO).fuel_class("sludge").ranges
    assert ranges["total_moisture"] == (60.0, 90.0)
    assert ranges["ash"] == (20.0, 60.0)


def test_unknown_names_are_refused_naming_the_nearest() -> None:
    """Queries answer with the nearest known name."""
    lab = read_lab(DEMO)
    with pytest.raises(BadInput, match="'biomass'"):
        lab.fuel_class("biomas")
    with pytest.raises(BadInput, match="'CAL-A'"):
        lab.calorimeter("CALA")
    with pytest.raises(BadInput, match="several calorimeters"):
        lab.calorimeter()
    with pytest.raises(BadInput, match="no vessel"):
        lab.vessel("A9")


@pytest.mark.parametrize(
    ("value", "mass", "likely"),
    [
        ("26457 J/g", "in vacuum", "the value is one in air"),
        ("26434 J/g", "in air", "the value is one in vacuum"),
        ("26500 J/g", "in air", None),
        ("26400 J/g", "in vacuum", None),
    ],
)
def test_a_certified_value_outside_its_conventions_band(
    tmp_path: Path, value: str, mass: str, likely: str | None
) -> None:
    """A benzoic acid value that its mass convention cannot have is a fault with file and key."""
    path = small(tmp_path, 'value = "26434 J/g"\nmass = "in vacuum"', f'value = "{value}"\nmass = "{mass}"')
    found = read_lab(path).faults()
    assert len(found) == 1
    assert found[0].field == "certified.B.value"
    assert found[0].message.startswith(f"{path}, line 16: ")
    assert (found[0].likely_cause or "").startswith(likely or "")
    assert (found[0].likely_cause is None) == (likely is None)


def test_another_substance_has_no_band(tmp_path: Path) -> None:
    """Only benzoic acid is judged by the bands of benzoic acid."""
    path = small(tmp_path, '"benzoic acid"\nvalue = "26434 J/g"', '"2,2,4-trimethylpentane"\nvalue = "47712 J/g"')
    assert read_lab(path).faults() == ()


NEW = {
    "vessel": "V",
    "issue": "b7k2m-9qxfd-h4t8w-n3c6r",
    "value": "8803.8 J/K",
    "n": 6,
    "rsd": "0.05 %",
    "certificate": "B",
    "sensitivity": 0.996,
    "rise": ["2.86 K", "2.90 K"],
    "valid_from": datetime(2025, 3, 6, 10, 41),
    "valid_until": date(2025, 9, 6),
}


def test_a_block_is_appended_and_the_old_text_stays(tmp_path: Path) -> None:
    """After adoption the new block rules from its moment, and every old byte is where it was."""
    path = small(tmp_path, end="# written by hand, no newline at the end")
    os.chmod(path, 0o640)
    before = path.read_bytes()
    text = append_block(path, "calibration", NEW, note="adopted 2025-03-06 by HT")
    after = path.read_bytes()
    assert after.startswith(before)
    assert after.decode().endswith(text)
    assert text.splitlines()[:2] == ["# adopted 2025-03-06 by HT", "[[calibration]]"]
    lab = read_lab(path)
    old, new = (lab.calibration_at("V", datetime(2025, 3, 6, hour)) for hour in (10, 11))
    assert old is not None and old.value == 10135.0
    assert new is not None and (new.value, new.rise) == (8803.8, (2.86, 2.90))
    assert path.stat().st_mode & 0o777 == 0o640
    assert [one.name for one in tmp_path.iterdir()] == ["lab.toml"]


@pytest.mark.parametrize(
    ("table", "change", "part"),
    [
        ("calibration", {"vessel": "W"}, "'W' is not known"),
        ("calibration", {"value": 8803.8}, "has no unit"),
        ("calibration", {"valu": "1 J/K"}, "'value'"),
        ("laboratory", {}, "takes no blocks"),
        ("calibration", {"issue": "two\nlines"}, "cannot stand"),
        ("calibration", {"valid_from": datetime(2025, 1, 15, 16)}, "stands twice"),
    ],
)
def test_a_block_that_would_not_read_is_not_written(
    tmp_path: Path, table: str, change: dict[str, object], part: str
) -> None:
    """What the reader would refuse never reaches the file."""
    path = small(tmp_path)
    before = path.read_bytes()
    with pytest.raises(SheetcalError, match=part):
        append_block(path, table, {**NEW, **change})
    assert path.read_bytes() == before
    assert [one.name for one in tmp_path.iterdir()] == ["lab.toml"]


def test_quotes_in_a_text_survive(tmp_path: Path) -> None:
    """A text with quotation marks and backslashes reads back as it was."""
    path = small(tmp_path)
    append_block(path, "person", {"id": 'A"B\\C', "may": ["fuel"]})
    assert read_lab(path).people[0].id == 'A"B\\C'
    assert block_text("person", {"id": "P", "may": ["fuel"]}) == '[[person]]\nid = "P"\nmay = ["fuel"]\n'


def test_lines_are_found_beside_long_values() -> None:
    """Keys inside long strings and lists are not mistaken for keys of the table."""
    text = '[a]\nx = """\ny = 1\n"""\nlist = [\n  "k = 2",  # ]\n]\ny = 2\n[[b]]\nz = 1\n[[b]]\n"z" = 2\n'
    lines = find_lines(text)
    assert lines.of("a", 0, "y") == 8
    assert (lines.of("b", 0, "z"), lines.of("b", 1, "z")) == (10, 12)
    assert lines.of("b", 1, "unknown") == 11
