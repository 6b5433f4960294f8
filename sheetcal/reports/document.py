"""The JSON document of `check`, key by key as the contract shows it."""

from __future__ import annotations

import json
import re
from collections import Counter
from collections.abc import Iterable, Mapping
from typing import Any

from sheetcal.errors import printable
from sheetcal.model import Finding, ResultLine, Verdict

NOT_ASCII = re.compile("[^\\x00-\\x7e]")
VERDICTS = ("sound", "hold", "reject", "incomplete", "unreadable")


def document(verdicts: Iterable[Verdict], skipped: int, tool: Mapping[str, Any]) -> dict[str, Any]:
    """The whole document; files stand in the order given (sorted by path)."""
    listed = list(verdicts)
    return {
        "tool": dict(tool),
        "files": [_file(one) for one in listed],
        "skipped": skipped,
        "summary": {"files": len(listed), **counts(listed)},
    }


def counts(verdicts: Iterable[Verdict]) -> dict[str, int]:
    """How many files got each verdict."""
    found = Counter(one.verdict for one in verdicts)
    return {name: found[name] for name in VERDICTS}


def text(whole: Mapping[str, Any]) -> str:
    """The document as UTF-8 text, see `spelled`."""
    return spelled(whole) + "\n"


def spelled(whole: Any) -> str:
    """JSON as UTF-8 text; infinities cannot occur and would be refused.

    Characters that a terminal would act on or not show, and halves of a pair that UTF-8 cannot hold, are spelled out.
    """
    return NOT_ASCII.sub(_letter, json.dumps(whole, ensure_ascii=False, indent=2, allow_nan=False))


def _letter(match: re.Match[str]) -> str:
    one = match[0]
    return one if printable(one) == one else json.dumps(one)[1:-1]


def _file(one: Verdict) -> dict[str, Any]:
    return {
        "file": one.file,
        "kind": one.kind,
        "kind_version": one.kind_version,
        "sha256": one.sha256,
        "complete": one.complete,
        "sound": one.sound,
        "verdict": one.verdict,
        "stage": one.stage,
        "issue_id": one.issue_id,
        "profile": one.profile,
        "profile_version": one.profile_version,
        "constants_checked_against": list(one.constants_checked_against),
        "missing": list(one.missing),
        "witnesses": list(one.witnesses),
        "witness_notes": dict(one.witness_notes),
        "results": [_result(line) for line in one.results],
        "findings": [finding(found) for found in one.findings],
        "not_checked": list(one.not_checked),
        "readings_sha256": one.readings_sha256,
    }


def _result(line: ResultLine) -> dict[str, Any]:
    keys = ("id", "label", "unit", "cell", "typed", "formula", "balance", "office", "agrees", "reported", "tolerance")
    return {key: getattr(line, key) for key in keys}


def finding(found: Finding) -> dict[str, Any]:
    """One finding, keys in the order of the contract."""
    keys = (
        "code", "sort", "severity", "sheet", "cell", "field", "message", "found", "expected", "likely_cause", "certain",
        "action", "effect", "false_alarm",
    )  # fmt: skip
    return {**{key: getattr(found, key) for key in keys}, "causes": list(found.causes)}
