"""The balance's element balance is right against published enthalpies and against libraries of constants."""

from __future__ import annotations

import csv
import re
from pathlib import Path

import periodictable
import pytest
import scipy.constants

from sheetcal.check.balance import atoms
from sheetcal.check.balance.atoms import Moles

TABLE = Path(__file__).parent.parent / "published" / "combustion_net.csv"
PARTS = {"H": atoms.H, "C": atoms.C, "N": atoms.N, "O": atoms.O, "S": atoms.S, "Cl": atoms.CL}


def rows() -> list[dict[str, str]]:
    with TABLE.open(encoding="utf-8", newline="") as lines:
        return list(csv.DictReader(lines))


def counts(formula: str) -> dict[str, int]:
    found = re.findall(r"(Cl|[CHNOS])(\d*)", formula)
    assert "".join(symbol + number for symbol, number in found) == formula
    return {symbol: int(number or 1) for symbol, number in found}


def molecule(formula: str) -> tuple[Moles, float]:
    """Moles of elements in one mole, and its molar mass."""
    has = counts(formula)
    listed = [float(has.get(symbol, 0)) for symbol in ("H", "O", "N", "C", "S", "Cl")]
    return Moles(*listed), sum(PARTS[symbol] * number for symbol, number in has.items())


def net_of(row: dict[str, str]) -> float:
    fuel, mass = molecule(row["formula"])
    gaseous = 1.0 if row["phase"] == "g" else 0.0
    return float(row["gross_cv_J_g"]) + atoms.release_at_constant_pressure(fuel, gaseous) / mass


def test_gross_to_net_of_41_compounds() -> None:
    """Gross at constant volume to net at constant pressure: within 0.001 % of the published 41 compounds.

    Source: combustion_net.csv, formation enthalpies of the CRC Handbook, ATcT and others as each row names.
    """
    plain = [row for row in rows() if not row["chlorine_product"]]
    assert len(plain) == 41
    worst = max(abs(net_of(row) / float(row["net_cp_J_g"]) - 1) for row in plain)
    assert worst < 1e-5, worst


def test_gas_change_and_water_of_41_compounds() -> None:
    """Moles of gas and of water are the published ones, exactly."""
    plain = [row for row in rows() if not row["chlorine_product"]]
    assert len(plain) == 41
    for row in plain:
        fuel, _ = molecule(row["formula"])
        gaseous = 1.0 if row["phase"] == "g" else 0.0
        assert atoms.gas_change(fuel, gaseous) == pytest.approx(float(row["dn_gas"]), abs=1e-12)
        assert atoms.water_made(fuel) == pytest.approx(float(row["n_H2O"]), abs=1e-12)


def test_chlorine_rows_by_name() -> None:
    """4-chlorobenzoic acid and chlorobenzene: net with HCl(g) within 0.001 %, release of HCl within 10 J/mol."""
    listed = {row["name"]: row for row in rows() if row["chlorine_product"]}
    assert sorted(listed) == ["4-chlorobenzoic acid", "chlorobenzene"]
    for row in listed.values():
        assert net_of(row) == pytest.approx(float(row["net_cp_J_g"]), rel=1e-5)
        shift = 1000 * (float(row["dcH_Cl_as_HClg_kJ_mol"]) - float(row["dcH298_kJ_mol"]))
        assert shift == pytest.approx(atoms.HCL_RELEASE, abs=10.0)


def test_constants_against_libraries() -> None:
    """R is the SI's, and the atomic weights are IUPAC's conventional ones, within their last digit."""
    assert pytest.approx(scipy.constants.R, rel=1e-12) == atoms.R
    assert atoms.VAPORISATION == 44004.0
    listed = {"H": 1e-4, "C": 1e-3, "N": 1e-3, "O": 1e-3, "S": 1e-2, "Cl": 1e-2}
    for symbol, digit in listed.items():
        assert PARTS[symbol] == pytest.approx(periodictable.elements.symbol(symbol).mass, abs=digit)


def test_acids_against_printed_heats() -> None:
    """Nitric acid gives 59.7 to 60.1 kJ/mol, sulfuric 301 to 302 kJ/mol (94 J/g per %, GOST 21261-91)."""
    assert 59_700 < atoms.NITRIC_ENERGY < 60_100
    assert 301_000 < atoms.SULFURIC_ENERGY < 302_000
    assert pytest.approx(94.0, abs=0.5) == 0.01 * atoms.SULFURIC_ENERGY / atoms.S
