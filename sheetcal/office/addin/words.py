"""The words of the function wizard: a folder of TOML files a language, English where a word is missing.

Keys of functions.toml are names of cell functions; of arguments.toml names of arguments, or FUNCTION.argument where one
function means something of its own; of sources.toml the registry's sources.
"""

from __future__ import annotations

import tomllib
from dataclasses import dataclass
from functools import cache
from pathlib import Path

from sheetcal.cells.registry import Argument, CellFunction

FOLDER = Path(__file__).parent / "words"
FIRST = "en"


@dataclass(frozen=True)
class Words:
    """What one language has words for."""

    language: str
    sentences: dict[str, str]
    functions: dict[str, str]
    arguments: dict[str, str]
    sources: dict[str, str]

    def what(self, function: CellFunction) -> str:
        """What a cell function gives, as one sentence."""
        return self.functions.get(function.name, function.doc.splitlines()[0])

    def source(self, function: CellFunction) -> str:
        """Where its equation comes from."""
        return self.sources.get(function.source, function.source)

    def label(self, function: CellFunction, argument: Argument) -> str:
        """The name of an argument, as the wizard shows it."""
        shared = self.arguments.get(argument.name, argument.name.replace("_", " "))
        return self.arguments.get(f"{function.name}.{argument.name}", shared)


def languages() -> list[str]:
    """Every language that has a folder, English first."""
    return [FIRST, *sorted({path.name for path in FOLDER.iterdir() if path.is_dir()} - {FIRST})]


@cache
def words(language: str) -> Words:
    """The words of a language; a sentence that it lacks is English."""
    parts = {name: _read(language, name) for name in ("functions", "arguments", "sources")}
    sentences = {**_read(FIRST, "sentences"), **_read(language, "sentences")}
    return Words(language, sentences, **parts)


def _read(language: str, part: str) -> dict[str, str]:
    path = FOLDER / language / f"{part}.toml"
    return tomllib.loads(path.read_text("utf-8")) if path.is_file() else {}
