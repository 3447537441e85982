"""Conversion factors agree with a general-purpose reference library."""

import pytest
from scipy import constants
from scission import units

CODATA_NAMES = {
    "BOHR_IN_METRE": "Bohr radius",
    "HARTREE_IN_JOULE": "Hartree energy",
    "HARTREE_IN_EV": "Hartree energy in eV",
    "ELECTRON_MASS_IN_KG": "electron mass",
    "DALTON_IN_KG": "atomic mass constant",
    "AVOGADRO_PER_MOL": "Avogadro constant",
    "SPEED_OF_LIGHT_IN_METRE_PER_S": "speed of light in vacuum",
    "AU_DIPOLE_IN_COULOMB_METRE": "atomic unit of electric dipole mom.",
}


@pytest.mark.parametrize(("name", "codata"), CODATA_NAMES.items())
def test_base_constants_are_those_of_codata(name: str, codata: str) -> None:
    """Every constant written out equals the CODATA value that scipy carries."""
    expected = constants.physical_constants[codata][0]

    assert getattr(units, name) == pytest.approx(expected, rel=1e-12)


def test_derived_factors_agree_with_codata_conversions() -> None:
    """Factors built here agree with the conversions CODATA gives itself, to their published digits."""
    per_metre = constants.physical_constants["hartree-inverse meter relationship"][0]
    ratio = constants.physical_constants["atomic mass constant energy equivalent in MeV"][0]
    electron = constants.physical_constants["electron mass energy equivalent in MeV"][0]

    assert pytest.approx(per_metre / 100.0, rel=1e-12) == units.HARTREE_IN_PER_CM
    assert pytest.approx(ratio / electron, rel=1e-9) == units.DALTON_IN_ELECTRON_MASS
    assert pytest.approx(627.5095, abs=1e-4) == units.HARTREE_IN_KCAL_PER_MOL  # handbook value, from memory
    assert pytest.approx(2.541746, abs=1e-6) == units.AU_DIPOLE_IN_DEBYE  # handbook value, from memory
