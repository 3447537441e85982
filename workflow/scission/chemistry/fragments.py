"""Starting densities from separated fragments, in all their spin and charge splits.

Far apart, routes that start from the whole molecule can agree on a wrong state: only a start built from
neutral (or ionic) fragments finds the other one.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from functools import lru_cache
from itertools import product
from typing import Any

import numpy as np
from numpy.typing import NDArray
from pyscf import gto
from pyscf.gto.mole import ao_rotation_matrix, charge
from pyscf.scf import uhf

from .integrals import share
from .molecule import build_mole
from .scf import MAX_CYCLES

Array = NDArray[np.float64]

NEUTRAL_STARTS = 3
IONIC_STARTS = 2
_ORIENTATIONS = 9
_SAME_SCORE = 1e-8
_WORTH_TRYING = 0.25
"""Splits this far (hartree) above the lowest one, the attraction of charges included, are not tried."""
_SHAPE_DIGITS = 7
"""Fragments whose atoms lie this alike (decimals of a bohr) are the same fragment: they only start things."""
_AXIS_CYCLES = tuple(np.roll(np.eye(3), k, axis=0) for k in range(3))


@dataclass(frozen=True)
class FragmentState:
    """A fragment by itself: charge, unpaired electrons, energy and densities (2, n_ao, n_ao)."""

    charge: int
    unpaired: int
    energy: float
    density: Array


@dataclass
class Split:
    """One way to share charge and spin between the fragments, with the sum of the fragments' energies."""

    label: str
    energy: float
    ionic: bool
    states: tuple[FragmentState, ...]
    flipped: tuple[bool, ...]


def fragment_densities(
    facts: dict[str, Any],
    basis: dict[str, str],
    positions: Array,
    fragments: Sequence[Sequence[int]],
    axis: Array,
    axial: bool = False,
) -> Iterator[tuple[str, Array]]:
    """Yield (label, density (2, n_ao, n_ao)) of the most promising splits, neutral ones first.

    Atoms whose density is not spherical are tried with each of three orientations to ``axis`` (the bond);
    the orientation whose energy is lowest in one evaluation comes first, or with ``axial`` the one whose
    unpaired electrons lie along the bond.  Of the lowest split all different ones are given: one evaluation
    does not tell which is lowest (F2: the hole of one atom along, that of the other across the bond).
    """
    mole = build_mole(facts, basis, positions)
    field = share(uhf.UHF(mole))
    for number, split in enumerate(promising_splits(facts, basis, positions, fragments)):
        options = [
            _orientations(facts, basis, atoms, s, axis)
            for atoms, s in zip(fragments, split.states, strict=True)
        ]
        scored: list[tuple[float, Array]] = []
        for choice in product(*options):
            density = _assemble(mole, fragments, choice, split.flipped)
            score = (
                -_spread(mole, density[0] - density[1], axis)
                if axial
                else float(field.energy_tot(dm=density))
            )
            if not any(
                abs(score - known) < _SAME_SCORE for known, _ in scored
            ):  # equal ones are turned copies
                scored.append((score, density))
        scored.sort(key=lambda s: s[0])
        for _, density in scored[: _ORIENTATIONS if number == 0 else 1]:
            yield split.label, density


def promising_splits(
    facts: dict[str, Any], basis: dict[str, str], positions: Array, fragments: Sequence[Sequence[int]]
) -> list[Split]:
    """Return the splits of charge and spin lowest in energy: some neutral ones, some with charge moved."""
    cache: dict[tuple[int, int, int], FragmentState | None] = {}

    def state(which: int, q: int, unpaired: int) -> FragmentState | None:
        key = which, q, unpaired
        if key not in cache:
            cache[key] = _fragment_state(facts, basis, positions, fragments[which], q, unpaired)
        return cache[key]

    wanted = facts["multiplicity"] - 1
    a, b = (positions[list(f)].mean(axis=0) for f in fragments)
    distance = float(np.linalg.norm(a - b))
    splits: list[Split] = []
    for q in _charge_splits(facts["charge"]):
        for unpaired in product(*(_unpaired_options(facts, f, c) for f, c in zip(fragments, q, strict=True))):
            flips = _flips(unpaired, wanted)
            if flips is None:
                continue
            states = [state(i, c, u) for i, (c, u) in enumerate(zip(q, unpaired, strict=True))]
            if any(s is None for s in states):
                continue
            known = tuple(s for s in states if s is not None)
            label = f"fragments with charges {q[0]:+d}, {q[1]:+d} and {unpaired[0]}, {unpaired[1]} unpaired electrons"
            energy = sum(s.energy for s in known) + q[0] * q[1] / distance
            splits.append(Split(label, energy, abs(q[0]) + abs(q[1]) > abs(facts["charge"]), known, flips))
    splits.sort(key=lambda s: s.energy)
    splits = [s for s in splits if s.energy < splits[0].energy + _WORTH_TRYING]
    return [s for s in splits if not s.ionic][:NEUTRAL_STARTS] + [s for s in splits if s.ionic][:IONIC_STARTS]


def _charge_splits(total: int) -> list[tuple[int, int]]:
    """Return the ways to give a total charge to two fragments, none further than one from an even share."""
    half = total // 2
    return [
        (q, total - q)
        for q in range(min(half, 0) - 1, max(total - half, 0) + 2)
        if abs(total - q) <= abs(total) + 1
    ]


