"""The parts of README.md that are generated: `python tests/readme_parts.py` writes them, test_readme.py compares."""

from __future__ import annotations

import re
from collections import Counter
from pathlib import Path

from sheetcal import profiles
from sheetcal.cells import registry
from sheetcal.kinds import load, names

README = Path(__file__).parent.parent / "README.md"
PART = re.compile(r"(<!-- (kinds|cells): [^\n]*-->\n)(.*?)(<!-- end -->)", re.DOTALL)


def kinds() -> str:
    """The table of kinds, and the profiles they are issued under."""
    rows = ["| kind | version | for |", "|---|---|---|"]
    rows += [f"| {one.name} | {one.version} | {one.purpose} |" for one in map(load, names())]
    served = ", ".join(f"`{one}`" for one in profiles.names())
    return "\n".join([*rows, "", f"Method profiles: {served}."]) + "\n"


def cells() -> str:
    """How many cell functions there are, by standing."""
    functions = registry.all()
    count = Counter(one.standing for one in functions)
    by_standing = ", ".join(f"{count[one]} {one}" for one in ("derived", "published", "memory"))
    return f"There are {len(functions)} cell functions: {by_standing}.\n"


def filled(text: str) -> str:
    """README with its generated parts as they are today."""
    parts = {"kinds": kinds(), "cells": cells()}
    return PART.sub(lambda found: found.group(1) + parts[found.group(2)] + found.group(4), text)


if __name__ == "__main__":
    README.write_text(filled(README.read_text("utf-8")), "utf-8")
