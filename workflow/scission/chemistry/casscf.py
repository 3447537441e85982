"""CASSCF references: spin fixed, orbitals and CI vectors carried, roots tracked."""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray
from pyscf import fci, gto, mcscf

from scission.records.store import Record, Store
from scission.solution import Solution

from . import scf
from .active_space import ActiveSpace, choose_space, holds_the_bond
from .bond_orders import mayer_orders
from .ci_vectors import analyse_vector, spin_densities
from .fragments import fragment_densities
from .molecule import build_mole, root_overlap
from .reference import candidates
from .solutions import dipole_moment, take_facts
from .symmetry import pure_orbitals, symmetric_mole

Array = NDArray[np.float64]

ENERGY_TOLERANCE = 1e-10
GRADIENT_TOLERANCE = 3e-6
CI_TOLERANCE = 1e-11
MAX_MACRO_CYCLES = 80
_SPIN_SHIFT = 0.5
_SPIN_ERROR = 1e-4
_STEP = 0.1
"""Largest orbital rotation of a step: the default of 0.02 takes twice the cycles from carried orbitals."""

_MODEL_SPACE = 100
"""Determinants of the preconditioner; the default of 400 spends most of a small CASSCF diagonalising it."""


def solve_casscf(task: dict[str, Any], store: Store) -> Solution:
    """Return the lowest CASSCF solution over the task's starts.

    Starts are ``carry`` (orbitals and CI vectors of a finished record) and ``select`` (choose the active
    space here, from the unrestricted determinant's natural orbitals).
    """
    mole = build_mole(task["molecule"], task["spec"]["basis"], np.array(task["positions"]))
    best: Solution | None = None
    for start in task["starts"]:
        begun = _begin(task, store, mole, start)
        if begun is None:
            continue
        solution = _optimise(task, mole, *begun)
        if best is None or _better(solution, best):
            best = solution
        if task.get("choose") == "first" and solution.converged:
            break
    if best is None:
        raise RuntimeError("no start was given from which the active space could be optimised")
    return best


def casci_object(
    mole: gto.Mole, spec: dict[str, Any], sizes: Array, orbital_step: bool, penalty: bool = True
) -> Any:
    """Return the engine's CASSCF (``orbital_step``) or CASCI object with our tolerances.

    The spin is fixed by a ``penalty`` on others; without it a CI vector keeps the spin that it starts with, as
    long as rounding does not let a lower state of another spin grow, at half the cost.
    """
    _, n_orbitals, n_electrons = (int(n) for n in sizes)
    field = scf.build_field(mole, spec)
    make = mcscf.CASSCF if orbital_step else mcscf.CASCI
    n_beta = (n_electrons - mole.spin) // 2
    mc = make(field, n_orbitals, (n_electrons - n_beta, n_beta))
    mc.fcisolver = fci.direct_spin1.FCI(mole)
    mc.fcisolver.conv_tol, mc.fcisolver.max_cycle = CI_TOLERANCE, 200
    mc.fcisolver.pspace_size = _MODEL_SPACE
    s = mole.spin / 2.0
    if penalty:
        mc.fix_spin_(shift=_SPIN_SHIFT, ss=s * (s + 1.0))
    states = spec.get("states", 1)
    if states > 1 and orbital_step:
        mc = mc.state_average_(np.full(states, 1.0 / states))
    elif states > 1:
        mc.fcisolver.nroots = states
    if orbital_step:
        mc.conv_tol, mc.conv_tol_grad = ENERGY_TOLERANCE, GRADIENT_TOLERANCE
        mc.max_cycle_macro, mc.chkfile = MAX_MACRO_CYCLES, None
        mc.max_stepsize = _STEP
        mc.canonicalization = False
    mc.verbose = 0
    return mc


def second_order_casscf(mole: gto.Mole, spec: dict[str, Any], sizes: Array, start: Any) -> Any:
    """Return the engine's object after second-order steps from the orbitals and CI vectors of ``start``."""
    mc = mcscf.newton(casci_object(mole, spec, sizes, orbital_step=True))
    mc.max_cycle_macro = MAX_MACRO_CYCLES
    mc.kernel(np.asarray(start.mo_coeff), ci0=start.ci)
    return mc


