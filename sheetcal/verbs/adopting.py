"""`adopt`: what a sound workbook proves becomes a dated block of the lab file, so that nobody retypes it."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, replace
from datetime import datetime, timedelta
from typing import Any

from sheetcal.check.replay import replay
from sheetcal.check.submission import Submission
from sheetcal.errors import Refused
from sheetcal.inputs import append_block, read_lab
from sheetcal.inputs.lab import Lab
from sheetcal.inputs.lab_append import block_text
from sheetcal.inputs.lab_reader import parse_lab
from sheetcal.kinds.dates import EPOCH
from sheetcal.model import Value
from sheetcal.verbs import Output
from sheetcal.verbs.checking import Against, check_path
from sheetcal.verbs.workbook import Opened, open_workbook

SMALL = 1e-3  # relative step of the certificate by which the sensitivity is found

Block = tuple[str, dict[str, Any]]


@dataclass(frozen=True)
class Proof:
    """A sound workbook with its results, who adopts it, and from when what it proves holds."""

    opened: Opened
    results: Mapping[str, Value]
    by: str
    moment: datetime

    @property
    def parts(self) -> Submission:
        """The workbook taken apart."""
        return self.opened.parts

    @property
    def issue_id(self) -> str:
        """The workbook's own id."""
        return self.parts.record.issue_id

    def number(self, one: str) -> float:
        """A result as a number. Raises Refused where it is blank."""
        return _number(self.results, one)


def run(file: str, lab: str, by: str = "", moment: datetime | None = None) -> Output:
    """Append the block. Raises Refused for a workbook that is not sound or a person who may not adopt."""
    laboratory = read_lab(lab)
    now = moment or _now(laboratory)
    _refuse_person(laboratory, by, now)
    # Also against the lab file: what stands on a certificate corrected since must be recomputed first.
    verdict = check_path(file, Against(laboratory))
    if not verdict.sound:
        do = "Run `sheetcal check`, correct, try again."
        raise Refused(file, f"verdict {verdict.verdict}", "a sound workbook", do)
    opened = open_workbook(file)
    makers: dict[str, Callable[[Proof], list[Block]]] = {
        "calibration": _calibration,
        "fuel": _aid_lots,
        "specific-heat": _cup,
    }
    maker = makers.get(opened.parts.kind.name)
    blocks = maker(Proof(opened, replay(opened.parts), by, now)) if maker else []
    if not blocks:
        raise Refused(file, "proves nothing to adopt", "a calibration, an aid-blank sample or blank runs of a cup")
    for table, values in blocks:
        _refuse_twice(laboratory, table, values)
    return Output(tuple(line for text in _append(lab, laboratory, blocks) for line in text.rstrip().splitlines()))


def _append(path: str, lab: Lab, blocks: list[Block]) -> list[str]:
    """Append all blocks or none: they are read together as a lab file before the first is written."""
    notes = [f"adopted from workbook {values['issue']}" for _, values in blocks]
    texts = [block_text(table, values, note) for (table, values), note in zip(blocks, notes, strict=True)]
    parse_lab(replace(lab.source, text="\n".join([lab.source.text, *texts])))
    return [append_block(path, table, values, note) for (table, values), note in zip(blocks, notes, strict=True)]


def _now(lab: Lab) -> datetime:
    return datetime.now(lab.zone).replace(tzinfo=None, microsecond=0)


def _refuse_person(lab: Lab, by: str, moment: datetime) -> None:
    if not by:
        return
    able = [one.id for one in lab.people_for("adopt", moment.date())]
    if by not in able:
        raise Refused(lab.path, f"{by} may not adopt", f"one of {', '.join(able) or 'nobody'}", "Ask one of them.")


def _refuse_twice(lab: Lab, table: str, values: Mapping[str, Any]) -> None:
    known: dict[str, set[tuple[str, str]]] = {
        "calibration": {(one.issue, one.vessel) for one in lab.calibrations},
        "lot": {(one.issue, one.id) for one in lab.all_lots},
        "cup": {(one.issue, one.id) for one in lab.cups},
    }
    name = values["vessel"] if table == "calibration" else values["id"]
    if (values["issue"], name) in known[table]:
        raise Refused(lab.path, f"workbook {values['issue']} was adopted already for {name}", "a new workbook")


