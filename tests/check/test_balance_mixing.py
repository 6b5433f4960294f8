"""The balance of a mixing sheet agrees with a right sheet, typed or recorded, given or measured cup."""

from __future__ import annotations

from typing import Any

import balance_case
import pytest
from balance_case import disagreeing, shown, spoken

from sheetcal.check.balance import water
from sheetcal.model import Value

RUNS = ("sheet", "run1", "run2", "run3")


def test_clean_sheet_agrees() -> None:
    """All results of three runs and the sheet agree; none is passed over."""
    case = balance_case.mixing()
    assert disagreeing(case) == []
    assert spoken(case) == shown(case, RUNS)
    assert len(spoken(case)) == 44


def test_water_against_published_values() -> None:
    """Specific heat of water 4.1885 (15), 4.1841 (20), 4.1813 J/(g K) (25 degC); 419.1 J/g from 0 to 100 degC.

    Source: IAPWS-95, which other tables of the last thirty years meet within 0.0005.
    """
    for temperature, value in ((15.0, 4.1885), (20.0, 4.1841), (25.0, 4.1813)):
        assert water.specific_heat(temperature) == pytest.approx(value, abs=0.0001)
    assert water.enthalpy(100.0) == pytest.approx(419.06, abs=0.1)
    assert water.between(-1.0, 20.0) is None
    assert water.between(20.0, 120.0) is None


@pytest.mark.parametrize("step", [5.0, -5.0])
def test_temperatures_from_the_record(step: float) -> None:
    """Warming and cooling records: both lines at the step, by another time of the step than the sheet's."""
    hot = 99.0 if step > 0 else -20.0
    readings = {one.replace(".", "__"): value for one, value in balance_case.mixing_record(1, step).items()}
    case = balance_case.mixing().with_readings(run1__sample_start_temperature=hot, **readings)
    assert case.results["run1.final_temperature"] == pytest.approx(20.02 + step, abs=0.03)
    assert disagreeing(case) == []
    assert {"run1.start_temperature", "run1.final_temperature", "run1.specific_heat"} <= spoken(case)


def test_cup_from_blank_runs() -> None:
    """Hot water into cold gives the cup; its mean serves the bodies."""
    blank: dict[str, Value | list[Value]] = {
        "run1__role": "blank", "run1__sample_mass": 45.0, "run1__sample_start_temperature": 60.0,
        "run1__start_temperature_typed": 20.0, "run1__final_temperature_typed": 28.27,
    }  # fmt: skip
    case = balance_case.mixing(cup_source="blank runs").with_readings(**blank)
    assert 30 < float(str(case.results["run1.cup_run"])) < 100
    assert disagreeing(case) == []
    assert {"sheet.cup_from_blanks", "sheet.cup_heat_capacity", "run2.specific_heat"} <= spoken(case)
    without = case.with_readings(run1__state="void")
    assert not {"sheet.cup_from_blanks", "run2.specific_heat"} & spoken(without)


def test_cup_typed_and_other_liquid() -> None:
    """A typed cup rules over the listed one; another liquid takes the stated specific heat with its slope."""
    case = balance_case.mixing(
        cup_heat_capacity_typed=60.0, cup_uncertainty_typed=0.8, liquid="other", liquid_name="oil",
        liquid_specific_heat=1.9, liquid_slope=0.002,
    )  # fmt: skip
    assert disagreeing(case) == []
    assert case.balances()["sheet.cup_heat_capacity"].value == 60.0
    unknown = balance_case.mixing(liquid="other")
    assert "run1.specific_heat" not in spoken(unknown)


def test_check_body() -> None:
    """A check body is held against its book value and does not count for the material."""
    case = balance_case.mixing().with_readings(run3__role="check body")
    assert disagreeing(case) == []
    assert "run3.check_deviation" in spoken(case)


SILENT: list[tuple[dict[str, Any], str]] = [
    ({"run1__cup_empty": None}, "run1.specific_heat"),
    ({"run1__end_mass": None}, "run1.mass_sum_error"),
    ({"run1__final_temperature_typed": None}, "run1.rise"),
    ({"run1__sample_mass": None}, "run1.specific_heat"),
    ({"run1__sample_start_temperature": None}, "run1.sample_temperature"),
    ({"run1__temperature_source": "record"}, "run1.start_temperature"),
    ({"run1__temperature_source": "record", "run1__drop_time": 2.0, "run1__end_of_mixing": 5.0}, "run1.rise"),
    ({"sheet__cup": None}, "run1.specific_heat"),
    ({"sheet__cup_source": None}, "run1.specific_heat"),
]


@pytest.mark.parametrize(("changes", "silent"), SILENT)
def test_a_reading_short(changes: dict[str, Any], silent: str) -> None:
    """What a missing reading feeds is left out, and all else agrees."""
    case = balance_case.mixing().with_readings(**changes)
    assert silent not in spoken(case)
    assert disagreeing(case) == []


def test_records_that_tell_nothing() -> None:
    """A record without a step, or one that jumps at once, gives no temperatures or no time."""
    flat = balance_case.mixing_record(1, 0.0, drift=0.0)
    case = balance_case.mixing().with_readings(**{one.replace(".", "__"): value for one, value in flat.items()})
    assert "run1.final_temperature" not in spoken(case)
    assert disagreeing(case) == []


def test_equal_temperatures() -> None:
    """Nothing moved, or a body as warm as the liquid: no specific heat."""
    still = balance_case.mixing().with_readings(run1__final_temperature_typed=19.89)
    assert disagreeing(still) == []
    assert "run1.cup_run" not in spoken(still)
    alike = balance_case.mixing().with_readings(run1__sample_start_temperature=24.89)
    assert "run1.specific_heat" not in spoken(alike)
    assert disagreeing(alike) == []


def test_one_run_and_none() -> None:
    """One run has a mean and no scatter; none has neither."""
    one = balance_case.mixing().with_readings(run2__state="void", run3__state="void")
    assert disagreeing(one) == []
    assert "sheet.specific_heat_reported" in spoken(one)
    assert "sheet.uncertainty" not in spoken(one)
    none = one.with_readings(run1__state="void")
    assert "sheet.specific_heat" not in spoken(none)


def test_text_in_place_of_a_value_before() -> None:
    """What is no number gives the next line nothing to stand on."""
    for name, silent in (
        ("sheet.specific_heat", "sheet.specific_heat_reported"),
        ("sheet.deviation", "sheet.uncertainty"),
        ("sheet.uncertainty", "sheet.expanded_uncertainty"),
        ("run1.liquid_specific_heat", "run1.liquid_side"),
        ("run1.final_temperature", "run1.specific_heat"),
    ):
        case = balance_case.mixing()
        case.results[name] = "#DIV/0!"
        assert silent not in spoken(case)
    case = balance_case.mixing()
    case.results.update({f"run{run}.liquid_side": "#DIV/0!" for run in (1, 2, 3)})
    assert "sheet.uncertainty" not in spoken(case)


@pytest.mark.parametrize("result", ["run1.liquid_side", "run1.specific_heat", "sheet.specific_heat_reported"])
def test_a_spoiled_result_is_seen(result: str) -> None:
    """A result off by 0.3 % is off its balance."""
    case = balance_case.mixing()
    value = case.results[result]
    assert isinstance(value, float)
    case.results[result] = value * 1.003
    assert result in disagreeing(case)
