"""The page the laboratory head wants on Friday: what can be reported, what waits, what was found, what moved."""

from __future__ import annotations

from collections import Counter
from collections.abc import Mapping
from dataclasses import dataclass

from sheetcal.inputs import read_lab
from sheetcal.model import Verdict
from sheetcal.verbs.demo_slips import Found
from sheetcal.verbs.demo_week import RIGHT, Week, table
from sheetcal.verbs.workbook import open_workbook, results


def friday_page(week: Week, found: Found, recomputed: tuple[str, ...]) -> list[str]:
    """The page, line by line; every figure is computed from the workbooks."""
    samples = _samples(week)
    page = ["", "FRIDAY PAGE of the week 3 to 7 March 2025 (invented laboratory)", ""]
    page += _decisions(week, samples)
    page += ["", *_right(week)]
    page += ["", "Samples, from the right workbooks (net value at constant pressure, as received):"]
    page += [one.line for one in samples]
    page += ["", *_submitted(found)]
    page += ["", "After the producer's correction of BA-31 (26436 -> 26429 J/g):", *recomputed]
    return page


@dataclass(frozen=True)
class Sample:
    """One sample in one workbook, as the page shows it."""

    name: str
    book: str
    line: str
    waits: bool


def _decisions(week: Week, samples: list[Sample]) -> list[str]:
    """What the head has to decide, first."""
    names = list(dict.fromkeys(one.name for one in samples))
    refused = [one["sample_id"] for one in _never_issued(week, names)]
    waiting = [one.name for one in samples if one.waits]
    twice = [name for name in names if sum(one.name == name for one in samples) > 1]
    ready = len(names) - len(waiting)
    lines = [
        f"{len(names) + len(refused)} samples: {ready} reportable"
        + (f"; {', '.join(refused)} not by this method (chlorine)" if refused else "")
        + (f"; {', '.join(waiting)} waits for one more run, or your decision" if waiting else "")
    ]
    lines += [_on_two_calibrations(name, [one.book for one in samples if one.name == name], week) for name in twice]
    return [*lines, *_heat_capacity_moved(week), *_vessels(week)]


def _never_issued(week: Week, names: list[str]) -> list[dict[str, str]]:
    """Samples of the laboratory's worklists that no workbook was issued for."""
    listed = {
        row["sample_id"]: row
        for path in sorted((week.folder / "worklists").glob("*.csv"))
        for row in table(path)
        if (row.get("role") or "sample") == "sample"
    }
    return [row for name, row in listed.items() if name not in names]


def _on_two_calibrations(name: str, books: list[str], week: Week) -> str:
    values = [_capacity(week, book) for book in books]
    shown = ", ".join(f"{book} {value:.1f}" for book, value in zip(books, values, strict=True))
    return f"{name} stands on two heat capacities ({shown} J/K): put it on one before it is reported."


def _capacity(week: Week, book: str) -> float:
    value = open_workbook(week.filled(book)).parts.record.tables["vessel"][0]["heat_capacity"]
    return float(value) if isinstance(value, int | float) else 0.0


def _heat_capacity_moved(week: Week) -> list[str]:
    """A heat capacity adopted during the week, and what it says of the days before."""
    lines = []
    lab = read_lab(week.lab)
    for vessel in lab.vessels:
        dated = sorted((one for one in lab.calibrations if one.vessel == vessel.id), key=lambda one: one.valid_from)
        if len(dated) > 1:
            old, new = dated[-2].value, dated[-1].value
            off = 100.0 * (old / new - 1.0)
            lines.append(
                f"{vessel.id} of {vessel.calorimeter}: heat capacity {old:.1f} -> {new:.1f} J/K, adopted "
                f"{dated[-1].valid_from:%A}: earlier results of the week stand {off:+.2f} % off "
                f"({240.0 * off:+.0f} J/g at 24 MJ/kg). Your decision, to be recorded."
            )
    return lines


def _vessels(week: Week) -> list[str]:
    """Vessels that have reached the firings allowed, counted over all workbooks of the week."""
    fired: Counter[str] = Counter()
    for name, row in week.rows.items():
        if row["kind"] == "fuel":
            parts = open_workbook(week.filled(name)).parts
            fired.update(str(value) for one, value in parts.readings.items() if one.endswith(".vessel"))
    lines = []
    for vessel in read_lab(week.lab).vessels:
        left = vessel.firings_left
        if left is not None and fired[vessel.id] > left:
            lines.append(
                f"{vessel.id}: {fired[vessel.id]} firings this week, {left} were left on Monday: "
                "OUT OF SERVICE until tested."
            )
    return lines


def _right(week: Week) -> list[str]:
    wrong = [
        f"  {name}: {one.verdict}, expected {RIGHT.get(name, 'sound')}"
        for name, one in week.verdicts.items()
        if one.verdict != RIGHT.get(name, "sound")
    ]
    counts: dict[str, int] = {}
    for one in week.verdicts.values():
        counts[one.verdict] = counts.get(one.verdict, 0) + 1
    shown = ", ".join(f"{number} {name}" for name, number in counts.items())
    return [f"{len(week.verdicts)} right workbooks: {shown}; each got the verdict listed for it." if not wrong else
            f"{len(week.verdicts)} right workbooks: {shown}; {len(wrong)} not as listed:", *wrong]  # fmt: skip


def _samples(week: Week) -> list[Sample]:
    found = []
    for name, row in week.rows.items():
        if row["kind"] != "fuel":
            continue
        parts = open_workbook(week.filled(name)).parts
        values = results(parts)
        for number in range(1, parts.skeleton.shape.samples + 1):
            block = f"sample{number}"
            if parts.record.prefilled.get(f"{block}.role") == "sample":
                found.append(_sample(parts.record.prefilled, values, block, name, week.verdicts[name]))
    return found


def _sample(
    printed: Mapping[str, object], values: Mapping[str, object], block: str, book: str, verdict: Verdict
) -> Sample:
    name = f"{printed[f'{block}.sample_id']}"
    net = values.get(f"{block}.net_p_as_received_reported_mj")
    runs = values.get(f"{block}.counted_runs") or 0
    duties = [one for one in verdict.findings if one.sort == "duty" and (one.field or "").startswith(f"{block}.")]
    shown = f"{net:6.2f} MJ/kg" if isinstance(net, float | int) else "  -   MJ/kg"
    words = "; ".join(one.message.partition(": ")[2] for one in duties) or values.get(f"{block}.what_next") or ""
    return Sample(name, book, f"  {name:<8} {shown}  n = {runs:.0f}  {book:<12} {words}", bool(duties))


def _submitted(found: Found) -> list[str]:
    here = found.looked_for
    missed = [one for one in here if not one.found]
    later = [one for one in found.planted if one not in here]
    lines = [f"As submitted: {len(here)} slips looked for, {len(here) - len(missed)} found."]
    lines += [f"  NOT FOUND {one.slip}: {one.code} in {one.file}, {one.field}" for one in missed]
    lines += [f"  {one.slip} ({one.file}) needs {one.needs}" for one in later]
    bad = [name for name, one in found.verdicts.items() if one.verdict == "reject"]
    stops = [
        f"{name} {finding.field}"
        for name, one in found.verdicts.items()
        for finding in one.findings
        if finding.action == "stop"
    ]
    lines.append(f"  send back: {', '.join(bad)}")
    lines.append(f"  STOP said in: {', '.join(stops) or 'none'}")
    lines.append(f"  witnesses: {found.witnesses}")
    return lines
