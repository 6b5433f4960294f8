"""What a person does to formulas in a real Calc is told in words: cut and paste, copying, typing."""

from __future__ import annotations

import shutil
from pathlib import Path

import pytest
from calc_client import Calc

from sheetcal.model import Finding, Verdict
from sheetcal.verbs.checking import Against, check_path

pytestmark = pytest.mark.office
FUEL = Path(__file__).parents[2] / "workbooks" / "fuel-filled.xlsx"


def _opened(calc: Calc, folder: Path, *tabs: str) -> None:
    """The workbook in Calc under the name `slip`, some tabs without protection."""
    source = folder / "source.xlsx"
    shutil.copy(FUEL, source)
    calc.open(document="slip", path=str(source))
    for tab in tabs:
        calc.unprotect(document="slip", tab=tab)


def _verdict(calc: Calc, folder: Path, form: str) -> Verdict:
    calc.store(document="slip", path=str(folder / f"saved.{form}"))
    return check_path(str(folder / f"saved.{form}"), Against())


def _of_formulas(verdict: Verdict) -> list[Finding]:
    return [one for one in verdict.findings if one.code != "protection-off"]


def test_cut_and_paste_is_recognised(calc: Calc, tmp_path: Path) -> None:
    """A weighing moved by one column: Calc re-points every formula, the checker says so once, in both formats."""
    _opened(calc, tmp_path, "Readings")
    try:
        calc.move(document="slip", tab="Readings", cells="E47", to="D47")
        for form in ("xlsx", "ods"):
            found = _of_formulas(_verdict(calc, tmp_path, form))
            assert [one.code for one in found] == ["formula-altered"], [(one.code, one.message) for one in found]
            assert "(Readings!E47 to Readings!D47) was cut and pasted" in found[0].message
    finally:
        calc.close(document="slip")


def test_a_formula_copied_from_the_line_above_is_recognised(calc: Calc, tmp_path: Path) -> None:
    """Copy and paste within a column: relative references moved with it, so it is none of the issued ones."""
    _opened(calc, tmp_path, "Results")
    try:
        calc.copy(document="slip", tab="Results", cells="E12", to="E13")
        found = _of_formulas(_verdict(calc, tmp_path, "ods"))
        assert [(one.sheet, one.cell) for one in found] == [("Results", "E13")]
        assert found[0].code in ("formula-altered", "formula-dimension")
    finally:
        calc.close(document="slip")


def test_a_formula_copied_from_the_next_run_is_the_right_one(calc: Calc, tmp_path: Path) -> None:
    """Copying along a line moves the references to the run's own column: nothing was changed."""
    _opened(calc, tmp_path, "Results")
    try:
        calc.copy(document="slip", tab="Results", cells="E12", to="F12")
        assert _of_formulas(_verdict(calc, tmp_path, "xlsx")) == []
    finally:
        calc.close(document="slip")