def _calibration(proof: Proof) -> list[Block]:
    parts = proof.parts
    until = EPOCH + timedelta(days=proof.number("sheet.valid_until"))
    values = {
        "vessel": parts.readings["sheet.vessel"],
        "issue": proof.issue_id,
        "value": f"{proof.number('sheet.effective_heat_capacity_reported'):.1f} J/K",
        "n": int(proof.number("sheet.counted_runs")),
        "rsd": f"{proof.number('sheet.relative_deviation'):.3f} %",
        "certificate": parts.readings["sheet.certified_lot"],
        "sensitivity": round(_certificate_sensitivity(proof), 4),
        "rise": [f"{proof.number(f'sheet.rise_{end}_covered'):.2f} K" for end in ("low", "high")],
        "energy": [f"{proof.number(f'sheet.energy_{end}_covered'):.1f} kJ" for end in ("low", "high")],
        "technique": parts.readings.get("sheet.technique"),
        "valid_from": proof.moment,
        "valid_until": datetime(until.year, until.month, until.day, 23, 59),
        "workbook_sha256": proof.opened.file.sha256,
        "adopted_by": proof.by or None,
    }
    return [("calibration", values)]


def _certificate_sensitivity(proof: Proof) -> float:
    """Relative change of the mean heat capacity for a relative change of the certificate."""
    lot = str(proof.parts.readings["sheet.certified_lot"]).casefold()
    rows = proof.parts.record.tables["certified"]
    changed = {
        f"table.certified.value[{number}]": float(row["value"]) * (1.0 + SMALL)
        for number, row in enumerate(rows, start=1)
        if str(row["lot"]).casefold() == lot and isinstance(row["value"], int | float)
    }
    return _tried(proof, changed, "sheet.effective_heat_capacity")


def _tried(proof: Proof, changed: Mapping[str, Value], one: str) -> float:
    """Relative change of a result over SMALL, with constants changed."""
    return (_number(replay(proof.parts, changed), one) / proof.number(one) - 1.0) / SMALL


def _aid_lots(proof: Proof) -> list[Block]:
    """The heat of every sample burnt as a blank of an aid: its gross value as analysed."""
    found = []
    prefilled = proof.parts.record.prefilled
    for number in range(1, proof.parts.skeleton.shape.samples + 1):
        block = f"sample{number}"
        if prefilled.get(f"{block}.role") == "aid-blank":
            certificate, sensitivity = _standing(proof, block)
            values = {
                "id": prefilled[f"{block}.sample_id"],
                "what": "aid",
                "heat": f"{proof.number(f'{block}.gross_analysed'):.0f} J/g",
                "standing": "laboratory",
                "source": f"determined here, n = {proof.number(f'{block}.counted_runs'):.0f}",
                "issue": proof.issue_id,
                "certificate": certificate,
                "sensitivity": sensitivity,
                "valid_from": proof.moment,
            }
            found.append(("lot", values))
    return found


def _standing(proof: Proof, block: str) -> tuple[str | None, float | None]:
    """The certificate an aid's heat stands on and the heat's sensitivity; None where its vessels differ in it."""
    parts = proof.parts
    used = {
        str(parts.readings.get(one)).casefold()
        for one, place in parts.skeleton.places.items()
        if place.field.key == "run.vessel" and place.sample == block
    }
    changed: dict[str, Value] = {}
    certificates: set[str] = set()
    for number, row in enumerate(parts.record.tables["vessel"], start=1):
        old, sensitivity = row["heat_capacity"], row.get("sensitivity")
        if str(row["id"]).casefold() not in used or not isinstance(old, int | float):
            continue
        certificates.add(str(row.get("certificate") or ""))
        own = float(sensitivity) if isinstance(sensitivity, int | float) else 1.0
        changed[f"table.vessel.heat_capacity[{number}]"] = float(old) * (1.0 + own * SMALL)
    if len(certificates) != 1 or "" in certificates:
        return None, None
    return certificates.pop(), round(_tried(proof, changed, f"{block}.gross_analysed"), 4)


def _cup(proof: Proof) -> list[Block]:
    """The heat capacity of a mixing cup, where the sheet holds blank runs."""
    capacity = proof.results.get("sheet.cup_from_blanks")
    if not isinstance(capacity, int | float):
        return []
    cup = proof.parts.readings.get("sheet.cup")
    if not cup:
        raise Refused(proof.opened.path.name, "does not name its cup", "a cup of the lab file", "Fill sheet.cup.")
    values = {
        "id": cup,
        "what": "mixing cup",
        "heat_capacity": f"{capacity:.1f} J/K",
        "issue": proof.issue_id,
        "valid_from": proof.moment,
    }
    return [("cup", values)]


def _number(results: Mapping[str, Value], one: str) -> float:
    value = results.get(one)
    if not isinstance(value, int | float):
        raise Refused(one, "has no value", "a complete workbook", "Fill what is missing.")
    return float(value)
