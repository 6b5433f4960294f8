"""`adopt`: what a sound workbook proves becomes a dated block of the lab file, so that nobody retypes it."""

from __future__ import annotations

from collections.abc import Mapping
from datetime import datetime, timedelta
from typing import Any

from sheetcal.check.replay import replay
from sheetcal.check.submission import Submission
from sheetcal.errors import Refused
from sheetcal.inputs import append_block, read_lab
from sheetcal.inputs.lab import Lab
from sheetcal.kinds.dates import EPOCH
from sheetcal.model import Value
from sheetcal.verbs import Output
from sheetcal.verbs.checking import Against, check_path
from sheetcal.verbs.workbook import Opened, open_workbook

SMALL = 1e-3  # relative step of the certificate by which the sensitivity is found


def run(file: str, lab: str, by: str = "", moment: datetime | None = None) -> Output:
    """Append the block. Raises Refused for a workbook that is not sound or a person who may not adopt."""
    laboratory = read_lab(lab)
    _refuse_person(laboratory, by, moment)
    verdict = check_path(file, Against())
    if not verdict.sound:
        raise Refused(
            file, f"verdict {verdict.verdict}", "a sound workbook", "Run `sheetcal check`, correct, try again."
        )
    opened = open_workbook(file)
    results = replay(opened.parts)
    makers = {"calibration": _calibration, "fuel": _aid_lots, "specific-heat": _cup}
    maker = makers.get(opened.parts.kind.name)
    blocks = maker(opened, results, by, moment or _now(laboratory)) if maker else []
    if not blocks:
        raise Refused(file, "proves nothing to adopt", "a calibration, an aid-blank sample or blank runs of a cup")
    note = f"adopted from workbook {opened.parts.record.issue_id}"
    texts = []
    for table, values in blocks:
        _refuse_twice(laboratory, table, values)
        texts.append(append_block(lab, table, values, note))
    return Output(tuple(line for text in texts for line in text.rstrip().splitlines()))


def _now(lab: Lab) -> datetime:
    return datetime.now(lab.zone).replace(tzinfo=None, microsecond=0)


def _refuse_person(lab: Lab, by: str, moment: datetime | None) -> None:
    if not by:
        return
    able = [one.id for one in lab.people_for("adopt", (moment or _now(lab)).date())]
    if by not in able:
        raise Refused(lab.path, f"{by} may not adopt", f"one of {', '.join(able) or 'nobody'}", "Ask one of them.")


def _refuse_twice(lab: Lab, table: str, values: Mapping[str, Any]) -> None:
    if table == "calibration" and any(
        one.issue == values["issue"] and one.vessel == values["vessel"] for one in lab.calibrations
    ):
        raise Refused(lab.path, f"workbook {values['issue']} was adopted already", "a new calibration")


def _calibration(
    opened: Opened, results: Mapping[str, Value], by: str, moment: datetime
) -> list[tuple[str, dict[str, Any]]]:
    parts = opened.parts
    until = EPOCH + timedelta(days=_number(results, "sheet.valid_until"))
    values = {
        "vessel": parts.readings["sheet.vessel"],
        "issue": parts.record.issue_id,
        "value": f"{_number(results, 'sheet.effective_heat_capacity_reported'):.1f} J/K",
        "n": int(_number(results, "sheet.counted_runs")),
        "rsd": f"{_number(results, 'sheet.relative_deviation'):.3f} %",
        "certificate": parts.readings["sheet.certified_lot"],
        "sensitivity": round(_sensitivity(parts, results), 4),
        "rise": [f"{_number(results, f'sheet.rise_{end}_covered'):.2f} K" for end in ("low", "high")],
        "energy": [f"{_number(results, f'sheet.energy_{end}_covered'):.1f} kJ" for end in ("low", "high")],
        "technique": parts.readings.get("sheet.technique"),
        "valid_from": moment,
        "valid_until": datetime(until.year, until.month, until.day, 23, 59),
        "workbook_sha256": opened.file.sha256,
        "adopted_by": by or None,
    }
    return [("calibration", values)]


def _sensitivity(parts: Submission, results: Mapping[str, Value]) -> float:
    """Relative change of the mean for a relative change of the certificate, found by trying a small one."""
    lot = str(parts.readings["sheet.certified_lot"]).lower()
    rows = parts.record.tables["certified"]
    number = next(place for place, row in enumerate(rows, start=1) if str(row["lot"]).lower() == lot)
    value = rows[number - 1]["value"]
    assert isinstance(value, int | float)
    changed = replay(parts, {f"table.certified.value[{number}]": float(value) * (1.0 + SMALL)})
    mean = _number(results, "sheet.effective_heat_capacity")
    return (_number(changed, "sheet.effective_heat_capacity") / mean - 1.0) / SMALL


def _aid_lots(
    opened: Opened, results: Mapping[str, Value], by: str, moment: datetime
) -> list[tuple[str, dict[str, Any]]]:
    """The heat of every sample burnt as a blank of an aid: its gross value as analysed."""
    parts = opened.parts
    found = []
    for number in range(1, parts.skeleton.shape.samples + 1):
        if parts.record.prefilled.get(f"sample{number}.role") != "aid-blank":
            continue
        heat = _number(results, f"sample{number}.gross_analysed")
        certificates = {str(row["certificate"]) for row in parts.record.tables["vessel"] if row["certificate"]}
        values = {
            "id": parts.record.prefilled[f"sample{number}.sample_id"],
            "what": "aid",
            "heat": f"{heat:.0f} J/g",
            "standing": "laboratory",
            "issue": parts.record.issue_id,
            "certificate": certificates.pop() if len(certificates) == 1 else None,
            "sensitivity": 1.0 if len(certificates) == 0 else None,
            "valid_from": moment,
        }
        found.append(("lot", values))
    return found


def _cup(opened: Opened, results: Mapping[str, Value], by: str, moment: datetime) -> list[tuple[str, dict[str, Any]]]:
    """The heat capacity of a mixing cup, where the sheet holds blank runs."""
    capacity = results.get("sheet.vessel_heat_capacity_found")
    cup = opened.parts.readings.get("sheet.cup")
    if not isinstance(capacity, int | float) or not cup:
        return []
    values = {
        "id": cup,
        "what": "mixing cup",
        "heat_capacity": f"{capacity:.1f} J/K",
        "issue": opened.parts.record.issue_id,
        "valid_from": moment,
    }
    return [("cup", values)]


def _number(results: Mapping[str, Value], one: str) -> float:
    value = results.get(one)
    if not isinstance(value, int | float):
        raise Refused(one, "has no value", "a complete workbook", "Fill what is missing.")
    return float(value)
