"""The kind's own limits: the rules the sheet showed while it was filled, judged again by the interpreter."""

from __future__ import annotations

from collections.abc import Iterable

from sheetcal.check.case import SEVERITIES, Case
from sheetcal.check.reasons import of_place
from sheetcal.check.rule_causes import of_rule
from sheetcal.check.weighed import misweighed
from sheetcal.model import Rule, Value

LIVE_ONLY = "live-"
# Errors whose right value the workbook itself shows: everything after them is judged with it in place.
EVIDENT = ("cross-foot", "run-void")
# Errors after which the figures that stand on their place mean nothing and are not judged.
SPOILING = frozenset(
    {
        "record-unsound", "record-too-short", "three-times-order", "firing-time-late", "firing-time-early",
        "cooling-constant", "heat-exchange", "rise-large", "gross-below-tare", "wire-order", "burette-order",
        "nitric-heat-negative", "moisture-and-ash", "gross-impossible", "phase-change", "amount-changed",
    }
)  # fmt: skip
OF_THE_RECORD = ("record-vessel",)  # says the same as an exchange of records, where one was found


def look_at_evident(case: Case) -> None:
    """Findings whose correction follows from the readings; it is noted as a repair."""
    for rule in case.parts.kind.rules:
        if rule.code in EVIDENT:
            for block in _broken(case, rule):
                right = _right(case, rule, block)
                _add(case, rule, block, right)
                case.repairs.update(right)


def look(case: Case) -> None:
    """A finding for every other limit that is broken: errors first, since what follows from one is no finding."""
    rules = [one for one in case.parts.kind.rules if one.code not in EVIDENT and not one.code.startswith(LIVE_ONLY)]
    for rule in sorted(rules, key=lambda one: SEVERITIES.index(one.severity)):
        for block in list(_broken(case, rule)):
            if not _follows(case, rule, block):
                right = _right(case, rule, block)
                _add(case, rule, block, right)
                case.repairs.update(right)
                if rule.code in SPOILING:
                    case.spoiled.add(f"{block}.{rule.place}")
    _say_once(case)


def _say_once(case: Case) -> None:
    """A limit that is broken says more than that its reading is unusual."""
    codes = {rule.code for rule in case.parts.kind.rules if rule.sort == "fault"}
    places = {one.field for one in case.found if one.code in codes}
    case.found = [one for one in case.found if one.code != "reading-out-of-range" or one.field not in places]


def _broken(case: Case, rule: Rule) -> Iterable[str]:
    """Blocks in which a rule is broken and no other rule or state takes its place."""
    return (block for block in _blocks(case, rule) if case.judge.holds(rule, block) and not _hidden(case, rule, block))


def _blocks(case: Case, rule: Rule) -> list[str]:
    if rule.scope == "sheet":
        return ["sheet"] if case.witnessed.started else []
    if rule.scope == "run":
        return list(case.runs())
    return [block for block in case.anchors if block.startswith(rule.scope)]


def _hidden(case: Case, rule: Rule, block: str) -> bool:
    """Whether a rule named by `unless` already says it, or a void run makes the limit moot."""
    if rule.scope == "run" and not case.is_counted(block) and rule.action != "stop":
        return rule.code not in ("void-without-reason", "void-other")
    other = next((one for one in case.parts.kind.rules if rule.unless and one.code == rule.unless), None)
    return other is not None and case.judge.holds(other, block)


def _follows(case: Case, rule: Rule, block: str) -> bool:
    """Whether another finding explains this one, or only its correction would make it true.

    A limit of safety is always said.
    """
    if rule.action == "stop":
        return False
    if not case.judge_as_read.holds(rule, block):
        return True
    if rule.code in OF_THE_RECORD and block in case.exchanged:
        return True
    return bool(case.spoiled) and not case.stands_on(case.spoiled).isdisjoint(case.judge.needs(rule, block))


def _add(case: Case, rule: Rule, block: str, right: dict[str, Value]) -> None:
    one = next(iter(right)) if rule.code == "cross-foot" else f"{block}.{rule.place}"
    found, expected = case.value(one), right.get(one)
    causes = [*of_place(case, one, found, expected), *of_rule(case, rule, block)]
    if rule.code == "record-vessel":
        named = case.text(f"{block}.record_vessel")
        causes.append(f"another vessel was probably ticked: the logger's file names {named}")
    sample = case.sample_of(block)
    name = case.text(f"{sample}.sample_id") if sample else ""
    message = f"{block}{f' ({name})' if name else ''}: {rule.text}"
    case.add(
        rule.code, one, message, rule.severity, sort=rule.sort, action=rule.action, found=found, expected=expected,
        effect=case.effect(one, right) if right else None, likely_cause=causes[0] if causes else None,
        causes=tuple(causes),
    )  # fmt: skip


def _right(case: Case, rule: Rule, block: str) -> dict[str, Value]:
    """What readings should have been where the workbook itself says it."""
    if rule.code == "cross-foot":
        return misweighed(case, block, rule.place)
    if rule.code == "run-void":
        reason: dict[str, Value] = {} if case.text(f"{block}.void_reason") else {f"{block}.void_reason": "other"}
        return {f"{block}.state": "void", **reason}
    if rule.code == "record-vessel":
        named = case.text(f"{block}.record_vessel").casefold()
        known = [str(row["id"]) for row in case.parts.record.tables.get("vessel", ())]
        return {f"{block}.vessel": one for one in known if one.casefold() == named}
    return {}
