"""Coupled cluster with singles, doubles and perturbative triples."""

from __future__ import annotations

from typing import Any

import numpy as np
from pyscf import cc
from pyscf.scf import rohf

from scission.records.store import Record, Store
from scission.solution import Solution

from .amplitudes import Amplitudes, amplitudes_of, fingerprint, recall, remember
from .molecule import build_mole
from .solutions import solution_of_field

ENERGY_TOLERANCE = 1e-9
AMPLITUDE_TOLERANCE = 1e-7
MAX_CYCLES = 100

_DIVERGED = 10.0
"""Correlation energies beyond this many hartree belong to amplitudes that diverge (light molecules)."""

DAMPED: dict[str, float | int] = {"iterative_damping": 0.5, "diis_space": 10, "max_cycle": 150}
REMEDIES: dict[str, dict[str, float | int]] = {
    "damping": {"iterative_damping": 0.3, "max_cycle": 300, "diis_space": 12},
    "level-shift": {"level_shift": 0.3, "max_cycle": 300},
    "more-cycles": {"max_cycle": 600, "diis_space": 15},
}


def coupled_cluster(
    task: dict[str, Any], field: Any, reference: Record, frozen: int, store: Store
) -> Solution:
    """Return the CCSD or CCSD(T) energy and amplitudes on an RHF, UHF or ROHF reference.

    Where the iterations do not converge, or end on a solution above the reference, the amplitudes of
    neighbouring points nearer to the equilibrium (``task["neighbours"]``) are carried here.
    For ROHF the orbitals are made semicanonical first, which the triples correction is defined with
    (Watts, Gauss and Bartlett, J. Chem. Phys. 98, 8718 (1993)); the CCSD energy does not depend on it.
    """
    solution = solution_of_field(field, task["spec"], diagnose=False)
    solution.n_correlated = sum(solution.n_electrons) - 2 * frozen
    solver = make_solver(field, frozen)
    how = solve(solver, task, reference, frozen, store)
    if how:
        solution.notes["amplitudes"] = how
    wanted = task["correlation"] == "CCSD(T)" and solver.converged
    _complete(solution, solver, float(solver.ccsd_t(eris=transformed(solver))) if wanted else None)
    return solution


def make_solver(field: Any, frozen: int) -> Any:
    """Return the engine's CCSD object with our tolerances."""
    if isinstance(field, rohf.ROHF):
        field = semicanonical(field, frozen)
    solver = cc.CCSD(field, frozen=frozen or None)
    solver.conv_tol, solver.conv_tol_normt, solver.max_cycle = (
        ENERGY_TOLERANCE,
        AMPLITUDE_TOLERANCE,
        MAX_CYCLES,
    )
    return solver


def transformed(solver: Any) -> Any:
    """Return the solver's integrals over its orbitals, transformed once for all that is done with them.

    The engine by itself transforms them again for every call of iterations, triples or density.
    """
    if getattr(solver, "kept_integrals", None) is None:
        solver.kept_integrals = solver.ao2mo(solver.mo_coeff)
    return solver.kept_integrals


def semicanonical(field: Any, frozen: int = 0) -> Any:
    """Return an unrestricted field with ROHF's occupied spaces, each spin's Fock matrix diagonal within them.

    The ``frozen`` lowest orbitals keep their space, so that what is frozen are ROHF's own core orbitals.
    """
    result = field.to_uhf()
    fock = np.asarray(result.get_fock(dm=result.make_rdm1()))
    coeff, energy = np.array(result.mo_coeff), np.array(result.mo_energy, dtype=float)
    core = np.arange(coeff.shape[2]) < frozen
    for s in range(2):
        occupied = result.mo_occ[s] > 0.5
        for space in (core, occupied & ~core, ~occupied):
            if np.any(space):
                block = coeff[s][:, space]
                energy[s, space], rotation = np.linalg.eigh(block.T @ fock[s] @ block)
                coeff[s][:, space] = block @ rotation
    result.mo_coeff, result.mo_energy, result.converged = coeff, energy, True
    return result


