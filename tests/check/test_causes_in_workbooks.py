"""The cause of a wrong value is named from the workbook it stands in: its equation, its neighbours, its history."""

from __future__ import annotations

import random
from collections.abc import Callable, Mapping
from pathlib import Path

import pytest
from planting import CONTROL, Book, check, coal, edited, filled, issue, lab, number, write

from sheetcal.formulas.compute import compute
from sheetcal.inputs.lab_reader import parse_lab
from sheetcal.inputs.text import TextFile
from sheetcal.kinds.record import constant_cells
from sheetcal.model import Finding, Value

Values = Mapping[str, Value]


@pytest.fixture(scope="module")
def fuel(tmp_path_factory: pytest.TempPathFactory) -> Book:
    return filled(issue("fuel", tmp_path_factory.mktemp("issue"), [CONTROL, coal("S-1")], spare=1))


@pytest.fixture(scope="module")
def calibration(tmp_path_factory: pytest.TempPathFactory) -> Book:
    return filled(issue("calibration", tmp_path_factory.mktemp("issue")))


@pytest.fixture(scope="module")
def values(fuel: Book) -> Values:
    return compute(fuel.plan, fuel.record, {**fuel.record.prefilled, **fuel.readings})


@pytest.fixture(scope="module")
def data(fuel: Book) -> bytes:
    return fuel.data()


def typed(book: Book, data: bytes, folder: Path, one: str, value: float) -> Finding:
    """The finding on a result in whose place a person typed a number."""
    verdict = check(write(folder, edited(data, {book.cell(one): number(value)})))
    return next(finding for finding in verdict.findings if finding.field == one)


def heat(values: Values, *names: str) -> float:
    """Heats of run 4 per gram of sample."""
    return sum(float(values[f"run4.{name}"] or 0.0) for name in names) / float(values["run4.mass"] or 1.0)


Slip = tuple[str, Callable[[Values], float], str]
HEATS = ("wire_heat", "nitric_heat", "sulfuric_heat")
SLIPS: list[Slip] = [
    ("run4.gross_run", lambda v: round(v["run4.gross_run"] + heat(v, "wire_heat"), 1), "wire * left out"),
    ("run4.gross_run", lambda v: round(v["run4.gross_run"] - heat(v, "nitric_heat"), 1), "nitric acid * counted twice"),
    ("run4.gross_run", lambda v: round(v["run4.gross_run"] + 2 * heat(v, "nitric_heat")), "nitric acid * wrong sign"),
    ("run4.gross_run", lambda v: round(v["run4.gross_run"] - 3.184 * heat(v, "wire_heat"), 1), "wire * calories"),
    ("run4.gross_run", lambda v: round(v["run4.gross_run"] + heat(v, *HEATS), 1), "all corrections * left out"),
    ("run4.gross_run", lambda v: round(v["run4.gross_run"] + 2 * heat(v, *HEATS)), "all corrections * wrong sign"),
    ("run4.gross_run", lambda v: round(v["run4.gross_run"] / 4.184, 1), "thermochemical calories"),
    ("run4.gross_run", lambda v: round(v["run4.gross_run"] / 2.326), "Btu/lb"),
    ("run4.gross_run", lambda v: round(v["run4.gross_run"] / 1000, 3), "kJ and J"),
    ("run4.gross_run", lambda v: round(v["run5.gross_run"], 1), "the value of run5"),
    ("run4.corrected_rise", lambda v: round(v["run4.corrected_rise"], 2), "a rounded figure"),
    ("run4.corrected_rise", lambda v: round(v["run4.corrected_rise"] + v["run4.exchange_correction"], 4), "exchanged"),
    ("run4.total_heat", lambda v: round(v["run4.corrected_rise"] * 10175.4), "heat capacity of vessel A2"),
    ("run4.effective_heat_capacity", lambda v: 10175.4, "heat capacity of vessel A2"),
    ("sample2.gross_dry", lambda v: round(v["sample2.gross_analysed"], 1), "moisture factor * left out"),
    ("sample2.gross_dry", lambda v: round(v["run4.gross_run_dry"], 1), "run5 was probably left out of the mean"),
    ("sample2.gross_as_received", lambda v: round(v["sample2.gross_dry"]), "moisture factor * left out"),
    ("sample2.gross_daf", lambda v: round(v["sample2.gross_dry"], 1), "ash factor * left out"),
    ("sample2.net_p_as_received", lambda v: round(v["sample2.net_p_dry"], 1), "total moisture"),
    ("sample2.gross_dry_reported", lambda v: round(v["sample2.gross_analysed"], -1), "as analysed"),
]


@pytest.mark.parametrize(("one", "slip", "words"), SLIPS)
def test_a_figure_typed_over_shows_how_it_came_about(
    one: str, slip: Callable[[Values], float], words: str, fuel: Book, data: bytes, values: Values, tmp_path: Path
) -> None:
    found = typed(fuel, data, tmp_path, one, slip(values))
    said = " | ".join(found.causes)
    assert found.likely_cause == found.causes[0]
    assert all(part in said for part in words.split(" * ")), said


