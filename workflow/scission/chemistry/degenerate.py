"""A definite orientation for degenerate orbitals.

Any rotation among degenerate orbitals is as good as any other, but single amplitudes (the largest T2) depend
on it: without a rule a diagnostic of a linear molecule would jump from point to point.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from pyscf import gto

Array = NDArray[np.float64]

_SAME_ENERGY = 1e-5
_WEIGHTS = {0: 1.0, 4: np.sqrt(2.0), 8: np.sqrt(3.0)}
"""x^2, y^2 and z^2 with incommensurable weights: no orientation of a molecule leaves it without a choice."""


def settle_degenerate(mole: gto.Mole, energies: Array, coeff: Array, occ: Array) -> Array:
    """Return orbitals (n_ao, n_mo) in which each degenerate set is aligned with the axes of space.

    Args:
        energies: orbital energies, (n_mo,), increasing within occupied and within empty ones.
        coeff: (n_ao, n_mo).
        occ: occupations, (n_mo,); sets of different occupation stay apart.
    """
    form: Array | None = None
    settled = np.array(coeff)
    for block in _blocks(np.asarray(energies), np.asarray(occ)):
        if form is None:
            form = _quadratic_form(mole)
        part = coeff[:, block]
        _, rotation = np.linalg.eigh(part.T @ form @ part)
        settled[:, block] = part @ rotation
    return settled


def _blocks(energies: Array, occ: Array) -> list[NDArray[np.intp]]:
    """Return the indices of each degenerate set of two or more orbitals."""
    blocks: list[NDArray[np.intp]] = []
    for value in np.unique(occ):
        same = np.flatnonzero(occ == value)
        ordered = same[np.argsort(energies[same], kind="stable")]
        cuts = np.flatnonzero(np.diff(energies[ordered]) > _SAME_ENERGY) + 1
        blocks += [b for b in np.split(ordered, cuts) if b.size > 1]
    return blocks


def _quadratic_form(mole: gto.Mole) -> Array:
    charges = mole.atom_charges()
    with mole.with_common_orig(charges @ mole.atom_coords() / max(charges.sum(), 1)):
        products = mole.intor("int1e_rr", comp=9)
    return sum(weight * products[i] for i, weight in _WEIGHTS.items())
