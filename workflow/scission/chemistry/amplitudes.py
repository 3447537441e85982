"""Coupled-cluster amplitudes that can be carried from one geometry to the next."""

from __future__ import annotations

from collections import OrderedDict
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from scission.records.store import Record

from .molecule import root_overlap

Array = NDArray[np.float64]

_KEPT_BYTES = 64e6
"""Amplitudes kept in this process: levels of a geometry and neighbours of a scan ask for the same ones one
after another.  The latest ones are kept whatever their size."""

_RANK = 6
"""Natural orbitals of the amplitudes that are kept for comparison: a bond needs three at most, each spin."""

_memory: OrderedDict[tuple[str, str, int], Amplitudes] = OrderedDict()


@dataclass
class Amplitudes:
    """Amplitudes with the orbitals they belong to.

    ``occupied`` and ``virtual`` hold one array a spin (one for a closed shell), (n_ao, n) in
    symmetrically orthogonalised basis functions; t1 and t2 are as the engine has them.  ``how`` says in words
    what it took to find them, empty for the usual way.
    """

    occupied: tuple[Array, ...]
    virtual: tuple[Array, ...]
    t1: Any
    t2: Any
    how: str = ""

    @property
    def nbytes(self) -> int:
        """Memory of the doubles, the largest part."""
        return sum(t.nbytes for t in (self.t2 if isinstance(self.t2, tuple) else (self.t2,)))

    def at(self, solver: Any) -> tuple[Any, Any]:
        """Return t1 and t2 turned to the orbitals of ``solver``, which belongs to a geometry near by."""
        occupied, virtual = _orbitals(solver)
        o = [a.T @ b for a, b in zip(self.occupied, occupied, strict=True)]
        v = [a.T @ b for a, b in zip(self.virtual, virtual, strict=True)]
        if len(o) == 1:
            return _turn1(self.t1, o[0], v[0]), _turn2(self.t2, o[0], o[0], v[0], v[0])
        t1 = tuple(_turn1(t, o[s], v[s]) for s, t in enumerate(self.t1))
        pairs = ((0, 0), (0, 1), (1, 1))
        t2 = tuple(_turn2(t, o[p], o[q], v[p], v[q]) for t, (p, q) in zip(self.t2, pairs, strict=True))
        return t1, t2


def amplitudes_of(solver: Any, how: str = "") -> Amplitudes:
    """Return the amplitudes of a converged solver with their orbitals."""
    return Amplitudes(*_orbitals(solver), solver.t1, solver.t2, how)


def fingerprint(solver: Any) -> Array:
    """Return what the amplitudes excite into: (rank, n_ao) leading natural orbitals of their virtual density.

    The virtual density sum_ijb t_ij^ab t_ij^cb + sum_i t_i^a t_i^c does not depend on phases or rotations of
    orbitals; each row is an eigenvector in the Loewdin basis, scaled by the root of its occupation, so that
    two geometries can be compared (:mod:`scission.analysis.amplitudes`).
    """
    _, virtual = _orbitals(solver)
    t1, t2 = (solver.t1, solver.t2) if len(virtual) > 1 else ((solver.t1,), (solver.t2,))
    density = sum(v @ d @ v.T for v, d in zip(virtual, _virtual_densities(t1, t2), strict=True))
    values, vectors = np.linalg.eigh(density)
    leading = slice(-min(_RANK, len(values)), None)
    return (vectors[:, leading] * np.sqrt(values[leading].clip(0.0))).T[::-1].copy()


def _virtual_densities(t1: Any, t2: Any) -> list[Array]:
    """Return the virtual density of each spin, (n_vir, n_vir)."""
    singles = [t.T @ t for t in t1]
    if len(t2) == 1:
        return [singles[0] + np.einsum("ijab,ijcb->ac", t2[0], t2[0], optimize=True)]
    aa, ab, bb = t2
    alpha = np.einsum("ijab,ijcb->ac", aa, aa, optimize=True) / 2 + np.einsum(
        "ijab,ijcb->ac", ab, ab, optimize=True
    )
    beta = np.einsum("ijab,ijcb->ac", bb, bb, optimize=True) / 2 + np.einsum(
        "ijba,ijbc->ac", ab, ab, optimize=True
    )
    return [singles[0] + alpha, singles[1] + beta]


def remember(reference: Record, frozen: int, amplitudes: Amplitudes) -> None:
    """Keep the amplitudes on a reference in this process; the oldest ones go."""
    _memory[_name(reference, frozen)] = amplitudes
    _memory.move_to_end(_name(reference, frozen))
    while len(_memory) > 1 and sum(kept.nbytes for kept in _memory.values()) > _KEPT_BYTES:
        _memory.popitem(last=False)


def recall(reference: Record, frozen: int) -> Amplitudes | None:
    """Return the amplitudes kept in this process for a reference as it stands, or ``None``."""
    return _memory.get(_name(reference, frozen))


def _name(reference: Record, frozen: int) -> tuple[str, str, int]:
    return reference.key, reference.stamp, frozen


def _orbitals(solver: Any) -> tuple[tuple[Array, ...], tuple[Array, ...]]:
    """Return correlated occupied and virtual orbitals by spin, in the Loewdin basis."""
    root, _ = root_overlap(solver.mol)
    coeff, occ = np.asarray(solver.mo_coeff), np.asarray(solver.mo_occ)
    masks = solver.get_frozen_mask()
    if coeff.ndim == 2:
        coeff, occ, masks = coeff[None], occ[None], [masks]
    occupied, virtual = [], []
    for c, o, mask in zip(coeff, occ, masks, strict=True):
        x = root @ c
        occupied.append(x[:, mask & (o > 0)])
        virtual.append(x[:, mask & (o == 0)])
    return tuple(occupied), tuple(virtual)


def _turn1(t: Array, o: Array, v: Array) -> Array:
    return o.T @ t @ v


def _turn2(t: Array, o1: Array, o2: Array, v1: Array, v2: Array) -> Array:
    return np.einsum("ijab,iI,jJ,aA,bB->IJAB", t, o1, o2, v1, v2, optimize=True)
