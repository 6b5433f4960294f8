"""Honest sheets that look wrong give no fault beyond what they show by their nature; blank ones are incomplete."""

from pathlib import Path

import pytest
from planting import CONTROL, check, coal, filled, issue, lab, lab_of_one, rewritten, write

from sheetcal.bench import HONEST_CASES, cases_of, class_of
from sheetcal.kinds import load
from sheetcal.model import ResultLine

KINDS = ("calibration", "fuel", "specific-heat", "vaporisation", "heat-balance")
CASES = [(kind, case) for kind in KINDS for case in cases_of(kind)]
BY_NATURE: dict[tuple[str, str], set[str]] = {}  # faults a case would carry by its nature: none does
# Verdicts other than sound: what is awaited is no fault, but the sheet is not complete.
VERDICTS = {("fuel", "values awaited"): "incomplete"}
DUTIES = {("fuel", "values awaited"): {"value-awaited"}}


HEATS = ("J/g", "J", "kJ", "J/K", "J/(g K)")
# Looked up in a printed table, a reading handed on, one of two lines that have their own balance, or no result.
HANDED_ON = (
    "vessel_rated_energy", "heat_capacity_in_force", "certificate_value", "certificate_uncertainty",
    "energy_low_in_force", "energy_high_in_force", "energy_low_covered", "energy_high_covered",
    "smallest_rated_energy", "critical_range", "control_certificate", "aid_planned_heat", "cup_looked_up",
    "cup_uncertainty_looked_up", "cup_given", "cup_uncertainty", "mean_liquid_side",
)  # fmt: skip


def test_every_honest_case_is_tried() -> None:
    assert {case for _, case in CASES} == set(HONEST_CASES)
    assert len(HONEST_CASES) == 20
    assert len(CASES) == 44


@pytest.mark.parametrize(("kind", "case"), CASES, ids=lambda one: one)
def test_an_honest_case(kind: str, case: str, tmp_path: Path) -> None:
    rows = None
    if kind == "fuel":
        sample = {**coal("S-1"), "fuel_class": class_of(case) or "coal", "approval": "HT 2025-03-01"}
        rows = [CONTROL, sample]
    house = lab_of_one() if case == "one person" else lab()
    verdict = rewritten(filled(issue(kind, tmp_path, rows, lab=house), 1, case), tmp_path, {})
    by_sort: dict[str, set[str]] = {"fault": set(), "duty": set(), "note": set()}
    for one in verdict.findings:
        by_sort[one.sort].add(one.code)
    assert by_sort["fault"] == BY_NATURE.get((kind, case), set())
    assert by_sort["duty"] == DUTIES.get((kind, case), set())
    assert verdict.verdict == VERDICTS.get((kind, case), "sound")
    assert not any(line.agrees is False for line in verdict.results)


@pytest.mark.parametrize("kind", KINDS)
def test_the_balance_speaks_where_the_contract_wants_it(kind: str, tmp_path: Path) -> None:
    """On the corrected rise, on every reported result, on every sample and sheet value of heat."""
    rows = [CONTROL, coal("S-1")] if kind == "fuel" else None
    verdict = rewritten(filled(issue(kind, tmp_path, rows)), tmp_path, {})
    wanted = [line for line in verdict.results if isinstance(line.formula, float) and _must_speak(line)]
    assert len(wanted) >= 2
    assert [line.id for line in wanted if line.balance is None] == []
    assert all(line.agrees for line in wanted)
    assert all(line.tolerance is not None for line in wanted)


def _must_speak(line: ResultLine) -> bool:
    """What the contract names, but for what is only looked up or handed on."""
    if line.reported or line.id.endswith(".corrected_rise"):
        return True
    return line.id.startswith(("sample", "sheet")) and line.unit in HEATS and not line.id.endswith(HANDED_ON)


def test_where_the_balance_is_silent_on_heat_the_kind_says_why() -> None:
    fields = [
        one for kind in KINDS for one in load(kind).fields if one.scope in ("sheet", "sample") and one.unit in HEATS
    ]
    silent = {one.name: one.step.balance_reason for one in fields if one.step and one.step.balance != "speaks"}
    assert all(silent.values())
    assert set(silent) <= set(HANDED_ON)


@pytest.mark.parametrize("kind", KINDS)
def test_a_blank_workbook_is_incomplete_and_says_so_once(kind: str, tmp_path: Path) -> None:
    rows = [CONTROL, coal("S-1")] if kind == "fuel" else None
    book = filled(issue(kind, tmp_path, rows))
    blank = check(write(tmp_path, type(book)(book.plan, book.record, {}).data()))
    assert (blank.verdict, blank.complete, blank.stage) == ("incomplete", False, "issued")
    assert [one.code for one in blank.findings] == ["reading-missing"]
    assert blank.findings[0].message == f"{len(blank.missing)} readings missing in blocks not begun"
    assert len(blank.missing) > 3
    assert ("balance" in blank.witnesses) != ("balance" in blank.witness_notes)
