"""One function per command: the one place that joins excel, check, office and reports; also the Python API.

Every function returns an `Output`: the lines for standard output and the exit code.
"""

from __future__ import annotations

import sys
from dataclasses import dataclass
from datetime import datetime
from pathlib import Path
from typing import Any

from sheetcal.errors import BadInput, Refused, SheetcalError


@dataclass(frozen=True)
class Output:
    """What a command says on standard output, and its exit code."""

    lines: tuple[str, ...] = ()
    code: int = 0


def _json(document: Any) -> Output:
    from sheetcal.reports.document import spelled

    return Output((spelled(document),))


def kinds(json: bool = False) -> Output:  # named after the option
    """The kinds of worksheet."""
    from sheetcal.kinds import load, names

    listed = [load(name) for name in names()]
    if json:
        return _json(
            [
                {
                    "kind": one.name,
                    "version": one.version,
                    "title": one.title,
                    "scopes": list(one.scopes),
                    "witnesses": ["typed", "formula", "balance", "office"],
                }
                for one in listed
            ]
        )
    return Output(tuple(f"{one.name:<16} {one.version}  {one.purpose}" for one in listed))


def cells(name: str | None = None, json: bool = False) -> Output:
    """The cell functions, or one of them."""
    from sheetcal.cells import registry
    from sheetcal.formulas.translate import formula_template

    def described(one: str) -> dict[str, Any]:
        return {**registry.describe(one), "formula": "=" + formula_template(one)}

    if name is None:
        every = registry.all()
        if json:
            return _json([described(one.name) for one in every])
        return Output(tuple(f"{one.name:<34} {one.unit or 'text':<10} {one.doc.splitlines()[0]}" for one in every))
    try:
        one = described(name.upper())
    except KeyError:
        nearest = ", ".join(registry.nearest(name))
        raise BadInput(f"cells {name}", "no such cell function", nearest, "See `sheetcal cells`.") from None
    return _json(one) if json else Output(tuple(_cell_page(one)))


def _cell_page(one: dict[str, Any]) -> list[str]:
    """The documentation page of one cell function."""
    lines = [one["name"], "  " + one["result"], "", f"  result    {one['unit'] or 'text'}"]
    for arg in one["args"]:
        low = "" if arg["low"] is None else f"{arg['low']:g}"
        high = "" if arg["high"] is None else f"{arg['high']:g}"
        valid = f"  {low} to {high}" if low or high else ""
        series = "  series" if arg["series"] else ""
        lines.append(f"  {arg['name']:<24} {arg['unit'] or 'text'}{valid}{series}")
    lines += ["", f"  equation  {one['equation']}", f"  source    {one['source']} ({one['standing']})"]
    return [*lines, f"  formula   {one['formula']}"]


def calc(name: str, arguments: list[str], to: str | None = None) -> Output:
    """One cell function from values with units."""
    from sheetcal.verbs.calculating import calculate

    return Output((calculate(name, arguments, to),))


def issue(
    kind: str,
    out: str,
    lab: str | None = None,
    worklist: str | None = None,
    samples: int | None = None,
    runs: int | None = None,
    spare: int | None = None,
    bodies: int | None = None,
    calorimeter: str | None = None,
    profile: str | None = None,
    unit: str | None = None,
    paper: str = "A4",
    job: str = "",
    register: str | None = None,
    format: str | None = None,  # named after the option
    force: bool = False,
    moment: datetime | None = None,
) -> Output:
    """Issue a workbook. `moment` (local time) stands for now where a week is played through."""
    from sheetcal.formulas.compute import compute
    from sheetcal.inputs import read_lab, read_worklist
    from sheetcal.kinds import load, skeleton
    from sheetcal.verbs import issuing, outputs

    outputs.refuse_contradiction(out, format)
    target = output_path(out, force, outputs.FORMATS)
    if worklist and samples is not None:
        raise BadInput("issue", "--worklist and --samples", "one of them", "Leave one out.")
    read = read_lab(lab) if lab else None
    if read is not None:
        _refuse_faulty(read.faults())
    order = issuing.Order(
        kind, read, read_worklist(worklist) if worklist else None, samples, runs, spare, bodies, calorimeter,
        profile, unit, paper, job, moment,
    )  # fmt: skip
    issuing.refuse_foreign(order, load(kind))
    record = issuing.build(order)
    issuing.refuse_chlorine(record)
    plan = skeleton(load(record.kind, record.kind_version), record.shape)
    outputs.refuse_unwritable(target)
    if register:
        from sheetcal.archive.register import note_issue

        note_issue(Path(register), record)
    outputs.write(record, {**record.prefilled, **compute(plan, record, {})}, target, force)
    return Output((f"issued {out}  {kind} {record.kind_version}  id {record.issue_id}  {_size(record.shape)}",))


def _refuse_faulty(faults: Any) -> None:
    """A lab file whose values cannot be right issues nothing."""
    from sheetcal.errors import BadInputs

    if faults:
        raise BadInputs([BadInput(*_split(fault.message)) for fault in faults])


def _split(message: str) -> tuple[str, str]:
    where, _, what = message.partition(": ")
    return where, what


def _size(shape: Any) -> str:
    parts = []
    if shape.samples:
        parts.append(f"{shape.samples} samples")
    if shape.runs:
        parts.append(f"{shape.runs * max(1, shape.samples)} runs")
    if shape.bodies:
        parts.append(f"{shape.bodies} bodies")
    return ", ".join(parts)


