"""`recompute`: an archive with new constants, what moved, and revised copies on request."""

from __future__ import annotations

import json as json_module
import os
import shutil
import sys
import tempfile
from dataclasses import replace
from datetime import UTC, datetime
from pathlib import Path
from typing import Any

from sheetcal import __version__
from sheetcal.archive.recompute import Outcome, recompute
from sheetcal.archive.rows import csv_text, table_text
from sheetcal.archive.summary import Tally
from sheetcal.archive.walk import walk
from sheetcal.errors import BadInput, Refused
from sheetcal.excel.writer import write_workbook
from sheetcal.formulas.compute import compute
from sheetcal.inputs import read_lab
from sheetcal.inputs.lab import Lab
from sheetcal.kinds.record import constants_sha256
from sheetcal.model import IssueRecord, Value
from sheetcal.verbs import Output
from sheetcal.verbs.issuing import new_id
from sheetcal.verbs.workbook import open_workbook, readings_iso

OURS = ("changes.csv", "not_recomputed.csv", "summary.txt", "summary.json", "revised")


def run(
    paths: list[str],
    into: str,
    lab: str | None = None,
    revise: bool = False,
    workers: int = 1,
    json: str | None = None,
    force: bool = False,
) -> Output:
    """Recompute all workbooks under the paths. Raises BadInput or Refused before anything is written."""
    found = walk(paths)
    target = _target(into, [*paths, *([lab] if lab else [])], force)
    if json not in (None, "-"):
        _refuse_taken(Path(str(json)), force)
    new = read_lab(lab) if lab else None
    tally = Tally(skipped=found.skipped)
    work = Path(tempfile.mkdtemp(prefix=f".{target.name}-", dir=target.parent))
    try:
        _write(work, found.files, new, tally, revise, workers)
        document = _json_text(tally.as_json(_tool(), _lab_json(new)))
        (work / "summary.json").write_text(document, "utf-8")
        lines = tally.lines(new.path if new else "their own constants")
        (work / "summary.txt").write_text("\n".join(lines) + "\n", "utf-8")
        _replace(work, target)
    finally:
        shutil.rmtree(work, ignore_errors=True)
    code = 2 if tally.unreadable else 1 if tally.moved else 0
    if json == "-":
        return Output((document.rstrip("\n"),), code)
    if json:
        _put(Path(json), document)
    return Output(tuple(lines), code)


def _target(into: str, inputs: list[str], force: bool) -> Path:
    """OUT as a path: nothing of what is read may lie in it, nor it in what is read."""
    target = Path(into)
    real = target.resolve()
    for path in inputs:
        one = Path(path).resolve()
        if real == one or one in real.parents:
            raise Refused(into, f"lies inside {path}", "a folder outside the archive", "Choose another.")
        if real in one.parents:
            raise Refused(into, f"holds {path}", "a folder of its own", "Choose another.")
    if target.exists():
        _refuse_foreign(target, force)
    if not target.parent.is_dir() or not os.access(target.parent, os.W_OK):
        raise BadInput(into, "cannot be written there", "a writable folder", "Choose another.")
    return target


def _refuse_foreign(target: Path, force: bool) -> None:
    """--force replaces a folder of ours, never one that holds anything else."""
    if not force:
        raise Refused(str(target), "exists already", "a new folder", "Choose another or use --force.")
    others = [one.name for one in target.iterdir() if one.name not in OURS] if target.is_dir() else [target.name]
    if others:
        raise Refused(str(target), f"holds {min(others)}", "a folder that recompute wrote", "Choose another.")


def _refuse_taken(target: Path, force: bool) -> None:
    if target.is_dir() or not target.parent.is_dir() or not os.access(target.parent, os.W_OK):
        raise BadInput(str(target), "cannot be written there", "a file in a writable folder", "Choose another.")
    if target.exists() and not force:
        raise Refused(str(target), "exists already", "a new name", "Choose another or use --force.")


def _put(target: Path, text: str) -> None:
    temporary = target.with_name(f".{target.name}.new")
    temporary.write_text(text, "utf-8")
    os.replace(temporary, target)


