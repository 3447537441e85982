"""Strongly contracted second-order n-electron valence perturbation theory on CASSCF."""

from __future__ import annotations

from typing import Any

import numpy as np
from pyscf import mrpt

from scission.records.store import Record, Store
from scission.solution import Solution

from .casscf import casci_object, finish_casscf
from .molecule import root_overlap


def nevpt2(task: dict[str, Any], field: Any, reference: Record, __: int, ___: Store) -> Solution:
    """Return the SC-NEVPT2 energy of each state; all electrons are correlated, the engine freezes none.

    Angeli, Cimiraglia and Malrieu, J. Chem. Phys. 117, 9138 (2002).
    """
    solution = finish_casscf(task, reference)
    mole = field.mol
    _, inverse_root = root_overlap(mole)
    coeff = inverse_root @ reference.arrays["mo_lowdin"][0]
    states = task["spec"].get("states", 1)
    energies = []
    for root in range(states):
        mc = casci_object(mole, task["spec"], reference.arrays["active"], orbital_step=False)
        mc.canonicalization = False
        vectors = list(reference.arrays["ci"])
        mc.kernel(coeff, ci0=vectors if states > 1 else vectors[0])
        second_order = mrpt.NEVPT(mc, root=root)
        second_order.verbose = 0
        energies.append(float(np.atleast_1d(mc.e_tot)[root] + second_order.kernel()))
    order = np.argsort(energies, kind="stable")
    solution.state_energies = np.array(energies)[order]
    if "state_labels" in solution.extra:
        solution.extra["state_labels"] = solution.extra["state_labels"][order]
    solution.energies["correlation"] = energies[order[0]] - solution.energy
    solution.energy = energies[order[0]]
    solution.n_correlated = int(mole.nelectron)
    return solution
