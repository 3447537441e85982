"""Second-order Moller-Plesset energies, restricted and unrestricted."""

from __future__ import annotations

from typing import Any

from pyscf import mp

from scission.records.store import Record, Store
from scission.solution import Solution

from .solutions import solution_of_field


def second_order_energy(task: dict[str, Any], field: Any, _: Record, frozen: int, __: Store) -> Solution:
    """Return the MP2 energy on an RHF or UHF reference, with ``frozen`` core orbitals left out."""
    solver = mp.MP2(field, frozen=frozen or None)
    correlation, _ = solver.kernel(with_t2=False)
    solution = solution_of_field(field, task["spec"], diagnose=False)
    solution.energy += float(correlation)
    solution.energies["correlation"] = float(correlation)
    solution.n_correlated = sum(solution.n_electrons) - 2 * frozen
    return solution
