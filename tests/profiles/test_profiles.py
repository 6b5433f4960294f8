"""Every profile loads, and each of its numbers has unit, source and standing."""

import periodictable
import pytest
import scipy.constants

from sheetcal import profiles, units
from sheetcal.errors import BadInput
from sheetcal.profiles import Coefficient

NAMES = ["astm-d240", "astm-d5865", "first-principles", "iso-18125", "iso-1928", "iso-21654"]
RT = scipy.constants.R * 298.15
HYDROGEN, NITROGEN, OXYGEN, SULFUR, CHLORINE = (
    float(getattr(periodictable, e).mass) for e in ("H", "N", "O", "S", "Cl")
)
WATER = 2 * HYDROGEN + OXYGEN
VAPORISATION = 285830 - 241826  # CODATA key values for thermodynamics (1989)


def exact(name: str) -> float:
    return profiles.load("first-principles").coefficients[name].value


def rows() -> list[tuple[str, Coefficient]]:
    return [(name, one) for name in profiles.names() for one in profiles.load(name).coefficients.values()]


def test_the_six_profiles_are_found_by_file_name() -> None:
    """Discovery is by file name: no list to keep."""
    assert profiles.names() == NAMES


def test_every_number_has_unit_source_standing_and_label() -> None:
    """No coefficient without what an assessor asks of it."""
    assert len(rows()) > 270
    for profile, one in rows():
        where = f"{profile}: {one.name}"
        units.parse(one.unit)
        assert one.standing in ("derived", "published", "memory"), where
        assert len(one.source) > 5 and len(one.label) > 5, where
        assert ("memory" in one.source or "practice" in one.source) <= (one.standing == "memory"), where
        assert one.name == one.name.lower() and one.name.isidentifier(), where


def test_one_name_has_one_unit_in_all_profiles() -> None:
    """A formula names a coefficient without knowing the profile, so its unit never changes."""
    seen: dict[str, str] = {}
    for _, one in rows():
        assert seen.setdefault(one.name, one.unit) == one.unit, one.name


def test_unknown_limits_are_absent() -> None:
    """A limit that no source gives is not invented: the lab file must give it."""
    for name in ("iso-21654", "first-principles"):
        assert "repeatability_limit" not in profiles.load(name).coefficients
        assert "reproducibility_limit" not in profiles.load(name).coefficients
    assert "calibration_rsd_limit" not in profiles.load("astm-d240").coefficients
    assert profiles.load("iso-21654").value("repeatability_limit", "J/g") is None


def test_constants_against_scipy_and_periodictable() -> None:
    """Constants of nature equal those of two reference libraries."""
    assert exact("gas_constant") == pytest.approx(scipy.constants.R, rel=1e-14)
    assert exact("reference_temperature") == scipy.constants.zero_Celsius + 25
    assert exact("water_vaporisation") == VAPORISATION
    assert exact("chlorine_hydrogen") == pytest.approx(HYDROGEN / CHLORINE, abs=5e-5)


@pytest.mark.parametrize(
    ("name", "value", "tolerance"),
    [
        ("net_p_hydrogen", 0.01 * (VAPORISATION / 2 - RT / 4) / HYDROGEN, 2e-3),
        ("net_p_oxygen", 0.01 * RT / 2 / OXYGEN, 1e-5),
        ("net_p_nitrogen", 0.01 * RT / 2 / NITROGEN, 1e-5),
        ("net_p_moisture", 0.01 * VAPORISATION / WATER, 1e-3),
        ("net_v_hydrogen", 0.01 * (VAPORISATION - RT) / 2 / HYDROGEN, 2e-3),
        ("net_v_moisture", 0.01 * (VAPORISATION - RT) / WATER, 1e-3),
        ("sulfur_as_nitric", 0.01 * 2 * 60e3 / SULFUR, 0.1),
        ("chlorine_as_nitric", 0.01 * 60e3 / CHLORINE, 0.05),
        ("sulfuric_heat", 0.01 * 301.7e3 / SULFUR, 0.05),
    ],
)
def test_derived_coefficients_follow_from_the_constants(name: str, value: float, tolerance: float) -> None:
    """The exact coefficients are recomputed from R, CODATA enthalpies and atomic weights.

    Tolerance: half the last digit the profile carries, or the spread of the atomic weights.
    """
    assert exact(name) == pytest.approx(value, abs=tolerance)


