"""The fourth witness of `check`: how it is asked, what it says, and what happens where it cannot speak."""

from __future__ import annotations

import io
import json
import random
import re
import sys
import zipfile
from collections.abc import Callable
from concurrent.futures import Future
from dataclasses import replace
from pathlib import Path
from typing import Any

import pytest
from openpyxl import load_workbook
from witness_case import KINDS, apart, read_one, results, said, workbook

sys.path.insert(0, str(Path(__file__).parents[1] / "check"))

import planting

from sheetcal.cli import main
from sheetcal.excel.bare import bare_key, bare_workbook
from sheetcal.kinds import load, skeleton
from sheetcal.kinds.layout import column_letter
from sheetcal.model import TABS, Shape
from sheetcal.office.failures import OfficeFailed, OfficeMissing
from sheetcal.office.jobs import Answer, Block, Convert, Job, Open, Push, Template, Values
from sheetcal.office.pool import Pool
from sheetcal.office.rectangles import covering, rectangles
from sheetcal.office.witness import heard
from sheetcal.verbs import fourth
from sheetcal.verbs.checking import Against, check_all, check_path
from sheetcal.verbs.fourth import ALWAYS, AUTO, NEVER, Office, bare

pytestmark = pytest.mark.office
Capture = pytest.CaptureFixture[str]


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Where the workbooks lie."""
    return tmp_path_factory.mktemp("witness")


@pytest.fixture(scope="module")
def book(tmp_path_factory: pytest.TempPathFactory) -> planting.Book:
    """A control and one coal, two runs each and a reserve place."""
    place = tmp_path_factory.mktemp("issue")
    return planting.filled(planting.issue("fuel", place, [planting.CONTROL, planting.coal("S-1")], spare=1))


# --- the bare workbook and its rectangles ---------------------------------------------------------------------


@pytest.mark.parametrize("kind", KINDS)
def test_the_bare_workbook_holds_the_kind_s_formulas_and_nothing_else(kind: str, folder: Path) -> None:
    """All tabs; each formula in its place; each name; not one value."""
    plan = read_one(workbook(folder, kind, 0)).question().plan
    made = load_workbook(io.BytesIO(bare_workbook(plan)))
    assert tuple(made.sheetnames) == TABS
    found = {
        f"{sheet.title}!{cell.coordinate}": cell.value
        for sheet in made
        for row in sheet.iter_rows()
        for cell in row
        if cell.value is not None
    }
    assert found == {one.where: one.formula for one in plan.places.values() if one.formula is not None}
    assert {name: one.attr_text for name, one in made.defined_names.items()} == plan.names
    assert len(found) > 10


def test_the_key_tells_layouts_apart() -> None:
    """Another number of samples, another order of the constants: another bare workbook, for names point elsewhere."""
    kind = load("specific-heat")
    names = tuple(kind.constants)
    shapes = [(2, names), (3, names), (2, names[::-1])]
    plans = [skeleton(kind, Shape(runs=runs, constants=constants)) for runs, constants in shapes]
    assert len({bare_key(one) for one in plans}) == 3
    assert len({bare_key(one) for one in [*plans, skeleton(kind, Shape(runs=2, constants=names))]}) == 3


def test_a_name_the_kind_does_not_know_stays_out() -> None:
    """Whatever a record lists as constants, only the kind's own names enter the bare workbook."""
    kind = load("heat-balance")
    plan = skeleton(kind, Shape(bodies=2, constants=('x" foreign="', *kind.constants)))
    text = zipfile.ZipFile(io.BytesIO(bare_workbook(plan))).read("xl/workbook.xml").decode()
    assert "foreign" not in text and f'name="{kind.constants[0]}"' in text


