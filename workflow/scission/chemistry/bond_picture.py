"""The bond in words of structures: weights of covalent and ionic terms between two fragments.

Two forms are given.  The orthogonal one counts electrons in active orbitals that are localised on the
fragments: its weights are positive and add up to one, but overstate ionic terms where the fragments'
orbitals overlap.  The other, for two electrons in two orbitals, uses the fragments' own non-orthogonal
orbitals and the weights of Chirgwin and Coulson, Proc. R. Soc. Lond. A 201, 196 (1950); it tells how much of
the wavefunction these orbitals capture.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray
from pyscf import gto
from pyscf.fci import addons, cistring

from scission.solution import Solution

from .molecule import build_mole, root_overlap

Array = NDArray[np.float64]

_ONE_SIDE = 0.75
"""Two orbitals with populations beyond this, or both below what is left of one, lie on one fragment."""

_WEIGHTS = ("covalent", "ionic_first", "ionic_second")


@dataclass
class Partition:
    """Basis functions shared out between two fragments.

    Attributes:
        root: S^1/2, (n_ao, n_ao).
        inverse_root: S^-1/2, (n_ao, n_ao).
        first: (n_ao,), True for functions of the first fragment.
        electrons: electrons of each fragment by itself and neutral, without those an ECP replaces.
        charge: charge of the molecule.
    """

    root: Array
    inverse_root: Array
    first: NDArray[np.bool_]
    electrons: tuple[int, int]
    charge: int


@dataclass
class Active:
    """An active-space wavefunction: Loewdin orbitals (n_ao, n), CI vector, electrons by spin."""

    orbitals: Array
    vector: Array
    electrons: tuple[int, int]
    inactive: Array


@dataclass
class BondPicture:
    """Numbers by the names of ``records.schema``; ``remark`` says why some or all of them are missing.

    ``transfer`` (n_electrons + 1,) holds the weights of configurations by the number of active electrons
    on the first fragment.
    """

    scalars: dict[str, float]
    transfer: Array | None
    remark: str


def describe_active_bond(solution: Solution, task: dict[str, Any]) -> None:
    """Add the bond picture of a CASSCF solution's lowest state to its numbers, arrays and notes."""
    if len(task.get("fragments", ())) != 2:
        return
    mole = build_mole(task["molecule"], task["spec"]["basis"], np.array(task["positions"]))
    parts = partition(mole, task["fragments"])
    n_inactive, n_active, n_electrons = (int(n) for n in solution.extra["active"])
    x = solution.extra["mo_lowdin"][0]
    by_spin = (n_electrons + mole.spin) // 2, (n_electrons - mole.spin) // 2
    active = Active(
        x[:, n_inactive : n_inactive + n_active], solution.extra["ci"][0], by_spin, x[:, :n_inactive]
    )
    add_picture(solution, active_picture(active, parts, solution.natural_occupations))


def describe_pair_bond(solution: Solution, task: dict[str, Any], amplitudes: Array) -> None:
    """Add the bond picture of a two-electron singlet; ``amplitudes`` (n_ao, n_ao) are in basis functions."""
    if len(task.get("fragments", ())) != 2:
        return
    mole = build_mole(task["molecule"], task["spec"]["basis"], np.array(task["positions"]))
    parts = partition(mole, task["fragments"])
    add_picture(solution, pair_picture(parts.root @ amplitudes @ parts.root, parts))


def add_picture(solution: Solution, picture: BondPicture) -> None:
    """Add a bond picture to a solution's numbers, arrays and notes."""
    solution.numbers |= picture.scalars
    if picture.transfer is not None:
        solution.extra["transfer_weights"] = picture.transfer
    if picture.remark:
        solution.notes["bond_picture"] = picture.remark


def partition(mole: gto.Mole, fragments: list[list[int]]) -> Partition:
    """Return how the basis functions and electrons of ``mole`` belong to its two fragments."""
    root, inverse_root = root_overlap(mole)
    slices = mole.aoslice_by_atom()[:, 2:]
    first = np.zeros(mole.nao, dtype=bool)
    for atom in fragments[0]:
        first[slice(*slices[atom])] = True
    a, b = (sum(int(mole.atom_charge(i)) for i in atoms) for atoms in fragments)
    return Partition(root, inverse_root, first, (a, b), int(mole.charge))