def test_american_coefficients_follow_from_their_own_vaporisation() -> None:
    """ASTM D5865's figures follow from 43 985 J/mol to the digits kept."""
    d5865 = profiles.load("astm-d5865").coefficients
    assert d5865["net_p_hydrogen"].value == pytest.approx(0.01 * (43985 / 2 - RT / 4) / HYDROGEN, abs=5e-3)
    assert d5865["net_p_moisture"].value == pytest.approx(0.01 * 43985 / WATER, abs=1e-3)
    assert d5865["net_v_hydrogen"].value == pytest.approx(0.01 * (43985 - RT) / 2 / HYDROGEN, abs=5e-3)
    assert d5865["net_v_moisture"].value == pytest.approx(0.01 * (43985 - RT) / WATER, abs=1e-3)


@pytest.mark.parametrize(("name", "more"), [("astm-d5865", 55.2), ("astm-d240", 58.0)])
def test_american_sulfur_bookkeeping_keeps_its_sum(name: str, more: float) -> None:
    """All acid as nitric plus so much per g and % S: the split shown by acid has the same sum."""
    values = profiles.load(name).coefficients
    assert values["sulfuric_heat"].value - values["sulfur_as_nitric"].value == pytest.approx(more, abs=1e-9)


def test_rounded_net_coefficients_stay_within_the_balance_tolerance() -> None:
    """On a fuel with 15 % H, 45 % O and 10 % N no ISO profile leaves the exact net value by over 4.8 J/g."""
    for name in ("iso-18125", "iso-1928", "iso-21654", "astm-d5865"):
        values = profiles.load(name).coefficients
        shifts = [
            share * (values[f"net_p_{element}"].value - exact(f"net_p_{element}"))
            for element, share in (("hydrogen", 15), ("oxygen", 45), ("nitrogen", 10))
        ]
        assert abs(sum(shifts)) < values["balance_coefficient"].value


def test_values_convert() -> None:
    """A coefficient is given in whatever unit fits, and refused in one that does not."""
    iso = profiles.load("iso-1928")
    assert iso.value("repeatability_limit", "MJ/kg") == pytest.approx(0.12)
    assert iso.value("unknown_energy", "kJ/g") == pytest.approx(48)
    with pytest.raises(BadInput):
        iso.value("repeatability_limit", "K")


def test_a_laboratory_restates_what_it_must() -> None:
    """An override keeps unit and label, says where it comes from, and may fill an absent limit."""
    own = profiles.load("iso-21654").restated({"repeatability_limit": 300.0, "net_p_hydrogen": 212.1}, "lab.toml")
    limit = own.coefficients["repeatability_limit"]
    assert (limit.value, limit.unit, limit.standing, limit.source) == (300.0, "J/g", "laboratory", "lab.toml")
    assert own.coefficients["net_p_hydrogen"].value == 212.1
    assert profiles.load("iso-21654").coefficients["net_p_hydrogen"].value == 212.2
    with pytest.raises(BadInput, match="'net_p_hydrogen'"):
        own.restated({"net_p_hydrogn": 1.0}, "lab.toml")


def test_an_unknown_profile_names_the_nearest() -> None:
    """A wrong name is refused with the right one."""
    with pytest.raises(BadInput, match="'iso-1928'"):
        profiles.load("iso1928")


def test_class_ranges() -> None:
    """Each class has its usual ranges; one that is not listed has the common ones."""
    assert profiles.class_ranges("coal")["hydrogen"] == (2.0, 6.0)
    assert profiles.class_ranges("biomass")["hydrogen"] == (4.5, 7.0)
    assert profiles.class_ranges("sludge")["ash"] == (20.0, 60.0)
    assert dict(profiles.class_ranges("peat")) == {"sulfur": (0.0, 4.0), "chlorine": (0.0, 0.5)}


def test_texts_say_what_the_numbers_cannot() -> None:
    """Each profile names the basis of its repeatability and the form of its net value."""
    for name in NAMES:
        texts = profiles.load(name).texts
        assert texts["r_basis"] in ("as analysed", "dry")
        assert "constant pressure" in texts["net_form"]
        assert profiles.load(name).version == 1