@pytest.mark.parametrize("kind", KINDS)
def test_rectangles_cover_every_cell_once_or_more_and_no_formula(kind: str, folder: Path) -> None:
    """Each reading, label, constant and table cell is pushed; no formula is written over; each result is read."""
    plan = read_one(workbook(folder, kind, 0)).question().plan
    found = rectangles(plan.kind, plan.shape)
    pushed = {(one.tab, cell) for one in found.pushed for row in one.rows for cell in row if cell}
    boxed = {(one.tab, place) for one in found.pushed for place in _box(one.cell, len(one.rows), len(one.rows[0]))}
    formulas = {(one.tab, one.cell) for one in plan.places.values() if one.formula is not None}
    single = {(one.tab, one.cell) for one in plan.places.values() if one.formula is None and not one.field.series}
    assert single <= pushed <= boxed
    assert not boxed & formulas
    assert found.results.keys() == {one.id for one in plan.places.values() if one.formula is not None}
    series = sum(one.field.series for one in plan.places.values())
    constants = sum(1 for tab, _ in pushed if tab == "Constants")
    assert len(pushed) == len(single) + series * plan.shape.record_rows + constants
    assert constants >= len(plan.shape.constants)


def _box(first: str, rows: int, columns: int) -> list[str]:
    letters, row = re.fullmatch(r"([A-Z]+)(\d+)", first).groups()  # type: ignore[union-attr]
    left = next(number for number in range(1, 703) if column_letter(number) == letters)
    return [f"{column_letter(left + c)}{int(row) + r}" for r in range(rows) for c in range(columns)]


def test_rectangles_are_few() -> None:
    """Cells side by side are one; a wall divides; a short gap is bridged, a long one is not."""
    block = {(row, column) for row in range(3, 9) for column in (5, 6)}
    assert covering(block, set()) == [(3, 5, 8, 6)]
    assert covering(block - {(5, 6)}, {(5, 6)}) == [(3, 5, 8, 5), (3, 6, 4, 6), (6, 6, 8, 6)]
    assert covering({(1, 1), (3, 1)}, {(2, 1)}) == [(1, 1, 1, 1), (3, 1, 3, 1)]
    assert covering({(1, 1), (3, 1)}, set()) == [(1, 1, 3, 1)]
    assert len(covering({(1, 1), (5000, 1)}, set())) == 2
    assert covering(set(), {(1, 1)}) == []


@pytest.mark.parametrize("seed", range(20))
def test_rectangles_of_any_pattern(seed: int) -> None:
    """At random: every wanted cell lies in one, no barred one does."""
    chance = random.Random(seed)
    cells = [(row, column) for row in range(1, 25) for column in range(1, 7)]
    wanted = set(chance.sample(cells, 60))
    barred = set(chance.sample(cells, 30)) - wanted
    boxes = covering(wanted, barred)
    inside = {
        (row, column)
        for top, left, bottom, right in boxes
        for row in range(top, bottom + 1)
        for column in range(left, right + 1)
    }
    assert wanted <= inside and not inside & barred
    assert len(boxes) <= len(wanted)


# --- what it says ---------------------------------------------------------------------------------------------


def test_nothing_of_an_earlier_file_remains(book: planting.Book, folder: Path, pool: Pool, tmp_path: Path) -> None:
    """A full workbook, then a blank one of the same layout: as blank as in a LibreOffice that saw no other.

    Every reading of the full one is another than that of the blank one, also those in reserve places and records.
    """
    blank = read_one(planting.write(tmp_path, planting.Book(book.plan, book.record, {}).data(), "blank.xlsx"))
    full = read_one(planting.write(tmp_path, book.data(), "full.xlsx"))
    with Pool(1) as fresh:
        before = results(fresh, blank)
    assert results(pool, full) != before
    assert results(pool, blank) == before
    assert sum(value is None for value in before.values()) > 20


def test_every_cell_of_the_template_is_cleared(book: planting.Book, pool: Pool) -> None:
    """All pushed cells filled with numbers, then pushed blank: a read of every tab shows no trace of them."""
    plan = rectangles(book.plan.kind, book.plan.shape)
    template = Template(*bare(book.plan))
    whole = tuple((tab, "A1:Z600") for tab in TABS[:5])

    def filled(value: float | None) -> Push:
        blocks = [Block(one.tab, one.cell, tuple((value,) * len(row) for row in one.rows)) for one in plan.pushed]
        return Push(template, tuple(blocks), whole)

    def count(answer: Answer) -> int:
        assert isinstance(answer, Values)
        return sum(cell == 987654.25 for block in answer.blocks for row in block.rows for cell in row)

    cells = sum(len(row) for one in plan.pushed for row in one.rows)
    assert count(pool.run(filled(987654.25))) >= 0.9 * cells > 500
    assert count(pool.run(filled(None))) == 0


