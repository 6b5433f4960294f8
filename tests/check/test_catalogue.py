"""The list of faults names every code that the checker can raise, and none that it cannot."""

from __future__ import annotations

import re
from pathlib import Path

from sheetcal import verbs
from sheetcal.check.catalogue import ALONE, catalogue
from sheetcal.kinds import load, names

ROOT = Path(__file__).parents[2] / "sheetcal"
MAKERS = r"(?:Finding|Said|case\.add|_?say|unreadable|_note)"
RAISED = re.compile(MAKERS + r'\(\s*(?:case, |path, fault, )?"([a-z]+(?:-[a-z]+)*)"')
BESIDE = (ROOT / "verbs" / "checking.py", ROOT / "verbs" / "standing.py")  # what needs the lab file
NAMED = re.compile(r'code: str = "([a-z-]+)"|\bcode = "([a-z-]+)"')
CODE = re.compile(r"[a-z0-9]+(?:-[a-z0-9]+)*")


def _raised() -> set[str]:
    """Codes in the sources of the checker, wherever a finding is made."""
    found: set[str] = set()
    for path in [*ROOT.joinpath("check").rglob("*.py"), *BESIDE]:
        text = path.read_text("utf-8")
        found.update(RAISED.findall(text))
        found.update(first or second for first, second in NAMED.findall(text))
    return found


def test_every_code_raised_is_listed() -> None:
    """Each code in the sources stands in the list with a meaning."""
    raised, listed = _raised(), {one.code for one in catalogue()}
    assert len(raised) >= 35
    assert raised - listed == set()


def test_every_code_listed_is_raised() -> None:
    """Each listed code is written somewhere in the checker or is a limit of a kind."""
    sources = "\n".join(path.read_text("utf-8") for path in ROOT.joinpath("check").rglob("*.py"))
    sources += "".join(path.read_text("utf-8") for path in BESIDE)
    limits = {rule.code for name in names() for rule in load(name).rules}
    listed = catalogue()
    assert len(listed) > 120
    assert [one.code for one in listed if one.code not in limits and f'"{one.code}"' not in sources] == []
    assert {one.code for one in listed} >= limits
    assert all(CODE.fullmatch(one.code) and one.meaning for one in listed)


def test_codes_are_listed_once_and_sorted() -> None:
    """No code twice; limits say their severity, and what needs more than the workbook says so."""
    codes = [one.code for one in catalogue()]
    assert codes == sorted(set(codes))
    needs = {one.code: one.needs for one in catalogue() if one.needs != ALONE}
    assert "--lab" in needs["constant-superseded"] and "LibreOffice" in needs["engines-disagree"]
    output = verbs.faults()
    assert len(output.lines) == len(codes) and output.code == 0
