"""Mayer bond orders of a density."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray
from pyscf import gto

Array = NDArray[np.float64]


def mayer_orders(
    mole: gto.Mole, alpha: Array, beta: Array, bonds: Sequence[Sequence[int]], overlap: Array
) -> Array:
    """Return the Mayer order of each bond, (n_bonds,).

    Args:
        mole: for the functions of each atom.
        alpha: density of the alpha electrons, (n_ao, n_ao); beta likewise.
        bonds: pairs of atoms, numbered from 0.
        overlap: (n_ao, n_ao).

    Mayer, Chem. Phys. Lett. 97, 270 (1983); 117, 396 (1985).
    """
    total, spin = (alpha + beta) @ overlap, (alpha - beta) @ overlap
    where = mole.aoslice_by_atom()[:, 2:]
    orders = []
    for a, b in bonds:
        at_a, at_b = slice(*where[a]), slice(*where[b])
        orders.append(sum(np.sum(m[at_a, at_b] * m[at_b, at_a].T) for m in (total, spin)))
    return np.array(orders, dtype=float)
