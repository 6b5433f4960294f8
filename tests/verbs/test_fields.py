"""`fields` lists every field of a workbook as the contract says, with what stands in it."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import pytest
from verbs_case import COAL, CONTROL, filled, record_of

from sheetcal import verbs
from sheetcal.kinds import load, skeleton

KEYS = [
    "id", "label", "sheet", "cell", "unit", "role", "scope", "value", "formula", "sample", "type", "low", "high",
    "resolution", "required", "locked", "origin",
]  # fmt: skip
TABS = ["Front", "Readings", "Records", "Results"]
ORIGINS = {"person", "logger", "worklist", "lab", "profile", "computed", "issue"}
TYPES = {"number", "integer", "text", "date", "datetime", "choice"}


@pytest.fixture(scope="module")
def rows(tmp_path_factory: pytest.TempPathFactory) -> dict[str, dict[str, Any]]:
    """Fields of a filled fuel workbook by id; one number was typed as text."""
    folder = tmp_path_factory.mktemp("fields")
    record = record_of("fuel", folder, [CONTROL, {**COAL, "total_moisture": "11.8"}])
    book = filled(record, folder / "book.xlsx", run5__burette_end="7,90", run5__remarks="ring twice")
    listed = json.loads("\n".join(verbs.fields(str(book), json=True).lines))
    return {row["id"]: row for row in listed}


def test_keys_and_words_are_the_contract_s(rows: dict[str, dict[str, Any]]) -> None:
    """Every field of the kind, each with all keys in order, origins and types of the contract."""
    plan = skeleton(load("fuel"), record_shape(rows))
    assert set(rows) == set(plan.places)
    for row in rows.values():
        assert list(row) == KEYS
        assert row["origin"] in ORIGINS and row["type"] in TYPES and row["role"] in ("label", "reading", "result")
        assert row["scope"] == row["id"].partition(".")[0]


def record_shape(rows: dict[str, dict[str, Any]]) -> Any:
    from sheetcal.model import Shape

    runs = max(int(row["scope"][3:]) for row in rows.values() if row["scope"].startswith("run"))
    height = rows["run1.record_time"]["cell"]
    first, last = (int("".join(sign for sign in part if sign.isdigit())) for part in height.split(":"))
    return Shape(samples=2, runs=runs // 2, record_rows=last - first + 1)


def test_they_stand_in_workbook_order(rows: dict[str, dict[str, Any]]) -> None:
    """By tab, row and column."""

    def place(row: dict[str, Any]) -> tuple[int, int, int]:
        letters = "".join(sign for sign in row["cell"].partition(":")[0] if sign.isalpha())
        number = int("".join(sign for sign in row["cell"].partition(":")[0] if sign.isdigit()))
        return TABS.index(row["sheet"]), number, sum((ord(s) - 64) * 26**n for n, s in enumerate(reversed(letters)))

    order = [place(row) for row in rows.values()]
    assert order == sorted(order)


def test_values_are_as_stored(rows: dict[str, dict[str, Any]]) -> None:
    """Numbers as numbers, text that looks like one as text, dates ISO, blanks null, a series to its last reading."""
    assert rows["run5.burette_end"]["value"] == "7,90"
    assert rows["run5.date"]["value"].startswith("2025-03-") and rows["run5.date"]["type"] == "date"
    assert rows["run5.vessel_water"]["value"] == pytest.approx(1.0, abs=0.2)
    assert rows["run8.vessel_water"]["value"] is None
    record = rows["run5.record_temperature"]["value"]
    assert isinstance(record, list) and record[-1] is not None and len(record) > 30
    assert ":" in rows["run5.record_temperature"]["cell"]


def test_formulas_ranges_and_owners(rows: dict[str, dict[str, Any]]) -> None:
    """A result has its formula, a reading its range and resolution; a run names its sample."""
    assert rows["run5.total_heat"]["formula"].startswith("=IF(COUNT(") and rows["run5.total_heat"]["role"] == "result"
    water = rows["run5.vessel_water"]
    assert (water["low"], water["high"], water["resolution"], water["formula"]) == (0, 20, 0.1, None)
    assert (rows["run5.mass"]["sample"], rows["sample2.ash"]["sample"], rows["sheet.job"]["sample"]) == (
        "sample2", "sample2", None,
    )  # fmt: skip


def test_locked_required_and_origin(rows: dict[str, dict[str, Any]]) -> None:
    """What the worklist printed is locked and says so; an optional reading is not required."""
    moisture, ash = rows["sample2.total_moisture"], rows["sample2.ash"]
    assert (moisture["locked"], moisture["origin"]) == (True, "worklist")
    assert (ash["locked"], ash["required"]) == (False, True)
    assert rows["run5.remarks"]["required"] is False
    assert (rows["run5.record_time"]["origin"], rows["run5.gross_run"]["origin"]) == ("logger", "computed")


def test_the_text_shows_no_control_characters(tmp_path: Path) -> None:
    """One line a field, whatever its text holds."""
    book = filled(record_of("heat-balance", tmp_path), tmp_path / "book.xlsx", sheet__remarks="a\u202eb")
    lines = verbs.fields(str(book)).lines
    assert any("a\\x202eb" in line for line in lines) and all(line.isprintable() for line in lines)