def finish_casscf(task: dict[str, Any], record: Record) -> Solution:
    """Return a finished record's wavefunction with natural occupations and leading weight."""
    mole = build_mole(task["molecule"], task["spec"]["basis"], np.array(task["positions"]))
    mc = casci_object(mole, task["spec"], record.arrays["active"], orbital_step=False)
    _, inverse_root = root_overlap(mole)
    coeff = inverse_root @ record.arrays["mo_lowdin"][0]
    solution = _solution(
        task, mole, mc, coeff, list(record.arrays["ci"]), record.arrays["state_energies"], True
    )
    if "state_labels" in record.arrays:
        solution.extra["state_labels"] = record.arrays["state_labels"]
    return solution


def _begin(
    task: dict[str, Any], store: Store, mole: gto.Mole, start: dict[str, Any]
) -> tuple[Any, ...] | None:
    """Return (coefficients, CI vectors or None, sizes, notes) to start from, or ``None``."""
    if "carry" in start:
        parent = store.read("reference", start["carry"])
        if parent is None or parent.status != "converged":
            return None
        _, inverse_root = root_overlap(mole)
        coeff = inverse_root @ parent.arrays["mo_lowdin"][0]
        notes = {"active_space": parent.notes.get("active_space", ""), "start": f"carried from {parent.key}"}
        return coeff, list(parent.arrays["ci"]), parent.arrays["active"], notes
    _, inverse_root = root_overlap(mole)
    space = _select(task, store, mole)
    sizes = np.array([space.n_inactive, space.n_orbitals, space.n_electrons])
    return (
        inverse_root @ space.orbitals,
        None,
        sizes,
        {"active_space": space.why, "start": "space chosen here"},
    )


def _select(task: dict[str, Any], store: Store, mole: gto.Mole) -> ActiveSpace:
    """Choose the space from the lowest unrestricted determinant that has broken this bond, else from fragments.

    The determinant of an ionic bond stays closed far beyond the length where the bond has turned covalent;
    there the separate neutral fragments show which orbitals the electrons of the bond end up in.
    """
    bond = task["bonds"][0]
    helper = {**task, "spec": {**task["spec"], "reference": "UHF"}, "remedy": ""}
    helper["starts"] = [{"engine": "minao"}, {"broken": True}, {"fragments": True}]
    fields = sorted((f for _, f in candidates(helper, store, mole) if f.converged), key=lambda f: f.e_tot)
    densities = [np.asarray(f.make_rdm1()).sum(axis=0) for f in fields]
    chosen = next((d for d in densities if holds_the_bond(mole, d, bond)), None)
    if chosen is None:
        chosen = _neutral_density(task)
    if chosen is None:
        chosen = densities[0]
    return choose_space(mole, chosen, task["spec"]["active_space"], task["bonds"], task["fragments"])


def _neutral_density(task: dict[str, Any]) -> Array | None:
    """Return the density of the lowest neutral split with its unpaired electrons along the bond."""
    if len(task["fragments"]) != 2:
        return None
    positions = np.array(task["positions"])
    a, b = task["bonds"][0]
    basis, axis = task["spec"]["basis"], positions[b] - positions[a]
    found = fragment_densities(task["molecule"], basis, positions, task["fragments"], axis, axial=True)
    return next((density.sum(axis=0) for _, density in found), None)


def _optimise(
    task: dict[str, Any],
    mole: gto.Mole,
    coeff: Array,
    vectors: list[Array] | None,
    sizes: Array,
    notes: dict[str, str],
) -> Solution:
    """Optimise orbitals and CI vectors; where the first-order steps do not converge, the second-order solver."""
    averaged = task["spec"].get("states", 1) > 1
    working, coeff, vectors = _with_symmetry(mole, coeff, vectors, sizes)
    guess = vectors if vectors is None or averaged else vectors[0]
    mc = None
    if guess is not None and not averaged and not task.get("remedy"):
        mc = _iterated(task, working, coeff, guess, sizes, penalty=False)
    if mc is None or not mc.converged or not _right_spin(mc, mole):
        mc = _iterated(task, working, coeff, guess, sizes, penalty=True)
    if not mc.converged:
        mc = second_order_casscf(mole, task["spec"], sizes, mc)
    found = list(mc.ci) if averaged else [mc.ci]
    energies = np.atleast_1d(mc.e_states if averaged else mc.e_tot)
    solution = _solution(
        task, mole, mc, np.asarray(mc.mo_coeff), [np.asarray(v) for v in found], energies, False
    )
    solution.converged = bool(mc.converged)
    solution.notes = notes
    solution.extra["active"] = sizes
    return solution


