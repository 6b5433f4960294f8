"""The balance of a calibration agrees with a right sheet on both roads, and keeps silent where readings lack."""

from __future__ import annotations

import balance_case
import pytest
from balance_case import disagreeing, shown, spoken, stated

from sheetcal.check.balance.weighing import air_over_vacuum
from sheetcal.model import Value

RUNS = tuple(f"run{run}" for run in range(1, 6))


@pytest.mark.parametrize("profile", ["iso-1928", "iso-18125", "first-principles"])
def test_clean_sheet_agrees(profile: str) -> None:
    """All results of five runs and of the sheet agree; none is passed over."""
    case = balance_case.calibration(profile=profile)
    assert disagreeing(case) == []
    assert spoken(case) == shown(case, ("sheet", *RUNS))
    assert len(spoken(case)) == 76


def test_air_factor_of_benzoic_acid() -> None:
    """Benzoic acid of 1.320 g/cm3: 1.000760 with weights of 8.0, 1.000767 with 8.4 g/cm3 (METHODS, derived)."""
    assert air_over_vacuum(1.320, 1.2, 8000.0) == pytest.approx(1.000760, abs=5e-7)
    assert air_over_vacuum(1.320, 1.2, 8400.0) == pytest.approx(1.000767, abs=5e-7)


def test_certificate_conditions_left_out() -> None:
    """Where the profile does not apply the conditions, the factor is 1."""
    case = stated(balance_case.calibration(), condition_factor=0.0)
    assert disagreeing(case) == []
    assert case.balances()["run1.condition_factor"].value == 1.0


def test_fixed_nitric_heat_and_blanks() -> None:
    """A fixed heat of nitric acid, a jacket and a station pressure not typed: the usual ones are taken."""
    case = balance_case.calibration().with_readings(
        run1__burette_end=None, run1__burette_start=None, run1__titrant_lot=None, run1__nitric_fixed=46.5,
        run1__jacket_temperature=None, run1__calorimeter_water=None, sheet__station_pressure=None,
    )  # fmt: skip
    assert disagreeing(case) == []
    assert "run1.effective_heat_capacity" in spoken(case)


LACKING: list[tuple[str, Value, str]] = [
    ("run1__burette_end", None, "run1.nitric_heat"),
    ("run1__oxygen_pressure", None, "run1.condition_factor"),
    ("run1__wire_left", None, "run1.heat_capacity_as_filled"),
    ("run1__firing_time", None, "run1.total_heat"),
    ("sheet__certified_lot", None, "run1.pellet_heat"),
    ("sheet__vessel", None, "sheet.change"),
    ("run1__rise_source", "value only", "run1.effective_heat_capacity"),
]


@pytest.mark.parametrize(("name", "value", "silent"), LACKING)
def test_a_reading_short(name: str, value: Value, silent: str) -> None:
    """What a missing reading feeds is left out, and all else agrees."""
    case = balance_case.calibration().with_readings(**{name: value})
    assert silent not in spoken(case)
    assert disagreeing(case) == []


def test_neither_mass() -> None:
    """Without net and without gross there is no pellet."""
    case = balance_case.calibration().with_readings(run1__pellet_mass=None, run1__crucible_gross=None)
    assert not {"run1.mass", "run1.pellet_heat"} & spoken(case)
    assert disagreeing(case) == []


def test_few_runs() -> None:
    """One run has a mean and no scatter; none has neither."""
    void: dict[str, Value | list[Value]] = {f"run{run}__state": "void" for run in range(2, 6)}
    one = balance_case.calibration().with_readings(**void)
    assert disagreeing(one) == []
    assert "sheet.effective_heat_capacity_reported" in spoken(one)
    assert not {"sheet.deviation", "sheet.uncertainty"} & spoken(one)
    none = one.with_readings(run1__state="void")
    assert not {"sheet.effective_heat_capacity", "sheet.energy_low"} & spoken(none)


def test_certificate_without_uncertainty() -> None:
    """A certificate that states none: the scatter is balanced, the uncertainty is not."""
    lots: tuple[dict[str, Value], ...] = ({"lot": "BA", "value": 26457.0, "convention": "in air", "density": 1.32},)
    case = balance_case.calibration()
    bare = balance_case.issue("calibration", case.record.shape, "iso-1928", certified=lots)
    bare.readings.update(case.readings)
    filled = bare.computed()
    assert disagreeing(filled) == []
    assert "sheet.deviation" in spoken(filled)
    assert "sheet.uncertainty" not in spoken(filled)


@pytest.mark.parametrize(
    ("result", "factor"),
    [("run1.total_heat", 1.001), ("sheet.effective_heat_capacity", 1.0001), ("sheet.deviation", 1.01)],
)
def test_a_spoiled_result_is_seen(result: str, factor: float) -> None:
    """A result typed over is off its balance."""
    case = balance_case.calibration()
    value = case.results[result]
    assert isinstance(value, float)
    case.results[result] = value * factor
    assert result in disagreeing(case)


def test_text_in_place_of_a_value_before() -> None:
    """A mean or a scatter that is no number gives the next line nothing to stand on."""
    for name in ("sheet.effective_heat_capacity", "sheet.deviation"):
        case = balance_case.calibration()
        case.results[name] = "#DIV/0!"
        assert "sheet.uncertainty" not in spoken(case)
        assert name in spoken(case)


@pytest.mark.parametrize(
    ("name", "silent"),
    [
        ("run1.total_heat", "run1.energy"),
        ("run1.heat_capacity_as_filled", "run1.effective_heat_capacity"),
        ("sheet.uncertainty", "sheet.expanded_uncertainty"),
    ],
)
def test_errors_in_place_of_heat_and_uncertainty(name: str, silent: str) -> None:
    """What stands on an error value has no balance; the error itself is held against its own."""
    case = balance_case.calibration()
    case.results[name] = "#VALUE!"
    assert silent not in spoken(case)
    assert name in spoken(case)


def test_vessel_without_a_value_in_force() -> None:
    """A new vessel has nothing to be compared with."""
    vessel = {**balance_case.TABLES["vessel"][0], "heat_capacity": None}
    case = balance_case.calibration()
    fresh = balance_case.issue("calibration", case.record.shape, "iso-1928", vessel=(vessel,))
    fresh.readings.update(case.readings)
    filled = fresh.computed()
    assert disagreeing(filled) == []
    assert "sheet.change" not in spoken(filled)
    assert "sheet.effective_heat_capacity" in spoken(filled)
