"""Coupled cluster with singles, doubles and perturbative triples."""

from __future__ import annotations

from typing import Any

import numpy as np
from pyscf import cc
from pyscf.scf import rohf

from scission.records.store import Record
from scission.solution import Solution

from .solutions import solution_of_field

ENERGY_TOLERANCE = 1e-9
AMPLITUDE_TOLERANCE = 1e-7
MAX_CYCLES = 100

_DIVERGED = 10.0
"""Correlation energies beyond this many hartree belong to amplitudes that diverge (light molecules)."""

LADDER: tuple[dict[str, float | int], ...] = (
    {},
    {"iterative_damping": 0.5, "diis_space": 10, "max_cycle": 150},
    {"iterative_damping": 0.3, "diis_start_cycle": 30, "diis_space": 12, "max_cycle": 250},
)
"""What is changed from one try to the next; each try starts from the amplitudes of the one before."""

REMEDIES: dict[str, dict[str, float | int]] = {
    "damping": {"iterative_damping": 0.3, "max_cycle": 300, "diis_space": 12},
    "level-shift": {"level_shift": 0.3, "max_cycle": 300},
    "more-cycles": {"max_cycle": 600, "diis_space": 15},
}


def coupled_cluster(task: dict[str, Any], field: Any, _: Record, frozen: int) -> Solution:
    """Return the CCSD or CCSD(T) energy and amplitudes on an RHF, UHF or ROHF reference.

    For ROHF the orbitals are made semicanonical first, which the triples correction is defined with
    (Watts, Gauss and Bartlett, J. Chem. Phys. 98, 8718 (1993)); the CCSD energy does not depend on it.
    """
    solution = solution_of_field(field, task["spec"], diagnose=False)
    if isinstance(field, rohf.ROHF):
        field = semicanonical(field)
    solver = cc.CCSD(field, frozen=frozen or None)
    _iterate(solver, task.get("remedy", ""))
    wanted = task["correlation"] == "CCSD(T)" and solver.converged
    _complete(solution, solver, float(solver.ccsd_t()) if wanted else None)
    solution.n_correlated = sum(solution.n_electrons) - 2 * frozen
    return solution


def semicanonical(field: Any) -> Any:
    """Return an unrestricted field with ROHF's occupied spaces, each spin's Fock matrix diagonal within them."""
    result = field.to_uhf()
    fock = np.asarray(result.get_fock(dm=result.make_rdm1()))
    coeff, energy = np.array(result.mo_coeff), np.array(result.mo_energy, dtype=float)
    for s in range(2):
        for space in (result.mo_occ[s] > 0.5, result.mo_occ[s] < 0.5):
            if np.any(space):
                block = coeff[s][:, space]
                energy[s, space], rotation = np.linalg.eigh(block.T @ fock[s] @ block)
                coeff[s][:, space] = block @ rotation
    result.mo_coeff, result.mo_energy, result.converged = coeff, energy, True
    return result


def _iterate(solver: Any, remedy: str) -> None:
    """Iterate the amplitudes, each try from the best ones of the try before."""
    solver.conv_tol, solver.conv_tol_normt, solver.max_cycle = ENERGY_TOLERANCE, AMPLITUDE_TOLERANCE, MAX_CYCLES
    amplitudes: tuple[Any, Any] = (None, None)
    for changes in (REMEDIES[remedy],) if remedy in REMEDIES else LADDER:
        for name, value in changes.items():
            setattr(solver, name, value)
        try:
            solver.kernel(*amplitudes)
        except (AttributeError, np.linalg.LinAlgError):
            # the extrapolation meets linearly dependent vectors when amplitudes diverge; go on without it
            solver.converged, solver.diis = False, False
        if solver.converged:
            return
        amplitudes = (solver.t1, solver.t2) if _sound(solver) else (None, None)


def _sound(solver: Any) -> bool:
    """Whether amplitudes that did not converge are worth going on from."""
    return solver.t1 is not None and np.isfinite(solver.e_corr) and abs(solver.e_corr) < _DIVERGED


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
    solution.t1 = tuple(np.asarray(t) for t in solver.t1) if isinstance(solver.t1, tuple) else (np.asarray(solver.t1),)
    solution.t2 = tuple(np.asarray(t) for t in solver.t2) if isinstance(solver.t2, tuple) else (np.asarray(solver.t2),)
