"""The kind's own limits: the rules the sheet showed while it was filled, judged again by the interpreter."""

from __future__ import annotations

from sheetcal.check.case import Case
from sheetcal.check.causes import of_value
from sheetcal.model import Rule, Value

LIVE_ONLY = "live-"
INDEPENDENT = "sheet"


def look(case: Case) -> None:
    """A finding for every limit that is broken, in every block in use."""
    for rule in case.parts.kind.rules:
        if rule.code.startswith(LIVE_ONLY):
            continue
        for block in _blocks(case, rule):
            if case.judge.holds(rule, block) and not _hidden(case, rule, block):
                _add(case, rule, block)


def _blocks(case: Case, rule: Rule) -> list[str]:
    if rule.scope == "sheet":
        return ["sheet"] if case.witnessed.started else []
    if rule.scope == "run":
        return list(case.runs())
    return [block for block in case.judge.anchors if block.startswith(rule.scope)]


def _hidden(case: Case, rule: Rule, block: str) -> bool:
    """Whether a rule named by `unless` already says it, or a void run makes the limit moot."""
    if rule.scope == "run" and case.text(f"{block}.state") in ("void", "not needed") and rule.action != "stop":
        return rule.code != "void-without-reason"
    other = next((one for one in case.parts.kind.rules if rule.unless and one.code == rule.unless), None)
    return other is not None and case.judge.holds(other, block)


def _add(case: Case, rule: Rule, block: str) -> None:
    one = f"{block}.{rule.place}"
    found = case.value(one)
    expected, right = _right(case, rule, block)
    place, _ = case.place(one)
    causes: list[str] = []
    if isinstance(found, float | int) and isinstance(expected, float | int):
        digits = _digits(place.field.resolution)
        causes = of_value(float(found), float(expected), digits=digits)
    name = case.text(f"{case.sample_of(block)}.sample_id") if case.sample_of(block) else ""
    message = f"{block}{f' ({name})' if name else ''}: {rule.text}"
    case.add(
        rule.code, one, message, rule.severity, sort=rule.sort, action=rule.action, found=found, expected=expected,
        effect=case.effect(one, right) if right else None, likely_cause=causes[0] if causes else None,
        causes=tuple(causes),
    )  # fmt: skip


def _right(case: Case, rule: Rule, block: str) -> tuple[Value, dict[str, Value]]:
    """What a reading should have been where the readings themselves say it."""
    if rule.code == "cross-foot":
        gross, tare = case.number(f"{block}.crucible_gross"), case.number(f"{block}.crucible_tare")
        if gross is not None and tare is not None:
            net = round(gross - tare, 6)
            return net, {f"{block}.{rule.place}": net}
    return None, {}


def _digits(resolution: float | None) -> int | None:
    if resolution is None or resolution <= 0:
        return None
    text = f"{resolution:.10f}".rstrip("0")
    return len(text.partition(".")[2])
