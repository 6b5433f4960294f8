"""A result is followed down to readings and constants; what is missing is named."""

from __future__ import annotations

import json
import re
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pytest
from verbs_case import COAL, CONTROL, filled, record_of, written

from sheetcal import verbs
from sheetcal.cells import registry
from sheetcal.errors import BadInput
from sheetcal.verbs.substituting import substituted
from sheetcal.verbs.workbook import open_workbook

KEYS = ["id", "label", "value", "unit", "cell", "function", "equation", "substituted", "source", "inputs"]
NET = "sample2.net_p_as_received_reported"


@pytest.fixture(scope="module")
def coal(tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("explain")
    return filled(record_of("fuel", folder, [CONTROL, COAL]), folder / "coal.xlsx")


def tree(path: Path, one: str) -> dict[str, Any]:
    found: dict[str, Any] = json.loads("\n".join(verbs.explain(str(path), one, json=True).lines))
    return found


def nodes(node: dict[str, Any]) -> Iterator[dict[str, Any]]:
    yield node
    for one in node["inputs"]:
        yield from nodes(one)


def test_every_level_has_the_shape_of_the_contract(coal: Path) -> None:
    """Keys in order at every level; values are those of the workbook, cells those where they stand."""
    parts = open_workbook(coal).parts
    listed = list(nodes(tree(coal, NET)))
    assert len(listed) > 100 and all(list(one) == KEYS for one in listed)
    for one in listed:
        if one["id"] in parts.typed:
            place = parts.skeleton.places[one["id"]]
            assert one["cell"] == place.where and one["label"] == place.field.label and one["unit"] == place.field.unit
            assert one["value"] == pytest.approx(parts.typed[one["id"]])


def test_it_goes_down_to_readings_constants_and_tables(coal: Path) -> None:
    """Leaves are readings with their origin, constants with their source, columns and series as count, first, last."""
    leaves = {one["id"]: one for one in nodes(tree(coal, NET)) if one["function"] is None}
    assert "reading (logger)" in leaves["run5.record_temperature"]["source"]
    assert re.fullmatch(r"\d+ values, \d+\.\d+ \.\. \d+\.\d+", leaves["run5.record_temperature"]["value"])
    assert leaves["const.net_p_hydrogen"]["value"] == 212.2 and "lab file" in leaves["const.net_p_hydrogen"]["source"]
    assert leaves["table.vessel.heat_capacity"]["cell"].startswith("Constants!B")
    assert "printed at issue" in leaves["sample2.repeatability_limit"]["source"]
    assert all(one["inputs"] == [] for one in leaves.values())


def test_each_result_is_unfolded_once(coal: Path) -> None:
    """A part that serves in many places is worked out where it comes first: the tree stays small."""
    unfolded = [one["id"] for one in nodes(tree(coal, NET)) if one["inputs"]]
    assert len(unfolded) == len(set(unfolded)) > 40
    lines = verbs.explain(str(coal), NET).lines
    assert len(lines) < 2000 and sum("(worked out above)" in line for line in lines) > 10


def test_numbers_stand_with_their_units_in_the_expression(coal: Path) -> None:
    """The heat is shown as heat capacity times rise, and works out to the value beside it."""
    one = next(one for one in nodes(tree(coal, NET)) if one["id"] == "run5.total_heat")
    found = re.fullmatch(r"([\d.]+) J/K \* ([\d.]+) K", one["substituted"])
    assert found is not None
    assert float(found[1]) * float(found[2]) == pytest.approx(one["value"], rel=1e-8)


def test_only_the_branch_taken_is_shown() -> None:
    """A conditional is replaced by the side that counted; with an argument missing the arguments are listed."""
    function = registry.get("HEAT_CAPACITY_WITH_WATER")
    given = {"heat_capacity": 10000.0, "water": 1991.5, "reference": 2000.0, "specific_heat": 4.18}
    shown = {name: f"{value:g}" for name, value in given.items()}
    assert substituted(function, given, shown) == "10000 + (1991.5 - 2000) * 4.18"
    assert substituted(function, {**given, "water": None}, {**shown, "water": "(missing)"}) == "10000"
    assert substituted(function, {**given, "heat_capacity": None}, shown).startswith("with heat_capacity = ")


def test_missing_readings_are_named_and_nothing_fails(tmp_path: Path) -> None:
    """In a blank workbook the last line lists what is needed; reserve places that nobody began are not."""
    blank = written(record_of("fuel", tmp_path, [CONTROL, COAL]), {}, tmp_path / "blank.xlsx")
    lines = verbs.explain(str(blank), "sample2.gross_dry").lines
    assert lines[0].startswith("Gross value, dry = missing")
    assert lines[-1].startswith("Missing: ") and "run5.vessel (Vessel, Readings!" in lines[-1]
    assert "run7." not in "\n".join(lines)
    assert "aid1_mass" not in lines[-1]
    assert tree(blank, "sample2.gross_dry")["value"] is None


def test_words_of_limits_have_no_inputs(coal: Path) -> None:
    """A line of warnings that is silent is blank, not missing."""
    assert verbs.explain(str(coal), "run1.run_look").lines[0].endswith("= blank   [run1.run_look, "
        + open_workbook(coal).parts.skeleton.places["run1.run_look"].where + "]")  # fmt: skip


def test_control_characters_are_shown(tmp_path: Path) -> None:
    """Text from a workbook cannot play tricks on a terminal."""
    record = record_of("fuel", tmp_path, [CONTROL, COAL])
    book = filled(record, tmp_path / "book.xlsx", run5__vessel="A1\u202e\u2066")
    text = "\n".join(verbs.explain(str(book), "run5.effective_heat_capacity").lines)
    assert "A1\\x202e\\x2066" in text


@pytest.mark.parametrize(("one", "near"), [("sample2.gros_dry", "sample2.gross_dry"), ("run1.vessel", ""), ("x", "")])
def test_an_id_that_is_no_result_names_the_nearest(coal: Path, one: str, near: str) -> None:
    """A typing error and a reading are refused in one line."""
    with pytest.raises(BadInput, match="is not a result of this workbook") as caught:
        verbs.explain(str(coal), one)
    assert near in str(caught.value)
