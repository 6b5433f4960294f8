"""The page the laboratory head wants on Friday: what can be reported, what waits, what was found, what moved."""

from __future__ import annotations

from collections.abc import Mapping

from sheetcal.model import Verdict
from sheetcal.verbs.demo_slips import Found
from sheetcal.verbs.demo_week import RIGHT, Week
from sheetcal.verbs.workbook import open_workbook, results


def friday_page(week: Week, found: Found, recomputed: tuple[str, ...]) -> list[str]:
    """The page, line by line; every figure is computed from the workbooks."""
    page = ["", f"FRIDAY PAGE - {week.folder.name} (invented laboratory)", ""]
    page += _right(week)
    page += ["", "Samples, from the right workbooks (net value at constant pressure, as received):"]
    page += _samples(week)
    page += ["", *_submitted(found)]
    page += ["", "After the producer's correction of BA-31 (26436 -> 26429 J/g):", *recomputed]
    return page


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


def _samples(week: Week) -> list[str]:
    lines = []
    for name, row in week.rows.items():
        if row["kind"] != "fuel":
            continue
        parts = open_workbook(week.filled(name)).parts
        values = results(parts)
        for number in range(1, parts.skeleton.shape.samples + 1):
            block = f"sample{number}"
            if parts.record.prefilled.get(f"{block}.role") == "sample":
                lines.append(_sample(parts.record.prefilled, values, block, name, week.verdicts[name]))
    return lines


def _sample(
    printed: Mapping[str, object], values: Mapping[str, object], block: str, book: str, verdict: Verdict
) -> str:
    name = f"{printed[f'{block}.sample_id']}"
    net = values.get(f"{block}.net_p_as_received_reported_mj")
    runs = values.get(f"{block}.counted_runs") or 0
    duties = [one.message.partition(": ")[2] for one in verdict.findings if one.sort == "duty" and name in one.message]
    shown = f"{net:6.2f} MJ/kg" if isinstance(net, float | int) else "  -   MJ/kg"
    return (
        f"  {name:<8} {shown}  n = {runs:.0f}  {book:<12} {'; '.join(duties) or values.get(f'{block}.what_next') or ''}"
    )


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
    return lines
