"""The week's slips: planted in the right workbooks as people make them, then looked for by the check."""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import dataclass, field
from datetime import datetime
from pathlib import Path

from sheetcal import verbs
from sheetcal.errors import SheetcalError
from sheetcal.excel.writer import write_workbook
from sheetcal.formulas.compute import compute
from sheetcal.inputs import read_lab, read_logger
from sheetcal.model import Finding, Value, Verdict
from sheetcal.planting.package import edited, number
from sheetcal.reports.document import document
from sheetcal.reports.document import text as json_text
from sheetcal.reports.lines import lines
from sheetcal.verbs.checking import Against, check_set, tool
from sheetcal.verbs.demo_week import Week
from sheetcal.verbs.fourth import AUTO, Office
from sheetcal.verbs.second import second
from sheetcal.verbs.workbook import open_workbook, readings_iso

Slip = Mapping[str, str]
RECORD_PARTS = ("record_time", "record_temperature", "record_file", "record_vessel", "record_start")
HERE = ("workbook", "lab file", "worklist", "balance file", "earlier sheets")


@dataclass
class Planted:
    """One slip as planted: where, and what must be found there; no code where another slip line says it."""

    slip: str
    file: str
    code: str
    field: str
    needs: str
    cell: str = ""
    found: bool = False


@dataclass
class Found:
    """What the check made of the submitted workbooks."""

    planted: list[Planted]
    verdicts: dict[str, Verdict] = field(default_factory=dict)
    office: str = ""

    @property
    def witnesses(self) -> str:
        """Who spoke on the workbooks, and how LibreOffice took part."""
        names = dict.fromkeys(name for one in self.verdicts.values() for name in one.witnesses)
        return f"{', '.join(names)}; {self.office}"

    @property
    def looked_for(self) -> list[Planted]:
        """Slips that this version looks for."""
        return [one for one in self.planted if one.needs in HERE]

    @property
    def whole(self) -> bool:
        """Whether every slip looked for was found."""
        return all(one.found for one in self.looked_for)


def plant(week: Week) -> list[Planted]:
    """Write the submitted workbooks and planted.csv."""
    by_book: dict[str, list[Slip]] = {}
    for slip in week.slips:
        by_book.setdefault(slip["workbook"], []).append(slip)
    for name in week.rows:
        _submit(week, name, by_book.get(name, []))
    planted = [
        Planted(one["slip"], _file(week, one), one["code"], one["field"], one["needs"], _cell(week, one))
        for one in week.slips
        if one["code"] or one["needs"] == "recompute"
    ]
    rows = "".join(f"{one.file},{one.code or one.needs},{one.cell or one.field}\n" for one in planted)
    (week.folder / "planted.csv").write_text(f"file,code,cell\n{rows}", "utf-8")
    return planted


def _file(week: Week, slip: Slip) -> str:
    return f"submitted/{slip['workbook']}.xlsx" if slip["workbook"] in week.rows else slip["workbook"]


def _cell(week: Week, slip: Slip) -> str:
    """Where the slip was planted, as `Tab!A1`; files that are no workbook have none."""
    if slip["workbook"] not in week.rows:
        return ""
    plan = open_workbook(week.filled(slip["workbook"])).parts.skeleton
    name = slip["field"].replace(".record", ".record_time") if slip["field"].endswith(".record") else slip["field"]
    place = plan.places.get(name)
    return place.where if place else ""


def _submit(week: Week, name: str, slips: list[Slip]) -> None:
    """One workbook as it comes back: the right one, with its slips typed in."""
    if any(slip["field"] == "issued" for slip in slips):
        _issued_early(week, name, next(slip for slip in slips if slip["field"] == "issued"))
        return
    parts = open_workbook(week.filled(name)).parts
    readings = readings_iso(parts)
    for slip in slips:
        readings.update(_typed(week, slip, readings))
    values = {**readings, **compute(parts.skeleton, parts.record, readings)}
    write_workbook(parts.record, values, week.submitted(name))
    for slip in slips:
        if slip["right"] == "formula":
            place = parts.skeleton.places[slip["field"]]
            type_over(week.submitted(name), place.tab, place.cell, float(slip["typed"]))


def _issued_early(week: Week, name: str, slip: Slip) -> None:
    """The sheet was issued days before it was used, with what was in force then."""
    moment = datetime.fromisoformat(slip["typed"])
    issued = week.folder / "submitted" / f".{name}-issued.xlsx"
    then = week.lab_on(moment)
    week.issue(name, moment, issued, then)
    week.fill(name, issued, week.submitted(name))
    issued.unlink()
    then.unlink()


