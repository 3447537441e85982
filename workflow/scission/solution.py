"""What a calculation leaves behind, as plain arrays: the only thing diagnostics and records ever see."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]


@dataclass
class Solution:
    """One converged or unconverged calculation in plain numbers (hartree, bohr, electrons).

    Arrays that depend on spin carry it as their first axis: length 1 for a restricted reference,
    2 (alpha, beta) otherwise.  ``None`` means that the calculation does not define the quantity.

    Attributes:
        reference: RHF, UHF, ROHF, RKS, UKS or CASSCF.
        correlation: none, MP2, CCSD, CCSD(T), FCI or NEVPT2.
        converged: whether every iteration of the calculation met its criteria.
        energy: total energy of the level, hartree; of the lowest state if there are several.
        n_electrons: electrons of each spin (alpha, beta), without those an ECP replaces.
        spin: S of the state that was asked for (half the number of unpaired electrons).
        mo_coeff: (n_spin, n_ao, n_mo) orbital coefficients.
        mo_occ: (n_spin, n_mo) occupations.
        mo_energy: (n_spin, n_mo) orbital energies, hartree; ``None`` where not canonical.
        overlap: (n_ao, n_ao) overlap of the basis functions.
        s2: expectation value of the total spin squared.
        energies: named parts of the energy, hartree (reference, correlation, triples, ...).
        state_energies: (n_states,) total energies of the states in the adiabatic order, hartree.
        natural_occupations: (n,) spin-summed natural occupations, decreasing; of the active
            space for CASSCF, of the total density for unrestricted references.
        spin_occupations: (2, n) natural occupations, 0 to 1, of the alpha and of the beta density of an
            active space or of full configuration interaction, each decreasing.
        orbital_weights: (n, 4) probability that a natural orbital of the active space is empty, holds
            one alpha, one beta electron, or both; from the one- and two-particle densities.
        bond_orders: (n_bonds,) Mayer bond orders of the stretched bonds.
        cc_occupations: (n_mo,) natural occupations of the coupled-cluster density, decreasing.
        fractional_occupations: (n_spin, n_mo) occupations, 0 to 1, of a determinant at finite temperature.
        triplet_stability: lowest eigenvalue of the restricted determinant's triplet stability
            matrix, hartree (negative: an unrestricted solution lies lower).
        leading_weight: squared weight of the leading configuration in natural orbitals, C0^2.
        t1: amplitudes by spin, each (n_occ, n_vir); one entry for a closed shell.
        t2: amplitudes: one (n_occ, n_occ, n_vir, n_vir) array for a closed shell, else the
            three spin blocks aa, ab, bb.
        n_correlated: number of correlated electrons.
        n_inactive: doubly occupied orbitals outside the space of ``natural_occupations``.
        dipole: (3,) dipole moment of the reference, atomic units, origin at the nuclear charge centre.
        notes: remarks in words, by subject (how the active space was chosen, ...).
        numbers: further scalars of a record, by the names of the schema.
        extra: further arrays that a later stage needs (CI vectors and the like), by name.
    """

    reference: str
    correlation: str
    converged: bool
    energy: float
    n_electrons: tuple[int, int]
    spin: float
    mo_coeff: Array
    mo_occ: Array
    overlap: Array
    mo_energy: Array | None = None
    s2: float | None = None
    energies: dict[str, float] = field(default_factory=dict)
    state_energies: Array | None = None
    natural_occupations: Array | None = None
    spin_occupations: Array | None = None
    orbital_weights: Array | None = None
    bond_orders: Array | None = None
    cc_occupations: Array | None = None
    fractional_occupations: Array | None = None
    triplet_stability: float | None = None
    leading_weight: float | None = None
    t1: tuple[Array, ...] | None = None
    t2: tuple[Array, ...] | None = None
    n_correlated: int | None = None
    n_inactive: int = 0
    dipole: Array | None = None
    notes: dict[str, str] = field(default_factory=dict)
    numbers: dict[str, float] = field(default_factory=dict)
    extra: dict[str, Array] = field(default_factory=dict)

    @property
    def open_shell(self) -> bool:
        """Whether the state that was asked for has unpaired electrons."""
        return self.n_electrons[0] != self.n_electrons[1]
