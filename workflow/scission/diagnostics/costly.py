"""Diagnostics that need a calculation of their own: only for campaigns that include them."""

from __future__ import annotations

import numpy as np

from scission.solution import Solution
from scission.units import HARTREE_IN_KCAL_PER_MOL

from .types import Absent

GRIMME_HANSEN = "Grimme and Hansen, Angew. Chem. Int. Ed. 54, 12308 (2015)"
SCHULTZ = "Schultz, Zhao and Truhlar, J. Phys. Chem. A 109, 11127 (2005)"
LOEWDIN = "Loewdin, Phys. Rev. 97, 1474 (1955)"
KARTON = "Karton, Rabinovich, Martin and Ruscic, J. Chem. Phys. 125, 144108 (2006)"

_NOT_CONVERGED = Absent("its own calculation did not converge")


def n_fod(solution: Solution) -> float | Absent:
    """N_FOD = sum over occupied spin orbitals (1 - f) + over empty ones f, electrons.

    f (n_spin, n_mo) are the Fermi occupations of a Kohn-Sham determinant at an electronic temperature (TPSS,
    5000 K, the level's own basis); the n_sigma largest of each spin count as occupied.  The spread of the
    published values over functionals is taken care of by T = 20000 K a_x + 5000 K.  Grimme and Hansen (2015).
    """
    if solution.fractional_occupations is None:
        return Absent("no fractional occupations were computed")
    if not solution.converged:
        return _NOT_CONVERGED
    n_spin = len(solution.fractional_occupations)
    total = 0.0
    for f, n in zip(solution.fractional_occupations, solution.n_electrons, strict=False):
        ordered = np.sort(f)[::-1]
        total += float(np.sum(1.0 - ordered[:n]) + np.sum(ordered[n:])) * (2.0 if n_spin == 1 else 1.0)
    return total


def b1(solution: Solution) -> float | Absent:
    """Functional sensitivity of the bond, BE[BLYP] - BE[B1LYP], kcal/mol, one bond.

    BE(R) is the energy of the separate fragments (unrestricted, their lowest neutral spins) less that of
    the molecule at length R (restricted for a singlet), both at the geometries of the scan and in the
    level's own basis.  At the minimum this is the published B1 but for its use of BLYP geometries; along a
    bond it grows as exact exchange punishes the restricted determinant.  Schultz, Zhao and Truhlar (2005).
    """
    local, hybrid = solution.energies.get("binding_blyp"), solution.energies.get("binding_b1lyp")
    if local is None or hybrid is None:
        return Absent("no binding energies with the two functionals were computed")
    if not solution.converged:
        return _NOT_CONVERGED
    return (local - hybrid) * HARTREE_IN_KCAL_PER_MOL


def cc_hono(solution: Solution) -> float | Absent:
    """Occupation of the last strongly occupied natural orbital of the CCSD density, electrons.

    From the unrelaxed density with lambda amplitudes (n_mo,), closed shells.  Meaningless where CCSD has
    failed: the density of an expansion that diverges has occupations below 0 or above 2.  Loewdin (1955).
    """
    return _cc_frontier(solution, occupied=True)


def cc_luno(solution: Solution) -> float | Absent:
    """Occupation of the first weakly occupied natural orbital of the CCSD density, electrons."""
    return _cc_frontier(solution, occupied=False)


def tae_share(_: Solution) -> float | Absent:
    """Share of (T) in the binding energy against the scan's own fragments, percent.

    100 (BE[CCSD(T)] - BE[CCSD]) / BE[CCSD(T)], BE the energy of the fragments less that of the molecule.  For
    a diatomic molecule it is %TAE[(T)]: below 5 mild, 5 to 10 moderate, above 10 severe.  Filled in by the
    analysis, which knows the fragments.  Karton et al. (2006).
    """
    return Absent("filled in by the analysis where the energies of the fragments are known")


_UNPHYSICAL = 0.05
"""Occupations this far beyond 0 and 2 come from an expansion that has failed (common practice, no source)."""


def _cc_frontier(solution: Solution, occupied: bool) -> float | Absent:
    n = solution.cc_occupations
    if n is None:
        return Absent("no coupled-cluster density of a closed shell was computed")
    if not solution.converged:
        return _NOT_CONVERGED
    if n.max() > 2.0 + _UNPHYSICAL or n.min() < -_UNPHYSICAL:
        return Absent(f"the CCSD density is unphysical: occupations from {n.min():.2f} to {n.max():.2f}")
    pair = solution.n_electrons[1]
    index = pair - 1 if occupied else pair
    return float(n[index]) if 0 <= index < n.size else Absent("the basis holds no such orbital")