def _write(work: Path, files: tuple[str, ...], lab: Lab | None, tally: Tally, revise: bool, workers: int) -> None:
    base = _base(files)
    with (work / "changes.csv").open("w", encoding="utf-8", newline="") as stream:
        stream.write(csv_text([]))
        for number, outcome in enumerate(recompute(files, lab, workers), start=1):
            if revise and outcome.moved:
                _revise(work / "revised", outcome, lab, base)
            tally.add(outcome)
            stream.write(csv_text(outcome.rows, header=False))
            _progress(number, len(files))
    listed = table_text([("file", "reason"), *tally.not_recomputed])
    (work / "not_recomputed.csv").write_text(listed, "utf-8", newline="")


def _base(files: tuple[str, ...]) -> str:
    """The folder from which revised copies take their relative paths: the lowest that holds all files."""
    folders = [os.path.dirname(os.path.abspath(file)) for file in files]
    return os.path.commonpath(folders)


def _progress(number: int, total: int) -> None:
    if sys.stderr.isatty() and (number % 10 == 0 or number == total):
        sys.stderr.write(f"\rrecomputed {number} of {total}{'' if number < total else chr(10)}")


def _replace(work: Path, target: Path) -> None:
    """Put the finished folder in place; an older one (with --force) goes only when the new one is whole."""
    work.chmod(0o755)
    if target.exists():
        old = Path(tempfile.mkdtemp(prefix=f".{target.name}-old-", dir=target.parent))
        os.replace(target, old / target.name)
        os.replace(work, target)
        shutil.rmtree(old, ignore_errors=True)
    else:
        os.replace(work, target)


def _revise(folder: Path, outcome: Outcome, lab: Lab | None, base: str) -> None:
    """A revised copy with the new constants and a new issue id, citing the original."""
    if outcome.split:
        outcome.reason = "recomputed, not revised: its runs fall under different constants; issue it anew"
        return
    opened = open_workbook(outcome.file)
    parts = opened.parts
    record = revised_record(parts.record, outcome, opened.file.sha256, lab)
    target = folder / os.path.relpath(os.path.abspath(outcome.file), base)
    if target.suffix.lower() != ".xlsx":  # written as .xlsx whatever it was; its own name stays readable
        target = target.with_name(f"{target.name}.xlsx")
    target.parent.mkdir(parents=True, exist_ok=True)
    readings = {**readings_iso(parts), **_labels(record)}
    write_workbook(record, {**readings, **compute(parts.skeleton, record, readings)}, target)


def _labels(record: IssueRecord) -> dict[str, Value]:
    """What the front page prints of the record itself."""
    return {one: record.prefilled[one] for one in PRINTED if one in record.prefilled}


PRINTED = ("sheet.issue_id", "sheet.issued_at", "sheet.constants_id")


def revised_record(record: IssueRecord, outcome: Outcome, sha256: str, lab: Lab | None) -> IssueRecord:
    """The record with changed constants in place, new id, and what it replaces."""
    constants = tuple(
        replace(one, value=float(value))
        if isinstance(value := outcome.changed.get(f"const.{one.name}"), int | float)
        else one
        for one in record.constants
    )
    tables: dict[str, tuple[dict[str, Value], ...]] = {
        name: tuple(dict(row) for row in rows) for name, rows in record.tables.items()
    }
    for one, value in outcome.changed.items():
        if one.startswith("table."):
            _, table, rest = one.split(".", 2)
            column, _, index = rest.partition("[")
            tables[table][int(index[:-1]) - 1][column] = value
    issue_id, now = new_id(), datetime.now(UTC).strftime("%Y-%m-%dT%H:%M:%SZ")
    revised = replace(
        record,
        issue_id=issue_id,
        issued_at=now,
        tool=__version__,
        constants=constants,
        tables=tables,
        lab_name=lab.laboratory.name if lab else record.lab_name,
        lab_sha256=lab.sha256 if lab else record.lab_sha256,
        cites={
            "issue_id": record.issue_id,
            "sha256": sha256,
            "cause": "; ".join(dict.fromkeys(outcome.causes.values())),
        },
    )
    own = {"sheet.issue_id": issue_id, "sheet.issued_at": now, "sheet.constants_id": constants_sha256(revised)[:16]}
    return replace(revised, prefilled={**record.prefilled, **own})


def _tool() -> dict[str, Any]:
    return {"name": "sheetcal", "version": __version__}


def _lab_json(lab: Lab | None) -> dict[str, Any] | None:
    return None if lab is None else {"file": Path(lab.path).name, "sha256": lab.sha256}


def _json_text(document: Any) -> str:
    return json_module.dumps(document, ensure_ascii=False, indent=2, allow_nan=False) + "\n"
