"""Clean workbooks: issued by the demonstration laboratory, filled by the bench, right in every cell."""

from __future__ import annotations

import subprocess
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass, replace
from datetime import datetime
from functools import cache
from pathlib import Path

from sheetcal.bench import cases_of, class_of, fill
from sheetcal.excel.writer import write_workbook
from sheetcal.formulas.compute import compute
from sheetcal.inputs import read_lab, read_worklist
from sheetcal.inputs.lab import Lab
from sheetcal.kinds import load, skeleton
from sheetcal.model import Finding, IssueRecord, Verdict
from sheetcal.verbs.checking import Against, check_path
from sheetcal.verbs.issuing import Order, build

DEMO = Path(__file__).parents[2] / "workbooks" / "demo"
MONDAY = datetime(2025, 3, 3, 6, 30)
KINDS = ("fuel", "calibration", "specific-heat", "vaporisation", "heat-balance")
CLASSES = ("coal", "biomass", "coke", "recovered", "sludge", "liquid", "waste")
EVERYTHING = (*KINDS, "release", "adopt", "amend", "analysis")
SAVED = ("ours", "xlsx", "ods")
MANY = 10
TOGETHER = 60  # files in one call of LibreOffice


@cache
def lab() -> Lab:
    """The demonstration laboratory."""
    return read_lab(DEMO / "lab.toml")


@cache
def lab_of_one() -> Lab:
    """The same laboratory run by people who may do everything, as in a laboratory of one."""
    return replace(lab(), people=tuple(replace(one, may=EVERYTHING, valid_until=None) for one in lab().people))


def record_of(kind: str, folder: Path, fuel_class: str, calorimeter: str, own: Lab | None = None) -> IssueRecord:
    """An issue record: a control and one sample, with one reserve place each, for a fuel workbook."""
    own = own or lab()
    if kind != "fuel":
        name = calorimeter if kind == "calibration" else None
        return build(Order(kind, lab=own, calorimeter=name, moment=MONDAY))
    lines = ["sample_id,role,fuel_class", "BA-31,control,", f"S-1,sample,{fuel_class}"]
    worklist = folder / "worklist.csv"
    worklist.write_text("\n".join(lines) + "\n", "utf-8")
    rows = read_worklist(worklist)
    return build(Order(kind, lab=own, worklist=rows, spare=1, calorimeter=calorimeter, moment=MONDAY))


def write(record: IssueRecord, seed: int, case: str | None, path: Path) -> None:
    """The workbook as a technician would send it in."""
    plan = skeleton(load(record.kind, record.kind_version), record.shape)
    readings = {**record.prefilled, **fill(record, seed, case)}
    write_workbook(record, {**readings, **compute(plan, record, readings)}, path)


@dataclass(frozen=True)
class Clean:
    """One clean workbook: its kind, and the honest case it shows, if any."""

    name: str
    kind: str
    case: str = ""
    again: bool = True


def build_all(folder: Path, number: int, again: int) -> list[Clean]:
    """`number` ordinary workbooks of each kind, `again` of them to be saved again, and one of every honest case."""
    found = []
    for kind in KINDS:
        for seed in range(number):
            one = Clean(f"{kind}-{seed:03d}", kind, again=seed < again)
            calorimeter = "CAL-B" if seed % 3 == 2 else "CAL-A"
            record = record_of(kind, folder, CLASSES[seed % len(CLASSES)], calorimeter)
            write(record, seed, None, folder / f"{one.name}.xlsx")
            found.append(one)
        for place, case in enumerate(cases_of(kind)):
            # Every case that any kind shows is among those of fuel; the other kinds follow in a full run.
            one = Clean(f"{kind}-{case.replace(' ', '_')}", kind, case, kind == "fuel" or again >= MANY)
            own = lab_of_one() if case == "one person" else lab()
            record = record_of(kind, folder, class_of(case) or "coal", "CAL-A", own)
            write(record, 1000 + place, case, folder / f"{one.name}.xlsx")
            found.append(one)
    (folder / "worklist.csv").unlink()
    return found


def save_again(files: list[Path], folder: Path) -> None:
    """Both forms at once: a LibreOffice of its own for each, with a user folder of its own."""

    def run(form: str) -> None:
        (folder / form).mkdir()
        user = f"-env:UserInstallation={(folder / f'user-{form}').as_uri()}"
        for first in range(0, len(files), TOGETHER):
            names = [str(one) for one in files[first : first + TOGETHER]]
            command = ["soffice", user, "--headless", "--convert-to", form, "--outdir", str(folder / form), *names]
            subprocess.run(command, check=True, capture_output=True, timeout=600)

    with ThreadPoolExecutor(len(SAVED) - 1) as pool:
        list(pool.map(run, SAVED[1:]))


def verdict_of(path: Path) -> Verdict:
    """What the checker says of a file."""
    return check_path(str(path), Against())


def faults(verdict: Verdict) -> list[Finding]:
    """Findings that say that something is wrong."""
    return [one for one in verdict.findings if one.sort == "fault"]


def told(listed: list[Finding]) -> list[str]:
    """Findings in a form that a failing test can show."""
    return [f"{one.code} {one.field} found {one.found}: {one.message}" for one in listed]
