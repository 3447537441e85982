"""Point-group symmetry for orbital optimisation: it keeps sigma orbitals sigma.

Without it, rounding is enough to turn an active orbital along the bond into one across it wherever that
lies a little lower, and the curve would leave its state.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from pyscf import gto

from .molecule import root_overlap

Array = NDArray[np.float64]

_LINEAR = {"Dooh": "D2h", "Coov": "C2v", "SO3": "D2h"}
_PURE = 0.02
"""How far the weight of an orbital space in an irreducible representation may be from a whole number."""


def symmetric_mole(mole: gto.Mole) -> gto.Mole | None:
    """Return the molecule with its (abelian) point group, or ``None`` if it has none to speak of."""
    twin = mole.copy()
    twin.symmetry = True
    twin.build(dump_input=False, parse_arg=False)
    if twin.topgroup in _LINEAR:
        twin.symmetry_subgroup = _LINEAR[twin.topgroup]
        twin.build(dump_input=False, parse_arg=False)
    return None if twin.groupname == "C1" else twin


def pure_orbitals(symmetric: gto.Mole, x: Array, borders: tuple[int, int]) -> tuple[Array, Array] | None:
    """Return orbitals that belong to one representation each, spanning the same spaces.

    Args:
        x: (n_ao, n_mo) orbitals in the Loewdin basis, in the order inactive, active, empty.
        borders: where the active and the empty orbitals begin.

    Returns:
        The orbitals (n_ao, n_mo) and the rotation (n_active, n_active) that the active ones went through,
        or ``None`` if a space does not have the symmetry.
    """
    root, _ = root_overlap(symmetric)
    frames = [np.linalg.qr(root @ so)[0] for so in symmetric.symm_orb]
    first, second = borders
    spaces = [_pure(space, frames) for space in (x[:, :first], x[:, first:second], x[:, second:])]
    if any(space is None for space in spaces):
        return None
    pure = np.hstack([space[0] for space in spaces if space is not None])
    u, _, vt = np.linalg.svd(pure, full_matrices=False)
    active = spaces[1]
    return (u @ vt, active[1]) if active is not None else None


def _pure(space: Array, frames: list[Array]) -> tuple[Array, Array] | None:
    """Return a space's orbitals, each within one representation, and the rotation that leads to them."""
    orbitals, rotation = [], []
    for frame in frames:
        inside = frame.T @ space
        weights, vectors = np.linalg.eigh(inside.T @ inside)
        if np.any(np.abs(weights - np.round(weights)) > _PURE):
            return None
        chosen = vectors[:, weights > 0.5]
        orbitals.append(frame @ (inside @ chosen))
        rotation.append(chosen)
    turned = np.hstack(rotation)
    if turned.shape != (space.shape[1], space.shape[1]):
        return None
    u, _, vt = np.linalg.svd(turned)
    return np.hstack(orbitals), u @ vt