def _typed(week: Week, slip: Slip, readings: Mapping[str, Value | list[Value]]) -> dict[str, Value | list[Value]]:
    """The readings a slip changes."""
    name, typed = slip["field"], slip["typed"]
    if slip["right"] == "formula" or slip["field"] in ("worklist", "issued") or "tested vessel" in slip["right"]:
        return {}
    if name.endswith(".record"):
        return _record_of(week, name.partition(".")[0], typed)
    if name.endswith(".*"):
        book, _, run = typed.removesuffix(".*").rpartition(" ")
        return _copied(week, name.removesuffix(".*"), book, run)
    if typed.startswith("text "):
        return {name: typed.removeprefix("text ")}
    if not typed:
        return {name: None}
    old = readings.get(name)
    return {name: float(typed) if isinstance(old, float | int) else typed}


def _record_of(week: Week, run: str, file: str) -> dict[str, Value | list[Value]]:
    record = read_logger(week.folder / "loggers" / file)
    start = record.start.isoformat(timespec="minutes") if record.start else None
    values: tuple[Value | list[Value], ...] = (
        list(record.time), list(record.temperature), file, record.vessel, start,
    )  # fmt: skip
    return {f"{run}.{name}": value for name, value in zip(RECORD_PARTS, values, strict=True)}


def _copied(week: Week, run: str, book: str, source: str) -> dict[str, Value | list[Value]]:
    """All of a run's readings copied from an earlier workbook, but for the date."""
    earlier = readings_iso(open_workbook(week.filled(book)).parts)
    kept = (f"{source}.date", f"{source}.start", f"{source}.operator", f"{source}.record_start")
    return {
        one.replace(f"{source}.", f"{run}.", 1): value
        for one, value in earlier.items()
        if one.startswith(f"{source}.") and one not in kept
    }


def type_over(path: Path, tab: str, cell: str, value: float) -> None:
    """Put a plain number where a formula stands, as typing it does; every other byte of the workbook stays."""
    temporary = path.with_name(f".{path.name}")
    temporary.write_bytes(edited(path.read_bytes(), {f"{tab}!{cell}": number(value)}))
    temporary.replace(path)


def looked_for(week: Week, planted: list[Planted]) -> Found:
    """Check everything submitted, with the balance's file; write check.json, check.txt, tell which slips were found."""
    found = Found(planted)
    folder = week.folder / "submitted"
    office = Office(AUTO)
    against = Against(second=second(None, str(week.folder / "balance.csv")))
    files = [str(path) for path in sorted(folder.glob("[!.]*.xlsx"))]
    listed = list(check_set(files, against, office=office))
    office.close()
    found.verdicts.update({Path(one.file).stem: one for one in listed})
    found.office = office.words
    (week.folder / "check.json").write_text(json_text(document(listed, 0, tool(office.version))), "utf-8")
    texts = lines(listed, 0, office.words, True)
    (week.folder / "check.txt").write_text("\n".join(texts) + "\n", "utf-8")
    for one in planted:
        name = Path(one.file).stem
        if one.file.startswith("submitted/"):
            owners = _owners(week, name)
            one.found = any(_matches(one, finding, owners) for finding in found.verdicts[name].findings)
    _lab_slips(week, planted)
    return found


def _owners(week: Week, name: str) -> dict[str, str | None]:
    """The sample of every run block of a workbook."""
    plan = open_workbook(week.filled(name)).parts.skeleton
    return {place.id.partition(".")[0]: place.sample for place in plan.places.values()}


def _matches(one: Planted, finding: Finding, owners: Mapping[str, str | None]) -> bool:
    """The code, with a cell, in the block where the slip was made (or in a run of that sample)."""
    if finding.code != one.code or not finding.cell:
        return False
    slip, block = one.field.partition(".")[0], (finding.field or "").partition(".")[0]
    return slip in ("issued", block, owners.get(block))


def _lab_slips(week: Week, planted: list[Planted]) -> None:
    """Slips in the lab file and the worklist: the first is found on reading, the second stops the issue."""
    for one in planted:
        if one.needs == "lab file":
            text = week.lab.read_text("utf-8")
            wrong = week.folder / ".lab-H1.toml"
            head, _, tail = text.partition('lot = "BA-32"')
            wrong.write_text(
                head + 'lot = "BA-32"' + re.sub(r'mass = "in air"', 'mass = "in vacuum"', tail, count=1), "utf-8"
            )
            entry = one.field.rpartition(".")[0]
            faults = read_lab(wrong).faults()
            one.found = any(fault.code == one.code and str(fault.field).startswith(entry) for fault in faults)
            one.cell = one.field
            wrong.unlink()
        elif one.needs == "worklist":
            one.found = _refused(week)


def _refused(week: Week) -> bool:
    """Whether the issue stops on the sample with too much chlorine."""
    out = week.folder / "submitted" / ".F4.xlsx"
    slip = next(one for one in week.slips if one["field"] == "worklist")
    try:
        verbs.issue(
            "fuel", str(out), lab=str(week.lab), worklist=str(week.folder / slip["typed"]), calorimeter="CAL-A",
            moment=datetime(2025, 3, 7, 6, 40),
        )  # fmt: skip
    except SheetcalError as fault:
        return "chlorine" in str(fault)
    out.unlink(missing_ok=True)
    return False
