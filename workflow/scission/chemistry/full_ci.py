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


def full_ci(task: dict[str, Any], field: Any, _: Record, frozen: int, __: Store) -> Solution:
    """Return the lowest full-CI state of the spin asked for; ``frozen`` orbitals stay doubly occupied."""
    mole = field.mol
    restricted = field if np.ndim(field.mo_coeff) == 2 else _shared_orbitals(field)
    size, electrons = restricted.mo_coeff.shape[1] - frozen, (mole.nelec[0] - frozen, mole.nelec[1] - frozen)
    mc = mcscf.CASCI(restricted, size, electrons)
    mc.canonicalization, mc.verbose = False, 0
    s = mole.spin / 2.0
    mc.fcisolver = fci.direct_spin1.FCI(mole)
    mc.fcisolver.conv_tol, mc.fcisolver.max_cycle = ENERGY_TOLERANCE, MAX_CYCLES
    mc.fix_spin_(shift=_SPIN_SHIFT, ss=s * (s + 1.0))
    mc.kernel()
    solution = solution_of_field(field, task["spec"], diagnose=False)
    solution.energies["correlation"] = float(mc.e_tot) - solution.energy
    solution.energy, solution.converged = float(mc.e_tot), bool(np.all(mc.fcisolver.converged))
    solution.n_correlated = sum(electrons)
    _describe(solution, mc.ci, size, electrons, frozen)
    if electrons == (1, 1) and frozen == 0:
        describe_pair_bond(solution, task, restricted.mo_coeff @ mc.ci @ restricted.mo_coeff.T)
    return solution


def _describe(solution: Solution, vector: Any, size: int, electrons: tuple[int, int], frozen: int) -> None:
    """Add natural occupations, what a vector that is not too long says of them, and the spin of the state."""
    take_facts(solution, analyse_vector(vector, size, electrons))
    solution.n_inactive = frozen
    solution.s2 = float(fci.spin_op.spin_square0(vector, size, electrons)[0])


def _shared_orbitals(field: Any) -> Any:
    """Return a restricted object with an unrestricted field's alpha orbitals, for both spins.

    Without frozen orbitals the full-CI energy is the same in any orbitals.
    """
    twin = field.copy()
    shared = twin.mol.RHF() if twin.mol.spin == 0 else twin.mol.ROHF()
    shared.mo_coeff, shared.mo_energy = np.asarray(field.mo_coeff)[0], np.asarray(field.mo_energy)[0]
    return shared