def test_the_order_of_files_does_not_matter(folder: Path, pool: Pool) -> None:
    """Several kinds and layouts in turns through one LibreOffice: each file gives what it gives alone."""
    files = [read_one(workbook(folder, kind, seed)) for kind in KINDS for seed in (0, 1)]
    alone = {one.path: results(pool, one) for one in files}
    for seed in range(3):
        mixed = random.Random(seed).sample(files, len(files))
        assert {one.path: results(pool, one) for one in mixed} == alone


def test_verdicts_through_the_pool_are_those_one_by_one(folder: Path, pool: Pool) -> None:
    """Many in flight at once, or each alone: the same verdicts, in the order of the files."""
    files = [str(workbook(folder, kind, seed)) for kind in KINDS for seed in (0, 1, 2)]
    office = Office(ALWAYS, pool)
    together = list(check_all(files, Against(), office))
    alone = [next(check_all([file], Against(), office)) for file in files]
    assert together == alone
    assert [one.file for one in together] == files
    assert {one.witnesses for one in together} == {("typed", "formula", "balance", "office")}
    assert all(one.sound for one in together)


def roads(pool: Pool, path: Path) -> str:
    """How it spoke."""
    return said(pool, read_one(path)).note


def test_a_file_whose_formulas_differ_is_opened(book: planting.Book, pool: Pool, tmp_path: Path) -> None:
    """Own formulas, spelled otherwise too, are pushed; an altered, typed-over or deleted one is not."""
    data = book.data()
    run = book.plan.places["run4.gross_run"]
    assert run.formula is not None
    spelled = planting.edited(data, {run.where: planting.formula(run.formula.replace("(", "( ", 1), 1.0)})
    altered = planting.edited(data, {run.where: planting.formula(f"{run.formula}+0", 1.0)})
    over = planting.edited(data, {run.where: planting.number(24000.0)})
    gone = planting.edited(data, {run.where: None})
    files = {"own": data, "spelled": spelled, "altered": altered, "over": over, "gone": gone}
    notes = {name: roads(pool, planting.write(tmp_path, bytes_, f"{name}.xlsx")) for name, bytes_ in files.items()}
    assert notes == {
        "own": "template", "spelled": "template", "altered": "opened", "over": "opened", "gone": "opened",
    }  # fmt: skip


@pytest.mark.parametrize("content", [planting.truth(True), planting.error("#N/A"), planting.formula("=5+11.95", 16.95)])
def test_readings_that_cannot_be_pushed_are_opened(
    content: Any, book: planting.Book, pool: Pool, tmp_path: Path
) -> None:
    """TRUE, an error value, a formula where a reading belongs: pushed they would lose their meaning."""
    path = planting.write(tmp_path, planting.edited(book.data(), {book.cell("run4.burette_end"): content}))
    assert roads(pool, path) == "opened"


@pytest.mark.parametrize("word", ["=1+1", "TRUE", "1/2", "'quoted", "16,95", "2025-03-03", "#N/A", " ", "Übung €"])
def test_texts_are_pushed_as_they_are(word: str, book: planting.Book, pool: Pool, tmp_path: Path) -> None:
    """What looks like a formula, a date, an error or a number is a text by either road, also among numbers."""
    one = read_one(planting.write(tmp_path, book.data({"sheet.remarks": word, "run4.burette_end": word})))
    assert said(pool, one).note == "template"
    assert [*apart(one, results(pool, one))] == []
    assert [*apart(one, results(pool, one, own=False))] == []


# --- where it cannot speak ------------------------------------------------------------------------------------


