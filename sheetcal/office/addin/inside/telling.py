"""From the checker's entry for one file to what is shown: one sentence first, then a line for each finding."""

from __future__ import annotations

from collections import Counter
from dataclasses import dataclass
from typing import Any

from sheetcal.office.addin.inside.words import Words

WEIGHTS = ("error", "warning", "note")
LONG = 60  # letters; a longer value (a formula) is left to the cell itself
MARK = "sheetcal: "
STOP = "STOP"  # what the checker's own sentence then says


@dataclass(frozen=True)
class Line:
    """One finding; `tab` and `cell` are "" where it has no place."""

    weight: str
    tab: str
    cell: str
    what: str
    cause: str
    do: str

    @property
    def place(self) -> str:
        """`Results F14`."""
        return f"{self.tab} {self.cell}".strip()


@dataclass(frozen=True)
class Told:
    """The verdict in one sentence, the findings in order, when and by whom it was judged, what was not looked at."""

    verdict: str
    sentence: str
    lines: tuple[Line, ...]
    stand: str
    not_checked: str


def tell(entry: dict[str, Any], words: Words, time: str) -> Told:
    """What the checker says, in words. `time`: when the copy was taken."""
    findings = entry.get("findings") or []
    left_out = "; ".join([words.say("looks"), *map(str, entry.get("not_checked") or ())])
    witnesses = ", ".join(map(str, entry.get("witnesses") or ())) or "-"
    return Told(
        str(entry.get("verdict")),
        _sentence(entry, findings, words),
        tuple(_line(one, words) for one in findings) if entry.get("verdict") != "unreadable" else (),
        words.say("as of", time=time, witnesses=witnesses),
        words.say("not checked", text=left_out),
    )


def _sentence(entry: dict[str, Any], findings: list[dict[str, Any]], words: Words) -> str:
    stops = [one for one in findings if one.get("action") == "stop"]
    if stops:
        message = str(stops[0].get("message")).rstrip(".")
        return f"{message}." if STOP in message else words.say("stop", message=message)
    verdict = str(entry.get("verdict"))
    if verdict == "unreadable":
        return words.say("unreadable", message=_unreadable(findings))
    counts = _counts(findings, words)
    if verdict == "incomplete":
        missing = words.counted("missing", len(entry.get("missing") or ()))
        return words.say("incomplete", missing=missing, counts=f"{words.say('and')}{counts}" if counts else "")
    if verdict == "sound":
        return words.say("sound") + (f" ({counts})" if counts else "")
    return words.say(verdict, counts=counts)


def _unreadable(findings: list[dict[str, Any]]) -> str:
    first = findings[0] if findings else {}
    texts = [str(first.get("message") or "?"), str(first.get("likely_cause") or "")]
    return ". ".join(text.rstrip(".") for text in texts if text)


def _counts(findings: list[dict[str, Any]], words: Words) -> str:
    """`2 errors, 1 note`; missing readings are said by themselves."""
    found = Counter(str(one.get("severity")) for one in findings if one.get("code") != "reading-missing")
    return words.say("and").join(words.counted(weight, found[weight]) for weight in WEIGHTS if found[weight])


def _line(one: dict[str, Any], words: Words) -> Line:
    cause = str(one.get("likely_cause") or "")
    message = str(one.get("message") or "")
    if not one.get("certain", True) and one.get("false_alarm"):
        cause = f"{cause} {words.say('about', n=round(1.0 / one['false_alarm']))}".strip()
    return Line(
        str(one.get("severity") or "note"),
        str(one.get("sheet") or ""),
        str(one.get("cell") or ""),
        f"{message}{_values(one, words)}",
        "" if cause and cause in message else cause,
        words.say(f"do {one.get('action')}") if f"do {one.get('action')}" in KNOWN else "",
    )


KNOWN = {f"do {action}" for action in ("stop", "reject", "hold", "correct", "note")}


def _values(one: dict[str, Any], words: Words) -> str:
    """` (found 24 903, expected 24 280)`, unless the message says it or the value is a long text."""
    found, expected = one.get("found"), one.get("expected")
    if found is None or _is_long(found) or str(found) in str(one.get("message")):
        return ""
    shown = [words.say("found", found=number(found))]
    if expected is not None and not _is_long(expected):
        shown.append(words.say("expected", expected=number(expected)))
    return f" ({', '.join(shown)})"


def _is_long(value: Any) -> bool:
    return isinstance(value, str) and len(value) > LONG


def number(value: Any) -> str:
    """A number for people: at most seven significant digits, thousands apart."""
    if isinstance(value, bool) or not isinstance(value, (int, float)):
        return str(value)
    return f"{value:,.7g}".replace(",", "\u00a0")


def comment(lines: list[Line], words: Words) -> str:
    """The text of a cell's comment: what, cause, what to do; it begins with the word that marks it as ours."""
    texts = []
    for one in lines:
        parts = [f"{words.say(one.weight.capitalize())}: {one.what}"]
        parts += [words.say("cause", text=one.cause)] if one.cause else []
        parts += [words.say("do", text=one.do)] if one.do else []
        texts.append("\n".join(parts))
    return MARK + "\n\n".join(texts)
