"""What a self-test leaves: a dated record for the assessor, the detection matrix as text, CSV and JSON."""

from __future__ import annotations

import csv
import hashlib
import io
import json
import os
import platform
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import asdict
from datetime import datetime
from importlib import metadata, resources
from pathlib import Path
from typing import Any

from sheetcal import __version__, profiles
from sheetcal.check.catalogue import ALONE, catalogue
from sheetcal.kinds.frozen import versions
from sheetcal.office.find import status
from sheetcal.verbs.selftesting import Outcome, Planted, by_code

PACKAGES = ("numpy", "openpyxl", "pint", "pyoo")
SHOWN = 3  # as many examples on the last page
STATISTICAL = "(statistical)"
UNPLANTED: Mapping[str, str] = {
    "void-without-reason": "while the sheet is filled; afterwards it is said as a missing reading",
    "version-unknown": "needs a kind newer than any that is installed",
    "formula-lost": "needs LibreOffice, which saves the old format",
    "result-disagrees": "needs a kind that is wrong in itself: readings and formulas as issued balance",
    "engines-disagree": "needs LibreOffice, and an engine that computes wrongly",
    "office-failed": "needs LibreOffice, and its failure",
}

# Limits that the invented laboratory's profile does not ask for, or that another certain finding always precedes.
NOT_HERE: Mapping[str, str] = {
    "calibration-days": "the profile asks for no number of days",
    "condition-extrapolated": "the profile takes the certificate's conditions as they are",
    "heat-capacity-slope": "needs a slope that hides behind the scatter of five runs",
    "heat-exchange": "a cooling constant that far off is said instead",
    "record-few-readings": "the bench types both temperatures of a drop",
}


def write(folder: Path, tested: Outcome, started: datetime, sizes: Mapping[str, int]) -> list[str]:
    """Write everything under one dated name; returns the last page."""
    before = _earlier(folder)
    stem = _free(folder, f"selftest-{started:%Y-%m-%d-%H%M%S}")
    record = _record(tested, started, sizes)
    record["compared_with"] = before.get("name") if before else None
    record["changes"] = changes(before, record) if before else []
    page = last_page(record, tested, stem)
    _store(folder / f"{stem}-record.json", json.dumps(record, indent=2, ensure_ascii=False) + "\n")
    _store(folder / f"{stem}-matrix.json", json.dumps(_rows(tested), indent=2, ensure_ascii=False) + "\n")
    _store(folder / f"{stem}-matrix.csv", _csv(_rows(tested)))
    _store(folder / f"{stem}-matrix.txt", "\n".join(_matrix(tested)) + "\n")
    _store(folder / f"{stem}-record.txt", "\n".join([*page, "", *_whole(record, tested)]) + "\n")
    return page


def _free(folder: Path, stem: str) -> str:
    """A name that nothing in the folder has: two tests may begin in one second."""
    number, name = 1, stem
    while any(folder.glob(f"{name}-*")):
        number += 1
        name = f"{stem}-{number}"
    return name


def _store(path: Path, text: str) -> None:
    temporary = path.with_name(f".{path.name}.new")
    temporary.write_text(text, "utf-8")
    os.replace(temporary, path)


def _earlier(folder: Path) -> dict[str, Any] | None:
    """The latest record in the folder that can be read."""
    for path in sorted(folder.glob("selftest-*-record.json"), reverse=True):
        try:
            found = json.loads(path.read_text("utf-8"))
        except (OSError, ValueError):
            continue
        if isinstance(found, dict) and isinstance(found.get("environment"), dict):
            return {**found, "name": path.name}
    return None


