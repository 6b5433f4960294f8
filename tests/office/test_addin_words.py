"""The function wizard shows every cell function with result, unit, range and source, in English and in German."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pytest
from calc_client import Calc

from sheetcal.cells import registry
from sheetcal.cells.registry import Argument, CellFunction
from sheetcal.office.addin.build import files, unpack
from sheetcal.office.addin.words import FOLDER, languages, words

pytestmark = pytest.mark.office
ADD_IN = 11  # LibreOffice's own category of add-in functions
GERMAN = """<?xml version="1.0" encoding="UTF-8"?>
<oor:items xmlns:oor="http://openoffice.org/2001/registry">
<item oor:path="/org.openoffice.Office.Linguistic/General"><prop oor:name="UILocale" oor:op="fuse"><value>de</value>
</prop></item>
</oor:items>
"""


@pytest.fixture(scope="module")
def english(calc: Calc) -> Any:
    """What an English wizard shows, by name of the function."""
    assert calc.language() in ("", "en-US")
    return calc.wizard()


@pytest.fixture(scope="module")
def german_calc(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Calc]:
    """A Calc with a German user interface."""
    folder = tmp_path_factory.mktemp("german")
    unpack(folder / "bundled")
    (folder / "user" / "user").mkdir(parents=True)
    (folder / "user" / "user" / "registrymodifications.xcu").write_text(GERMAN, "utf-8")
    with Calc(folder / "user", f"-env:BUNDLED_EXTENSIONS={(folder / 'bundled').as_uri()}") as one:
        yield one


@pytest.fixture(scope="module")
def german(german_calc: Calc) -> Any:
    """What a German wizard shows; that LibreOffice speaks German shows in one of its own functions."""
    assert german_calc.language() == "de"
    shown = german_calc.wizard()
    assert "SUMME" in shown
    return shown


def test_every_function_is_there_with_unit_source_and_named_arguments(english: Any) -> None:
    assert len(registry.all()) >= 210
    for function in registry.all():
        category, text, arguments = english[function.name]
        assert category == ADD_IN, function.name
        assert text.startswith(f"Calorimetry: {function.doc.splitlines()[0]}"), text
        assert function.source.rstrip(".") in text
        unit = function.unit
        assert unit is None or unit in ("1", "date") or " / " in unit or "same as" in unit or f"in {unit}." in text, (
            text
        )
        named = [name for name, _, _ in arguments]
        assert named == [argument.name.replace("_", " ") for argument in function.args]


def test_every_argument_says_its_unit_range_and_choices(english: Any) -> None:
    for function in registry.all():
        for argument, (_, text, _) in zip(function.args, english[function.name][2], strict=True):
            for part in _must_say(argument):
                assert part in text, (function.name, argument.name, text)


def _must_say(argument: Argument) -> list[str]:
    bounds = [f"{bound:.15g}" for bound in (argument.low, argument.high) if bound is not None]
    unit = argument.unit
    plain = [unit] if unit and unit not in ("1", "any", "date") and "same as" not in unit else []
    series = ["range of cells"] if argument.series else []
    return [*bounds, *plain, *argument.choices, *series, *(["left out"] if argument.optional else [])]


def test_the_wizard_speaks_german(german: Any) -> None:
    text, arguments = german["HEAT_FROM_RISE"][1:]
    assert text.startswith("Kalorimetrie: Wärme, die ein Körper beim Erwärmen aufnimmt;")
    assert "Ergebnis in J. Quelle: Definition der spezifischen Wärmekapazität." in text
    assert [name for name, _, _ in arguments] == ["Masse", "spezifische Wärmekapazität", "Temperaturanstieg"]
    assert arguments[0][1] == "Masse: in g, 0 bis 1000000, nötig"
    for function in registry.all():
        for place, shown in enumerate(german[function.name][2]):
            assert shown[0] == words("de").label(function, function.args[place])


def test_german_covers_the_functions_and_knows_no_strange_ones(german: Any, english: Any) -> None:
    """A new function may stay English for a while: the gap is printed, and no more than one in ten may be left."""
    spoken = words("de")
    functions = registry.all()
    lacking = [one.name for one in functions if one.name not in spoken.functions]
    names = {argument.name for one in functions for argument in one.args}
    nameless = sorted(names - set(spoken.arguments))
    sourceless = sorted({one.source for one in functions} - set(spoken.sources))
    print(f"\nwithout German words: functions {lacking}, arguments {nameless}, sources {sourceless}")
    assert len(lacking) <= len(functions) // 10
    assert len(nameless) <= len(names) // 10
    assert not _strange(functions)
    same = [one.name for one in functions if german[one.name][1] == english[one.name][1]]
    assert not same, same


def _strange(functions: list[CellFunction]) -> list[str]:
    """Words for what is no longer there."""
    names = {one.name for one in functions}
    sources = {one.source for one in functions}
    pairs = {f"{one.name}.{argument.name}" for one in functions for argument in one.args}
    single = {pair.partition(".")[2] for pair in pairs}
    spoken = words("de")
    return [
        *(set(spoken.functions) - names),
        *(set(spoken.arguments) - pairs - single),
        *(set(spoken.sources) - sources),
    ]


def test_every_language_has_the_english_sentences_with_the_same_gaps() -> None:
    assert languages()[0] == "en" and "de" in languages()
    for language in languages():
        assert (FOLDER / language / "sentences.toml").is_file()
        for key, sentence in words("en").sentences.items():
            translated = words(language).sentences[key]
            fields = {part.partition("}")[0] for part in sentence.split("{")[1:]}
            assert fields == {part.partition("}")[0] for part in translated.split("{")[1:]}, (language, key)


def test_what_a_language_lacks_is_english(monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> None:
    """A new language may begin with one sentence."""
    for part in FOLDER.rglob("*.toml"):
        target = tmp_path / part.relative_to(FOLDER)
        target.parent.mkdir(exist_ok=True)
        target.write_bytes(part.read_bytes())
    (tmp_path / "fr").mkdir()
    (tmp_path / "fr" / "sentences.toml").write_text('result_unit = "Résultat en {unit}."\n', "utf-8")
    monkeypatch.setattr("sheetcal.office.addin.words.FOLDER", tmp_path)
    shown = files()["CalcAddIns.xcu"].decode()
    assert '<value xml:lang="fr">Calorimetry: Heat taken up by a body that warms' in shown
    assert "Résultat en J. Source: definition of the specific heat." in shown