def _unpaired_options(facts: dict[str, Any], atoms: Sequence[int], q: int) -> list[int]:
    """Return the numbers of unpaired electrons worth trying for a fragment."""
    electrons = sum(charge(facts["symbols"][a]) for a in atoms) - q
    if electrons < 0:
        return []
    single = len(atoms) == 1
    heavy = single and charge(facts["symbols"][atoms[0]]) > 20
    most = 6 if heavy else 4 if single else 3
    return [u for u in range(electrons % 2, most + 1, 2) if u <= electrons]


def _flips(unpaired: Sequence[int], wanted: int) -> tuple[bool, ...] | None:
    """Return which fragment's spin points down so that the unpaired electrons add up to ``wanted``."""
    for flips in ((False, True), (True, False), (False, False)):
        if sum(-u if f else u for u, f in zip(unpaired, flips, strict=True)) == wanted:
            return flips
    return None


def _fragment_state(
    facts: dict[str, Any],
    basis: dict[str, str],
    positions: Array,
    atoms: Sequence[int],
    q: int,
    unpaired: int,
) -> FragmentState | None:
    """Return a fragment's unrestricted solution, or ``None`` if its electrons do not fit its basis."""
    symbols = tuple(facts["symbols"][a] for a in atoms)
    shape = np.round(positions[list(atoms)] - positions[atoms[0]], _SHAPE_DIGITS) + 0.0
    names = tuple((s, basis[s]) for s in sorted(set(symbols)))
    return _alone(symbols, names, tuple(map(tuple, shape.tolist())), q, unpaired)


@lru_cache(maxsize=128)
def _alone(
    symbols: tuple[str, ...],
    basis: tuple[tuple[str, str], ...],
    shape: tuple[tuple[float, ...], ...],
    q: int,
    unpaired: int,
) -> FragmentState | None:
    """Return the same for positions counted from the fragment's first atom: it is alike at every length."""
    part = {"symbols": list(symbols), "charge": q, "multiplicity": unpaired + 1}
    mole = build_mole(part, dict(basis), np.array(shape))
    n = mole.nao
    if mole.nelectron == 0:
        return FragmentState(q, unpaired, float(mole.energy_nuc()), np.zeros((2, n, n)))
    if max(mole.nelec) > n or min(mole.nelec) < 0:
        return None
    field = share(uhf.UHF(mole))
    field.conv_tol, field.max_cycle, field.chkfile = 1e-7, MAX_CYCLES, None
    field.kernel()
    return FragmentState(q, unpaired, float(field.e_tot), np.asarray(field.make_rdm1()))


def _orientations(
    facts: dict[str, Any], basis: dict[str, str], atoms: Sequence[int], state: FragmentState, axis: Array
) -> list[Array]:
    """Return a fragment's density in each orientation worth trying."""
    if len(atoms) > 1:
        return [state.density]
    part = {
        "symbols": [facts["symbols"][atoms[0]]],
        "charge": state.charge,
        "multiplicity": state.unpaired + 1,
    }
    atom = build_mole(part, basis, np.zeros((1, 3)))
    frame = _frame(axis)
    rotated: list[Array] = []
    for cycle in _AXIS_CYCLES:
        u = ao_rotation_matrix(atom, frame @ cycle)
        density = np.array([u @ d @ u.T for d in state.density])
        if not any(np.allclose(density, known, atol=1e-4) for known in rotated):
            rotated.append(density)
    return rotated


def _spread(mole: gto.Mole, spin_density: Array, axis: Array) -> float:
    """Return how far the unpaired electrons of all atoms reach along the axis, summed over atoms, bohr^2."""
    unit = axis / np.linalg.norm(axis)
    total = 0.0
    for atom, (first, last) in enumerate(mole.aoslice_by_atom()[:, 2:]):
        with mole.with_common_orig(mole.atom_coord(atom)):
            moments = mole.intor("int1e_rr").reshape(3, 3, mole.nao, mole.nao)
        along = np.einsum("i,ijpq,j->pq", unit, moments, unit)[first:last, first:last]
        total += abs(float(np.einsum("pq,qp->", along, spin_density[first:last, first:last])))
    return total


def _frame(axis: Array) -> Array:
    """Return a proper rotation that turns z into ``axis``, (3, 3)."""
    z = axis / np.linalg.norm(axis)
    helper = np.eye(3)[int(np.argmin(np.abs(z)))]
    x = np.cross(helper, z)
    x /= np.linalg.norm(x)
    return np.array([x, np.cross(z, x), z]).T


def _assemble(
    mole: gto.Mole, fragments: Sequence[Sequence[int]], densities: Sequence[Array], flipped: Sequence[bool]
) -> Array:
    """Return the block-diagonal density of the molecule, (2, n_ao, n_ao), from its fragments' densities."""
    total = np.zeros((2, mole.nao, mole.nao))
    slices = mole.aoslice_by_atom()[:, 2:]
    for atoms, density, flip in zip(fragments, densities, flipped, strict=True):
        where = np.concatenate([np.arange(*slices[a]) for a in atoms])
        total[np.ix_(np.arange(2), where, where)] += density[::-1] if flip else density
    return total