def test_a_run_left_out_of_the_mean_of_a_calibration(calibration: Book, tmp_path: Path) -> None:
    one = "sheet.effective_heat_capacity"
    whole = compute(calibration.plan, calibration.record, {**calibration.record.prefilled, **calibration.readings})
    ids = [f"run{run}.heat_capacity_counted" for run in range(1, 6)]
    runs = sorted(ids, key=lambda name: abs(float(whole[name] or 0.0) - float(whole[one] or 0.0)))
    kept = [float(whole[name] or 0.0) for name in runs[:-1]]
    found = typed(calibration, calibration.data(), tmp_path, one, round(sum(kept) / len(kept), 4))
    assert found.likely_cause == f"{runs[-1].partition('.')[0]} was probably left out of the mean"


def constant(book: Book, folder: Path, one: str, value: float, **against: object) -> Finding:
    """The finding on a constant that was changed in its cell; nothing is recalculated."""
    cell = {name: where for name, where, _, _ in constant_cells(book.plan.kind, book.record)}[one]
    path = write(folder, edited(book.data(), {f"Constants!{cell}": number(value)}))
    return next(found for found in check(path, **against).findings if found.code == "constant-altered")


def test_a_certificate_for_the_other_way_of_weighing(calibration: Book, tmp_path: Path) -> None:
    """26 436 J/g of mass in vacuum is 26 456 of mass weighed in air: 1.2 kg/m3 on 1320 and on 8000 kg/m3."""
    lot = [str(row["lot"]) for row in calibration.record.tables["certified"]].index("BA-31") + 1
    right = calibration.record.tables["certified"][lot - 1]["value"]
    assert isinstance(right, float)
    in_air = right * (1 - 1.2 / 8000) / (1 - 1.2 / 1320)
    found = constant(calibration, tmp_path, f"table.certified.value[{lot}]", round(in_air, 1))
    assert found.likely_cause is not None
    assert "weighed in air" in found.likely_cause


def test_the_value_of_the_other_vessel(fuel: Book, tmp_path: Path) -> None:
    found = constant(fuel, tmp_path, "table.vessel.heat_capacity[1]", 10175.4)
    assert found.likely_cause == "the value of vessel A2 was probably taken"


def test_the_calibration_before_last_is_known_by_the_lab_file(fuel: Book, tmp_path: Path) -> None:
    """Old blocks stay in a lab file: with --lab a superseded heat capacity is named, without it is not."""
    block = lab().source.text.partition('[[calibration]]\nvessel = "A1"')[2].partition("[[calibration]]")[0]
    old = block.replace("10138.7", "10121.3").replace('"C1"', '"B1"').replace("2025-01-15", "2024-07-10")
    older = block.replace("10138.7", "10117.9").replace('"C1"', '"A1"').replace("2025-01-15", "2024-01-12")
    text = lab().source.text.replace(block, f'{block}[[calibration]]\nvessel = "A1"{old}[[calibration]]\nvessel = "A1"{older}', 1)  # fmt: skip # noqa: E501
    history = parse_lab(TextFile(lab().source.path, lab().sha256, text))
    assert len([one for one in history.calibrations if one.vessel == "A1"]) == 3
    one = "table.vessel.heat_capacity[1]"
    found = constant(fuel, tmp_path, one, 10117.9, lab=history)
    assert found.likely_cause is not None
    assert found.likely_cause.startswith("the heat capacity of the calibration before the one before last")
    assert constant(fuel, tmp_path, one, 10117.9).likely_cause is None
    path = write(tmp_path, edited(fuel.data(), {fuel.cell("run4.effective_heat_capacity"): number(10121.3)}))
    named = next(one for one in check(path, lab=history).findings if one.field == "run4.effective_heat_capacity")
    assert str(named.likely_cause).startswith("the heat capacity of the calibration before last")


def test_random_figures_have_no_cause(fuel: Book, data: bytes, values: Values, tmp_path: Path) -> None:
    """Of figures typed over at random, up to a fifth off, in at most a few per cent a cause is named."""
    source = random.Random(20)
    places = ["run4.gross_run", "sample2.gross_dry", "run4.corrected_rise", "sample2.net_p_as_received", "run5.mass"]
    named = []
    for turn in range(60):
        one = places[turn % len(places)]
        right = float(values[one] or 0.0)
        digits = 1 if right > 100 else 4
        off = 10 ** source.uniform(-3.0, -0.7) * source.choice((-1, 1))
        named.append(typed(fuel, data, tmp_path, one, round(right * (1.0 + off), digits)).likely_cause)
    assert sum(one is not None for one in named) <= 3, named


def test_a_balance_that_starts_from_the_figure_typed_over_says_nothing_of_its_own(
    calibration: Book, tmp_path: Path
) -> None:
    """The relative deviation balances from the mean; a mean typed over is one fault, not two."""
    path = write(
        tmp_path, edited(calibration.data(), {calibration.cell("sheet.effective_heat_capacity"): number(10150.0)})
    )
    assert [one.code for one in check(path).findings] == ["result-typed-over"]
