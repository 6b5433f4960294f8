"""An issued .ods is as hard to fill in wrongly as the .xlsx it was made of, and is checked as well."""

from __future__ import annotations

import io
import re
import shutil
import zipfile
from dataclasses import dataclass
from datetime import date
from pathlib import Path
from typing import Any

import pytest
from output_case import KINDS, cells_of, clean_case, typed, whole, without_office

from sheetcal.bench import fill
from sheetcal.cli import main
from sheetcal.errors import Refused
from sheetcal.excel import odsform
from sheetcal.excel.form import xlsx_form
from sheetcal.excel.reader import read
from sheetcal.excel.writer import workbook_bytes
from sheetcal.kinds import load, names
from sheetcal.model import IssueRecord
from sheetcal.office.jobs import Convert
from sheetcal.verbs import outputs
from sheetcal.verbs.checking import Against, check_path

pytestmark = pytest.mark.office
DEMO = clean_case.DEMO
CORRECTED = DEMO / "lab-corrected.toml"
SEED = 3


def issued(kind: str, folder: Path) -> IssueRecord:
    """An issue record of a kind."""
    return clean_case.record_of(kind, folder, "coal", "CAL-A")


@dataclass(frozen=True)
class Made:
    """One kind: the record, its blank .ods, the same with readings typed in LibreOffice, what LibreOffice saw."""

    record: IssueRecord
    path: Path
    filled: Path
    facts: dict[str, Any]


@pytest.fixture(scope="module")
def made(tmp_path_factory: pytest.TempPathFactory) -> dict[str, Made]:
    """A workbook of each kind issued as .ods, opened in LibreOffice, filled there by hand and saved."""
    folder = tmp_path_factory.mktemp("made")
    records, orders = {}, []
    for kind in KINDS:
        records[kind] = issued(kind, folder)
        path, filled = folder / f"{kind}.ods", folder / f"{kind}-filled.ods"
        outputs.write(records[kind], whole(records[kind], {}), path)
        cells = cells_of(records[kind], fill(records[kind], SEED, None))
        orders.append({"file": str(path), "out": str(filled), "filter": "calc8", "cells": cells})
    facts = typed(orders, folder / "typing")
    names = [(Path(order["file"]), Path(order["out"])) for order in orders]
    return {kind: Made(records[kind], *files, told) for kind, files, told in zip(KINDS, names, facts, strict=True)}


def test_what_libreoffice_finds_in_it(made: dict[str, Made]) -> None:
    """All five kinds, opened by somebody else: tabs locked, every tab protected, record hidden, heads stay in view."""
    assert len(made) == 5
    for kind, one in made.items():
        form = xlsx_form(workbook_bytes(one.record, whole(one.record, {})))
        assert one.facts["locked"] and one.facts["front"] == "Front", kind
        for tab, own in form.tabs.items():
            seen = one.facts["tabs"][tab]
            assert seen["protected"], (kind, tab)
            assert seen["visible"] != own.hidden, (kind, tab)
            assert seen["charts"] == own.charts, (kind, tab)
            assert (seen["marks"] > 0) == bool(own.marks), (kind, tab)
            assert own.hidden or seen["frozen"] == 3, (kind, tab)


def test_every_open_cell_says_what_it_wants(made: dict[str, Made]) -> None:
    """Each reading that can be typed has its rule, shown on entry and enforced; everything else is locked."""
    count = 0
    for kind, one in made.items():
        form = odsform.ods_form(one.path.read_bytes())
        for tab, cells in cells_of(one.record, fill(one.record, SEED, None)).items():
            for address in cells:
                spot = odsform.place(address)
                rule = form.tabs[tab].rules[spot]
                assert spot in form.tabs[tab].open, (kind, tab, address)
                assert rule.sort in ("list", "date", "textLength", "custom") and all(rule.words), (kind, address)
                count += 1
        for tab, cells in read(one.path).cells.items():
            locked = {odsform.place(address) for address, cell in cells.items() if cell[2] is not None}
            assert not locked & form.tabs[tab].open, (kind, tab)
    assert count > 500


def test_readings_typed_in_libreoffice_raise_no_false_alarm(made: dict[str, Made], tmp_path: Path) -> None:
    """The bench's readings typed into the .ods of each kind and saved there: sound, as the .xlsx is."""
    for kind, one in made.items():
        clean_case.write(one.record, SEED, None, tmp_path / f"{kind}.xlsx")
        ours, theirs = (check_path(str(path), Against()) for path in (tmp_path / f"{kind}.xlsx", one.filled))
        assert (theirs.verdict, clean_case.told(list(theirs.findings))) == ("sound", []), kind
        assert theirs.readings_sha256 == ours.readings_sha256
        assert [line.id for line in theirs.results] == [line.id for line in ours.results]
        assert theirs.witnesses == ("typed", "formula", "balance")


