"""Isotope masses against the engine's own table."""

import pytest
from pyscf.data import elements
from scission.masses import isotope_mass, reduced_mass
from scission.units import DALTON_IN_ELECTRON_MASS

# The engine lists a mass of 98.907 for Tc, which is not its main isotope (98) but Tc-99.
COMPARED = [symbol for symbol in elements.ELEMENTS[1:104] if symbol != "Tc"]


@pytest.mark.parametrize("symbol", COMPARED)
def test_isotope_masses_agree_with_the_engines_table(symbol):
    """Every element agrees within a part per million; the engine's table is older and shorter."""
    engine = elements.COMMON_ISOTOPE_MASSES[elements.ELEMENTS.index(symbol)]

    assert isotope_mass(symbol) / DALTON_IN_ELECTRON_MASS == pytest.approx(engine, rel=1e-6)


def test_carbon_defines_the_unit():
    """Carbon-12 has 12 dalton by definition."""
    assert isotope_mass("C") == 12.0 * DALTON_IN_ELECTRON_MASS


def test_reduced_mass_of_equal_partners_is_half():
    """Two equal fragments have half the mass of one."""
    assert reduced_mass(["C", "H"], ["C", "H"]) == pytest.approx((isotope_mass("C") + isotope_mass("H")) / 2)


def test_unknown_element_and_empty_fragment_are_errors():
    """Both say which value is wrong."""
    with pytest.raises(ValueError, match="'Xx'"):
        isotope_mass("Xx")
    with pytest.raises(ValueError, match="no atoms"):
        reduced_mass(["H"], [])
