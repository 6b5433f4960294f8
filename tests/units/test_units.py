"""Unit text is read as the laboratory means it, or refused with the text to write instead."""

import pickle

import pytest

from sheetcal import units
from sheetcal.errors import BadInput

CONTRACT_UNITS = [
    "g", "mg", "kg", "K", "mK", "degC", "s", "min", "h", "1/min", "J", "kJ", "J/K", "J/g", "J/cm",
    "MJ/kg", "kJ/mol", "J/(g K)", "K/s", "MPa", "kPa", "cm", "mL", "cm3/mol", "mol/L", "mg/L",
    "g/mL", "g/mol", "V", "A", "W", "%", "1", "cal_th", "cal_IT", "Btu_IT", "kWh",
    "kcal_IT/kg", "GJ/t", "Btu_IT/lb", "J/mL", "W/K", "K/min", "mK/min", "ohm", "1/K", "kg/m3",
    "g/cm3", "g/L", "J/(mol K)", "J/(g K**2)",
]  # fmt: skip


def test_every_unit_of_the_contract_parses() -> None:
    """Each unit the contract names is one the registry knows."""
    assert len(CONTRACT_UNITS) == 51
    for text in CONTRACT_UNITS:
        assert units.parse(text) is not None


@pytest.mark.parametrize(
    ("value", "from_", "to", "expected"),
    [
        (1.0, "cal_th", "J", 4.184),  # ISO 80000-5
        (1.0, "cal_IT", "J", 4.1868),  # ISO 80000-5
        (1.0, "Btu_IT/lb", "J/g", 2.326),  # exact by definition of the IT Btu
        (1.0, "kWh", "MJ", 3.6),
        (25.0, "degC", "K", 298.15),
        (298.15, "K", "degC", 25.0),
        (12.345, "MJ/kg", "J/g", 12345.0),
        (2.0, "GJ/t", "J/g", 2000.0),
        (3.0, "%", "1", 0.03),
        (1.0, "atm", "kPa", 101.325),
        (2.5, "1/min", "1/h", 150.0),
    ],
)
def test_conversion(value: float, from_: str, to: str, expected: float) -> None:
    """A value moves between units by the published factors."""
    assert units.convert(value, from_, to) == pytest.approx(expected, rel=1e-12)


def test_a_rise_moves_without_the_offset() -> None:
    """2.5 degC of rise are 2.5 K, while 2.5 degC on the scale are 275.65 K."""
    assert units.convert_difference(2.5, "degC", "K") == 2.5
    assert units.convert_difference(2500.0, "mK", "degC") == pytest.approx(2.5)
    assert units.convert(2.5, "degC", "K") == pytest.approx(275.65)


@pytest.mark.parametrize("text", ["cal", "kcal/kg", "Btu", "Btu/lb", "cal/g", "BTU"])
def test_bare_heat_units_are_refused_naming_the_suffixed(text: str) -> None:
    """A calorie or Btu of unknown size is refused and all three suffixed names are given."""
    with pytest.raises(BadInput) as caught:
        units.parse(text)
    assert all(name in str(caught.value) for name in ("cal_th", "cal_IT", "Btu_IT"))


@pytest.mark.parametrize(
    ("text", "advice"),
    [
        ("\N{DEGREE SIGN}C", "Write 'degC'"),
        ("KJ/kg", "'kJ' for 'KJ'"),
        ("J/g K", "J/(g K)"),
        ("J/g*K", "J/(g K)"),
        ("mpa", "'MPa' for 'mpa'"),
        ("foo_bar", "'foo_bar'"),
        ("", "1 for a pure number"),
        ("3 J", "a unit such as"),
        ("2**9**9", "a unit such as"),
        ("J/(g K", "a unit such as"),
        ("g" * 4000, "ASCII"),
        ("__import__('os')", "units.txt"),
    ],
)
def test_a_bad_unit_says_what_to_write(text: str, advice: str) -> None:
    """Each malformed unit is refused in one line that names the right spelling or the rule."""
    with pytest.raises(BadInput) as caught:
        units.parse(text)
    assert advice in str(caught.value)
    assert "\n" not in str(caught.value)
    assert str(pickle.loads(pickle.dumps(caught.value))) == str(caught.value)


def test_dimensions_are_exponents() -> None:
    """Units of one kind share their dimensions; a per cent and text have none."""
    assert units.dimensions("J/g") == units.dimensions("MJ/kg") == (("length", 2.0), ("time", -2.0))
    assert units.dimensions("%") == units.dimensions("1") == units.dimensions(None) == ()
    assert units.dimensions("J/(g K)") == units.dimensions("kJ/(kg K)")
    assert units.dimensions("degC") == units.dimensions("K")
    assert units.is_scale("degC") and not units.is_scale("K") and not units.is_scale(None)


def test_quantity_reads_number_and_unit() -> None:
    """A value with its unit comes out in the unit wanted; a pure number needs none."""
    assert units.quantity("98.2 mg", to="g") == pytest.approx(0.0982)
    assert units.quantity("10135.0 J/K", to="J/K") == 10135.0
    assert units.quantity("0.25 %", to="%") == 0.25
    assert units.quantity("0.00196 1/min", to="1/min") == 0.00196
    assert units.quantity("1.5e-3kg", to="g") == pytest.approx(1.5)
    assert units.quantity("0.996", to="1") == 0.996
    assert units.quantities("22.31, 22.35 degC", to="degC") == [22.31, 22.35]
    assert units.quantities("1, 2, 3", to="1") == [1.0, 2.0, 3.0]


@pytest.mark.parametrize(
    ("text", "to", "advice"),
    [
        ("98.2", "g", "has no unit"),
        ("98,2 mg", "g", "decimal comma"),
        ("98.2 mL", "g", "does not measure"),
        ("12.5 degC", "K", "'12.5 K' for a difference, '285.65 K' for a temperature"),
        ("mg", "g", "not a number"),
        ("1e999 g", "g", "too large"),
        ("nan g", "g", "not a number"),
        ("4 cal", "J", "cal_th"),
    ],
)
def test_a_bad_quantity_is_refused(text: str, to: str, advice: str) -> None:
    """Text that is not a number with a fitting unit is refused, saying why."""
    with pytest.raises(BadInput, match=advice.replace("(", r"\(")):
        units.quantity(text, to)


def test_every_line_of_the_unit_file_names_its_source() -> None:
    """Each unit in units.txt carries a comment that says where its size comes from."""
    path = units.Path(units.__file__).with_name("units.txt")
    lines = [n for n in path.read_text("ascii").splitlines() if "=" in n and not n.startswith("#")]
    defined = [line for line in lines if "- =" not in line]
    assert len(defined) >= 30
    assert all("#" in line for line in defined)
