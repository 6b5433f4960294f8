"""What a sound workbook proves becomes a dated block of the lab file, so that nobody retypes it."""

from __future__ import annotations

from datetime import datetime
from pathlib import Path
from typing import Any

import pytest
from verbs_case import COAL, CONTROL, filled, lab_file, record_of, written

from sheetcal import bench
from sheetcal.errors import BadInputs, Refused, SheetcalError
from sheetcal.inputs import read_lab
from sheetcal.verbs.adopting import run
from sheetcal.verbs.workbook import open_workbook, results

ADOPTED = datetime(2025, 3, 10, 9, 30)
AID = {"sample_id": "SO-2", "role": "aid-blank", "fuel_class": "liquid"}


@pytest.fixture
def lab(tmp_path: Path) -> Path:
    return lab_file(tmp_path)


def calibration(folder: Path, lab: Path, **changed: Any) -> Path:
    return filled(record_of("calibration", folder, lab=lab), folder / "cal.xlsx", **changed)


def test_a_calibration_becomes_a_dated_block(lab: Path, tmp_path: Path) -> None:
    """Vessel, value, n, scatter, ranges, validity, id and hash stand in the block; the old text stays byte for byte."""
    book = calibration(tmp_path, lab)
    before = lab.read_bytes()
    output = run(str(book), str(lab), "HT", ADOPTED)
    assert lab.read_bytes().startswith(before)
    one = read_lab(lab).calibrations[-1]
    opened = open_workbook(book)
    values = results(opened.parts)
    assert one.value == pytest.approx(values["sheet.effective_heat_capacity_reported"], abs=1e-9)
    assert (one.vessel, one.issue, one.n) == (opened.parts.readings["sheet.vessel"], opened.parts.record.issue_id, 5)
    assert one.rsd == pytest.approx(values["sheet.relative_deviation"], abs=0.0006)
    assert (one.valid_from, one.adopted_by, one.certificate) == (
        ADOPTED,
        "HT",
        opened.parts.readings["sheet.certified_lot"],
    )
    assert one.valid_until > ADOPTED and one.workbook_sha256 == opened.file.sha256
    assert (
        one.rise is not None and one.rise[0] < one.rise[1] and one.energy is not None and one.energy[0] < one.energy[1]
    )
    assert 0.99 < one.sensitivity < 1.0
    assert "[[calibration]]" in output.lines and "\n".join(output.lines) in lab.read_text("utf-8")


def test_the_sensitivity_is_the_share_of_the_certificate(lab: Path, tmp_path: Path) -> None:
    """Q (1 + x) + extras over Q + extras: the sensitivity is the certificate's share of all heat."""
    book = calibration(tmp_path, lab)
    run(str(book), str(lab), "HT", ADOPTED)
    values = results(open_workbook(book).parts)
    runs = [f"run{n}" for n in range(1, 6)]
    shares = []
    for one in runs:
        total = values[f"{one}.effective_heat_capacity"] * values[f"{one}.corrected_rise"]  # type: ignore[operator]
        extras = sum(
            float(values[f"{one}.{name}"]) for name in ("wire_heat", "thread_heat", "ignition_heat", "nitric_heat")
        )  # type: ignore[arg-type]
        shares.append(1.0 - extras / total)
    assert read_lab(lab).calibrations[-1].sensitivity == pytest.approx(sum(shares) / 5, abs=2e-4)


def test_an_aid_lot_is_found_by_burning_it_alone(lab: Path, tmp_path: Path) -> None:
    """A sample of role aid-blank gives a lot with its heat, its certificate and a sensitivity just above 1."""
    book = filled(record_of("fuel", tmp_path, [CONTROL, AID], lab=lab), tmp_path / "aid.xlsx")
    run(str(book), str(lab), "HT", ADOPTED)
    lot = read_lab(lab).all_lots[-1]
    values = results(open_workbook(book).parts)
    assert lot.id == "SO-2" and lot.what == "aid" and lot.issue == open_workbook(book).parts.record.issue_id
    assert lot.heat == (pytest.approx(values["sample2.gross_analysed"], abs=0.5), "J/g")
    assert lot.certificate == "BA-31" and lot.sensitivity == pytest.approx(1.0, abs=0.01)


