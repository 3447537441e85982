"""Entropies of the orbitals of an active space."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from scission.solution import Solution

from .types import Absent

STEIN_REIHER = "Stein and Reiher, Mol. Phys. 115, 2110 (2017)"
LEGEZA = "Legeza and Solyom, Phys. Rev. B 68, 195116 (2003)"

_DILUTED = 2
"""A space of more orbitals than this an electron holds more than valence orbitals."""

_UNKNOWN = Absent("the level has no configuration expansion over few enough orbitals")


def z_s1(solution: Solution) -> float | Absent:
    """Z_s(1) = sum_i s_i(1) / (L ln 4), dimensionless, 0 to 1, over the L orbitals of the space.

    s_i are the single-orbital entropies in natural orbitals (entropies depend on the orbitals, so one
    choice is kept throughout).  For valence spaces.
    H2 far apart in a minimal basis: 1/2.  Stein and Reiher (2017).
    """
    if solution.orbital_weights is None:
        return _UNKNOWN
    s = single_orbital_entropies(solution.orbital_weights)
    if s.size > _DILUTED * (sum(solution.n_electrons) - 2 * solution.n_inactive):
        return Absent("a mean over a space far larger than the valence orbitals says nothing")
    return float(s.sum() / (s.size * np.log(4.0)))


def largest_s1(solution: Solution) -> float | Absent:
    """Largest single-orbital entropy max_i s_i(1) in natural orbitals, nats, 0 to ln 4.

    Legeza and Solyom, Phys. Rev. B 68, 195116 (2003).
    """
    if solution.orbital_weights is None:
        return _UNKNOWN
    return float(single_orbital_entropies(solution.orbital_weights).max())


def single_orbital_entropies(weights: NDArray[np.float64]) -> NDArray[np.float64]:
    """s_i = - sum_a w_ia ln w_ia (n,), from the weights (n, 4) of empty, alpha, beta, doubly occupied."""
    w = np.clip(weights, 0.0, 1.0)
    safe = np.where(w > 0.0, w, 1.0)
    entropies: NDArray[np.float64] = -np.sum(w * np.log(safe), axis=1)
    return entropies
