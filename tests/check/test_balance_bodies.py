"""The balance of the bodies sheet agrees with a right sheet, whatever is unknown in it."""

from __future__ import annotations

from typing import Any

import balance_case
import pytest
from balance_case import Case, disagreeing, shown, spoken

BLOCKS = ("sheet", "body1", "body2", "body3", "body4")


def test_clean_sheet_agrees() -> None:
    """All results of four bodies and the sheet agree; none is passed over."""
    case = balance_case.bodies()
    assert disagreeing(case) == []
    assert spoken(case) == shown(case, BLOCKS)
    assert len(spoken(case)) == 33


CHANGES = {
    "part melts": {"amount_changed": 40.0},
    "melts and stays": {"end": 0.0, "specific_heat_after": None},
    "freezes": {"change": "freezes", "start": 12.0, "end": -3.0, "specific_heat": 4.19, "specific_heat_after": 2.06},
    "boils": {"change": "boils", "start": 80.0, "end": 101.0, "change_temperature": 99.2, "latent_heat": 2258.0,
              "specific_heat": 4.2, "specific_heat_after": 2.0, "amount_changed": 10.0},
    "condenses": {"change": "condenses", "start": 104.0, "end": 40.0, "change_temperature": 99.2,
                  "latent_heat": 2258.0, "specific_heat": 2.0, "specific_heat_after": 4.2},
}  # fmt: skip


@pytest.mark.parametrize("case_name", CHANGES)
def test_changes_of_phase(case_name: str) -> None:
    """Whole and partial changes, both ways, portion by portion."""
    case = balance_case.bodies(**{f"body4__{name}": value for name, value in CHANGES[case_name].items()})
    assert disagreeing(case) == []
    assert {"body4.gained", "body4.change_heat", "body4.heat_per_gram"} <= spoken(case)


UNKNOWN: list[tuple[str, str, str, str]] = [
    ("mass", "body3", "mass", "solved_mass"),
    ("mass", "body4", "mass", "solved_mass"),
    ("specific heat", "body3", "specific_heat", "solved_specific_heat"),
    ("start temperature", "body3", "start", "solved_start"),
    ("start temperature", "body4", "start", "solved_start"),
    ("end temperature", "body3", "end", "solved_end"),
    ("end temperature", "body4", "end", "solved_end"),
    ("latent heat", "body4", "latent_heat", "solved_latent_heat"),
]


def with_unknown(what: str, body: str, blank: str) -> Case:
    changes: dict[str, Any] = {"sheet__unknown": what, f"{body}__unknown_here": "yes", f"{body}__{blank}": None}
    if what == "mass" and body == "body4":
        changes["body4__amount_changed"] = None
    return balance_case.bodies(**changes)


@pytest.mark.parametrize(("what", "body", "blank", "solved"), UNKNOWN)
def test_every_unknown(what: str, body: str, blank: str, solved: str) -> None:
    """The unknown and its uncertainty from two trial values agree with the sheet's own solution."""
    case = with_unknown(what, body, blank)
    assert disagreeing(case) == []
    assert {f"{body}.{solved}", f"{body}.{solved}_uncertainty"} <= spoken(case)
    assert spoken(case) == shown(case, BLOCKS)


def test_unknown_heater() -> None:
    """The heater's heat as the unknown: gains and loss."""
    case = balance_case.bodies(
        sheet__unknown="heater", sheet__heater_voltage=None, sheet__heater_current=None, sheet__heater_time=None
    )
    assert disagreeing(case) == []
    assert "sheet.solved_heater" in spoken(case)


SILENT: list[tuple[dict[str, Any], str]] = [
    ({"body1__mass": None}, "body1.gained"),
    ({"body1__specific_heat": None}, "body1.capacity"),
    ({"body1__change": None}, "body1.gained"),
    ({"body4__latent_heat": None}, "body4.change_heat"),
    ({"body4__change_temperature": None}, "body4.heat_per_gram"),
    ({"body4__amount_changed": None}, "body4.gained"),
    ({"sheet__heater_time": None}, "sheet.heat_given"),
    ({"sheet__loss_time": None}, "sheet.loss_heat"),
    ({"sheet__temperature_uncertainty": None, "sheet__mass_uncertainty": None}, "sheet.uncertainty"),
    ({"sheet__unknown": None}, "sheet.closure"),
    ({"sheet__unknown": "mass", "body1__unknown_here": "yes"}, "body1.solved_start"),
    ({"sheet__unknown": "heater", "body1__unknown_here": "yes"}, "body1.solved_mass"),
]


@pytest.mark.parametrize(("changes", "silent"), SILENT)
def test_a_reading_short(changes: dict[str, Any], silent: str) -> None:
    """What a missing reading feeds is left out, and all else agrees."""
    case = balance_case.bodies(**changes)
    assert silent not in spoken(case)
    assert disagreeing(case) == []


def test_one_uncertainty_and_no_heater() -> None:
    """One of the two uncertainties alone; neither heater nor loss."""
    case = balance_case.bodies(sheet__mass_uncertainty=None)
    assert disagreeing(case) == []
    bare: dict[str, Any] = {f"sheet__{name}": None for name in ("heater_voltage", "heater_current", "heater_time")}
    still = balance_case.bodies(**bare, sheet__loss_power=None, sheet__loss_time=None)
    assert disagreeing(still) == []
    assert still.balances()["sheet.heat_given"].value == 0.0


def test_nothing_moved_and_nothing_there() -> None:
    """Bodies that start where they end exchange nothing; without bodies nothing is said of a sum."""
    still: dict[str, Any] = {f"body{number}__start": 26.43 for number in (1, 2, 3)}
    drop: dict[str, Any] = {f"body4__{name}": None for name in balance_case.BODIES[3]}
    none = {"sheet__heater_voltage": 0.0, "sheet__loss_power": 0.0}
    case = balance_case.bodies(**still, **drop, **none, body4__end=None)
    assert "sheet.closure" not in spoken(case)
    assert disagreeing(case) == []
    empty = balance_case.bodies(**{f"body{number}__mass": None for number in (1, 2, 3, 4)})
    assert not {"sheet.heat_gained", "sheet.heat_left", "sheet.capacity"} & spoken(empty)


@pytest.mark.parametrize("result", ["body3.gained", "sheet.heat_gained", "sheet.closure", "sheet.final_temperature"])
def test_a_spoiled_result_is_seen(result: str) -> None:
    """A result off by 0.1 % is off its balance."""
    case = balance_case.bodies()
    value = case.results[result]
    assert isinstance(value, float)
    case.results[result] = value * 1.001
    assert result in disagreeing(case)


def test_text_in_place_of_a_value_before() -> None:
    """What is no number gives the next line nothing to stand on."""
    case = balance_case.bodies()
    case.results["sheet.capacity"] = "#VALUE!"
    assert "sheet.final_temperature" not in spoken(case)
    solved = with_unknown("mass", "body3", "mass")
    solved.results["body3.solved_mass"] = "#VALUE!"
    assert "body3.solved_mass_uncertainty" not in spoken(solved)


def test_two_blanks_in_one_body() -> None:
    """A body that lacks more than its unknown has no solution."""
    case = balance_case.bodies(
        sheet__unknown="mass", body3__unknown_here="yes", body3__mass=None, body3__specific_heat=None
    )
    assert "body3.solved_mass" not in spoken(case)
    assert disagreeing(case) == []
