"""Choosing the active space of a stretched bond, once, with a fixed size.

The choice is made where the bond is stretched: there the natural orbitals of the unrestricted determinant
show which orbitals break (Pulay and Hamilton, J. Chem. Phys. 88, 4926 (1988)).
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray
from pyscf import gto
from pyscf.data import elements
from pyscf.lo.iao import reference_mol

from .molecule import root_overlap
from .orbitals import natural_occupations

Array = NDArray[np.float64]

BREAKING = 0.1
"""Natural orbitals with occupations between this and 2 minus this break with the bond, where it is
stretched to twice its length; spin polarisation of other electrons stays below (own measurement)."""

_FRACTIONAL = 0.02
_AXIAL_SHARE = 0.65
"""Part of the axial valence orbitals of the bonded atoms that must lie in the breaking orbitals: hybrids
mix s into them, so less than all is normal (0.8 to 1.0 for fifteen bonds of main-group atoms, 0.5 and
less with unpaired electrons across the bond on one or both atoms; own measurement)."""
_GROUP = {first + k: 13 + k for first in (5, 13, 31, 49, 81) for k in range(4)}
"""Groups 13 to 16 by atomic number."""


@dataclass
class ActiveSpace:
    """Orbitals in the order inactive, active, empty ((n_ao, n_mo), Loewdin basis), sizes and the why."""

    orbitals: Array
    n_inactive: int
    n_orbitals: int
    n_electrons: int
    why: str


def choose_space(
    mole: gto.Mole, density: Array, request: Any, bonds: list[list[int]], fragments: list[list[int]]
) -> ActiveSpace:
    """Return the active space that ``request`` describes.

    Args:
        density: spin-summed density (n_ao, n_ao) of the lowest unrestricted determinant here.
        request: ``auto``, or a mapping with electrons, orbitals and perhaps atomic_orbitals.
        bonds: stretched bonds, pairs of atoms.
        fragments: the two groups of atoms that the stretched bonds hold together.

    Raises:
        ValueError: the space does not fit the molecule or its basis.
    """
    root, _ = root_overlap(mole)
    occupations, orbitals = natural_occupations(density, root)
    projector = None
    if request == "auto":
        electrons, size, why, shell = _automatic(mole, occupations, fragments)
        if shell:
            projector = _projector(mole, root, shell)
    else:
        electrons, size = request["electrons"], request["orbitals"]
        why = f"{electrons} electrons in {size} orbitals as the campaign says"
        if request.get("atomic_orbitals"):
            projector = _projector(mole, root, named_shells(mole, request["atomic_orbitals"]))
            why += ", from the atomic orbitals " + ", ".join(request["atomic_orbitals"])
    n_inactive = (mole.nelectron - electrons) // 2
    if n_inactive < 0 or n_inactive + size > mole.nao:
        raise ValueError(
            f"{electrons} electrons in {size} orbitals do not fit {mole.nelectron} electrons in {mole.nao} functions"
        )
    strict = projector is not None
    if projector is None:
        bonded = sorted({a for bond in bonds for a in bond})
        projector = _projector(mole, root, valence_shells(mole, bonded))
    ordered = _order(occupations, orbitals, projector, n_inactive, size, strict)
    return ActiveSpace(ordered, n_inactive, size, electrons, why)


def holds_the_bond(mole: gto.Mole, density: Array, bond: list[int]) -> bool:
    """Whether the fractionally occupied natural orbitals of ``density`` hold the bond along its axis.

    Far apart, unrestricted solutions with the unpaired electrons across the bond often lie lowest; an active
    space made of them would not describe the bond near its equilibrium.
    """
    root, _ = root_overlap(mole)
    occupations, orbitals = natural_occupations(density, root)
    active = orbitals[:, (occupations > BREAKING) & (occupations < 2 - BREAKING)]
    axial = _axial(mole, root, bond)
    return bool(np.sum((axial.T @ active) ** 2) > _AXIAL_SHARE * axial.shape[1])


def _axial(mole: gto.Mole, root: Array, bond: list[int]) -> Array:
    """Return the best valence orbital along the bond of each bonded atom, (n_ao, 2), in the Loewdin basis."""
    axis = mole.atom_coord(bond[1]) - mole.atom_coord(bond[0])
    axis /= np.linalg.norm(axis)
    columns = []
    for atom in bond:
        shells = valence_shells(mole, [atom])
        p_shell = [s for s in shells if s[1].endswith("p")]
        if p_shell:
            columns.append(_projector(mole, root, p_shell) @ axis)
        else:
            columns.append(_projector(mole, root, [s for s in shells if s[1].endswith("s")])[:, 0])
    return np.array(columns).T


def valence_shells(mole: gto.Mole, atoms: list[int]) -> list[tuple[int, str]]:
    """Return (atom, shell) of the valence shells of ``atoms``: highest s and p, and d of the transition series."""
    noble = (2, 10, 18, 36, 54, 86)
    shells = []
    for a in atoms:
        z = elements.charge(mole.atom_symbol(a))
        n = 1 + sum(z > last for last in noble)
        shells += [(a, f"{n}s")]
        if (
            n > 1 and z - noble[n - 2] > 2
        ):  # free atoms of groups 1 and 2 have no p shell in the minimal basis
            shells += [(a, f"{n}p")]
        if n > 3 and 2 < z - noble[n - 2] <= 12:
            shells += [(a, f"{n - 1}d")]
    return shells


def named_shells(mole: gto.Mole, names: list[str]) -> list[tuple[int, str]]:
    """Return (atom, shell) for names like ``N1 2p`` (that atom) or ``N 2p`` (every nitrogen)."""
    shells = []
    for name in names:
        label, shell = name.split()
        symbol = label.rstrip("0123456789")
        number = label[len(symbol) :]
        atoms = (
            [int(number) - 1]
            if number
            else [a for a in range(mole.natm) if mole.atom_pure_symbol(a) == symbol]
        )
        shells += [(a, shell) for a in atoms]
    return shells


def _automatic(
    mole: gto.Mole, occupations: Array, fragments: list[list[int]]
) -> tuple[int, int, str, list[tuple[int, str]]]:
    """Return (electrons, orbitals, why, shells that must span the space or none)."""
    charges = [[elements.charge(mole.atom_symbol(a)) for a in f] for f in fragments]
    if len(fragments) == 2 and all(len(c) == 1 and c[0] in _GROUP for c in charges):
        return _valence_of_atoms(mole, [f[0] for f in fragments], [c[0] for c in charges])
    breaking = occupations[(occupations > BREAKING) & (occupations < 2 - BREAKING)]
    if len(breaking) >= 2:
        electrons = round(float(breaking.sum()))
        electrons += (electrons - mole.nelectron) % 2
        shown = ", ".join(f"{n:.2f}" for n in breaking)
        size = f"{electrons} electrons in {len(breaking)} orbitals"
        why = f"natural orbitals of the stretched bond with occupations {shown} ({size})"
        return electrons, len(breaking), why, []
    open_shells = mole.spin
    why = (
        f"no orbital breaks at this length: one pair of bond orbitals and {open_shells} singly occupied ones"
    )
    return 2 + open_shells, 2 + open_shells, why, []


def _valence_of_atoms(
    mole: gto.Mole, atoms: list[int], charges: list[int]
) -> tuple[int, int, str, list[tuple[int, str]]]:
    """Return the space of two atoms of groups 13 to 16, which share several bonds.

    Their p shells; with an atom of group 13 or 14, whose s electrons take part in bonding, the s shells too.
    """
    groups = [_GROUP[z] for z in charges]
    with_s = min(groups) <= 14
    shells = [s for s in valence_shells(mole, atoms) if s[1].endswith("p") or (with_s and s[1].endswith("s"))]
    electrons = sum(g - (10 if with_s else 12) for g in groups) - mole.charge
    orbitals = 8 if with_s else 6
    kind = "valence s and p" if with_s else "valence p"
    size = f"{electrons} electrons in {orbitals} orbitals"
    why = f"{kind} shells of both atoms ({size}): atoms of groups 13 to 16 share several bonds"
    return electrons, orbitals, why, shells


def _projector(mole: gto.Mole, root: Array, shells: list[tuple[int, str]]) -> Array:
    """Return free-atom shells as orthonormal columns (n_ao, n) in the Loewdin basis.

    Raises:
        ValueError: an atom has no such shell in the minimal basis.
    """
    minimal = reference_mol(mole, "minao")
    labels = minimal.ao_labels(fmt=None)
    chosen = [i for i, (atom, _, shell, _) in enumerate(labels) if (atom, shell) in shells]
    known = {(atom, shell) for atom, _, shell, _ in labels}
    missing = [f"{mole.atom_symbol(a)}{a + 1} {s}" for a, s in shells if (a, s) not in known]
    if missing:
        raise ValueError(f"no such atomic orbital in the free atoms' minimal basis: {', '.join(missing)}")
    cross = gto.mole.intor_cross("int1e_ovlp", mole, minimal)[:, chosen]
    q, _ = np.linalg.qr(np.linalg.solve(root, cross))
    return q


def _order(
    occupations: Array, orbitals: Array, projector: Array, n_inactive: int, size: int, strict: bool
) -> Array:
    """Return the orbitals as inactive, active, empty.

    Fractionally occupied natural orbitals come first; what else the space needs are the combinations of
    doubly occupied or empty ones with the largest part in the projector.  ``strict`` takes the projector's
    part of all orbitals instead, keeping only singly occupied ones in any case.
    """
    margin = 0.5 if strict else _FRACTIONAL
    full = orbitals[:, occupations >= 2 - margin]
    middle = orbitals[:, (occupations < 2 - margin) & (occupations > margin)]
    empty = orbitals[:, occupations <= margin]
    from_full = full.shape[1] - n_inactive
    from_empty = size - from_full - middle.shape[1]
    if from_full < 0 or from_empty < 0:
        return orbitals  # the window of decreasing occupations is all that fits
    inactive, active_full = _split(full, projector, from_full)
    rest, active_empty = _split(empty, projector, from_empty)
    return np.hstack([inactive, active_full, middle, active_empty, rest])


def _split(space: Array, projector: Array, n: int) -> tuple[Array, Array]:
    """Rotate ``space`` so that its last ``n`` orbitals have the largest part in the projector."""
    if n == 0 or space.shape[1] == 0:
        return space, space[:, :0]
    _, _, vt = np.linalg.svd(projector.T @ space, full_matrices=True)
    rotated = space @ vt.T
    return rotated[:, n:], rotated[:, :n]
