"""Diagnostics from the orbital energies of the reference."""

from __future__ import annotations

from scission.solution import Solution

from .types import Absent


def homo_lumo_gap(solution: Solution) -> float | Absent:
    """Smallest gap between occupied and empty orbitals of either spin, hartree; shown only, no threshold."""
    if solution.mo_energy is None or solution.reference == "CASSCF":
        return Absent("the reference has no canonical orbital energies")
    gaps = []
    for energy, occ in zip(solution.mo_energy, solution.mo_occ, strict=True):
        filled, empty = energy[occ > 0.5], energy[occ < 0.5]
        if filled.size and empty.size:
            gaps.append(float(empty.min() - filled.max()))
    return min(gaps) if gaps else Absent("there is no empty orbital in this basis")