def solve(solver: Any, task: dict[str, Any], reference: Record, frozen: int, store: Store) -> str:
    """Converge the amplitudes; return in words what it took, empty for the usual way.

    Levels of one geometry that need the same amplitudes find those that the first of them left.
    """
    remedy = task.get("remedy", "")
    known = None if remedy else recall(reference, frozen)
    if known is not None and _iterate(solver, known.at(solver), {}):
        return known.how
    how = _search(solver, task, frozen, store)
    if solver.converged and not _sound(solver):
        solver.converged = False
    if solver.converged:
        remember(reference, frozen, amplitudes_of(solver, how))
    return how


def _search(solver: Any, task: dict[str, Any], frozen: int, store: Store) -> str:
    """Try one way after another until the amplitudes converge; return the words of the last one."""
    remedy = task.get("remedy", "")
    if remedy in REMEDIES:
        _iterate(solver, None, REMEDIES[remedy])
        return remedy
    if remedy != "neighbour" and _iterate(solver, None, {}):
        return ""
    start = _carried(task, frozen, store)
    if start is not None and _iterate(solver, start.at(solver), DAMPED):
        return "carried from the neighbour nearer to the equilibrium"
    _iterate(solver, None, DAMPED)
    return "damped iterations"


def _carried(task: dict[str, Any], frozen: int, store: Store) -> Amplitudes | None:
    """Return amplitudes of the nearest neighbour, continued from the nearest one that converges by itself."""
    neighbours = task.get("neighbours", [])
    for depth, neighbour in enumerate(neighbours):
        start = _at_neighbour(task, neighbour, None, frozen, store)
        if start is None:
            continue
        for nearer in reversed(neighbours[:depth]):
            start = _at_neighbour(task, nearer, start, frozen, store)
            if start is None:
                return None
        return start
    return None


def _at_neighbour(
    task: dict[str, Any], neighbour: dict[str, Any], start: Amplitudes | None, frozen: int, store: Store
) -> Amplitudes | None:
    """Return converged amplitudes at a neighbour, from ``start`` or by themselves; ``None`` if they do not."""
    from .correlate import prepared_field  # the two modules need each other

    reference = store.read("reference", neighbour["reference_key"])
    if reference is None or reference.status != "converged":
        return None
    known = recall(reference, frozen)
    if known is not None:
        return known
    mole = build_mole(task["molecule"], task["spec"]["basis"], np.array(neighbour["positions"]))
    solver = make_solver(prepared_field(task, mole, reference), frozen)
    good = _iterate(solver, start.at(solver) if start else None, DAMPED if start else {})
    if not good:
        return None
    found = amplitudes_of(solver)
    remember(reference, frozen, found)
    return found


def _iterate(solver: Any, start: tuple[Any, Any] | None, changes: dict[str, float | int]) -> bool:
    """Iterate the amplitudes; return whether they converged to a solution below the reference."""
    solver.diis = True
    for name, value in changes.items():
        setattr(solver, name, value)
    try:
        solver.kernel(*(start or (None, None)), eris=transformed(solver))
    except (AttributeError, np.linalg.LinAlgError):
        # the extrapolation meets linearly dependent vectors where amplitudes diverge
        solver.converged = False
    return bool(solver.converged) and _sound(solver)


def _sound(solver: Any) -> bool:
    """Whether the correlation energy is one a ground state can have: finite and not above the reference."""
    return (
        solver.e_corr is not None and bool(np.isfinite(solver.e_corr)) and -_DIVERGED < solver.e_corr < 1e-9
    )


def _complete(solution: Solution, solver: Any, triples: float | None) -> None:
    doubles = float(solver.e_corr) if solver.e_corr is not None else float("nan")
    total = doubles + (triples or 0.0)
    solution.energy += total
    solution.energies["correlation"] = total
    if triples is not None:
        solution.energies["triples"] = triples
    solution.converged = bool(solver.converged)
    if not solution.converged:
        return
    solution.extra["amplitude_orbitals"] = fingerprint(solver)
    solution.t1 = (
        tuple(np.asarray(t) for t in solver.t1) if isinstance(solver.t1, tuple) else (np.asarray(solver.t1),)
    )
    solution.t2 = (
        tuple(np.asarray(t) for t in solver.t2) if isinstance(solver.t2, tuple) else (np.asarray(solver.t2),)
    )
