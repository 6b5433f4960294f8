"""A file that LibreOffice opens itself: settings of the file change no result, odd formulas blame no engine.

Every file here has an altered formula, so that it is opened; the finding on that is the only one about formulas.
"""

from __future__ import annotations

import re
import sys
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path

import pytest

sys.path.insert(0, str(Path(__file__).parents[1] / "check"))

import planting

from sheetcal.model import ResultLine, Verdict
from sheetcal.office.pool import Pool
from sheetcal.office.witness import question
from sheetcal.verbs.checking import Against, check_all
from sheetcal.verbs.fourth import ALWAYS, Office

pytestmark = pytest.mark.office
BLAMED = "engines-disagree"
PLACE = "run5.gross_run"


@pytest.fixture(scope="module")
def book(tmp_path_factory: pytest.TempPathFactory) -> planting.Book:
    """A control and one coal, two runs each and a reserve place."""
    place = tmp_path_factory.mktemp("issue")
    return planting.filled(planting.issue("fuel", place, [planting.CONTROL, planting.coal("S-1")], spare=1))


def altered(book: planting.Book, written: str) -> bytes:
    """The workbook with another formula for the gross value of one run."""
    return planting.edited(book.data(), {book.cell(PLACE): planting.formula(written, 1.0)})


def checked(pool: Pool, folder: Path, data: bytes) -> tuple[Verdict, ResultLine]:
    """The verdict, and the line of the run."""
    (verdict,) = check_all([str(planting.write(folder, data))], Against(), Office(ALWAYS, pool))
    assert verdict.witness_notes["office"] == "opened"
    return verdict, next(one for one in verdict.results if one.id == PLACE)


def with_setting(mark: str) -> Callable[[str], str]:
    """A setting of the calculation."""
    return lambda xml: xml.replace("<calcPr ", f"<calcPr {mark} ")


SETTINGS: dict[str, Callable[[str], str]] = {
    "precision as displayed": with_setting('fullPrecision="0"'),
    "iteration": with_setting('iterate="1" iterateCount="5"'),
    "calculation by hand": with_setting('calcMode="manual"'),
    "calendar of 1904": lambda xml: xml.replace("<workbookPr />", '<workbookPr date1904="1"/>'),
    "a name of a constant points elsewhere": lambda xml: re.sub(
        r'(<definedName name="nitric_heat"[^>]*>)Constants!\$C\$\d+', r"\1Constants!$C$6", xml
    ),
}


@pytest.mark.parametrize("setting", SETTINGS)
def test_settings_blame_no_engine(setting: str, book: planting.Book, pool: Pool, tmp_path: Path) -> None:
    """Full precision always; where the file's own names lie, the finding on them stands alone."""
    run = book.plan.places[PLACE]
    data = planting.on_part(altered(book, f"{run.formula}+0"), "xl/workbook.xml", SETTINGS[setting])
    verdict, line = checked(pool, tmp_path, data)
    codes = [one.code for one in verdict.findings]
    assert "formula-altered" in codes and BLAMED not in codes
    if "name" in setting:
        assert "constant-altered" in codes and line.office != pytest.approx(line.formula, rel=1e-6)
    else:
        assert line.office == pytest.approx(line.formula, rel=1e-12)


# formula, what sheetcal's interpreter gives, what LibreOffice gives: different only where the interpreter knows less
ODD = {
    "=NOW()": ("#NAME?", float), "=FOO(1)": ("#NAME?", "#NAME?"), '=INDIRECT("E5")': ("#NAME?", str),
    '="1"+1': ("#VALUE!", (2.0, "#VALUE!")), "=TRUE": (True, 1.0), "=50%": (0.5, 0.5), "=-2^2": (4.0, 4.0),
    '="a"="A"': (True, 1.0), '=1.5&"x"': ("1.5x", "1.5x"), "=1E308*10": ("#NUM!", "#NUM!"), "=1/3-1/3": (0.0, 0.0),
    "=1/0": ("#DIV/0!", "#DIV/0!"), "=NA()": (None, "#N/A"),
}  # fmt: skip


@pytest.mark.parametrize("written", ODD)
def test_odd_formulas_blame_no_engine(written: str, book: planting.Book, pool: Pool, tmp_path: Path) -> None:
    """What stands on an altered formula is settled by the finding on it, whatever either engine makes of it."""
    verdict, line = checked(pool, tmp_path, altered(book, written))
    assert [one.code for one in verdict.findings if one.code.startswith(("formula", "engines"))] in (
        ["formula-altered"], ["formula-dimension"], ["formula-volatile"],
    )  # fmt: skip
    ours, theirs = ODD[written]
    assert ours is None or line.formula == ours
    if isinstance(theirs, type):
        assert isinstance(line.office, theirs)
    else:
        assert line.office in (theirs if isinstance(theirs, tuple) else (theirs,))


def test_a_record_that_states_a_monstrous_size(book: planting.Book, pool: Pool) -> None:
    """Nothing is laid out for it and nobody is asked; the witness is silent and says why."""
    shape = replace(book.record.shape, samples=99, runs=40, record_rows=500)
    for asked in (shape, replace(shape, samples=40, runs=2, spare=2, record_rows=500)):
        large = asked.samples * asked.places * asked.record_rows > 100_000
        found = question("a.xlsx", "fuel", 1, asked, {}, own=False)
        assert (found is None) == large
    heard = Office(ALWAYS, pool).heard(None)
    assert heard.values is None and heard.note == "silent: larger than any workbook that is issued"