def _record(tested: Outcome, started: datetime, sizes: Mapping[str, int]) -> dict[str, Any]:
    cells = by_code(tested.planted)
    return {
        "date": started.strftime("%Y-%m-%dT%H:%M:%SZ"),
        "environment": environment(),
        "sizes": {**sizes, "planted": len(tested.planted), "clean workbooks": tested.clean},
        "results": figures(tested),
        "found": {f"{code} {kind}": sum(one.found for one in cells[code, kind]) for code, kind in sorted(cells)},
        "planted": {f"{code} {kind}": len(cells[code, kind]) for code, kind in sorted(cells)},
        "not_planted": dict(not_planted(tested)),
        "accused": list(tested.accused),
        "whole": tested.whole,
    }


def environment() -> dict[str, str]:
    """What a validation stands on: programs with versions, kinds and profiles with versions and hashes."""
    office = status()
    found = {"sheetcal": __version__, "Python": platform.python_version(), "system": platform.platform()}
    for name in PACKAGES:
        try:
            found[name] = metadata.version(name)
        except metadata.PackageNotFoundError:
            found[name] = "not installed"
    found["LibreOffice"] = str(office["version"]) if office.get("version") else "not found"
    for kind, version in versions():
        data = resources.files("sheetcal.kinds").joinpath("frozen", f"{kind}-{version}.json").read_bytes()
        found[f"kind {kind}"] = f"version {version}, sha256 {hashlib.sha256(data).hexdigest()}"
    for name in profiles.names():
        data = resources.files("sheetcal.profiles").joinpath(f"{name}.toml").read_bytes()
        version = profiles.load(name).version
        found[f"profile {name}"] = f"version {version}, sha256 {hashlib.sha256(data).hexdigest()}"
    return found


def figures(tested: Outcome) -> dict[str, float]:
    """The shares that are asked for, in per cent."""
    wanted = [one for one in tested.planted if one.cause_wanted]
    return {
        "faults planted": len(tested.planted),
        "codes": len({one.code for one in tested.planted}),
        "found %": _share([one.found for one in tested.planted]),
        "right cell %": _share([one.right_cell for one in tested.planted]),
        "cause rightly named %": _share([one.cause_named for one in wanted]),
        "with a recognisable cause": len(wanted),
        "clean workbooks accused": len(tested.accused),
    }


def _share(held: Sequence[bool]) -> float:
    return round(100.0 * sum(held) / len(held), 2) if held else 0.0


def not_planted(tested: Outcome) -> Iterator[tuple[str, str]]:
    """Codes that no slip of this test was planted for, each with the reason."""
    planted = {one.code for one in tested.planted}
    for one in catalogue():
        if one.code in planted or one.code.startswith("live-"):
            continue
        if STATISTICAL in one.meaning:
            yield one.code, "statistical: it has a power, and is measured over many workbooks"
        elif one.needs != ALONE and one.code not in UNPLANTED:
            yield one.code, f"needs {one.needs}"
        else:
            yield one.code, {**UNPLANTED, **NOT_HERE}.get(one.code, "no slip happens in the fresh workbooks")


def changes(before: Mapping[str, Any], now: Mapping[str, Any]) -> list[str]:
    """Why validation was due again, and what came out otherwise."""
    found = []
    for key, value in now["environment"].items():
        old = before["environment"].get(key, "absent")
        if old != value:
            found.append(f"re-validation was due: {key} was {old}, is {value}")
    for key in sorted({*before.get("planted", {}), *now["planted"]}):
        old, new = (_of(one, key) for one in (before, now))
        if old != new:
            found.append(f"{key}: {old} found before, {new} now")
    return found


def _of(record: Mapping[str, Any], key: str) -> str:
    planted = record.get("planted", {}).get(key)
    return "not planted" if planted is None else f"{record.get('found', {}).get(key, 0)} of {planted}"


