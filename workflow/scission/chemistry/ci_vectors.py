"""What a configuration-interaction vector says of its orbitals: densities, natural orbitals, weights."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from pyscf import fci
from pyscf.fci import cistring

Array = NDArray[np.float64]

_STRINGS_TO_TURN = 1000
"""Up to this many strings of each spin the vector itself is turned to natural orbitals."""

_ORBITALS_FOR_PAIRS = 40
_DETERMINANTS_FOR_PAIRS = 5_000_000
"""Beyond these sizes the two-particle density takes longer than it tells."""


@dataclass
class VectorFacts:
    """Natural occupations (n,) of all and (2, n) of each spin's density, decreasing.

    ``leading_weight`` is the largest squared coefficient in natural orbitals; ``orbital_weights`` (n, 4) the
    probability of a natural orbital to be empty, to hold one alpha, one beta electron, or both.  ``None`` where
    the vector is too long for them.
    """

    natural_occupations: Array
    spin_occupations: Array
    leading_weight: float | None
    orbital_weights: Array | None


def spin_densities(vector: Array, size: int, electrons: tuple[int, int]) -> tuple[Array, Array]:
    """Return the one-particle densities of alpha and beta, each (n, n), in the orbitals of the vector."""
    alpha, beta = fci.direct_spin1.make_rdm1s(vector, size, electrons)
    return np.asarray(alpha), np.asarray(beta)


def analyse_vector(vector: Array, size: int, electrons: tuple[int, int]) -> VectorFacts:
    """Return what the diagnostics need to know of a vector (n_alpha_strings, n_beta_strings)."""
    alpha, beta = spin_densities(vector, size, electrons)
    values, rotation = np.linalg.eigh(alpha + beta)
    natural, rotation = values[::-1].copy(), rotation[:, ::-1]
    by_spin = np.array([np.linalg.eigvalsh(density)[::-1] for density in (alpha, beta)])
    if max(np.shape(vector)) <= _STRINGS_TO_TURN:
        turned = np.asarray(fci.addons.transform_ci(vector, electrons, rotation))
        return VectorFacts(
            natural, by_spin, float(np.max(turned**2)), _weights_of_vector(turned, size, electrons)
        )
    if size <= _ORBITALS_FOR_PAIRS and np.size(vector) <= _DETERMINANTS_FOR_PAIRS:
        return VectorFacts(natural, by_spin, None, _weights_of_densities(vector, size, electrons, rotation))
    return VectorFacts(natural, by_spin, None, None)


def _weights_of_vector(vector: Array, size: int, electrons: tuple[int, int]) -> Array:
    """Weights (n, 4) from a vector in the orbitals themselves: sums of squared coefficients."""
    squares = vector.reshape(vector.shape[0], -1) ** 2
    alpha, beta = (_holds(size, n) for n in electrons)
    both = np.einsum("ai,ab,bi->i", alpha, squares, beta, optimize=True)
    return _four(squares.sum(axis=1) @ alpha, squares.sum(axis=0) @ beta, both)


def _holds(size: int, n_electrons: int) -> Array:
    """Return which orbitals each string holds, (n_strings, n) of 0 and 1."""
    if n_electrons == 0:
        return np.zeros((1, size))
    occupied = cistring.gen_occslst(range(size), n_electrons)
    table = np.zeros((len(occupied), size))
    np.put_along_axis(table, np.asarray(occupied, dtype=np.intp), 1.0, axis=1)
    return table


def _weights_of_densities(vector: Array, size: int, electrons: tuple[int, int], rotation: Array) -> Array:
    """Weights (n, 4) from the one- and two-particle densities turned to the orbitals ``rotation`` (n, n)."""
    (alpha, beta), (_, pairs, _) = fci.direct_spin1.make_rdm12s(vector, size, electrons)
    both = np.einsum("pqrs,pi,qi,ri,si->i", pairs, rotation, rotation, rotation, rotation, optimize=True)
    n_alpha, n_beta = (np.einsum("pq,pi,qi->i", d, rotation, rotation) for d in (alpha, beta))
    return _four(n_alpha, n_beta, both)


def _four(n_alpha: Array, n_beta: Array, both: Array) -> Array:
    return np.stack([1.0 - n_alpha - n_beta + both, n_alpha - both, n_beta - both, both], axis=1)