def active_picture(active: Active, parts: Partition, natural_occupations: Array | None = None) -> BondPicture:
    """Return the weights of an active-space wavefunction.

    Args:
        active: the wavefunction.
        parts: the two fragments.
        natural_occupations: (n,) of the active space, decreasing, for the effective bond order.
    """
    n, n_electrons = active.orbitals.shape[1], sum(active.electrons)
    scalars = _bond_order(natural_occupations, n_electrons)
    localised, n_first = localise(active.orbitals, parts)
    if not 0 < n_first < n:
        return BondPicture(scalars, None, "the active orbitals belong to one fragment alone")
    rotation = active.orbitals.T @ localised
    transfer = _transfer_weights(active, rotation, n_first)
    shared = _neutral_share(active, parts, n_first)
    if shared is None:
        words = "an electron or charge that both fragments may have leaves no single covalent structure"
        return BondPicture(scalars, transfer, words)
    weights = transfer[shared], transfer[shared + 1 :].sum(), transfer[:shared].sum()
    scalars |= {f"bond_{name}": float(w) for name, w in zip(_WEIGHTS, weights, strict=True)}
    if n != 2 or active.electrons != (1, 1):
        return BondPicture(scalars, transfer, "non-orthogonal form: only for two electrons in two orbitals")
    pair = active.orbitals @ active.vector @ active.orbitals.T
    return BondPicture(scalars | valence_bond(pair, localised, parts), transfer, "")


def pair_picture(pair: Array, parts: Partition) -> BondPicture:
    """Return the weights of the whole wavefunction of two electrons in a singlet.

    The orthogonal form rests on two natural orbitals, the leading one and its antibonding partner.

    Args:
        pair: (n_ao, n_ao) symmetric amplitudes in Loewdin functions, of norm one.
        parts: the two fragments.
    """
    coefficients, orbitals = np.linalg.eigh(pair)
    lead = int(np.argmax(np.abs(coefficients)))
    sides = np.array(
        [np.where(parts.first, orbitals[:, lead], 0.0), np.where(parts.first, 0.0, orbitals[:, lead])]
    ).T
    alike = np.sum((np.linalg.qr(sides)[0].T @ orbitals) ** 2, axis=0) * coefficients**2
    alike[lead] = -1.0
    partner = int(np.argmax(alike))
    kept = np.array([coefficients[lead], coefficients[partner]])
    vector = np.diag(kept / np.linalg.norm(kept))
    chosen = orbitals[:, [lead, partner]]
    active = Active(chosen, vector, (1, 1), orbitals[:, :0])
    picture = active_picture(active, parts, np.sort(2.0 * np.diag(vector) ** 2)[::-1])
    localised, _ = localise(chosen, parts)
    return BondPicture(
        picture.scalars | valence_bond(pair, localised, parts), picture.transfer, picture.remark
    )


def localise(orbitals: Array, parts: Partition) -> tuple[Array, int]:
    """Return the orbitals turned to lie on one fragment each, the first one's leading, and how many it has.

    They diagonalise the population (Loewdin, J. Chem. Phys. 18, 365 (1950)) on the first fragment, which has
    as many of them as that rounds to; two orbitals are one for each fragment unless both clearly lie on one.
    """
    values, vectors = np.linalg.eigh(orbitals[parts.first].T @ orbitals[parts.first])
    n_first = round(float(values.sum()))
    if len(values) == 2 and values[0] < _ONE_SIDE and values[1] > 1.0 - _ONE_SIDE:
        n_first = 1
    return orbitals @ vectors[:, ::-1], n_first


