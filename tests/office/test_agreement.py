"""LibreOffice and sheetcal's own interpreter compute every result alike, to 1e-12 of its largest term.

On each kind, blank, filled by the bench, and with planted faults; by both roads: pushed into the bare workbook,
and the file itself opened.
"""

from __future__ import annotations

import sys
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pytest
from witness_case import KINDS, Read, apart, largest_terms, read_one, results, said, workbook

from sheetcal.check.submission import take_apart
from sheetcal.office.pool import Pool

sys.path.insert(0, str(Path(__file__).parents[1] / "check"))

import planting
from test_findings_office import slips

from sheetcal.verbs import Output

pytestmark = pytest.mark.office


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Where the workbooks lie."""
    return tmp_path_factory.mktemp("agreement")


@pytest.mark.parametrize("kind", KINDS)
def test_blank_workbooks_agree_by_both_roads(kind: str, folder: Path, pool: Pool) -> None:
    """Every result blank, or what follows from the constants alone."""
    one = read_one(workbook(folder, kind, None))
    assert [*apart(one, results(pool, one))] == []
    assert [*apart(one, results(pool, one, own=False))] == []
    assert len(one.lines) > 10


@pytest.mark.parametrize("kind", KINDS)
def test_filled_workbooks_agree(kind: str, folder: Path, pool: Pool, sizes: dict[str, Any]) -> None:
    """Values pushed into the bare workbook, on every fill; a sample of the files opened as well."""
    compared = 0
    for seed in range(sizes["office_fills"]):
        one = read_one(workbook(folder, kind, seed))
        office = results(pool, one)
        assert [*apart(one, office)] == [], one.path
        if seed < sizes["office_opened"]:
            assert [*apart(one, results(pool, one, own=False))] == [], one.path
        compared += sum(isinstance(value, float) for value in office.values())
    assert compared > 15 * sizes["office_fills"]


@pytest.fixture(scope="module")
def planted(tmp_path_factory: pytest.TempPathFactory) -> list[Read]:
    """One fuel workbook for each sort of slip."""
    place = tmp_path_factory.mktemp("slips")
    rows = [planting.CONTROL, planting.coal("S-1")]
    book = planting.filled(planting.issue("fuel", place, rows, spare=1))
    return [read_one(planting.write(place, data, f"{code}.xlsx")) for code, data in slips(book).items()]


def typed_over(one: Read) -> list[str]:
    """Results in whose cell no formula stands."""
    places = [(line.id, *line.cell.split("!")) for line in one.lines]
    return [name for name, tab, cell in places if one.file.cells[tab].get(cell, ("", None, None))[2] is None]


def test_planted_faults_agree(planted: list[Read], pool: Pool) -> None:
    """Altered formulas, text, dates, errors, truth values and formulas among readings: the engines differ nowhere.

    Only a cell that was typed over has no formula: there LibreOffice shows what was typed.
    """
    roads = set()
    for one in planted:
        over = typed_over(one)
        assert len(over) == (one.path.stem == "result-typed-over"), one.path.stem
        roads.add(said(pool, one).note)
        assert [*apart(one, results(pool, one), over)] == [], one.path.stem
        assert [*apart(one, results(pool, one, own=False), over)] == [], one.path.stem
    assert len(planted) == 15 and roads == {"template", "opened"}


def submitted(played: tuple[Path, Output]) -> Iterator[Read]:
    """What came back in the demonstration's week, with the slips of people in it."""
    for path in sorted((played[0] / "submitted").glob("*.xlsx")):
        yield read_one(path)


def test_the_week_s_slips_agree(played: tuple[Path, Output], pool: Pool) -> None:
    """All kinds, with void runs, values awaited, exchanged records, a decimal comma and a typed-over result."""
    seen = 0
    for one in submitted(played):
        over = typed_over(one)
        assert [*apart(one, results(pool, one), over)] == [], one.path.stem
        seen += 1
    assert seen == 19


def test_the_largest_term_is_what_an_input_moves(planted: list[Read]) -> None:
    """A scatter of 0.1 mK about temperatures near 25 degC: its terms are the temperatures, no more and no less.

    A heat's terms are of its own size, or of the temperatures of which the rise is a difference: ten times that.
    """
    one = next(one for one in planted if one.path.stem == "sound")
    values = {line.id: float(str(line.formula or 0.0)) for line in one.lines if not isinstance(line.formula, str)}
    names = ["run4.fore_scatter", "run4.total_heat", "run4.nitric_heat"]
    terms = largest_terms(take_apart(one.file, "sound"), names)
    assert 0.0 < values["run4.fore_scatter"] < 1e-3
    assert 1.0 < terms["run4.fore_scatter"] < 100.0
    for name in names[1:]:
        assert values[name] > 0.0
        assert 0.3 * values[name] < terms[name] < 200.0 * values[name], name
