"""The text of `check`: a line a file, a line a finding, a line of counts."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping

from sheetcal.model import Finding, Value, Verdict
from sheetcal.reports.document import VERDICTS, counts

WORST = ("unreadable", "reject", "incomplete", "hold", "sound")
MOST = 10
STYLES = {"reject": "31", "unreadable": "31", "hold": "33", "incomplete": "36", "sound": "32"}


def lines(
    verdicts: Iterable[Verdict], skipped: int, office: str, show_all: bool = False, colour: bool = False
) -> Iterator[str]:
    """Worst first; findings of the files that are not sound; the counts last."""
    listed = sorted(verdicts, key=lambda one: (WORST.index(one.verdict), one.file))
    shown = listed if show_all else listed[:MOST]
    width = max((len(printable(one.file)) for one in shown), default=0)
    for one in shown:
        yield _file(one, width, colour)
    if len(listed) > len(shown):
        yield f"... and {len(listed) - len(shown)} more (--all shows them)"
    for one in shown:
        if one.verdict != "sound" or any(found.severity != "note" for found in one.findings):
            yield from (_finding(one, found, colour) for found in one.findings if found.certain)
            yield from (_finding(one, found, colour) for found in one.findings if not found.certain)
    yield _counts(listed, skipped, office)
    yield from _not_checked(listed)


def _file(one: Verdict, width: int, colour: bool) -> str:
    stage = f"  {one.stage}" if one.stage and one.verdict in ("incomplete", "hold") else ""
    word = painted(f"{one.verdict:<10}", one.verdict, colour)
    return f"{word}  {printable(one.file):<{width}}  {one.kind or '-'}{stage}".rstrip()


def _finding(one: Verdict, found: Finding, colour: bool) -> str:
    place = f"{found.sheet}!{found.cell}" if found.sheet and found.cell else found.sheet or ""
    word = "STOP" if found.action == "stop" else found.severity
    where = f"{printable(one.file)}  {place}".rstrip()
    text = f"{word:<7}  {where}  {found.message}{_values(found)}{_effect(found)}{_cause(found)}"
    chance = "" if found.certain else f"  [statistical, false-alarm chance {found.false_alarm:.2g}]"
    return painted(printable(text + chance), "reject" if word in ("STOP", "error") else "hold", colour)


def _values(found: Finding) -> str:
    if found.found is None or (isinstance(found.found, str) and len(found.found) > 60):
        return ""
    if found.expected is None or (isinstance(found.expected, str) and len(found.expected) > 60):
        return f": {number(found.found)}"
    return f": {number(found.found)}, expected {number(found.expected)}"


def _effect(found: Finding) -> str:
    effect = found.effect
    if not effect:
        return ""
    limit = effect.get("of_limit")
    share = f"; {limit:.2g} x the limit" if limit is not None else ""
    digits = "; the reported figure changes" if effect.get("reported_changes") else ""
    return f" ({effect['change']:+.4g} {effect['unit']} on {effect['result']}{share}{digits})"


def _cause(found: Finding) -> str:
    return f" - {found.likely_cause}" if found.likely_cause and found.likely_cause not in found.message else ""


def _counts(listed: list[Verdict], skipped: int, office: str) -> str:
    found = counts(listed)
    parts = ", ".join(f"{found[name]} {name}" for name in VERDICTS if found[name])
    names: dict[str, None] = {}
    for one in listed:
        names.update(dict.fromkeys(one.witnesses))
    spoken = ", ".join(name for name in ("typed", "formula", "balance", "office") if name in names) or "none"
    others = f" {skipped} other files passed over." if skipped else ""
    plural = "workbook" if len(listed) == 1 else "workbooks"
    return f"{len(listed)} {plural}: {parts or 'none'}. Witnesses: {spoken}; {office}.{others}"


def _not_checked(listed: list[Verdict]) -> Iterator[str]:
    """What nobody looked for, once for all files."""
    every: Mapping[str, None] = dict.fromkeys(text for one in listed for text in one.not_checked)
    if every:
        yield "Not looked at: " + "; ".join(every) + "."


def number(value: Value) -> str:
    """A number for people: at most seven significant digits."""
    if isinstance(value, bool) or not isinstance(value, float | int):
        return str(value)
    return f"{value:.7g}"


def printable(text: str) -> str:
    """Control characters and marks that turn the reading direction as \\xNN; nothing acts on the terminal."""
    return "".join(c if c.isprintable() else f"\\x{ord(c):02x}" for c in text)


def painted(text: str, verdict: str, colour: bool) -> str:
    """Colour on a terminal, never the only sign."""
    return f"\x1b[{STYLES[verdict]}m{text}\x1b[0m" if colour else text
