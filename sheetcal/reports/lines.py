"""The text of `check`: a line a file, a line a finding, a line of counts."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping

from sheetcal.errors import printable
from sheetcal.model import Finding, Value, Verdict
from sheetcal.reports.document import VERDICTS, counts

WORST = ("unreadable", "reject", "incomplete", "hold", "sound")
MOST = 10
LONG = 60  # letters; a longer text (a formula) is in the JSON document
STYLES = {"reject": "31", "unreadable": "31", "hold": "33", "incomplete": "36", "sound": "32"}
COLOURS = {"STOP": "reject", "reject": "reject", "hold": "hold", "correct": "hold"}


def lines(
    verdicts: Iterable[Verdict], skipped: int, office: str, show_all: bool = False, colour: bool = False
) -> Iterator[str]:
    """Worst first; then what is certain of the files that are not sound; then what is statistical; the counts last.

    `office` says in words how LibreOffice took part. Without `show_all` the first ten files only.
    """
    listed = sorted(verdicts, key=lambda one: (WORST.index(one.verdict), one.file))
    shown = listed if show_all else listed[:MOST]
    width = max((len(printable(one.file)) for one in shown), default=0)
    for one in shown:
        yield _file(one, width, colour)
    if len(listed) > len(shown):
        yield f"... and {len(listed) - len(shown)} more (--all shows them)"
    for one in shown:
        if not one.sound:
            yield from (_finding(one, found, width, colour) for found in one.findings if found.certain)
    yield from _by_chance(shown, width, colour)
    yield from _not_checked(listed)
    yield _counts(listed, skipped, office)


def _by_chance(shown: list[Verdict], width: int, colour: bool) -> Iterator[str]:
    """Statistical findings in a list of their own, those of sound files too."""
    listed = [(one, found) for one in shown for found in one.findings if not found.certain]
    if listed:
        yield "Statistical findings; none of them changes a verdict:"
        yield from (_finding(one, found, width, colour) for one, found in listed)


def _file(one: Verdict, width: int, colour: bool) -> str:
    stage = f"  {one.stage}" if one.stage and one.verdict == "incomplete" else ""
    return painted(f"{_head(one.verdict, one, width)}{stage}", one.verdict, colour)


def _head(word: str, one: Verdict, width: int) -> str:
    """Word, file and kind in columns."""
    return f"{word:<10}  {printable(one.file):<{width}}  {printable(one.kind or '-'):<13}".rstrip()


def _finding(one: Verdict, found: Finding, width: int, colour: bool) -> str:
    """Action, file, kind, place, message, values, effect, cause."""
    word = "STOP" if found.action == "stop" else found.action
    place = f"{found.sheet}!{found.cell}" if found.sheet and found.cell else found.sheet or ""
    chance = "" if found.certain else f"  [statistical, false-alarm chance {found.false_alarm or 0.0:.2g}]"
    said = f"{place}  {found.message}{_values(found)}{_effect(found)}{_cause(found)}{chance}".strip()
    return painted(f"{_head(word, one, width):<{width + 27}}  {printable(said)}", COLOURS.get(word, ""), colour)


def _values(found: Finding) -> str:
    """Found and expected, unless one is a long text."""
    if found.found is None or _is_long(found.found):
        return ""
    colon = " " if found.message.endswith(("?", ".", "!")) else ": "
    expected = "" if found.expected is None or _is_long(found.expected) else f", expected {number(found.expected)}"
    return f"{colon}{number(found.found)}{expected}"


def _is_long(value: Value) -> bool:
    return isinstance(value, str) and len(value) > LONG


def _effect(found: Finding) -> str:
    effect = found.effect
    if not effect:
        return ""
    limit = effect.get("of_limit")
    share = f"; {limit:.2g} x the limit" if limit is not None else ""
    digits = "; the reported figure changes" if effect.get("reported_changes") else ""
    return f" ({_change(effect['change'])} {effect['unit']} on {effect['result']}{share}{digits})"


def _change(value: float) -> str:
    """A change with its sign, four digits or whole units."""
    return f"{value:+,.0f}".replace(",", " ") if abs(value) >= 1000.0 else f"{value:+.4g}"


def _cause(found: Finding) -> str:
    return f" - {found.likely_cause}" if found.likely_cause and found.likely_cause not in found.message else ""


def _counts(listed: list[Verdict], skipped: int, office: str) -> str:
    found = counts(listed)
    parts = ", ".join(f"{found[name]} {name}" for name in VERDICTS if found[name])
    names = {name for one in listed for name in one.witnesses}
    spoken = ", ".join(name for name in ("typed", "formula", "balance", "office") if name in names) or "none"
    others = f" {skipped} other {'file' if skipped == 1 else 'files'} passed over." if skipped else ""
    plural = "workbook" if len(listed) == 1 else "workbooks"
    return f"{len(listed)} {plural}: {parts or 'none'}. Witnesses: {spoken}; {office}.{others}"


def _not_checked(listed: list[Verdict]) -> Iterator[str]:
    """What nobody looked for, once for all files."""
    every: Mapping[str, None] = dict.fromkeys(text for one in listed for text in one.not_checked)
    if every:
        yield "Not looked at: " + "; ".join(every) + "."


def number(value: Value) -> str:
    """A number for people: at most seven significant digits, thousands apart."""
    if isinstance(value, bool) or not isinstance(value, float | int):
        return str(value)
    return f"{value:,.7g}".replace(",", " ")


def painted(text: str, verdict: str, colour: bool) -> str:
    """Colour on a terminal, never the only sign."""
    return f"\x1b[{STYLES[verdict]}m{text}\x1b[0m" if colour and verdict in STYLES else text
