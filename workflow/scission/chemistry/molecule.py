"""Molecules for the engine: from numbers and checked names only, never from text that it would evaluate."""

from __future__ import annotations

from functools import lru_cache
from typing import Any

import numpy as np
from numpy.typing import NDArray
from pyscf import gto

from scission.campaign import basis_on

MAX_MEMORY_MB = 4000
"""What the engine may use for integrals and amplitudes before it turns to the disk."""


def build_mole(facts: dict[str, Any], basis: dict[str, str], positions: NDArray[np.float64]) -> gto.Mole:
    """Return the engine's molecule.

    Args:
        facts: symbols, charge and multiplicity of the molecule.
        basis: element -> name of its basis (checked against the known names before).
        positions: (n_atoms, 3) in bohr.

    Raises:
        pyscf.lib.exceptions.BasisNotFoundError: an element is not part of its basis.
    """
    elements = sorted(set(facts["symbols"]))
    mole = gto.Mole()
    mole.atom = [(s, tuple(map(float, p))) for s, p in zip(facts["symbols"], positions, strict=True)]
    mole.unit = "Bohr"
    mole.charge = facts["charge"]
    mole.spin = facts["multiplicity"] - 1
    mole.basis = {e: _shells(basis[e], e) for e in elements}
    mole.ecp = {e: core for e in elements if (core := _core_potential(basis[e], e)) is not None}
    mole.symmetry = False
    mole.verbose = 0
    mole.max_memory = MAX_MEMORY_MB
    mole.build(dump_input=False, parse_arg=False)
    return mole


def root_overlap(mole: gto.Mole) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Return S^1/2 and S^-1/2 of the basis functions, each (n_ao, n_ao)."""
    return overlap_roots(mole.intor_symmetric("int1e_ovlp"))


def overlap_roots(overlap: NDArray[np.float64]) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Return S^1/2 and S^-1/2 of an overlap matrix, each (n_ao, n_ao)."""
    values, vectors = np.linalg.eigh(overlap)
    roots = np.sqrt(np.maximum(values, 1e-14))
    return (vectors * roots) @ vectors.T, (vectors / roots) @ vectors.T


@lru_cache(maxsize=256)
def _shells(name: str, element: str) -> Any:
    return gto.basis.load(name, element)


@lru_cache(maxsize=256)
def _core_potential(name: str, element: str) -> Any | None:
    """Return the effective core potential that belongs to a basis, or ``None`` where it has none."""
    known = basis_on(name, element)
    return gto.basis.load_ecp(known.ecp, element) if known is not None and known.ecp else None
