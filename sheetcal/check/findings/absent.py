"""Readings that are not there yet: still to be typed at the bench, or awaited from another one."""

from __future__ import annotations

from sheetcal.check.case import Case, called

LATE = "f"  # `when` of fields that come after the bench work


def look(case: Case) -> None:
    """One finding for each block begun, one for all blocks not begun; late values of finished work are a duty."""
    blocks: dict[str, list[str]] = {}
    for one in case.missing:
        blocks.setdefault(one.partition(".")[0], []).append(one)
    unbegun: list[str] = []
    for block, ids in blocks.items():
        if block.startswith("run") and block in case.witnessed.started:
            case.spoiled.update(ids)  # what such a run lacks is said once, here
        if _is_benched(case, block) and all(is_late(case, one) for one in ids):
            _awaited(case, block, ids)
        elif block in case.witnessed.started or (block == "sheet" and case.witnessed.started):
            _block(case, block, ids)
        else:
            unbegun += ids
    if unbegun:
        plural = "reading" if len(unbegun) == 1 else "readings"
        _missing(case, unbegun[0], f"{len(unbegun)} {plural} missing in blocks not begun")


def is_late(case: Case, one: str) -> bool:
    """Whether a value comes from another bench, days later."""
    return case.place(one)[0].field.when == LATE


def _is_benched(case: Case, block: str) -> bool:
    """Whether the bench work of a sample, or of a run, is done."""
    runs = list(case.runs(block)) if block.startswith("sample") else [block]
    begun = [run for run in runs if run in case.witnessed.started and run.startswith("run")]
    open_runs = {one.partition(".")[0] for one in case.missing if not is_late(case, one)}
    owned = {one for one in open_runs if one.startswith("run") and case.sample_of(one) == case.sample_of(block)}
    return bool(begun) and not owned if block.startswith("sample") else bool(begun) and block not in open_runs


def _block(case: Case, block: str, ids: list[str]) -> None:
    _missing(case, ids[0], f"{block}: missing {_listed(case, ids)}; what stands on it is withheld")


def _missing(case: Case, one: str, message: str) -> None:
    """An error that rejects nothing: the sheet waits."""
    case.add("reading-missing", one, message, action="hold")


def _listed(case: Case, ids: list[str]) -> str:
    labels = list(dict.fromkeys(_label(case, one) for one in ids))
    more = f" and {len(labels) - 4} more" if len(labels) > 4 else ""
    return ", ".join(labels[:4]) + more


def _label(case: Case, one: str) -> str:
    element = one.partition("[")[2].rstrip("]")
    return called(case.place(one)[0].field.label) + (f" (reading {element})" if element else "")


def _awaited(case: Case, block: str, ids: list[str]) -> None:
    sample = case.sample_of(block)
    name = case.text(f"{sample}.sample_id") if sample else ""
    whose = name if block == sample and name else f"{block}{f' ({name})' if name else ''}"
    case.add("value-awaited", ids[0], f"{whose}: waiting for {_listed(case, ids)}", "warning", sort="duty")