def output_path(out: str, force: bool, suffixes: tuple[str, ...] = (".xlsx",)) -> Path:
    """The output as a path. Raises BadInput or Refused before anything is done."""
    target = Path(out)
    if target.suffix.lower() not in suffixes:
        raise BadInput(
            out, f"ends in '{target.suffix}'" if target.suffix else "has no ending", " or ".join(suffixes), "Rename it."
        )
    if target.is_dir():
        raise BadInput(out, "is a folder", "a file", "Name a file.")
    if target.exists() and not force:
        raise Refused(out, "exists already", "a new name", "Choose another or use --force.")
    if not target.parent.is_dir():
        raise BadInput(out, "its folder does not exist", "an existing folder", "Make it first.")
    return target


def fields(file: str, json: bool = False) -> Output:
    """Every field of a workbook, in workbook order."""
    from sheetcal.verbs.listing import field_rows, field_text
    from sheetcal.verbs.workbook import open_workbook

    rows = field_rows(open_workbook(file).parts)
    return _json(rows) if json else Output(tuple(field_text(row) for row in rows))


def fill(
    file: str,
    data: str | None = None,
    log: list[str] | None = None,
    log_time: str | None = None,
    allow_out_of_range: bool = False,
    amend: bool = False,
    reason: str = "",
    out: str = "",
    force: bool = False,
) -> Output:
    """Fill readings into a new workbook with the same issue id."""
    from sheetcal.verbs.filling import Wish, run
    from sheetcal.verbs.outputs import FORMATS

    target = output_path(out, force, FORMATS)
    if target.exists() and Path(file).exists() and target.samefile(file):
        raise Refused(out, "is the workbook that is filled", "a new name", "Choose another.")
    wish = Wish(data, tuple(log or ()), log_time, allow_out_of_range, amend, reason)
    return Output((f"filled {out}  {run(file, wish, target, force)}",))


def note(text: str) -> None:
    """A message for people, on standard error."""
    sys.stderr.write(f"{text}\n")


def check(
    paths: list[str],
    json: str | None = None,
    lab: str | None = None,
    register: str | None = None,
    workers: int = 1,
    office: str = "never",
    show_all: bool = False,
    force: bool = False,
    history: str | None = None,
    instrument_log: str | None = None,
) -> Output:
    """Check workbooks; the verdict decides the exit code. `office`: never, auto (the command's) or always."""
    from sheetcal.verbs.checking import run

    return run(paths, json, lab, register, workers, office, show_all, force, history, instrument_log)


def faults(json: bool = False) -> Output:
    """Every code a verdict can carry: what it means, where it occurs, what is needed to look for it."""
    from dataclasses import asdict

    from sheetcal.check.catalogue import ALONE, catalogue
    from sheetcal.kinds import names

    listed, every = catalogue(), tuple(names())
    if json:
        return _json([asdict(one) for one in listed])
    lines = []
    for one in listed:
        needs = "" if one.needs == ALONE else f" [needs {one.needs}]"
        kinds = "every kind" if one.kinds == every else ", ".join(one.kinds)
        lines.append(f"{one.code:<28} {one.meaning} ({kinds}){needs}")
    return Output(tuple(lines))


def selftest(into: str, places: int = 5, workers: int = 2) -> Output:
    """Plant every certain fault in fresh workbooks of every kind, check them, write the laboratory's record of it."""
    from sheetcal.verbs.selftesting import run

    return run(into, places, workers=workers)


def explain(file: str, result: str, json: bool = False) -> Output:
    """Follow one result down to readings and constants."""
    from sheetcal.verbs.explaining import Explainer, tree_lines
    from sheetcal.verbs.workbook import open_workbook

    tree = Explainer(open_workbook(file).parts).explain(result)
    return _json(tree.as_json()) if json else Output(tuple(tree_lines(tree)))


def adopt(file: str, lab: str, by: str = "") -> Output:
    """Append what a sound workbook proves to the lab file."""
    from sheetcal.verbs.adopting import run

    return run(file, lab, by)


def recompute(
    paths: list[str],
    into: str,
    lab: str | None = None,
    revise: bool = False,
    workers: int = 1,
    json: str | None = None,
    force: bool = False,
) -> Output:
    """Recompute an archive and list what moved."""
    from sheetcal.verbs.recomputing import run

    return run(paths, into, lab, revise, workers, json, force)


def office(action: str = "status", json: bool = False, shared: bool = False) -> Output:
    """Say which LibreOffice is found (exit 0 of use, 1 not), or install or remove the add-in."""
    from sheetcal.office.failures import OfficeMissing, find_place
    from sheetcal.office.find import status
    from sheetcal.verbs import addin

    if action != "status":
        if json:
            raise BadInput(f"office {action}", "--json", "`office status --json`", "Leave it out.")
        return Output(addin.installed(shared) if action == "install" else addin.removed(shared))
    if shared:
        raise BadInput("office status", "--shared", "`office install --shared`", "Leave it out.")

    found, code = status(), 0
    try:
        find_place()  # what the other commands ask: a wrong setting stops them, it is not passed over
    except OfficeMissing as missing:
        note(f"sheetcal: {missing}")
        code = 1
    if json:
        return Output(_json(found).lines, code)
    return Output(tuple(f"{key:<10} {'not found' if value is None else value}" for key, value in found.items()), code)


def print(path: str, into: str, force: bool = False) -> Output:  # named after the command
    """Print workbooks for signature, as PDF."""
    from sheetcal.verbs.printing import run

    return run(path, into, force)


def demo(folder: str = "sheetcal-demo") -> Output:
    """Play the invented laboratory's week."""
    from sheetcal.verbs.playing import run

    return run(folder)


__all__ = [
    "Output", "SheetcalError", "adopt", "calc", "cells", "check", "demo", "explain", "faults", "fields", "fill",
    "issue", "kinds", "note", "office", "output_path", "print", "recompute", "selftest",
]  # fmt: skip
