"""The front page's table at a glance cannot be typed over unseen: the head reads it first."""

from __future__ import annotations

import sys
from pathlib import Path

import openpyxl
import pytest

sys.path.insert(0, str(Path(__file__).parents[1] / "excel"))

import example_record

from sheetcal.excel.writer import write_workbook
from sheetcal.kinds.glance import glances
from sheetcal.model import Finding
from sheetcal.verbs.checking import Against, check_path


def on_front(path: Path, cell: str, value: object) -> list[Finding]:
    """Findings on the front page once a cell of it holds something else."""
    book = openpyxl.load_workbook(path)
    book["Front"][cell] = value
    changed = path.with_name("changed.xlsx")
    book.save(changed)
    verdict = check_path(str(changed), Against())
    return [one for one in verdict.findings if one.sheet == "Front" and one.cell == cell]


@pytest.fixture(scope="module")
def workbook(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The filled example as written."""
    record, values, _ = example_record.example()
    path = tmp_path_factory.mktemp("glance") / "book.xlsx"
    write_workbook(record, values, path)
    return path


def test_the_table_as_written_is_no_finding(workbook: Path) -> None:
    """What the writer puts there is what the checker expects."""
    _, _, layout = example_record.example()
    cells = {one.cell for one in glances(layout)}
    found = check_path(str(workbook), Against()).findings
    assert len(cells) == 14
    assert not [one for one in found if one.sheet == "Front" and one.cell in cells]


@pytest.mark.parametrize(
    ("name", "value", "code"),
    [
        ("gross_dry_reported", 31000, "result-typed-over"),
        ("gross_dry_reported", None, "result-typed-over"),
        ("gross_dry_reported", "=30000+1", "formula-altered"),
        ("what_next", "enough runs: report the mean", "result-typed-over"),
        ("warnings", "", "result-typed-over"),
    ],
)
def test_a_cell_typed_over_or_altered_is_found(workbook: Path, name: str, value: object, code: str) -> None:
    """A figure, a word, the warning, deleted or another formula: each by its cell."""
    _, _, layout = example_record.example()
    table = glances(layout)
    one = next(one for one in table if (one.places[0].field.name == name if not one.warns else name == "warnings"))
    found = on_front(workbook, one.cell, value)
    assert [each.code for each in found] == [code]
    assert found[0].action == "reject"
