"""Orbitals that can be carried from one geometry to the next and compared between geometries.

They are kept in symmetrically orthogonalised basis functions, X = S^1/2 C.  There they stay orthonormal
when the nuclei move, so carrying is C' = S'^-1/2 X, and the overlap of two geometries' orbitals is X1^T X2.
Loewdin, J. Chem. Phys. 18, 365 (1950).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]


@dataclass
class Orbitals:
    """Orbitals and occupations by spin: coeff (n_spin, n_ao, n_mo), occ (n_spin, n_mo)."""

    coeff: Array
    occ: Array

    @property
    def restricted(self) -> bool:
        """Whether both spins share the orbitals."""
        return len(self.coeff) == 1

    def density(self) -> Array:
        """Return the density matrix: (n_ao, n_ao) for a restricted closed shell, else (2, n_ao, n_ao)."""
        if self.restricted and not np.any(np.isclose(self.occ, 1.0)):
            return (self.coeff[0] * self.occ[0]) @ self.coeff[0].T
        return np.array([(c * o) @ c.T for c, o in zip(*self.by_spin(), strict=True)])

    def by_spin(self) -> tuple[Array, Array]:
        """Return coefficients (2, n_ao, n_mo) and occupations (2, n_mo) of alpha and beta."""
        if not self.restricted:
            return self.coeff, self.occ
        alpha, beta = (self.occ[0] > 0.5).astype(float), (self.occ[0] > 1.5).astype(float)
        return np.array([self.coeff[0], self.coeff[0]]), np.array([alpha, beta])

    def occupied(self) -> tuple[Array, Array]:
        """Return the occupied alpha and beta orbitals, (n_ao, n_alpha) and (n_ao, n_beta)."""
        coeff, occ = self.by_spin()
        return coeff[0][:, occ[0] > 0.5], coeff[1][:, occ[1] > 0.5]

    def spin_swapped(self) -> Orbitals:
        """Return the same with alpha and beta exchanged."""
        return Orbitals(self.coeff[::-1].copy(), self.occ[::-1].copy())

    def transformed(self, matrix: Array) -> Orbitals:
        """Return the orbitals with ``matrix`` ((n_ao, n_ao)) applied to their coefficients."""
        return Orbitals(np.array([matrix @ c for c in self.coeff]), self.occ.copy())


def subspace_overlap(a: Array, b: Array) -> float:
    """Return the smallest singular value of a^T b: 1 for the same space, 0 if one direction is lost.

    ``a`` and ``b`` are (n, m) with orthonormal columns; spaces of different size have overlap 0.
    """
    if a.shape != b.shape:
        return 0.0
    if a.shape[1] == 0:
        return 1.0
    return float(np.linalg.svd(a.T @ b, compute_uv=False)[-1])


def state_overlap(a: Orbitals, b: Orbitals) -> float:
    """Return how well the occupied spaces of two determinants (Loewdin orbitals) agree, 0 to 1.

    The worse of the two spins counts.
    """
    return min(subspace_overlap(x, y) for x, y in zip(a.occupied(), b.occupied(), strict=True))


def state_overlap_any_spin(a: Orbitals, b: Orbitals) -> tuple[float, bool]:
    """Return the overlap of two determinants up to an exchange of alpha and beta, and whether that was needed."""
    straight = state_overlap(a, b)
    if b.restricted or b.occ[0].sum() != b.occ[1].sum():
        return straight, False
    swapped = state_overlap(a, b.spin_swapped())
    return (swapped, True) if swapped > straight + 1e-6 else (straight, False)


def natural_occupations(density: Array, root_overlap: Array) -> tuple[Array, Array]:
    """Return natural occupations (n_ao,), decreasing, and orbitals in the Loewdin basis (n_ao, n_ao).

    ``density`` is the spin-summed density matrix (n_ao, n_ao); ``root_overlap`` is S^1/2.
    """
    values, vectors = np.linalg.eigh(root_overlap @ density @ root_overlap)
    return values[::-1].copy(), vectors[:, ::-1].copy()


def not_orthonormal(x: Array) -> float:
    """Return the largest deviation of x^T x from the unit matrix."""
    return float(np.abs(x.T @ x - np.eye(x.shape[1])).max()) if x.shape[1] else 0.0
