"""Full configuration interaction in the space of all orbitals but the frozen ones."""

from __future__ import annotations

from typing import Any

import numpy as np
from pyscf import fci, mcscf

from scission.records.store import Record, Store
from scission.solution import Solution

from .bond_picture import describe_pair_bond
from .ci_vectors import analyse_vector
from .solutions import solution_of_field, take_facts

ENERGY_TOLERANCE = 1e-10
MAX_CYCLES = 300
_SPIN_SHIFT = 0.5
_GUESSES = 4
_LONGEST_STRING = 63
"""Orbitals that the engine's occupation strings hold in one word of 64 bits."""


def full_ci(task: dict[str, Any], field: Any, _: Record, frozen: int, __: Store) -> Solution:
    """Return the lowest full-CI state of the spin asked for; ``frozen`` orbitals stay doubly occupied."""
    mole = field.mol
    restricted = field if np.ndim(field.mo_coeff) == 2 else _shared_orbitals(field)
    size, electrons = restricted.mo_coeff.shape[1] - frozen, (mole.nelec[0] - frozen, mole.nelec[1] - frozen)
    mc = mcscf.CASCI(restricted, size, electrons)
    mc.canonicalization, mc.verbose = False, 0
    _choose_solver(mc, mole.spin / 2.0, size, electrons)
    _solve(mc, size, electrons)
    solution = solution_of_field(field, task["spec"], diagnose=False)
    solution.energies["correlation"] = float(mc.e_tot) - solution.energy
    solution.energy, solution.converged = float(mc.e_tot), bool(np.all(mc.fcisolver.converged))
    solution.n_correlated = sum(electrons)
    _describe(solution, mc.ci, size, electrons, frozen)
    if electrons == (1, 1) and frozen == 0:
        describe_pair_bond(solution, task, restricted.mo_coeff @ mc.ci @ restricted.mo_coeff.T)
    return solution


def _choose_solver(mc: Any, spin: float, size: int, electrons: tuple[int, int]) -> None:
    """Give ``mc`` a solver that stays in the spin asked for.

    A singlet's matrix of coefficients is symmetric, which keeps triplets out: far apart they have its energy,
    and a search that starts from one of them ends in an ionic state.  Higher spins are kept out by the engine's
    penalty, which works on occupation strings of 63 orbitals at most; a pair of electrons needs none.

    Raises:
        ValueError: more than a pair of electrons in more orbitals than that.
    """
    long = size > _LONGEST_STRING
    if long and electrons != (1, 1):
        raise ValueError(
            f"full CI of {sum(electrons)} electrons in {size} orbitals: more than two electrons need "
            f"{_LONGEST_STRING} orbitals or fewer; take a smaller basis"
        )
    solver = fci.direct_spin0 if spin == 0.0 else fci.direct_spin1
    mc.fcisolver = solver.FCI(mc.mol)
    mc.fcisolver.conv_tol, mc.fcisolver.max_cycle = ENERGY_TOLERANCE, MAX_CYCLES
    if not long and electrons != (1, 1):
        mc.fix_spin_(shift=_SPIN_SHIFT, ss=spin * (spin + 1.0))


def _solve(mc: Any, size: int, electrons: tuple[int, int]) -> None:
    """Find the lowest state of ``mc`` from several determinants at once.

    A single one may have a symmetry of its own, and the search then never leaves it: H2 at 10 angstrom in its own
    orbitals ended in an ionic state.
    """
    one, core = mc.get_h1eff()
    two = mc.get_h2eff()
    diagonal = mc.fcisolver.make_hdiag(one, two, size, electrons)
    guesses = mc.fcisolver.get_init_guess(size, electrons, min(_GUESSES, diagonal.size), diagonal)
    mc.e_tot, mc.ci = mc.fcisolver.kernel(one, two, size, electrons, ci0=guesses, ecore=core)


def _spin_square(vector: Any, size: int, electrons: tuple[int, int]) -> float:
    """Return <S^2>; of a pair of electrons 1 - tr(CC), 0 for symmetric and 2 for antisymmetric coefficients."""
    if electrons == (1, 1):
        return 1.0 - float(np.sum(vector * np.transpose(vector)))
    return float(fci.spin_op.spin_square0(vector, size, electrons)[0])


def _describe(solution: Solution, vector: Any, size: int, electrons: tuple[int, int], frozen: int) -> None:
    """Add natural occupations, what a vector that is not too long says of them, and the spin of the state."""
    take_facts(solution, analyse_vector(vector, size, electrons))
    solution.n_inactive = frozen
    solution.s2 = _spin_square(np.asarray(vector), size, electrons)


def _shared_orbitals(field: Any) -> Any:
    """Return a restricted object with an unrestricted field's alpha orbitals, for both spins.

    Without frozen orbitals the full-CI energy is the same in any orbitals.
    """
    twin = field.copy()
    shared = twin.mol.RHF() if twin.mol.spin == 0 else twin.mol.ROHF()
    shared.mo_coeff, shared.mo_energy = np.asarray(field.mo_coeff)[0], np.asarray(field.mo_energy)[0]
    return shared
