"""`recompute`: an archive with new constants, what moved, and revised copies on request."""

from __future__ import annotations

import json as json_module
import os
import shutil
import sys
import tempfile
from dataclasses import replace
from pathlib import Path
from typing import Any

from sheetcal import __version__
from sheetcal.archive.recompute import Outcome, recompute
from sheetcal.archive.rows import csv_cell, csv_text
from sheetcal.archive.summary import Tally
from sheetcal.archive.walk import walk
from sheetcal.errors import BadInput, Refused
from sheetcal.excel.writer import write_workbook
from sheetcal.formulas.compute import compute
from sheetcal.inputs import read_lab
from sheetcal.inputs.lab import Lab
from sheetcal.model import IssueRecord, Value
from sheetcal.verbs import Output
from sheetcal.verbs.issuing import new_id
from sheetcal.verbs.workbook import open_workbook, readings_iso


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
    target = _target(into, paths, force)
    found = walk(paths)
    new = read_lab(lab) if lab else None
    tally = Tally(skipped=found.skipped)
    work = Path(tempfile.mkdtemp(prefix=f".{target.name}-", dir=target.parent))
    try:
        _write(work, found.files, new, tally, revise, workers, paths)
        document = tally.as_json(_tool(), _lab_json(new))
        (work / "summary.json").write_text(_json_text(document), "utf-8")
        lines = tally.lines(new.path if new else "their own constants")
        (work / "summary.txt").write_text("\n".join(lines) + "\n", "utf-8")
        _replace(work, target)
    finally:
        shutil.rmtree(work, ignore_errors=True)
    code = 2 if tally.unreadable else 1 if tally.moved else 0
    if json == "-":
        return Output((_json_text(document).rstrip("\n"),), code)
    if json:
        Path(json).write_text(_json_text(document), "utf-8")
    return Output(tuple(lines), code)


def _target(into: str, paths: list[str], force: bool) -> Path:
    target = Path(into)
    real = target.resolve()
    for path in paths:
        if real == Path(path).resolve() or Path(path).resolve() in real.parents:
            raise Refused(into, f"lies inside {path}", "a folder outside the archive", "Choose another.")
    if target.exists() and not force:
        raise Refused(into, "exists already", "a new folder", "Choose another or use --force.")
    if not target.parent.is_dir() or not os.access(target.parent, os.W_OK):
        raise BadInput(into, "cannot be written there", "a writable folder", "Choose another.")
    return target


def _write(
    work: Path,
    files: tuple[str, ...],
    lab: Lab | None,
    tally: Tally,
    revise: bool,
    workers: int,
    paths: list[str],
) -> None:
    with (work / "changes.csv").open("w", encoding="utf-8", newline="") as stream:
        stream.write(csv_text([]))
        for number, outcome in enumerate(recompute(files, lab, workers), start=1):
            tally.add(outcome)
            stream.write(csv_text(outcome.rows, header=False))
            if revise and any(row.moved for row in outcome.rows):
                _revise(work / "revised", outcome, lab, paths)
            _progress(number, len(files))
    with (work / "not_recomputed.csv").open("w", encoding="utf-8", newline="") as stream:
        stream.write("file,reason\n")
        for file, reason in tally.not_recomputed:
            stream.write(f"{_quoted(file)},{_quoted(reason)}\n")


def _quoted(text: str) -> str:
    safe = csv_cell(text).replace('"', '""')
    return f'"{safe}"' if any(c in safe for c in ',"\n') else safe


def _progress(number: int, total: int) -> None:
    if sys.stderr.isatty() and (number % 10 == 0 or number == total):
        sys.stderr.write(f"\rrecomputed {number} of {total}{'' if number < total else chr(10)}")


def _replace(work: Path, target: Path) -> None:
    """Put the finished folder in place; an older one (with --force) goes only when the new one is whole."""
    if target.exists():
        old = Path(tempfile.mkdtemp(prefix=f".{target.name}-old-", dir=target.parent))
        os.replace(target, old / target.name)
        os.replace(work, target)
        shutil.rmtree(old, ignore_errors=True)
    else:
        os.replace(work, target)
    target.chmod(0o755)


def _revise(folder: Path, outcome: Outcome, lab: Lab | None, paths: list[str]) -> None:
    """A revised copy with the new constants and a new issue id, citing the original."""
    opened = open_workbook(outcome.file)
    parts = opened.parts
    record = revised_record(parts.record, outcome, opened.file.sha256, lab)
    target = folder / _relative(outcome.file, paths)
    target = target.with_suffix(".xlsx")
    target.parent.mkdir(parents=True, exist_ok=True)
    readings = {**readings_iso(parts), "sheet.issue_id": record.issue_id}
    write_workbook(record, {**readings, **compute(parts.skeleton, record, readings)}, target)


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
    issue_id = new_id()
    return replace(
        record,
        issue_id=issue_id,
        constants=constants,
        tables=tables,
        prefilled={**record.prefilled, "sheet.issue_id": issue_id},
        lab_sha256=lab.sha256 if lab else record.lab_sha256,
        cites={
            "issue_id": record.issue_id,
            "sha256": sha256,
            "cause": "; ".join(dict.fromkeys(outcome.causes.values())),
        },
    )


def _relative(file: str, paths: list[str]) -> Path:
    for path in paths:
        base = Path(path)
        if base.is_dir() and base in Path(file).parents:
            return Path(file).relative_to(base)
    return Path(Path(file).name)


def _tool() -> dict[str, Any]:
    return {"name": "sheetcal", "version": __version__}


def _lab_json(lab: Lab | None) -> dict[str, Any] | None:
    return None if lab is None else {"file": Path(lab.path).name, "sha256": lab.sha256}


def _json_text(document: Any) -> str:
    return json_module.dumps(document, ensure_ascii=False, indent=2, allow_nan=False) + "\n"