@pytest.mark.parametrize("state", ["planned", "scatter"])
def test_a_workbook_that_is_not_sound_is_refused(lab: Path, tmp_path: Path, state: str) -> None:
    """Incomplete or rejected: nothing is written."""
    record = record_of("calibration", tmp_path, lab=lab)
    readings = bench.fill(record, 1)
    if state == "planned":
        readings = {one: value for one, value in readings.items() if not one.startswith("run5.")}
    else:
        readings["run2.crucible_gross"] = float(readings["run2.crucible_gross"]) + 0.05
    book = written(record, readings, tmp_path / "cal.xlsx")
    before = lab.read_bytes()
    with pytest.raises(Refused, match="incomplete" if state == "planned" else "reject"):
        run(str(book), str(lab), "HT", ADOPTED)
    assert lab.read_bytes() == before


@pytest.mark.parametrize("by", ["JO", "MR", "nobody"])
def test_a_person_without_authority_is_refused(lab: Path, tmp_path: Path, by: str) -> None:
    """Only people the lab file lets adopt may; the line names them."""
    book = calibration(tmp_path, lab)
    before = lab.read_bytes()
    with pytest.raises(Refused, match=f"{by} may not adopt; expected one of HT"):
        run(str(book), str(lab), by, ADOPTED)
    assert lab.read_bytes() == before


def test_the_same_workbook_is_adopted_once(lab: Path, tmp_path: Path) -> None:
    """Twice is refused, for calibrations and for lots."""
    for book in (
        calibration(tmp_path, lab),
        filled(record_of("fuel", tmp_path, [CONTROL, AID], lab=lab), tmp_path / "aid.xlsx"),
    ):
        run(str(book), str(lab), "HT", ADOPTED)
        after = lab.read_bytes()
        with pytest.raises(Refused, match="adopted already"):
            run(str(book), str(lab), "HT", ADOPTED)
        assert lab.read_bytes() == after


def test_what_stands_on_a_corrected_certificate_is_refused(lab: Path, tmp_path: Path) -> None:
    """The lab file states another certificate than the workbook used: recompute first."""
    book = calibration(tmp_path, lab)
    lab.write_text(lab.read_text("utf-8").replace("26436 J/g", "26429 J/g"), "utf-8")
    with pytest.raises(Refused, match="expected a sound workbook"):
        run(str(book), str(lab), "HT", ADOPTED)


def test_a_workbook_that_proves_nothing_is_refused(lab: Path, tmp_path: Path) -> None:
    """A sound fuel workbook of samples only has nothing to adopt."""
    book = filled(record_of("fuel", tmp_path, [CONTROL, COAL], lab=lab), tmp_path / "coal.xlsx")
    with pytest.raises(Refused, match="proves nothing to adopt"):
        run(str(book), str(lab), "HT", ADOPTED)


def test_a_vessel_the_lab_file_does_not_know_is_refused(lab: Path, tmp_path: Path) -> None:
    """What would not read as a lab file is not written."""
    book = calibration(tmp_path, lab)
    text = lab.read_text("utf-8")
    for old, new in (("A1", "X1"), ("A2", "X2")):
        text = text.replace(f'id = "{old}"\ncal', f'id = "{new}"\ncal').replace(
            f'vessel = "{old}"', f'vessel = "{new}"'
        )
    lab.write_text(text, "utf-8")
    before = lab.read_bytes()
    with pytest.raises(BadInputs):
        run(str(book), str(lab), "HT", ADOPTED)
    assert lab.read_bytes() == before


def test_a_file_that_is_no_workbook_is_refused(lab: Path, tmp_path: Path) -> None:
    """One line, nothing written."""
    (tmp_path / "page.xlsx").write_bytes(b"%PDF-1.7")
    before = lab.read_bytes()
    with pytest.raises(SheetcalError):
        run(str(tmp_path / "page.xlsx"), str(lab), "HT", ADOPTED)
    assert lab.read_bytes() == before