def last_page(record: Mapping[str, Any], tested: Outcome, stem: str) -> list[str]:
    """About ten lines: what was tested, what came out, what follows."""
    shares, sizes, where = record["results"], record["sizes"], record["environment"]
    missed = [one for one in tested.planted if not one.found]
    lines = [
        f"Self-test of sheetcal {where['sheetcal']}, {record['date']}",
        f"Python {where['Python']}, LibreOffice {where['LibreOffice']}",
        f"{sizes['planted']} faults of {shares['codes']} codes planted in workbooks of {len(_kinds(tested))} kinds",
        f"found {shares['found %']:g} %, in the right cell {shares['right cell %']:g} %, cause rightly named "
        f"{shares['cause rightly named %']:g} % of {shares['with a recognisable cause']}",
        f"{tested.clean} clean workbooks: {len(tested.accused)} accused",
        *(f"  accused: {text}" for text in tested.accused[:SHOWN]),
        *(f"  NOT FOUND: {one.code} in {one.kind}, {one.at}: {one.slip}" for one in missed[:SHOWN]),
        f"{len(record['not_planted'])} codes were not planted here: the record says why",
    ]
    lines += _compared(record)
    verdict = "every certain fault was found" if tested.whole else "NOT everything was found: see the matrix"
    return [*lines, f"{verdict}; written: {stem}-record and -matrix"]


def _compared(record: Mapping[str, Any]) -> list[str]:
    if not record["compared_with"]:
        return ["no earlier record in the folder: this is the first"]
    changed = record["changes"]
    head = f"compared with {record['compared_with']}: {len(changed) or 'no'} changes"
    return [head, *(f"  {text[:110]}" for text in changed[:SHOWN])]


def _kinds(tested: Outcome) -> list[str]:
    return sorted({one.kind for one in tested.planted})


def _rows(tested: Outcome) -> list[dict[str, Any]]:
    """The matrix in full: a row for each fault planted."""
    return [{**asdict(one), "besides": " ".join(one.besides)} for one in tested.planted]


def _csv(rows: list[dict[str, Any]]) -> str:
    stream = io.StringIO()
    writer = csv.DictWriter(stream, list(rows[0]) if rows else [], lineterminator="\n")
    writer.writeheader()
    for row in rows:
        writer.writerow({key: _safe(value) for key, value in row.items()})
    return stream.getvalue()


def _safe(value: Any) -> Any:
    """Text that a spreadsheet would take for a formula gets a mark before it; truths are yes and no."""
    if isinstance(value, bool):
        return "yes" if value else "no"
    return f"'{value}" if isinstance(value, str) and value[:1] in tuple("=+-@\t\r") and value else value


def _matrix(tested: Outcome) -> list[str]:
    """Code by kind: found of planted; a blank where it was not planted."""
    kinds, cells = _kinds(tested), by_code(tested.planted)
    lines = [f"{'':<32}" + "".join(f"{kind:>15}" for kind in kinds)]
    for code in sorted({code for code, _ in cells}):
        counts = [cells.get((code, kind), []) for kind in kinds]
        lines.append(f"{code:<32}" + "".join(f"{_count(row):>15}" for row in counts))
    return lines


def _count(row: list[Planted]) -> str:
    return f"{sum(one.found for one in row)}/{len(row)}" if row else ""


def _whole(record: Mapping[str, Any], tested: Outcome) -> list[str]:
    """The record for the file: what it stood on, the matrix, what was missed, what was not planted."""
    lines = ["Stands on"]
    lines += [f"  {key:<28} {value}" for key, value in record["environment"].items()]
    lines += ["", "Matrix: found of planted", *_matrix(tested), "", "Not found, or not in the right cell"]
    lines += [f"  {one.code}  {one.kind}  {one.at}  {one.slip}" for one in tested.planted if one.missed] or ["  none"]
    lines += ["", "Cause not named, or another one"]
    unnamed = [one for one in tested.planted if one.cause_wanted and not one.cause_named]
    lines += [f"  {one.code}  {one.kind}  {one.at}  {one.slip}: {one.cause or 'none'}" for one in unnamed] or ["  none"]
    lines += ["", "Not planted", *(f"  {code:<28} {why}" for code, why in record["not_planted"].items())]
    return [*lines, "", "Changes", *(f"  {text}" for text in record["changes"])]
