"""Counting electrons, functions, determinants and configurations."""

import pytest
from scission.campaign import Counts, Level, Molecule, count
from scission.campaign.electrons import configurations, determinants


def _count(atoms: str, basis: object, charge: int = 0, multiplicity: int = 1) -> Counts | None:
    molecule = Molecule(charge=charge, multiplicity=multiplicity, atoms=atoms)
    return count(molecule, Level.model_validate({"reference": "UHF", "basis": basis}))


def test_water() -> None:
    """Water in cc-pVDZ has 14 functions on O and 5 on each H: Dunning, J. Chem. Phys. 90, 1007 (1989)."""
    counts = _count("O 0 0 0\nH 0 0 1\nH 1 0 0", "cc-pVDZ")

    assert counts == Counts(electrons=10, unpaired=0, functions=24, core=1)


def test_electrons_in_a_core_potential_do_not_count() -> None:
    """Iodine in def2-SVP keeps 25 of 53 electrons: Peterson et al., J. Chem. Phys. 119, 11113 (2003)."""
    counts = _count("I 0 0 0", "def2-SVP", multiplicity=2)

    assert counts is not None
    assert (counts.electrons, counts.alpha, counts.beta) == (25, 13, 12)


def test_no_basis_no_count() -> None:
    """Without a basis on each element there is nothing to count."""
    assert _count("O 0 0 0\nH 0 0 1", {"H": "STO-3G"}, multiplicity=2) is None


def test_determinants_of_water() -> None:
    """Frozen-core full CI of water in cc-pVDZ: 8 electrons in 23 orbitals, C(23,4) = 8855 strings a spin."""
    assert determinants(23, 4, 4) == 8855**2


@pytest.mark.parametrize(
    ("orbitals", "electrons", "unpaired", "functions"),
    [(2, 2, 0, 3), (2, 2, 2, 1), (3, 3, 1, 8), (6, 6, 0, 175), (1, 1, 1, 1), (4, 4, 4, 1)],
)
def test_configurations(orbitals: int, electrons: int, unpaired: int, functions: int) -> None:
    """Weyl's formula: 3 singlets of 2 in 2, 8 doublets of 3 in 3, 175 singlets of 6 in 6 (textbook)."""
    assert configurations(orbitals, electrons, unpaired) == functions