def _iterated(
    task: dict[str, Any], mole: gto.Mole, coeff: Array, guess: Any, sizes: Array, penalty: bool
) -> Any:
    """Return the engine's object after its first-order steps, none for the remedy that leaves them out."""
    mc = casci_object(mole, task["spec"], sizes, True, penalty)
    if task.get("remedy") == "second-order":
        mc.mo_coeff, mc.ci, mc.converged = coeff, guess, False
    else:
        mc.kernel(coeff, ci0=guess)
    return mc


def _right_spin(mc: Any, mole: gto.Mole) -> bool:
    s = mole.spin / 2.0
    return bool(abs(mc.fcisolver.spin_square(mc.ci, mc.ncas, mc.nelecas)[0] - s * (s + 1.0)) < _SPIN_ERROR)


def _with_symmetry(
    mole: gto.Mole, coeff: Array, vectors: list[Array] | None, sizes: Array
) -> tuple[gto.Mole, Array, list[Array] | None]:
    """Return molecule, orbitals and CI vectors with the point group put to use, where the orbitals have it."""
    symmetric = symmetric_mole(mole)
    n_core, n_active, n_electrons = (int(n) for n in sizes)
    root, inverse_root = root_overlap(mole)
    x = root @ coeff
    pure = pure_orbitals(symmetric, x, (n_core, n_core + n_active)) if symmetric is not None else None
    if symmetric is None or pure is None:
        return mole, coeff, vectors
    turned, rotation = pure
    if vectors is not None:
        n_beta = (n_electrons - mole.spin) // 2
        electrons = (n_electrons - n_beta, n_beta)
        vectors = [fci.addons.transform_ci(v, electrons, rotation) for v in vectors]
    return symmetric, inverse_root @ turned, vectors


def _solution(
    task: dict[str, Any],
    mole: gto.Mole,
    mc: Any,
    coeff: Array,
    vectors: list[Array],
    energies: Array,
    diagnose: bool,
) -> Solution:
    n_core, n_active = int(mc.ncore), int(mc.ncas)
    order = np.argsort(energies, kind="stable")
    vectors, energies = [vectors[i] for i in order], np.asarray(energies, dtype=float)[order]
    by_spin = spin_densities(vectors[0], n_active, mc.nelecas)
    dm1 = by_spin[0] + by_spin[1]
    core, active = coeff[:, :n_core] @ coeff[:, :n_core].T, coeff[:, n_core : n_core + n_active]
    alpha, beta = (core + active @ d @ active.T for d in by_spin)
    occ = np.zeros((1, coeff.shape[1]))
    occ[0, :n_core] = 2.0
    occ[0, n_core : n_core + n_active] = np.diag(dm1)
    root, _ = root_overlap(mole)
    overlap = root @ root
    solution = Solution(
        reference="CASSCF",
        correlation="none",
        converged=True,
        energy=float(energies[0]),
        n_electrons=(int(mole.nelec[0]), int(mole.nelec[1])),
        spin=mole.spin / 2.0,
        mo_coeff=coeff[None],
        mo_occ=occ,
        overlap=overlap,
        s2=float(fci.spin_op.spin_square0(vectors[0], n_active, mc.nelecas)[0]),
        energies={"reference": float(energies[0]), "nuclear": float(mole.energy_nuc())},
        state_energies=energies,
        n_inactive=n_core,
        dipole=dipole_moment(mc._scf, alpha + beta),
        extra={
            "mo_lowdin": (root @ coeff)[None],
            "mo_occ": occ,
            "ci": np.array(vectors),
            "active": np.array([n_core, n_active, sum(mc.nelecas)]),
        },
    )
    if diagnose:
        take_facts(solution, analyse_vector(vectors[0], n_active, mc.nelecas))
        solution.bond_orders = mayer_orders(mole, alpha, beta, task.get("bonds", ()), overlap)
    return solution


def _better(new: Solution, old: Solution) -> bool:
    if new.converged != old.converged:
        return new.converged
    return new.energy < old.energy - 1e-7
