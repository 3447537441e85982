"""Calculations that only some diagnostics need; a campaign asks for them by including one of those.

Contract for a new one: a function (task, mean field of the reference, its record, frozen orbitals, store) ->
Solution in ``EXTRAS``, under its name in ``scission.diagnostics.CALCULATIONS``; what the diagnostics read of
the Solution is set, and ``converged`` says whether to believe it.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
from pyscf import dft, gto
from pyscf.scf.addons import smearing

from scission.records.store import Record, Store
from scission.solution import Solution
from scission.units import KELVIN_IN_HARTREE

from .coupled_cluster import make_solver, solve, transformed
from .fragments import FragmentState, promising_splits
from .molecule import build_mole
from .solutions import solution_of_field

FOD_FUNCTIONAL, FOD_KELVIN = "TPSS", 5000.0
_FUNCTIONALS = {"binding_blyp": "BLYP", "binding_b1lyp": "B1LYP"}
_CYCLES = 200


def ccsd_density(task: dict[str, Any], field: Any, reference: Record, frozen: int, store: Store) -> Solution:
    """Return a Solution with the natural occupations of the CCSD density of a closed shell.

    The density is the unrelaxed one of the lambda equations; frozen orbitals count as doubly occupied.
    """
    solution = solution_of_field(field, task["spec"], diagnose=False)
    solver = make_solver(field, frozen)
    solve(solver, task, reference, frozen, store)
    solution.converged = bool(solver.converged)
    if solution.converged:
        solver.solve_lambda(eris=transformed(solver))
        solution.converged = bool(solver.converged_lambda)
        solution.cc_occupations = np.linalg.eigvalsh(solver.make_rdm1())[::-1].copy()
    return solution


def fractional_occupations(task: dict[str, Any], field: Any, *_: Any) -> Solution:
    """Return a Solution with Fermi occupations of TPSS at 5000 K, each spin's electrons kept.

    Grimme and Hansen, Angew. Chem. Int. Ed. 54, 12308 (2015).
    """
    solution = solution_of_field(field, task["spec"], diagnose=False)
    warm = smearing(
        _kohn_sham(field.mol, FOD_FUNCTIONAL), sigma=FOD_KELVIN * KELVIN_IN_HARTREE, method="fermi"
    )
    warm.fix_spin = field.mol.spin != 0
    warm.kernel()
    occ = np.asarray(warm.mo_occ, dtype=float)
    solution.converged = bool(warm.converged)
    solution.fractional_occupations = occ if occ.ndim == 2 else occ[None] / 2.0
    return solution


def functional_sensitivity(task: dict[str, Any], field: Any, *_: Any) -> Solution:
    """Return a Solution with the binding energies of BLYP and B1LYP against the scan's fragments, hartree.

    The molecule is restricted if it is a singlet; fragments are unrestricted, with the charges and spins of
    the lowest neutral split.
    """
    solution = solution_of_field(field, task["spec"], diagnose=False)
    positions, basis = np.array(task["positions"]), task["spec"]["basis"]
    splits = promising_splits(task["molecule"], basis, positions, task["fragments"])
    split = next(s for s in splits if not s.ionic)
    parts = [_part(task, atoms, state) for atoms, state in zip(task["fragments"], split.states, strict=True)]
    solution.converged = True
    for name, functional in _FUNCTIONALS.items():
        fields = [_kohn_sham(mole, functional) for mole in (field.mol, *parts)]
        energies = [float(f.kernel()) for f in fields]
        solution.energies[name] = sum(energies[1:]) - energies[0]
        solution.converged = solution.converged and all(f.converged for f in fields)
    return solution


def _part(task: dict[str, Any], atoms: list[int], state: FragmentState) -> gto.Mole:
    symbols = [task["molecule"]["symbols"][a] for a in atoms]
    facts = {"symbols": symbols, "charge": state.charge, "multiplicity": state.unpaired + 1}
    return build_mole(facts, task["spec"]["basis"], np.array(task["positions"])[list(atoms)])


def _kohn_sham(mole: gto.Mole, functional: str) -> Any:
    field = dft.rks.RKS(mole) if mole.spin == 0 else dft.uks.UKS(mole)
    field.xc, field.max_cycle, field.chkfile, field.verbose = functional, _CYCLES, None, 0
    return field


EXTRAS: dict[str, Callable[..., Solution]] = {
    "ccsd_density": ccsd_density,
    "n_fod": fractional_occupations,
    "b1": functional_sensitivity,
}
"""Name of the calculation -> function."""