def test_issue_fill_check_on_the_command_line(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """`issue` and `fill` write .ods by the name of OUT, and the filled one is sound."""
    first, second, third = (str(tmp_path / f"{name}") for name in ("blank.ods", "filled.ods", "filled.xlsx"))
    assert main(["issue", "heat-balance", "-o", first, "--format", "ods"]) == 0
    assert capsys.readouterr().out.startswith(f"issued {first}  heat-balance 1  id ")
    data = tmp_path / "HB1.csv"  # as measured today: the workbook was issued today
    text = (DEMO / "data" / "HB1.csv").read_text("utf-8")
    data.write_text(re.sub("2025-03-0[67]", date.today().isoformat(), text), "utf-8")
    for out in (second, third):
        assert main(["fill", first, "--from", str(data), "-o", out]) == 0
        assert capsys.readouterr().out == f"filled {out}  49 readings, 0 missing\n"
    assert check_path(second, Against()).verdict == "sound"
    assert check_path(second, Against()).readings_sha256 == check_path(third, Against()).readings_sha256
    assert main(["fields", second]) == 0
    assert main(["issue", "heat-balance", "-o", first]) == 2
    assert "exists already" in capsys.readouterr().err


@pytest.mark.parametrize(("out", "form"), [("a.xlsx", "ods"), ("a.ods", "xlsx")])
def test_format_and_name_that_contradict_are_refused(
    out: str, form: str, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    assert main(["issue", "heat-balance", "-o", str(tmp_path / out), "--format", form]) == 2
    said = capsys.readouterr().err
    assert said.count("\n") == 1 and f"--format is {form}" in said
    assert list(tmp_path.iterdir()) == []


def test_without_libreoffice_one_line_says_how_to_get_it(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    without_office(monkeypatch)
    assert main(["issue", "heat-balance", "-o", str(tmp_path / "a.ods")]) == 2
    said = capsys.readouterr().err
    assert said.count("\n") == 1 and "LibreOffice: not found" in said and "install" in said
    assert list(tmp_path.iterdir()) == []


SPOILS = {
    "the lock on its tabs": (b' table:structure-protected="true"', b""),
    "the protection of Front": (b'table:name="Front" table:style-name="ta1" table:protected="true"',
                                b'table:name="Front" table:style-name="ta1"'),
    "the locked cells of": (b'style:cell-protect="none"', b'style:cell-protect="protected"'),
    "the rule of entry of": (b"expected a number in", b"expected any number in"),
    "the marks of": (b"formula-is(LEFT([.", b"formula-is(RIGHT([."),
    "the names of constants": (b'table:name="closure_limit"', b'table:name="closure_limits"'),
    "the issue record": (b"first-principles", b"first-principle"),
    "Front!A4": (b"<text:p>This workbook</text:p>", b"<text:p>That workbook</text:p>"),
    "Front!E": (b"of:=IF(", b"of:=1*IF("),
}  # fmt: skip


@dataclass
class Office:
    """Stands in for LibreOffice: hands out an .ods made before, with one piece changed."""

    path: Path
    piece: tuple[bytes, bytes]

    def run(self, job: Convert) -> None:
        Path(job.out).write_bytes(changed(self.path.read_bytes(), *self.piece))


@pytest.mark.parametrize("what", SPOILS)
def test_nothing_is_written_that_was_not_kept(
    what: str, made: dict[str, Made], tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Whatever LibreOffice might lose of the form is noticed, named, and no file appears."""
    one = made["heat-balance"]
    monkeypatch.setattr(outputs, "shared_pool", lambda: Office(one.path, SPOILS[what]))
    monkeypatch.setattr(outputs, "finished", lambda data, ours: data)
    with pytest.raises(Refused, match="did not keep") as refused:
        outputs.write(one.record, whole(one.record, {}), tmp_path / "a.ods")
    assert what in refused.value.what
    assert list(tmp_path.iterdir()) == []


def changed(data: bytes, old: bytes, new: bytes, part: str = "content.xml") -> bytes:
    """The package with a piece of one part replaced, everywhere."""
    buffer = io.BytesIO()
    with zipfile.ZipFile(io.BytesIO(data)) as before, zipfile.ZipFile(buffer, "w") as after:
        for entry in before.infolist():
            content = before.read(entry)
            if entry.filename == part:
                assert old in content
                content = content.replace(old, new)
            after.writestr(entry, content, entry.compress_type)
    return buffer.getvalue()


def test_a_form_without_fixed_rows_gets_them_back(made: dict[str, Made]) -> None:
    """Saved without a window LibreOffice keeps no view: it is put into the package."""
    one = made["vaporisation"]
    form = xlsx_form(workbook_bytes(one.record, whole(one.record, {})))
    data = one.path.read_bytes()
    with zipfile.ZipFile(io.BytesIO(data)) as package:
        settings = package.read("settings.xml")
    end = b"</config:config-item-map-indexed>"
    views = settings[settings.index(b"<config:config-item-map-indexed") : settings.rindex(end) + len(end)]
    bare = changed(changed(data, views, b"", "settings.xml"), b' table:structure-protected="true"', b"")
    assert {tab.frozen for tab in odsform.ods_form(bare).tabs.values()} == {0}
    again = odsform.ods_form(odsform.finished(bare, form))
    assert {tab: own.frozen for tab, own in again.tabs.items()} == {tab: own.frozen for tab, own in form.tabs.items()}
    assert again.structure


def test_no_choice_holds_a_comma() -> None:
    """A list of choices is written with commas, so none may stand in a choice."""
    fields = [fld for name in names() for fld in load(name).fields if isinstance(fld.choices, tuple)]
    listed = [one for fld in fields for one in fld.choices]
    assert len(listed) > 50
    assert [one for one in listed if "," in one] == []


def test_a_revised_ods_becomes_an_xlsx(made: dict[str, Made], tmp_path: Path) -> None:
    """`recompute --revise` of an .ods whose constants moved writes a workbook that cites it."""
    archive, into = tmp_path / "archive", tmp_path / "out"
    archive.mkdir()
    shutil.copy(made["fuel"].filled, archive / "a.ods")
    assert main(["recompute", str(archive), "--into", str(into), "--lab", str(CORRECTED), "--revise"]) == 1
    assert [one.name for one in (into / "revised").glob("*")] == ["a.ods.xlsx"]
    revised = into / "revised" / "a.ods.xlsx"
    assert check_path(str(revised), Against()).verdict == "sound"
    assert read(revised).cells["Issue record"] != read(made["fuel"].filled).cells["Issue record"]
