"""From the engine's objects to plain arrays: the one place where a calculation becomes a Solution."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np
from pyscf import gto

from scission.solution import Solution

from . import scf
from .bond_orders import mayer_orders
from .ci_vectors import VectorFacts
from .molecule import root_overlap
from .orbitals import natural_occupations
from .stability import triplet_instability


def solution_of_field(
    field: Any, spec: dict[str, Any], diagnose: bool, bonds: Sequence[Sequence[int]] = ()
) -> Solution:
    """Return a mean-field reference as a Solution.

    ``diagnose`` adds what costs more than a look: stability eigenvalue, natural occupations and the
    orders of ``bonds`` (pairs of atoms).
    """
    mole: gto.Mole = field.mol
    orbitals = scf.orbitals_of(field)
    energies = np.asarray(field.mo_energy)
    solution = Solution(
        reference=spec["reference"],
        correlation="none",
        converged=bool(field.converged),
        energy=float(field.e_tot),
        n_electrons=(int(mole.nelec[0]), int(mole.nelec[1])),
        spin=mole.spin / 2.0,
        mo_coeff=orbitals.coeff,
        mo_occ=orbitals.occ,
        overlap=mole.intor_symmetric("int1e_ovlp"),
        mo_energy=energies if energies.ndim == 2 else energies[None],
        s2=float(field.spin_square()[0]),
        energies={"reference": float(field.e_tot), "nuclear": float(mole.energy_nuc())},
        dipole=dipole_moment(field),
    )
    if diagnose:
        _diagnose(field, solution)
        alpha, beta = densities_by_spin(field)
        solution.bond_orders = mayer_orders(mole, alpha, beta, bonds, solution.overlap)
    return solution


def densities_by_spin(field: Any) -> tuple[Any, Any]:
    """Return the alpha and beta densities, each (n_ao, n_ao), of any determinant."""
    density = np.asarray(field.make_rdm1())
    return (density[0], density[1]) if density.ndim == 3 else (density / 2.0, density / 2.0)


def take_facts(solution: Solution, facts: VectorFacts) -> None:
    """Give a Solution what the CI vector of its active space (or full CI) says."""
    solution.natural_occupations = facts.natural_occupations
    solution.spin_occupations = facts.spin_occupations
    solution.leading_weight = facts.leading_weight
    solution.orbital_weights = facts.orbital_weights


def dipole_moment(field: Any, density: Any = None) -> Any:
    """Return the dipole moment, (3,) atomic units, with the centre of nuclear charge as origin."""
    mole = field.mol
    charges = mole.atom_charges()
    total = charges.sum()
    centre = charges @ mole.atom_coords() / total if total else np.zeros(3)
    with mole.with_common_orig(centre):
        integrals = mole.intor_symmetric("int1e_r", comp=3)
    density = field.make_rdm1() if density is None else density
    density = density.sum(axis=0) if np.ndim(density) == 3 else density
    nuclear = charges @ (mole.atom_coords() - centre)
    return nuclear - np.einsum("xij,ji->x", integrals, density)


def _diagnose(field: Any, solution: Solution) -> None:
    """Add stability and natural occupations where the kind of reference defines them."""
    if solution.reference in ("RHF", "RKS") and field.converged and field.mol.nelectron > 0:
        has_virtuals = np.any(solution.mo_occ == 0)
        solution.triplet_stability = triplet_instability(field)[0] if has_virtuals else None
    if solution.reference in ("UHF", "UKS"):
        root, _ = root_overlap(field.mol)
        density = np.asarray(field.make_rdm1()).sum(axis=0)
        solution.natural_occupations = natural_occupations(density, root)[0]