class Failing:
    """A pool whose every answer is a fault."""

    def __init__(self, fault: Exception) -> None:
        self.fault = fault
        self.size, self.asked = 1, 0
        self.place = Pool(1).place

    def submit(self, _: Job) -> Future[Answer]:
        """A future that raises."""
        self.asked += 1
        future: Future[Answer] = Future()
        future.set_exception(self.fault)
        return future


TWICE = OfficeFailed("a.xlsx", "office failed twice: killed", "", "Look at it.")
UNSTARTED = OfficeMissing("LibreOffice", "did not start: no memory", "", "Start it yourself.")


def by(fault: Exception, mode: str, *files: Path) -> tuple[Office, list[Any], Failing]:
    """Verdicts with a LibreOffice that fails."""
    pool = Failing(fault)
    office = Office(mode, pool)  # type: ignore[arg-type]  # all that Office asks of a pool is there
    return office, list(check_all([str(one) for one in files], Against(), office)), pool


def test_a_failure_is_silence(folder: Path) -> None:
    """Under `auto` the other three decide: the same verdict, no finding, a note, a word at the end."""
    path = workbook(folder, "heat-balance", 0)
    office, (verdict,), _ = by(TWICE, AUTO, path)
    alone = check_path(str(path), Against())
    assert verdict == replace(alone, witness_notes={**alone.witness_notes, "office": "silent: office failed twice"})
    assert office.words.endswith("failed on 1 file")


def test_a_failure_where_it_must_speak_is_a_finding(folder: Path) -> None:
    """Under `always`: `office-failed`, an error, on that file."""
    _, (verdict,), _ = by(TWICE, ALWAYS, workbook(folder, "heat-balance", 0))
    assert [(one.code, one.severity) for one in verdict.findings] == [("office-failed", "error")]
    assert verdict.verdict == "reject" and "office" not in verdict.witnesses


def test_one_that_does_not_start_is_not_asked_again(folder: Path) -> None:
    """Each start costs its time limit: the files in flight hear of it, the others do not wait."""
    files = [workbook(folder, "heat-balance", seed) for seed in range(12)]
    office, verdicts, pool = by(UNSTARTED, AUTO, *files)
    assert office.words == "LibreOffice did not start: no memory"
    assert pool.asked <= office.ahead + 1 < len(files)
    assert {one.witness_notes["office"] for one in verdicts} == {"silent: LibreOffice did not start: no memory"}
    assert all(one.sound for one in verdicts)


def test_a_file_libreoffice_cannot_open_is_spokento_be_one(book: planting.Book, pool: Pool, tmp_path: Path) -> None:
    """Gone between our reading and its opening: silent, with its reason."""
    one = read_one(planting.write(tmp_path, book.data()))
    asked = one.question(own=False)
    one.path.unlink()
    future = pool.submit(Open(asked.path, (("Front", "A1:A2"),)))
    spoken = heard(asked, future)
    assert spoken.values is None and spoken.failed and spoken.note.startswith("silent: LibreOffice says the file")


@pytest.fixture
def nowhere(monkeypatch: pytest.MonkeyPatch) -> None:
    """No LibreOffice on this machine."""
    missing = OfficeMissing("LibreOffice", "not found", "an installed one", "Install it.")

    def raises() -> Pool:
        raise missing

    monkeypatch.setattr(fourth, "shared_pool", raises)


def check(capsys: Capture, *argv: str | Path) -> tuple[int, dict[str, Any]]:
    """Exit code and JSON document of a `check`."""
    capsys.readouterr()
    code = main(["check", *(str(one) for one in argv), "--json", "-"])
    return code, json.loads(capsys.readouterr().out)


@pytest.mark.usefixtures("nowhere")
def test_absent_the_other_three_decide(folder: Path, capsys: Capture) -> None:
    """`auto`: exit code, verdict and findings as ever; the last line says so, the document as well."""
    path = workbook(folder, "heat-balance", 0)
    code, document = check(capsys, path)
    (one,) = document["files"]
    assert code == 0 and one["sound"] and one["witnesses"] == ["typed", "formula", "balance"]
    assert one["witness_notes"] == {"office": "silent: LibreOffice not found"}
    assert document["tool"]["office"] is None
    assert main(["check", str(path)]) == 0
    assert capsys.readouterr().out.rstrip().endswith("Witnesses: typed, formula, balance; LibreOffice not found.")


