"""Counting electrons, orbitals and determinants without a calculation."""

from dataclasses import dataclass
from math import comb

from scission.campaign.model import Level, Molecule
from scission.campaign.names import ELEMENTS, AtomBasis, basis_on, core_orbitals


@dataclass(frozen=True)
class Counts:
    """Electrons (outside ECPs), spatial basis functions and usual core orbitals of a molecule at a level."""

    electrons: int
    unpaired: int
    functions: int
    core: int

    @property
    def alpha(self) -> int:
        """Electrons of the majority spin."""
        return (self.electrons + self.unpaired) // 2

    @property
    def beta(self) -> int:
        """Electrons of the minority spin."""
        return (self.electrons - self.unpaired) // 2


def all_electrons(molecule: Molecule) -> int:
    """Electrons of the molecule, those of the cores included."""
    return sum(ELEMENTS[symbol] for symbol in molecule.symbols) - molecule.charge


def atom_bases(molecule: Molecule, level: Level) -> dict[str, AtomBasis | None]:
    """Basis on each element of the molecule, None where the level has none for it."""
    names = {symbol: level.basis_of(symbol) for symbol in dict.fromkeys(molecule.symbols)}
    return {symbol: basis_on(name, symbol) if name else None for symbol, name in names.items()}


def count(molecule: Molecule, level: Level) -> Counts | None:
    """Counts of a molecule at a level, None where the level has no basis for one of its elements."""
    bases = atom_bases(molecule, level)
    atoms = [(symbol, bases[symbol]) for symbol in molecule.symbols]
    known = [(symbol, basis) for symbol, basis in atoms if basis is not None]
    if len(known) != len(atoms):
        return None
    return Counts(
        electrons=all_electrons(molecule) - sum(basis.ecp_core for _, basis in known),
        unpaired=molecule.multiplicity - 1,
        functions=sum(basis.functions for _, basis in known),
        core=sum(core_orbitals(symbol, basis.ecp_core) for symbol, basis in known),
    )


def determinants(orbitals: int, alpha: int, beta: int) -> int:
    """Slater determinants of alpha and beta electrons in spatial orbitals, symmetry not used."""
    return comb(orbitals, alpha) * comb(orbitals, beta)


def configurations(orbitals: int, electrons: int, unpaired: int) -> int:
    """Configuration state functions of a spin, by Weyl's formula.

    (2S+1)/(n+1) C(n+1, N/2-S) C(n+1, N/2+S+1) for N electrons in n orbitals;
    Weyl-Paldus dimension formula, Paldus, J. Chem. Phys. 61, 5321 (1974) (from memory).
    """
    low, high = (electrons - unpaired) // 2, (electrons + unpaired) // 2 + 1
    return (unpaired + 1) * comb(orbitals + 1, low) * comb(orbitals + 1, high) // (orbitals + 1)
