"""The balance of a boil-off sheet agrees with a right sheet by every source of enthalpy and form of work."""

from __future__ import annotations

from typing import Any

import balance_case
import pytest
from balance_case import disagreeing, shown, spoken

BLOCKS = ("sheet", "run1", "run2", "run3")


@pytest.mark.parametrize("source", ["measured here", "table", "vapour-pressure line"])
@pytest.mark.parametrize("form", ["measured volumes", "ideal gas", "second virial"])
def test_clean_sheet_agrees(source: str, form: str) -> None:
    """Each source with each form: all results agree, none is passed over."""
    case = balance_case.boil_off(enthalpy_source=source, work_form=form)
    assert disagreeing(case) == []
    assert spoken(case) == shown(case, BLOCKS)
    assert len(spoken(case)) == 31


def test_three_powers() -> None:
    """Three powers: enthalpy and loss by least squares."""
    case = balance_case.boil_off(runs=3)
    assert disagreeing(case) == []
    assert {"sheet.enthalpy_from_powers", "sheet.loss"} <= spoken(case)


def test_single_power() -> None:
    """One power alone stands for the enthalpy, its loss in it."""
    case = balance_case.boil_off().with_readings(run2__state="void")
    assert disagreeing(case) == []
    assert "sheet.enthalpy_from_powers" not in spoken(case)
    assert "sheet.enthalpy" in spoken(case)
    none = case.with_readings(run1__state="void")
    assert not {"sheet.enthalpy_measured", "sheet.energy", "sheet.total_enthalpy"} & spoken(none)


def test_amount_by_volume() -> None:
    """A volume boiled off counts by its density."""
    case = balance_case.boil_off(amount_mass=None, amount_volume=260.0, amount_density=0.998)
    assert disagreeing(case) == []
    assert "sheet.total_energy" in spoken(case)


SILENT: list[tuple[dict[str, Any], str]] = [
    ({"run1__voltage": None}, "run1.power"),
    ({"run1__duration": None}, "run1.electrical_heat"),
    ({"run1__condensate_mass": None}, "run1.enthalpy_single"),
    ({"sheet__molar_mass": None}, "sheet.enthalpy_molar"),
    ({"sheet__molar_mass": None}, "sheet.work_virial"),
    ({"sheet__line_pressure1": None}, "sheet.enthalpy_from_line"),
    ({"sheet__liquid_density": None}, "sheet.work_measured"),
    ({"sheet__vapour_volume": None}, "sheet.work"),
    ({"sheet__virial": None}, "sheet.work_virial"),
    ({"sheet__boiling_temperature": None}, "sheet.energy_ideal"),
    ({"sheet__station_pressure": None}, "sheet.work_virial"),
    ({"sheet__amount_mass": None}, "sheet.total_energy"),
    ({"sheet__enthalpy_table": None}, "sheet.enthalpy_deviation"),
    ({"sheet__enthalpy_source": None}, "sheet.enthalpy"),
    ({"sheet__work_form": None}, "sheet.energy"),
]


@pytest.mark.parametrize(("changes", "silent"), SILENT)
def test_a_reading_short(changes: dict[str, Any], silent: str) -> None:
    """What a missing reading feeds is left out, and all else agrees."""
    case = balance_case.boil_off().with_readings(**changes)
    assert silent not in spoken(case)
    assert disagreeing(case) == []


@pytest.mark.parametrize(
    "result", ["sheet.enthalpy_from_powers", "sheet.work", "sheet.energy", "sheet.energy_reported"]
)
def test_a_spoiled_result_is_seen(result: str) -> None:
    """A result off by 0.1 % is off its balance."""
    case = balance_case.boil_off()
    value = case.results[result]
    assert isinstance(value, float)
    case.results[result] = value * 1.001
    assert result in disagreeing(case)


def test_text_in_place_of_a_value_before() -> None:
    """An energy that is no number leaves its own per cent out."""
    case = balance_case.boil_off()
    case.results["sheet.energy"] = "#DIV/0!"
    assert "sheet.ideal_deviation" not in spoken(case)