@pytest.mark.usefixtures("nowhere")
def test_absent_where_it_must_speak_is_misuse(folder: Path, tmp_path: Path, capsys: Capture) -> None:
    """`always`: exit 2 before any file is read, one line that says how to get it, no document."""
    (tmp_path / "paper.xlsx").write_bytes(b"%PDF")
    out = tmp_path / "out.json"
    assert main(["check", str(tmp_path), "--office", "always", "--json", str(out)]) == 2
    spoken = capsys.readouterr()
    assert spoken.out == "" and spoken.err.count("\n") == 1
    assert spoken.err.startswith("sheetcal: LibreOffice: not found") and "Install it" in spoken.err
    assert not out.exists()


def test_a_variable_that_points_nowhere(folder: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """SHEETCAL_SOFFICE without LibreOffice behind it: absent, and the word names the variable."""
    from sheetcal.office import shared

    monkeypatch.setattr(shared, "_POOLS", {})
    monkeypatch.setenv("SHEETCAL_SOFFICE", str(folder))
    office = Office(AUTO)
    (verdict,) = check_all([str(workbook(folder, "heat-balance", 0))], Against(), office)
    assert not office.speaks and verdict.sound and "office" not in verdict.witnesses
    assert "SHEETCAL_SOFFICE" in office.words and office.version is None
    with pytest.raises(OfficeMissing, match="SHEETCAL_SOFFICE"):
        Office(ALWAYS)


# --- the command ----------------------------------------------------------------------------------------------


@pytest.fixture
def alone(pool: Pool, monkeypatch: pytest.MonkeyPatch) -> None:
    """The command speaks to the LibreOffice of these tests."""
    monkeypatch.setattr(fourth, "shared_pool", lambda: pool)


@pytest.mark.usefixtures("alone")
def test_check_names_the_fourth_witness(book: planting.Book, tmp_path: Path, capsys: Capture) -> None:
    """By default where LibreOffice is found: witness, road, values and version; the last line names them."""
    planting.write(tmp_path, book.data(), "a-own.xlsx")
    over = planting.edited(book.data(), {book.cell("sample2.gross_dry"): planting.number(24903.0)})
    planting.write(tmp_path, over, "b-over.xlsx")
    code, document = check(capsys, tmp_path)
    own, typed = document["files"]
    assert code == 1 and (own["verdict"], typed["verdict"]) == ("sound", "reject")
    assert own["witnesses"] == typed["witnesses"] == ["typed", "formula", "balance", "office"]
    assert own["witness_notes"] == {"office": "template"} and typed["witness_notes"] == {"office": "opened"}
    assert re.fullmatch(r"\d+\.\d+.*", document["tool"]["office"])
    gross = {one["id"]: one for one in own["results"]}["sample2.gross_dry"]
    assert gross["office"] == pytest.approx(gross["formula"], rel=1e-12) and gross["agrees"] is True
    assert [one["code"] for one in typed["findings"] if one["severity"] == "error"] == ["result-typed-over"]
    main(["check", str(tmp_path)])
    last = capsys.readouterr().out.splitlines()[-1]
    assert f"Witnesses: typed, formula, balance, office; LibreOffice {document['tool']['office']}." in last


@pytest.mark.usefixtures("alone")
def test_never_asks_nobody(book: planting.Book, tmp_path: Path, capsys: Capture, monkeypatch: Any) -> None:
    """`never`: no LibreOffice, no pool, no word but that it was not asked."""
    monkeypatch.setattr(fourth, "shared_pool", lambda: pytest.fail("it was asked"))
    path = planting.write(tmp_path, book.data())
    code, document = check(capsys, path, "--office", NEVER)
    assert code == 0 and document["files"][0]["witnesses"] == ["typed", "formula", "balance"]
    assert document["files"][0]["witness_notes"] == {"office": "silent: LibreOffice not asked"}


@pytest.mark.usefixtures("alone")
def test_workers_share_the_libreoffice(folder: Path, capsys: Capture, pool: Pool) -> None:
    """Several processes examine, one pool answers: the same document as with one process, no more LibreOffices."""
    files = [workbook(folder, kind, seed) for kind in KINDS for seed in (0, 1)]
    spoken = [check(capsys, *files, "--workers", workers) for workers in ("1", "3")]
    assert spoken[0] == spoken[1]
    assert len(pool.engine_pids()) == 1
    assert all("office" in one["witnesses"] for one in spoken[0][1]["files"])


@pytest.mark.usefixtures("alone")
def test_what_is_no_workbook_is_not_asked_about(tmp_path: Path, capsys: Capture) -> None:
    """Refused files keep their entry as ever, also where LibreOffice must speak."""
    (tmp_path / "paper.xlsx").write_bytes(b"%PDF-1.7")
    code, document = check(capsys, tmp_path, "--office", ALWAYS)
    (one,) = document["files"]
    assert code == 2 and one["witnesses"] == [] and one["witness_notes"] == {}
    assert [found["code"] for found in one["findings"]] == ["file-unreadable"]


def test_kinds_names_four_witnesses(capsys: Capture) -> None:
    """Every kind can be computed by LibreOffice."""
    assert main(["kinds", "--json"]) == 0
    listed = json.loads(capsys.readouterr().out)
    assert {tuple(one["witnesses"]) for one in listed} == {("typed", "formula", "balance", "office")}


Change = Callable[[bytes], bytes]
REWRITTEN: dict[str, Change] = {
    "quotes": lambda data: planting.on_part(
        data, planting.sheet_part("Results"), lambda xml: xml.replace("Front!", "'Front'!")
    ),
    "structure": lambda data: planting.on_part(
        data, "xl/workbook.xml", lambda xml: re.sub(r"<workbookProtection[^>]*/>", "", xml)
    ),
}  # fmt: skip


@pytest.mark.parametrize("change", REWRITTEN)
def test_what_a_program_rewrites_is_no_difference(change: str, book: planting.Book, pool: Pool, tmp_path: Path) -> None:
    """Needless quotes, lost protection of the structure: the own formulas still, pushed, and sound."""
    path = planting.write(tmp_path, REWRITTEN[change](book.data()))
    (verdict,) = check_all([str(path)], Against(), Office(ALWAYS, pool))
    assert verdict.sound and verdict.witness_notes["office"] == "template"


@pytest.mark.parametrize("form", ["xlsx", "ods"])
def test_saved_again_by_libreoffice(form: str, book: planting.Book, pool: Pool, tmp_path: Path) -> None:
    """TRUE(), its own spelling of numbers, another format: sound, by the template."""
    path = planting.write(tmp_path, book.data())
    again = tmp_path / f"again.{form}"
    pool.run(Convert(str(path), str(again), form))
    (verdict,) = check_all([str(again)], Against(), Office(ALWAYS, pool))
    assert [one.code for one in verdict.findings] == [] and verdict.sound
    assert verdict.witness_notes["office"] == "template"


def test_what_the_old_format_cannot_hold_is_no_difference(
    book: planting.Book, pool: Pool, tmp_path: Path, convert: Callable[[list[Path], str, Path], None]
) -> None:
    """An .xls with a result typed over is opened; lines of warning too long for it are passed over, nothing else."""
    over = planting.edited(book.data(), {book.cell("sample2.gross_dry"): planting.number(24903.0)})
    convert([planting.write(tmp_path, over)], "xls", tmp_path)
    (verdict,) = check_all([str(tmp_path / "book.xls")], Against(), Office(ALWAYS, pool))
    assert verdict.witness_notes["office"] == "opened"
    assert {one.code for one in verdict.findings} == {"result-typed-over", "formula-lost"}
    lines = {one.id: one for one in verdict.results}
    lost = [one for one in lines.values() if one.office is None and one.formula is not None]
    assert {one.unit for one in lost} <= {None} and len(lost) < 10
    assert lines["run4.gross_run"].office == pytest.approx(lines["run4.gross_run"].formula, rel=1e-12)
