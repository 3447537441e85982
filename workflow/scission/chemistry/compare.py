"""How alike two reference records are.  Numbers only: no molecule and no engine is needed."""

from __future__ import annotations

from typing import Any

import numpy as np

from scission.records.store import Record

from .orbitals import Orbitals, state_overlap_any_spin, subspace_overlap

_LOWER = 1e-6
_LOWER_ON_A_GRID = 1e-5


def least_step(spec: dict[str, Any]) -> float:
    """Return by how much (hartree) a solution of a reference must lie lower to count as lower.

    Ten times the tightest agreement of energies converged from different starts; for Kohn-Sham more, because
    one state turned about the bond differs by 2e-6 on the engine's default grid (own measurement, F2).
    """
    return _LOWER_ON_A_GRID if spec.get("functional") else _LOWER


def likeness(a: Record, b: Record) -> float:
    """Return the overlap of two references, 0 to 1, up to an exchange of alpha and beta.

    For determinants the smallest singular value between their occupied spaces; for active-space
    wavefunctions the smaller of those between the active and between the inactive spaces.
    """
    return overlap_and_swap(a, b)[0]


def overlap_and_swap(a: Record, b: Record) -> tuple[float, bool]:
    """Return the overlap of two references and whether alpha and beta had to be exchanged for it."""
    if "active" in a.arrays:
        return _active_overlap(a, b), False
    first, second = (Orbitals(r.arrays["mo_lowdin"], r.arrays["mo_occ"]) for r in (a, b))
    return state_overlap_any_spin(first, second)


def _active_overlap(a: Record, b: Record) -> float:
    (core_a, active_a), (core_b, active_b) = _spaces(a), _spaces(b)
    return min(subspace_overlap(active_a, active_b), subspace_overlap(core_a, core_b))


def _spaces(record: Record) -> tuple[np.ndarray, np.ndarray]:
    n_core, n_active = (int(n) for n in record.arrays["active"][:2])
    x = record.arrays["mo_lowdin"][0]
    return x[:, :n_core], x[:, n_core : n_core + n_active]


def stability_changes(a: Record, b: Record) -> bool:
    """Whether the triplet stability of a restricted determinant changes its sign between two neighbours.

    False where one of them has no eigenvalue, or where the zero has been searched for already.
    """
    values = [record.diagnostics.get("triplet_stability", np.nan) for record in (a, b)]
    searched = any("coulson_fischer" in record.notes for record in (a, b))
    return bool(values[0] * values[1] < 0.0) and not searched
