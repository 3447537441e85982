"""The classic pictures of a two-electron bond, over one orbital of each free atom.

``PAIR``: the covalent pair function a(1)b(2) + b(1)a(2), Heitler and London, Z. Phys. 44, 455 (1927).
``ORBITAL``: the bonding combination of a and b, doubly occupied, Hund and Mulliken; see Mulliken, Phys. Rev.
41, 49 (1932) (from memory).
``PAIR+IONIC``: the pair function with the ionic terms a(1)a(2) and b(1)b(2), Weinbaum, J. Chem. Phys. 1, 593
(1933) (from memory).  The orbitals keep the shape they have in the free atom, so nothing is iterated.
"""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray
from pyscf import ao2mo, gto
from scipy.linalg import eigh
from scipy.optimize import minimize_scalar

from scission.solution import Solution

from .bond_picture import Active, active_picture, add_picture, partition
from .molecule import build_mole

Array = NDArray[np.float64]

_COVALENT = np.array([[0.0, 1.0], [1.0, 0.0]])
_IONIC = (np.diag([1.0, 0.0]), np.diag([0.0, 1.0]))
_ANGLES = np.linspace(0.0, np.pi / 2, 46)


class TwoOrbitals:
    """Integrals over two orbitals that overlap: pair functions are their symmetric (2, 2) amplitudes."""

    def __init__(self, mole: gto.Mole, orbitals: Array) -> None:
        core = mole.intor_symmetric("int1e_kin") + mole.intor_symmetric("int1e_nuc")
        if mole.has_ecp():
            core = core + mole.intor_symmetric("ECPscalar")
        self.overlap = orbitals.T @ mole.intor_symmetric("int1e_ovlp") @ orbitals
        self.core = orbitals.T @ core @ orbitals
        self.repulsion = ao2mo.restore(1, ao2mo.kernel(mole, orbitals), 2)
        self.nuclear = float(mole.energy_nuc())

    def product(self, k: Array, m: Array) -> float:
        """Return <k|m>."""
        return float(np.sum(k * (self.overlap @ m @ self.overlap)))

    def coupling(self, k: Array, m: Array) -> float:
        """Return <k|H|m> of the electrons, hartree."""
        one = self.core @ m @ self.overlap + self.overlap @ m @ self.core
        return float(np.sum(k * one) + np.einsum("pq,prqs,rs", k, self.repulsion, m))

    def energy(self, k: Array) -> float:
        """Return the energy of a pair function with the repulsion of the nuclei, hartree."""
        return self.coupling(k, k) / self.product(k, k) + self.nuclear


def solve_picture(task: dict[str, Any]) -> Solution:
    """Return one picture of the bond at one geometry; two electrons and two atoms."""
    mole = build_mole(task["molecule"], task["spec"]["basis"], np.array(task["positions"]))
    orbitals = free_atom_orbitals(task, mole)
    two = TwoOrbitals(mole, orbitals)
    amplitudes = PICTURE_FUNCTIONS[task["spec"]["reference"]](two)
    amplitudes = amplitudes / np.sqrt(two.product(amplitudes, amplitudes))
    return _solution(task, mole, two.energy(amplitudes), orbitals, amplitudes)


def free_atom_orbitals(task: dict[str, Any], mole: gto.Mole) -> Array:
    """Return the lowest orbital of each atom with one electron, (n_ao, 2), with a positive overlap."""
    orbitals = np.zeros((mole.nao, 2))
    for i, (first, last) in enumerate(mole.aoslice_by_atom()[:, 2:]):
        symbol = task["molecule"]["symbols"][i]
        charge = int(mole.atom_charge(i)) - 1
        facts = {"symbols": [symbol], "charge": charge, "multiplicity": 2}
        atom = build_mole(facts, task["spec"]["basis"], np.zeros((1, 3)))
        core = atom.intor_symmetric("int1e_kin") + atom.intor_symmetric("int1e_nuc")
        if atom.has_ecp():
            core = core + atom.intor_symmetric("ECPscalar")
        _, vectors = eigh(core, atom.intor_symmetric("int1e_ovlp"))
        orbitals[first:last, i] = vectors[:, 0]
    if orbitals[:, 0] @ mole.intor_symmetric("int1e_ovlp") @ orbitals[:, 1] < 0.0:
        orbitals[:, 1] *= -1.0
    return orbitals


def pair(_: TwoOrbitals) -> Array:
    """Return the covalent pair function."""
    return _COVALENT


def orbital(two: TwoOrbitals) -> Array:
    """Return the lowest doubly occupied combination cos(t) a + sin(t) b, t from 0 to 90 degrees."""
    start = _ANGLES[int(np.argmin([two.energy(_doubly(t)) for t in _ANGLES]))]
    step = _ANGLES[1]
    bounds = (max(start - step, 0.0), min(start + step, np.pi / 2))
    best = minimize_scalar(
        lambda t: two.energy(_doubly(t)), bounds=bounds, method="bounded", options={"xatol": 1e-9}
    )
    return _doubly(float(best.x))


def pair_and_ionic(two: TwoOrbitals) -> Array:
    """Return the lowest combination of the covalent and the two ionic functions."""
    functions = (_COVALENT, *_IONIC)
    h = np.array([[two.coupling(k, m) for m in functions] for k in functions])
    s = np.array([[two.product(k, m) for m in functions] for k in functions])
    _, vectors = eigh(h, s)
    return np.asarray(sum(c * f for c, f in zip(vectors[:, 0], functions, strict=True)))


PICTURE_FUNCTIONS = {"PAIR": pair, "ORBITAL": orbital, "PAIR+IONIC": pair_and_ionic}
"""Reference -> function that gives the amplitudes, not normalised."""


def _doubly(angle: float) -> Array:
    c = np.array([np.cos(angle), np.sin(angle)])
    return np.outer(c, c)


def _solution(
    task: dict[str, Any], mole: gto.Mole, energy: float, orbitals: Array, amplitudes: Array
) -> Solution:
    """Return the picture as a Solution in its two natural orbitals.

    ``orbitals`` are (n_ao, 2), ``amplitudes`` (2, 2) those of the pair function over them.
    """
    parts = partition(mole, task["fragments"])
    u, _, vt = np.linalg.svd(parts.root @ orbitals, full_matrices=False)
    basis = u @ vt  # the two orbitals, symmetrically orthogonalised
    turn = basis.T @ parts.root @ orbitals
    coefficients, vectors = np.linalg.eigh(turn @ amplitudes @ turn.T)
    order = np.argsort(-np.abs(coefficients), kind="stable")
    kept, x = coefficients[order], basis @ vectors[:, order]
    occ = 2.0 * kept**2
    solution = Solution(
        reference=task["spec"]["reference"],
        correlation="none",
        converged=True,
        energy=energy,
        n_electrons=(1, 1),
        spin=0.0,
        mo_coeff=(parts.inverse_root @ x)[None],
        mo_occ=occ[None],
        overlap=parts.root @ parts.root,
        s2=0.0,
        energies={"reference": energy, "nuclear": float(mole.energy_nuc())},
        natural_occupations=occ,
        leading_weight=float(kept[0] ** 2),
        notes={"start": "orbitals of the free atoms at frozen shape"},
        extra={"mo_lowdin": x[None], "mo_occ": occ[None]},
    )
    active = Active(x, np.diag(kept), (1, 1), x[:, :0])
    add_picture(solution, active_picture(active, parts, occ))
    return solution
