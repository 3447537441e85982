"""Whether a determinant is a minimum: lowest eigenvalues of its orbital Hessians, and where they lead.

Seeger and Pople, J. Chem. Phys. 66, 3045 (1977).
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
from numpy.typing import NDArray
from pyscf.lib import davidson1
from pyscf.scf import rohf, stability, uhf
from pyscf.scf.hf import unpack_uniq_var
from pyscf.soscf import newton_ah
from scipy.linalg import expm

from .orbitals import Orbitals

Array = NDArray[np.float64]

UNSTABLE = -1e-5
"""Eigenvalues (hartree) below this are instabilities, and not the noise of a converged gradient."""

_STARTS = 3
"""Rotations of smallest diagonal that a search starts from, beside a mixture of all: with the mixture alone,
families of solutions of another symmetry were missed."""


def triplet_instability(field: Any) -> tuple[float, Array]:
    """Return the lowest eigenvalue (hartree) of a closed shell's triplet stability matrix, and its vector.

    Negative: an unrestricted solution lies lower.
    """
    _, _, times, diagonal = stability._gen_hop_rhf_external(field)
    return _lowest(times, diagonal, tolerance=1e-7)


def internal_instability(field: Any) -> tuple[float, Array]:
    """Return the lowest eigenvalue (hartree) of a determinant's own orbital Hessian, and its vector."""
    make = newton_ah.gen_g_hop_rhf
    if isinstance(field, uhf.UHF):
        make = newton_ah.gen_g_hop_uhf
    elif isinstance(field, rohf.ROHF):
        make = newton_ah.gen_g_hop_rohf
    _, times, diagonal = make(field, field.mo_coeff, field.mo_occ)
    return _lowest(lambda x: times(x).real * 2.0, diagonal * 2.0, tolerance=1e-5)


def unrestricted_along(restricted: Any, vector: Array) -> Orbitals:
    """Return unrestricted orbitals: alpha of a closed shell turned along a triplet instability, beta as they are."""
    coeff, occ = restricted.mo_coeff, restricted.mo_occ
    turned = _rotated(coeff, occ, vector)
    return Orbitals(np.array([turned, coeff]), np.array([occ / 2.0, occ / 2.0]))


def turned_along(field: Any, vector: Array) -> Any:
    """Return the field's orbitals, in the engine's shape, turned along an internal instability."""
    if not isinstance(field, uhf.UHF):
        return _rotated(field.mo_coeff, field.mo_occ, vector)
    border = int(np.sum(field.mo_occ[0] > 0.5)) * int(np.sum(field.mo_occ[0] < 0.5))
    by_spin = zip(field.mo_coeff, field.mo_occ, (vector[:border], vector[border:]), strict=True)
    return np.array([_rotated(*spin) for spin in by_spin])


def _rotated(coeff: Array, occ: Array, vector: Array) -> Array:
    return np.asarray(coeff @ expm(unpack_uniq_var(vector, occ)))


def _lowest(times: Callable[[Array], Array], diagonal: Array, tolerance: float) -> tuple[float, Array]:
    def precondition(residual: Array, eigenvalue: float, _: Array) -> Array:
        shift = diagonal - eigenvalue
        shift[np.abs(shift) < 1e-8] = 1e-8
        return residual / shift

    starts = [1.0 / np.maximum(diagonal, 1e-2)]
    for i in np.argsort(diagonal)[:_STARTS]:
        unit = np.zeros_like(diagonal)
        unit[i] = 1.0
        starts.append(unit)
    _, values, vectors = davidson1(
        lambda xs: [times(x) for x in xs],
        starts,
        precondition,
        nroots=1,
        tol=tolerance,
        max_cycle=80,
        verbose=0,
    )
    return float(values[0]), np.asarray(vectors[0])
