"""Files with add-in calls, saved as .xlsx and .ods, open with and without the add-in; stored values stay readable."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path
from typing import Any

import openpyxl
import pytest
from calc_client import Calc, spelled

from sheetcal.excel.reader import read

pytestmark = pytest.mark.office
CALLS: list[tuple[str, Any]] = [
    ("HEAT_FROM_RISE(180;4.18;5)", 3762.0),
    ("TOTAL_OF($Numbers.A1:A4)", 17.0),
    ("SLOPE_OF($Numbers.A1:A4;$Numbers.B1:B4)", 1.5),
    ("HEAT_FROM_RISE(-1;4.18;5)", "#N/A"),
    ('HEAT_FROM_RISE("x";4.18;5)', "#VALUE!"),
    ('FORM_WORDS("ideal gas")', "ideal gas; volume of the liquid left out"),
    ("HEAT_FROM_RISE(TOTAL_OF($Numbers.A1:A2);2;3)+1", 34.0),
]
NUMBERS = [[2.0, 1.0], [3.5, 2.0], [5.0, 3.0], [6.5, 4.0]]
FORMS = ["xlsx", "ods"]


@pytest.fixture(scope="module")
def saved(calc: Calc, tmp_path_factory: pytest.TempPathFactory) -> dict[str, Path]:
    """The same document in both formats, written by a Calc with the add-in."""
    folder = tmp_path_factory.mktemp("files")
    calc.new(document="files")
    calc.put(document="files", tab="Numbers", column=0, row=0, rows=NUMBERS)
    calc.formulas(document="files", tab="Calls", column=0, row=0, texts=["=" + spelled(one) for one, _ in CALLS])
    paths = {form: folder / f"calls.{form}" for form in FORMS}
    for path in paths.values():
        calc.store(document="files", path=str(path))
    calc.close(document="files")
    return paths


@pytest.fixture(scope="module")
def plain(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Calc]:
    """A Calc without the add-in."""
    with Calc(tmp_path_factory.mktemp("plain")) as one:
        yield one


def _values(calc: Calc) -> list[Any]:
    return [row[0] for row in calc.read(document="again", tab="Calls", cells=f"A1:A{len(CALLS)}")]


def _same(found: list[Any]) -> bool:
    return all(
        one == (wanted if isinstance(wanted, str) else pytest.approx(wanted, rel=1e-13))
        for one, (_, wanted) in zip(found, CALLS, strict=True)
    )


@pytest.mark.parametrize("form", FORMS)
def test_with_the_add_in_everything_is_calculated_again(calc: Calc, saved: dict[str, Path], form: str) -> None:
    calc.open(document="again", path=str(saved[form]))
    assert _same(_values(calc))
    calc.recalculate(document="again")
    assert _same(_values(calc))
    calc.put(document="again", tab="Numbers", column=0, row=0, rows=[[3.0, 1.0]])
    assert _values(calc)[1] == pytest.approx(18.0)
    texts = [row[0] for row in calc.texts(document="again", tab="Calls", cells="A1:A7")]
    assert texts[0].replace(",", ";") == "=HEAT_FROM_RISE(180;4.18;5)" and "(TOTAL_OF(" in texts[6]
    calc.close(document="again")


def test_without_the_add_in_an_xlsx_shows_its_stored_values(plain: Calc, saved: dict[str, Path]) -> None:
    plain.open(document="again", path=str(saved["xlsx"]))
    found = _values(plain)
    assert found[0] == 3762.0 and found[1] == 17.0 and found[5] == CALLS[5][1]
    plain.close(document="again")


def test_without_the_add_in_both_forms_open_and_say_name(plain: Calc, saved: dict[str, Path]) -> None:
    """After a hard recalculation nobody can know the values; the file is neither refused nor altered."""
    for form in FORMS:
        plain.open(document="again", path=str(saved[form]))
        plain.recalculate(document="again")
        assert set(_values(plain)) == {"#NAME?"}, form
        assert plain.read(document="again", tab="Numbers", cells="A1:B4") == NUMBERS
        plain.close(document="again")


def test_a_file_saved_without_the_add_in_recovers_with_it(plain: Calc, calc: Calc, saved: dict[str, Path]) -> None:
    for form in FORMS:
        path = saved[form].with_name(f"without.{form}")
        plain.open(document="again", path=str(saved[form]))
        plain.store(document="again", path=str(path))
        plain.close(document="again")
        calc.open(document="again", path=str(path))
        calc.recalculate(document="again")
        assert _same(_values(calc)), form
        calc.close(document="again")


def test_other_readers_find_the_stored_values(saved: dict[str, Path]) -> None:
    stored = openpyxl.load_workbook(saved["xlsx"], data_only=True)["Calls"]
    assert _same([row[0] for row in stored.iter_rows(max_col=1, values_only=True)])
    for form in FORMS:
        cells = read(saved[form]).cells["Calls"]
        assert _same([cells[f"A{row}"][1] for row in range(1, len(CALLS) + 1)]), form
        assert all("HEAT_FROM_RISE" in cells[f"A{row}"][2].upper() for row in (1, 4, 5, 7)), form