def valence_bond(pair: Array, localised: Array, parts: Partition) -> dict[str, float]:
    """Return weights, overlap and captured share over the fragments' own orbitals.

    These are the localised orbitals cut down to the functions of their fragment.  With a the one, b the
    other, the structures are ab + ba, aa and bb; a weight is c_k sum_l S_kl c_l (Chirgwin and Coulson 1950).
    The share is the norm of the wavefunction's projection onto the three.

    Args:
        pair: (n_ao, n_ao) amplitudes of the two electrons in Loewdin functions.
        localised: (n_ao, 2) Loewdin orbitals, that of the first fragment leading.
    """
    own = fragment_orbitals(localised, parts)
    metric = own.T @ own
    inverse = np.linalg.inv(metric)
    amplitudes = inverse @ (own.T @ pair @ own) @ inverse
    weights, share = chirgwin_coulson(amplitudes, float(metric[0, 1]))
    found = {f"vb_{name}": float(w) for name, w in zip(_WEIGHTS, weights, strict=True)}
    return found | {"vb_captured": share, "vb_overlap": float(metric[0, 1])}


def fragment_orbitals(localised: Array, parts: Partition) -> Array:
    """Return the orbitals cut down to their fragment's functions, normalised, (n_ao, 2), Loewdin basis.

    Their phases are such that the overlap is not negative.
    """
    own = parts.inverse_root @ localised
    own[~parts.first, 0] = 0.0
    own[parts.first, 1] = 0.0
    own = parts.root @ own
    own = own / np.linalg.norm(own, axis=0)
    if own[:, 0] @ own[:, 1] < 0.0:
        own[:, 1] *= -1.0
    return own


def chirgwin_coulson(amplitudes: Array, overlap: float) -> tuple[Array, float]:
    """Return (covalent, both on the first, both on the second) weights and the norm of a pair function.

    ``amplitudes`` (2, 2), symmetric, are the coefficients of aa, ab, ba, bb; ``overlap`` is <a|b>.
    """
    norm = np.sqrt(2.0 * (1.0 + overlap**2))
    c = np.array([amplitudes[0, 1] * norm, amplitudes[0, 0], amplitudes[1, 1]])
    mixed = 2.0 * overlap / norm
    s = np.array([[1.0, mixed, mixed], [mixed, 1.0, overlap**2], [mixed, overlap**2, 1.0]])
    total = float(c @ s @ c)
    return c * (s @ c) / total, total


def _transfer_weights(active: Active, rotation: Array, n_first: int) -> Array:
    """Return the weights of configurations by the number of electrons in the first ``n_first`` orbitals."""
    n = len(rotation)
    turned = addons.transform_ci(active.vector, active.electrons, rotation)
    on_first = [_count(n, e, n_first) for e in active.electrons]
    total = on_first[0][:, None] + on_first[1][None, :]
    weights = np.bincount(total.ravel(), (turned**2).ravel(), minlength=sum(active.electrons) + 1)
    return weights / weights.sum()


def _count(n: int, electrons: int, n_first: int) -> NDArray[np.intp]:
    """Return how many electrons of each determinant string lie in the first ``n_first`` orbitals."""
    strings = cistring.make_strings(range(n), electrons)
    return np.array([bin(int(s) & ((1 << n_first) - 1)).count("1") for s in strings], dtype=np.intp)


def _neutral_share(active: Active, parts: Partition, n_first: int) -> int | None:
    """Return the first fragment's active electrons where none is transferred; ``None`` if not one number.

    One electron an orbital where there are as many of both, else what the neutral fragment's electrons
    leave over beside its doubly occupied orbitals.
    """
    n, n_electrons = active.orbitals.shape[1], sum(active.electrons)
    if parts.charge != 0:
        return None
    if n == n_electrons:
        return n_first
    doubly = round(float(np.sum(active.inactive[parts.first] ** 2)))
    left = parts.electrons[0] - 2 * doubly
    others = parts.electrons[1] - 2 * (active.inactive.shape[1] - doubly)
    fits = 0 <= left <= 2 * n_first and 0 <= others <= 2 * (n - n_first)
    return left if fits and left + others == n_electrons else None


def _bond_order(occupations: Array | None, n_electrons: int) -> dict[str, float]:
    """Return half of what the bonding orbitals hold more than their partners.

    Defined for as many electrons as orbitals.  Roos, Borin and Gagliardi, Angew. Chem. Int. Ed. 46, 1469
    (2007) (from memory).
    """
    if occupations is None or len(occupations) != n_electrons or n_electrons < 2:
        return {}
    half = n_electrons // 2
    ordered = np.sort(occupations)[::-1]
    return {"bond_order": float(ordered[:half].sum() - ordered[-half:].sum()) / 2.0}
